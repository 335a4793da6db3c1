r"""The book's operating point: swing, load resistance, currents, power and heat.

::

    V_electrode = V_supply − R_choke·I_dc         swing  V1 = V_electrode − V_min
    P_device = P_load/η_tank = V1²/(2 R)          I1 = V1/R = a1·I_peak,  I_dc = a0·I_peak

    symbol   name                 unit
    ------   -------------------  ----
    V1       swing                V      peak of the fundamental at the output electrode
    R        load_resistance      ohm    what the device's current generator must see
    a0, a1   coefficients         -      of the current pulse, peak 1
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

from rfstage.errors import ImpossibleError
from rfstage.quantity import exact_text

SMALLEST_RESISTANCE, LARGEST_RESISTANCE = 1e-9, 1e12  # ohm: beyond them no lumped circuit is worth a number


class OperatingPoint(NamedTuple):
    """Voltages [V], currents [A], powers [W] and efficiencies [-] of the textbook stage.

    ``dc_power`` is what the supply gives, the choke's dc loss included; ``device_rf_power`` is the
    fundamental's power out of the device; ``dissipation`` is the device's heat.
    """

    load_resistance: float
    electrode_voltage_dc: float
    swing: float
    peak_current: float
    dc_current: float
    fundamental_current: float
    dc_power: float
    device_rf_power: float
    dissipation: float
    choke_loss: float
    device_efficiency: float
    overall_efficiency: float
    peak_voltage: float
    output_power: float


def operating_point(
    *,
    supply: float,
    minimum_voltage: float,
    output_power: float,
    dc_coefficient: float,
    fundamental_coefficient: float,
    tank_efficiency: float = 1.0,
    choke_resistance: float = 0.0,
) -> OperatingPoint:
    """Return the operating point that puts ``output_power`` into the load.

    Parameters
    ----------
    supply, minimum_voltage : float
        Supply voltage and lowest output-electrode voltage [V]; the second below the first.
    output_power : float
        Power at the load [W], above 0.
    dc_coefficient, fundamental_coefficient : float
        ``a0`` and ``a1`` of the current pulse [-].
    tank_efficiency : float
        Power at the load over the fundamental's power out of the device [-], in (0, 1].
    choke_resistance : float
        Direct-current resistance between supply and device [ohm], 0 or more.

    Returns
    -------
    OperatingPoint

    Raises
    ------
    ImpossibleError
        If the choke's dc resistance leaves no swing that gives the power, or the load resistance would be
        one that no circuit shows.

    References
    ----------
    The relations of every text on tuned power amplifiers; with a choke resistance the swing solves
    ``V1² − (V_supply − V_min) V1 + 2 R_choke (a0/a1) P = 0``.

    Examples
    --------
    >>> p = operating_point(supply=1000.0, minimum_voltage=100.0, output_power=100.0,
    ...                     dc_coefficient=0.217996, fundamental_coefficient=0.391002)
    >>> round(p.load_resistance), round(p.peak_current, 4), round(100 * p.device_efficiency, 1)
    (4050, 0.5683, 80.7)
    """
    device_power = output_power / tank_efficiency
    available = supply - minimum_voltage
    drop = 2 * choke_resistance * dc_coefficient / fundamental_coefficient * device_power
    square = available**2 - 4 * drop
    if available <= 0 or square < 0:
        most = available**2 * fundamental_coefficient / (8 * dc_coefficient * device_power)
        raise ImpossibleError(
            f"the choke's dc resistance of {exact_text(choke_resistance, 'ohm')} drops too much for "
            f"{exact_text(output_power, 'W')} from {exact_text(supply, 'V')}: at most {most:.3g} ohm would do"
        )
    swing = (available + math.sqrt(square)) / 2
    resistance = swing**2 / (2 * device_power)
    if not SMALLEST_RESISTANCE <= resistance <= LARGEST_RESISTANCE:
        raise ImpossibleError(
            f"{exact_text(output_power, 'W')} from {exact_text(supply, 'V')} would want a load resistance of "
            f"{resistance:.3g} ohm, which no circuit shows; are power and supply what was meant?"
        )
    return operating_point_at(
        resistance,
        supply=supply,
        minimum_voltage=minimum_voltage,
        dc_coefficient=dc_coefficient,
        fundamental_coefficient=fundamental_coefficient,
        tank_efficiency=tank_efficiency,
        choke_resistance=choke_resistance,
    )


def operating_point_at(
    load_resistance: float,
    *,
    supply: float,
    minimum_voltage: float,
    dc_coefficient: float,
    fundamental_coefficient: float,
    tank_efficiency: float = 1.0,
    choke_resistance: float = 0.0,
) -> OperatingPoint:
    """Return the operating point of a load resistance [ohm]; the other arguments are those of `operating_point`.

    Examples
    --------
    >>> p = operating_point_at(4050.0, supply=1000.0, minimum_voltage=100.0, dc_coefficient=0.217996,
    ...                        fundamental_coefficient=0.391002)
    >>> round(p.output_power, 6)
    100.0
    """
    ratio = dc_coefficient / fundamental_coefficient
    swing = (supply - minimum_voltage) / (1 + choke_resistance * ratio / load_resistance)
    fundamental = swing / load_resistance
    dc_current = ratio * fundamental
    device_power = swing * fundamental / 2
    choke_loss = choke_resistance * dc_current**2
    electrode = supply - choke_resistance * dc_current
    dc_power = supply * dc_current
    output_power = tank_efficiency * device_power
    return OperatingPoint(
        load_resistance=load_resistance,
        electrode_voltage_dc=electrode,
        swing=swing,
        peak_current=fundamental / fundamental_coefficient,
        dc_current=dc_current,
        fundamental_current=fundamental,
        dc_power=dc_power,
        device_rf_power=device_power,
        dissipation=dc_power - choke_loss - device_power,
        choke_loss=choke_loss,
        device_efficiency=device_power / (dc_power - choke_loss),
        overall_efficiency=output_power / dc_power,
        peak_voltage=electrode + swing,
        output_power=output_power,
    )


class Rating(NamedTuple):
    """One rating of the device: what is allowed, what the stage asks, in V, A or W."""

    name: str
    limit: float
    value: float

    @property
    def exceeded(self) -> bool:
        """Whether the stage asks more than the device stands."""
        return self.value > self.limit


def ratings(
    point: OperatingPoint, *, max_voltage: float | None, max_current: float | None, max_dissipation: float | None
) -> Sequence[Rating]:
    """Return the given ratings [V, A, W] against peak voltage, peak current and dissipation."""
    pairs = (
        ("max_voltage", max_voltage, point.peak_voltage),
        ("max_current", max_current, point.peak_current),
        ("max_dissipation", max_dissipation, point.dissipation),
    )
    return tuple(Rating(name, limit, value) for name, limit, value in pairs if limit is not None)
