r"""Sums of evenly spaced samples against harmonics of a frequency, block by block.

::

    symbol  name          meaning
    ------  ------------  ---------------------------------------------------------------
    τ       time          of a sample from the middle of the record [s]
    P0(n)   plain[n]      Σ y·exp(−jnωτ)          P1(n)  timed[n]  Σ τ·y·exp(−jnωτ)
    S0(m)   powers[0, m]  Σ exp(jmωτ)             S1, S2 with τ and τ² under the sum

A block of samples is one row of a matrix product with a template of one block's length, since the samples are evenly
spaced; only the template's phase at the block's start differs. That is what makes ten million samples cost less than
a few Fourier transforms of them, in memory that does not grow with the record.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

BLOCK = 1024  # samples of one template
CHUNK = 128 * BLOCK  # samples handled at once: a megabyte


class Grid(NamedTuple):
    """Evenly spaced samples: how many, and their interval [s]."""

    samples: int
    interval: float

    @property
    def start(self) -> float:
        """Time of the first sample from the middle of the record [s]."""
        return -(self.samples - 1) / 2 * self.interval

    def rows(self) -> Iterator[tuple[slice, int, Array]]:
        """Yield pieces of the record: its samples, the block length in it, and the blocks' first times [s]."""
        whole = self.samples // BLOCK * BLOCK
        for first in range(0, whole, CHUNK):
            part = slice(first, min(first + CHUNK, whole))
            yield part, BLOCK, self.start + np.arange(part.start, part.stop, BLOCK, dtype=np.float64) * self.interval
        if whole < self.samples:
            yield slice(whole, self.samples), self.samples - whole, np.array([self.start + whole * self.interval])


class Sums(NamedTuple):
    """Projections of a record on harmonics 0 to H, and sums of the harmonics themselves, 0 to 2H.

    ``plain`` and ``timed`` have shape (H + 1,), ``powers`` (3, 2H + 1); ``square`` is the sum of squared samples.
    """

    plain: Complex
    timed: Complex
    powers: Complex
    square: float


def taken(samples: NDArray[np.generic], part: slice) -> Array:
    """Return some samples as contiguous floats; the record itself may lie in a file."""
    return np.ascontiguousarray(samples[part], dtype=np.float64)


def template(omega: float, orders: int, length: int, interval: float) -> Complex:
    """Return exp(−jnωu) of one block's own time u, shape (length, orders + 1); omega in rad/s."""
    phase = omega * interval * np.arange(length)
    return np.exp(-1j * np.outer(phase, np.arange(orders + 1)))


def harmonic_sums(samples: NDArray[np.generic], interval: float, omega: float, orders: int) -> Sums:
    """Return the sums of a record for harmonics 0 to ``orders`` of ``omega`` [rad/s]; the interval in s."""
    grid = Grid(samples.size, interval)
    n = np.arange(orders + 1)
    m = np.arange(2 * orders + 1)
    plain = np.zeros(orders + 1, dtype=np.complex128)
    timed = np.zeros_like(plain)
    powers = np.zeros((3, 2 * orders + 1), dtype=np.complex128)
    square = 0.0
    made: dict[int, tuple[Array, Complex]] = {}
    for part, length, times in grid.rows():
        if length not in made:
            made[length] = _templates(omega, orders, length, interval)
        columns, own = made[length]
        values = taken(samples, part)
        square += float(values @ values)
        found = (values.reshape(-1, length) @ columns).reshape(len(times), 2, 2, orders + 1)
        p0, p1 = found[:, 0, 0] + 1j * found[:, 0, 1], found[:, 1, 0] + 1j * found[:, 1, 1]
        turn = np.exp(-1j * omega * np.outer(times, n))
        plain += (turn * p0).sum(axis=0)
        timed += (turn * (times[:, np.newaxis] * p0 + p1)).sum(axis=0)
        turn = np.exp(1j * omega * np.outer(times, m))
        still, first, second = (times**k @ turn for k in range(3))
        powers[0] += still * own[0]
        powers[1] += first * own[0] + still * own[1]
        powers[2] += second * own[0] + 2 * first * own[1] + still * own[2]
    return Sums(plain, timed, powers, square)


def _templates(omega: float, orders: int, length: int, interval: float) -> tuple[Array, Complex]:
    """Return the real columns of one block's templates, plain and timed, and the block's own sums of powers."""
    u = interval * np.arange(length)
    waves = template(omega, orders, length, interval)
    timed = u[:, np.newaxis] * waves
    columns = np.concatenate([waves.real, waves.imag, timed.real, timed.imag], axis=1)
    doubled = template(omega, 2 * orders, length, interval).conj()
    own = np.stack([u**k @ doubled for k in range(3)])
    return np.ascontiguousarray(columns), own


class Residual(NamedTuple):
    """What the harmonics leave of a record: sum of squares, and its first samples."""

    square: float
    beginning: Array


def residual(
    samples: NDArray[np.generic], interval: float, omega: float, phasors: Complex, *, keep: int = CHUNK
) -> Residual:
    """Return what is left of a record when harmonics are taken out.

    ``phasors`` of shape (H + 1,) are peak values at the middle of the record, entry 0 the mean; ``omega`` in rad/s,
    the interval in s; the first ``keep`` samples of what is left are kept.
    """
    grid = Grid(samples.size, interval)
    orders = phasors.size - 1
    n = np.arange(orders + 1)
    left = np.empty(min(keep, samples.size))
    square = 0.0
    made: dict[int, Array] = {}
    for part, length, times in grid.rows():
        if length not in made:
            waves = template(omega, orders, length, interval)
            made[length] = np.ascontiguousarray(np.concatenate([waves.real, waves.imag], axis=1).T)
        turned = phasors * np.exp(1j * omega * np.outer(times, n))
        model = np.concatenate([turned.real, turned.imag], axis=1) @ made[length]
        rest = taken(samples, part) - model.reshape(-1)
        square += float(rest @ rest)
        if part.start < left.size:
            end = min(part.stop, left.size)
            left[part.start : end] = rest[: end - part.start]
    return Residual(square, left)


def block_phasors(samples: NDArray[np.generic], interval: float, omega: float) -> tuple[Array, Complex]:
    """Return the middle time [s] and the sum Σ y·exp(−jωτ) of every whole block of a record."""
    grid = Grid(samples.size, interval)
    wave = template(omega, 1, BLOCK, interval)[:, 1]
    columns = np.ascontiguousarray(np.stack([wave.real, wave.imag], axis=1))
    middles, found = [], []
    for part, length, times in grid.rows():
        if length == BLOCK:
            sums = taken(samples, part).reshape(-1, BLOCK) @ columns
            found.append((sums[:, 0] + 1j * sums[:, 1]) * np.exp(-1j * omega * times))
            middles.append(times + (BLOCK - 1) / 2 * interval)
    return np.concatenate(middles), np.concatenate(found)
