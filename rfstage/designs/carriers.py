"""One tank for several carriers: settings and coil taps of each, and which loads its variable parts can match.

::

    jobs, one a carrier ──► one network for all ──► design of each ──► settings, taps, loaded Q, margin
                                                         │
                       variable parts (least, most) ─────┴──► where strays decide the Q; map of loads matched
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

from rfstage.designs.design import Design, design
from rfstage.designs.settings import with_defaults
from rfstage.errors import ConvergenceError, ImpossibleError, InputError, RfstageError
from rfstage.job import Job, Variable
from rfstage.kinds import unit
from rfstage.ladder import Branch, Ladder
from rfstage.matching.exact import Free, close
from rfstage.matching.networks import solve_network
from rfstage.pulse import pulse_coefficients
from rfstage.quantity import show
from rfstage.tankfields import AUTO

VSWRS = (1.0, 1.5, 2.0, 3.0)
PHASES = tuple(range(0, 360, 30))  # degrees of the reflection coefficient
_ROUNDS = 40  # of the search for the Q that a capacitor at its end leaves


class Setting(NamedTuple):
    """One part at one carrier: its value [F or H], a coil's share of the turns of the largest, and its range.

    ``turns`` is None for a capacitor; ``within`` is None where the part is not variable.
    """

    part: str
    unit: str
    value: float
    turns: float | None
    variable: Variable | None
    within: bool | None


class Matched(NamedTuple):
    """Whether a load [ohm] of a VSWR and phase [deg] is matched, with the coil where it is or its tap moved.

    ``settings`` [F or H] by part, where a match was found at all, in or out of the ranges; ``change`` says in words
    what it would take.
    """

    vswr: float
    phase: float
    load: complex
    matched: bool
    tap_moved: bool
    settings: tuple[tuple[str, float], ...]
    change: str


class Tuned(NamedTuple):
    """One carrier: its design, settings, whether a variable part at its end decides the Q, and the loads tried."""

    design: Design
    settings: tuple[Setting, ...]
    decided_by: str
    loads: tuple[Matched, ...]


def design_carriers(jobs: Sequence[Job], textbook: bool = False) -> tuple[Tuned, ...]:
    """Design one tank for several carriers.

    Parameters
    ----------
    jobs : sequence of Job
        Alike but for their carriers, which rise.
    textbook : bool
        As in `rfstage.design`.

    Returns
    -------
    tuple of Tuned
        One for each carrier. With variable parts the loads of VSWR up to 3 and any phase are tried too.

    Raises
    ------
    RfstageError
        If a carrier can't be designed with the network that serves the others, or the variable parts are not those
        of the network.

    Examples
    --------
    >>> job = Job(carrier=3.65e6, power=100.0, conduction_angle=120.0, supply=50.0, network="pi")
    >>> low, high = design_carriers([job, replace(job, carrier=7.1e6)], textbook=True)
    >>> [f"{s.part} {1e9 * s.value:.2f} nF" for s in low.settings if s.unit == "F"]
    ['C1 13.98 nF', 'C2 6.54 nF']
    >>> [round(s.turns, 2) for tuned in (low, high) for s in tuned.settings if s.unit == "H"]
    [1.0, 0.72]
    """
    designs = _of_one_network(jobs, textbook)
    known = {part.branch.name for part in designs[0].tank.parts}
    for name, _, _ in jobs[0].variable:
        if name not in known:
            raise InputError(
                f"tank.variable: {name!r} is no part of network {designs[0].tank.network}; it has "
                f"{', '.join(b.name for b in _tank(designs[0]))}"
            )
    decided = [_at_its_end(made, textbook) for made in designs]
    largest: dict[str, float] = {}
    for made, _ in decided:
        for branch in _tank(made):
            if unit(branch.kind) == "H":
                largest[branch.name] = max(largest.get(branch.name, 0.0), float(branch.value))
    return tuple(Tuned(made, _settings(made, largest), by, _loads(made)) for made, by in decided)


def _of_one_network(jobs: Sequence[Job], textbook: bool) -> list[Design]:
    """Return the designs of all carriers with the first network that serves them all."""
    first = jobs[0]
    if first.network not in (None, AUTO):
        return [design(job, textbook) for job in jobs]
    from rfstage.designs.ranking import rank

    settings = with_defaults(first)
    ranking = rank(settings, pulse_coefficients(settings.half_angle, highest_order=24, exponent=settings.exponent))
    failed = []
    for network in dict.fromkeys(made.settings.request.network for made in ranking.allowed):
        try:
            return [design(replace(job, network=network), textbook) for job in jobs]
        except RfstageError as error:
            failed.append(f"{network}: {error}")
    best = f"the best for {show(first.carrier, 'Hz', 5)}, {failed[0]}"
    raise ImpossibleError(f"no network serves all the carriers; {best}")


def _tank(made: Design) -> list[Branch]:
    """Return the parts of the network itself."""
    own = len(made.filter.parts) if made.filter else 0
    coupler = 2 if made.job.transformer is not None else 1
    parts = [p.branch for p in made.tank.parts if p.branch.origin != "device"][1 + coupler :]
    return parts[: len(parts) - own]


def _at_its_end(made: Design, textbook: bool) -> tuple[Design, str]:
    """Return a design whose input capacitor can be set: at the end of its range where it wanted to be beyond.

    Then that end, and not the wish, decides the Q, where the network works at all with it.
    """
    first = _tank(made)[0]
    variable = next((v for v in made.job.variable if v.name == first.name), None)
    if variable is None or first.kind != "capacitor" or first.place != "shunt":
        return made, ""
    value = float(first.value)
    end = min(max(value, variable.least), variable.most)
    if end == value:
        return made, ""
    omega, trial = 2 * math.pi * made.job.carrier, made
    for _ in range(_ROUNDS):
        across = end + made.settings.output_capacitance
        q = trial.point.load_resistance * omega * across
        try:
            trial = design(replace(made.job, network=made.tank.network, loaded_q=None, input_q=q), textbook)
        except ImpossibleError:
            return made, ""
        if abs(float(_tank(trial)[0].value) / end - 1) <= 1e-6:
            return trial, first.name
    raise ConvergenceError(f"{first.name} at {show(end, 'F')} does not settle against the load resistance")


def _settings(made: Design, largest: dict[str, float]) -> tuple[Setting, ...]:
    ranges = {v.name: v for v in made.job.variable}
    found = []
    for branch in _tank(made):
        value, of = float(branch.value), unit(branch.kind)
        turns = math.sqrt(value / largest[branch.name]) if of == "H" else None
        variable = ranges.get(branch.name)
        within = None if variable is None else variable.holds(value)
        found.append(Setting(branch.name, of, value, turns, variable, within))
    return tuple(found)


def _loads(made: Design) -> tuple[Matched, ...]:
    """Return what the variable parts can match around the resistive line at the carrier."""
    variable = made.job.variable
    if not variable:
        return ()
    found = []
    for vswr in VSWRS:
        for phase in PHASES if vswr > 1 else PHASES[:1]:
            size = (vswr - 1) / (vswr + 1)
            reflected = cmath.rect(size, math.radians(phase))
            load = made.settings.line.at_carrier.real * (1 + reflected) / (1 - reflected)
            found.append(_matched(made, vswr, float(phase), load))
    return tuple(found)


def _matched(made: Design, vswr: float, phase: float, load: complex) -> Matched:
    own = _tank(made)
    ranges = {v.name: v for v in made.job.variable}
    free = tuple(Free(k) for k, b in enumerate(own) if b.name in ranges)
    best: tuple[tuple[str, float], ...] = ()
    for more in (None, 0.0, 3.0, 6.0):
        moved = more is not None
        try:
            parts = _set(made, own, free, load) if more is None else _moved(made, own, load, more)
        except (ConvergenceError, ImpossibleError):
            continue
        values = tuple((b.name, float(b.value)) for b in parts if b.name in ranges or (moved and b.kind == "coil"))
        positive = all(float(b.value) > 0 for b in parts)
        if positive and all(ranges[name].holds(value) for name, value in values if name in ranges):
            return Matched(vswr, phase, load, True, moved, values, "")
        if positive:
            best = values
    return Matched(vswr, phase, load, False, False, best, _change(best, ranges))


def _set(made: Design, own: Sequence[Branch], free: Sequence[Free], load: complex) -> Sequence[Branch]:
    """Return the network with its two variable parts set for a load [ohm], or three at the loaded Q it has."""
    if len(free) not in (2, 3):
        raise InputError(
            f"tank.variable: got {len(free)} parts of network {made.tank.network}; two can be set for a load, or three "
            "at a loaded Q"
        )
    return close(
        _before(made),
        own,
        wanted=complex(made.point.load_resistance),
        load=_through_filter(made, load),
        carrier=made.job.carrier,
        free=free,
        asked_loaded_q=made.tank.loaded_q if len(free) == 3 else None,
    )


def _moved(made: Design, own: Sequence[Branch], load: complex, more: float) -> Sequence[Branch]:
    """Return the network at its loaded Q and some ``more`` of it for a load [ohm], whatever coil that takes."""
    if any(b.kind == "coil" and b.name in {v.name for v in made.job.variable} for b in own):
        raise ImpossibleError("the coil is variable already")
    q = made.tank.loaded_q + more if made.settings.request.network not in ("l", "l-high-pass") else None
    return solve_network(
        made.settings.request._replace(loaded_q=q, input_q=None),
        feed=_before(made),
        wanted=complex(made.point.load_resistance),
        load=_through_filter(made, load),
        carrier=made.job.carrier,
    )


def _before(made: Design) -> tuple[Branch, ...]:
    """Return what stands before the network."""
    branches = [part.branch for part in made.tank.parts]
    first = _tank(made)[0].name
    return tuple(branches[: [b.name for b in branches].index(first)])


def _through_filter(made: Design, load: complex) -> complex:
    return complex(Ladder(made.settings.filter).impedance(made.job.carrier, load))


def _change(values: tuple[tuple[str, float], ...], ranges: dict[str, Variable]) -> str:
    """Return what a range would have to be, in words."""
    if not values:
        return "no setting of these parts matches it"
    words = []
    for name, value in values:
        given = ranges.get(name)
        if given is None or given.holds(value):
            continue
        of = "F" if name.startswith("C") else "H"
        if value > given.most:
            add = f"{show(value - given.most, of)} more than its {show(given.most, of)}"
            words.append(f"{name} wants {show(value, of)}, {add}")
        else:
            words.append(f"{name} wants {show(value, of)}, below its least of {show(given.least, of)}")
    return "; ".join(words)
