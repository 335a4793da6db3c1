"""The section of a page about heat: four conditions, the heat sink or the anode's rating, derating."""

from __future__ import annotations

from collections.abc import Sequence

from rich.text import Text

from rfstage.designs.heat import RATED_AT, Heat, Heated
from rfstage.quantity import show
from rfstage.report.page import Cell, Look, columns, heading, note

WIDE = 100  # columns, from which the dc current has room beside the heat sink
ROUNDING = 1e-6  # K, or of a rating: a heat sink that just does it is no fault


def heat_lines(heat: Heat, look: Look, title: str = "Heat") -> list[Text]:
    """Return the section."""
    lines = heading(look, title) + _table(heat, look) + _notes(heat, look)
    tube = heat.family == "tube"
    lines += _anode(heat, look) if tube else _sink(heat, look)
    lines += _volts(heat, look)
    if heat.missing:
        what = "To judge the anode" if tube else "For heat sink and junction"
        lines += note(look, f"{what} this is missing: {heat.missing}.")
    return lines


def _table(heat: Heat, look: Look) -> list[Text]:
    mean = heat.cooling.duty < 1
    sinks = heat.family != "tube" and heat.cooling.junction_to_case is not None
    warm = any(row.junction is not None for row in heat.conditions)
    rated = heat.rating is not None
    current = look.width >= WIDE or not sinks
    titles = ["", "device", *(["mean"] if mean else []), *(["of rating"] if rated else [])]
    titles += [*(["dc current"] if current else []), "peak volts"]
    titles += [*(["sink needed"] if sinks else []), *(["junction"] if warm else [])]
    rows = [[Cell(title, "dim", right=True) for title in titles]]
    for row in heat.conditions:
        c = row.condition
        words = [_or_none(c.device_dissipation, "W"), *([_or_none(row.mean, "W")] if mean else [])]
        over = row.use is not None and row.use.exceeded
        if rated:
            words.append("unknown" if row.use is None else f"{100 * row.use.share:.0f} %")
        words += [*([_or_none(c.dc_current, "A")] if current else []), _or_none(c.peak_voltage, "V")]
        if sinks:
            impossible = bool(row.reason) and bool(row.mean)
            over = over or impossible
            words.append(_needed(row, impossible=impossible))
        if warm:
            words.append("unknown" if row.junction is None else f"{row.junction:.0f} °C")
            over = over or (row.junction or 0.0) > heat.cooling.junction_limit + ROUNDING
        style = "bold red" if over else ""
        rows.append([Cell(c.name, "bold"), *(Cell(word, style, right=True) for word in words)])
    return columns(look, rows)


def _or_none(value: float | None, unit: str) -> str:
    return "unknown" if value is None else show(value, unit) if value else f"0 {unit}"


def _needed(row: Heated, *, impossible: bool) -> str:
    if row.sink_needed is not None:
        return show(row.sink_needed, "K/W")
    return "impossible" if impossible else "unknown" if row.mean is None else "none"


def _notes(heat: Heat, look: Look) -> list[Text]:
    """Return what each condition is, and what a duty cycle means."""
    told: Sequence[Heated] = [row for row in heat.conditions if row.condition.name != "normal" or _unsettled(row)]
    words = "; ".join(f"{row.condition.name}: {row.condition.note}" for row in told)
    pair = any(row.stage_mean != row.mean for row in heat.conditions)
    both = " Figures are those of the hotter device of the two; the sink takes both." if pair else ""
    lines = note(look, f"{words[:1].upper()}{words[1:]}.{both}", style="dim")
    if heat.cooling.duty < 1:
        lines += note(
            look,
            f"Mean: on the air {100 * heat.cooling.duty:.3g} % of the time, the bias stays in the pauses. It counts "
            "where a transmission is short against the minutes that a heat sink takes to warm up.",
            style="dim",
        )
    return lines


def _unsettled(row: Heated) -> bool:
    return row.condition.dissipation is None


def _volts(heat: Heat, look: Look) -> list[Text]:
    """Return the highest peak voltage of the four against the rating, where that is exceeded."""
    highest, rating = heat.highest, heat.max_voltage
    if highest is None or rating is None or (highest.condition.peak_voltage or 0.0) <= rating:
        return []
    asked = f"{show(highest.condition.peak_voltage or 0.0, 'V')} {highest.condition.name}"
    return note(
        look,
        f"EXCEEDED  rating: greatest voltage {show(rating, 'V')}, the stage asks {asked}: tune at reduced power, and "
        "trip on reflected power",
        style="bold red",
    )


def _anode(heat: Heat, look: Look) -> list[Text]:
    worst = heat.worst
    if worst is None or worst.use is None:
        return []
    use, name = worst.use, worst.condition.name
    asked = f"rating: anode dissipation {show(use.rating, 'W')}, the stage asks {show(use.dissipation, 'W')} {name}"
    if not use.exceeded:
        return note(look, f"within    {asked}, the worst of the four: {show(use.left, 'W')} to spare")
    over = f"{use.share:.2g} times as much; never for longer than it takes to switch off"
    cure = "tune at reduced power, and trip on reflected power"
    return note(look, f"EXCEEDED  {asked}, {over}: {cure}", style="bold red")


def _sink(heat: Heat, look: Look) -> list[Text]:
    cooling, worst = heat.cooling, heat.worst
    if cooling.junction_to_case is None or worst is None:
        return []
    if not worst.mean:
        return note(look, "Nothing heats the device: any heat sink does.")
    lines: list[Text] = []
    path = f"{cooling.junction_to_case:.3g} K/W junction to case, {cooling.case_to_sink:.3g} K/W case to sink"
    name = worst.condition.name
    if worst.sink_needed is None:
        cure = "trip on reflected power, halve the heat with two devices, or transmit for less of the time"
        lines += note(look, f"EXCEEDED  {name}: {worst.reason}; {cure}", style="bold red")
    else:
        normal = heat.conditions[0].sink_needed
        alone = f"; for normal alone {show(normal, 'K/W')}" if normal and name != "normal" else ""
        lines += note(
            look,
            f"Heat sink: {show(worst.sink_needed, 'K/W')} or less to outlast the worst, {name}{alone}. Ambient "
            f"{_degrees(cooling.ambient)}, junction limit {_degrees(cooling.junction_limit)}, {path}.",
        )
    if heat.sink is None or heat.most is None or heat.per_kelvin is None or worst.junction is None:
        return lines
    which = "that heat sink" if cooling.sink_to_ambient is None else f"the heat sink fitted, {show(heat.sink, 'K/W')}"
    over = worst.junction > cooling.junction_limit + ROUNDING
    words = (
        f"With {which}, the device stands {show(heat.most, 'W')}, and {show(heat.per_kelvin, 'W')} less for each "
        f"kelvin of ambient above {_degrees(cooling.ambient)}"
    )
    if over:
        words = f"EXCEEDED  junction {worst.junction:.0f} °C {name}. {words}"
    lines += note(look, f"{words}.", style="bold red" if over else "")
    if heat.rating is not None and heat.derated_rating is not None and worst.case is not None:
        short = heat.derated_rating < worst.mean * (1 - ROUNDING)
        cure = "."
        if short:
            needed = heat.sink_for_rating
            cure = ": no heat sink keeps it." if needed is None else f": {show(needed, 'K/W')} or less keep it."
        lines += note(
            look,
            f"{'EXCEEDED  ' if short else ''}Derating: the rating of {show(heat.rating, 'W')}, taken for a case of "
            f"{RATED_AT:g} °C, falls to {_or_none(heat.derated_rating, 'W')} at the {worst.case:.0f} °C of the case "
            f"{name}; {show(worst.mean, 'W')} are asked{cure}",
            style="bold red" if short else "",
        )
    return lines


def _degrees(value: float) -> str:
    return f"{value:.4g} °C".replace("-", "−")
