"""From the textbook's design to one whose settled power is the asked one.

One unknown serves: the load resistance that the tank shows. Peak current, drive and angle follow from it as
in the book, the network is closed exactly for each trial, and a secant on the logarithms of resistance and power
finds it. A target that is "reached" only with a tiny resistance, a voltage beyond the device, or an efficiency far
below the book's is no design: then the program stops and says what would do.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from rfstage.designs.building import Built, build
from rfstage.designs.settings import Settings, with_defaults
from rfstage.designs.textbook import by_the_book, circuit_at
from rfstage.errors import ImpossibleError, RfstageError
from rfstage.pulse import pulse_coefficients
from rfstage.quantity import exact_text, show
from rfstage.steady import SteadyState, settle, settle_many

WITHIN = 1e-3  # of the asked power
AIMED = 3e-4  # of it: where the search rests, so that rounding of parts leaves it within
SOLVES = 10
ROUNDS = 3
TRIAL_ORDERS = 32  # of the search's solves: enough for a network that shorts the harmonics; the last solve chooses
LONGEST_STEP = 0.7  # of the logarithm of the resistance
LEAST_RESISTANCE = 0.3  # of the textbook's
VOLTAGE_RATIO = 3.0  # of the supply, where no rating is given
EFFICIENCY_LOST = 0.15  # against the textbook's


def corrected(
    settings: Settings, coefficients: NDArray[np.float64], book: Built, *, advise: bool = True
) -> tuple[Built, SteadyState]:
    """Return the stage whose settled power is the asked one within 0.1 %, and its steady state.

    Where it can't be had the way out is looked for, unless not to ``advise``.

    Raises
    ------
    ImpossibleError
        If no load resistance gives it as a design worth the name; the text says why, and what would.
    ConvergenceError
        If a steady state is not reached on the way.
    """
    try:
        return _search(settings, coefficients, book)
    except ImpossibleError as error:
        if not advise:
            raise
        raise ImpossibleError(f"{error}{_way_out(settings)}") from None


def _search(settings: Settings, coefficients: NDArray[np.float64], book: Built) -> tuple[Built, SteadyState]:
    """Find the resistance with few orders, then settle it with as many as it needs, and mend what those change."""
    asked = settings.job.power
    built, state, goal = book, None, asked
    for _ in range(ROUNDS):
        built, trial = _secant(settings, coefficients, book, built, state, goal)
        state = settle(built.stage, start=trial)
        if abs(state.output_power / asked - 1) <= WITHIN:
            _judge(settings, book, state)
            return built, state
        if not state.has_output:
            break
        goal *= asked / state.output_power
    raise ImpossibleError(
        f"the settled power stays at {show(state.output_power, 'W') if state else 'nothing'} where "
        f"{exact_text(asked, 'W')} is asked: it no longer follows the load resistance"
    )


def _secant(
    settings: Settings,
    coefficients: NDArray[np.float64],
    book: Built,
    built: Built,
    state: SteadyState | None,
    goal: float,
) -> tuple[Built, SteadyState]:
    before: tuple[float, float] | None = None
    for _ in range(SOLVES):
        state = settle_many([built.stage], orders=TRIAL_ORDERS, start=state)[0]
        if not state.has_output:
            raise ImpossibleError("in steady state the stage has no output at all")
        miss = math.log(state.output_power / goal)
        if abs(miss) <= AIMED:
            return built, state
        here = math.log(built.point.load_resistance)
        step = miss  # power goes about as one over the resistance
        if before is not None and before[1] != miss:
            step = -miss * (here - before[0]) / (miss - before[1])
        before = (here, miss)
        resistance = math.exp(here + min(max(step, -LONGEST_STEP), LONGEST_STEP))
        if resistance < LEAST_RESISTANCE * book.point.load_resistance:
            raise ImpossibleError(
                f"in steady state network {settings.request.network} gives {show(state.output_power, 'W')} where "
                f"{show(goal, 'W')} is asked, and would need less than {LEAST_RESISTANCE:g} of the textbook's "
                f"load resistance of {show(book.point.load_resistance, 'ohm')}"
            )
        built = build(settings, *circuit_at(settings, coefficients, resistance))
    assert state is not None
    return built, state


def _judge(settings: Settings, book: Built, state: SteadyState) -> None:
    """Raise where the power was reached by what is no design."""
    job = settings.job
    most, named = VOLTAGE_RATIO * job.supply, f"{VOLTAGE_RATIO:g} times the supply"
    if job.max_voltage is not None and book.point.peak_voltage <= job.max_voltage:
        most, named = job.max_voltage, "the device's rating"
    if state.peak_voltage > most:
        raise ImpossibleError(
            f"in steady state network {settings.request.network} gives {exact_text(job.power, 'W')} only with "
            f"{show(state.peak_voltage, 'V')} peak across the device, above {named} of {show(most, 'V')}"
        )
    efficiency = state.efficiency or 0.0
    if efficiency < book.point.overall_efficiency - EFFICIENCY_LOST:
        raise ImpossibleError(
            f"in steady state network {settings.request.network} gives {exact_text(job.power, 'W')} at an efficiency "
            f"of {100 * efficiency:.0f} % where the textbook has {100 * book.point.overall_efficiency:.0f} %"
        )


def _way_out(made: Settings) -> str:
    """Say which network or supply would do it, tried and not guessed; or that --textbook keeps the book's design."""
    network = made.request.network
    job = replace(made.job, network=network)
    plain = "network pi with its default Q" if network == "pi" else "network pi"
    trials: list[tuple[str, dict[str, object]]] = [
        (plain, {"network": "pi", "loaded_q": None, "input_q": None}),
        ("network pi with an input-side Q of 4", {"network": "pi", "loaded_q": None, "input_q": 4.0}),
        (f"a supply of {1.3 * job.supply:.3g} V", {"supply": 1.3 * job.supply}),
        (
            f"network pi and a supply of {1.3 * job.supply:.3g} V",
            {"network": "pi", "loaded_q": None, "input_q": None, "supply": 1.3 * job.supply},
        ),
    ]
    for name, changes in trials:
        try:
            settings = with_defaults(replace(job, **changes))  # type: ignore[arg-type]  # of a job's own fields
            coefficients = pulse_coefficients(settings.half_angle, highest_order=2, exponent=settings.exponent)
            _search(settings, coefficients, build(settings, *by_the_book(settings, coefficients)))
        except RfstageError:
            continue
        return f"; {name} does it (--textbook keeps the book's design as it is)"
    return "; --textbook keeps the book's design as it is"
