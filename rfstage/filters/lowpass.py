r"""A low-pass filter's parts, from its prototype, for a cutoff and a line resistance.

::

    tank ──┬──[ L3 ]──┬──[ W1 ]──┬── line            capacitor-first (pi form); W: a wave trap,
           C3         C4         C5                  coil and capacitor in parallel
           │          │          │
    tank ──[ L3 ]──┬──[ L4 ]──┬──[ L5 ]── line       coil-first (T form); W: coil and capacitor in series
                   C3         W1
                   │          │

    L = g·R/ωc   C = g/(ωc·R)   ωc = 2π·cutoff
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from rfstage.errors import ImpossibleError, OutOfRangeError
from rfstage.filters.prototypes import Prototype, plain
from rfstage.ladder import Branch, Ladder

CAPACITOR_FIRST, COIL_FIRST = "capacitor-first", "coil-first"
FORMS = (CAPACITOR_FIRST, COIL_FIRST)

# A trap without any loss has no impedance to be told right at its resonance: it is tuned so much off it
_OFF_RESONANCE = 1e-9


def low_pass(
    prototype: Prototype,
    *,
    form: str,
    cutoff: ArrayLike,
    resistance: float,
    coil_q: float = math.inf,
    capacitor_q: float = math.inf,
    carrier: float | None = None,
    numbers: tuple[int, int, int] = (1, 1, 1),
) -> tuple[Branch, ...]:
    """Return the filter's branches, from the tank to the line.

    Parameters
    ----------
    prototype : Prototype
        Its samples, if any, go with those of ``cutoff``.
    form : str
        ``"capacitor-first"`` or ``"coil-first"``.
    cutoff : array_like, shape (samples...)
        Of the prototype: its 3 dB point (Butterworth) or edge of the ripple [Hz].
    resistance : float
        Of the line [ohm].
    coil_q, capacitor_q : float
        Of every part [-], the coils' at the carrier; infinite is lossless.
    carrier : float
        Where a coil's Q holds [Hz]; needed with a finite ``coil_q``.
    numbers : tuple of int
        Of the first coil L, capacitor C and wave trap W.

    Raises
    ------
    OutOfRangeError
        For a form, cutoff, resistance or Q that is none.
    ImpossibleError
        For an even Chebyshev order, which does not end in the line's own resistance.

    References
    ----------
    Scaling in frequency and impedance, as in Matthaei, Young and Jones, section 4.04.

    Examples
    --------
    >>> from rfstage.filters.prototypes import butterworth
    >>> parts = low_pass(butterworth(3), form="capacitor-first", cutoff=10e6, resistance=50.0)
    >>> [f"{b.name} {b.place} {b.value:.4g}" for b in parts]
    ['C1 shunt 3.183e-10', 'L1 series 1.592e-06', 'C2 shunt 3.183e-10']
    """
    if form not in FORMS:
        raise OutOfRangeError("form", repr(form), " or ".join(FORMS))
    _check_positive("cutoff", cutoff, "Hz")
    _check_positive("resistance", resistance, "ohm")
    check_qs(coil_q, capacitor_q)
    if carrier is None and not math.isinf(coil_q):
        raise OutOfRangeError("carrier", None, "given where a coil has a Q")
    if np.any(np.abs(np.asarray(prototype.load) - 1) > 1e-9):
        raise ImpossibleError(
            f"{prototype.kind} filter of order {prototype.order}: it ends in {float(np.max(prototype.load)):.4g} times "
            "the line's resistance or its inverse; take an odd order"
        )
    omega = 2 * math.pi * np.asarray(cutoff, dtype=np.float64)
    henry, farad = resistance / omega, 1 / (omega * resistance)
    coil_loss: dict[str, Any] = {} if math.isinf(coil_q) else {"q": coil_q, "q_frequency": carrier}
    capacitor_loss = None if math.isinf(capacitor_q) else capacitor_q
    coils, capacitors, traps = numbers
    branches = []
    for k, (g, trap) in enumerate(zip(prototype.values, prototype.traps, strict=True)):
        series = (k % 2 == 0) == (form == COIL_FIRST)
        place = "series" if series else "shunt"
        if isinstance(trap, np.ndarray) or trap != 0:
            inductance, capacitance = (g, trap) if series else (trap, g)
            branches.append(
                Branch(
                    f"W{traps}",
                    place,
                    "trap",
                    plain(inductance * henry),
                    second=plain(capacitance * farad),
                    second_q=capacitor_loss,
                    **coil_loss,
                )
            )
            traps += 1
        elif series:
            branches.append(Branch(f"L{coils}", place, "coil", plain(g * henry), **coil_loss))
            coils += 1
        else:
            branches.append(Branch(f"C{capacitors}", place, "capacitor", plain(g * farad), q=capacitor_loss))
            capacitors += 1
    return tuple(branches)


def with_trap(
    parts: Sequence[Branch],
    *,
    carrier: float,
    harmonic: int,
    capacitor_q: float = math.inf,
    coil: str = "",
    name: str = "W1",
) -> tuple[Branch, ...]:
    """Return the filter with one of its series coils made a parallel trap of the same reactance at the carrier.

    Parameters
    ----------
    parts : sequence of Branch
        A low-pass filter. Its later coils move one number down.
    carrier : float
        Hz.
    harmonic : int
        2 or more: the trap resonates on so many times the carrier.
    capacitor_q : float
        Of the trap's capacitor [-]; its coil keeps the Q it has.
    coil : str
        The coil's name; without one it is the middle-most, of two equally near the one at the tank.
    name : str
        Of the trap.

    Raises
    ------
    OutOfRangeError
        For a harmonic below 2, or a coil that is not there.

    Notes
    -----
    ``L' = L·(1 − (carrier/resonance)²)`` and ``C' = 1/((2π·resonance)² L')``.

    Examples
    --------
    >>> from rfstage.filters.prototypes import chebyshev
    >>> made = low_pass(chebyshev(3, ripple=0.1), form="capacitor-first", cutoff=10e6, resistance=50.0)
    >>> trap = with_trap(made, carrier=7e6, harmonic=2)[1]
    >>> f"{trap.name} {trap.value:.4g} {trap.second:.4g}"
    'W1 6.848e-07 1.887e-10'
    """
    if isinstance(harmonic, bool) or harmonic not in range(2, 1000):
        raise OutOfRangeError("harmonic", harmonic, "a whole number from 2")
    _check_positive("carrier", carrier, "Hz")
    check_qs(math.inf, capacitor_q)
    middle = (len(parts) - 1) / 2
    coils = [k for k, part in enumerate(parts) if (part.place, part.kind) == ("series", "coil")]
    wanted = [k for k in coils if coil in ("", parts[k].name)]
    if not wanted:
        raise OutOfRangeError(
            "coil", repr(coil), f"one of {', '.join(parts[k].name for k in coils) or 'some'} in series"
        )
    chosen = min(wanted, key=lambda k: abs(k - middle))
    old = parts[chosen]
    lossless = old.q is None and math.isinf(capacitor_q)
    inductance = old.value * (1 - 1 / harmonic**2)
    resonance = 2 * math.pi * carrier * harmonic * (1 + _OFF_RESONANCE if lossless else 1)
    trap = replace(
        old,
        name=name,
        kind="trap",
        value=inductance,
        second=1 / (resonance**2 * inductance),
        second_q=None if math.isinf(capacitor_q) else capacitor_q,
    )
    names = iter([parts[k].name for k in coils])
    renamed = {k: replace(parts[k], name=next(names)) for k in coils if k != chosen}
    return tuple(trap if k == chosen else renamed.get(k, part) for k, part in enumerate(parts))


def line_response(parts: Sequence[Branch], frequency: ArrayLike, *, resistance: float) -> tuple[Any, Any]:
    """Return S11 and S21 [-] of a filter in its line, losses and all.

    Parameters
    ----------
    parts : sequence of Branch
        Values may be arrays of samples.
    frequency : array_like, shape (frequencies...)
        Above 0 [Hz].
    resistance : float
        Of the line [ohm].

    Returns
    -------
    tuple of complex or ndarray, shape (samples..., frequencies...)
        Reflection and transmission coefficient.
    """
    z, h = Ladder(parts).transfer(frequency, resistance)
    return (z - resistance) / (z + resistance), 2 * h / (z + resistance)


def number_of_parts(parts: Sequence[Branch]) -> int:
    """Return how many parts are soldered in: a trap is two."""
    return sum(2 if part.kind == "trap" else 1 for part in parts)


def check_qs(coil_q: float, capacitor_q: float) -> None:
    """Refuse a Q [-] that is not above 0.

    Raises
    ------
    OutOfRangeError
        If one is not.
    """
    for name, q in (("coil_q", coil_q), ("capacitor_q", capacitor_q)):
        if not q > 0:
            raise OutOfRangeError(name, q, "above 0", "infinite is lossless")


def _check_positive(name: str, value: ArrayLike, unit: str) -> None:
    array = np.asarray(value, dtype=np.float64)
    if not np.all(np.isfinite(array) & (array > 0)):
        raise OutOfRangeError(name, f"{array} {unit}", f"above 0 {unit}, and finite")
