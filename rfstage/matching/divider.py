r"""The capacitive divider: a coil, and two capacitors in series across it with the lower resistance at their joint.

::

    top ──┬──[ C1 ]──┬── joint            Rt at the top, Rj at the joint, Rt > Rj
         L1          C2                   rs = Rt/(Q² + 1),  q = √(Rj/rs − 1)
          │          │                    X_L1 = Rt/Q,  X_C1 = rs (Q − q),  X_C2 = Rj/q

    loaded Q = Q. Device at the top and load at the joint, or the other way round.

It is a step down in impedance, and no low-pass: the harmonics go through its capacitors.
"""

from __future__ import annotations

import math

from rfstage.errors import ImpossibleError
from rfstage.ladder import Branch
from rfstage.matching.parts import capacitor, coil, four_figures, parallel_resistance
from rfstage.matching.solving import NEAREST, asked_q, between_ends, finish, positive, refuse_q
from rfstage.matching.task import Task


def least_loaded_q(wanted: complex, load: complex) -> float:
    """Return the least loaded Q [-] with which a divider joins two impedances [ohm]."""
    top, joint = _ends(wanted, load)
    r_top, r_joint = parallel_resistance(top), parallel_resistance(joint)
    q = max(0.0, r_joint * (1 / joint).imag)  # what the joint's own capacitance takes
    return max(math.sqrt(r_top * (1 + q**2) / r_joint - 1), r_top * (1 / top).imag)


def _ends(wanted: complex, load: complex) -> tuple[complex, complex]:
    """Return what stands at the top and at the joint [ohm], as if the device were at the top."""
    # a lossless network turned round takes the conjugate of one end to the conjugate of the other
    down = parallel_resistance(wanted) >= parallel_resistance(load)
    return (wanted, load) if down else (load.conjugate(), wanted.conjugate())


def divider(wanted: complex, load: complex, *, carrier: float, loaded_q: float) -> tuple[Branch, ...]:
    """Return the lossless divider that shows ``wanted`` when ``load`` is connected.

    Parameters
    ----------
    wanted, load : complex
        Impedances [ohm] at the carrier, both with a resistance above 0; the higher one is at the top.
    carrier : float
        Hz.
    loaded_q : float
        Resistance at the top over the coil's reactance [-].

    Returns
    -------
    tuple of Branch
        From device to load: L1, C1, C2, or C1, C2, L1 where the device is at the joint.

    Raises
    ------
    ImpossibleError
        If the Q is below what the impedances need, saying the least that works.

    Examples
    --------
    >>> parts = divider(2000, 50, carrier=7e6, loaded_q=15)
    >>> [f"{b.name} {b.place} {b.value:.4g}" for b in parts]
    ['L1 shunt 3.032e-06', 'C1 series 2e-10', 'C2 shunt 9.806e-10']
    """
    least = least_loaded_q(wanted, load)
    if loaded_q <= least:
        raise ImpossibleError(
            f"tank.loaded_q: {loaded_q:.6g} is too low for a capacitive divider from {four_figures(wanted)} ohm to "
            f"{four_figures(load)} ohm; it must be above {least:.4g}"
        )
    down = parallel_resistance(wanted) >= parallel_resistance(load)
    top, joint = _ends(wanted, load)
    r_top, r_joint = parallel_resistance(top), parallel_resistance(joint)
    series = r_top / (loaded_q**2 + 1)
    q = math.sqrt(max(r_joint / series - 1, 0.0))
    first, second = ("C1", "C2") if down else ("C2", "C1")
    parts = (
        coil("L1", "shunt", 1 / (loaded_q / r_top - (1 / top).imag), carrier),
        capacitor(first, "series", series * (loaded_q - q), carrier),
        Branch(second, "shunt", "capacitor", (q / r_joint - (1 / joint).imag) / (2 * math.pi * carrier)),
    )
    return parts if down else parts[::-1]


def solve(task: Task) -> tuple[Branch, ...]:
    """Return the divider of a task, exact with its losses; errors as `rfstage.matching.networks.solve_network`."""
    refuse_q(task)
    least = least_loaded_q(task.target, task.load)
    if parallel_resistance(task.target) < parallel_resistance(task.load):
        start = q = asked_q(task, least)
    else:
        # the output capacitance stands at the top, and what of the coil tunes it out is in the loaded Q
        q = asked_q(task, least_loaded_q(task.start, task.load) + task.taken)
        start = max(q - task.least_shunt_q, NEAREST * least)
    made = divider(task.target, task.load, carrier=task.carrier, loaded_q=start)
    return between_ends(task, lambda: positive(finish(task, made, asked_loaded_q=q)))
