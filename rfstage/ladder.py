"""The ladder between device and load, walked branch by branch.

::

    device ──┬──── series ────┬── through ── load             V, I at the load: V = 1, I = 1/Z
             │                │     ││                        series branch:  V += I·Z
           shunt            shunt   ││                        shunt branch:   I += V·Y
             │                │     ││                        through branch: V, I by its two-port
                                                              at the device:  Zin = V/I, V_load/I = 1/I

One walk serves everything: impedance, transfer, and the current, voltage and loss of every branch. It is
written in plain arithmetic, so that the same lines serve one Python number and arrays of samples times
frequencies; arrays of many samples are walked in blocks that fit the processor's cache.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from operator import attrgetter
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from rfstage.branch import Branch, Complex, Real
from rfstage.kinds import THROUGH
from rfstage.load import Load

__all__ = ["BLOCK_ELEMENTS", "SAMPLED", "Branch", "BranchState", "Ladder", "Walk"]

BLOCK_ELEMENTS = 8_000  # complex numbers in one array: 125 KiB, under what allocators map afresh each time


class BranchState(NamedTuple):
    """What one branch carries for 1 A peak from the device: peak current [A] and loss [W].

    Each of shape (samples..., frequencies...). Of a through branch the current is that of the device's side, and
    ``seen`` the impedance there [ohm], load and all; of others ``seen`` is None.
    """

    current: Complex
    loss: Real
    seen: Complex | None = None

    def drop(self, branch: Branch, frequency: Real) -> Any:
        """Return the impedance [ohm] that makes the current the voltage across, at the device's side if through."""
        return branch.impedance(frequency) if self.seen is None else self.seen


class Walk(NamedTuple):
    """One walk of a ladder, for 1 A peak from the device.

    ``impedance`` at the device [ohm], ``transimpedance`` V_load/I_device [ohm], ``load_impedance`` [ohm],
    and one `BranchState` a branch, in the ladder's order.
    """

    impedance: Complex
    transimpedance: Complex
    load_impedance: Complex
    branches: tuple[BranchState, ...]


@dataclass(frozen=True, slots=True)
class Ladder:
    """An ordered tuple of branches from device to load.

    Parameters
    ----------
    branches : sequence of Branch
        Their values may be arrays of samples, of shapes that broadcast together.

    Examples
    --------
    >>> c1 = Branch("C1", "shunt", "capacitor", 545.67e-12)
    >>> l1 = Branch("L1", "series", "coil", 4.5473e-6)
    >>> c2 = Branch("C2", "shunt", "capacitor", 2273.6e-12)
    >>> z = Ladder([c1, l1, c2]).impedance(3.5e6, 50)
    >>> round(z.real), round(abs(z.imag))
    (1000, 0)
    """

    branches: Sequence[Branch]

    def impedance(self, frequency: ArrayLike, load: Load | ArrayLike) -> Any:
        """Return the impedance at the device [ohm], shape (samples..., frequencies...).

        Parameters
        ----------
        frequency : array_like, shape (frequencies...)
            Above 0 [Hz].
        load : Load or array_like
            A load, or its impedance [ohm] in a shape that broadcasts against the result.
        """
        return self._blocks(frequency, load, lambda v, i, _z, _b: (v / i,))[0]

    def transimpedance(self, frequency: ArrayLike, load: Load | ArrayLike) -> Any:
        """Return V_load/I_device [ohm], shape (samples..., frequencies...); arguments as `impedance`."""
        return self._blocks(frequency, load, lambda _v, i, _z, _b: (1 / i,))[0]

    def transfer(self, frequency: ArrayLike, load: Load | ArrayLike) -> tuple[Any, Any]:
        """Return impedance and transimpedance from one walk; arguments as `impedance`."""
        z, h = self._blocks(frequency, load, lambda v, i, _z, _b: (v / i, 1 / i))
        return z, h

    def walk(self, frequency: ArrayLike, load: Load | ArrayLike) -> Walk:
        """Return everything: impedance, transimpedance, and current and loss of every branch.

        Arguments as `impedance`; arrays as described at `Walk`, for 1 A peak from the device.
        """
        values = self._blocks(frequency, load, self._everything, keep=True)
        seen = iter(values[3 + 2 * len(self.branches) :])
        states = tuple(
            BranchState(values[3 + 2 * k], values[4 + 2 * k], next(seen) if branch.place == THROUGH else None)
            for k, branch in enumerate(self.branches)
        )
        return Walk(values[0], values[1], values[2], states)

    def chain(self, frequency: ArrayLike) -> tuple[Any, Any, Any, Any]:
        """Return the chain (ABCD) terms of the two-port from device node to load.

        ``V_device = A·V_load + B·I_load`` and ``I_device = C·V_load + D·I_load``; frequency in Hz.
        """
        f: Any = float(frequency) if isinstance(frequency, float | int) else np.asarray(frequency, dtype=np.float64)
        a, c = _outwards(self.branches, f, 1 + 0j, 0j, None)
        b, d = _outwards(self.branches, f, 0j, 1 + 0j, None)
        if isinstance(f, float):
            return a, b, c, d
        full = np.broadcast_shapes(*(np.shape(x) for x in (a, b, c, d, f)))
        return tuple(np.broadcast_to(x, full) for x in (a, b, c, d))  # type: ignore[return-value]  # four, as said

    def _everything(self, v: Complex, i: Complex, load: Complex, steps: list[tuple[Any, ...]]) -> tuple[Any, ...]:
        unit = 1 / i
        half_square = _square(unit) / 2
        out = [v * unit, unit, load]
        for step in reversed(steps):
            out += [step[0] * unit, step[1] * half_square]
        return (*out, *(step[2] for step in reversed(steps) if len(step) > 2))

    def _blocks(
        self, frequency: ArrayLike, load: Load | ArrayLike, finish: Any, *, keep: bool = False
    ) -> tuple[Any, ...]:
        """Walk once, or block by block where samples times frequencies exceed what fits the cache."""
        shape = _sample_shape(self.branches)
        few = not shape or math.prod(shape) <= BLOCK_ELEMENTS
        plain = few and isinstance(frequency, float | int) and isinstance(load, complex | float | int)
        f: Any = float(frequency) if plain else np.asarray(frequency, dtype=np.float64)  # type: ignore[arg-type]  # plain: a number
        z: Any = load.impedance(f) if hasattr(load, "impedance") else load
        z = complex(z) if plain else np.asarray(z, dtype=np.complex128)
        points = 1 if plain else f.size
        if not shape or math.prod(shape) * points <= BLOCK_ELEMENTS:
            return _one_walk(self.branches, f, z, finish, keep)
        axes = len(shape)
        samples = math.prod(shape)
        z_rows = np.broadcast_to(z, shape + f.shape).reshape(samples, *f.shape) if z.ndim > f.ndim else None
        rows = max(1, BLOCK_ELEMENTS // points)
        flat = [_flat_samples(branch, shape) for branch in self.branches]
        out: list[Any] = []
        for start in range(0, samples, rows):
            part = slice(start, start + rows)
            block = [_take(branch, part) for branch in flat]
            results = _one_walk(block, f, z if z_rows is None else z_rows[part], finish, keep)
            if not out:
                out = [np.empty((samples, *f.shape), dtype=r.dtype) for r in results]
            for whole, piece in zip(out, results, strict=True):
                whole[part] = piece
        return tuple(o.reshape(shape + o.shape[1:]) for o in out) if axes != 1 else tuple(out)


def _one_walk(branches: Sequence[Branch], f: Any, z: Any, finish: Any, keep: bool) -> tuple[Any, ...]:
    steps: list[tuple[Any, ...]] | None = [] if keep else None
    v, i = _outwards(branches, f, 1 + 0j, 1 / z, steps)
    return finish(v, i, z, steps)  # type: ignore[no-any-return]  # a tuple, by every caller above


def _outwards(
    branches: Sequence[Branch], f: Any, v: Any, i: Any, steps: list[tuple[Any, ...]] | None
) -> tuple[Any, Any]:
    """Walk from load to device; ``steps`` collects each branch's current, |I|²·Re Z, and V/I if it is through."""
    for branch in reversed(branches):
        if branch.place == "series":
            z = branch.impedance(f)
            across = i * z
            if steps is not None:
                steps.append((i, _square(i) * z.real))
            v = v + across
        elif branch.place == THROUGH:
            ports = branch.ports(f)
            beyond = i
            v, i = ports.inwards(v, i)
            if steps is not None:
                resistances = (ports.own.real, ports.mutual.real, ports.far.real)
                steps.append((i, ports.weighed(i, beyond, resistances), v / i))
        else:
            y = branch.admittance(f)
            through = v * y
            if steps is not None:
                steps.append((through, _square(v) * y.real))
            i = i + through
    return v, i


def _square(x: Any) -> Any:
    """Return |x|²: the library's magnitude is quicker than the parts, or the conjugate, taken from memory apart."""
    return abs(x) ** 2


SAMPLED = (
    "value",
    "q",
    "series_resistance",
    "lead_inductance",
    "self_capacitance",
    "second",
    "second_q",
    "coupling",
)  # the numbers of a branch
_sampled_of = attrgetter(*SAMPLED)


def _sample_shape(branches: Sequence[Branch]) -> tuple[int, ...]:
    arrays = [a.shape for branch in branches for a in _sampled_of(branch) if isinstance(a, np.ndarray)]
    return np.broadcast_shapes(*arrays) if arrays else ()


def _flat_samples(branch: Branch, shape: tuple[int, ...]) -> Branch:
    arrays: dict[str, Any] = {
        name: np.broadcast_to(a, shape).reshape(-1)
        for name in SAMPLED
        if isinstance(a := getattr(branch, name), np.ndarray)
    }
    return replace(branch, **arrays) if arrays else branch


def _take(branch: Branch, part: slice) -> Branch:
    arrays: dict[str, Any] = {name: a[part] for name in SAMPLED if isinstance(a := getattr(branch, name), np.ndarray)}
    return replace(branch, **arrays) if arrays else branch
