r"""The T network: series coil, shunt capacitor, series coil.

::

    wanted ──[ L1 ]──┬──[ L2 ]── load     R1 = resistance wanted, R2 = that of the load
                    C1                    virtual resistance Rv above both:
                     │                    Q1 = √(Rv/R1 − 1),  Q2 = √(Rv/R2 − 1)

    loaded Q = Q1 + Q2;  X_L1 = Q1·R1,  X_L2 = Q2·R2,  X_C1 = Rv/(Q1 + Q2)

Reactance of the load, and of what is wanted, is absorbed into the coil beside it. The first coil leaves the
device's harmonics nowhere to go but its own output capacitance: with a current generator the trough dips.
"""

from __future__ import annotations

import math

from rfstage.errors import ImpossibleError
from rfstage.ladder import Branch
from rfstage.matching.parts import four_figures
from rfstage.matching.pi import virtual_resistance
from rfstage.matching.solving import NEAREST, asked_q, finish, positive, refuse_q
from rfstage.matching.task import Task


def least_loaded_q(wanted: complex, load: complex) -> float:
    """Return the least loaded Q [-] with which a T joins two impedances [ohm]."""
    q1, q2 = max(-wanted.imag / wanted.real, 0.0), max(load.imag / load.real, 0.0)
    virtual = max(wanted.real * (1 + q1**2), load.real * (1 + q2**2))
    return math.sqrt(virtual / wanted.real - 1) + math.sqrt(virtual / load.real - 1)


def t_network(wanted: complex, load: complex, *, carrier: float, loaded_q: float) -> tuple[Branch, ...]:
    """Return the lossless T that shows ``wanted`` when ``load`` is connected.

    Parameters
    ----------
    wanted, load : complex
        Impedances [ohm] at the carrier, both with a resistance above 0.
    carrier : float
        Hz.
    loaded_q : float
        The sum of both Qs [-].

    Returns
    -------
    tuple of Branch
        L1, C1, L2, from device to load.

    Raises
    ------
    ImpossibleError
        If the Q is below what the impedances need, saying the least that works.

    References
    ----------
    Two L networks back to back, as in D. K. Misra, *Radio-Frequency and Microwave Communication Circuits*,
    2nd ed. (2004), ch. 6; the dual of the pi.

    Examples
    --------
    >>> parts = t_network(10, 50, carrier=14e6, loaded_q=6)
    >>> [f"{b.name} {b.value:.4g}" for b in parts]
    ['L1 4.887e-07', 'C1 3.502e-10', 'L2 9.672e-07']
    """
    least = least_loaded_q(wanted, load)
    if loaded_q <= least:
        raise ImpossibleError(
            f"tank.loaded_q: {loaded_q:.6g} is too low for a T from {four_figures(wanted)} ohm to "
            f"{four_figures(load)} ohm; it must be above {least:.4g}"
        )
    virtual = 1 / virtual_resistance(1 / wanted.real, 1 / load.real, loaded_q=loaded_q)
    q1, q2 = (math.sqrt(max(virtual / r - 1, 0.0)) for r in (wanted.real, load.real))
    omega = 2 * math.pi * carrier
    return (
        Branch("L1", "series", "coil", (q1 * wanted.real + wanted.imag) / omega),
        Branch("C1", "shunt", "capacitor", (q1 + q2) / virtual / omega),
        Branch("L2", "series", "coil", (q2 * load.real - load.imag) / omega),
    )


def solve(task: Task) -> tuple[Branch, ...]:
    """Return the T of a task, exact with its losses; errors as `rfstage.matching.networks.solve_network`."""
    refuse_q(task)
    least = least_loaded_q(task.target, task.load)
    # the output capacitance, and what of the first coil tunes it out, are in the loaded Q besides
    q = asked_q(task, least + task.taken)
    start = max(q - task.least_shunt_q, NEAREST * least)
    made = t_network(task.target, task.load, carrier=task.carrier, loaded_q=start)
    return positive(finish(task, made, asked_loaded_q=q))
