"""From a cold start to the solution: damped Newton, then a softened knee, then drive steps.

A device far in saturation has a flat current over the voltage, and Newton finds no direction there. With the
knee a few times softer it does, and the solution follows as the knee hardens again. Each stage that
needs this gets it by itself; the others of the batch do not notice.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.devicelaw import Array
from rfstage.steady.balance import PATIENT, QUICK, Effort, Outcome, newton, spectrum
from rfstage.steady.circuit import Circuit
from rfstage.steady.modes import modes
from rfstage.steady.network import Complex

DIRECT, SOFTENED, STEPPED, FAILED = "direct", "softened knee", "drive steps", "failed"
FIRST_FACTORS = (16.0, 64.0, 256.0, 1024.0)  # of softness, until one converges from the cold start
HARDENING = 4.0  # by which the softness falls at each step, and the square root of it after a failure
LEAST_RATIO = 1.02
SWING_OF_START = 0.9  # of the supply: the most that the start's fundamental may have


class Solution(NamedTuple):
    """Unknowns (S, N + 1) [V], of pairs (S, 2, N + 1), merit and iterations (S,), and each stage's way."""

    unknowns: Complex
    merit: Array
    iterations: NDArray[np.int64]
    methods: tuple[str, ...]

    def take(self, rows: Sequence[int]) -> Solution:
        """Return the chosen rows."""
        return Solution(
            self.unknowns[rows], self.merit[rows], self.iterations[rows], tuple(self.methods[row] for row in rows)
        )


def solve(circuit: Circuit, start: Complex | None = None) -> Solution:
    """Solve all stages, from a start (S, N + 1) [V] or cold; a stage that resists has the method ``FAILED``."""
    first = newton(circuit, cold_start(circuit) if start is None else start)
    unknowns, merit, iterations = first.unknowns, first.merit, first.iterations
    methods = [DIRECT] * merit.size
    for row in np.flatnonzero(~first.converged):
        found, methods[row], spent = _rescue(circuit.take([row]), tried_cold=start is None)
        iterations[row] += spent
        unknowns[row], merit[row] = found.unknowns[0], found.merit[0]
    return Solution(unknowns, merit, iterations, tuple(methods))


def cold_start(circuit: Circuit) -> Complex:
    """Return the first guess: the supply, and the fundamental of the unsaturated current, clipped."""
    guess = np.zeros_like(circuit.impedance)
    flat = circuit.driven.flat_current(np.broadcast_to(circuit.supply, circuit.driven.overdrive.shape))
    drawn = spectrum(flat, 1)
    if circuit.paired:
        drawn = modes(drawn)
    swing = -circuit.impedance[..., 1] / circuit.scale[..., 1] * drawn[..., 1]
    most = SWING_OF_START * circuit.supply[..., 0]
    guess[..., 1] = swing * most / np.maximum(np.abs(swing), most)
    return guess


def _rescue(circuit: Circuit, *, tried_cold: bool) -> tuple[Outcome, str, int]:
    """Solve one stage by the ways that always get there; returns outcome, method and iterations."""
    spent = 0
    cold = cold_start(circuit)
    if not tried_cold:
        out = newton(circuit, cold)
        spent += int(out.iterations[0])
        if out.converged[0]:
            return out, DIRECT, spent
    for effort in (QUICK, PATIENT):
        out, more = _by_softening(circuit, cold, effort)
        spent += more
        if out.converged[0]:
            return out, SOFTENED, spent
    out, more = _step_drive(circuit, cold)
    return out, STEPPED if out.converged[0] else FAILED, spent + more


def _by_softening(circuit: Circuit, cold: Complex, effort: Effort) -> tuple[Outcome, int]:
    """Soften the knee until Newton converges, and follow the solution back to the real knee."""
    spent = 0
    for factor in FIRST_FACTORS:
        out = newton(circuit.softened(factor), cold, effort=effort)
        spent += int(out.iterations[0])
        if out.converged[0]:
            break
    reached, ratio = out, HARDENING
    while reached.converged[0] and ratio > LEAST_RATIO:
        target = max(factor / ratio, 1.0)
        out = newton(circuit.softened(target) if target > 1 else circuit, reached.unknowns, effort=effort)
        spent += int(out.iterations[0])
        if not out.converged[0]:
            ratio = ratio**0.5
        elif target == 1:
            break
        else:
            factor, reached = target, out
    return out, spent


def _step_drive(circuit: Circuit, cold: Complex) -> tuple[Outcome, int]:
    """Raise the drive from nothing, each start extrapolated from the two solutions before."""
    spent, at, step = 0, 0.0, 0.25
    known = [(-1.0, np.zeros_like(cold)), (0.0, np.zeros_like(cold))]
    while True:
        target = min(1.0, at + step)
        (before, x_before), (last, x_last) = known
        start = x_last + (x_last - x_before) * (target - last) / (last - before)
        out = newton(circuit.driven_at(target), start)
        spent += int(out.iterations[0])
        if out.converged[0]:
            known = [known[1], (target, out.unknowns)]
            at, step = target, 1.5 * step
            if target == 1.0:
                return out, spent
        else:
            step /= 3
            if step < 1e-4:
                return out, spent
