"""One description a value: its key, option, unit and range; what reads it and says what is wrong.

Job files, stage files and command lines all read their values through these descriptions, so that an
error reads the same wherever the value came from. Standard library only: a malformed job is refused
before anything heavy is loaded.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from typing import Any, NamedTuple

from rfstage.quantity import QuantityError, exact_complex, exact_text, parse_complex, parse_real

LOSSLESS = "lossless"


class Field(NamedTuple):
    """One value a person may give.

    ``unit`` is one of `rfstage.quantity`; ``kind`` is real, impedance, q, count, choice, text or
    flag; the range is ``low`` to ``high``, with ``low`` itself left out if ``above``.
    """

    path: str
    name: str
    kind: str
    unit: str = ""
    low: float = -math.inf
    high: float = math.inf
    above: bool = False
    option: str = ""
    help: str = ""
    choices: tuple[str, ...] = ()


def allowed(field: Field) -> str:
    """Return the range in words: ``above 0 W, to 10 MW``."""
    if field.kind == "choice":
        return " | ".join(field.choices)
    low, high = _bound(field.low, field.unit), _bound(field.high, field.unit)
    if field.low == -math.inf:
        text = "any" if field.high == math.inf else f"up to {high}"
    elif field.high == math.inf:
        text = f"above {low}" if field.above else f"{low} or more"
    else:
        text = f"above {low}, to {high}" if field.above else f"{low} to {high}"
    if field.kind == "impedance":
        text = f"R+jX with a resistance {text}"
    return f"{text}, or {LOSSLESS}" if field.kind == "q" else text


def _bound(value: float, unit: str) -> str:
    return "" if math.isinf(value) else exact_text(value, unit)


def read(field: Field, raw: object) -> Any:
    """Return the value of a field from text or number.

    Raises
    ------
    QuantityError
        Saying what was got and what is allowed; the key's path is not in the message.
    """
    if isinstance(raw, bool) or not isinstance(raw, str | int | float):
        raise QuantityError(f"got {raw!r}; wanted {_wanted(field)}")
    if field.kind in ("choice", "text"):
        return _read_text(field, raw)
    try:
        if field.kind == "q" and raw == LOSSLESS:
            return math.inf
        if field.kind == "impedance":
            value: Any = parse_complex(raw, field.unit) if isinstance(raw, str) else complex(raw)
        else:
            value = parse_real(raw, field.unit) if isinstance(raw, str) else float(raw)
    except OverflowError:
        raise QuantityError(f"got a number beyond the range; allowed {allowed(field)}") from None
    return check(field, value)


def _read_text(field: Field, raw: object) -> str:
    if not isinstance(raw, str) or not raw.strip():
        raise QuantityError(f"got {raw!r}; wanted {_wanted(field)}")
    if field.choices and raw not in field.choices:
        raise QuantityError(f"got {raw!r}; allowed {allowed(field)}{nearest(raw, field.choices)}")
    return raw


def _wanted(field: Field) -> str:
    return "a text" if field.kind == "text" else allowed(field)


def check(field: Field, value: Any) -> Any:
    """Return the value if it lies in the field's range, a count as an int.

    Raises
    ------
    QuantityError
        If not, with a likely fix where a prefix of the unit would make it right.
    """
    if field.kind == "q" and value == math.inf:
        return value
    size = value.real if field.kind == "impedance" else value
    if not math.isfinite(abs(value)):
        raise QuantityError(f"got {value}; wanted a finite number, {allowed(field)}")
    if size < field.low or size > field.high or (field.above and size == field.low):
        shown = exact_complex(value) + " ohm" if field.kind == "impedance" else exact_text(value, field.unit)
        raise QuantityError(f"got {shown}; allowed {allowed(field)}{_likely(field, size)}")
    if field.kind == "count":
        if value != int(value):
            raise QuantityError(f"got {value:g}; wanted a whole number, {allowed(field)}")
        return int(value)
    return value


def _likely(field: Field, value: float) -> str:
    """Suggest the sign or the prefix that was probably meant."""
    if value < 0 <= field.low:
        return " (is the minus sign meant?)"
    if field.unit == "Hz" and 0 < value < field.low:
        return f" (did you mean {exact_text(value * (1e9 if value < 1 else 1e6), 'Hz')}?)"
    return ""


def nearest(word: str, known: Iterable[str]) -> str:
    """Return `` (did you mean …?)`` for the known word nearest to one that is not known, or nothing."""
    from difflib import get_close_matches

    found = get_close_matches(word, list(known), n=1, cutoff=0.5)
    return f" (did you mean {found[0]!r}?)" if found else ""
