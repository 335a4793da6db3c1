"""The table of harmonics with its bars, and the verdict on the limit."""

from __future__ import annotations

from rich.text import Text

from rfstage.designs.design import Design
from rfstage.harmonics import Harmonic
from rfstage.quantity import show
from rfstage.report.judged import signed, verdict_lines
from rfstage.report.page import Cell, Look, columns, heading, note

WIDE = 100  # columns, from which device current and power in the load are shown too
BAR_FLOOR = -100.0  # dBc at the left end of a bar; the right end is the carrier


def harmonic_lines(design: Design, look: Look) -> list[Text]:
    """Return the table and the verdict."""
    line = show(design.settings.line.at_carrier.real, "ohm")
    judged = any(h.limit is not None for h in design.harmonics)
    wide = look.width >= WIDE
    titles = ["n", "frequency", *(["device", "in load"] if wide else []), "textbook"]
    titles += ["settled"] if design.settled is not None else []
    titles += ["line", *(["limit", "margin"] if judged else []), ""]
    rows = [[Cell(t, "dim", right=True) for t in titles]]
    room = max(8, min(40, look.width - 14 - 9 * (len(titles) - 3)))
    rows += [_harmonic_row(h, look, design, wide=wide, judged=judged, room=room) for h in design.harmonics]
    lines = heading(look, "Harmonics at the load, dBc") + columns(look, rows, gap=1)
    worse = "the worse of textbook and settled" if design.settled is not None else "from the textbook pulse"
    words = f"textbook and settled: in the given load; line: in a resistive {line}, {worse}."
    lines += note(look, words + (" device and in load: textbook." if wide else ""), style="dim")
    if any(h.strays_decide for h in design.harmonics):
        lines += note(
            look, "* strays decide: 5 nH of lead in each shunt capacitor moves it by more than 3 dB", style="dim"
        )
    return lines + _verdict(design, look)


def _harmonic_row(h: Harmonic, look: Look, design: Design, *, wide: bool, judged: bool, room: int) -> list[Cell]:
    cells = [Cell(f"{h.order}", right=True), Cell(show(h.frequency, "Hz", 4), right=True)]
    if wide:
        cells += [
            Cell(show(abs(h.device_current), "A") if h.device_current else "none", right=True),
            Cell(show(h.load_power, "W") if h.load_power else "none", right=True),
        ]
    cells.append(Cell(_level(h.level), right=True))
    if design.settled is not None:
        cells.append(Cell(_level(h.settled_level), right=True))
    cells.append(Cell(_level(h.line_level) + ("*" if h.strays_decide else " "), "bold", right=True))
    style = ""
    if judged:
        style = "" if h.margin is None else "green" if h.margin >= 0 else "bold red"
        cells += [
            Cell(_level(h.limit), right=True),
            Cell("none" if h.margin is None else signed(h.margin), style, right=True),
        ]
    if h.level is None:
        return [*cells, Cell("none in the ideal pulse", "dim")]
    return [*cells, Cell("" if h.line_level is None else _bar(h.line_level, h.limit, look, room), style)]


def _level(decibels: float | None) -> str:
    return "none" if decibels is None else f"{decibels:.1f}".replace("-", "−")


def _bar(level: float, limit: float | None, look: Look, room: int) -> str:
    """Draw a level from the floor at the left to the carrier at the right, the limit marked in it."""
    full, mark, empty = ("#", "|", ".") if look.ascii else ("█", "┃", "·")

    def place(value: float) -> int:
        return max(0, min(room - 1, round((value - BAR_FLOOR) / -BAR_FLOOR * room)))

    cells = [full if k < place(level) else empty for k in range(room)]
    if limit is not None:
        cells[place(limit)] = mark
    return "".join(cells)


def _verdict(design: Design, look: Look) -> list[Text]:
    limit, worst = design.settings.limit, design.worst
    if limit is None:
        return note(look, "No limit rule was given; --limit names one.", style="dim")
    return verdict_lines(
        look,
        limit,
        worst=None if worst is None or worst.margin is None else (worst.order, worst.margin),
        highest=design.settings.highest_order,
        line=design.settings.line.at_carrier.real,
        carrier=design.job.carrier,
        power=design.job.power,
    )
