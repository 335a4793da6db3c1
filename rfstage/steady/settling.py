"""The entries: one stage with its orders chosen, or many at once with one order number."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from rfstage.devicelaw import Array
from rfstage.errors import ConvergenceError, OutOfRangeError
from rfstage.stage import Stage
from rfstage.steady.circuit import Circuit, check
from rfstage.steady.report import Cycle, Figures, power_gains, report
from rfstage.steady.solve import FAILED, Solution, solve
from rfstage.steady.state import SteadyState

FEWEST, MOST_CHOSEN, MOST = 10, 256, 1024  # orders: that may be asked, that the choice goes to, that may be asked
FIRST_CHOSEN = 16
BLOCK = 60_000  # numbers in the Jacobians of one block of stages: half a megabyte, which a cache holds


def settle(stage: Stage, *, orders: int | None = None, start: SteadyState | None = None) -> SteadyState:
    """Return the steady state of a stage.

    Parameters
    ----------
    stage : Stage
        An as-built stage.
    orders : int or None
        Orders in the balance, 10 to 1024. None chooses: they double from 16 until dc current, output power and
        the harmonics to the tenth above −80 dBc have settled, and stop at 256;
        ``change_from_half_the_orders`` says whether they have.
    start : SteadyState or None
        A solution of a similar stage, as the first guess. It saves time and changes nothing else, since
        there is one solution only.

    Returns
    -------
    SteadyState

    Raises
    ------
    OutOfRangeError, ImpossibleError
        If the stage's values make no circuit, or its ladder conducts direct current.
    ConvergenceError
        If the balance was not reached; no unfinished result is returned.

    Notes
    -----
    Feedback capacitance, the drive source's impedance, charge stored in junctions and heating are not in it,
    and a steady state says nothing about stability.

    References
    ----------
    M. S. Nakhla and J. Vlach, "A piecewise harmonic balance technique for determination of periodic response of
    nonlinear systems", IEEE Trans. Circuits Syst. 23 (1976): the idea of the balance.

    Examples
    --------
    >>> from rfstage.designs.design import design
    >>> from rfstage.job import Job
    >>> stage = design(Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8)).stage
    >>> state = settle(stage)
    >>> state.orders_solved, state.change_from_half_the_orders.settled, abs(state.balance_error) < 1e-9
    (32, True, True)
    """
    check(stage)
    known = None if start is None else start.device_voltage
    if orders is not None:
        _check_orders(orders)
        levels = [orders // 2, orders]
    else:
        levels = [FIRST_CHOSEN]
        while levels[-1] < MOST_CHOSEN:
            levels.append(2 * levels[-1])
    before: Figures | None = None
    gains: Array | None = None
    unknowns: Array | None = None
    for level in levels:
        circuit = Circuit.of([stage], level)
        guess = _resized(unknowns, level) if unknowns is not None else _from_phasors(known, circuit)
        solution = solve(circuit, guess)
        _raise_if_failed(solution, [0])
        unknowns = solution.unknowns
        cycle = Cycle.of(circuit, solution)
        gains = power_gains(stage) if gains is None else gains
        figures = Figures.of(cycle, gains)
        change = None if before is None else figures.change_from(before)
        if orders is None and change is not None and change.settled:
            break
        before = figures
    return report(stage, circuit, solution, cycle, change)


def settle_many(stages: Sequence[Stage], *, orders: int, start: SteadyState | None = None) -> tuple[SteadyState, ...]:
    """Return the steady states of many stages, solved together with one order number.

    Sweeps want one order number, so that their curves are smooth. A hard stage falls back by itself.

    Parameters
    ----------
    stages : sequence of Stage
        Any stages; they need not resemble one another.
    orders : int
        Orders in the balance, 10 to 1024.
    start : SteadyState or None
        The first guess for all of them, such as the middle of the sweep.

    Returns
    -------
    tuple of SteadyState
        One a stage, in their order; ``change_from_half_the_orders`` is None.

    Raises
    ------
    OutOfRangeError, ImpossibleError, ConvergenceError
        As `settle`, for the first stage that fails.

    Examples
    --------
    >>> from dataclasses import replace
    >>> from rfstage.designs.design import design
    >>> from rfstage.job import Job
    >>> stage = design(Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8)).stage
    >>> weaker = replace(stage, drive=replace(stage.drive, amplitude=0.9 * stage.drive.amplitude))
    >>> full, less = settle_many([stage, weaker], orders=32)
    >>> less.output_power < full.output_power
    True
    """
    _check_orders(orders)
    for stage in stages:
        check(stage)
    rows = max(1, BLOCK // (2 * orders + 1)**2)
    known = None if start is None else start.device_voltage
    found: dict[int, SteadyState] = {}
    # a hard corner wants more samples: kept apart, so that no stage's figures depend on its neighbours
    hard = [stage.device.threshold_softness == 0 for stage in stages]
    for kind in (False, True):
        places = [place for place, is_hard in enumerate(hard) if is_hard is kind]
        for first in range(0, len(places), rows):
            block = places[first:first + rows]
            circuit = Circuit.of([stages[place] for place in block], orders)
            solution = solve(circuit, _from_phasors(known, circuit))
            _raise_if_failed(solution, block)
            for row, place in enumerate(block):
                one, alone = circuit.take([row]), solution.take(row)
                found[place] = report(stages[place], one, alone, Cycle.of(one, alone), None)
    return tuple(found[place] for place in range(len(stages)))


def _check_orders(orders: int) -> None:
    if not FEWEST <= orders <= MOST:
        raise OutOfRangeError("orders", orders, f"from {FEWEST} to {MOST}")


def _raise_if_failed(solution: Solution, places: Sequence[int]) -> None:
    for row, (place, method) in enumerate(zip(places, solution.methods, strict=True)):
        if method == FAILED:
            raise ConvergenceError(
                f"the steady state of stage {place + 1} was not reached: a residual of "
                f"{solution.merit[row]:.2g} of the supply voltage is left (is the knee voltage far below 0.1 % of "
                "the supply, or a part lossless?)")


def _resized(unknowns: Array, orders: int) -> Array:
    """Return unknowns of another order number: cut off, or continued with zeros."""
    n = unknowns.shape[1] // 2
    kept = min(n, orders)
    out = np.zeros((unknowns.shape[0], 2 * orders + 1))
    out[:, :kept + 1] = unknowns[:, :kept + 1]
    out[:, orders + 1:orders + 1 + kept] = unknowns[:, n + 1:n + 1 + kept]
    return out


def _from_phasors(node: object, circuit: Circuit) -> Array | None:
    """Return unknowns for every row from the phasors of a known device voltage."""
    if not isinstance(node, np.ndarray):
        return None
    unknowns = np.concatenate((node.real, node.imag[1:]))[np.newaxis, :].repeat(circuit.supply.size, axis=0)
    unknowns[:, 0] -= circuit.supply[:, 0]
    return _resized(unknowns, circuit.orders)
