"""The entries: one stage with its orders chosen, or many at once with one order number."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from rfstage.errors import ConvergenceError, OutOfRangeError
from rfstage.stage import Stage
from rfstage.steady.circuit import Circuit, check
from rfstage.steady.enough import LEAST_SAMPLES, Figures, too_narrow
from rfstage.steady.network import Complex
from rfstage.steady.report import LISTED
from rfstage.steady.single import Singles, System
from rfstage.steady.solve import FAILED, solve
from rfstage.steady.state import ORDERS_VOLTAGE, SteadyState

FEWEST, MOST_CHOSEN, MOST = 10, 256, 1024  # orders: that may be asked, that the choice goes to, that may be asked
FIRST_CHOSEN = 16
LEAST_COARSE = 24  # orders: the least that are worth solving only as a start for more
BLOCK = 120_000  # numbers in the Jacobians of one block of stages: a megabyte, which a cache holds


def settle(
    stage: Stage, *, orders: int | None = None, start: SteadyState | None = None, listed: int = LISTED
) -> SteadyState:
    """Return the steady state of a stage.

    Parameters
    ----------
    stage : Stage
        An as-built stage.
    orders : int or None
        Orders in the balance, 10 to 1024. None chooses: they double from 16 until dc current, output power, the
        harmonics to the tenth above −80 dBc and the peak voltage have settled, no resonance of the ladder above
        them is left that would be felt, and the current pulse has its samples. They stop at 256;
        ``change_from_half_the_orders`` says whether the figures have settled.
    start : SteadyState or None
        A solution of a similar stage, as the first guess. It saves time and changes nothing else, since
        there is one solution only.
    listed : int
        The order to which harmonics are listed at least, 1 to 512. Twice as many orders are needed above 10; they
        are chosen accordingly, beyond 256 if need be.

    Returns
    -------
    SteadyState

    Raises
    ------
    OutOfRangeError, ImpossibleError
        If the stage's values make no circuit, or its ladder conducts direct current.
    ConvergenceError
        If the balance was not reached, or the current pulse is narrower than six samples of the cycle; no unfinished
        result is returned.

    Notes
    -----
    The equations and why they have one solution are in `rfstage.steady.balance`. Feedback capacitance, the drive
    source's impedance, charge stored in junctions and heating are not in them, and a steady state says
    nothing about stability.

    Examples
    --------
    >>> from rfstage.device import Device
    >>> from rfstage.ladder import Branch
    >>> from rfstage.load import SeriesLoad
    >>> from rfstage.stage import Drive, Supply
    >>> fet = Device(family="fet", transfer_factor=9.2, exponent=1.0, threshold=3.0, threshold_softness=0.01,
    ...              knee_voltage=0.2, knee_resistance=0.04)
    >>> parts = (Branch("Cblock", "series", "capacitor", 83e-9), Branch("C1", "shunt", "capacitor", 8.7e-9),
    ...          Branch("L1", "series", "coil", 191e-9), Branch("C2", "shunt", "capacitor", 3.5e-9))
    >>> stage = Stage(carrier=7.1e6, device=fet, drive=Drive(bias=2.5, amplitude=1.0), branches=parts,
    ...               supply=Supply(voltage=13.8, choke=1.6e-6), load=SeriesLoad(50 + 0j, 7.1e6))
    >>> state = settle(stage)
    >>> state.orders_solved, state.change_from_half_the_orders.settled, abs(state.balance_error) < 1e-9
    (32, True, True)
    >>> round(state.output_power, 1), round(state.efficiency, 2), round(state.conduction_angle_deg)
    (10.9, 0.79, 120)
    """
    check(stage)
    if not 1 <= listed <= MOST // 2:
        raise OutOfRangeError("listed", listed, f"from 1 to {MOST // 2}")
    if orders is None:
        levels = _doubled(FIRST_CHOSEN, max(MOST_CHOSEN, 1 << (2 * listed - 1).bit_length()))
    else:
        _check_orders(orders)
        if listed > max(LISTED, orders // 2):
            raise OutOfRangeError("orders", orders, f"at least {2 * listed} for harmonics to the order {listed}")
        levels = [*_levels(orders // 2), orders]
    system = _system([stage], levels[-1])
    before: Figures | None = None
    unknowns: Complex | None = None
    for level in levels:
        circuit = system.circuit(level)
        solution = solve(circuit, _start(system, circuit, unknowns, start))
        if FAILED in solution.methods:
            if level == levels[-1]:
                raise _not_reached("the steady state", float(solution.merit[0]))
            before = unknowns = None
            continue
        unknowns = solution.unknowns
        cycle = system.cycle(circuit, solution)
        figures = system.figures(cycle)
        change = None if before is None else figures.change_from(before)
        before = figures
        chosen = orders is None and level >= 2 * listed and change is not None and change.settled
        if chosen and system.voltage_beyond(cycle) >= ORDERS_VOLTAGE * stage.supply.voltage:
            chosen = False  # a resonance above these orders, which none of the figures has felt yet
        if chosen or level == levels[-1]:
            narrow = too_narrow(circuit, solution, cycle.amperes)
            if not narrow.any():
                break
    state = system.states(cycle, solution, change)[0]
    if narrow.any():
        raise _too_narrow("the current pulse", state, circuit)
    return state


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
    >>> from rfstage.device import Device
    >>> from rfstage.ladder import Branch
    >>> from rfstage.load import SeriesLoad
    >>> from rfstage.stage import Drive, Supply
    >>> fet = Device(family="fet", transfer_factor=9.2, exponent=1.0, threshold=3.0, threshold_softness=0.01,
    ...              knee_voltage=0.2, knee_resistance=0.04)
    >>> parts = (Branch("Cblock", "series", "capacitor", 83e-9), Branch("C1", "shunt", "capacitor", 8.7e-9),
    ...          Branch("L1", "series", "coil", 191e-9), Branch("C2", "shunt", "capacitor", 3.5e-9))
    >>> stage = Stage(carrier=7.1e6, device=fet, drive=Drive(bias=2.5, amplitude=1.0), branches=parts,
    ...               supply=Supply(voltage=13.8, choke=1.6e-6), load=SeriesLoad(50 + 0j, 7.1e6))
    >>> sweep = [replace(stage, drive=Drive(bias=2.5, amplitude=volts)) for volts in (0.8, 0.9, 1.0)]
    >>> [round(state.dc_current, 2) for state in settle_many(sweep, orders=32)]
    [0.52, 0.75, 1.0]
    """
    _check_orders(orders)
    for stage in stages:
        check(stage)
    found: dict[int, SteadyState] = {}
    # a hard corner wants more samples: kept apart, so that no stage's figures depend on its neighbours
    # a balanced pair is one device and an unlike one two: apart as well
    kinds = [
        (stage.device.threshold_softness == 0, stage.device.imbalance > 0, stage.device.pair or "") for stage in stages
    ]
    for kind in sorted(set(kinds)):
        _, unlike, _ = kind
        at_once = max(1, BLOCK // ((4 if unlike else 2) * (orders + 1)) ** 2)
        places = [place for place, its in enumerate(kinds) if its == kind]
        for first in range(0, len(places), at_once):
            block = places[first : first + at_once]
            states = _settle_block([stages[place] for place in block], block, orders, start)
            found.update(zip(block, states, strict=True))
    return tuple(found[place] for place in range(len(stages)))


def _settle_block(
    stages: Sequence[Stage], places: Sequence[int], orders: int, start: SteadyState | None
) -> list[SteadyState]:
    system = _system(stages, orders)
    unknowns: Complex | None = None
    for level in _levels(orders):
        circuit = system.circuit(level)
        solution = solve(circuit, _start(system, circuit, unknowns, start))
        unknowns = solution.unknowns
    if FAILED in solution.methods:
        row = solution.methods.index(FAILED)
        raise _not_reached(f"the steady state of stage {places[row] + 1}", float(solution.merit[row]))
    cycle = system.cycle(circuit, solution)
    states = system.states(cycle, solution, None)
    for thin in np.flatnonzero(too_narrow(circuit, solution, cycle.amperes)):
        raise _too_narrow(f"the current pulse of stage {places[int(thin)] + 1}", states[thin], circuit)
    return states


def _system(stages: Sequence[Stage], orders: int) -> System:
    if stages[0].device.pair is None:
        return Singles.of(stages, orders)

    from rfstage.steady.pair import Pairs  # three rooms that most runs do without

    return Pairs.of(stages, orders)


def _doubled(first: int, last: int) -> list[int]:
    return [first] if first == last else [first, *_doubled(2 * first, last)]


def _levels(orders: int) -> list[int]:
    """Return order numbers that about double up to the wanted one: each solution is the next one's start."""
    half = orders // 2
    return [orders] if half < LEAST_COARSE else [*_levels(half), orders]


def _check_orders(orders: int) -> None:
    if not FEWEST <= orders <= MOST:
        raise OutOfRangeError("orders", orders, f"from {FEWEST} to {MOST}")


def _not_reached(what: str, residual: float) -> ConvergenceError:
    return ConvergenceError(
        f"{what} was not reached: a residual of {residual:.2g} of the supply voltage is left (is the knee voltage far "
        "below 0.1 % of the supply, or a part lossless?)"
    )


def _too_narrow(what: str, state: SteadyState, circuit: Circuit) -> ConvergenceError:
    least = 360 * LEAST_SAMPLES / circuit.samples
    return ConvergenceError(
        f"{what} is too narrow: its conduction angle is {state.conduction_angle_deg:.3g}°, and {circuit.orders} orders "
        f"resolve no less than {least:.3g}°"
    )


def _start(system: System, circuit: Circuit, unknowns: Complex | None, known: SteadyState | None) -> Complex | None:
    """Return the first guess: from fewer orders, else from a known solution, else None."""
    if unknowns is not None:
        guess = np.zeros_like(circuit.impedance)
        guess[..., : unknowns.shape[-1]] = unknowns
        return guess
    if known is None:
        return None
    supply = circuit.supply.reshape(-1, 1)
    deviation = np.zeros((supply.size, circuit.orders + 1), dtype=np.complex128)
    shared = min(circuit.orders + 1, known.device_voltage.size)
    deviation[:, :shared] = known.device_voltage[:shared]
    deviation[:, :1] -= supply
    return system.guess(deviation)
