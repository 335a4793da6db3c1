"""Trimmer, coil length, tap or link set so that the device sees its load resistance again, strays and all."""

from __future__ import annotations

from collections.abc import Sequence

from rfstage.designs.design import Design
from rfstage.errors import ConvergenceError, ImpossibleError, RfstageError
from rfstage.fitting.capacitors import TRIMMED, Bought, choose_capacitor
from rfstage.fitting.choosing import (
    Chosen,
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

RETRIMS = 12
CHOSEN_AGAIN = 3  # of these, in which a trimmer that is left near its end is chosen again
NEAR_END = 3.0  # % of the capacitance left to one side
PART_WAY = 0.7  # of the way to where a tap would be best, were the rest of the coil not to follow
CLOSEST_LINK = 0.9  # coupling that no link over another coil exceeds (common practice, no source)
NEAR = 1e-3  # of the load resistance: how near the impedance comes back


def retrimmed(
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
