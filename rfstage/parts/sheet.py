r"""The current sheet and Rosa's corrections: what the inductance of a solenoid is made of.

::

    L = μ0 N² π a²/l · K(D/l) − μ0 a N (A + B)        a = D/2, the mean radius;  p = l/N, the pitch

    K   Nagaoka's coefficient, from complete elliptic integrals of k² = D²/(D² + l²)
    A   = 5/4 − ln(2p/d): a round wire, with its current evenly over its section, in place of a strip one pitch wide
    B   = (2/N) ln G(N+1) − N ln N + 3(N−1)/2: turns in place of a sheet; G is Barnes' function

Lorenz's form of the coefficient, ``4/(3πk′)·[(k′²/k²)(K − E) + E − k]`` with the complete elliptic integrals K and E,
loses its digits in short coils, where E and k are near 1. Legendre's relation turns it into sums of positive terms
that come out of two arithmetic-geometric means. Rosa's sum over pairs of turns, ``B = −(2/N) Σ (N−n)(ln g_n − ln n)``
with g_n the geometric mean distance of equal collinear segments n apart, telescopes to the form above, which continues
it to fractions of a turn.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from rfstage.parts.arrays import Real, checked
from rfstage.parts.wire import MU_0

CLOSE = 1 + 1e-9  # wire over pitch close-wound, with the last digits of a division forgiven
_LEAST_B = 9.0  # turns from which the series of B below is exact to the last digit
# 2·B(2k+2)/(4k(k+1)) of Bernoulli's numbers: what follows in the logarithm of Barnes' function
_BARNES = (-1 / 120, 1 / 504, -1 / 720, 1 / 528, -691 / 163800, 1 / 72, -3617 / 57120)
# Stirling's series of ln Γ(z+1) in 1/z, 1/z³, …
_STIRLING = (1 / 12, -1 / 360, 1 / 1260, -1 / 1680, 1 / 1188, -691 / 360360, 1 / 156)
_ZETA_SLOPE = -0.16542114370045092921  # ζ'(−1)


def nagaoka(diameter_to_length: ArrayLike) -> Any:
    """Return Nagaoka's coefficient: the inductance of a current sheet over that of a very long one.

    Parameters
    ----------
    diameter_to_length : array_like, shape (...)
        Diameter over length, above 0 [-].

    Returns
    -------
    float or ndarray, shape (...)
        In (0, 1) [-], to about 1e-15 of it for sheets long and short.

    Raises
    ------
    OutOfRangeError
        If a ratio is not above 0.

    References
    ----------
    Rosa and Grover, Bulletin of the Bureau of Standards 8 no. 1 (1912), scientific paper 169.

    Examples
    --------
    >>> [round(float(nagaoka(u)), 6) for u in (0.5, 1, 2, 5)]
    [0.818136, 0.688423, 0.52551, 0.319825]
    """
    u = checked("diameter_to_length", diameter_to_length, "", least=1e-30, most=1e30)
    root = np.hypot(1.0, u)
    k, kc = u / root, 1 / root
    mean, gap, _ = _mean_and_sum(kc, k**2)
    _, other, rise = _mean_and_sum(k, kc**2)
    return 4 * kc / (3 * math.pi) * (math.pi / (2 * mean) * (gap + other) + rise)


def _mean_and_sum(b: Real, square: Real) -> tuple[Real, Real, Real]:
    """Return what one arithmetic-geometric mean of 1 and b = √(1 − square) gives.

    The mean m; (K − E)/(K·square) for the modulus √square; and (m − b)/square.
    """
    start, a = b, np.ones_like(b)
    total = np.full_like(b, 0.5)
    above_a, above_b = 1 / (1 + b), np.zeros_like(b)  # (a − start)/square and (b − start)/square: never subtracted
    for n in range(20):
        gap = above_a - above_b
        total = total + 2.0 ** (n - 2) * gap**2 * square
        if np.all(gap <= 1e-15 * above_a):
            break
        after = np.sqrt(a * b)
        product = start * (above_a + above_b) + square * above_a * above_b
        above_a, above_b = 0.5 * (above_a + above_b), product / (after + start)
        a, b = 0.5 * (a + b), after
    return a, total, above_a


def strip_correction(wire_to_pitch: ArrayLike) -> Any:
    """Return Rosa's A [-]: round wire in place of strips that touch; the ratio is in (0, 1].

    References
    ----------
    Rosa, Bulletin of the Bureau of Standards 2 (1906); Grover, Inductance Calculations (1946), from memory.

    Examples
    --------
    >>> round(float(strip_correction(0.5)), 4)
    -0.1363
    """
    ratio = checked("wire_to_pitch", wire_to_pitch, "", above=0, most=CLOSE)
    return 1.25 - np.log(2 / ratio)


def turns_correction(turns: ArrayLike) -> Any:
    """Return Rosa's B [-]: turns in place of a sheet, for 1 turn or more, fractions included.

    Exact: the sum over all pairs of turns in closed form, and its natural continuation between whole numbers.

    Examples
    --------
    >>> [round(float(turns_correction(n)), 6) for n in (1, 2, 10, 1000)]
    [0.0, 0.113706, 0.266408, 0.336395]
    """
    n = checked("turns", turns, "", least=1)
    few = n < _LEAST_B
    z = np.where(few, n + 8, n)
    inverse = 1 / z**2
    series = np.zeros_like(z)
    for coefficient in reversed(_BARNES):
        series = (series + coefficient) * inverse
    many = math.log(2 * math.pi) - 1.5 + (2 * _ZETA_SLOPE - np.log(z) / 6 + series) / z
    if not np.any(few):
        return many
    # ln G(N+1) = ln G(z+1) − 8 ln Γ(z+1) + Σ i ln(N+i), z = N + 8
    barnes = 0.5 * z * (many + z * np.log(z) - 1.5 * (z - 1))
    gamma = z * np.log(z) - z + 0.5 * np.log(2 * math.pi * z)
    for k, coefficient in enumerate(_STIRLING):
        gamma = gamma + coefficient * inverse**k / z
    steps = sum(i * np.log(n + i) for i in range(1, 9))
    exact = 2 / n * (barnes - 8 * gamma + steps) - n * np.log(n) + 1.5 * (n - 1)
    return np.where(n == 1, 0.0, np.where(few, exact, many))[()]


def sheet_inductance(turns: ArrayLike, diameter: ArrayLike, length: ArrayLike) -> Any:
    """Return the inductance of a current sheet [H] of these turns, diameter and length [m].

    Examples
    --------
    >>> round(float(sheet_inductance(10, 50e-3, 50e-3)) * 1e6, 5)
    3.39723
    """
    n = checked("turns", turns, "", above=0)
    diameter = checked("diameter", diameter, "m", above=0)
    length = checked("length", length, "m", above=0)
    return MU_0 * math.pi / 4 * (n * diameter) ** 2 / length * nagaoka(diameter / length)
