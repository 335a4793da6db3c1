"""Every network by name: closed form, then closed exactly with its losses."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

from rfstage.errors import ConvergenceError, ImpossibleError
from rfstage.ladder import Branch
from rfstage.matching import divider, l, link, pi, pil, t, tapped
from rfstage.matching.parts import four_figures, parallel_resistance
from rfstage.matching.solving import quality
from rfstage.matching.task import DEFAULT_LOADED_Q, DEFAULT_Q_MARGIN, Request, Task

SOLVERS: dict[str, Callable[[Task], tuple[Branch, ...]]] = {
    "l": l.solve,
    "l-high-pass": l.solve,
    "pi": pi.solve,
    "pi-l": pil.solve,
    "t": t.solve,
    "tapped-coil": tapped.solve,
    "link": link.solve,
    "capacitive-divider": divider.solve,
}


def solve_network(
    request: Request,
    *,
    feed: Sequence[Branch],
    wanted: complex,
    load: complex,
    carrier: float,
    near: Sequence[Branch] = (),
) -> tuple[Branch, ...]:
    """Return the network's parts, exact with their losses.

    Parameters
    ----------
    request : Request
        Name and Qs.
    feed : sequence of Branch
        What stands before the network: output capacitance, choke, blocking capacitor, or nothing.
    wanted, load : complex
        What the device's current generator must see, and the load [ohm].
    carrier : float
        Hz.
    near : sequence of Branch
        The parts for nearly the same impedances, where they are known: a start that saves time.

    Raises
    ------
    ImpossibleError
        If no such network does it; the text says what would.
    """
    task = Task.between(request, feed=feed, wanted=wanted, load=load, carrier=carrier, near=near)
    try:
        return SOLVERS[request.network](task)
    except ConvergenceError as error:
        raise ImpossibleError(
            f"network {request.network}: with {quality('coils', request.coil_q)} and "
            f"{quality('capacitors', request.capacitor_q)} no parts show {four_figures(wanted)} ohm to "
            f"the device ({error}); {_cure(request)}"
        ) from None


def _cure(request: Request) -> str:
    """Return what may help where a network did not close."""
    lossless = math.isinf(request.coil_q) and math.isinf(request.capacitor_q)
    better = "" if lossless else "raise tank.coil_q and tank.capacitor_q, "
    return (
        f"{better}try another loaded Q, or network pi" if request.network != "pi" else f"{better}try another loaded Q"
    )


def shunt_reactance(
    request: Request, *, resistance: float, capacitance: float, load: complex, carrier: float
) -> float | None:
    """Return the reactance [ohm] of all the capacitance a network has across the device, or None without any.

    From the lossless closed form for a ``resistance`` [ohm] and an output ``capacitance`` [F]; None too where no
    such form exists, which the network itself then says.
    """
    device = (Branch("Cout", "shunt", "capacitor", capacitance, origin="device"),) if capacitance else ()
    wanted = complex(resistance)
    try:
        task = Task.between(request, feed=device, wanted=wanted, load=load, carrier=carrier)
        first = FIRST_CAPACITORS[request.network](task)
    except (ImpossibleError, KeyError):
        return None
    return 1 / (task.omega * first) if first > 0 else None


def _pi_capacitor(task: Task) -> float:
    q = task.request.loaded_q or max(DEFAULT_LOADED_Q, pi.least_for(task) + DEFAULT_Q_MARGIN)
    parts = pi.pi_network(task.wanted, task.load, carrier=task.carrier, loaded_q=q, input_q=task.request.input_q)
    return float(parts[0].value)


def _pi_l_capacitor(task: Task) -> float:
    q = task.request.loaded_q or max(DEFAULT_LOADED_Q, pil.least_for(task) + DEFAULT_Q_MARGIN)
    bare = task._replace(feed=(), target=task.wanted)
    return float(pil.first_guess(bare, q)[0].value)


def _tank_capacitor(task: Task) -> float:
    """Return the capacitance [F] across the device of a tank whose Q is all in it, where that is its place."""
    if task.request.network == "tapped-coil" and parallel_resistance(task.wanted) < parallel_resistance(task.load):
        return 0.0
    q = task.request.input_q or task.request.loaded_q or max(DEFAULT_LOADED_Q, task.taken + DEFAULT_Q_MARGIN)
    return q / (task.omega * task.wanted.real)


FIRST_CAPACITORS: dict[str, Callable[[Task], float]] = {
    "pi": _pi_capacitor,
    "pi-l": _pi_l_capacitor,
    "tapped-coil": _tank_capacitor,
    "link": _tank_capacitor,
}
