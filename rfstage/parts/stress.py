"""What a capacitor must stand in its place, alone or beside others: voltage, current, loss, and the rating to buy.

Parallel capacitors have the same voltage, so that each takes current in proportion to its capacitance, at every
frequency; their leads are not counted in that. The loss is I²/(2π f C Q) with all the current at the carrier: an upper
figure where harmonics are part of it, since a capacitor's series resistance falls with frequency.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

from rfstage.errors import OutOfRangeError
from rfstage.parts.leads import LEADED, self_resonance
from rfstage.parts.ranges import need

# V dc: ratings that are sold (common practice, no source)
VOLTAGE_RATINGS = (
    *(50.0, 63.0, 100.0, 160.0, 250.0, 400.0, 500.0, 630.0, 1000.0, 1600.0, 2000.0, 2500.0, 3000.0, 4000.0, 5000.0),
    *(6300.0, 7500.0, 10e3, 15e3, 20e3, 30e3),
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Burden:
    """What a capacitance bears in its circuit.

    Carrier [Hz], rms current through it [A], RF peak voltage across it [V], and the direct voltage [V] where it blocks
    or stands across the supply.

    Raises
    ------
    OutOfRangeError
        If the carrier is not above 0, or a current or voltage is below 0.
    """

    carrier: float
    rms_current: float
    rf_peak_voltage: float
    dc_voltage: float = 0.0

    def __post_init__(self) -> None:
        need("carrier", self.carrier, "Hz", above=0)
        need("rms_current", self.rms_current, "A", least=0)
        need("rf_peak_voltage", self.rf_peak_voltage, "V", least=0)
        need("dc_voltage", self.dc_voltage, "V", least=0)

    @property
    def peak_voltage(self) -> float:
        """Direct voltage and RF peak together [V]."""
        return self.dc_voltage + self.rf_peak_voltage


@dataclass(frozen=True, slots=True, kw_only=True)
class Margins:
    """What a part is to stand over what it bears [-]; twice and 1.5 times are common practice, no source.

    Raises
    ------
    OutOfRangeError
        If one is below 1.
    """

    voltage: float = 2.0
    current: float = 1.5

    def __post_init__(self) -> None:
        need("voltage margin", self.voltage, "", least=1)
        need("current margin", self.current, "", least=1)


class PartStress(NamedTuple):
    """One capacitor [F] in its place: what it bears, and what to buy.

    ``peak_voltage`` [V] with the direct voltage, ``rms_current`` [A], ``loss`` [W] or None without a Q;
    ``voltage_to_stand`` [V] and ``current_to_stand`` [A] with their margins; ``voltage_rating`` [V dc], the preferred
    one that covers the first, or None above 30 kV (a vacuum capacitor, or several in series); ``self_resonance`` [Hz]
    with its leads.
    """

    value: float
    peak_voltage: float
    rms_current: float
    loss: float | None
    voltage_to_stand: float
    current_to_stand: float
    voltage_rating: float | None
    self_resonance: float


def stresses(
    values: Sequence[float],
    burden: Burden,
    *,
    holds_for: float | None = None,
    q: float | None = None,
    margins: Margins | None = None,
    lead_inductance: float = LEADED,
) -> tuple[PartStress, ...]:
    """Return what parallel capacitors each bear of a burden.

    They have the same voltage, so each takes current in proportion to its capacitance; their leads are not counted.

    Parameters
    ----------
    values : sequence of float
        The capacitors side by side [F], one or more.
    burden : Burden
        What the whole bears.
    holds_for : float or None
        The capacitance [F] the burden was found for; by default the sum. Of a fixed part and a trimmer give the
        wanted value here, and the trimmer at its highest setting among ``values``.
    q : float or None
        Quality factor at the carrier [-]; None for no loss figure.
    margins : Margins or None
        None for the usual ones.
    lead_inductance : float
        Of each part [H]; 5 nH on short wires, common practice without a source.

    Raises
    ------
    OutOfRangeError
        If a capacitance, Q or lead inductance is not above 0, or there is no capacitor.

    Examples
    --------
    >>> burden = Burden(carrier=7.1e6, rms_current=3.0, rf_peak_voltage=95.0)
    >>> first, second = stresses([390e-12, 150e-12], burden, q=1000)
    >>> round(first.rms_current, 3), round(second.rms_current, 3), first.voltage_rating
    (2.167, 0.833, 250.0)
    """
    if not values:
        raise OutOfRangeError("values", "none", "one capacitor or more")
    for value in values:
        need("a capacitor", value, "F", above=0)
    whole = sum(values) if holds_for is None else holds_for
    need("holds_for", whole, "F", above=0)
    if q is not None:
        need("q", q, "", above=0)
    margin = margins or Margins()
    stand = margin.voltage * burden.peak_voltage
    found = []
    for value in values:
        current = burden.rms_current * value / whole
        found.append(
            PartStress(
                value=value,
                peak_voltage=burden.peak_voltage,
                rms_current=current,
                loss=None if q is None else current**2 / (2 * math.pi * burden.carrier * value * q),
                voltage_to_stand=stand,
                current_to_stand=margin.current * current,
                voltage_rating=voltage_rating(stand),
                self_resonance=self_resonance(value, lead_inductance=lead_inductance),
            )
        )
    return tuple(found)


def voltage_rating(voltage: float) -> float | None:
    """Return the lowest preferred rating [V dc] that covers a voltage [V], or None above 30 kV.

    Raises
    ------
    OutOfRangeError
        If the voltage is below 0.

    Examples
    --------
    >>> voltage_rating(190.0), voltage_rating(250.0), voltage_rating(31e3)
    (250.0, 250.0, None)
    """
    need("voltage", voltage, "V", least=0)
    return next((rating for rating in VOLTAGE_RATINGS if rating >= voltage), None)
