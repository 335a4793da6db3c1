r"""Jacobi's elliptic functions by descending Landen transformation, and what joins a filter's order to its modulus.

::

    symbol   name              what it is
    -------  ----------------  ---------------------------------------------------------------
    k, k1    modulus           1/(stop-band edge); ripple factor over that of the stop band
    K        quarter period    of k; arguments are given in units of it
    q        nome              exp(−π K′/K)

One step of the descent is ``k → (k/(1 + k′))²``: five or six of them leave nothing of any modulus a filter has,
and there the functions are circular. The way back up is ``w → (1 + k) w/(1 + k w²)`` for sn and cd alike.
After S. J. Orfanidis, *Lecture Notes on Elliptic Filter Design* (2006; from memory).
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

_NOTHING = 1e-17  # a modulus that changes no digit any more
_TERMS = 12  # of theta series, whose terms fall as q to the square of their number

Array = NDArray[np.float64]


def landen(modulus: ArrayLike) -> tuple[Array, ...]:
    """Return the moduli of the descent, the given one left out; shape (...) each, down to nothing.

    Parameters
    ----------
    modulus : array_like, shape (...)
        In [0, 1) [-].
    """
    k = np.asarray(modulus, dtype=np.float64)
    steps: list[Array] = []
    while not steps or np.any(k > _NOTHING):
        k = (k / (1 + np.sqrt((1 - k) * (1 + k)))) ** 2
        steps.append(k)
    return tuple(steps)


def ascend(circular: Any, steps: tuple[Array, ...]) -> Any:
    """Return sn or cd of an argument whose sine or cosine, times π/2 of the quarter period, is ``circular``.

    Parameters
    ----------
    circular : float or ndarray, real or complex
        ``sin(u π/2)`` for sn(u K), ``cos(u π/2)`` for cd(u K).
    steps : tuple of ndarray
        As `landen` gives them.
    """
    w = circular
    for k in reversed(steps):
        w = (1 + k) * w / (1 + k * w * w)
    return w


def sn(fraction: ArrayLike, modulus: ArrayLike) -> Array:
    """Return sn(u·K, k) for a real ``fraction`` u of the quarter period [-].

    Examples
    --------
    >>> round(float(sn(0.5, 0.8)), 6)  # 1/√(1 + k′)
    0.790569
    """
    u = np.asarray(fraction, dtype=np.float64)
    return np.asarray(ascend(np.sin(u * (math.pi / 2)), landen(modulus)))


def hyperbolic_sn(height: Any, steps: tuple[Array, ...]) -> Any:
    """Return x of ``sn(j v K) = j x``; ``height`` is v [-], ``steps`` as `landen` gives them."""
    x = np.sinh(height * (math.pi / 2))
    for k in reversed(steps):
        x = (1 + k) * x / (1 - k * x * x)
    return x


def hyperbolic_sn_inverse(value: Any, modulus: ArrayLike) -> Any:
    """Return v of ``sn(j v K) = j x``, for ``value`` x above 0; the inverse of `hyperbolic_sn`."""
    x, k = value, np.asarray(modulus, dtype=np.float64)
    for lower in landen(modulus):
        x = 2 * x / ((1 + lower) * (1 + np.sqrt(1 + (k * x) ** 2)))
        k = lower
    return np.arcsinh(x) * (2 / math.pi)


def discrimination(order: int, modulus: ArrayLike) -> Array:
    """Return k1, the ripple factor over that of the stop band, from the order and k = 1/edge (degree equation)."""
    k = np.asarray(modulus, dtype=np.float64)
    steps = landen(k)
    product = k**order
    for i in range(1, order // 2 + 1):
        product = product * ascend(math.sin((2 * i - 1) * math.pi / (2 * order)), steps) ** 4
    return np.asarray(product)


def modulus_for(order: int, ratio: ArrayLike) -> Array:
    """Return k = 1/edge from the order and k1, by the nomes: ``q = q1^(1/order)``.

    Parameters
    ----------
    order : int
        Of the filter.
    ratio : array_like, shape (...)
        k1 in (0, 1) [-].
    """
    k1 = np.asarray(ratio, dtype=np.float64)
    complement = np.sqrt((1 - k1) * (1 + k1))
    nome = np.exp(-math.pi * _mean(complement) / _mean(k1) / order)
    top = sum(nome ** (m * (m + 1)) for m in range(_TERMS))
    bottom = 1 + 2 * sum(nome ** (m * m) for m in range(1, _TERMS))
    return np.asarray(4 * np.sqrt(nome) * (top / bottom) ** 2)


def _mean(value: Array) -> Array:
    """Return the arithmetic-geometric mean of 1 and a value: π/2 over the quarter period of its complement."""
    a, b = np.ones_like(value), value
    while np.any(np.abs(a - b) > 4e-16 * a):
        a, b = (a + b) / 2, np.sqrt(a * b)
    return a
