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
from rfstage.fitting.capacitors import Bought
from rfstage.fitting.choosing import Chosen, burdens, chosen_parts, real
from rfstage.fitting.coils import Winding
from rfstage.fitting.request import PartsRequest
from rfstage.ladder import Branch, Ladder
from rfstage.matching.exact import Free, close
from rfstage.quantity import show
from rfstage.stage import BLOCKING as BLOCKER
from rfstage.stage import PartData, Stage
from rfstage.steady import SteadyState, settle

RETRIMS = 6
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
            trimmed = _retrimmed(made, before, branches, chosen, (capacitor, coil))
        except RfstageError as error:
            trouble.append(str(error))
            continue
        return _compared(made, before, *trimmed, seen, (capacitor, coil))
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
    made: Design, before: Sequence[Branch], branches: Sequence[Branch], chosen: Chosen, trims: tuple[str, str]
) -> tuple[tuple[Branch, ...], Chosen]:
    """Return the branches and parts with trimmer and coil set so that the device sees what it is to see.

    Squeezing a coil changes its Q and self-capacitance, so it is done again with those until the rest is small.
    """
    wanted, load, carrier = complex(made.point.load_resistance), made.settings.load_impedance, made.job.carrier
    places = {branch.name: k for k, branch in enumerate(branches)}
    capacitor, coil = (places[name] for name in trims)
    tied = ("second",) if branches[coil].kind == "coupled" else ()
    free = (Free(capacitor), Free(coil, "value", tied))
    now = tuple(branches)
    for _ in range(RETRIMS):
        closed = close(before, now, wanted=wanted, load=load, carrier=carrier, free=free)
        chosen = _set(chosen, trims, float(closed[capacitor].value), float(closed[coil].value), wound=not tied)
        now = tuple(real(branch, chosen) for branch in closed)
        if abs(complex(Ladder((*before, *now)).impedance(carrier, load)) / wanted - 1) <= NEAR:
            return now, chosen
    raise ConvergenceError(f"{trims[0]} and {trims[1]} do not settle against each other")


def _set(chosen: Chosen, trims: tuple[str, str], capacitance: float, inductance: float, *, wound: bool) -> Chosen:
    """Return the parts with the trimmed capacitor at a capacitance [F] and the coil at an inductance [H]."""
    name, coil = trims
    bought, windings = dict(chosen.bought), dict(chosen.wound)
    if name in bought:
        low, high = bought[name].reach or (0.0, 0.0)
        if not low <= capacitance <= high:
            raise ImpossibleError(
                f"{name} would have to be {show(capacitance, 'F')}, and its trimmer reaches from {show(low, 'F')} to "
                f"{show(high, 'F')}"
            )
        bought[name] = bought[name].retrimmed(capacitance)
    if inductance <= 0:
        raise ConvergenceError(f"{coil} would have to be negative")
    if coil in windings and wound:
        windings[coil] = windings[coil].retrimmed(inductance)
    return chosen._replace(bought=bought, wound=windings)


def _compared(
    made: Design,
    before: Sequence[Branch],
    branches: tuple[Branch, ...],
    chosen: Chosen,
    seen: complex,
    trims: tuple[str, str],
) -> Fitting:
    stage = replace(made.stage, branches=branches, part_data=_part_data(chosen))
    state = line = None
    trouble = ""
    try:
        state = settle(stage, listed=made.settings.highest_order, start=made.settled)
        line = in_line(stage, state, made.settings.line)
    except ConvergenceError as error:
        trouble = str(error)
    return Fitting(
        bought=tuple(chosen.bought.values()),
        wound=tuple(chosen.wound.values()),
        ideal=tuple(chosen.ideal.items()),
        impedance=seen,
        retrimmed=complex(Ladder((*before, *branches)).impedance(made.job.carrier, made.settings.load_impedance)),
        moved=trims,
        stage=stage,
        state=state,
        line=line,
        compared=_comparisons(made, state, line),
        trouble=trouble,
    )


def _part_data(chosen: Chosen) -> dict[str, PartData]:
    found = {}
    for name, bought in chosen.bought.items():
        rating = bought.stresses[0].voltage_rating
        found[name] = PartData(bought.reach, None if bought.reach else TOLERANCE, None, rating)
    for name, winding in chosen.wound.items():
        coil = winding.coil
        found[name] = PartData(
            winding=(
                ("turns", coil.turns),
                ("diameter", coil.diameter),
                ("length", coil.length),
                ("wire", coil.wire_diameter),
            )
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
