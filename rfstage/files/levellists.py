"""Read a level list, and the response of a sampler: small tables of frequency and decibels."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np

from rfstage.errors import FileError, InputError
from rfstage.fields import plain
from rfstage.files.columns import CELL, ECHO, FREQUENCY, LEVEL, UNITS, Column, Head, cells_of, read_head
from rfstage.files.tables import unreadable
from rfstage.files.touchstone import read_network
from rfstage.verify.levels import LevelList, Reading, Response

LARGEST = 4_000_000  # bytes: more is no list
MOST_DECIBELS = 400.0  # either way: far beyond any instrument, and ratios stay numbers
SHOWN = 5  # problems told at once
_UNIT = {"dbm": "dBm", "dbc": "dBc", "db": "dB"}


def is_level_list(head: Head) -> bool:
    """Return whether a table is one of frequency and level."""
    return [column.quantity for column in head.columns] == [FREQUENCY, LEVEL]


def read_level_list(path: Path, head: Head) -> LevelList:
    """Return a level list; a level such as ``<-75`` says that nothing was seen above it.

    Raises
    ------
    FileError
        With the line of each cell that is wrong.
    """
    unit = _UNIT[head.columns[1].unit.lower()]
    if unit == "dB":
        raise FileError(f"{plain(path)}: line {head.line - 1}: levels in dB; wanted dBm, or dBc against the carrier")
    readings = [Reading(f, level, below) for f, level, below in _rows(path, head)]
    return LevelList(plain(path), unit, tuple(readings))


def read_sampler(path: str | Path) -> Response:
    """Return a sampler's response from a Touchstone two-port (its S21), or from a table of frequency and dB.

    Raises
    ------
    FileError, InputError
        If it can't be read, or is no response of a passive sampler.
    """
    path = Path(path)
    name = plain(path)
    if path.suffix.lower() == ".s2p":
        network = read_network(path, ports=2)
        through = np.abs(network.s[:, 1, 0])
        if np.any(through == 0):
            raise InputError(f"{name}: the sampler passes nothing at all at some frequency")
        return Response(np.asarray(network.f, dtype=np.float64), 20 * np.log10(through), name)
    head = read_head(path)
    if not is_level_list(head) or _UNIT[head.columns[1].unit.lower()] != "dB":
        raise FileError(f"{name}: is no response of a sampler; wanted columns such as 'frequency (MHz),response (dB)'")
    rows = _rows(path, head)
    below = [k for k, row in enumerate(rows) if row[2]]
    if below:
        raise FileError(f"{name}: a sampler's response is a number, without '<'")
    return Response(np.array([row[0] for row in rows]), np.array([row[1] for row in rows]), name)


def _rows(path: Path, head: Head) -> list[tuple[float, float, bool]]:
    name = plain(path)
    try:
        with open(path, "rb") as file:
            file.seek(head.offset)
            raw = file.read(LARGEST + 1)
    except OSError as error:
        raise FileError(unreadable(name, error)) from None
    if len(raw) > LARGEST:
        raise FileError(f"{name}: is too large for a list of levels")
    rows, problems = [], []
    for number, line in enumerate(raw.decode("utf-8", errors="replace").split("\n"), start=head.line):
        cells = cells_of(line.strip(), head.split)
        if not cells or cells[0].startswith("#"):
            continue
        try:
            if len(cells) != 2:
                raise InputError(
                    f"has {len(cells)} columns; wanted 2, a frequency and a level"
                    + (" (a decimal comma? write a point)" if head.split == "," and len(cells) in (3, 4) else "")
                )
            frequency, bounded = _cell(cells[0], head.columns[0])
            level, below = _cell(cells[1], head.columns[1])
            if bounded:
                raise InputError("'<' stands before the frequency; it belongs to the level")
            if frequency <= 0:
                raise InputError(f"the frequency {cells[0][:ECHO]!r} is not above 0")
            if abs(level) > MOST_DECIBELS:
                raise InputError(f"got {cells[1][:ECHO]!r}; allowed -{MOST_DECIBELS:g} to {MOST_DECIBELS:g} decibels")
            rows.append((frequency, level, below))
        except InputError as error:
            problems.append(f"{name}: line {number}: {error}")
    if problems:
        more = len(problems) - SHOWN
        raise FileError(
            "\n".join(problems[:SHOWN] + ([f"{name}: and {more} more lines like these"] if more > 0 else []))
        )
    return rows


def _cell(text: str, column: Column) -> tuple[float, bool]:
    found = CELL.fullmatch(text)
    if not found:
        hint = "; write a decimal point, not a comma" if "," in text else ""
        raise InputError(f"{plain(text[:ECHO])!r} is not a number{hint}")
    value, factor = float(found["number"]), column.factor
    if not math.isfinite(value):
        raise InputError(f"{text[:ECHO]!r} is not a finite number")
    if found["unit"]:
        quantity, own = UNITS.get(found["unit"].lower(), ("", 0.0))
        same = found["unit"].lower() == column.unit.lower()
        if quantity != column.quantity or (quantity == LEVEL and not same):
            raise InputError(f"{text[:ECHO]!r} is not in {column.unit}, as its column says")
        factor = own
    return value * factor, bool(found["below"])
