"""Values of one part, or of two, that show the device a wanted impedance: free, or within what can be set.

The measure is the mismatch |Z − W|/|Z + W*| of the impedance Z that the device sees against the wanted W: 0 is
exact, and its square the share of the power that a generator of impedance W* would lose.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.device import PARALLEL, PUSH_PULL
from rfstage.ladder import Branch, Ladder
from rfstage.load import Load
from rfstage.stage import Stage
from rfstage.steady.pair import shared_node

FELT = 0.05  # change of the impedance over that of a part, relative: a part below it tunes nothing
WIDEST = 24.0  # times the value now, either way, that is looked at
SINGLE_POINTS, PAIR_POINTS = 481, 129
CLOSER = 5  # times that a minimum is looked at more closely
EXACT = 1e-9  # mismatch below which the wanted impedance is met

Array = NDArray[np.float64]


class Fit(NamedTuple):
    """Values of the parts in the order they were named, and the mismatch that is left [-]."""

    values: tuple[float, ...]
    mismatch: float


@dataclass(frozen=True, slots=True)
class Seen:
    """What the device sees at one frequency [Hz] while parts take other values.

    ``feed`` stands before the ``branches``; ``wanted`` [ohm] is what it should see.
    """

    feed: tuple[Branch, ...]
    branches: tuple[Branch, ...]
    load: Load
    frequency: float
    wanted: complex

    def impedance(self, values: dict[str, Array | float]) -> NDArray[np.complex128]:
        """Return the impedance [ohm] with parts at other values; arrays broadcast."""
        parts = [replace(b, value=values[b.name]) if b.name in values else b for b in self.branches]
        seen = Ladder((*self.feed, *parts)).impedance(self.frequency, self.load)
        return np.asarray(seen, dtype=np.complex128)

    def mismatch(self, values: dict[str, Array | float]) -> Array:
        """Return the mismatch [-] with parts at other values; arrays broadcast."""
        z = self.impedance(values)
        return np.asarray(np.abs(z - self.wanted) / np.abs(z + self.wanted.conjugate()), dtype=np.float64)

    @property
    def ladder(self) -> Ladder:
        """All of it, from the device's current generator to the load."""
        return Ladder((*self.feed, *self.branches))

    def value(self, name: str) -> float:
        """Return what a part has now."""
        return next(float(b.value) for b in self.branches if b.name == name)


def seen_by_device(stage: Stage, wanted: complex | None = None) -> Seen:
    """Return what the device of a stage sees at its carrier; what it sees now is wanted unless said otherwise [ohm].

    Of a pair it is what both see together: at the common electrode, or between the two of a push-pull pair.
    """
    feed = stage.feed
    if stage.device.pair == PARALLEL:
        feed = shared_node(stage).feed
    elif stage.device.pair == PUSH_PULL:
        feed = tuple(_from_side_to_side(branch) for branch in feed)
    if wanted is None:
        wanted = complex(Ladder((*feed, *stage.branches)).impedance(stage.carrier, stage.load))
    return Seen(feed, stage.branches, stage.load, stage.carrier, wanted)


def _from_side_to_side(branch: Branch) -> Branch:
    """Return two like parts from electrode to ground as the one that they are between the electrodes."""
    resistance = branch.series_resistance
    value = branch.value / 2 if branch.kind == "capacitor" else branch.value * 2
    return replace(branch, value=value, series_resistance=None if resistance is None else 2 * resistance)


def tuning_parts(seen: Seen) -> tuple[str, ...]:
    """Return the names of the coils and capacitors that tune: those whose value the device feels."""
    found = []
    z = complex(seen.impedance({}))
    for branch in seen.branches:
        if branch.kind in ("coil", "capacitor"):
            step = 1e-4
            moved = complex(seen.impedance({branch.name: float(branch.value) * (1 + step)}))
            if abs(moved / z - 1) / step >= FELT:
                found.append(branch.name)
    return tuple(found)


def fit_single(seen: Seen, name: str, reach: tuple[float, float] | None = None) -> Fit:
    """Return the value of one part that leaves the least mismatch, free or from one end of ``reach`` to the other."""
    now = seen.value(name)
    low, high = reach or (now / WIDEST, now * WIDEST)
    points = np.geomspace(low, high, SINGLE_POINTS)
    for _ in range(CLOSER):
        mismatch = seen.mismatch({name: points})
        k = int(np.argmin(mismatch))
        best = Fit((float(points[k]),), float(mismatch[k]))
        points = np.geomspace(points[max(k - 1, 0)], points[min(k + 1, points.size - 1)], 41)
    return best


def fit_pair(seen: Seen, names: tuple[str, str], reach: Sequence[tuple[float, float]] | None = None) -> list[Fit]:
    """Return values of two parts that meet the wanted impedance, or within ``reach`` the one best fit.

    Free, there may be several, nearest to the present values first, or none: then the list is empty.
    """
    nows = [seen.value(name) for name in names]
    ends = reach or [(now / WIDEST, now * WIDEST) for now in nows]
    one, two = (np.geomspace(low, high, PAIR_POINTS) for low, high in ends)
    mismatch = seen.mismatch({names[0]: one[:, None], names[1]: two[None, :]})
    if reach is not None:
        return [_closer(seen, names, one, two, mismatch)]
    found: list[Fit] = []
    for i, k in _low_spots(mismatch):
        fit = _newton(seen, names, (float(one[i]), float(two[k])))
        known = any(np.allclose(fit.values, other.values, rtol=1e-6, atol=0) for other in found) if fit else True
        if fit is not None and not known:
            found.append(fit)
    return sorted(found, key=lambda fit: sum(abs(math.log(v / now)) for v, now in zip(fit.values, nows, strict=True)))


def _low_spots(mismatch: Array) -> list[tuple[int, int]]:
    """Return the places of a table that are lower than their neighbours, at most eight, the lowest first."""
    edged = np.pad(mismatch, 1, constant_values=math.inf)
    inner = edged[1:-1, 1:-1]
    low = np.ones(inner.shape, dtype=bool)
    for down in (0, 1, 2):
        for across in (0, 1, 2):
            low &= inner <= edged[down : down + inner.shape[0], across : across + inner.shape[1]]
    places = [(int(i), int(k)) for i, k in np.argwhere(low)]
    return sorted(places, key=lambda place: float(mismatch[place]))[:8]


def _closer(seen: Seen, names: tuple[str, str], one: Array, two: Array, mismatch: Array) -> Fit:
    """Return the least mismatch of a table, looked at more closely around it."""
    for _ in range(CLOSER):
        i, k = divmod(int(np.argmin(mismatch)), mismatch.shape[1])
        best = Fit((float(one[i]), float(two[k])), float(mismatch[i, k]))
        one = np.geomspace(one[max(i - 2, 0)], one[min(i + 2, one.size - 1)], 33)
        two = np.geomspace(two[max(k - 2, 0)], two[min(k + 2, two.size - 1)], 33)
        mismatch = seen.mismatch({names[0]: one[:, None], names[1]: two[None, :]})
    return best


def _newton(seen: Seen, names: tuple[str, str], start: tuple[float, float]) -> Fit | None:
    """Return the values that meet the wanted impedance from a start, or None if there are none near it."""
    x = np.log(start)
    step = 1e-6

    def miss(at: Array) -> tuple[Array, float]:
        values = np.exp(at)
        z = complex(seen.impedance(dict(zip(names, values.tolist(), strict=True)))) / seen.wanted - 1
        return np.array([z.real, z.imag]), abs(z)

    r, size = miss(x)
    for _ in range(40):
        if size < EXACT:
            values = np.exp(x).tolist()
            return Fit((values[0], values[1]), float(seen.mismatch(dict(zip(names, values, strict=True)))))
        jacobian = np.array([(miss(x + step * unit)[0] - r) / step for unit in np.eye(2)]).T
        if not np.isfinite(jacobian).all() or abs(np.linalg.det(jacobian)) < 1e-14:
            return None
        move = np.linalg.solve(jacobian, -r)
        move *= min(1.0, 0.3 / float(np.abs(move).max()))
        for _ in range(12):
            r_new, size_new = miss(x + move)
            if size_new < size:
                break
            move /= 2
        else:
            return None
        x, r, size = x + move, r_new, size_new
    return None
