"""A design with the parts that can be had: chosen, put in the ladder with losses and strays, retrimmed, settled again.

::

    design ──► capacitors of preferred values, coils of whole turns ──► ladder with their Qs, leads, self-capacitance
                                                                           │  trimmer and coil length, until the
                                                                           ▼  impedance at the device is back
                                              settled again, beside the ideal: power, heat, harmonics, limit
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

from rfstage.designs.design import Design
from rfstage.designs.judging import in_line
from rfstage.errors import ConvergenceError, ImpossibleError, RfstageError
from rfstage.fitting.capacitors import TRIMMED, Bought, choose_capacitor
from rfstage.fitting.choosing import (
    Chosen,
    as_settled,
    burdens,
    chosen_parts,
    coil_for,
    link_of,
    moved_until,
    real,
)
from rfstage.fitting.coils import Winding, tap_for, tapped
from rfstage.fitting.request import PartsRequest
from rfstage.ladder import Branch, Ladder
from rfstage.matching.exact import Free, close
from rfstage.parts.stress import Burden
from rfstage.quantity import show
from rfstage.stage import BLOCKING as BLOCKER
from rfstage.stage import PartData, Stage
from rfstage.steady import SteadyState, settle

RETRIMS = 12
CHOSEN_AGAIN = 3  # of these, in which a trimmer that is left near its end is chosen again
NEAR_END = 3.0  # % of the capacitance left to one side
PART_WAY = 0.7  # of the way to where a tap would be best, were the rest of the coil not to follow
CLOSEST_LINK = 0.9  # coupling that no link over another coil exceeds (common practice, no source)
NEAR = 1e-3  # of the load resistance: how near the impedance comes back
TOLERANCE = 5.0  # % of fixed capacitors (common practice, no source)


class Comparison(NamedTuple):
    """What the parts did: a figure of the ideal stage and of the fitted one; None where there is none."""

    name: str
    unit: str
    ideal: float | None
    fitted: float | None


class Fitting(NamedTuple):
    """The parts of a design, and the stage with them.

    ``bought`` and ``wound`` by branch; ``ideal`` holds the branches that stayed ideal, with the reason; ``impedance``
    [ohm] at the device with the parts as chosen, ``retrimmed`` the same after the retrim; ``moved`` names the parts
    that were set for it; ``state`` is the steady state and ``line`` that on the resistive line, None where the stage
    did not settle, which ``trouble`` then says.
    """

    bought: tuple[Bought, ...]
    wound: tuple[Winding, ...]
    ideal: tuple[tuple[str, str], ...]
    impedance: complex
    retrimmed: complex
    moved: tuple[str, ...]
    stage: Stage
    state: SteadyState | None
    line: SteadyState | None
    compared: tuple[Comparison, ...]
    trouble: str = ""

    @property
    def misses_limit(self) -> bool:
        """Whether the limit, where there is one, is missed with these parts, or nothing settled to tell."""
        margin = next((c for c in self.compared if c.unit == "dB"), None)
        return margin is not None and (margin.fitted is None or margin.fitted < 0)


def fit_parts(made: Design, asked: PartsRequest) -> Fitting:
    """Return the parts bin's version of a design.

    Parameters
    ----------
    made : Design
        With or without its steady state; with one, the stresses are those of all orders and dc.
    asked : PartsRequest
        Formers, wire, series and margins.

    Raises
    ------
    ImpossibleError
        If no trimmer and coil length bring the impedance at the device back.
    """
    stage, carrier = made.stage, made.job.carrier
    borne = burdens(made)
    first = len(made.tank.parts) - len(stage.branches)
    before = [part.branch for part in made.tank.parts[:first]]
    trims = _trims(made)
    trouble: list[str] = []
    for capacitor, coil in trims:
        chosen = chosen_parts(made, stage.branches, borne, asked, capacitor)
        if capacitor in chosen.ideal:
            trouble.append(f"{capacitor}: {chosen.ideal[capacitor]}")
            continue
        branches = tuple(real(branch, chosen) for branch in stage.branches)
        seen = complex(Ladder((*before, *branches)).impedance(carrier, made.settings.load_impedance))
        try:
            trimmed = _retrimmed(made, before, branches, chosen, (capacitor, coil), borne, asked)
        except RfstageError as error:
            trouble.append(str(error))
            continue
        return _compared(made, before, *trimmed, seen, (capacitor, coil), borne, asked)
    said = trouble[0] if trouble else "it has no capacitor and coil to trim"
    raise ImpossibleError(
        f"--parts: no trimmer and coil length bring {show(made.point.load_resistance, 'ohm')} back to the device: "
        f"{said}"
    )


def _trims(made: Design) -> list[tuple[str, str]]:
    """Return which capacitor and coil could be trimmed together, the most sensible pair first."""
    own = made.tank.parts[-len(made.stage.branches) :]
    filtered = {branch.name for branch in made.filter.parts} if made.filter else set()
    tank = [p.branch for p in own if p.branch.name not in filtered and p.branch.name != BLOCKER]
    coils = [b.name for b in tank if b.kind in ("coil", "coupled")]
    capacitors = [b for b in tank if b.kind == "capacitor"]
    capacitors.sort(key=lambda b: b.place != "shunt")  # one end of a shunt capacitor is at ground
    shunt = [b.name for b in capacitors]
    return [(capacitor, coil) for coil in coils for capacitor in (*shunt[1:], *shunt[:1])]


def _retrimmed(
    made: Design,
    before: Sequence[Branch],
    branches: Sequence[Branch],
    chosen: Chosen,
    trims: tuple[str, str],
    borne: dict[str, Burden],
    asked: PartsRequest,
) -> tuple[tuple[Branch, ...], Chosen]:
    """Return the branches and parts with trimmer and coil set so that the device sees what it is to see.

    Of a coil the length moves, of a tapped one the tap, of a link the coupling. Squeezing a coil changes its Q and
    self-capacitance, moving a tap the coupling, so it is done again with those until the rest is small.
    """
    wanted, load, carrier = complex(made.point.load_resistance), made.settings.load_impedance, made.job.carrier
    places = {branch.name: k for k, branch in enumerate(branches)}
    capacitor, coil = (places[name] for name in trims)
    attribute = "value" if branches[coil].kind == "coil" else "second" if branches[coil].tap else "coupling"
    free = (Free(capacitor), Free(coil, attribute))
    now = tuple(branches)
    for done in range(RETRIMS):
        closed = close(before, now, wanted=wanted, load=load, carrier=carrier, free=free)
        bought = _set_capacitor(chosen, closed[capacitor], borne, asked, again=done < CHOSEN_AGAIN)
        wound = _set_coil(made, chosen, closed[coil], asked)
        chosen = chosen._replace(bought=bought, wound=wound)
        now = tuple(real(branch, chosen) for branch in closed)
        if abs(complex(Ladder((*before, *now)).impedance(carrier, load)) / wanted - 1) <= NEAR:
            return now, chosen
    raise ConvergenceError(f"{trims[0]} and {trims[1]} do not settle against each other")


def _set_capacitor(
    chosen: Chosen, closed: Branch, borne: dict[str, Burden], asked: PartsRequest, *, again: bool
) -> dict[str, Bought]:
    """Return the capacitors with one set to what the network wants; its parts are chosen anew if they can't be."""
    name, total = closed.name, float(closed.value)
    if total <= 0:
        raise ConvergenceError(f"{name} would have to be negative")
    part = chosen.bought[name].retrimmed(total)
    if part.spare < (NEAR_END if again else 0.0):
        q = None if closed.q is None else float(closed.q)
        part = choose_capacitor(name, part.wanted, TRIMMED, borne[name], q, asked, total=total)
    return {**chosen.bought, name: part}


def _set_coil(made: Design, chosen: Chosen, closed: Branch, asked: PartsRequest) -> dict[str, Winding]:
    """Return the windings with one set to what the network wants; a coil that can't be is wound anew."""
    name, value = closed.name, float(closed.value)
    if value <= 0 or float(closed.second) < 0:
        raise ConvergenceError(f"{name} would have to be negative")
    if closed.kind == "coupled" and not closed.tap and not 0 < float(closed.coupling) <= CLOSEST_LINK:
        raise ImpossibleError(
            f"{name} would need a coupling of {float(closed.coupling):.3g}; a link has above 0, to {CLOSEST_LINK:g}"
        )
    if name not in chosen.wound:
        return chosen.wound
    wound = dict(chosen.wound)
    if closed.kind == "coil":
        try:
            wound[name] = wound[name].retrimmed(value)
        except RfstageError:
            wound[name] = coil_for(made, name, value, wound[name].current, asked)
    elif closed.tap:
        coil, tap = wound[name].coil, wound[name].tap
        assert tap is not None
        now = tapped(coil, tap)[1]
        wound[name] = wound[name]._replace(tap=tap_for(coil, now * (float(closed.second) / now) ** PART_WAY))
    else:
        link = link_of(name)
        wound[link] = wound[link]._replace(note=moved_until(name, float(closed.coupling)))
    return wound


def _compared(
    made: Design,
    before: Sequence[Branch],
    branches: tuple[Branch, ...],
    chosen: Chosen,
    seen: complex,
    trims: tuple[str, str],
    borne: dict[str, Burden],
    asked: PartsRequest,
) -> Fitting:
    stage = replace(made.stage, branches=branches)
    state = line = None
    trouble = ""
    try:
        state = settle(stage, listed=made.settings.highest_order, start=made.settled)
        line = in_line(stage, state, made.settings.line)
    except ConvergenceError as error:
        trouble = str(error)
    if state is not None:
        chosen = as_settled(chosen, state, branches, borne, asked)
    stage = replace(stage, part_data=_part_data(chosen, branches))
    ideal = dict(chosen.ideal)
    if trims[1] in ideal:
        ideal[trims[1]] += f"; it is to be {_size(next(b for b in branches if b.name == trims[1]))}"
    return Fitting(
        bought=tuple(chosen.bought.values()),
        wound=tuple(chosen.wound.values()),
        ideal=tuple(ideal.items()),
        impedance=seen,
        retrimmed=complex(Ladder((*before, *branches)).impedance(made.job.carrier, made.settings.load_impedance)),
        moved=trims,
        stage=stage,
        state=state,
        line=line,
        compared=_comparisons(made, state, line),
        trouble=trouble,
    )


def _size(coil: Branch) -> str:
    if coil.kind == "coil":
        return show(float(coil.value), "H")
    first, second = (show(float(value), "H") for value in (coil.value, coil.second))
    between = "above and below its tap" if coil.tap else "of its windings"
    return f"{first} and {second} {between}, with a coupling of {float(coil.coupling):.3g}"


def _part_data(chosen: Chosen, branches: Sequence[Branch]) -> dict[str, PartData]:
    found: dict[str, PartData] = {}
    kept = {branch.name for branch in branches}
    for name, bought in chosen.bought.items():
        rating = bought.stresses[0].voltage_rating
        found[name] = PartData(bought.reach, None if bought.reach else TOLERANCE, None, rating)
    for name, winding in chosen.wound.items():
        coil = winding.coil
        if name not in kept:  # a link, which has no line of its own in a stage file
            continue
        found[name] = replace(
            found.get(name, PartData()),
            winding=(
                ("turns", coil.turns),
                ("diameter", coil.diameter),
                ("length", coil.length),
                ("wire", coil.wire_diameter),
            ),
        )
    return found


def _comparisons(made: Design, state: SteadyState | None, line: SteadyState | None) -> tuple[Comparison, ...]:
    ideal = made.settled
    found = [
        Comparison(
            name, unit, None if ideal is None else getattr(ideal, key), None if state is None else getattr(state, key)
        )
        for name, unit, key in (
            ("power at the load", "W", "output_power"),
            ("dc current", "A", "dc_current"),
            ("overall efficiency", "", "efficiency"),
            ("device dissipation", "W", "dissipation"),
            ("peak voltage", "V", "peak_voltage"),
        )
    ]
    levels = {h.order: h.level for h in line.harmonics} if line else {}
    for h in made.harmonics[:3]:
        found.append(Comparison(f"harmonic {h.order} in the line", "dBc", h.line_level, levels.get(h.order)))
    worst = made.worst
    if worst is not None and worst.margin is not None:
        margins = [
            h.limit - level
            for h in made.harmonics
            if h.limit is not None and (level := levels.get(h.order)) is not None
        ]
        found.append(Comparison("least margin to the limit", "dB", worst.margin, min(margins, default=None)))
    return tuple(found)
