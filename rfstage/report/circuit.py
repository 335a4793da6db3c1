"""The circuit drawn in characters: a rail from device to load, one part a line, its figures beside it.

A trap, a coupled pair and a transformer take more lines: their figures stand beside the first, what their
numbers are beside the others.
"""

from __future__ import annotations

from collections.abc import Sequence

from rich.text import Text

from rfstage.ladder import Branch
from rfstage.matching.tank import PartStress
from rfstage.quantity import show
from rfstage.report.page import Cell, Look, columns, note
from rfstage.stage import CHOKE
from rfstage.stagevalues import described, has_one_value, losses_described

ELECTRODE = {"bipolar": "collector", "fet": "drain", "tube": "anode"}
FAMILY = {"bipolar": "bipolar", "fet": "FET", "tube": "tube"}
CONTROL = {"bipolar": "base", "fet": "gate", "tube": "grid"}

# (place, kind, tap) -> drawing in Unicode, in ASCII, line by line
_DRAWN = {
    ("shunt", "capacitor", ""): (("├──┤├──╧",), ("+--||--=",)),
    ("shunt", "coil", ""): (("├──◠◠──╧",), ("+--uu--=",)),
    ("shunt", "resistor", ""): (("├──▯▯──╧",), ("+--[]--=",)),
    ("shunt", "trap", ""): (("├◠◠─┤├─╧",), ("+uu-||-=",)),
    ("series", "capacitor", ""): (("╪",), ("=",)),
    ("series", "coil", ""): (("ξ",), ("3",)),
    ("series", "resistor", ""): (("▯",), ("#",)),
    ("series", "trap", ""): (("├─┐", "ξ ╪", "├─┘"), ("+-.", "3 =", "+-'")),
    ("through", "coupled", ""): (("└──◠◠──╧", "   ┆┆", "┌──◠◠──╧"), ("`--uu--=", "   ::", ".--uu--=")),
    ("through", "coupled", "load"): (("ξ┄┄┐", "├──◠◠──╧"), ("3..,", "+--uu--=")),
    ("through", "coupled", "device"): (("├──◠◠──╧", "ξ┄┄┘"), ("+--uu--=", "3..'")),
    ("through", "transformer", ""): (("└──◠◠──╧", "   ══", "┌──◠◠──╧"), ("`--uu--=", "   ~~", ".--uu--=")),
}
_TO_SUPPLY = (("├──◠◠──○ supply",), ("+--uu--o supply",))


def circuit(look: Look, parts: Sequence[PartStress], *, start: str, end: str) -> list[Text]:
    """Return the drawing from ``start`` to ``end``, with value, Q and stresses of each part."""
    rail = "|" if look.ascii else "│"
    stressed = any(part.peak_voltage is not None for part in parts)
    titles = ["", "part", "value", "Q or R", *(["peak volts", "rms amps", "loss"] if stressed else [])]
    rows = [[Cell(start, "bold"), *(Cell(t, "dim", right=k > 0) for k, t in enumerate(titles[1:]))]]
    for part in parts:
        rows.append(_row(look, part, stressed))
    rows.append([Cell("  " + rail)])
    rows.append([Cell(end, "bold")])
    lines = columns(look, rows)
    room = max(len(look.text(row[0].words)) for row in rows) + 2
    found = lines[:1]
    for line, part in zip(lines[1:-2], parts, strict=True):
        found += [line, *_further_lines(look, part, rail, room)]
    return found + lines[-2:]


def _drawing(look: Look, branch: Branch) -> tuple[str, ...]:
    both = _TO_SUPPLY if branch.name == CHOKE else _DRAWN[branch.place, branch.kind, branch.tap]
    return both[look.ascii]


def _row(look: Look, part: PartStress, stressed: bool) -> list[Cell]:
    branch = part.branch
    in_column = has_one_value(branch.kind) or branch.kind == "transformer"
    cells = [
        Cell("  " + _drawing(look, branch)[0], "cyan"),
        Cell(branch.name, "bold"),
        Cell(described(branch)[0] if in_column else "tapped" if branch.tap else branch.kind, "bold", right=True),
        Cell(_quality(branch), right=True),
    ]
    if stressed:
        assert part.peak_voltage is not None
        assert part.rms_current is not None
        assert part.loss is not None
        cells += [
            Cell(show(part.peak_voltage, "V"), right=True),
            Cell(show(part.rms_current, "A"), right=True),
            Cell(show(part.loss, "W") if part.loss > 0 else "none", right=True),
        ]
    return cells


def _further_lines(look: Look, part: PartStress, rail: str, room: int) -> list[Text]:
    """Return what follows the first line of a part: the rest of its drawing, and the numbers it is made of."""
    branch = part.branch
    words: list[str] = []
    if not has_one_value(branch.kind):
        said = [*described(branch)[branch.kind == "transformer" :], *losses_described(branch, 4)[1:]]
        if part.far_voltage is not None and part.far_current is not None:
            said.append(f"load side {show(part.far_voltage, 'V')} peak, {show(part.far_current, 'A')} rms")
        words = [line.plain.strip() for line in note(look, ", ".join(said), indent=room + 2)]
    drawn = _drawing(look, branch)[1:]
    lines = []
    for k in range(max(len(drawn), len(words))):
        piece = "  " + (drawn[k] if k < len(drawn) else rail)
        line = Text("  ").append(piece.ljust(room) if k < len(words) else piece, "cyan")
        lines.append(line.append(words[k] if k < len(words) else ""))
    return lines


def _quality(branch: Branch) -> str:
    """Return the Q (of a transformer its core's), or the series resistance that stands in its place."""
    if branch.origin == "device":
        return "device"
    if branch.series_resistance is not None:
        return show(float(branch.series_resistance), "ohm")
    q = branch.second_q if branch.kind == "transformer" else branch.q
    return "lossless" if q is None else f"{float(q):.4g}"
