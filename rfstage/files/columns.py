"""The head of a table of measurements: what stands between its cells, what its columns are, where the numbers begin.

A head may have any lines above the numbers: names, units, and what instruments write of themselves
(``Sample Interval,4e-10``). Every column must say what it is; nothing is guessed from the numbers.
"""

from __future__ import annotations

import re
from pathlib import Path
from typing import NamedTuple

from rfstage.errors import FileError
from rfstage.fields import plain
from rfstage.files.tables import unreadable

HEAD = 65536  # bytes in which the numbers must begin
TIME, FREQUENCY, LEVEL, VOLTS, AMPERES = "time", "frequency", "level", "V", "A"
_PREFIX = {"": 1.0, "k": 1e3, "m": 1e-3, "u": 1e-6, "µ": 1e-6, "μ": 1e-6, "n": 1e-9, "p": 1e-12}
# unit in lower case -> (what it measures, factor to SI or the unit kept)
UNITS: dict[str, tuple[str, float]] = {
    **{f"{p}s": (TIME, _PREFIX[p]) for p in ("", "m", "u", "µ", "μ", "n", "p")},
    **dict.fromkeys(("sec", "secs", "second", "seconds"), (TIME, 1.0)),
    "hz": (FREQUENCY, 1.0),
    "khz": (FREQUENCY, 1e3),
    "mhz": (FREQUENCY, 1e6),
    "ghz": (FREQUENCY, 1e9),
    **dict.fromkeys(("dbm", "dbc", "db"), (LEVEL, 1.0)),
    **{f"{p}v": (VOLTS, _PREFIX[p]) for p in ("", "m", "u", "µ", "μ", "k")},
    **dict.fromkeys(("volt", "volts"), (VOLTS, 1.0)),
    **{f"{p}a": (AMPERES, _PREFIX[p]) for p in ("", "m", "u", "µ", "μ")},
    **dict.fromkeys(("amp", "amps", "ampere", "amperes"), (AMPERES, 1.0)),
}
# the unit a column has by its name alone, where that leaves no choice
_NAMED = {"time": "s", "t": "s", "x-axis": "s", "voltage": "V", "current": "A"}
_ENCLOSED = re.compile(r"^(?P<name>.*?)[\s_]*[(\[]\s*(?P<unit>[^()\[\]]+?)\s*[)\]]$")
_AT_END = re.compile(r"^(?P<name>.+?)[\s_/]+(?P<unit>\S+)$")
CELL = re.compile(
    r"(?P<below><?)\s*(?P<number>[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?|[+-]?(?:nan|inf(?:inity)?))"
    r"\s*(?P<unit>[A-Za-zµμ]+)?",
    re.ASCII | re.IGNORECASE,
)
_COMMA = re.compile(r"[+-]?\d+,\d+(?:[eE][+-]?\d+)?")
_SPLITS = (";", "\t", ",")
ECHO = 40  # characters of a cell that a message repeats


class Column(NamedTuple):
    """One column: its name, what it measures, its unit as written, and the factor to SI."""

    name: str
    quantity: str
    unit: str
    factor: float


class Head(NamedTuple):
    """What stands before the numbers.

    ``split`` is the character between cells, or empty for spaces; ``columns`` as many as there are; ``line`` and
    ``offset`` [bytes] where the numbers begin; ``interval`` between samples [s] where the head gives one.
    """

    split: str
    columns: tuple[Column, ...]
    line: int
    offset: int
    interval: float | None


def cells_of(line: str, split: str) -> list[str]:
    """Return the cells of a line, without quotes and spaces around them, and without empty ones at its end."""
    cells = [cell.strip().strip('"').strip() for cell in (line.split(split) if split else line.split())]
    while cells and not cells[-1]:
        cells.pop()
    return cells


def read_head(path: Path) -> Head:
    """Return the head of a table.

    Raises
    ------
    FileError
        If the file can't be read, is no text, has no numbers, or does not say what its columns are; with the line.
    """
    name = plain(path)
    try:
        with open(path, "rb") as file:
            raw = file.read(HEAD)
    except OSError as error:
        raise FileError(unreadable(name, error)) from None
    if not raw.strip():
        raise FileError(f"{name}: is empty")
    if raw[:2] in (b"\xff\xfe", b"\xfe\xff"):
        raise FileError(f"{name}: is a text in UTF-16; save it as UTF-8")
    if b"\0" in raw:
        raise FileError(f"{name}: is no text; wanted a table of numbers (.csv), .npy, .s1p or .s2p")
    marked = 3 if raw.startswith(b"\xef\xbb\xbf") else 0
    offset = marked
    before: list[str] = []
    for number, line in enumerate(raw[marked:].split(b"\n"), start=1):
        text = line.decode("utf-8", errors="replace").strip()
        split = next((s for s in _SPLITS if s in text), "")
        cells = cells_of(text, split)
        if cells and CELL.fullmatch(cells[0]) and all(CELL.fullmatch(cell) for cell in cells):
            return _found(name, split, cells, before, number, offset)
        if cells and split != "," and any(_COMMA.fullmatch(cell) for cell in cells):
            raise FileError(f"{name}: line {number}: has decimal commas; write decimal points")
        before.append(text)
        offset += len(line) + 1
    raise FileError(f"{name}: has no line of numbers within its first {len(before)} lines")


def _found(name: str, split: str, cells: list[str], before: list[str], line: int, offset: int) -> Head:
    bare = [text.lstrip("#!% ") for text in before]
    heads = [cells_of(text, split) if len(cells) > 1 else [text.strip().strip('"')] for text in bare]
    above = [(k, row) for k, row in enumerate(heads, start=1) if len(row) == len(cells) and row[0]]
    units: list[str] | None = None
    if above and all(_bare(cell).lower() in UNITS for cell in above[-1][1]):
        units = [_bare(cell) for cell in above[-1][1]]
        above.pop()
    if not above and units is None:
        others = [row for row in heads if len(row) > 1]
        hint = (
            f" (its head has {len(others[-1])} columns and the numbers {len(cells)}: a decimal comma would do that)"
            if others and split == "," and len(others[-1]) * 2 == len(cells)
            else ""
        )
        raise FileError(
            f"{name}: line {line}: no line above says what the {len(cells)} columns are{hint}; wanted a line such as "
            "'frequency (MHz),level (dBm)' or 'time (s),voltage (V)'"
        )
    at, names = above[-1] if above else (line - 1, units or [])
    odd = next((cell for cell in names if not CELL.fullmatch(cell)), None)
    if odd is not None and CELL.fullmatch(names[0]):
        raise FileError(f"{name}: line {at}: {plain(odd[:ECHO])!r} is not a number (a bound is written as <-60)")
    interval, vertical = _settings(bare)
    columns = tuple(
        titled(text, f"{name}: line {at}", units[k] if units else "", vertical) for k, text in enumerate(names)
    )
    return Head(split, columns, line, offset, interval)


def _settings(lines: list[str]) -> tuple[float | None, str]:
    """Return the interval [s] and the unit of all channels, where a head gives them on lines of their own."""
    interval, vertical = None, ""
    for text in lines:
        row = cells_of(text, next((s for s in _SPLITS if s in text), ":"))
        if len(row) > 1:
            interval = _interval(row) or interval
            vertical = row[1] if row[0].lower() in ("vertical units", "vertical unit") else vertical
    return interval, vertical


def _bare(cell: str) -> str:
    return cell.strip("()[] ")


def _interval(row: list[str]) -> float | None:
    """Return the interval [s] that a line of the head gives, such as ``Sample Interval,4e-10,s``."""
    title = row[0].lower().strip(":= ")
    found = CELL.fullmatch(row[1])
    if not found or found["below"]:
        return None
    value = float(found["number"])
    unit = (found["unit"] or (row[2] if len(row) > 2 else "")).lower()
    enclosed = _ENCLOSED.fullmatch(title)
    if enclosed:
        title, unit = enclosed["name"].strip(), unit or enclosed["unit"].lower()
    what, factor = UNITS.get(unit, ("", 1.0))
    if title in ("sample interval", "sampling interval", "x increment", "increment") and what in ("", TIME):
        return value * factor if value > 0 else None
    if title in ("sample rate", "sampling rate", "sampling frequency") and what in ("", FREQUENCY):
        return 1 / (value * factor) if value > 0 else None
    return None


def titled(text: str, where: str, unit: str = "", vertical: str = "") -> Column:
    """Return a column from its title, and from the unit beneath it or the unit of all channels.

    Raises
    ------
    FileError
        If it has no unit, or none that is known; ``where`` begins the message.

    Examples
    --------
    >>> titled("CH1 (mV)", "a.csv: line 1")
    Column(name='CH1', quantity='V', unit='mV', factor=0.001)
    """
    title = text.strip()
    own = unit
    for pattern in (_ENCLOSED, _AT_END):
        found = pattern.fullmatch(title)
        if not own and found and (found["unit"].lower() in UNITS or pattern is _ENCLOSED):
            title, own = found["name"].strip(), found["unit"]
    if not own and title.lower() in UNITS and title.lower() not in _NAMED and (len(title) > 1 or title in "sVA"):
        own = title
    if not own:
        own = _NAMED.get(title.lower(), "") or (vertical if not title.lower().startswith("freq") else "")
    if not own:
        raise FileError(
            f"{where}: column {plain(text[:ECHO])!r} has no unit; write it behind the name, such as 'frequency (MHz)', "
            "'level (dBm)', 'time (s)', 'CH1 (V)'"
        )
    if own.lower() not in UNITS:
        raise FileError(
            f"{where}: column {plain(text[:ECHO])!r} is in {plain(own[:ECHO])!r}, which is not known here; wanted Hz, "
            "dBm, dBc, dB, s, V or A, with a prefix where it has one"
        )
    quantity, factor = UNITS[own.lower()]
    return Column(title or text, quantity, own, factor)
