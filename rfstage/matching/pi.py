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

from rfstage.errors import ImpossibleError
from rfstage.ladder import Branch
from rfstage.matching.parts import four_figures, parallel_resistance


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
