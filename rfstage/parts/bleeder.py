"""The bleeder across a supply's reservoir capacitor: how soon the voltage is safe, and what the resistor burns.

::

    supply ──┬──────────┬── stage        v(t) = V e^(−t/RC);  V → 60 V takes R C ln(V/60 V)
             C    bleeder R              energy C V²/2, loss V²/R
             │          │

Nothing else is counted as discharging: a stage without drive, or a blown fuse, draws nothing. A bleeder fails open, so
that a capacitor is safe when it has been measured and shorted, never because time has passed.
"""

from __future__ import annotations

import math
from typing import NamedTuple

from rfstage.constants import SAFE_VOLTAGE
from rfstage.errors import ImpossibleError
from rfstage.parts.preferred import neighbours
from rfstage.parts.ranges import need
from rfstage.quantity import show

POWER_MARGIN = 2.0  # rating over loss: a bleeder runs all the time (common practice, no source)
# W: resistors that are sold (common practice, no source)
POWER_RATINGS = (0.25, 0.5, 1.0, 2.0, 3.0, 5.0, 7.0, 10.0, 17.0, 25.0, 50.0, 100.0, 200.0, 300.0)


class Bleeder(NamedTuple):
    """A bleeder and what it does.

    ``resistance`` [ohm], ``discharge_time`` [s] from the supply voltage to the safe one, ``time_constant`` [s],
    ``current`` [A] and ``loss`` [W] all the time the supply is on, ``power_to_stand`` [W] with its margin,
    ``power_rating`` [W], the one sold that covers it or None above 300 W (several in series), ``stored_energy`` [J] in
    the reservoir.
    """

    resistance: float
    discharge_time: float
    time_constant: float
    current: float
    loss: float
    power_to_stand: float
    power_rating: float | None
    stored_energy: float


def bleeder(
    resistance: float,
    *,
    capacitance: float,
    voltage: float,
    safe_voltage: float = SAFE_VOLTAGE,
    margin: float = POWER_MARGIN,
) -> Bleeder:
    """Return what a bleeder does for a reservoir.

    Parameters
    ----------
    resistance : float
        Bleeder [ohm].
    capacitance : float
        Reservoir [F].
    voltage, safe_voltage : float
        Supply, and where the discharge counts as done [V]; a supply that is safe already takes no time.
    margin : float
        Power rating over loss [-], 1 or more.

    Raises
    ------
    OutOfRangeError
        If a value is not above 0, or the margin below 1.

    Examples
    --------
    >>> found = bleeder(100e3, capacitance=50e-6, voltage=2000.0)
    >>> round(found.discharge_time, 1), found.stored_energy, found.loss, found.power_rating
    (17.5, 100.0, 40.0, 100.0)
    """
    need("resistance", resistance, "ohm", above=0)
    _check(capacitance, voltage, safe_voltage, margin)
    time_constant = resistance * capacitance
    loss = voltage**2 / resistance
    stand = margin * loss
    return Bleeder(
        resistance=resistance,
        discharge_time=time_constant * max(0.0, math.log(voltage / safe_voltage)),
        time_constant=time_constant,
        current=voltage / resistance,
        loss=loss,
        power_to_stand=stand,
        power_rating=next((rating for rating in POWER_RATINGS if rating >= stand), None),
        stored_energy=capacitance * voltage**2 / 2,
    )


def bleeder_for(
    time: float,
    *,
    capacitance: float,
    voltage: float,
    safe_voltage: float = SAFE_VOLTAGE,
    margin: float = POWER_MARGIN,
    series: str | None = None,
) -> Bleeder:
    """Return the bleeder that makes a reservoir safe within a time.

    Parameters
    ----------
    time : float
        From the supply voltage to the safe one [s].
    capacitance, voltage, safe_voltage, margin :
        As `bleeder`.
    series : str or None
        E series of the resistor: the preferred value at or below the one computed, which is never slower. None leaves
        it as it is.

    Raises
    ------
    InputError
        If there is no such series.
    ImpossibleError
        If the supply is not above the safe voltage: no bleeder is needed for that.
    OutOfRangeError
        If a value is not above 0, or the margin below 1.

    Examples
    --------
    >>> found = bleeder_for(20.0, capacitance=50e-6, voltage=2000.0, series="E12")
    >>> found.resistance, round(found.discharge_time, 1)
    (100000.0, 17.5)
    """
    need("time", time, "s", above=0)
    _check(capacitance, voltage, safe_voltage, margin)
    if voltage <= safe_voltage:
        raise ImpossibleError(
            f"a supply of {show(voltage, 'V')} needs no bleeder to come down to {show(safe_voltage, 'V')}"
        )
    resistance = time / (capacitance * math.log(voltage / safe_voltage))
    if series is not None:
        resistance = neighbours(resistance, series=series).below
    return bleeder(resistance, capacitance=capacitance, voltage=voltage, safe_voltage=safe_voltage, margin=margin)


def _check(capacitance: float, voltage: float, safe_voltage: float, margin: float) -> None:
    need("capacitance", capacitance, "F", above=0)
    need("voltage", voltage, "V", above=0)
    need("safe_voltage", safe_voltage, "V", above=0)
    need("margin", margin, "", least=1)
