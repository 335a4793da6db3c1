"""The circuit drawn in characters: a rail from device to load, one part a line, its figures beside it."""

from __future__ import annotations

from collections.abc import Sequence

from rich.text import Text

from rfstage.ladder import Branch
from rfstage.matching.networks import PartStress
from rfstage.quantity import show
from rfstage.report.page import Cell, Look, columns
from rfstage.stage import CHOKE

UNIT = {"capacitor": "F", "coil": "H", "resistor": "ohm"}
ELECTRODE = {"bipolar": "collector", "fet": "drain", "tube": "anode"}
FAMILY = {"bipolar": "bipolar", "fet": "FET", "tube": "tube"}
CONTROL = {"bipolar": "base", "fet": "gate", "tube": "grid"}

# (place, kind) -> drawing in Unicode, in ASCII
_DRAWN = {
    ("shunt", "capacitor"): ("├──┤├──╧", "+--||--="),
    ("shunt", "coil"): ("├──◠◠──╧", "+--uu--="),
    ("shunt", "resistor"): ("├──▯▯──╧", "+--[]--="),
    ("series", "capacitor"): ("╪", "="),
    ("series", "coil"): ("ξ", "3"),
    ("series", "resistor"): ("▯", "#"),
}
_TO_SUPPLY = ("├──◠◠──○ supply", "+--uu--o supply")


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
    return columns(look, rows)


def _row(look: Look, part: PartStress, stressed: bool) -> list[Cell]:
    branch = part.branch
    drawing = _TO_SUPPLY if branch.name == CHOKE else _DRAWN[branch.place, branch.kind]
    cells = [
        Cell("  " + drawing[look.ascii], "cyan"),
        Cell(branch.name, "bold"),
        Cell(show(float(branch.value), UNIT[branch.kind]), "bold", right=True),
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


def _quality(branch: Branch) -> str:
    """Return the Q, or the series resistance that stands in its place."""
    if branch.origin == "device":
        return "in device"
    if branch.series_resistance is not None:
        return show(float(branch.series_resistance), "ohm")
    return "lossless" if branch.q is None else f"{float(branch.q):.4g}"
