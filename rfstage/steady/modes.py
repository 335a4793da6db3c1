"""A pair's two modes: what both devices have in common, and what they have against each other.

::

    even = (a + b)/2        a = even + odd
    odd  = (a − b)/2        b = even − odd

In the modes the network comes apart: each has its own impedance, and only the devices tie them together. Arrays
of a pair have an axis of two behind that of the stages, devices a and b or modes even and odd.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

EVEN, ODD = 0, 1


def modes(devices: NDArray[Any]) -> NDArray[Any]:
    """Return even and odd mode of both devices, shape (S, 2, ...).

    Examples
    --------
    >>> modes(np.array([[3.0, 1.0]]))
    array([[2., 1.]])
    """
    return each(devices) / 2


def each(modes: NDArray[Any]) -> NDArray[Any]:
    """Return both devices from even and odd mode, shape (S, 2, ...).

    Examples
    --------
    >>> each(np.array([[2.0, 1.0]]))
    array([[3., 1.]])
    """
    even, odd = modes[:, EVEN], modes[:, ODD]
    return np.stack((even + odd, even - odd), axis=1)
