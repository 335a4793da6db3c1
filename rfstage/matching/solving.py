"""From a closed form to parts with losses: the steps that all networks share, and what is said where one fails."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

from rfstage.errors import ConvergenceError, ImpossibleError
from rfstage.ladder import Branch
from rfstage.matching.exact import Free, close, free_values, with_losses
from rfstage.matching.parts import four_figures, parallel_resistance
from rfstage.matching.task import DEFAULT_LOADED_Q, DEFAULT_Q_MARGIN, Task

NEAREST = 1.02  # of the least Q: a closed form that stands for more than its own Q begins no lower
NEAR_ENDS = 2.0  # ratio of resistances below which a tap may fall outside its coil


def refuse_q(task: Task, *, also: str = "") -> None:
    """Raise where an input-side Q is asked of a network that does not begin with a capacitor across the device."""
    if task.request.input_q is not None:
        raise ImpossibleError(
            f"tank.input_q: got {task.request.input_q:.6g} for network {task.request.network}, which has no capacitor "
            f"across the device here to set it by; ask for a loaded Q{also}"
        )


def asked_q(task: Task, least: float) -> float:
    """Return the loaded Q [-] to design for: what is asked if it is above the least, or the default.

    Raises
    ------
    ImpossibleError
        If the Q is too low, saying the least that works.
    """
    asked = task.request.loaded_q
    if asked is None:
        return max(DEFAULT_LOADED_Q, least + DEFAULT_Q_MARGIN)
    if asked <= least:
        raise ImpossibleError(
            f"tank.loaded_q: {asked:.6g} is too low for network {task.request.network} from "
            f"{four_figures(task.target)} ohm to {four_figures(task.load)} ohm; it must be above {least:.4g}"
            + (", by some margin since the load is reactive" if task.load.imag else "")
        )
    return asked


def finish(
    task: Task, lossless: Sequence[Branch], *, asked_loaded_q: float | None, free: Sequence[Free] = ()
) -> tuple[Branch, ...]:
    """Return the parts of a closed form, exact with their losses.

    Parameters
    ----------
    task : Task
        What is asked.
    lossless : sequence of Branch
        The closed form.
    asked_loaded_q : float or None
        The loaded Q [-] to meet, where one is left free.
    free : sequence of Free
        Which values move; all of them if empty.

    Raises
    ------
    ConvergenceError
        If no values near the closed form do it.
    """
    lossy = with_losses(
        lossless, coil_q=task.request.coil_q, capacitor_q=task.request.capacitor_q, carrier=task.carrier
    )
    free = free or free_values(lossy)

    # a part that an input-side Q fixes is right in the closed form only, not in the parts of a near task
    return close(
        task.feed,
        task.near if task.near and asked_loaded_q is not None else lossy,
        wanted=task.wanted,
        load=task.load,
        carrier=task.carrier,
        free=free,
        asked_loaded_q=asked_loaded_q,
    )


def between_ends(task: Task, closed: Callable[[], tuple[Branch, ...]]) -> tuple[Branch, ...]:
    """Return what ``closed`` does for a network with a tap or joint between a higher and a lower resistance.

    Raises
    ------
    ImpossibleError
        If it does not, because the two are too near each other.
    """
    try:
        return closed()
    except ConvergenceError as error:
        ends = (parallel_resistance(task.target), parallel_resistance(task.load))
        if max(ends) >= NEAR_ENDS * min(ends):
            raise
        raise ImpossibleError(
            f"network {task.request.network}: {four_figures(task.target)} ohm and {four_figures(task.load)} ohm are "
            "too near each other for a tap between them; network pi joins them"
        ) from error


def positive(parts: Sequence[Branch]) -> tuple[Branch, ...]:
    """Return the parts.

    Raises
    ------
    ConvergenceError
        If one of them came out negative.
    """
    for branch in parts:
        if not (float(branch.value) > 0 and (branch.kind != "coupled" or float(branch.second) > 0)):
            raise ConvergenceError(f"{branch.name} would have to be negative")
    return tuple(parts)


def quality(parts: str, q: float) -> str:
    """Return a Q in words."""
    return f"lossless {parts}" if math.isinf(q) else f"{parts} of Q {q:.6g}"
