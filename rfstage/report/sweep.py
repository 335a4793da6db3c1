"""The page of a sweep: the table, curves in characters, the turning points and which way to turn."""

from __future__ import annotations

from rich.text import Text

from rfstage.designs.judging import LINE
from rfstage.quantity import show
from rfstage.report.page import NO_BREAK, Cell, Look, columns, heading, note, pairs
from rfstage.stagevalues import fitted_value
from rfstage.sweep import PHASES, Sweep, modulation

ROWS = 24  # of the table; a longer sweep is thinned for the page, never for JSON or CSV
BAR = 16
STRAIGHT = 0.1  # of the carrier's voltage: a departure that is heard (common practice, no source)


def sweep_page(swept: Sweep, look: Look) -> list[Text]:
    """Return the page of a sweep."""
    title = "standing-wave ratio of the load" if swept.circles else swept.path
    lines = heading(look, f"Steady state along {title}")
    lines += _circles(swept, look) if swept.circles else _table(swept, look)
    lines += _turning(swept, look) + _modulation(swept, look)
    if swept.path == "drive.amplitude" and _conducts_for_less_than_half(swept):
        lines += note(
            look,
            "Class C: the output does not follow the drive in proportion, so such a stage does not suit signals whose "
            "amplitude carries the message.",
        )
    return lines


def _conducts_for_less_than_half(swept: Sweep) -> bool:
    angles = [p.conduction_angle_deg for p in swept.points if p.has_output]
    return bool(angles) and max(angles) < 179.5


def _shown(swept: Sweep) -> tuple[list[int], int]:
    """Return which points the page shows, evenly thinned, and the step."""
    step = -(-len(swept.values) // ROWS)
    return list(range(0, len(swept.values), step)), step


def _table(swept: Sweep, look: Look) -> list[Text]:
    barred = look.width >= 96
    titles = [
        swept.path,
        "dc",
        "output",
        "eff.",
        "heat",
        "peak",
        "angle",
        "2nd",
        "3rd",
        *(["of the most"] if barred else []),
    ]
    rows = [[Cell(t, "dim", right=k < 9) for k, t in enumerate(titles)]]
    most = max(p.output_power for p in swept.points) or 1.0
    full, empty = ("#", ".") if look.ascii else ("█", "·")
    shown, step = _shown(swept)
    device = swept.stage.device
    for k in shown:
        p = swept.points[k]
        length = round(BAR * p.output_power / most)
        levels = [next((h.level for h in p.harmonics if h.order == n), None) for n in (2, 3)]
        row = [
            Cell(show(swept.values[k], swept.unit, 4), "bold", right=True),
            Cell(_figure(p.dc_current, "A"), right=True),
            Cell(_figure(p.output_power, "W"), right=True),
            Cell("none" if p.efficiency is None else f"{100 * p.efficiency:.0f} %", right=True),
            _held(_figure(p.dissipation, "W"), p.dissipation, device.max_dissipation),
            _held(show(p.peak_voltage, "V"), p.peak_voltage, device.max_voltage),
            Cell(f"{p.conduction_angle_deg:.0f}°", right=True),
            *(Cell("none" if level is None else f"{level:.0f}".replace("-", "−"), right=True) for level in levels),
        ]
        rows.append([*row, Cell(full * length + empty * (BAR - length))] if barred else row)
    lines = columns(look, rows, gap=1)
    words = "2nd and 3rd are dBc in the load; heat is the device's; ! is beyond the device's rating."
    if step > 1:
        words += f" One point in {step} is shown; --csv and --json have all {len(swept.values)}."
    return lines + note(look, words, style="dim")


def _held(words: str, value: float, rating: float | None) -> Cell:
    """Return a figure, marked where it is beyond its rating."""
    beyond = rating is not None and value > rating
    return Cell(words + ("!" if beyond else ""), "bold red" if beyond else "", right=True)


def _figure(value: float, unit: str) -> str:
    return show(value, unit) if value else f"0 {unit}"


def _circles(swept: Sweep, look: Look) -> list[Text]:
    titles = ["ratio", "worst heat", "at", "highest peak", "at", "least output", "greatest"]
    rows = [[Cell(t, "dim", right=True) for t in titles]]
    for value, circle in zip(swept.values, swept.circles, strict=True):
        rows.append(
            [
                Cell(words, "bold" if k == 0 else "", right=True)
                for k, words in enumerate(
                    (
                        f"{value:.3g}",
                        _figure(circle.dissipation, "W"),
                        "any" if value == 1 else f"{circle.dissipation_phase:.0f}°",
                        show(circle.peak_voltage, "V"),
                        "any" if value == 1 else f"{circle.peak_voltage_phase:.0f}°",
                        _figure(circle.least_output, "W"),
                        _figure(circle.greatest_output, "W"),
                    )
                )
            ]
        )
    line = show(swept.stage.limit_load or LINE, "ohm")
    lines = columns(look, rows) + note(
        look,
        f"Ratios against {line}, in place of the stage's own load; the angles are those of the reflection where the "
        f"worst is reached, in steps of {360 / PHASES:g}°. The tank is not retuned.",
        style="dim",
    )
    device = swept.stage.device
    if device.max_dissipation is not None and max(c.dissipation for c in swept.circles) > device.max_dissipation:
        lines += note(look, f"! heat goes beyond the rating of {show(device.max_dissipation, 'W')}", style="bold red")
    if device.max_voltage is not None and max(c.peak_voltage for c in swept.circles) > device.max_voltage:
        lines += note(look, f"! peak goes beyond the rating of {show(device.max_voltage, 'V')}", style="bold red")
    return lines


def _turning(swept: Sweep, look: Look) -> list[Text]:
    alive = [k for k, p in enumerate(swept.points) if p.has_output]
    if swept.circles or not alive:
        return [] if swept.circles else note(look, "No point of this sweep has any output.")
    rows = []
    for name, extreme, unit, figures in (
        ("dip of the dc current", swept.dip, "A", [-p.dc_current for p in swept.points]),
        ("best efficiency", swept.efficiency_peak, "", [p.efficiency or 0.0 for p in swept.points]),
        ("greatest output", swept.output_peak, "W", [p.output_power for p in swept.points]),
    ):
        if extreme is None:
            k = max(alive, key=lambda k: figures[k])
            place, figure, way = show(swept.values[k], swept.unit, 4), abs(figures[k]), "at the edge, or beyond it"
        else:
            place, figure = show(extreme.value, swept.unit, 4), extreme.figure
            way = _way(swept, extreme.value)
        shown = show(figure, unit) if unit else f"{100 * figure:.1f} %"
        rows.append([Cell(name), Cell(place, "bold", right=True), Cell(shown, right=True), Cell(way)])
    return heading(look, "Turning points, and the way there from what is set now") + columns(look, rows)


def _way(swept: Sweep, there: float) -> str:
    """Say which way to turn and how far, and whether the trimmer gets there."""
    now = fitted_value(swept.stage, swept.path)
    if not now:
        return ""
    percent = 100 * (there / now - 1)
    if abs(percent) < 0.05:
        return "where it is set now"
    words = f"{'raise' if percent > 0 else 'lower'} {swept.path} by {abs(percent):.2g} %"
    data = swept.stage.part_data.get(swept.path)
    if data is None or data.trim is None or data.trim[0] <= there <= data.trim[1]:
        return words
    return f"{words}, beyond its trimmer"


def _modulation(swept: Sweep, look: Look) -> list[Text]:
    found = modulation(swept)
    if found is None:
        return []
    items = [
        ("depth", f"{100 * found.depth:.0f} % about {show(found.carrier_supply, 'V')}"),
        ("modulator load", show(found.modulator_load, "ohm")),
        ("audio power", show(found.audio_power, "W")),
        ("output at the crest", show(found.envelope_power, "W")),
        ("departure from a line", f"{100 * found.nonlinearity:.1f} % of the carrier"),
        ("mean device heat", show(found.mean_dissipation, "W")),
        ("peak at the device", show(found.peak_voltage, "V")),
    ]
    peaks = ", ".join(f"{name}{NO_BREAK}{show(volts, 'V')}" for name, volts in found.branch_peaks.items())
    lines = heading(look, "Modulated through the supply") + pairs(look, items)
    lines += note(look, f"Peaks across the parts at the crest: {peaks}.")
    if found.nonlinearity >= STRAIGHT:
        lines += note(look, "The output does not follow the supply: drive harder, or modulate the drive as well.")
    return lines
