"""The value of one suspect that explains readings best: found on its column, then between stages settled about it.

The cost of a value is the sum of squared departures, in meter errors, and of its implausibility.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.retuning.explored import FINE, Explored
from rfstage.retuning.reading import Reading

SPREAD = 0.3  # of the logarithm of a factor, in the plausibility
TABLE_ERROR = 0.01  # relative: what a column is off between its points where the device comes to its knee, a corner
APART = 6.0  # cost between two groups: chi-squared of two degrees of freedom at 95 %
NEAR = 0.006  # logarithm of a factor, to either side: settled afresh for the last word
MOVES = 4

Array = NDArray[np.float64]


class Fit(NamedTuple):
    """A suspect at its best value: logarithm of its factor, misfit [meter errors], cost, and the misfit at factor 1.

    Cost and misfits are infinite where it explains nothing at all.
    """

    suspect: str
    log: float
    misfit: float
    cost: float
    as_built: float


def implausibility(log: Array | float) -> Array:
    """Return the cost of a factor by itself: 2·ln(1 + (ln factor/0.3)²)."""
    return np.asarray(2 * np.log1p((np.asarray(log) / SPREAD) ** 2), dtype=np.float64)


def explain(explored: Explored, suspect: str, readings: Sequence[Reading], meter_error: float) -> list[Fit]:
    """Return the best value of a suspect by its columns, and what explains the readings too beyond worse values.

    A tank that is off tune the one way or the other may show the meters the same: then one part has two values.
    """
    rows = [
        (explored.column(reading, suspect).along(row), value) for reading in readings for row, value in _read(reading)
    ]
    square = _square(rows, meter_error)
    if not np.isfinite(square).any():
        return [Fit(suspect, 0.0, math.inf, math.inf, math.inf)]
    as_built = math.sqrt(float(square[FINE.size // 2]) / len(rows))
    cost = square + implausibility(FINE)
    best = int(np.argmin(cost))
    places = [best, *_beyond(cost, best, 1), *_beyond(cost, best, -1)]
    return [_bottom(suspect, FINE, cost, k, len(rows), as_built) for k in places]


def _beyond(cost: Array, best: int, step: int) -> list[int]:
    """Return where the cost is least on one side of the best, behind a rise of `APART` above it; none at an end."""
    side = cost[best::step]
    with np.errstate(invalid="ignore"):
        behind = np.isfinite(side) & (np.maximum.accumulate(side) >= side + APART)
    if not behind.any():
        return []
    k = int(np.argmin(np.where(behind, side, math.inf)))
    return [best + step * k] if k + 1 < side.size and math.isfinite(side[k + 1]) else []


def refined(fit: Fit, explored: Explored, readings: Sequence[Reading], meter_error: float) -> Fit:
    """Return the fit again from three stages settled around it; as it was where they don't settle."""
    x, offsets = fit.log, np.linspace(-1, 1, 201)
    for _ in range(MOVES):
        at = x + NEAR * np.array([-1.0, 0.0, 1.0])
        rows = []
        for reading in readings:
            near = explored.settled_at(reading, fit.suspect, at)
            for row, value in _read(reading):
                low, middle, high = near[row]
                curve = middle + offsets * ((high - low) / 2 + offsets * ((high + low) / 2 - middle))
                rows.append((np.asarray(curve, dtype=np.float64), value))
        square = _square(rows, meter_error)
        if not np.isfinite(square).all():
            return fit
        found = _best(fit.suspect, x + NEAR * offsets, square, len(rows), fit.as_built)
        if abs(found.log - x) < 0.99 * NEAR:
            return found
        x = found.log
    return found


def _read(reading: Reading) -> list[tuple[int, float]]:
    """Return what a reading has, as row of a column and value."""
    rows = ((0, reading.dc_current), (1, reading.output_power), (2, reading.found_at))
    return [(row, value) for row, value in rows if value is not None]


def _square(rows: Sequence[tuple[Array, float]], meter_error: float) -> Array:
    total = sum(((curve - math.log(value)) / meter_error) ** 2 for curve, value in rows)
    return np.where(np.isfinite(total), total, math.inf)


def _best(suspect: str, x: Array, square: Array, count: int, as_built: float) -> Fit:
    cost = square + implausibility(x)
    return _bottom(suspect, x, cost, int(np.argmin(cost)), count, as_built)


def _bottom(suspect: str, x: Array, cost: Array, k: int, count: int, as_built: float) -> Fit:
    at, least = _vertex(x, cost, k)
    left = max(0.0, least - float(implausibility(at)))
    return Fit(suspect, at, math.sqrt(left / count), least, as_built)


def _vertex(x: Array, y: Array, k: int) -> tuple[float, float]:
    """Return the bottom of a parabola through a least figure and its neighbours, never below zero."""
    if not (0 < k < x.size - 1 and np.isfinite(y[k - 1 : k + 2]).all()):
        return float(x[k]), float(y[k])
    left, right = (y[k] - y[k - 1]) / (x[k] - x[k - 1]), (y[k + 1] - y[k]) / (x[k + 1] - x[k])
    curvature = (right - left) / (x[k + 1] - x[k - 1])
    if curvature <= 0:
        return float(x[k]), float(y[k])
    slope = left + curvature * (x[k] - x[k - 1])
    shift = -slope / (2 * curvature)
    return float(x[k] + shift), max(0.0, float(y[k] + slope * shift + curvature * shift**2))
