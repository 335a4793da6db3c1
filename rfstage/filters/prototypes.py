r"""Low-pass prototypes, computed: Butterworth and Chebyshev. A prototype has 1 ohm and a cutoff of 1 rad/s.

::

    capacitor-first   ──┬──[ g2 ]──┬──[ g4 ]──┬──       coil-first   ──[ g1 ]──┬──[ g3 ]──┬──[ g5 ]──
                        g1         g3         g5                               g2         g4
                        │          │          │                                │          │

    symbol    name         unit
    --------  -----------  ----------------------------------------------------------------------
    g1 … gn   values       H of coils, F of capacitors
    g(n+1)    load         ohm behind a shunt capacitor, S behind a series coil
    ω         frequency    rad/s: 1 is the 3 dB point (Butterworth) or the edge of the ripple (others)
    ρ         reflection   magnitude of the reflection coefficient at the ripple's crests

Ripple and edges may be arrays of samples, and so may the values then.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from rfstage.errors import OutOfRangeError

Real = float | NDArray[np.float64]

_HIGHEST_RIPPLE = 20.0  # dB: beyond it a pass band is none
_HIGHEST_ORDER = 99
_DECIBEL = math.log(10) / 10  # nepers of power in one


class Prototype(NamedTuple):
    """A low-pass of 1 ohm and 1 rad/s.

    ``values`` are g1 … gn [H or F]; ``traps`` are, arm by arm, what makes a trap of it: in the capacitor-first
    form the capacitor [F] across the coil, in the coil-first form the coil [H] in series with the capacitor,
    and 0 where there is none. ``load`` is g(n+1). ``ripple`` [dB] is 0 for Butterworth.
    """

    kind: str
    ripple: Real
    values: tuple[Real, ...]
    traps: tuple[Real, ...]
    load: Real

    @property
    def order(self) -> int:
        """Number of arms."""
        return len(self.values)


def butterworth(order: int) -> Prototype:
    """Return the maximally flat prototype; its cutoff is the 3 dB point.

    Parameters
    ----------
    order : int
        1 to 99.

    Raises
    ------
    OutOfRangeError
        For another order.

    References
    ----------
    ``g_k = 2 sin((2k − 1)π/2n)``, as in Matthaei, Young and Jones, table 4.05-1.

    Examples
    --------
    >>> [round(g, 4) for g in butterworth(5).values]
    [0.618, 1.618, 2.0, 1.618, 0.618]
    """
    check_order(order, range(1, _HIGHEST_ORDER + 1), "a whole number from 1 to 99")
    values = tuple(2 * math.sin((2 * k - 1) * math.pi / (2 * order)) for k in range(1, order + 1))
    return Prototype("butterworth", 0.0, values, (0.0,) * order, 1.0)


def chebyshev(order: int, *, ripple: ArrayLike) -> Prototype:
    """Return the prototype of equal ripple; its cutoff is the edge of the ripple.

    Parameters
    ----------
    order : int
        1 to 99. An even order ends in a load other than 1 (see `Prototype`).
    ripple : array_like, shape (samples...)
        Of the pass band [dB], above 0 and up to 20.

    Raises
    ------
    OutOfRangeError
        For another order or ripple.

    References
    ----------
    Belevitch's recursion, as in Matthaei, Young and Jones, section 4.05.

    Examples
    --------
    >>> [round(g, 4) for g in chebyshev(5, ripple=0.1).values]
    [1.1468, 1.3712, 1.975, 1.3712, 1.1468]
    """
    check_order(order, range(1, _HIGHEST_ORDER + 1), "a whole number from 1 to 99")
    widest = np.arcsinh(1 / ripple_factor(ripple))
    gamma = np.sinh(widest / order)
    sines = [math.sin((2 * k - 1) * math.pi / (2 * order)) for k in range(1, order + 1)]
    values = [2 * sines[0] / gamma]
    for k in range(1, order):
        b = gamma**2 + math.sin(k * math.pi / order) ** 2
        values.append(4 * sines[k - 1] * sines[k] / (b * values[-1]))
    load = 1.0 if order % 2 else plain(1 / np.tanh(widest / 2) ** 2)
    return Prototype("chebyshev", plain(ripple), tuple(plain(g) for g in values), (0.0,) * order, load)


def ripple_of_reflection(reflection: float) -> float:
    """Return the ripple [dB] whose crests reflect so much: ``−10 log10(1 − ρ²)``.

    Parameters
    ----------
    reflection : float
        Magnitude of the reflection coefficient [-], above 0 and below 0.995.

    Raises
    ------
    OutOfRangeError
        For anything else.

    Examples
    --------
    >>> round(ripple_of_reflection(0.2), 4)
    0.1773
    """
    if not 0 < reflection < 0.995:
        raise OutOfRangeError("reflection", reflection, "above 0 and below 0.995", "is it in percent?")
    return -math.log1p(-(reflection**2)) / _DECIBEL


def ripple_factor(ripple: ArrayLike) -> NDArray[np.float64]:
    """Return ε of ``10 log10(1 + ε²)`` for a ripple or an attenuation [dB].

    Raises
    ------
    OutOfRangeError
        If a ripple is not above 0 and at most 20 dB.
    """
    given = np.asarray(ripple, dtype=np.float64)
    if not np.all((given > 0) & (given <= _HIGHEST_RIPPLE)):
        raise OutOfRangeError("ripple", f"{given} dB", f"above 0 and at most {_HIGHEST_RIPPLE:g} dB")
    return np.asarray(np.sqrt(np.expm1(given * _DECIBEL)))


def butterworth_attenuation(frequency: ArrayLike, *, order: int) -> NDArray[np.float64]:
    """Return the attenuation [dB] of the lossless filter between equal resistances.

    Parameters
    ----------
    frequency : array_like, shape (...)
        Over the cutoff [-], 0 or above.
    order : int
        Of the filter.

    Examples
    --------
    >>> round(float(butterworth_attenuation(2.0, order=5)), 2)
    30.11
    """
    omega = np.asarray(frequency, dtype=np.float64)
    return np.asarray(np.log1p(omega ** (2 * order)) / _DECIBEL)


def chebyshev_attenuation(frequency: ArrayLike, *, order: int, ripple: ArrayLike) -> NDArray[np.float64]:
    """Return the attenuation [dB] of the lossless filter between the resistances it is made for.

    Parameters
    ----------
    frequency, ripple : array_like, shapes that broadcast together
        Over the cutoff [-], 0 or above; and dB.
    order : int
        Of the filter.

    Examples
    --------
    >>> round(float(chebyshev_attenuation(2.0, order=5, ripple=0.1)), 2)
    34.85
    """
    omega = np.asarray(frequency, dtype=np.float64)
    inside = np.cos(order * np.arccos(np.minimum(omega, 1.0)))
    polynomial = np.where(omega > 1, np.cosh(order * np.arccosh(np.maximum(omega, 1.0))), inside)
    return np.asarray(np.log1p((ripple_factor(ripple) * polynomial) ** 2) / _DECIBEL)


def check_order(order: int, allowed: range, need: str, hint: str = "") -> None:
    """Refuse an order [-] that is not among those allowed, saying what is needed.

    Raises
    ------
    OutOfRangeError
        If it is not, or is no whole number.
    """
    if isinstance(order, bool) or order not in allowed:
        raise OutOfRangeError("order", order, need, hint)


def plain(value: ArrayLike) -> Real:
    """Return an array of samples as it is, and what holds one number as a Python number."""
    array = np.asarray(value, dtype=np.float64)
    return array if array.ndim else float(array)
