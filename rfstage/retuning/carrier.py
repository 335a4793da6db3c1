"""What is fitted, brought to another carrier: each part alone and in pairs, by least work.

::

    wanted       the impedance that the device sees now, at the carrier the stage has now
    alone        the value that comes nearest to it at the new carrier
    in pairs     the values that meet it; or the nearest within what can be set, where that serves
    work         one trimmer < two < a coil spread < its tap moved < a new part

A stage that is out of tune where it stands would be brought out of tune to the new carrier: it says how far off it is.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations
from typing import NamedTuple

from rfstage.designs.judging import judged, worst
from rfstage.errors import ConvergenceError, ImpossibleError, InputError, OutOfRangeError
from rfstage.load import MeasuredLoad
from rfstage.matching.quality import loaded_q
from rfstage.quantity import exact_text, show
from rfstage.retuning.fitting import Fit, Seen, fit_pair, fit_single, seen_by_device, tuning_parts
from rfstage.retuning.windings import rewound, spread_range
from rfstage.stage import Stage
from rfstage.stagevalues import with_value
from rfstage.steady import SteadyState, settle

WORK = {"none": 0, "trim": 1, "spread": 3, "tap": 5, "new": 9}  # of one part; of several they add
UNITS = {"capacitor": "F", "coil": "H"}
NOT_WORTH = 0.7  # mismatch: half of the power lost; what is no better within reach is not shown
POWER_KEPT = 1.25  # times, either way, about 1 dB: the output that still counts as the stage's own
EFFICIENCY_KEPT = 0.05
REACHES = 0.2  # mismatch to which a carrier counts as reached: 4 % of the power
SAME = 1e-6  # relative: a part that would change by less stays


class Change(NamedTuple):
    """One part at another value [F or H].

    ``way`` is trim, spread, tap, new, or none where it stays; ``length`` [m] and ``turns`` of a coil where the
    winding says so.
    """

    part: str
    unit: str
    now: float
    wanted: float
    way: str
    length: float | None = None
    turns: float | None = None

    @property
    def within_reach(self) -> bool:
        """Whether it takes no new part."""
        return self.way != "new"


@dataclass(frozen=True, slots=True)
class Option:
    """One way to the new carrier: what changes, and what results.

    ``stage`` has the changed values and the new carrier, ``state`` is its steady state; ``impedance`` [ohm] is what
    the device sees and ``loaded_q`` [-] the tank's. ``serves``: output and efficiency stay the stage's own.
    ``limit_margin`` [dB] is the least against the stage's own limit, None where it has none.
    """

    changes: tuple[Change, ...]
    mismatch: float
    stage: Stage
    state: SteadyState
    impedance: complex
    loaded_q: float
    serves: bool
    limit_margin: float | None

    @property
    def work(self) -> int:
        """How much work it is, a number to sort by."""
        return sum(WORK[change.way] for change in self.changes)

    @property
    def within_reach(self) -> bool:
        """Whether it takes no new part."""
        return all(change.within_reach for change in self.changes)


@dataclass(frozen=True, slots=True)
class Retuned:
    """A stage brought to a new carrier [Hz], as `retuned` returns it.

    ``wanted`` [ohm] is what the device sees at its present carrier, ``before`` the steady state there and ``untouched``
    the one at the new carrier with nothing changed, None if that does not settle. ``nearest`` [Hz] is the carrier
    nearest the new one that what can be set does reach, None where the new one itself is reached or no part can be set.
    ``unsettled`` names the ways left out because they don't settle.
    """

    stage: Stage
    carrier: float
    wanted: complex
    before: SteadyState
    untouched: SteadyState | None
    options: tuple[Option, ...]
    nearest: float | None
    unsettled: tuple[str, ...]


def retuned(stage: Stage, carrier: float) -> Retuned:
    """Return what each part alone, and each two together, would have to become for a new carrier.

    Parameters
    ----------
    stage : Stage
        As it is built.
    carrier : float
        The new carrier [Hz].

    Returns
    -------
    Retuned
        ``options`` in this order: those that serve first, of those least work first, then the better match.

    Raises
    ------
    OutOfRangeError
        If the carrier is not above 0, or a measured load does not reach it.
    ImpossibleError
        If no part of the stage tunes it, or no value of one or two comes near the new carrier.
    ConvergenceError
        If the stage does not settle where it stands.

    Examples
    --------
    >>> from rfstage.device import Device
    >>> from rfstage.ladder import Branch
    >>> from rfstage.load import SeriesLoad
    >>> from rfstage.stage import Drive, PartData, Supply
    >>> fet = Device(family="fet", transfer_factor=9.2, exponent=1.0, threshold=3.0, threshold_softness=0.01,
    ...              knee_voltage=0.2, knee_resistance=0.04)
    >>> parts = (Branch("Cblock", "series", "capacitor", 83e-9), Branch("C1", "shunt", "capacitor", 8.7e-9),
    ...          Branch("L1", "series", "coil", 191e-9), Branch("C2", "shunt", "capacitor", 3.5e-9))
    >>> stage = Stage(carrier=7.1e6, device=fet, drive=Drive(bias=2.5, amplitude=1.0), branches=parts,
    ...               supply=Supply(voltage=13.8, choke=1.6e-6), load=SeriesLoad(50 + 0j, 7.1e6),
    ...               part_data={"C1": PartData(trim=(8e-9, 10e-9)), "C2": PartData(trim=(3e-9, 4e-9))})
    >>> best = retuned(stage, 7.0e6).options[0]
    >>> [(change.part, change.way, round(change.wanted * 1e9, 2)) for change in best.changes], best.serves
    ([('C2', 'trim', 3.63)], True)
    """
    if not (carrier > 0 and math.isfinite(carrier)):
        raise OutOfRangeError("carrier", f"{carrier:g} Hz", "finite and above 0 Hz")
    if isinstance(stage.load, MeasuredLoad) and not stage.load.reaches(carrier):
        ends = " to ".join(exact_text(float(f), "Hz") for f in stage.load.frequencies[[0, -1]])
        raise OutOfRangeError("carrier", exact_text(carrier, "Hz"), f"within {stage.load.name}, {ends}")
    here = seen_by_device(stage)
    moved = with_value(stage, "carrier", carrier)
    wanted, seen = here.wanted, seen_by_device(moved, here.wanted)
    names = tuning_parts(here)
    if not names:
        raise ImpossibleError("no coil or capacitor of this stage tunes it: the device feels none of them")
    before = settle(stage)
    unsettled: list[str] = []
    options = []
    for changes, mismatch in _ways(stage, seen, names):
        try:
            options.append(_option(moved, before, changes, mismatch))
        except ConvergenceError:
            unsettled.append(" and ".join(change.part for change in changes))
    options.sort(key=lambda o: (not o.serves, o.work, round(o.mismatch, 6), len(o.changes)))
    reached = any(option.serves and option.within_reach for option in options)
    nearest = None if reached else _nearest(stage, wanted, names, carrier)
    if not options:
        set_there = "" if nearest is None else f"; what can be set reaches {show(nearest, 'Hz', 4)} at the nearest"
        raise ImpossibleError(
            f"no value of one part and none of two brings this stage to {show(carrier, 'Hz', 4)}{set_there} "
            "(a new tank does it: rfstage design)"
        )
    return Retuned(
        stage=stage,
        carrier=carrier,
        wanted=wanted,
        before=before,
        untouched=_settled_or_none(moved, before),
        options=tuple(options),
        nearest=nearest,
        unsettled=tuple(unsettled),
    )


def _reach(stage: Stage, name: str, now: float) -> tuple[float, float] | None:
    """Return what a part can be set to without replacing it [F or H], or None."""
    data = stage.part_data.get(name)
    if data is None:
        return None
    try:
        return data.trim or spread_range(data.winding, now)
    except OutOfRangeError as error:
        raise InputError(f"{name}: its winding can't be wound: {error}") from None


def _ways(stage: Stage, seen: Seen, names: Sequence[str]) -> list[tuple[tuple[Change, ...], float]]:
    """Return the changes of every part alone and of every two, with their mismatch; each set of changes once."""
    reach = {name: _reach(stage, name, seen.value(name)) for name in names}
    found: list[tuple[tuple[Change, ...], float]] = []

    def add(parts: tuple[str, ...], fit: Fit) -> None:
        changes = tuple(_change(stage, seen, name, value) for name, value in zip(parts, fit.values, strict=True))
        found.append((tuple(change for change in changes if change.way != "none"), fit.mismatch))

    for name in names:
        free = fit_single(seen, name)
        add((name,), free)
        limits = reach[name]
        if limits is not None and not limits[0] <= free.values[0] <= limits[1]:
            add((name,), fit_single(seen, name, limits))
    for pair in combinations(names, 2):
        free_fits = fit_pair(seen, pair)
        both = [reach[name] for name in pair]
        limits_of_pair = [r for r in both if r is not None]
        inside = [
            fit
            for fit in free_fits
            if len(limits_of_pair) == 2
            and all(low <= value <= high for value, (low, high) in zip(fit.values, limits_of_pair, strict=True))
        ]
        for fit in inside[:1] or free_fits[:1]:
            add(pair, fit)
        if len(limits_of_pair) == 2 and not inside:
            add(pair, fit_pair(seen, pair, limits_of_pair)[0])
    return _once([way for way in found if way[1] < NOT_WORTH])


def _once(ways: Sequence[tuple[tuple[Change, ...], float]]) -> list[tuple[tuple[Change, ...], float]]:
    kept: list[tuple[tuple[Change, ...], float]] = []
    for changes, mismatch in ways:
        same = any(
            [c.part for c in changes] == [c.part for c in other]
            and all(math.isclose(a.wanted, b.wanted, rel_tol=1e-4) for a, b in zip(changes, other, strict=True))
            for other, _ in kept
        )
        if not same:
            kept.append((changes, mismatch))
    return kept


def _change(stage: Stage, seen: Seen, name: str, wanted: float) -> Change:
    branch = next(b for b in stage.branches if b.name == name)
    now, unit = seen.value(name), UNITS[branch.kind]
    data = stage.part_data.get(name)
    if abs(wanted / now - 1) < SAME:
        return Change(name, unit, now, now, "none")
    if data is not None and data.trim is not None and data.trim[0] <= wanted <= data.trim[1]:
        return Change(name, unit, now, wanted, "trim")
    if branch.kind == "capacitor":
        return Change(name, unit, now, wanted, "new")
    how = rewound(None if data is None else data.winding, now=now, wanted=wanted)
    return Change(name, unit, now, wanted, how.way, how.length, how.turns)


def _option(moved: Stage, before: SteadyState, changes: tuple[Change, ...], mismatch: float) -> Option:
    stage = moved
    for change in changes:
        stage = with_value(stage, change.part, change.wanted)
    state = settle(stage)
    seen = seen_by_device(stage)
    least = worst(judged(state))
    return Option(
        changes=changes,
        mismatch=mismatch,
        stage=stage,
        state=state,
        impedance=seen.wanted,
        loaded_q=_loaded_q(seen),
        serves=_serves(state, before),
        limit_margin=None if least is None else least.margin,
    )


def _loaded_q(seen: Seen) -> float:
    """Return the loaded Q [-] of a tank: of what stands behind a blocking capacitor, if it begins with one."""
    first = seen.branches[:1]
    split = int(bool(first) and first[0].blocks)
    load = complex(seen.load.impedance(seen.frequency))
    return loaded_q((*seen.feed, *seen.branches[:split]), seen.branches[split:], load, seen.frequency)


def _serves(state: SteadyState, before: SteadyState) -> bool:
    if not state.has_output or not before.has_output:
        return state.has_output == before.has_output
    power = state.output_power / before.output_power
    assert state.efficiency is not None
    assert before.efficiency is not None
    return 1 / POWER_KEPT <= power <= POWER_KEPT and state.efficiency >= before.efficiency - EFFICIENCY_KEPT


def _settled_or_none(stage: Stage, start: SteadyState) -> SteadyState | None:
    try:
        return settle(stage, start=start)
    except ConvergenceError:
        return None


def _nearest(stage: Stage, wanted: complex, names: Sequence[str], carrier: float) -> float | None:
    """Return the carrier [Hz] on the way to the new one that what can be set still reaches, by halving."""
    reach = {name: r for name in names if (r := _reach(stage, name, float(_value(stage, name)))) is not None}
    if not reach:
        return None

    def reached(at: float) -> bool:
        seen = seen_by_device(with_value(stage, "carrier", at), wanted)
        singles = (fit_single(seen, name, limits).mismatch for name, limits in reach.items())
        pairs = (fit_pair(seen, (a, b), [reach[a], reach[b]])[0].mismatch for a, b in combinations(reach, 2))
        return any(mismatch <= REACHES for mismatch in (*singles, *pairs))

    near, far = stage.carrier, carrier
    if reached(far):
        return far
    for _ in range(14):
        middle = math.sqrt(near * far)
        near, far = (middle, far) if reached(middle) else (near, middle)
    return near


def _value(stage: Stage, name: str) -> float:
    return next(float(b.value) for b in stage.branches if b.name == name)
