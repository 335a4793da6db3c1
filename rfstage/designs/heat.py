"""The heat of a stage in four conditions, and what it takes to carry it away.

::

    conditions ──► mean over the duty cycle ──► transistor: heat sink, junction, derating
                                           └──► tube: anode against its rating

Between transmissions the bias stays, so that the mean holds what the stage dissipates undriven. The mean is what
counts while a transmission is short against the minutes that a heat sink takes to warm up.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import NamedTuple

from rfstage.constants import AMBIENT, CASE_TO_SINK, JUNCTION_LIMIT
from rfstage.designs.conditions import Condition, conditions
from rfstage.errors import ImpossibleError
from rfstage.parts.heatsink import (
    RatingUse,
    ThermalPath,
    derated,
    largest_dissipation,
    rating_use,
    resistance_from_rating,
    sink_for,
    temperatures,
)
from rfstage.quantity import show
from rfstage.stage import Stage
from rfstage.steady import SteadyState

RATED_AT = 25.0  # degC, of the case, at which data sheets rate dissipation (common practice, no source)


@dataclass(frozen=True, slots=True, kw_only=True)
class Cooling:
    """What carries the heat away: temperatures [degC], thermal resistances [K/W], part of the time on the air [-].

    ``junction_to_case`` is None where it isn't known, ``sink_to_ambient`` where the heat sink is still to be chosen.
    """

    ambient: float = AMBIENT
    junction_limit: float = JUNCTION_LIMIT
    junction_to_case: float | None = None
    case_to_sink: float = CASE_TO_SINK
    sink_to_ambient: float | None = None
    duty: float = 1.0


class Heated(NamedTuple):
    """One condition and its heat; None where it did not settle, or nothing is known of the way of the heat.

    ``mean`` [W] over the duty cycle, of the hotter device, and ``stage_mean`` [W] of both of a pair; ``sink_needed``
    [K/W], the most from sink to ambient, None too where no sink does it or nothing is to be carried away, and
    ``reason`` why; ``junction`` and ``case`` [degC] with the sink of `Heat.sink`; ``use`` of the device's rating.
    """

    condition: Condition
    mean: float | None
    stage_mean: float | None
    sink_needed: float | None
    reason: str
    junction: float | None
    case: float | None
    use: RatingUse | None


class Heat(NamedTuple):
    """The heat of a stage.

    ``conditions`` are normal, detuned, mismatched and undriven, ``worst`` the hottest of them. ``sink`` [K/W] is the
    one fitted, else the one that the worst needs, or None. With it the hotter device stands ``most`` [W], which falls
    by ``per_kelvin`` [W/K] of ambient above the one given. ``rating`` [W] is the device's, ``derated_rating`` [W] what
    is left of it at the case's temperature in the worst condition, and ``sink_for_rating`` [K/W] the sink that keeps
    within it, None where none does. ``missing`` says what isn't known; ``assumed`` holds the defaults by key;
    ``max_voltage`` [V] is the device's rating, or None.
    """

    family: str
    cooling: Cooling
    conditions: tuple[Heated, ...]
    worst: Heated | None
    sink: float | None
    most: float | None
    per_kelvin: float | None
    rating: float | None
    derated_rating: float | None
    sink_for_rating: float | None
    missing: str
    assumed: dict[str, object]
    max_voltage: float | None = None

    @property
    def highest(self) -> Heated | None:
        """The condition of the highest peak voltage, or None where none settled."""
        known = [row for row in self.conditions if row.condition.peak_voltage is not None]
        return max(known, key=lambda row: row.condition.peak_voltage or 0.0, default=None)


def cooling_of(values: Mapping[str, float | None], family: str) -> tuple[Cooling, dict[str, object]]:
    """Return the cooling of given values by field name, and the defaults taken, by key; the duty in percent.

    Examples
    --------
    >>> cooling, assumed = cooling_of({"ambient": 25.0, "junction_to_case": 1.2}, "fet")
    >>> cooling.ambient, cooling.junction_limit, assumed["heat.duty"]
    (25.0, 150.0, 100.0)
    """
    given = {name: value for name, value in values.items() if value is not None and name != "duty"}
    duty = values.get("duty")
    cooling = Cooling(**given, duty=1.0 if duty is None else duty / 100)
    defaults = () if family == "tube" else ("ambient", "junction_limit", "case_to_sink")
    assumed: dict[str, object] = {f"heat.{name}": getattr(cooling, name) for name in defaults if name not in given}
    if duty is None:
        assumed["heat.duty"] = 100.0
    return cooling, assumed


def heat_of(
    stage: Stage,
    values: Mapping[str, float | None],
    *,
    state: SteadyState | None = None,
    progress: Callable[[int, int], None] | None = None,
) -> Heat:
    """Return the heat of a stage in normal, detuned, mismatched and undriven condition.

    Parameters
    ----------
    stage : Stage
        The stage.
    values : mapping
        What is known of the cooling, by the names of `rfstage.safetyfields.HEAT`, the duty in percent.
    state : SteadyState or None
        Its steady state, if known already.
    progress : callable or None
        Called with the number of mismatched points done and of all, now and then.

    Raises
    ------
    OutOfRangeError, ImpossibleError
        If the stage's values make no circuit.

    Examples
    --------
    >>> from rfstage.designs.design import design
    >>> from rfstage.job import Job
    >>> stage = design(Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8, network="pi")).stage
    >>> heat = heat_of(stage, {"junction_to_case": 2.0})
    >>> heat.worst.condition.name, round(heat.worst.mean, 1), round(heat.sink, 1), round(heat.worst.junction, 6)
    ('mismatched', 9.7, 9.0, 150.0)
    """
    device = stage.device
    cooling, assumed = cooling_of(values, device.family)
    found = conditions(stage, state=state, progress=progress)
    rows = [_heated(condition, found.undriven, cooling, device.max_dissipation) for condition in found]
    worst = max((row for row in rows if row.mean is not None), key=lambda row: row.mean or 0.0, default=None)
    path = None if worst is None else _path(worst, cooling)
    sink = most = per_kelvin = derated_rating = sink_for_rating = None
    if path is not None and worst is not None:
        sink = cooling.sink_to_ambient if cooling.sink_to_ambient is not None else worst.sink_needed
        most = largest_dissipation(path, junction_limit=cooling.junction_limit, ambient=cooling.ambient)
        per_kelvin = 1 / path.whole
        rows = [_warmed(row, cooling, sink) for row in rows]
        worst = next(row for row in rows if row.condition is worst.condition)
        if device.max_dissipation is not None and worst.case is not None and cooling.junction_limit > RATED_AT:
            implied = _implied(device.max_dissipation, cooling)
            derated_rating = derated(
                device.max_dissipation, at=RATED_AT, per_kelvin=1 / implied, temperature=worst.case
            )
            sink_for_rating, _ = _sink_for(worst.mean, worst.stage_mean, cooling, implied)
    return Heat(
        family=device.family,
        cooling=cooling,
        conditions=tuple(rows),
        worst=worst,
        sink=sink,
        most=most,
        per_kelvin=per_kelvin,
        rating=device.max_dissipation,
        derated_rating=derated_rating,
        sink_for_rating=sink_for_rating,
        missing=_missing(device.family, device.max_dissipation, cooling),
        assumed=assumed,
        max_voltage=device.max_voltage,
    )


def _heated(condition: Condition, undriven: Condition, cooling: Cooling, rating: float | None) -> Heated:
    """Return a condition with its mean heat, and the sink that it alone would need."""
    mean = _mean(condition.device_dissipation, undriven.device_dissipation, cooling.duty)
    stage_mean = _mean(condition.dissipation, undriven.dissipation, cooling.duty)
    use = None if mean is None or rating is None else rating_use(mean, rating=rating)
    needed, reason = _sink_for(mean, stage_mean, cooling, cooling.junction_to_case)
    return Heated(condition, mean, stage_mean, needed, reason, None, None, use)


def _sink_for(
    mean: float | None, stage_mean: float | None, cooling: Cooling, junction_to_case: float | None
) -> tuple[float | None, str]:
    """Return the most from sink to ambient [K/W], or None and why; both devices of a pair warm the one sink."""
    if mean is None or stage_mean is None or junction_to_case is None:
        return None, ""
    if mean == 0:
        return None, "nothing to carry away"
    try:
        alone = sink_for(
            mean,
            junction_limit=cooling.junction_limit,
            ambient=cooling.ambient,
            junction_to_case=junction_to_case,
            case_to_sink=cooling.case_to_sink,
        )
    except ImpossibleError as error:
        return None, str(error)
    return mean / stage_mean * alone, ""


def _mean(keyed: float | None, resting: float | None, duty: float) -> float | None:
    """Return the mean over the duty cycle [W]; None where one of the two that count isn't known."""
    if keyed is None or (duty < 1 and resting is None):
        return None
    return duty * keyed + (1 - duty) * (resting or 0.0)


def _path(worst: Heated, cooling: Cooling) -> ThermalPath | None:
    """Return the way of the heat of the hotter device; None where it isn't known or no sink does it."""
    sink = worst.sink_needed if cooling.sink_to_ambient is None else cooling.sink_to_ambient
    if cooling.junction_to_case is None or sink is None:
        return None
    share = (worst.stage_mean or 0.0) / worst.mean if worst.mean else 1.0
    return ThermalPath(
        junction_to_case=cooling.junction_to_case,
        case_to_sink=cooling.case_to_sink,
        sink_to_ambient=sink * share,
    )


def _warmed(row: Heated, cooling: Cooling, sink: float | None) -> Heated:
    """Return a condition with the temperatures that its mean makes on a sink [K/W]."""
    if row.mean is None or row.stage_mean is None or cooling.junction_to_case is None or sink is None:
        return row
    inner = ThermalPath(junction_to_case=cooling.junction_to_case, case_to_sink=cooling.case_to_sink)
    found = temperatures(row.mean, inner, ambient=cooling.ambient + row.stage_mean * sink)
    return row._replace(junction=found.junction, case=found.case)


def _implied(rating: float, cooling: Cooling) -> float:
    """Return the thermal resistance from junction to case [K/W] that a rating [W] stands for."""
    return resistance_from_rating(rating, at=RATED_AT, junction_limit=cooling.junction_limit)


def _missing(family: str, rating: float | None, cooling: Cooling) -> str:
    """Return what it takes to say more, in words."""
    if family == "tube":
        return "" if rating is not None else "the rating of the anode: give device.max_dissipation"
    if cooling.junction_to_case is not None:
        return ""
    words = "the thermal resistance from junction to case: give heat.junction_to_case, from the data sheet"
    if rating is None or cooling.junction_limit <= RATED_AT:
        return words
    return f"{words}; a rating of {show(rating, 'W')} at a {RATED_AT:g} °C case stands for " + (
        f"{show(_implied(rating, cooling), 'K/W')}"
    )
