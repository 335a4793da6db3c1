"""One tank for several carriers: settings and coil taps of each, and which loads its variable parts can match.

::

    jobs, one a carrier ──► one network for all ──► design of each ──► settings, taps, loaded Q, margin
                                                         │
                       variable parts (least, most) ─────┴──► where strays decide the Q; map of loads matched
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

from rfstage.designs.design import Design, design
from rfstage.designs.loads import Matched, loads_of, tank_of
from rfstage.designs.lowresistance import with_network
from rfstage.designs.settings import with_defaults
from rfstage.errors import ConvergenceError, ImpossibleError, InputError, RfstageError
from rfstage.fields import plain
from rfstage.harmonics import WAVEFORM_ORDERS
from rfstage.job import Job, Variable
from rfstage.kinds import unit
from rfstage.pulse import pulse_coefficients
from rfstage.quantity import show
from rfstage.stage import BLOCKING
from rfstage.tankfields import AUTO

_ROUNDS = 40  # of the search for the Q that a capacitor at its end leaves
_AT_THE_END = 5e-10  # relative: within what a range holds


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
    _check_variable(designs[0])
    decided = [_at_its_end(made, textbook) for made in designs]
    largest: dict[str, float] = {}
    for made, _ in decided:
        for branch in tank_of(made):
            if unit(branch.kind) == "H":
                largest[branch.name] = max(largest.get(branch.name, 0.0), float(branch.value))
    return tuple(Tuned(made, _settings(made, largest), by, loads_of(made)) for made, by in decided)


def _check_variable(made: Design) -> None:
    """Raise `InputError` unless the variable parts are two or three of the network, each of one value."""
    own, variable, network = tank_of(made), made.job.variable, made.tank.network
    single = [b.name for b in own if b.kind in ("coil", "capacitor")]
    problems = [
        f"tank.variable: {plain(v.name)!r} "
        + (
            f"is no part of network {network}; it has {', '.join(b.name for b in own)}"
            if v.name not in {b.name for b in own}
            else f"of network {network} is a coupled pair, which has no one value to set"
        )
        for v in variable
        if v.name not in single
    ]
    if not problems and variable and len(variable) not in (2, 3):
        parts = "1 part" if len(variable) == 1 else f"{len(variable)} parts"
        problems.append(
            f"tank.variable: got {parts} of network {network}; a load is matched with two, or with three and a choice "
            "of loaded Q"
        )
    if problems:
        raise InputError(*problems)


def _of_one_network(jobs: Sequence[Job], textbook: bool) -> list[Design]:
    """Return the designs of all carriers with the first network that serves them all."""
    first = jobs[0]
    if first.network not in (None, AUTO):
        return _alike(jobs, textbook)
    from rfstage.designs.ranking import rank

    settings = with_defaults(first)
    orders = max(WAVEFORM_ORDERS, settings.highest_order)
    coefficients = pulse_coefficients(settings.half_angle, highest_order=orders, exponent=settings.exponent)
    ranking = rank(settings, coefficients)
    failed = []
    for network in dict.fromkeys(made.settings.request.network for made in ranking.allowed):
        try:
            return _alike([with_network(job, network) for job in jobs], textbook)
        except RfstageError as error:
            failed.append(f"{network}: {error}")
    best = f"the best for {show(first.carrier, 'Hz', 5)}, {failed[0]}"
    raise ImpossibleError(f"no network serves all the carriers; {best}")


def _alike(jobs: Sequence[Job], textbook: bool) -> list[Design]:
    """Return the designs of all carriers with the choke and the blocking capacitor of the lowest."""
    first = design(jobs[0], textbook)
    blocking = next(float(b.value) for b in first.stage.branches if b.name == BLOCKING)
    choke = first.stage.supply.choke
    return [first, *(design(replace(job, choke=choke, blocking=blocking), textbook) for job in jobs[1:])]


def _at_its_end(made: Design, textbook: bool) -> tuple[Design, str]:
    """Return a design whose input capacitor can be set: at the end of its range where it wanted to be beyond.

    Then that end, and not the wish, decides the Q, where the network works at all with it.
    """
    first = tank_of(made)[0]
    variable = next((v for v in made.job.variable if v.name == first.name), None)
    if variable is None or first.kind != "capacitor" or first.place != "shunt" or made.job.tap is not None:
        return made, ""
    value = float(first.value)
    end = min(max(value, variable.least), variable.most)
    if variable.holds(value):
        return made, ""
    good, good_miss = made.tank.loaded_q, math.log(value / end)
    slope, step = 1.0, -good_miss  # of the capacitor's logarithm over that of the loaded Q
    for _ in range(_ROUNDS):
        q = good * math.exp(step)
        try:
            trial = design(replace(made.job, network=made.tank.network, loaded_q=q, input_q=None), textbook)
        except (ConvergenceError, ImpossibleError):
            step /= 2
            continue
        miss = math.log(float(tank_of(trial)[0].value) / end)
        if abs(miss) <= _AT_THE_END:
            return trial, first.name
        if miss != good_miss:
            slope = (miss - good_miss) / step
        good, good_miss, step = q, miss, -miss / slope if slope else -miss
    return made, ""


def _settings(made: Design, largest: dict[str, float]) -> tuple[Setting, ...]:
    ranges = {v.name: v for v in made.job.variable}
    found = []
    for branch in tank_of(made):
        value, of = float(branch.value), unit(branch.kind)
        turns = math.sqrt(value / largest[branch.name]) if of == "H" else None
        variable = ranges.get(branch.name)
        within = None if variable is None else variable.holds(value)
        found.append(Setting(branch.name, of, value, turns, variable, within))
        if branch.kind == "coupled":
            second = "below tap" if branch.tap else "link"
            found.append(Setting(f"{branch.name} {second}", of, float(branch.second), None, None, None))
    return tuple(found)
