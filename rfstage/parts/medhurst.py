r"""Medhurst's measured data of single-layer coils: self-capacitance and high-frequency resistance.

::

    symbol  name                 unit
    ------  -------------------  ----
    l/D     length_to_diameter   -     length is turns × pitch, diameter from wire centre to wire centre
    d/p     wire_to_pitch        -     1 is close-wound
    H       —                    pF/cm self-capacitance over diameter, one end of the coil grounded; stated to 5 %
    φ       —                    -     resistance of the coil over that of the same wire drawn straight

φ is the limit of high frequency, where the current has gone to the skin, and of coils of many turns. Both tables come
back exactly at their nodes. Between them ln H goes linearly with ln(l/D), and ln φ with d/p and with x/(1 + x),
x = l/D, which brings the table's last column, the endless coil, to 1. Outside the tables nothing is guessed.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from rfstage.parts.arrays import checked

SOURCE = "R. G. Medhurst, Wireless Engineer 24 (1947), pages 35 and 80"
SHORTEST, LONGEST = 0.1, 50.0  # l/D of the self-capacitance
LEAST_WIRE_TO_PITCH = 0.1
_ROUNDING = 1e-9  # of a ratio: a close-wound coil divides to a last digit above 1

# SOURCE: the paper's table of H as restated, with its reference, by E. Rzeszotarski (1996)
_SELF_CAPACITANCE = (
    *((0.1, 0.96), (0.15, 0.79), (0.2, 0.70), (0.25, 0.64), (0.3, 0.60), (0.35, 0.57), (0.4, 0.54), (0.45, 0.52)),
    *((0.5, 0.50), (0.6, 0.48), (0.7, 0.47), (0.8, 0.46), (0.9, 0.46), (1.0, 0.46), (1.5, 0.47), (2.0, 0.50)),
    *((2.5, 0.56), (3.0, 0.61), (3.5, 0.67), (4.0, 0.72), (4.5, 0.77), (5.0, 0.81), (6.0, 0.92), (7.0, 1.01)),
    *((8.0, 1.12), (9.0, 1.22), (10.0, 1.32), (15.0, 1.86), (20.0, 2.36), (25.0, 2.9), (30.0, 3.4), (40.0, 4.6)),
    (50.0, 5.8),
)
_LENGTHS = (0.0, 0.2, 0.4, 0.6, 0.8, 1.0, 2.0, 4.0, 6.0, 8.0, 10.0, np.inf)
# SOURCE: the paper's table of φ, alike in several public transcriptions; row 0.1 and the first columns of row 0.2 from
# memory. Transcriptions differ in two cells: (0.4, 0) is 1.26 or 1.20, (0.7, 10) 2.37 or 2.27; the first of each fits
# its neighbours.
_RESISTANCE = {
    0.1: (1.02, 1.02, 1.03, 1.03, 1.03, 1.03, 1.04, 1.04, 1.04, 1.04, 1.04, 1.05),
    0.2: (1.07, 1.08, 1.08, 1.10, 1.10, 1.10, 1.13, 1.15, 1.16, 1.165, 1.17, 1.19),
    0.3: (1.16, 1.19, 1.21, 1.22, 1.23, 1.24, 1.28, 1.32, 1.34, 1.34, 1.35, 1.40),
    0.4: (1.26, 1.29, 1.33, 1.38, 1.42, 1.45, 1.50, 1.54, 1.56, 1.57, 1.58, 1.65),
    0.5: (1.44, 1.48, 1.54, 1.60, 1.64, 1.67, 1.74, 1.78, 1.80, 1.81, 1.83, 1.93),
    0.6: (1.74, 1.77, 1.83, 1.89, 1.92, 1.94, 1.98, 2.01, 2.03, 2.08, 2.10, 2.22),
    0.7: (2.12, 2.20, 2.28, 2.38, 2.44, 2.47, 2.32, 2.27, 2.29, 2.34, 2.37, 2.51),
    0.8: (2.74, 2.83, 2.97, 3.10, 3.20, 3.17, 2.74, 2.60, 2.60, 2.62, 2.65, 2.81),
    0.9: (3.73, 3.84, 3.99, 4.11, 4.17, 4.10, 3.36, 3.05, 2.92, 2.90, 2.93, 3.11),
    1.0: (5.31, 5.45, 5.65, 5.80, 5.80, 5.55, 4.10, 3.54, 3.31, 3.20, 3.23, 3.41),
}
_H_AT, _H = (np.log(column) for column in zip(*_SELF_CAPACITANCE, strict=True))
_SPACINGS = np.array(tuple(_RESISTANCE))
_PLACES = np.array([1.0 if np.isinf(x) else x / (1 + x) for x in _LENGTHS])
_PHI = np.log(np.array(tuple(_RESISTANCE.values())))


def self_capacitance(diameter: ArrayLike, length: ArrayLike) -> Any:
    """Return the self-capacitance of a coil with one end grounded [F].

    Parameters
    ----------
    diameter, length : array_like, shape (...)
        Above 0 [m]; length over diameter from 0.1 to 50.

    Returns
    -------
    float or ndarray, shape (...)
        F. The paper states 5 %.

    Raises
    ------
    OutOfRangeError
        Where length over diameter is outside the table.

    References
    ----------
    R. G. Medhurst, Wireless Engineer 24 (1947), page 35.

    Examples
    --------
    >>> round(float(self_capacitance(50e-3, 50e-3)) * 1e12, 2)
    2.3
    """
    d = checked("diameter", diameter, "m", above=0)
    ratio = checked("length", length, "m", above=0) / d
    checked(
        "length over diameter",
        ratio,
        "",
        least=SHORTEST * (1 - _ROUNDING),
        most=LONGEST * (1 + _ROUNDING),
        hint="Medhurst's table of self-capacitance ends there",
    )
    return np.exp(np.interp(np.log(ratio), _H_AT, _H)) * 1e-10 * d  # 1 pF/cm is 1e-10 F/m


def resistance_ratio(wire_to_pitch: ArrayLike, length_to_diameter: ArrayLike) -> Any:
    """Return what winding wire to a coil multiplies its high-frequency resistance by.

    Parameters
    ----------
    wire_to_pitch : array_like, shape (...)
        0.1 to 1 [-].
    length_to_diameter : array_like, shape (...)
        0 or more; infinity is the endless coil [-].

    Returns
    -------
    float or ndarray, shape (...)
        [-], about 1.02 for wide spacing to 5.8 close-wound.

    Raises
    ------
    OutOfRangeError
        Where a ratio is outside the table.

    References
    ----------
    R. G. Medhurst, Wireless Engineer 24 (1947), page 80.

    Examples
    --------
    >>> round(float(resistance_ratio(0.5, 1.0)), 3), round(float(resistance_ratio(0.45, 1.5)), 3)
    (1.67, 1.592)
    """
    y = checked(
        "wire over pitch",
        wire_to_pitch,
        "",
        least=LEAST_WIRE_TO_PITCH * (1 - _ROUNDING),
        most=1 + _ROUNDING,
        hint="Medhurst's table of resistance ends there",
    )
    x = np.asarray(length_to_diameter, dtype=np.float64)
    checked("length over diameter", np.where(np.isposinf(x), 0.0, x), "", least=0)
    place = np.where(np.isposinf(x), 1.0, x / (1 + np.where(np.isposinf(x), 0.0, x)))
    y, place = np.broadcast_arrays(y, place)
    row, down = _between(y, _SPACINGS)
    column, right = _between(place, _PLACES)
    top = _PHI[row, column] * (1 - right) + _PHI[row, column + 1] * right
    bottom = _PHI[row + 1, column] * (1 - right) + _PHI[row + 1, column + 1] * right
    return np.exp(top * (1 - down) + bottom * down)


def _between(value: Any, nodes: Any) -> tuple[Any, Any]:
    """Return the node below each value and the share of the way to the next."""
    below = np.clip(np.searchsorted(nodes, value, side="right") - 1, 0, len(nodes) - 2)
    return below, (value - nodes[below]) / (nodes[below + 1] - nodes[below])
