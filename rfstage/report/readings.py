"""The page of meter readings: what they imply, which part explains them, what to read next."""

from __future__ import annotations

import math

from rich.text import Text

from rfstage.quantity import show
from rfstage.report.page import Cell, Look, columns, heading, note
from rfstage.report.retune import moved
from rfstage.retuning.causes import EXPLAINED, Cause, Diagnosis, next_words, untold_words
from rfstage.retuning.explored import WIDEST
from rfstage.retuning.reading import Reading

HARDLY = 0.01  # of a value: what nobody would move a part for


def causes_page(found: Diagnosis, look: Look) -> list[Text]:
    """Return the page of what readings say."""
    lines = heading(look, "Readings, and what they imply by themselves") + _readings(found, look)
    lines += note(
        look,
        "Angle and load resistance are the textbook's, from dc current and output, and hold where the device does not "
        "run out of voltage.",
        style="dim",
    )
    lines += heading(look, "One part off that explains them, best first") + _causes(found, look)
    sound = found.as_built_misfit <= EXPLAINED / 2
    if sound:
        lines += note(
            look, "The stage as its file says explains the readings too: nothing need be off.", style="bold green"
        )
    elif not found.explained:
        lines += note(
            look,
            f"No single part explains the readings: the best leaves {found.causes[0].misfit:.1f} meter errors. Two "
            "parts off, another meter range, or a device that is not what its file says.",
            style="bold red",
        )
    elif (untold := untold_words(found)) is not None:
        lines += note(look, untold)
        if found.next_reading is None:
            lines += note(
                look,
                "No other setting of this stage would tell them apart on these meters: measure the parts, or give "
                "those that can be set a trim range in the stage file.",
            )
    words = None if sound else next_words(found)
    if words is not None:
        lines += heading(look, "The next reading") + note(look, words[0].upper() + words[1:] + ".")
    return lines + note(
        look,
        f"Meter errors of {100 * found.meter_error:.2g} % are taken. One fault is looked for, among parts the device "
        "feels, the load, and drive and supply where they were not read; a part that was set is off by its dial's "
        "factor.",
        style="dim",
    )


def _readings(found: Diagnosis, look: Look) -> list[Text]:
    """Return the table of readings; what was set stands beneath it where it would be too wide."""
    titles = ("", "dc", "output", "eff.", "load resistance", "angle", "supply")
    table = [[Cell(t, "dim", right=True) for t in titles]]
    set_at = []
    for number, (reading, said) in enumerate(zip(found.readings, found.implied, strict=True), start=1):
        supply = found.stage.supply.voltage if reading.supply is None else reading.supply
        figures = (
            str(number),
            "" if reading.dc_current is None else show(reading.dc_current, "A"),
            "" if reading.output_power is None else show(reading.output_power, "W"),
            "" if said.efficiency is None else f"{100 * said.efficiency:.1f} %",
            "" if said.load_resistance is None else show(said.load_resistance, "ohm"),
            "" if said.conduction_angle_deg is None else f"{said.conduction_angle_deg:.0f}°",
            show(supply, "V"),
        )
        table.append([Cell(words, "bold" if k == 0 else "", right=True) for k, words in enumerate(figures)])
        set_at.append(_set_at(found, reading))
    beside = columns(look, [[*row, Cell(text)] for row, text in zip(table, ["", *set_at], strict=True)])
    if max(len(line) for line in beside) <= look.width:
        return beside
    lines = columns(look, table)
    for number, text in enumerate(set_at, start=1):
        lines += note(look, f"{number}: {text}", hanging=3) if text else []
    return lines


def _set_at(found: Diagnosis, reading: Reading) -> str:
    units = {b.name: "H" if b.kind == "coil" else "F" for b in found.stage.branches}
    words = [f"{part} {show(value, units[part])}" for part, value in reading.settings]
    words += [f"drive {show(reading.drive, 'V')}"] if reading.drive is not None else []
    words += [f"{reading.dip} at the dip"] if reading.dip is not None else []
    return ", ".join(words)


def _causes(found: Diagnosis, look: Look) -> list[Text]:
    titles = ("group", "part", "file says", "would be", "off by", "misfit", "so")
    rows = [[Cell(t, "dim", right=k not in (1, 6)) for k, t in enumerate(titles)]]
    for cause in found.causes:
        leads = cause.group == 1
        words = (
            (str(cause.group), True),
            (cause.part, False),
            (show(cause.nominal, cause.unit), True),
            (show(cause.estimated, cause.unit), True),
            (_off(cause), True),
            (f"{cause.misfit:.1f}", True),
            (_so(cause) if leads else "", False),
        )
        rows.append([Cell(text, "bold" if leads else "", right=right) for text, right in words])
    return columns(look, rows, gap=1)


def _off(cause: Cause) -> str:
    """Return how far a cause is off; with a mark where it is as far as was looked."""
    ratio = cause.estimated / cause.nominal
    words = f"{100 * (ratio - 1):+.1f} %".replace("-", "−")
    edge = abs(math.log(ratio)) > 0.99 * math.log(WIDEST)
    return f"{'>' if ratio > 1 else '<'} {words}" if edge else words


def _so(cause: Cause) -> str:
    ratio = cause.nominal / cause.estimated
    return "as it should be" if abs(ratio - 1) < HARDLY else moved(ratio)
