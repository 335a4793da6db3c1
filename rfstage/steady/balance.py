r"""The balance of harmonics, its exact Jacobian, and damped Newton on many stages at once.

::

    W_k + Z_k (I_k + j k ω Q_k) = 0,  k = 0 … N        v(t) = V_supply + W_0 + Σ Re W_k e^{jkωt}

    W_k  deviation of the device node's voltage from the supply (the unknowns; Im W_0 is carried along as 0)
    I_k  of the device's current at v(t) and the drive; Q_k of its junction charge; both by FFT of M samples

In this impedance form a short (Z = 0) is as welcome as an open. Written for the deviation, the equations keep
their relative accuracy down to the faintest drive.

The Jacobian is exact. With G_n the coefficients of the sampled slope di/dv, and W_l = a_l + j b_l,

    dI_k/da_l = G_{k−l} + G_{k+l}            dI_k/db_l = j (G_{k−l} − G_{k+l})

so that it is a Toeplitz and a Hankel array, both only views of one row of numbers. The unknowns of a pair are its
two modes, each with its own Z; a mode's current depends on its own voltage by the mean of the two devices' slopes,
and on the other mode's by half their difference. A passive ladder and a
current that rises with the voltage make the problem monotone: there is one solution, and any way to it is right.
"""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.devicelaw import Array, junction_charge
from rfstage.steady.circuit import Circuit
from rfstage.steady.modes import EVEN, ODD, each, modes
from rfstage.steady.network import Complex

TOLERANCE = 1e-11  # of the supply voltage, or of the current's response where that is less


class Effort(NamedTuple):
    """How long Newton tries: iterations, and halvings of one step."""

    iterations: int
    halvings: int


QUICK = Effort(25, 4)  # past these the knee is in the way, and softening it is shorter
PATIENT = Effort(60, 12)


class Point(NamedTuple):
    """A trial: unknowns and scaled residual [V] (S, N + 1), merit and goal [-] (S,), sampled slopes (S, M).

    Pairs have modes and devices as the second axis. ``merit`` is the residual's length over the supply voltage, and
    the solution has ``merit <= goal``.
    """

    unknowns: Complex
    residual: Complex
    merit: Array
    goal: Array
    conductance: Array
    capacitance: Array | None

    def take(self, rows: Any) -> Point:
        """Return the chosen rows."""
        capacitance = None if self.capacitance is None else self.capacitance[rows]
        return Point(
            self.unknowns[rows],
            self.residual[rows],
            self.merit[rows],
            self.goal[rows],
            self.conductance[rows],
            capacitance,
        )

    def put(self, rows: Any, other: Point) -> None:
        """Overwrite the chosen rows."""
        for name in ("unknowns", "residual", "merit", "goal", "conductance"):
            getattr(self, name)[rows] = getattr(other, name)
        if self.capacitance is not None:
            self.capacitance[rows] = other.capacitance


class Outcome(NamedTuple):
    """Where Newton ended: unknowns (S, N + 1), of pairs (S, 2, N + 1), merit, convergence and iterations (S,)."""

    unknowns: Complex
    merit: Array
    converged: NDArray[np.bool_]
    iterations: NDArray[np.int64]


def voltage(circuit: Circuit, unknowns: Complex) -> Array:
    """Return the device node's voltage [V] over the cycle, shape (S, M), or of both devices (S, 2, M)."""
    half = (each(unknowns) if circuit.paired else unknowns) / 2
    half[..., 0] *= 2
    wave: Array = np.fft.irfft(half, circuit.samples, norm="forward")
    wave += circuit.supply
    return wave


def spectrum(wave: Array, orders: int) -> Complex:
    """Return twice the Fourier coefficients 0 … orders: peak phasors, and twice the mean."""
    coefficients: Complex = np.fft.rfft(wave, norm="forward")[..., : orders + 1] * 2
    return coefficients


def evaluate(circuit: Circuit, unknowns: Complex) -> Point:
    """Return residual, merit and slopes at the unknowns [V], shape (S, N + 1)."""
    n = circuit.orders
    volts = voltage(circuit, unknowns)
    amperes, conductance = circuit.driven.current(volts)
    drawn = spectrum(amperes, n)
    capacitance = None
    if circuit.law.parts.charge:
        charge, capacitance = junction_charge(circuit.law, volts)
        drawn += 1j * circuit.omega * spectrum(charge, n)
    residual = circuit.impedance * (modes(drawn) if circuit.paired else drawn)
    supply = circuit.supply.reshape(-1)
    goal = TOLERANCE * np.minimum(1, _length(residual) / supply)
    residual += circuit.scale * unknowns
    return Point(unknowns, residual, _length(residual) / supply, goal, conductance, capacitance)


def _length(phasors: Complex) -> Array:
    flat = phasors.reshape(phasors.shape[0], -1)
    length: Array = np.sqrt(np.vecdot(flat, flat).real)
    return length


def jacobian(circuit: Circuit, point: Point) -> Array:
    """Return d residual/d unknowns [-], shape (S, 2N + 2, 2N + 2), exact for the sampled law.

    Rows and columns are real and imaginary part of order 0, then of order 1, and so on; of a pair first those of
    the even mode, then those of the odd, shape (S, 4N + 4, 4N + 4).
    """
    n = circuit.orders
    z = circuit.impedance[..., np.newaxis]
    over_a, over_b = _slopes(point.conductance, n)
    if point.capacitance is not None:
        charge_a, charge_b = _slopes(point.capacitance, n)
        rate = 1j * circuit.omega[..., np.newaxis]
        over_a += rate * charge_a
        over_b += rate * charge_b
    stages, size = z.shape[0], 2 * circuit.scale[0].size
    j = np.empty((stages, size, size))
    if circuit.paired:
        over_a, over_b = modes(over_a), modes(over_b)
        blocks = j.reshape(stages, 2, 2 * n + 2, 2, 2 * n + 2)
        for row in (EVEN, ODD):
            for column in (EVEN, ODD):
                mixed = row ^ column
                _fill(blocks[:, row, :, column], z[:, row] * over_a[:, mixed], z[:, row] * over_b[:, mixed])
    else:
        over_a *= z
        over_b *= z
        _fill(j, over_a, over_b)
    diagonals, scale = j.reshape(stages, -1)[:, :: size + 1], circuit.scale.reshape(stages, -1)
    diagonals[:, ::2] += scale
    diagonals[:, 1::2] += scale
    return j


def _fill(j: Array, over_a: Complex, over_b: Complex) -> None:
    """Write the real form; the columns of b are j times over_b: its real part is −imag, its imaginary part real."""
    j[:, ::2, ::2] = over_a.real
    j[:, 1::2, ::2] = over_a.imag
    np.negative(over_b.imag, out=j[:, ::2, 1::2])
    j[:, 1::2, 1::2] = over_b.real


def _slopes(wave: Array, n: int) -> tuple[Complex, Complex]:
    """Return d/da and −j d/db of a current's phasors, from its sampled slope.

    Rows k and columns l from 0 to n. Row 0 is of twice the mean, as in `spectrum`.
    """
    g = np.fft.rfft(wave.reshape(-1, wave.shape[-1]), norm="forward")
    stages = g.shape[0]
    row = np.empty((stages, 3 * n + 1), dtype=np.complex128)  # G_{−n} … G_{2n}; G_{−n} is the conjugate of G_n
    row[:, n:] = g[:, : 2 * n + 1]
    np.conjugate(g[:, n:0:-1], out=row[:, :n])
    step = row.itemsize
    shape, along = (stages, n + 1, n + 1), row.strides[0]
    wanted = (*wave.shape[:-1], n + 1, n + 1)
    toeplitz = np.ndarray(shape, row.dtype, row, n * step, (along, step, -step))  # G_{k−l}
    hankel = np.ndarray(shape, row.dtype, row, n * step, (along, step, step))  # G_{k+l}
    return (toeplitz + hankel).reshape(wanted), (toeplitz - hankel).reshape(wanted)


def newton(circuit: Circuit, start: Complex, *, effort: Effort = QUICK) -> Outcome:
    """Solve from a start, shape (S, N + 1) [V]; stages that end early no longer cost anything.

    A step is halved until the merit falls, for those stages only where it does not. A stage whose
    merit can't be lowered, or that uses up its iterations, comes back with ``converged`` False.
    """
    out = Outcome(
        start.copy(),
        np.full(start.shape[0], np.inf),
        np.zeros(start.shape[0], dtype=np.bool_),
        np.zeros(start.shape[0], dtype=np.int64),
    )
    rows = np.arange(start.shape[0])
    point = evaluate(circuit, start)
    for spent in range(effort.iterations + 1):
        solved = point.merit <= point.goal
        stuck = ~np.isfinite(point.merit)
        ended = solved | stuck if spent < effort.iterations else np.ones_like(solved)
        _record(out, rows, point, ended, spent)
        out.converged[rows[solved]] = True
        if ended.any():
            if ended.all():
                return out
            kept = np.flatnonzero(~ended)
            rows, circuit, point = rows[kept], circuit.take(kept), point.take(kept)
        step = _step(circuit, point)
        trial = evaluate(circuit, point.unknowns + step)
        lost = _search(circuit, point, step, trial, effort.halvings)
        if lost.size:
            _record(out, rows, point, lost, spent + 1)
            kept = np.setdiff1d(np.arange(rows.size), lost)
            if not kept.size:
                return out
            rows, circuit, trial = rows[kept], circuit.take(kept), trial.take(kept)
        point = trial
    return out


def _record(out: Outcome, rows: NDArray[np.int64], point: Point, which: Any, spent: int) -> None:
    out.unknowns[rows[which]] = point.unknowns[which]
    out.merit[rows[which]] = point.merit[which]
    out.iterations[rows[which]] = spent


def _step(circuit: Circuit, point: Point) -> Complex:
    matrix = jacobian(circuit, point)
    wanted = point.residual.view(np.float64).reshape(matrix.shape[:2])
    steps = np.full_like(wanted, np.nan)
    try:
        np.negative(np.linalg.solve(matrix, wanted[:, :, np.newaxis])[:, :, 0], out=steps)
    except np.linalg.LinAlgError:  # of one stage among many; a step of NaN makes that one fall back alone
        for row, one in enumerate(matrix):
            if np.linalg.cond(one) < 1e15:
                steps[row] = -np.linalg.solve(one, wanted[row])
    return steps.view(np.complex128).reshape(point.residual.shape)


def _search(circuit: Circuit, point: Point, step: Complex, trial: Point, halvings: int) -> NDArray[np.int64]:
    """Shorten steps that did not lower the merit, writing into ``trial``; return the rows that never did."""
    worse = np.flatnonzero(~(trial.merit < point.merit))
    fraction = 1.0
    for _ in range(halvings):
        if not worse.size:
            break
        fraction /= 2
        part = circuit if worse.size == step.shape[0] else circuit.take(worse)
        again = evaluate(part, point.unknowns[worse] + fraction * step[worse])
        better = again.merit < point.merit[worse]
        trial.put(worse[better], again.take(better))
        worse = worse[~better]
    return worse
