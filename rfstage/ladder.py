"""The ladder between device and load, walked branch by branch.

::

    device ──┬──── series ────┬──── series ──── load          V, I at the load: V = 1, I = 1/Z
             │                │                               series branch:  V += I·Z
           shunt            shunt                             shunt branch:   I += V·Y
             │                │                               at the device:  Zin = V/I, V_load/I = 1/I

    symbol  name                unit        losses
    ------  ------------------  ------      ------------------------------------------------------
    L       value of a coil     H           Q at the carrier: R = ω₀L/Q · √(f/f₀)
    C       value of a capacitor F          Q: R = 1/(ωCQ) at every frequency (constant loss tangent)
    R       series_resistance   ohm         either may state a constant series resistance instead

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
from numpy.typing import ArrayLike, NDArray

from rfstage.errors import OutOfRangeError
from rfstage.load import Load

Real = float | NDArray[np.float64]
Complex = complex | NDArray[np.complex128]

BLOCK_ELEMENTS = 8_000  # complex numbers in one array: 125 KiB, under what allocators map afresh each time


@dataclass(frozen=True, slots=True)
class Branch:
    """One part of the ladder.

    Parameters
    ----------
    name : str
        Such as ``"C1"``.
    place : str
        ``"series"`` or ``"shunt"``.
    kind : str
        ``"coil"``, ``"capacitor"`` or ``"resistor"``.
    value : float or ndarray, shape (samples...)
        Inductance [H], capacitance [F] or resistance [ohm].
    q : float, ndarray or None
        Quality factor [-] at ``q_frequency``; None is lossless unless ``series_resistance`` is given.
    q_frequency : float or None
        Where a coil's Q holds [Hz]: the carrier. A capacitor's Q is the same at all frequencies.
    series_resistance : float, ndarray or None
        Constant series resistance [ohm], instead of a Q.
    lead_inductance : float or ndarray
        In series with a capacitor or resistor [H].
    self_capacitance : float or ndarray
        Across a coil [F].
    origin : str
        ``"part"``, ``"device"`` or ``"stray"``.
    """

    name: str
    place: str
    kind: str
    value: Real
    q: Real | None = None
    q_frequency: float | None = None
    series_resistance: Real | None = None
    lead_inductance: Real = 0.0
    self_capacitance: Real = 0.0
    origin: str = "part"

    def impedance(self, frequency: Real) -> Any:
        """Return the branch's impedance [ohm]; sample axes come before those of ``frequency`` [Hz]."""
        omega = 2 * math.pi * frequency
        value = _lift(self.value, frequency)
        if self.kind == "coil":
            z = value * (1j * omega + self._coil_loss(frequency))
            if self.series_resistance is not None:
                z = z + _lift(self.series_resistance, frequency)
            if _present(self.self_capacitance):
                z = z / (1 + 1j * omega * _lift(self.self_capacitance, frequency) * z)
            return z
        if self.kind == "capacitor":
            loss = 0.0 if self.q is None else 1 / _lift(self.q, frequency)
            z = (loss - 1j) / (omega * value)
        else:
            z = value + 0j
        if self.series_resistance is not None:
            z = z + _lift(self.series_resistance, frequency)
        if _present(self.lead_inductance):
            z = z + 1j * omega * _lift(self.lead_inductance, frequency)
        return z

    def admittance(self, frequency: Real) -> Any:
        """Return one over the impedance [S]; a capacitor without strays costs no division by its value."""
        if self.kind == "capacitor" and self.series_resistance is None and not _present(self.lead_inductance):
            loss = 0.0 if self.q is None else 1 / _lift(self.q, frequency)
            return _lift(self.value, frequency) * (2 * math.pi * frequency * ((loss + 1j) / (loss * loss + 1)))
        return 1 / self.impedance(frequency)

    def _coil_loss(self, frequency: Real) -> Any:
        """Series resistance per henry that a Q stands for: ω₀/Q · √(f/f₀)."""
        if self.q is None:
            return 0.0
        if self.q_frequency is None:
            raise OutOfRangeError(f"{self.name}: q_frequency", None, "given where a coil has a Q")
        return 2 * math.pi * self.q_frequency / _lift(self.q, frequency) * (frequency / self.q_frequency) ** 0.5

    def stored_energy(self, frequency: float, current: complex) -> float:
        """Return mean stored energy [J] at peak ``current`` [A] through the branch.

        For one sample and frequency; lead inductance and self-capacitance are counted.
        """
        omega = 2 * math.pi * frequency
        square = abs(current) ** 2 / 4
        if self.kind == "coil":
            if not _present(self.self_capacitance):
                return float(self.value) * square
            across = current * complex(self.impedance(frequency))
            winding = current - across * 1j * omega * float(self.self_capacitance)
            return (float(self.value) * abs(winding) ** 2 + float(self.self_capacitance) * abs(across) ** 2) / 4
        if self.kind == "capacitor":
            return square * (float(self.lead_inductance) + 1 / (omega**2 * float(self.value)))
        return square * float(self.lead_inductance)


def _lift(value: Real, frequency: Real) -> Any:
    """Give sample arrays one new axis for each axis of ``frequency``; leave plain numbers alone."""
    if isinstance(value, np.ndarray) and isinstance(frequency, np.ndarray):
        return value.reshape(value.shape + (1,) * frequency.ndim)
    return value


def _present(value: Real) -> bool:
    return isinstance(value, np.ndarray) or value != 0


class BranchState(NamedTuple):
    """What one branch carries for 1 A peak from the device: peak current [A] and loss [W].

    Each of shape (samples..., frequencies...). The voltage across it is its impedance times the current.
    """

    current: Complex
    loss: Real


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
        states = tuple(BranchState(*values[k : k + 2]) for k in range(3, len(values), 2))
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

    def _everything(self, v: Complex, i: Complex, load: Complex, steps: list[tuple[Any, Any]]) -> tuple[Any, ...]:
        unit = 1 / i
        half_square = _square(unit) / 2
        out = [v * unit, unit, load]
        for current, resistive in reversed(steps):
            out += [current * unit, resistive * half_square]
        return tuple(out)

    def _blocks(
        self, frequency: ArrayLike, load: Load | ArrayLike, finish: Any, *, keep: bool = False
    ) -> tuple[Any, ...]:
        """Walk once, or block by block where samples times frequencies exceed what fits the cache."""
        plain = isinstance(frequency, float | int) and isinstance(load, complex | float | int)
        f: Any = float(frequency) if plain else np.asarray(frequency, dtype=np.float64)  # type: ignore[arg-type]  # plain: a number
        z: Any = load.impedance(f) if hasattr(load, "impedance") else load
        z = complex(z) if plain else np.asarray(z, dtype=np.complex128)
        shape = _sample_shape(self.branches)
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
    steps: list[tuple[Any, Any]] | None = [] if keep else None
    v, i = _outwards(branches, f, 1 + 0j, 1 / z, steps)
    return finish(v, i, z, steps)  # type: ignore[no-any-return]  # a tuple, by every caller above


def _outwards(
    branches: Sequence[Branch], f: Any, v: Any, i: Any, steps: list[tuple[Any, Any]] | None
) -> tuple[Any, Any]:
    """Walk from load to device; ``steps`` collects each branch's current and |I|²·Re Z."""
    for branch in reversed(branches):
        if branch.place == "series":
            z = branch.impedance(f)
            across = i * z
            if steps is not None:
                steps.append((i, _square(i) * z.real))
            v = v + across
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


_SAMPLED = ("value", "q", "series_resistance", "lead_inductance", "self_capacitance")
_sampled_of = attrgetter(*_SAMPLED)


def _sample_shape(branches: Sequence[Branch]) -> tuple[int, ...]:
    arrays = [a.shape for branch in branches for a in _sampled_of(branch) if isinstance(a, np.ndarray)]
    return np.broadcast_shapes(*arrays) if arrays else ()


def _flat_samples(branch: Branch, shape: tuple[int, ...]) -> Branch:
    arrays: dict[str, Any] = {
        name: np.broadcast_to(a, shape).reshape(-1)
        for name in _SAMPLED
        if isinstance(a := getattr(branch, name), np.ndarray)
    }
    return replace(branch, **arrays) if arrays else branch


def _take(branch: Branch, part: slice) -> Branch:
    arrays: dict[str, Any] = {name: a[part] for name in _SAMPLED if isinstance(a := getattr(branch, name), np.ndarray)}
    return replace(branch, **arrays) if arrays else branch
