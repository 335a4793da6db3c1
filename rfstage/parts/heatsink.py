r"""Heat: junction temperature, the heat sink it takes, derating; for tubes the anode against its rating.

::

    junction ──[ R_JC ]── case ──[ R_CS ]── sink ──[ R_SA ]── ambient
       P ↑                                                            TJ = TA + P (R_JC + R_CS + R_SA)

    symbol          name                                        unit
    --------------  ------------------------------------------  ----
    P               dissipation                                 W
    TJ, TA          junction and ambient temperature            °C
    R_JC            junction_to_case                            K/W
    R_CS            case_to_sink (washer and paste)             K/W
    R_SA            sink_to_ambient                             K/W

Steady heat; heat in pulses is in `rfstage.parts.heatpulses`.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

from rfstage.constants import JUNCTION_LIMIT
from rfstage.errors import ImpossibleError
from rfstage.parts.ranges import need

COLDEST = -273.15  # °C
# °C, of silicon: as in the worked examples of Boylestad & Nashelsky (200) and Sedra & Smith (150)
JUNCTION_LIMITS = {"metal can": 200.0, "plastic": JUNCTION_LIMIT}


@dataclass(frozen=True, slots=True, kw_only=True)
class ThermalPath:
    """The way of the heat from junction to ambient: three thermal resistances [K/W].

    Raises
    ------
    OutOfRangeError
        If one is below 0, or all are 0.
    """

    junction_to_case: float
    case_to_sink: float = 0.0
    sink_to_ambient: float = 0.0

    def __post_init__(self) -> None:
        need("junction_to_case", self.junction_to_case, "K/W", least=0)
        need("case_to_sink", self.case_to_sink, "K/W", least=0)
        need("sink_to_ambient", self.sink_to_ambient, "K/W", least=0)
        need("the whole thermal resistance", self.whole, "K/W", above=0)

    @property
    def whole(self) -> float:
        """Junction to ambient [K/W]."""
        return self.junction_to_case + self.case_to_sink + self.sink_to_ambient


class Temperatures(NamedTuple):
    """Temperatures along the path [°C]."""

    junction: float
    case: float
    sink: float


class RatingUse(NamedTuple):
    """A dissipation against its rating: both [W], the share used [-], what is left [W], and whether it is too much."""

    dissipation: float
    rating: float
    share: float
    left: float
    exceeded: bool


def temperatures(dissipation: float, path: ThermalPath, *, ambient: float) -> Temperatures:
    """Return the temperatures [°C] that a steady dissipation [W] makes over an ambient temperature [°C].

    Raises
    ------
    OutOfRangeError
        If the dissipation is below 0 W or the ambient below −273.15 °C.

    References
    ----------
    Boylestad & Nashelsky, *Electronic Devices and Circuit Theory*, 10th ed., example 12.18, read backwards.

    Examples
    --------
    >>> path = ThermalPath(junction_to_case=0.5, case_to_sink=0.6, sink_to_ambient=1.5)
    >>> round(temperatures(61.538, path, ambient=40.0).junction)
    200
    """
    need("dissipation", dissipation, "W", least=0)
    need("ambient", ambient, "°C", least=COLDEST)
    sink = ambient + dissipation * path.sink_to_ambient
    case = sink + dissipation * path.case_to_sink
    return Temperatures(case + dissipation * path.junction_to_case, case, sink)


def largest_dissipation(path: ThermalPath, *, junction_limit: float, ambient: float) -> float:
    """Return the dissipation [W] that brings the junction to its limit [°C] over an ambient temperature [°C].

    Raises
    ------
    ImpossibleError
        If the ambient is at the limit or above.
    OutOfRangeError
        If a temperature is below −273.15 °C.

    References
    ----------
    Boylestad & Nashelsky, *Electronic Devices and Circuit Theory*, 10th ed., example 12.18.

    Examples
    --------
    >>> path = ThermalPath(junction_to_case=0.5, case_to_sink=0.6, sink_to_ambient=1.5)
    >>> round(largest_dissipation(path, junction_limit=200.0, ambient=40.0), 2)
    61.54
    """
    return _room(junction_limit, ambient) / path.whole


def sink_for(
    dissipation: float, *, junction_limit: float, ambient: float, junction_to_case: float, case_to_sink: float
) -> float:
    """Return the largest thermal resistance from sink to ambient [K/W] that keeps the junction within its limit.

    Parameters
    ----------
    dissipation : float
        Steady, or the average [W], above 0.
    junction_limit, ambient : float
        Temperatures [°C].
    junction_to_case, case_to_sink : float
        Thermal resistances [K/W], 0 or more.

    Raises
    ------
    ImpossibleError
        If no heat sink does it, with the dissipation that an endless one would allow.
    OutOfRangeError
        If a value is out of range.

    Examples
    --------
    >>> round(sink_for(61.54, junction_limit=200.0, ambient=40.0, junction_to_case=0.5, case_to_sink=0.6), 2)
    1.5
    """
    need("dissipation", dissipation, "W", above=0)
    need("junction_to_case", junction_to_case, "K/W", least=0)
    need("case_to_sink", case_to_sink, "K/W", least=0)
    room = _room(junction_limit, ambient)
    inner = junction_to_case + case_to_sink
    resistance = room / dissipation - inner
    if resistance <= 0:
        raise ImpossibleError(
            f"no heat sink keeps {dissipation:.3g} W within {junction_limit:g} °C at {ambient:g} °C ambient: "
            f"{inner:.3g} K/W from junction to sink allow less than {room / inner:.3g} W with an endless one"
        )
    return resistance


def derated(rating: float, *, at: float, per_kelvin: float, temperature: float) -> float:
    """Return the dissipation [W] a device is rated for at a temperature [°C]; 0 where it has fallen to nothing.

    Parameters
    ----------
    rating : float
        Dissipation [W] up to the temperature ``at`` [°C], case or ambient as the data sheet says.
    per_kelvin : float
        What it falls by above that [W/K].
    temperature : float
        Where it is wanted [°C].

    Raises
    ------
    OutOfRangeError
        If the rating or the derating is not above 0, or a temperature below −273.15 °C.

    References
    ----------
    Boylestad & Nashelsky, *Electronic Devices and Circuit Theory*, 10th ed., example 12.17.

    Examples
    --------
    >>> derated(80.0, at=25.0, per_kelvin=0.5, temperature=125.0)
    30.0
    """
    need("rating", rating, "W", above=0)
    need("per_kelvin", per_kelvin, "W/K", above=0)
    need("at", at, "°C", least=COLDEST)
    need("temperature", temperature, "°C", least=COLDEST)
    return max(0.0, rating - per_kelvin * max(0.0, temperature - at))


def resistance_from_rating(rating: float, *, at: float, junction_limit: float) -> float:
    """Return the thermal resistance [K/W] that a rating [W] at a temperature [°C] stands for.

    To the point where that temperature is: the case, or the ambient. One over it is the derating [W/K].

    Raises
    ------
    ImpossibleError
        If the temperature is at the junction's limit [°C] or above.
    OutOfRangeError
        If the rating is not above 0 W, or a temperature below −273.15 °C.

    References
    ----------
    Sedra & Smith, *Microelectronic Circuits*, 5th ed., example 14.4, p. 1251.

    Examples
    --------
    >>> resistance_from_rating(2.0, at=25.0, junction_limit=150.0)
    62.5
    """
    need("rating", rating, "W", above=0)
    return _room(junction_limit, at) / rating


def rating_use(dissipation: float, *, rating: float, duty: float = 1.0) -> RatingUse:
    """Return a dissipation against its rating, such as a tube's anode or one device of a pair against the data sheet.

    Parameters
    ----------
    dissipation : float
        While on [W], 0 or more.
    rating : float
        Continuous rating [W], above 0. A tube's anode is rated for its mean, with the cooling that the data sheet asks.
    duty : float
        Part of the time on [-], above 0, to 1.

    Raises
    ------
    OutOfRangeError
        If a value is out of range.

    Examples
    --------
    >>> rating_use(180.0, rating=250.0)
    RatingUse(dissipation=180.0, rating=250.0, share=0.72, left=70.0, exceeded=False)
    """
    need("dissipation", dissipation, "W", least=0)
    need("rating", rating, "W", above=0)
    need("duty", duty, "", above=0, most=1)
    mean = dissipation * duty
    return RatingUse(mean, rating, mean / rating, rating - mean, exceeded=mean > rating)


def _room(junction_limit: float, ambient: float) -> float:
    """Return how far the junction may rise [K]."""
    need("junction_limit", junction_limit, "°C", least=COLDEST)
    need("ambient", ambient, "°C", least=COLDEST)
    if ambient >= junction_limit:
        raise ImpossibleError(
            f"at {ambient:g} °C around it nothing may be dissipated within a junction limit of {junction_limit:g} °C"
        )
    return junction_limit - ambient
