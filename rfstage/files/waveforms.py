"""Read a waveform from a table of time and volts or amperes: block by block, in memory that holds the samples only.

Blocks of plain numbers are read at the speed of the C library. Whatever looks odd is read again line by line, which
either makes sense of it or names the line.
"""

from __future__ import annotations

import math
import os
from collections.abc import Iterator
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from rfstage.errors import FileError
from rfstage.fields import plain
from rfstage.files.columns import AMPERES, CELL, ECHO, TIME, VOLTS, Head, cells_of
from rfstage.files.decimals import decimal_rows
from rfstage.files.tables import unreadable
from rfstage.verify.capture import Capture, Channel

Array = NDArray[np.float64]
Places = NDArray[np.int64]

BLOCK = 1 << 21  # bytes read at once
MOST_CHANNELS = 2
STEPS, KEPT = 1000, 16  # first steps that tell the usual one; times kept of every block
UNEVEN = 0.5  # of the interval: time as printed may be off by less


class Spacing:
    """Whether times are evenly spaced, told as they come.

    Every step is held against the first ones' median, and some times of every block against the straight line from
    the first to the last. ``at`` is the sample that is wrong.
    """

    def __init__(self) -> None:
        self.count = self.at = 0
        self.first = self.last = self.step = 0.0
        self.kept: list[tuple[Places, Array]] = []

    def take(self, times: Array) -> str:
        """Take some more times [s]; return what is wrong with them, or nothing."""
        if times.size == 0:
            return ""
        good = np.isfinite(times)
        if not good.all():
            self.at = self.count + int(np.argmin(good))
            return "the time is not a finite number"
        if self.count == 0:
            self.first = self.last = float(times[0])
            self.count, times = 1, times[1:]
            if times.size == 0:
                return ""
        steps = np.diff(times, prepend=self.last)
        if self.count == 1:
            self.step = float(np.median(np.abs(steps[:STEPS])))
        wrong = ~(np.abs(steps - self.step) <= UNEVEN * self.step) | (steps <= 0)
        some = np.unique(np.linspace(0, times.size - 1, KEPT).astype(np.int64))
        self.kept.append((self.count + some, times[some]))
        self.count += times.size
        self.last = float(times[-1])
        if not wrong.any():
            return ""
        k = int(np.argmax(wrong))
        self.at = self.count - times.size + k
        if steps[k] < 0:
            return f"the time goes back, by {-steps[k]:.4g} s"
        if steps[k] == 0:
            return "the time stands still: export it with more digits, or give --sample-rate"
        return f"the time is uneven: a step of {steps[k]:.4g} s where {self.step:.4g} s is usual"

    def interval(self) -> float | None:
        """Return the mean interval [s], or None where it changes along the record."""
        interval = (self.last - self.first) / (self.count - 1)
        off = max(float(np.abs(t - self.first - k * interval).max()) for k, t in self.kept)
        return None if off > UNEVEN * interval else interval


def is_waveform(head: Head) -> bool:
    """Return whether a table is one of channels over time, or of channels with an interval in its head."""
    kinds = [column.quantity for column in head.columns]
    return kinds[0] in (TIME, VOLTS, AMPERES) and all(kind in (VOLTS, AMPERES) for kind in kinds[1:])


def read_waveform(path: Path, head: Head, *, sample_rate: float | None = None) -> Capture:
    """Return a waveform.

    Parameters
    ----------
    path, head : Path, Head
        The file and its head.
    sample_rate : float or None
        Instead of the time in the file [Hz].

    Raises
    ------
    FileError
        With the line of what is wrong.
    """
    name = plain(path)
    timed = head.columns[0].quantity == TIME
    channels = head.columns[1:] if timed else head.columns
    if not 1 <= len(channels) <= MOST_CHANNELS:
        raise FileError(f"{name}: line {head.line - 1}: has {len(channels)} channels; wanted one or two")
    given = head.interval if sample_rate is None else 1 / sample_rate
    if not timed and given is None:
        raise FileError(f"{name}: has no column of time; give --sample-rate")
    spacing = Spacing()
    samples = [np.empty(_estimate(path, head)) for _ in channels]
    count, line = 0, head.line
    for block in _blocks(path, head, name):
        numbers, lines = _numbers(block, head, line, name)
        if timed and sample_rate is None:
            wrong = spacing.take(numbers[:, 0] * head.columns[0].factor)
            if wrong:
                raise FileError(f"{name}: line {lines[spacing.at - count]}: {wrong}")
        if count + len(numbers) > samples[0].size:
            for one in samples:
                one.resize(int(1.3 * (count + len(numbers))) + 1000, refcheck=False)
        for one, column, at in zip(samples, channels, range(int(timed), len(head.columns)), strict=True):
            np.multiply(numbers[:, at], column.factor, out=one[count : count + len(numbers)])
        count += len(numbers)
        line = lines[-1] + 1 if len(lines) else line
    if count < 2:
        raise FileError(f"{name}: holds {count} samples; wanted more to see a wave in")
    if given is None or (timed and sample_rate is None):
        interval = spacing.interval()
        if interval is None:
            raise FileError(f"{name}: the time is uneven: its interval changes along the record")
    else:
        interval = given
    made = tuple(
        Channel(column.name, column.quantity, one[:count]) for column, one in zip(channels, samples, strict=True)
    )
    return Capture(name, interval, made)


def _estimate(path: Path, head: Head) -> int:
    """Return about how many samples a file holds, a little more; memory never touched is never taken."""
    try:
        with open(path, "rb") as file:
            file.seek(head.offset)
            some = file.read(BLOCK // 16)
            size = os.fstat(file.fileno()).st_size
    except OSError as error:
        raise FileError(unreadable(plain(path), error)) from None
    a_line = len(some) / max(some.count(b"\n"), 1)
    return int(1.1 * size / a_line) + 16


def _blocks(path: Path, head: Head, name: str) -> Iterator[bytes]:
    """Yield the numbers' text in blocks of whole lines."""
    try:
        with open(path, "rb") as file:
            file.seek(head.offset)
            rest = b""
            while chunk := file.read(BLOCK):
                end = chunk.rfind(b"\n") + 1
                if end == 0:
                    rest += chunk
                    if len(rest) > 2 * BLOCK:
                        raise FileError(f"{name}: has a line too long to be a row of numbers")
                    continue
                yield rest + chunk[:end]
                rest = chunk[end:]
            if rest.strip():
                yield rest + b"\n"
    except OSError as error:
        if isinstance(error, FileError):
            raise
        raise FileError(unreadable(name, error)) from None


def _numbers(block: bytes, head: Head, line: int, name: str) -> tuple[Array, range | list[int]]:
    """Return the numbers of some whole lines, shape (rows, columns), and the line of each row."""
    quick = _quick(block, head.split, len(head.columns))
    if quick is not None and bool(np.isfinite(quick).all()):
        return quick, range(line, line + len(quick))
    return _by_line(block, head, line, name)


def _quick(block: bytes, split: str, columns: int) -> Array | None:
    """Return the numbers of a regular block, or None if it is not regular."""
    found = decimal_rows(block, split, columns) if split else None
    if found is not None:
        return found
    lines = block.decode("latin-1").split("\n")
    try:
        found = np.loadtxt(lines, dtype=np.float64, comments=None, delimiter=split or None, ndmin=2)
    except ValueError:
        return None
    return found if found.shape == (len(lines) - 1, columns) else None


def _by_line(block: bytes, head: Head, line: int, name: str) -> tuple[Array, list[int]]:
    """Return the numbers of lines that are not regular: blank lines pass, and whatever is wrong is told.

    Raises
    ------
    FileError
        With the first line that is wrong.
    """
    rows, lines = [], []
    for number, raw in enumerate(block.split(b"\n")[:-1], start=line):
        cells = cells_of(raw.decode("utf-8", errors="replace").strip(), head.split)
        if not cells:
            continue
        where = f"{name}: line {number}"
        if len(cells) != len(head.columns):
            cut = "the row is cut" if len(cells) < len(head.columns) else "a decimal comma, or more columns than named"
            raise FileError(f"{where}: has {len(cells)} columns where {len(head.columns)} are wanted: {cut}")
        row = []
        for cell, column in zip(cells, head.columns, strict=True):
            found = CELL.fullmatch(cell)
            if not found or found["below"] or found["unit"]:
                hint = "; write a decimal point, not a comma" if "," in cell else ""
                raise FileError(f"{where}: {plain(cell[:ECHO])!r} is not a number{hint}")
            value = float(found["number"])
            if not math.isfinite(value):
                raise FileError(
                    f"{where}: {plain(cell[:ECHO])!r} in column {plain(column.name)!r} is not a finite number"
                )
            row.append(value)
        rows.append(row)
        lines.append(number)
    return np.array(rows, dtype=np.float64).reshape(len(rows), len(head.columns)), lines
