r"""The pi network: shunt capacitor, series coil, shunt capacitor.

::

    wanted ──┬──[ L1 ]──┬── load          R1 = parallel resistance wanted, R2 = that of the load
            C1          C2                virtual resistance Rv below both:
             │          │                 Q1 = √(R1/Rv − 1),  Q2 = √(R2/Rv − 1)

    loaded Q = Q1 + Q2;  input-side Q = Q1 = R1·ω·(C1 + output capacitance)
    X_C1 = R1/Q1,  X_C2 = R2/Q2,  X_L = Rv (Q1 + Q2)

Reactance of the load, and of what is wanted, is absorbed into the capacitor beside it.
"""

from __future__ import annotations

import math

from rfstage.errors import ConvergenceError, ImpossibleError
from rfstage.ladder import Branch
from rfstage.matching.exact import Free
from rfstage.matching.parts import four_figures, parallel_resistance
from rfstage.matching.solving import finish
from rfstage.matching.task import DEFAULT_LOADED_Q, DEFAULT_Q_MARGIN, Task
from rfstage.quantity import exact_text, show


def least_loaded_q(wanted: complex, load: complex, *, least_input_q: float = 0.0) -> float:
    """Return the least loaded Q [-] with which a pi joins two impedances [ohm].

    ``least_input_q`` [-] is what a fixed capacitance at the device takes for itself; a capacitive
    load asks for its share in the same way.
    """
    r1, r2 = parallel_resistance(wanted), parallel_resistance(load)
    q1, q2 = max(least_input_q, 0.0), max(r2 * (1 / load).imag, 0.0)
    virtual = min(r1 / (1 + q1**2), r2 / (1 + q2**2))
    return math.sqrt(r1 / virtual - 1) + math.sqrt(r2 / virtual - 1)


def virtual_resistance(r1: float, r2: float, *, loaded_q: float) -> float:
    """Return Rv [ohm] for which Q1 + Q2 is the loaded Q, between two resistances [ohm].

    Examples
    --------
    >>> round(virtual_resistance(1000.0, 50.0, loaded_q=14.5), 6)
    6.896552
    """
    total = r1 + r2
    inside = total**2 - (r1 - r2) ** 2 * (1 + 4 / loaded_q**2)
    return (total + math.sqrt(max(inside, 0.0))) / (loaded_q**2 + 4)


def pi_network(
    wanted: complex, load: complex, *, carrier: float, loaded_q: float | None = None, input_q: float | None = None
) -> tuple[Branch, ...]:
    """Return the lossless pi that shows ``wanted`` when ``load`` is connected.

    Parameters
    ----------
    wanted, load : complex
        Impedances [ohm] at the carrier, both with a resistance above 0.
    carrier : float
        Hz.
    loaded_q, input_q : float
        One of the two [-].

    Returns
    -------
    tuple of Branch
        C1, L1, C2, from device to load. C1 holds any capacitance that stands across the device too.

    Raises
    ------
    ImpossibleError
        If the Q is below what the resistances need, saying the least that works.

    References
    ----------
    The design relations by virtual resistance, as in handbooks; identical to the usual form with
    ``X_L = (Q R1 + R1 R2/X_C2)/(Q² + 1)``.

    Examples
    --------
    >>> [f"{b.name} {b.value:.4g}" for b in pi_network(1000, 50, carrier=3.5e6, input_q=12)]
    ['C1 5.457e-10', 'L1 4.547e-06', 'C2 2.274e-09']
    """
    r1, r2 = parallel_resistance(wanted), parallel_resistance(load)
    if input_q is not None:
        virtual = r1 / (input_q**2 + 1)
        if virtual >= r2:
            least = math.sqrt(r1 / r2 - 1)
            raise ImpossibleError(
                f"tank.input_q: {input_q:.6g} is too low for a pi from {r1:.4g} ohm at the device to "
                f"{four_figures(load)} ohm; it must be above {least:.4g}"
            )
        q1, q2 = input_q, math.sqrt(r2 / virtual - 1)
    else:
        assert loaded_q is not None
        least = least_loaded_q(wanted, load)
        if loaded_q <= least:
            raise ImpossibleError(
                f"tank.loaded_q: {loaded_q:.6g} is too low for a pi from {r1:.4g} ohm at the device to "
                f"{four_figures(load)} ohm; it must be above {least:.4g}"
            )
        virtual = virtual_resistance(r1, r2, loaded_q=loaded_q)
        q1, q2 = math.sqrt(max(r1 / virtual - 1, 0.0)), math.sqrt(max(r2 / virtual - 1, 0.0))
    omega = 2 * math.pi * carrier
    return (
        Branch("C1", "shunt", "capacitor", (q1 / r1 + (1 / wanted).imag) / omega),
        Branch("L1", "series", "coil", virtual * (q1 + q2) / omega),
        Branch("C2", "shunt", "capacitor", (q2 / r2 - (1 / load).imag) / omega),
    )


def solve(task: Task) -> tuple[Branch, ...]:
    """Return the pi of a task, exact with its losses; errors as `rfstage.matching.networks.solve_network`."""
    request, load, carrier = task.request, task.load, task.carrier
    asked, input_q = request.loaded_q, request.input_q
    if asked is None and input_q is None:
        asked = max(DEFAULT_LOADED_Q, least_for(task) + DEFAULT_Q_MARGIN)
    elif asked is not None:
        pi_network(task.start, load, carrier=carrier, loaded_q=asked)  # says so where the Q is too low
        if asked <= least_loaded_q(task.target, load):
            raise ImpossibleError(
                f"tank.loaded_q: behind choke and blocking capacitor a pi has to start from "
                f"{four_figures(task.target)} ohm and needs a loaded Q above "
                f"{least_loaded_q(task.target, load):.4g}; "
                f"got {asked:.6g} (a larger tank.blocking or supply.choke brings it down)"
            )
    try:
        parts = finish(
            task,
            first_guess(task, asked),
            asked_loaded_q=None if input_q is not None else asked,
            free=(Free(1), Free(2)) if input_q is not None else (Free(0), Free(1), Free(2)),
        )
    except ConvergenceError:
        if task.capacitance and task.taken > (input_q or request.loaded_q or DEFAULT_LOADED_Q):
            raise ImpossibleError(too_much_capacitance(task)) from None
        raise
    _check(task, parts)
    return parts


def least_for(task: Task) -> float:
    """Return the least loaded Q [-] with which a pi does a task."""
    return max(least_loaded_q(task.start, task.load, least_input_q=task.taken), least_loaded_q(task.target, task.load))


def first_guess(task: Task, loaded_q: float | None) -> tuple[Branch, ...]:
    """Return the lossless pi behind the feed, for a loaded Q [-] or, where there is none, the asked input-side Q."""
    input_q = task.request.input_q
    if input_q is not None:
        pi_network(task.start, task.load, carrier=task.carrier, input_q=input_q)  # says so where the Q is too low
        input_q = behind_feed(task, input_q)
    return pi_network(task.target, task.load, carrier=task.carrier, loaded_q=loaded_q, input_q=input_q)


def behind_feed(task: Task, input_q: float) -> float:
    """Return the input-side Q [-] that the network itself has, output capacitance and reactances taken off."""
    if task.transformed:
        return input_q
    susceptance = input_q * (1 / task.wanted).real - task.omega * task.capacitance
    return parallel_resistance(task.target) * (susceptance - (1 / task.target).imag)


def _check(task: Task, parts: tuple[Branch, ...]) -> None:
    """Raise where a value came out at nothing or below."""
    if float(parts[1].value) <= 0:
        raise ConvergenceError("the coil would have to be negative")
    if float(parts[0].value) <= 0:
        if task.capacitance:
            raise ImpossibleError(too_much_capacitance(task))
        raise ImpossibleError(
            f"network {task.request.network}: the input capacitor comes out at nothing; raise the loaded Q or "
            "tank.blocking"
        )
    if float(parts[2].value) <= 0:
        least = least_loaded_q(task.start, task.load, least_input_q=task.taken)
        if task.load.imag >= 0:
            raise ImpossibleError(
                f"network pi: the output capacitor comes out at nothing, from the losses or from a blocking capacitor "
                f"with too much reactance; a loaded Q above {least:.3g} by some margin, or a larger tank.blocking, "
                "helps"
            )
        raise ImpossibleError(
            f"network pi: the load's own capacitance is more than the output capacitor this Q leaves; a loaded Q "
            f"above about {least:.3g} leaves room"
        )


def too_much_capacitance(task: Task) -> str:
    """Return what is wrong where the output capacitance is more than a network leaves room for."""
    capacitance, carrier = task.capacitance, task.carrier
    fits = least_loaded_q(task.start, task.load, least_input_q=1.05 * task.taken)
    reactance = show(1 / (task.omega * capacitance), "ohm")
    coil_q = task.request.coil_q
    better = f", with coils of far higher Q than {coil_q:.4g}" if fits > coil_q / 3 else ""
    return (
        f"device.output_capacitance: {show(capacitance, 'F')} has {reactance} reactance at "
        f"{exact_text(carrier, 'Hz')}, an input-side Q of {task.taken:.3g} by itself against "
        f"{four_figures(task.wanted)} ohm, which is more than this Q leaves; a pi of loaded Q {fits:.3g} or "
        f"more would take it in{better}"
    )
