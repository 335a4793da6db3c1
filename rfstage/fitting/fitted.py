"""A design with the parts that can be had: chosen, put in the ladder with losses and strays, retrimmed, settled again.

::

    design ──► capacitors of preferred values, coils of whole turns ──► ladder with their Qs, leads, self-capacitance
                                                                           │  trimmer and coil length, until the
                                                                           ▼  impedance at the device is back
                                              settled again, beside the ideal: power, heat, harmonics, limit
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace
from functools import partial
from typing import NamedTuple

from rfstage.designs.design import Design
from rfstage.designs.judging import in_line
from rfstage.errors import ConvergenceError, ImpossibleError, RfstageError
from rfstage.fitting.capacitors import Bought
from rfstage.fitting.choosing import (
    Chosen,
    as_settled,
    burdens,
    chosen_parts,
    real,
)
from rfstage.fitting.coils import Winding
from rfstage.fitting.request import PartsRequest, request_of
from rfstage.fitting.retrimming import retrimmed
from rfstage.fitting.rings import Ring, choke_ring, transformer_ring
from rfstage.ladder import Branch, Ladder
from rfstage.parts.stress import Burden
from rfstage.quantity import show
from rfstage.stage import BLOCKING as BLOCKER
from rfstage.stage import CHOKE, PartData, Stage
from rfstage.steady import SteadyState, settle

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
    that were set for it; ``rings`` are the choke and a transformer on ring cores;
    ``state`` is the steady state and ``line`` that on the resistive line, None where the stage
    did not settle, which ``trouble`` then says.
    """

    bought: tuple[Bought, ...]
    wound: tuple[Winding, ...]
    rings: tuple[Ring, ...]
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


def fit_parts(made: Design, asked: PartsRequest | None = None) -> Fitting:
    """Return the parts bin's version of a design.

    Parameters
    ----------
    made : Design
        With or without its steady state; with one, the stresses are those of all orders and dc.
    asked : PartsRequest or None
        Formers, wire, series and margins; None takes them from the design's job.

    Raises
    ------
    ImpossibleError
        If no trimmer and coil length bring the impedance at the device back.

    Examples
    --------
    >>> from rfstage.designs.design import design
    >>> from rfstage.job import Job
    >>> made = design(Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8, network="pi"))
    >>> fitting = fit_parts(made)
    >>> [f"{1e9 * value:.3g} nF" for value in fitting.bought[1].values], fitting.moved
    (['8.2 nF'], ('C2', 'L1'))
    """
    stage, carrier = made.stage, made.job.carrier
    asked = asked or request_of(made.job)
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
            trimmed = retrimmed(made, before, branches, chosen, (capacitor, coil), borne, asked)
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
    rings = () if state is None else tuple(_rings(state, branches, ideal))
    if trims[1] in ideal:
        ideal[trims[1]] += f"; it is to be {_size(next(b for b in branches if b.name == trims[1]))}"
    return Fitting(
        bought=tuple(chosen.bought.values()),
        wound=tuple(chosen.wound.values()),
        rings=rings,
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


def _rings(state: SteadyState, branches: Sequence[Branch], ideal: dict[str, str]) -> Iterator[Ring]:
    """Yield choke and transformer on ring cores; what can't be had is said in ``ideal``."""
    jobs: dict[str, Callable[[], Ring]] = {CHOKE: partial(choke_ring, CHOKE, state.stage.supply.choke, state)}
    for branch in branches:
        if branch.kind == "transformer":
            jobs[branch.name] = partial(transformer_ring, branch, state)
    for name, job in jobs.items():
        ideal.pop(name, None)
        try:
            yield job()
        except ImpossibleError as error:
            ideal[name] = str(error)


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
