"""What the rooms of coils share: arrays whose numbers are checked, and the root of a rising function."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray

from rfstage.errors import ConvergenceError
from rfstage.parts.ranges import need

Real = NDArray[np.float64]
_STEPS = 300  # a quarter of them halvings: more than a float can tell apart
_CLOSED = 2e-14  # of the root: the width of a bracket that is closed


def checked(
    name: str,
    value: ArrayLike,
    unit: str,
    *,
    above: float | None = None,
    least: float | None = None,
    most: float | None = None,
    hint: str = "",
) -> Real:
    """Return a value as an array of floats, all of them finite and in the range; ranges as `rfstage.parts.ranges.need`.

    Raises
    ------
    OutOfRangeError
        For the first end of the values that is outside.

    Examples
    --------
    >>> checked("turns", [1, 12.5], "", least=1).tolist()
    [1.0, 12.5]
    """
    array = np.asarray(value, dtype=np.float64)
    if array.size:
        for extreme in (array.min(), array.max()):  # both are NaN where any is
            need(name, float(extreme), unit, above=above, least=least, most=most, hint=hint)
    return array


def rising_root(function: Callable[[Real], Real], target: Real, low: Real, high: Real) -> Real:
    """Return where a rising function has its target, inside brackets that hold it.

    Three steps by false position, where an end that stays twice counts half, then one by halving, so that the bracket
    always closes.

    Parameters
    ----------
    function : callable
        Array in, array of the same shape out; never falling from ``low`` to ``high``.
    target, low, high : ndarray
        Of one shape; ``function(low) <= target <= function(high)``.

    Returns
    -------
    ndarray
        To 2e-14 of it.

    Raises
    ------
    ConvergenceError
        If a bracket has not closed, which a rising function can't bring about.

    Examples
    --------
    >>> round(float(rising_root(np.square, np.array(2.0), np.array(1.0), np.array(2.0))), 12)
    1.414213562373
    """
    f_low, f_high = function(low) - target, function(high) - target
    was_below = np.zeros(np.shape(low), dtype=bool)
    for step in range(_STEPS):
        span = f_high - f_low
        share = np.where(span > 0, -f_low / np.where(span > 0, span, 1.0), 0.5) if step % 4 < 3 else 0.5
        # a step that would not leave an end goes a few digits past it, so that the far end comes in too
        inset = 0.25 * _CLOSED * np.abs(high)
        middle = np.clip(low + share * (high - low), np.minimum(low + inset, high), np.maximum(high - inset, low))
        value = function(middle) - target
        below = value < 0
        low, high = np.where(below, middle, low), np.where(below, high, middle)
        again = 0.5 if step else 1.0
        f_low, f_high = (
            np.where(below, value, f_low * np.where(was_below, 1.0, again)),
            np.where(below, f_high * np.where(was_below, again, 1.0), value),
        )
        was_below = below
        if np.all((high - low <= _CLOSED * np.abs(high)) | (value == 0)):
            return middle
    raise ConvergenceError(f"a root has not closed in {_STEPS} steps")
