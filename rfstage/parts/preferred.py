"""Preferred values: the E series of IEC 60063, and what of them lies near a wanted value.

::

    E6, E12, E24           two digits, the standard's own list: every second, fourth of E24
    E48, E96, E192         three digits, 10^(k/n) rounded; one exception in E192, 9.20 where the rule gives 9.19

Values are scaled by powers of ten as decimal literals, so that 4.7e-9 is the float that ``4.7e-9`` is.
"""

from __future__ import annotations

from bisect import bisect_left
from functools import cache
from typing import NamedTuple

from rfstage.errors import InputError
from rfstage.fields import nearest
from rfstage.parts.ranges import need

# IEC 60063, from memory; the list departs from the rule of the finer series at 2.7 to 4.7 and at 8.2
_E24 = (10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91)
_EXCEPTION = {919: 920}  # IEC 60063, from memory: the one value of E192 that is not its rule's
SERIES = ("E6", "E12", "E24", "E48", "E96", "E192")
LEAST, MOST = 1e-300, 1e300  # beyond them decimal scaling loses digits


def _by_rule(count: int) -> tuple[int, ...]:
    digits = (round(100 * 10 ** (k / count)) for k in range(count))
    return tuple(_EXCEPTION.get(d, d) for d in digits)


# digits of one decade, and the power of ten that makes them a value from 1 to below 10
_DIGITS: dict[str, tuple[tuple[int, ...], int]] = {
    "E6": (_E24[::4], -1),
    "E12": (_E24[::2], -1),
    "E24": (_E24, -1),
    "E48": (_by_rule(48), -2),
    "E96": (_by_rule(96), -2),
    "E192": (_by_rule(192), -2),
}


class Neighbours(NamedTuple):
    """The preferred values on either side of a value, both that value where it is one itself."""

    below: float
    above: float


def series_values(series: str) -> tuple[float, ...]:
    """Return the values of a series from 1 to below 10.

    Raises
    ------
    InputError
        If there is no such series.

    References
    ----------
    IEC 60063, Preferred number series for resistors and capacitors.

    Examples
    --------
    >>> series_values("E6")
    (1.0, 1.5, 2.2, 3.3, 4.7, 6.8)
    """
    return _decade(series, 0)


def preferred_range(low: float, high: float, *, series: str) -> tuple[float, ...]:
    """Return the preferred values from ``low`` to ``high``, both counted in, rising; empty where there are none.

    Any unit; both from 1e-300 to 1e300.

    Raises
    ------
    InputError
        If there is no such series.
    OutOfRangeError
        If a bound is out of range, or the lower above the upper.

    Examples
    --------
    >>> preferred_range(8e-10, 2e-9, series="E6")
    (1e-09, 1.5e-09)
    """
    need("low", low, "", least=LEAST, most=MOST)
    need("high", high, "", least=low, most=MOST)
    exponents = range(_exponent(low), _exponent(high) + 1)
    return tuple(value for e in exponents for value in _decade(series, e) if low <= value <= high)


def neighbours(value: float, *, series: str) -> Neighbours:
    """Return the preferred values next below and above a value, from 1e-300 to 1e300 in any unit.

    Raises
    ------
    InputError
        If there is no such series.
    OutOfRangeError
        If the value is out of range.

    Examples
    --------
    >>> neighbours(5e-9, series="E12")
    Neighbours(below=4.7e-09, above=5.6e-09)
    >>> neighbours(4700.0, series="E12")
    Neighbours(below=4700.0, above=4700.0)
    """
    need("value", value, "", least=LEAST, most=MOST)
    exponent = _exponent(value)
    around = [v for e in range(exponent - 1, exponent + 2) for v in _decade(series, e)]
    place = bisect_left(around, value)
    above = around[place]
    return Neighbours(value if above == value else around[place - 1], above)


def nearest_preferred(value: float, *, series: str) -> float:
    """Return the preferred value with the least error in percent, the smaller of two that are as near.

    Raises
    ------
    InputError
        If there is no such series.
    OutOfRangeError
        If the value is not from 1e-300 to 1e300.

    Examples
    --------
    >>> nearest_preferred(5e-9, series="E12"), nearest_preferred(5e-9, series="E24")
    (4.7e-09, 5.1e-09)
    """
    below, above = neighbours(value, series=series)
    return below if value - below <= above - value else above


def _exponent(value: float) -> int:
    """Return the power of ten of a value's first digit."""
    return int(f"{value:e}".partition("e")[2])


@cache
def _decade(series: str, exponent: int) -> tuple[float, ...]:
    if series not in _DIGITS:
        raise InputError(f"series: got {series!r}; allowed {', '.join(SERIES)}{nearest(series, SERIES)}")
    digits, scale = _DIGITS[series]
    return tuple(float(f"{d}e{exponent + scale}") for d in digits)
