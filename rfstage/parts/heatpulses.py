r"""Heat in equal pulses: how far the junction swings about what the average makes of it.

::

    P  ┌──┐    ┌──┐         a body of time constant τ swings between two temperatures; over its surroundings
       │  │    │  │         the upper is  P R (1 − e^(−w/τ))/(1 − e^(−T/τ)),
    ───┘  └────┘  └──       the lower that times e^(−(T−w)/τ)
       w
       ├── T ──┤            through everything slower flows the average P w/T
"""

from __future__ import annotations

import math
from typing import NamedTuple

from rfstage.parts.heatsink import ThermalPath, temperatures
from rfstage.parts.ranges import need


class PulsedTemperatures(NamedTuple):
    """Junction in equal pulses [°C]: at its hottest, mean and coolest, with case and sink at the average's."""

    hottest: float
    mean: float
    coolest: float
    case: float
    sink: float


def pulsed_temperatures(
    dissipation: float,
    path: ThermalPath,
    *,
    ambient: float,
    width: float,
    period: float,
    time_constant: float | None = None,
) -> PulsedTemperatures:
    """Return the temperatures of a junction heated in equal pulses for so long that they repeat.

    Parameters
    ----------
    dissipation : float
        Within a pulse [W].
    path : ThermalPath
        Junction to ambient.
    ambient : float
        [°C].
    width, period : float
        Of the pulses [s]; the duty cycle is one over the other.
    time_constant : float or None
        Thermal time constant of the junction against its case [s]; case and sink are taken to be much slower than the
        period. None where the junction is too: all then stand at the average's temperature.

    Raises
    ------
    OutOfRangeError
        If the dissipation is below 0 W, or a time is not above 0 s, or the width above the period.

    Examples
    --------
    A tenth of the time 100 W: the junction swings about what 10 W would give.

    >>> path = ThermalPath(junction_to_case=1.0, sink_to_ambient=2.0)
    >>> found = pulsed_temperatures(100.0, path, ambient=20.0, width=1e-3, period=10e-3, time_constant=10e-3)
    >>> [round(t, 1) for t in (found.hottest, found.mean, found.coolest, found.case)]
    [55.1, 50.0, 46.1, 40.0]
    """
    need("width", width, "s", above=0)
    need("period", period, "s", least=width, hint="the period holds the pulse and the pause")
    mean = temperatures(dissipation * width / period, path, ambient=ambient)
    if time_constant is None:
        return PulsedTemperatures(mean.junction, mean.junction, mean.junction, mean.case, mean.sink)
    need("time_constant", time_constant, "s", above=0)
    rise = dissipation * path.junction_to_case
    swing = math.expm1(-width / time_constant) / math.expm1(-period / time_constant)
    return PulsedTemperatures(
        hottest=mean.case + rise * swing,
        mean=mean.junction,
        coolest=mean.case + rise * swing * math.exp(-(period - width) / time_constant),
        case=mean.case,
        sink=mean.sink,
    )
