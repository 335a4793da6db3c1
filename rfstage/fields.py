"""One description a value: its key, option, unit and range; what reads it and says what is wrong.

Job files, stage files and command lines all read their values through these descriptions, so that an
error reads the same wherever the value came from. Standard library only: a malformed job is refused
before anything heavy is loaded.
"""

import math
from collections.abc import Iterable
from typing import Any, NamedTuple

from rfstage.quantity import QuantityError, exact_complex, exact_text, parse_complex, parse_real

LOSSLESS = "lossless"
LONGEST_ECHO = 60  # characters of a text that a message repeats


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
        text = f"above {low}, to {high}" if field.above else low if low == high else f"{low} to {high}"
    if field.kind == "impedance":
        text = f"R+jX with a resistance {text}"
    return f"{text}, or {LOSSLESS}" if field.kind == "q" else text


def _bound(value: float, unit: str) -> str:
    if math.isinf(value):
        return ""
    return f"{value / 1e6:g} million" if not unit and value >= 1e6 else exact_text(value, unit)


def plain(text: object) -> str:
    """Return a text for one line of a message: what is no visible character is shown escaped."""
    return "".join(c if c.isprintable() else repr(c)[1:-1] for c in str(text))


def shown(raw: object) -> str:
    """Return what a file or an option gave, for a message: in TOML's words, never in Python's."""
    if isinstance(raw, bool):
        return "true" if raw else "false"
    if isinstance(raw, dict):
        return "a table"
    if isinstance(raw, list):
        return "a list"
    if isinstance(raw, str):
        return repr(raw if len(raw) <= LONGEST_ECHO else raw[:LONGEST_ECHO] + "…")
    return f"{raw}" if isinstance(raw, int | float) else f"a date or time ({raw})"


def read(field: Field, raw: object) -> Any:
    """Return the value of a field from text or number.

    Raises
    ------
    QuantityError
        Saying what was got and what is allowed; the key's path is not in the message.
    """
    if isinstance(raw, bool) or not isinstance(raw, str | int | float):
        raise QuantityError(f"got {shown(raw)}; wanted {_wanted(field)}")
    if field.kind in ("choice", "text"):
        return _read_text(field, str(raw) if isinstance(raw, int) and str(raw) in field.choices else raw)
    try:
        if field.kind == "q" and isinstance(raw, str) and raw.strip() == LOSSLESS:
            return math.inf
        if field.kind == "impedance":
            value: Any = parse_complex(raw, field.unit) if isinstance(raw, str) else complex(raw)
        else:
            value = parse_real(raw, field.unit) if isinstance(raw, str) else float(raw)
    except OverflowError:
        raise QuantityError(f"got a number beyond the range; allowed {allowed(field)}") from None
    except QuantityError:
        if field.unit or "," in str(raw):  # the reader of quantities knows better what is wrong
            raise
        raise QuantityError(f"got {shown(raw)}; wanted {_wanted(field)}") from None
    return check(field, value)


def _read_text(field: Field, raw: object) -> str:
    if not isinstance(raw, str) or not raw.strip():
        raise QuantityError(f"got {shown(raw)}; wanted {_wanted(field)}")
    if field.choices and raw not in field.choices:
        near = "" if raw.isdigit() else nearest(raw, field.choices)  # a number is not misspelt
        raise QuantityError(f"got {shown(raw)}; allowed {allowed(field)}{near}")
    return raw


def _wanted(field: Field) -> str:
    if field.kind == "text":
        return "a text"
    return f"a whole number, {allowed(field)}" if field.kind == "count" else allowed(field)


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
        got = exact_complex(value) + " ohm" if field.kind == "impedance" else exact_text(value, field.unit)
        raise QuantityError(f"got {got}; allowed {allowed(field)}{_likely(field, size)}")
    if field.kind == "count":
        if value != int(value):
            raise QuantityError(f"got {exact_text(value, field.unit)}; wanted {_wanted(field)}")
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
    """Return `` (did you mean …?)`` for the known word nearest to one that is not known, or nothing.

    A word that differs only by capitals is the nearest; the dashes of an option make no likeness.

    Examples
    --------
    >>> nearest("c1", ["L1", "C1"]), nearest("--carier", ["--carrier", "--power"]), nearest("--frob", ["--spice"])
    (" (did you mean 'C1'?)", " (did you mean '--carrier'?)", '')
    """
    folded: dict[str, str] = {}
    for name in known:
        folded.setdefault(name.lower().lstrip("-"), name)
    wanted = word.lower().lstrip("-")
    if wanted in folded:
        return f" (did you mean {folded[wanted]!r}?)"
    from difflib import get_close_matches

    cutoff = 0.6 if len(wanted) > 2 else 0.5  # of two letters one may be wrong, as in C7 for C1
    found = get_close_matches(wanted, folded, n=1, cutoff=cutoff)
    return f" (did you mean {folded[found[0]]!r}?)" if found else ""
