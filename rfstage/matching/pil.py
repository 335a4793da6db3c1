r"""The pi-L network: a pi to a middle resistance, then a series coil down to the load.

::

    wanted ──┬──[ L1 ]──┬──[ L2 ]── load     Rm = middle resistance, R2 = that of the load
            C1          C2                   QL = √(Rm/R2 − 1),  X_L2 = QL·R2
             │          │                    C2 does for the pi and for the L together

    loaded Q = Q1 + Q2 + QL

The second coil adds about 10 dB at the second harmonic to what the pi does.
"""

from __future__ import annotations

import math

from rfstage.errors import ImpossibleError
from rfstage.ladder import Branch
from rfstage.matching.exact import Free
from rfstage.matching.parts import coil, four_figures, parallel_resistance
from rfstage.matching.pi import behind_feed, least_loaded_q, pi_network
from rfstage.matching.solving import asked_q, finish, positive
from rfstage.matching.task import Task

# Q of the L where no middle resistance is asked: five times the load's, or twice from a resistance below it, where
# the pi needs its Q for itself
SECTION_Q, SECTION_Q_UPWARDS = 2.0, 1.0


def pi_l_network(
    wanted: complex,
    load: complex,
    *,
    carrier: float,
    middle_resistance: float,
    loaded_q: float | None = None,
    input_q: float | None = None,
) -> tuple[Branch, ...]:
    """Return the lossless pi-L that shows ``wanted`` when ``load`` is connected.

    Parameters
    ----------
    wanted, load : complex
        Impedances [ohm] at the carrier, both with a resistance above 0.
    carrier : float
        Hz.
    middle_resistance : float
        Between pi and L [ohm], above the load's resistance.
    loaded_q, input_q : float
        One of the two [-].

    Returns
    -------
    tuple of Branch
        C1, L1, C2, L2, from device to load.

    Raises
    ------
    ImpossibleError
        If the Q or the middle resistance is below what the impedances need, saying the least that works.

    References
    ----------
    The pi's design relations, and those of an L, one after the other (common practice, no source).

    Examples
    --------
    >>> parts = pi_l_network(1500, 50, carrier=3.5e6, middle_resistance=300, input_q=12)
    >>> [f"{b.name} {b.value:.4g}" for b in parts]
    ['C1 3.638e-10', 'L1 8.134e-06', 'C2 1.141e-09', 'L2 5.084e-06']
    """
    if middle_resistance <= load.real:
        raise ImpossibleError(
            f"tank.middle_resistance: got {middle_resistance:.6g} ohm for a load of {four_figures(load)} ohm; it must "
            f"be above {load.real:.4g} ohm, such as five times that"
        )
    q = math.sqrt(middle_resistance / load.real - 1)
    last = q * load.real - load.imag
    if last <= 0:
        raise ImpossibleError(
            f"tank.middle_resistance: got {middle_resistance:.6g} ohm for a load of {four_figures(load)} ohm, whose "
            f"own inductance is more; above {abs(load) ** 2 / load.real:.4g} ohm leaves room for a coil"
        )
    inner = None if loaded_q is None else loaded_q - q
    least = least_loaded_q(wanted, load + 1j * last)
    if inner is not None and inner <= least:
        raise ImpossibleError(
            f"tank.loaded_q: {loaded_q:.6g} is too low for a pi-L from {four_figures(wanted)} ohm by "
            f"{middle_resistance:.4g} ohm to {four_figures(load)} ohm; it must be above {least + q:.4g}"
        )
    made = pi_network(wanted, load + 1j * last, carrier=carrier, loaded_q=inner, input_q=input_q)
    return (*made, coil("L2", "series", last, carrier))


def default_middle(wanted: complex, load: complex) -> float:
    """Return the middle resistance [ohm] where none is asked, with room for a coil beside the load's inductance."""
    q = SECTION_Q if parallel_resistance(wanted) >= load.real else SECTION_Q_UPWARDS
    return load.real * (1 + max(q, load.imag / load.real + 1) ** 2)


def middle_for(task: Task) -> float:
    """Return the middle resistance [ohm] of a task."""
    return task.request.middle_resistance or default_middle(task.start, task.load)


def first_guess(task: Task, loaded_q: float | None) -> tuple[Branch, ...]:
    """Return the lossless pi-L behind the feed, for a loaded Q [-] or, where there is none, the asked input-side Q."""
    input_q = task.request.input_q
    return pi_l_network(
        task.target,
        task.load,
        carrier=task.carrier,
        middle_resistance=middle_for(task),
        loaded_q=loaded_q,
        input_q=None if input_q is None else behind_feed(task, input_q),
    )


def least_for(task: Task) -> float:
    """Return the least loaded Q [-] with which a pi-L does a task."""
    middle, r2 = complex(middle_for(task)), task.load.real
    inner = max(
        least_loaded_q(task.start, middle, least_input_q=task.taken),
        least_loaded_q(task.target, middle, least_input_q=task.least_shunt_q),
    )
    return inner + math.sqrt(max(middle.real / r2 - 1, 0.0))


def solve(task: Task) -> tuple[Branch, ...]:
    """Return the pi-L of a task, exact with its losses; errors as `rfstage.matching.networks.solve_network`."""
    if task.request.input_q is not None:
        return positive(finish(task, first_guess(task, None), asked_loaded_q=None, free=(Free(1), Free(2))))
    q = asked_q(task, least_for(task))
    return positive(finish(task, first_guess(task, q), asked_loaded_q=q, free=(Free(0), Free(1), Free(2))))
