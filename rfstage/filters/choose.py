"""The search for the least harmonic filter that does: fewest parts, least ripple, highest cutoff, least loss.

A filter stands between tank and line, and neither is a resistance to it at the harmonics. So what decides is
the caller's ``levels``, which walks the whole circuit with the filter in place; the attenuation in a resistive
line only leaves out what is hopeless. Every call of ``levels`` carries all ripples and cutoffs of one filter,
as arrays of samples.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import replace
from itertools import groupby
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from rfstage.errors import ImpossibleError, OutOfRangeError
from rfstage.filters.candidates import (
    BUTTERWORTH,
    CHEBYSHEV_TRAP,
    HIGHEST_ORDER,
    KINDS,
    Candidate,
    Samples,
    candidates,
    finer,
    grid,
    line_attenuation,
    orders_of,
    realised,
)
from rfstage.filters.lowpass import check_qs, line_response, low_pass, with_trap
from rfstage.filters.prototypes import Prototype
from rfstage.ladder import Branch
from rfstage.quantity import exact_text

# A tank is next to a reactance at the harmonics, and then a filter may do more than in a resistive line: 6 dB
# where its first arm alone counts, some more where that arm and the tank resonate. What lacks more is left out.
_HOPELESS = 20.0  # dB

Array = NDArray[np.float64]
Levels = Callable[[Sequence[Branch]], NDArray[np.float64]]


class Filter(NamedTuple):
    """A harmonic filter as chosen.

    ``ripple_db`` is 0 for Butterworth; ``cutoff`` [Hz] its 3 dB point, otherwise the edge of the ripple; ``form``
    ``"capacitor-first"`` or ``"coil-first"``; ``parts`` from tank to line. Insertion and return loss [dB] are at
    the carrier between two line ``resistance``s [ohm], with the parts' losses. ``margins`` [dB] are what ``levels``
    said of orders 2 and up.
    """

    kind: str
    order: int
    ripple_db: float
    cutoff: float
    form: str
    parts: tuple[Branch, ...]
    resistance: float
    insertion_loss_db: float
    return_loss_db: float
    margins: tuple[float, ...]

    def attenuation(self, frequency: ArrayLike) -> Array:
        """Return the attenuation [dB] between two line resistances, losses and all, at frequencies [Hz]."""
        passed = line_response(self.parts, np.asarray(frequency, dtype=np.float64), resistance=self.resistance)[1]
        return np.asarray(-20 * np.log10(np.abs(passed)))


class _Short(NamedTuple):
    """How near a candidate came that does not do it: margin [dB], and where it is least."""

    margin: float
    candidate: Candidate
    ripple: float
    cutoff: float
    harmonic: int


class _Search(NamedTuple):
    carrier: float
    resistance: float
    coil_q: float
    capacitor_q: float
    harmonic: int
    numbers: tuple[int, int, int]
    first: int
    orders: int
    levels: Levels

    def parts(self, candidate: Candidate, samples: Samples, prototype: Prototype) -> tuple[Branch, ...]:
        """Return the branches of all samples."""
        branches = low_pass(
            prototype,
            form=candidate.form,
            cutoff=samples.cutoff * self.carrier,
            resistance=self.resistance,
            coil_q=self.coil_q,
            capacitor_q=self.capacitor_q,
            carrier=self.carrier,
            numbers=self.numbers,
        )
        if candidate.kind != CHEBYSHEV_TRAP:
            return branches
        name = f"W{self.numbers[2]}"
        return with_trap(
            branches, carrier=self.carrier, harmonic=self.harmonic, capacitor_q=self.capacitor_q, name=name
        )

    def margins(self, branches: tuple[Branch, ...], samples: int) -> Array:
        margins = np.asarray(self.levels(branches), dtype=np.float64)
        if margins.shape != (samples, self.orders) or np.isnan(margins).any():
            raise OutOfRangeError(
                "levels", f"shape {margins.shape}", f"numbers of shape {(samples, self.orders)}: samples, orders"
            )
        return margins

    def attempt(self, candidate: Candidate) -> Filter | _Short | None:
        """Return the candidate's best filter, or by how much it falls short; None if it never comes out in parts."""
        samples, prototype = grid(candidate.kind, candidate.order, self.first)
        if not samples.cutoff.size:
            return None
        branches = self.parts(candidate, samples, prototype)
        margins = self.margins(branches, samples.cutoff.size)
        least = margins.min(axis=1)
        if least.max() < 0:
            nearest = int(least.argmax())
            sample = samples.where(nearest)
            harmonic = int(margins[nearest].argmin()) + 2
            return _Short(
                float(least[nearest]), candidate, float(sample.ripple), float(sample.cutoff) * self.carrier, harmonic
            )
        best = _best(samples, least)
        closer = finer(candidate.kind, candidate.order, samples.where(best))
        closer, prototype = realised(candidate.kind, candidate.order, self.first, closer)
        closer_branches = self.parts(candidate, closer, prototype)
        closer_margins = self.margins(closer_branches, closer.cutoff.size)
        if closer_margins.size and closer_margins.min(axis=1).max() >= 0:
            samples, branches, margins = closer, closer_branches, closer_margins
            best = _best(samples, margins.min(axis=1))
        return self.finished(candidate, samples.where(best), tuple(_one(b, best) for b in branches), margins[best])

    def finished(self, candidate: Candidate, sample: Samples, parts: tuple[Branch, ...], margins: Array) -> Filter:
        reflected, passed = line_response(parts, self.carrier, resistance=self.resistance)
        return Filter(
            kind=candidate.kind,
            order=candidate.order,
            ripple_db=float(sample.ripple),
            cutoff=float(sample.cutoff) * self.carrier,
            form=candidate.form,
            parts=parts,
            resistance=self.resistance,
            insertion_loss_db=-20 * math.log10(abs(passed)),
            return_loss_db=-20 * math.log10(abs(reflected)) if reflected else math.inf,
            margins=tuple(margins.tolist()),
        )


def choose_filter(
    needed: ArrayLike,
    levels: Levels,
    *,
    carrier: float,
    resistance: float,
    coil_q: float,
    capacitor_q: float,
    kind: str | None = None,
    order: int | None = None,
    harmonic: int = 2,
    numbers: tuple[int, int, int] = (1, 1, 1),
) -> Filter:
    """Return the harmonic filter with the fewest parts that meets every order, and of those the one of least loss.

    Parameters
    ----------
    needed : array_like, shape (orders,)
        Attenuation still needed [dB], relative to the carrier's, at orders 2, 3, …; minus infinity where none is.
    levels : callable
        Takes the filter's branches, whose values are arrays of shape (samples,), and returns the margins [dB] at
        orders 2, 3, … with these parts between tank and load, of shape (samples, orders). Not below 0 is met.
    carrier, resistance : float
        Hz, and of the line [ohm].
    coil_q, capacitor_q : float
        Of the parts [-], the coils' at the carrier; infinite is lossless.
    kind : str or None
        ``"butterworth"``, ``"chebyshev"``, ``"elliptic"``, ``"chebyshev-trap"``; None tries all.
    order : int or None
        The only one to try, up to 11; None tries all. Orders are odd but for Butterworth.
    harmonic : int
        The trap of ``"chebyshev-trap"`` resonates on so many times the carrier.
    numbers : tuple of int
        Of the first coil, capacitor and wave trap.

    Raises
    ------
    OutOfRangeError
        For a value outside its range.
    ImpossibleError
        If none does it, with the nearest and how much it lacks.

    Notes
    -----
    For each kind, form and order: the least ripple of 0.01, 0.05, 0.1, 0.2 and 0.5 dB, and with it the highest
    cutoff, to half a percent, from 1.15 to 1.8 times the carrier. Butterworth's is at least where the carrier's
    return loss is 20 dB without losses, and at most 1.5 times that. The stop band of an elliptic filter begins, or
    its nearest trap lies, on the lowest order that needs attenuation. Ladders whose parts must come out negative
    are passed over.

    Examples
    --------
    >>> def in_line(parts):
    ...     passed = line_response(parts, 7e6 * np.arange(1, 6), resistance=50.0)[1]
    ...     loss = -20 * np.log10(np.abs(passed))
    ...     return loss[:, 1:] - loss[:, :1] - 30.0
    >>> best = choose_filter([30.0] * 4, in_line, carrier=7e6, resistance=50.0, coil_q=150, capacitor_q=1000)
    >>> best.kind, best.order, best.form, min(best.margins) >= 0
    ('chebyshev', 5, 'capacitor-first', True)
    """
    wanted = _checked(needed, carrier=carrier, resistance=resistance, kind=kind, order=order, harmonic=harmonic)
    check_qs(coil_q, capacitor_q)
    lacking = np.flatnonzero(wanted > 0)
    first = int(lacking[0]) + 2 if lacking.size else 2
    search = _Search(carrier, resistance, coil_q, capacitor_q, harmonic, numbers, first, wanted.size, levels)
    nearest: _Short | None = None
    for _, alike in groupby(candidates(kind, order), key=lambda candidate: candidate.parts):
        found = []
        for candidate in alike:
            last = candidate.order in (HIGHEST_ORDER, order)
            if not last and _hopeless(search, candidate, wanted):
                continue
            outcome = search.attempt(candidate)
            if isinstance(outcome, Filter):
                found.append(outcome)
            elif outcome is not None and (nearest is None or outcome.margin > nearest.margin):
                nearest = outcome
        if found:
            return min(found, key=lambda made: made.insertion_loss_db)
    raise ImpossibleError(_none_does(nearest, search, kind, order))


def _checked(
    needed: ArrayLike, *, carrier: float, resistance: float, kind: str | None, order: int | None, harmonic: int
) -> Array:
    wanted = np.asarray(needed, dtype=np.float64)
    if wanted.ndim != 1 or not wanted.size or np.isnan(wanted).any() or np.isposinf(wanted).any():
        raise OutOfRangeError("needed", needed, "one number of dB an order, from order 2")
    for name, value, unit in (("carrier", carrier, "Hz"), ("resistance", resistance, "ohm")):
        if not 0 < value < math.inf:
            raise OutOfRangeError(name, f"{value} {unit}", f"above 0 {unit}, and finite")
    if kind is not None and kind not in KINDS:
        raise OutOfRangeError("kind", repr(kind), " or ".join(KINDS))
    if isinstance(harmonic, bool) or harmonic not in range(2, 1000):
        raise OutOfRangeError("harmonic", harmonic, "a whole number from 2")
    if order is not None and (
        isinstance(order, bool) or not any(order in orders_of(k) for k in KINDS if kind in (None, k))
    ):
        odd = kind not in (None, BUTTERWORTH)
        need = "3, 5, 7, 9 or 11" if odd else f"a whole number from 2 to {HIGHEST_ORDER}"
        raise OutOfRangeError("order", order, need, "of an even order only Butterworth fits the line" if odd else "")
    return wanted


def _hopeless(search: _Search, candidate: Candidate, wanted: Array) -> bool:
    """Return whether every sample lacks far too much in a resistive line, even without losses."""
    loss = line_attenuation(
        candidate.kind, candidate.order, first=search.first, harmonic=search.harmonic, orders=search.orders
    )
    return bool((loss - wanted).min(axis=1).max() < -_HOPELESS)


def _best(samples: Samples, least: Array) -> int:
    """Return the sample that meets every order with the least ripple, then the highest cutoff, then most margin."""
    keys = (least, samples.cutoff, -samples.ripple, least >= 0)
    return int(np.lexsort(keys)[-1])


def _one(branch: Branch, index: int) -> Branch:
    arrays: dict[str, Any] = {
        name: float(a[index]) for name in ("value", "second") if isinstance(a := getattr(branch, name), np.ndarray)
    }
    return replace(branch, **arrays)


def _none_does(nearest: _Short | None, search: _Search, kind: str | None, order: int | None) -> str:
    what = (
        f"no {kind or 'harmonic'} filter of order {order}"
        if order
        else f"no {kind or 'harmonic'} filter up to order 11"
    )
    if nearest is None:
        return f"{what} comes out in parts above nothing; leave order or kind free"
    candidate = nearest.candidate
    ripple = f"{nearest.ripple:g} dB ripple, " if nearest.ripple else ""
    losses = "lossless coils" if math.isinf(search.coil_q) else f"coils of Q {search.coil_q:.4g}"
    helps = [] if math.isinf(search.coil_q) else [f"coils of a higher Q than {search.coil_q:.4g}"]
    helps += ["leaving the order free"] if order else []
    helps += ["another kind"] if kind else []
    return (
        f"{what} meets the limit with {losses}: the nearest, {candidate.kind} of order {candidate.order} "
        f"({candidate.form}, {ripple}cutoff {exact_text(float(f'{nearest.cutoff:.4g}'), 'Hz')}), is "
        f"{-nearest.margin:.3g} dB short at harmonic {nearest.harmonic}; what helps: "
        f"{', '.join([*helps, 'another tank network or loaded Q'])}"
    )
