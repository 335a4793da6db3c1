"""What the search tries: kinds and orders by number of parts, and the ripples and cutoffs of each as samples."""

from __future__ import annotations

import math
from functools import lru_cache
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.filters import elliptic
from rfstage.filters.lowpass import FORMS
from rfstage.filters.prototypes import (
    Prototype,
    butterworth,
    butterworth_attenuation,
    chebyshev,
    chebyshev_attenuation,
)

BUTTERWORTH, CHEBYSHEV, ELLIPTIC, CHEBYSHEV_TRAP = KINDS = ("butterworth", "chebyshev", "elliptic", "chebyshev-trap")
HIGHEST_ORDER = 11
RIPPLES = (0.01, 0.05, 0.1, 0.2, 0.5)  # dB
_CUTOFFS = np.linspace(1.15, 1.8, 11)  # over the carrier
_BUTTERWORTH_RETURN = 99.0  # of the carrier's power passed on, over that returned: 20 dB return loss
_FINER = 12  # steps from one cutoff to the next
_BESIDE_RESONANCE = 1 + 1e-9  # a trap without any loss is tuned so much off the harmonic

Array = NDArray[np.float64]


class Samples(NamedTuple):
    """Ripples [dB], cutoffs over the carrier, and whether an elliptic filter has its nearest trap on ``first``.

    ``first`` is the lowest order that needs attenuation; without a trap there its stop band begins there.
    Each of shape (samples,).
    """

    ripple: Array
    cutoff: Array
    trapped: NDArray[np.bool_]

    def where(self, chosen: Any) -> Samples:
        """Return the chosen samples, by index or mask."""
        return Samples(*(field[chosen] for field in self))


class Candidate(NamedTuple):
    """One filter to try: number of parts, a trap being two; kind; order; form."""

    parts: int
    kind: str
    order: int
    form: str


def orders_of(kind: str) -> range:
    """Return the orders of a kind that end in the line's own resistance."""
    return range(2, HIGHEST_ORDER + 1) if kind == BUTTERWORTH else elliptic.ORDERS


def candidates(kind: str | None, order: int | None) -> list[Candidate]:
    """Return what is to be tried, fewest parts first; None leaves a kind or an order free."""
    every = [
        Candidate(n + {CHEBYSHEV_TRAP: 1, ELLIPTIC: n // 2}.get(k, 0), k, n, form)
        for k in KINDS
        if kind in (None, k)
        for n in orders_of(k)
        if order in (None, n)
        for form in FORMS
    ]
    return sorted(every, key=lambda candidate: candidate.parts)


@lru_cache(maxsize=64)
def grid(kind: str, order: int, first: int) -> tuple[Samples, Prototype]:
    """Return all samples of a kind and order that come out in parts above nothing, and their prototype."""
    return realised(kind, order, first, _every_sample(kind, order))


def finer(kind: str, order: int, sample: Samples) -> Samples:
    """Return samples from one of the grid (its fields plain numbers) towards the next cutoff above it."""
    cutoffs = _every_sample(kind, order).cutoff
    above = cutoffs[cutoffs > sample.cutoff]
    upwards = np.linspace(sample.cutoff, above.min() if above.size else sample.cutoff, _FINER, endpoint=False)
    return Samples(*(np.full(_FINER, field) for field in sample))._replace(cutoff=upwards)


@lru_cache(maxsize=64)
def _every_sample(kind: str, order: int) -> Samples:
    if kind == BUTTERWORTH:
        least = _BUTTERWORTH_RETURN ** (1 / (2 * order))
        cutoffs = np.linspace(least, 1.5 * least, _CUTOFFS.size)
        return Samples(np.zeros(cutoffs.size), cutoffs, np.zeros(cutoffs.size, dtype=np.bool_))
    trapped = (False, True) if kind == ELLIPTIC else (False,)
    mesh = np.meshgrid(np.array(RIPPLES), _CUTOFFS, np.array(trapped), indexing="ij")
    return Samples(*(axis.reshape(-1) for axis in mesh))


def realised(kind: str, order: int, first: int, samples: Samples) -> tuple[Samples, Prototype]:
    """Return those samples that come out in parts above nothing, and their prototype."""
    if kind == BUTTERWORTH:
        return samples, butterworth(order)
    if kind != ELLIPTIC:
        return samples, chebyshev(order, ripple=samples.ripple)
    made = elliptic.ladders(order, ripple=samples.ripple, edge=_edges(order, samples, first))
    samples = samples.where(made.realised)
    return samples, made.where(made.realised).prototype(samples.ripple)


def line_attenuation(kind: str, order: int, *, first: int, harmonic: int, orders: int) -> Array:
    """Return what the grid's samples attenuate in a resistive line without losses, over the carrier [dB].

    Of shape (samples, orders), orders from 2 up. At the harmonic of a trap it is infinite.
    """
    samples = _every_sample(kind, order)
    frequency = np.arange(1, orders + 2) / samples.cutoff[:, None]
    if kind == BUTTERWORTH:
        loss = butterworth_attenuation(frequency, order=order)
    elif kind == ELLIPTIC:
        edge = _edges(order, samples, first)[:, None]
        loss = elliptic.elliptic_attenuation(frequency, order=order, ripple=samples.ripple[:, None], edge=edge)
    else:
        loss = chebyshev_attenuation(frequency, order=order, ripple=samples.ripple[:, None])
        if kind == CHEBYSHEV_TRAP and harmonic <= orders + 1:
            loss[:, harmonic - 1] = math.inf
    return np.asarray(loss[:, 1:] - loss[:, :1])


def _edges(order: int, samples: Samples, first: int) -> Array:
    """Return where the elliptic samples' stop bands begin, over the cutoff."""
    edge = first / samples.cutoff
    edge[samples.trapped] = elliptic.edge_for_trap(order, _BESIDE_RESONANCE * edge[samples.trapped])
    return np.asarray(edge)
