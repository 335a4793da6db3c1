"""A page of text: headings, rows in columns, wrapped notes; in colour or plain, in Unicode or ASCII.

Sections are lists of rich texts whose columns are aligned before anything is printed, so that nothing is
cut in a pipe, and a page reads the same with and without colour.
"""

from __future__ import annotations

import io
import os
import re
import shutil
import sys
import textwrap
from collections.abc import Sequence
from typing import IO, NamedTuple

from rich.console import Console
from rich.text import Text

PIPE_WIDTH = 100
_FIGURE = re.compile(r"(?<=\d) (?=(?:[fpnuµmkMGT]?(?:Hz|ohm|[VAWΩFHSJTms])|dB|dBc|dBi|%|deg|°C|degC|K/W)\b)| (?=%)")
NO_BREAK = "\u00a0"  # keeps a figure with its label where a note wraps
_ASCII = (
    ("µ", "u"),
    ("Ω", "ohm"),
    ("−", "-"),
    ("×", "x"),
    (" °C", " degC"),
    ("°", " deg"),
    ("·", "*"),
    ("≤", "<="),
    ("≥", ">="),
    ("→", "->"),
    ("…", "..."),
    ("√", "sqrt"),
    ("λ", "wavelength"),
    ("π", "pi"),
    ("²", "^2"),
    ("±", "+/-"),
    ("η", "efficiency"),
    ("–", "-"),
)


class Look(NamedTuple):
    """How a page is to look: its width in columns, and whether it must be ASCII."""

    width: int = PIPE_WIDTH
    ascii: bool = False

    def text(self, words: str) -> str:
        """Return words in the alphabet of this page."""
        if self.ascii:
            for mark, plain in _ASCII:
                words = words.replace(mark, plain)
        return words

    @property
    def rule(self) -> str:
        """The character of a heading's line."""
        return "-" if self.ascii else "─"


class Cell(NamedTuple):
    """Words in a column, with a style, and whether they stand to the right."""

    words: str
    style: str = ""
    right: bool = False


def heading(look: Look, words: str) -> list[Text]:
    """Return a blank line and a heading with a line to the page's edge."""
    words = look.text(words)
    line = look.rule * max(3, min(look.width, 120) - len(words) - 1)
    return [Text(""), Text.assemble((words, "bold"), " ", (line, "dim"))]


def columns(look: Look, rows: Sequence[Sequence[Cell]], *, indent: int = 2, gap: int = 2) -> list[Text]:
    """Return rows with their columns aligned; the last column keeps its own length."""
    texts = [[look.text(cell.words) for cell in row] for row in rows]
    count = max(len(row) for row in rows)
    widths = [max((len(row[k]) for row in texts if k < len(row)), default=0) for k in range(count)]
    lines = []
    for row, words in zip(rows, texts, strict=True):
        line = Text(" " * indent)
        for k, (cell, word) in enumerate(zip(row, words, strict=True)):
            last = k == len(row) - 1
            padded = word.rjust(widths[k]) if cell.right else word if last else word.ljust(widths[k])
            line.append(padded, cell.style)
            if not last:
                line.append(" " * gap)
        line.rstrip()
        lines.append(line)
    return lines


def note(look: Look, words: str, *, style: str = "", indent: int = 2, hanging: int = 0) -> list[Text]:
    """Return a paragraph wrapped to the page, no figure parted from its unit."""
    wrapped = textwrap.wrap(
        _FIGURE.sub(NO_BREAK, look.text(words)),
        width=max(30, min(look.width, 110)),
        initial_indent=" " * indent,
        subsequent_indent=" " * (indent + hanging),
        break_long_words=False,
        break_on_hyphens=False,
    )
    return [Text(line.replace(NO_BREAK, " "), style) for line in wrapped]


def pairs(look: Look, items: Sequence[tuple[str, str]], *, style: str = "") -> list[Text]:
    """Return names and values, two or three pairs a line as the page allows."""
    for across in (3, 2):
        lines = _pairs_across(look, items, across, style)
        if max(len(line) for line in lines) <= look.width:
            return lines
    return _pairs_across(look, items, 1, style)


def _pairs_across(look: Look, items: Sequence[tuple[str, str]], across: int, style: str) -> list[Text]:
    rows_needed = -(-len(items) // across)
    rows = []
    for r in range(rows_needed):
        row = []
        for c in range(across):
            k = c * rows_needed + r
            if k < len(items):
                row += [Cell(items[k][0], "dim"), Cell(items[k][1] + ("   " if c < across - 1 else ""), style)]
        rows.append(row)
    return columns(look, rows)


def look_for(stream: IO[str], *, plain: bool) -> Look:
    """Return the look that suits a stream: its width if it is a terminal, ASCII if it can't show more."""
    terminal = stream.isatty()
    width = shutil.get_terminal_size((80, 25)).columns if terminal or "COLUMNS" in os.environ else PIPE_WIDTH
    return Look(width=max(60, width), ascii=plain or not _shows(getattr(stream, "encoding", None), "µΩ°−─┤╧ξ█"))


def _shows(encoding: str | None, sample: str) -> bool:
    try:
        sample.encode(encoding or "ascii")
    except (UnicodeEncodeError, LookupError):
        return False
    return True


def print_page(lines: Sequence[Text], *, plain: bool, stream: IO[str] | None = None) -> None:
    """Print a page in one go; colour only on a terminal that wants it.

    It is drawn aside first: rich ends the program itself when a reader goes away.
    """
    target = stream or sys.stdout
    drawn = io.StringIO()
    console = Console(
        file=drawn,
        force_terminal=Console(file=target).is_terminal,
        no_color=True if plain or "NO_COLOR" in os.environ else None,
        highlight=False,
        markup=False,
        emoji=False,
        soft_wrap=True,
        color_system=None if plain else "auto",
    )
    console.print(Text("\n").join(lines), soft_wrap=True)
    target.write(drawn.getvalue())
