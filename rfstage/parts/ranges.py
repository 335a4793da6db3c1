"""One check for the numbers that rooms of parts are given: finite, and within what the formula allows."""

from __future__ import annotations

import math

from rfstage.errors import OutOfRangeError
from rfstage.quantity import exact_text

_PREFIXED = ("F", "H", "Hz", "V", "A", "W", "ohm", "m")  # the units that are written with a prefix


def need(
    name: str,
    value: float,
    unit: str,
    *,
    above: float | None = None,
    least: float | None = None,
    most: float | None = None,
    hint: str = "",
) -> None:
    """Refuse a number that is not finite or outside its range; the bounds are in ``unit``.

    Raises
    ------
    OutOfRangeError
        With the name, what was given, the range with its unit, and the hint.

    Examples
    --------
    >>> need("wanted", 1e-9, "F", above=0)
    >>> need("duty", 1.5, "", above=0, most=1)
    Traceback (most recent call last):
        ...
    rfstage.errors.OutOfRangeError: duty must be above 0, at most 1; got 1.5
    """
    holds = (
        math.isfinite(value)
        and (above is None or value > above)
        and (least is None or value >= least)
        and (most is None or value <= most)
    )
    if holds:
        return
    bounds = (("above", above), ("at least", least), ("at most", most))
    words = [f"{word} {_written(bound, unit)}" for word, bound in bounds if bound is not None]
    raise OutOfRangeError(name, _written(value, unit), ", ".join(words) or "a finite number", hint)


def _written(value: float, unit: str) -> str:
    return exact_text(value, unit) if unit in _PREFIXED and math.isfinite(value) else f"{value:g} {unit}".strip()
