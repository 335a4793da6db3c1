"""All networks for one job, with and without a filter, in the order in which they suit it.

By the book, in this order: no part is beyond building; limit and margin are kept; the trough dip is small; what is
missing of the limit, in steps; the power lost in tank and filter, in steps; how much is of extreme value or current;
how many parts there are. Only the winner is settled.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.designs.filtering import fitted, line_levels, suppression, wants_filter
from rfstage.designs.settings import Settings
from rfstage.designs.textbook import Fitted, by_the_book
from rfstage.errors import ImpossibleError, RfstageError
from rfstage.filters.choose import Filter
from rfstage.harmonics import WAVEFORM_ORDERS, trough_dip
from rfstage.ladder import Branch, Ladder
from rfstage.matching.tank import PartStress, stresses, tank_efficiency
from rfstage.quantity import show
from rfstage.tankfields import AUTO, NETWORKS

SHORT_STEP = 3.0  # dB: networks that miss the limit by less than this apart are alike
LOSS_STEP = 0.02  # of the power: the same for what tank and filter lose
DIPS = (0.10, 0.20, 0.50, 1.0)  # trough dips: the first costs 7 % of power, the second 18 %
# What makes a part extreme, and what puts it beyond building; common practice, no source
LEADS = 10.0 * 5e-9  # H: a coil, and the reactance of a capacitor, should be ten times a lead of 5 nH
STRAPS = {"coil": 5e-9, "trap": 5e-9, "coupled": 15e-9}  # H: less can't be made of a strap, or of a turn that couples
SHORTEST_LEAD = 2.0 * 1e-9  # H: a capacitor of less reactance than that is its leads
SMALLEST_CAPACITOR = (5e-12, 1e-12)  # F, below which strays decide
LARGEST_COIL = 300e-6  # H
LARGEST_CURRENT = (15.0, 30.0)  # A rms


class Extreme(NamedTuple):
    """What is extreme of a part: its name, in words, and whether that is beyond building."""

    part: str
    words: str
    beyond: bool


class Candidate(NamedTuple):
    """One network, alone or with a filter, by the book.

    ``fitted`` is None where the network was refused, and ``refused`` says why. ``margin`` [dB] is the least against
    the limit, None without one; ``missed`` how much of limit and margin is missing [dB], 0 where both are kept;
    ``trough_dip`` and ``efficiency`` of tank and filter [-]; ``extremes`` in words; ``parts`` of tank and filter.
    """

    network: str
    filter: Filter | None
    fitted: Fitted | None
    refused: str = ""
    margin: float | None = None
    missed: float = 0.0
    trough_dip: float = 0.0
    efficiency: float = 0.0
    extremes: tuple[Extreme, ...] = ()
    parts: int = 0
    allowed: bool = True

    @property
    def grade(self) -> tuple[float, ...]:
        """What comes first: whether it can be built, whether limit and margin are kept, how deep the trough dips."""
        return (_parts_of(self.extremes, beyond=True), self.missed > 0, sum(self.trough_dip > dip for dip in DIPS))

    def key(self, best: Candidate) -> tuple[float, ...]:
        """Return what the ranking goes by, least first; ``best`` has the least missed and lost of the same grade."""
        return (
            *self.grade,
            (self.missed - best.missed) // SHORT_STEP,
            (best.efficiency - self.efficiency) // LOSS_STEP,
            _parts_of(self.extremes),
            self.parts,
            round(self.trough_dip, 3) + 0.0,
        )

    @property
    def name(self) -> str:
        """Network and filter in words."""
        if self.filter is None:
            return self.network
        return f"{self.network} + {self.filter.kind} {self.filter.order}"


class Ranking(NamedTuple):
    """All candidates, best first, refused ones last; ``chosen`` is the place of the one that is designed."""

    candidates: tuple[Candidate, ...]
    chosen: int

    @property
    def winner(self) -> Candidate:
        """The candidate that is designed."""
        return self.candidates[self.chosen]

    @property
    def allowed(self) -> list[Fitted]:
        """What may be designed, best first: no filter where none was asked for."""
        return [c.fitted for c in self.candidates if c.fitted and c.allowed]

    def of(self, made: Fitted) -> Candidate:
        """Return what is known of one that may be designed."""
        return next(c for c in self.candidates if c.fitted is made)

    def settled(self, made: Fitted, failed: Sequence[str]) -> Ranking:
        """Return the ranking with ``made`` chosen, since the steady state of those before it was not good enough.

        ``failed`` says why of each of them, in order.
        """
        places = [k for k, c in enumerate(self.candidates) if c.fitted and c.allowed]
        found = list(self.candidates)
        for place, said in zip(places, failed, strict=False):
            found[place] = found[place]._replace(fitted=None, refused=_plain(said, found[place].network))
        chosen = next(k for k, c in enumerate(self.candidates) if c.fitted is made)
        found[chosen] = self.candidates[chosen]
        return Ranking(tuple(found), chosen)

    @property
    def reason(self) -> str:
        """Why the winner is first, against the next that could have been."""
        others = [k for k, c in enumerate(self.candidates) if k > self.chosen and c.fitted and c.allowed]
        if not others:
            return "the only one that does it"
        fit = [c for c in self.candidates if c.fitted]  # refused ones stand last
        keys = keys_of(fit)
        first, second = self.winner, self.candidates[others[0]]
        pairs = zip(keys[self.chosen], keys[others[0]], strict=True)
        place = next((k for k, (a, b) in enumerate(pairs) if a != b), -1)
        if place < 0:
            return f"as good as {second.name}"
        words = (
            f"{_many(first.extremes, True)} beyond building, against {_many(second.extremes, True)} of {second.name}",
            f"it keeps limit and margin, and {second.name} does not",
            f"trough dip {first.trough_dip:.2f}, against {second.trough_dip:.2f} of {second.name}",
            f"{first.missed:.1f} dB short of limit and margin, against {second.missed:.1f} dB of {second.name}",
            f"{100 * first.efficiency:.1f} % efficient, against {100 * second.efficiency:.1f} % of {second.name}",
            f"{_many(first.extremes)} with a value or current that is extreme, against {_many(second.extremes)} of "
            f"{second.name}",
            f"{first.parts} parts, against {second.parts} of {second.name}",
            f"trough dip {first.trough_dip:.3f}, against {second.trough_dip:.3f} of {second.name}",
        )
        return words[place]


def keys_of(candidates: Sequence[Candidate]) -> list[tuple[float, ...]]:
    """Return the key of each candidate among all of them."""
    best: dict[tuple[float, ...], Candidate] = {}
    for c in candidates:
        known = best.setdefault(c.grade, c)
        best[c.grade] = known._replace(
            missed=min(known.missed, c.missed), efficiency=max(known.efficiency, c.efficiency)
        )
    return [c.key(best[c.grade]) for c in candidates]


def _many(extremes: Sequence[Extreme], beyond: bool = False) -> str:
    number = _parts_of(extremes, beyond)
    return f"{number or 'no'} part{'' if number == 1 else 's'}"


def _parts_of(extremes: Sequence[Extreme], beyond: bool = False) -> int:
    """Return how many parts are extreme, or beyond building."""
    return len({extreme.part for extreme in extremes if extreme.beyond or not beyond})


def rank(settings: Settings, coefficients: NDArray[np.float64]) -> Ranking:
    """Return every network for a job, best first.

    Raises
    ------
    ImpossibleError
        If none does it, with what a pi lacks.
    """
    found: list[Candidate] = []
    for network in NETWORKS:
        found += _tried(settings, coefficients, network)
    fit = [c for c in found if c.fitted]
    keys = keys_of(fit)
    made = [fit[k] for k in sorted(range(len(fit)), key=keys.__getitem__)]
    chosen = next((k for k, c in enumerate(made) if c.allowed), None)
    if chosen is None:
        said = next(c for c in found if c.refused and c.network in ("pi", "pi + filter"))
        raise ImpossibleError(f"no network does it; {said.name}: {said.refused} (--network says what another lacks)")
    return Ranking((*made, *(c for c in found if not c.fitted)), chosen)


def _tried(settings: Settings, coefficients: NDArray[np.float64], network: str) -> list[Candidate]:
    """Return a network alone, and with a filter where the limit or the job asks for one."""
    own = replace(settings, request=settings.request._replace(network=network))
    try:
        alone = Fitted(own, *by_the_book(own, coefficients), None)
    except RfstageError as error:
        return [Candidate(network, None, None, _plain(str(error), network))]
    forced = settings.job.filter not in (None, AUTO) and wants_filter(settings)
    first = measured(alone, coefficients)
    if not forced and not first.missed:
        return [first]
    found = [first._replace(allowed=not wants_filter(settings))]
    try:
        behind = fitted(own, coefficients, alone.circuit, alone.point, always=not forced)
    except RfstageError as error:
        return [*found, Candidate(f"{network} + filter", None, None, _plain(str(error), network))]
    return [*found, measured(behind, coefficients)._replace(allowed=wants_filter(settings))]


def _plain(said: str, network: str) -> str:
    return said.removeprefix(f"network {network}: ")


def measured(made: Fitted, coefficients: NDArray[np.float64]) -> Candidate:
    """Return what the ranking knows of a circuit."""
    settings, circuit, point = made.settings, made.circuit, made.point
    job, load = settings.job, settings.load_impedance
    own = (*circuit.tank, *circuit.filter)
    borne = stresses(circuit.branches, load, job.carrier, point.fundamental_current)
    needed = suppression(settings)
    worst = float(line_levels(settings, circuit, point, coefficients).max())
    return Candidate(
        network=settings.request.network,
        filter=made.filter,
        fitted=made,
        margin=None if needed is None or math.isinf(worst) else settings.margin - needed - worst,
        missed=0.0 if needed is None else max(0.0, worst + needed),
        trough_dip=trough_dip(
            Ladder(circuit.branches),
            settings.load,
            carrier=job.carrier,
            coefficients=coefficients[: WAVEFORM_ORDERS + 1],
            peak_current=point.peak_current,
            swing=point.swing,
        ),
        efficiency=tank_efficiency(circuit.branches, load, job.carrier),
        extremes=tuple(word for part in borne[-len(own) :] for word in _extreme(part, job.carrier)),
        # two windings, or a coil and a capacitor; a tapped coil is one
        parts=sum(2 if branch.kind in ("trap", "coupled") and not branch.tap else 1 for branch in own),
    )


def _extreme(part: PartStress, carrier: float) -> list[Extreme]:
    branch, omega, found = part.branch, 2 * math.pi * carrier, []

    def note(words: str, beyond: bool) -> None:
        found.append(Extreme(branch.name, f"{branch.name} {words}", beyond))

    coils = {"coil": ("value",), "coupled": ("value", "second"), "trap": ("value",)}.get(branch.kind, ())
    for attribute in coils:
        value = float(getattr(branch, attribute))
        if value < LEADS:
            note(f"of {show(value, 'H')}: leads decide", value < STRAPS[branch.kind])
        elif value > LARGEST_COIL:
            note(f"of {show(value, 'H')}: a large coil", False)
    capacitance = _capacitance(branch)
    if capacitance is not None:
        reactance = 1 / (omega * capacitance)
        if reactance < omega * LEADS:
            note(f"of {show(reactance, 'ohm')}: leads decide", reactance < omega * SHORTEST_LEAD)
        elif capacitance < SMALLEST_CAPACITOR[0]:
            note(f"of {show(capacitance, 'F')}: strays decide", capacitance < SMALLEST_CAPACITOR[1])
    current = max(part.rms_current or 0.0, part.far_current or 0.0)
    if current > LARGEST_CURRENT[0]:
        note(f"carries {show(current, 'A')}", current > LARGEST_CURRENT[1])
    return found


def _capacitance(branch: Branch) -> float | None:
    if branch.kind == "trap":
        return float(branch.second)
    return float(branch.value) if branch.kind == "capacitor" else None
