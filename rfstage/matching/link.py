r"""The link: a tuned tank coil, and a second winding coupled to it that goes to the load.

::

    wanted ──┬──╮ ╭──[ C2 ]── load      k coupling, X1 and X2 the windings' reactances, R the load's resistance
            C1  L1║L1'                  reflected into the tank: r = k²·X1·X2/R with the link tuned out by C2
             │  │ │                     tank Q = R/(k²·X2);  loaded Q = tank Q + X2/R, at least 2/k

    untuned (no C2):  (1 − k²)q² + (2x − k²x − k²Q)q + 1 + x² = 0,  q = X2/R, x = load reactance/R,
                      which has a solution where k²Q ≥ 2√((1 − k²)(1 + x²)) + 2x − k²x

Critical coupling is where the least Q stands: k = 1/√(tank Q · link Q), link Q = X2/R.
"""

from __future__ import annotations

import math

from rfstage.errors import ImpossibleError
from rfstage.ladder import Branch
from rfstage.matching.exact import Free
from rfstage.matching.parts import capacitor, four_figures, parallel_resistance
from rfstage.matching.pi import behind_feed
from rfstage.matching.solving import asked_q, finish, positive
from rfstage.matching.task import COUPLINGS, Task


def least_tank_q(load: complex, coupling: float) -> float:
    """Return the least tank Q [-] with which an untuned link of a coupling [-] serves a load [ohm]."""
    x, k2 = load.imag / load.real, coupling**2
    return (2 * math.sqrt((1 - k2) * (1 + x**2)) + 2 * x - k2 * x) / k2


def link_network(
    wanted: complex, load: complex, *, carrier: float, coupling: float, tank_q: float, tuned: bool = True
) -> tuple[Branch, ...]:
    """Return the lossless linked tank that shows ``wanted`` when ``load`` is connected.

    Parameters
    ----------
    wanted, load : complex
        Impedances [ohm] at the carrier, both with a resistance above 0.
    carrier : float
        Hz.
    coupling : float
        Between the windings [-], above 0 and below 1.
    tank_q : float
        Resistance wanted over the reactance of the capacitor across the tank [-].
    tuned : bool
        With a series capacitor that tunes out the link's and the load's reactance.

    Returns
    -------
    tuple of Branch
        C1, the coupled pair L1, and C2 if tuned, from device to load.

    Raises
    ------
    ImpossibleError
        If the coupling is too loose for this Q, saying the least that works.

    References
    ----------
    Reflected impedance of coupled circuits, as in F. E. Terman, *Radio Engineers' Handbook* (from memory).

    Examples
    --------
    >>> parts = link_network(1000, 50, carrier=7e6, coupling=0.3, tank_q=12)
    >>> [f"{b.name} {b.value:.4g}" for b in parts], f"{parts[1].second:.4g}"
    (['C1 2.728e-10', 'L1 1.882e-06', 'C2 4.911e-10'], '1.053e-06')
    """
    r, k2 = load.real, coupling**2
    if tuned:
        link = r / (k2 * tank_q)
        if link + load.imag <= 0:
            raise ImpossibleError(
                f"network link: a load of {four_figures(load)} ohm is more capacitive than the link of {link:.4g} ohm "
                "is inductive; a looser tank.coupling, a lower loaded Q or tank.link untuned leaves room"
            )
        strength, detuning = k2 * link / r, 1.0
    else:
        x = load.imag / r
        half = (k2 * tank_q + k2 * x - 2 * x) / 2
        root = half**2 - (1 - k2) * (1 + x**2)
        if half <= 0 or root < 0:
            raise ImpossibleError(
                f"tank.coupling: {coupling:.4g} is too loose for an untuned link at a tank Q of {tank_q:.4g} into "
                f"{four_figures(load)} ohm; a tank Q above {least_tank_q(load, coupling):.4g} or tank.link tuned works"
            )
        q = (1 + x**2) / (half + math.sqrt(root))  # the root of fewer turns
        link, bottom = q * r, 1 + (q + x) ** 2
        strength, detuning = k2 * q / bottom, 1 - k2 * q * (q + x) / bottom
    r_wanted = parallel_resistance(wanted)
    reflected = r_wanted / (1 + tank_q**2)
    first = reflected / strength
    omega = 2 * math.pi * carrier
    assert abs(detuning * first / reflected / tank_q - 1) < 1e-6
    parts = (
        Branch("C1", "shunt", "capacitor", (tank_q / r_wanted + (1 / wanted).imag) / omega),
        Branch("L1", "through", "coupled", first / omega, second=link / omega, coupling=coupling),
    )
    return (*parts, capacitor("C2", "series", link + load.imag, carrier)) if tuned else parts


def solve(task: Task) -> tuple[Branch, ...]:
    """Return the link of a task, exact with its losses; errors as `rfstage.matching.networks.solve_network`."""
    request = task.request
    coupling = request.coupling or COUPLINGS["link"]
    tuned = request.link != "untuned"
    room = task.least_shunt_q
    if request.input_q is not None:
        q, asked = behind_feed(task, request.input_q), None
    else:
        least = 2 / coupling if tuned else least_tank_q(task.load, coupling)
        asked = asked_q(task, max(least, room))
        q = (asked + math.sqrt(asked**2 - 4 / coupling**2)) / 2 if tuned else asked
    made = link_network(task.target, task.load, carrier=task.carrier, coupling=coupling, tank_q=q, tuned=tuned)
    free = (Free(1), Free(1, "second")) if asked is None else (Free(0), Free(1), Free(1, "second"))
    return positive(finish(task, made, asked_loaded_q=asked, free=free))
