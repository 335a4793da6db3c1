"""The page of a sweep: the table, curves in characters, the turning points and which way to turn."""

from __future__ import annotations

from rich.text import Text

from rfstage.quantity import show
from rfstage.report.page import NO_BREAK, Cell, Look, columns, heading, note, pairs
from rfstage.sweep import Extreme, Sweep, fitted_value, modulation

ROWS = 24  # of the table; a longer sweep is thinned for the page, never for JSON or CSV
BAR = 16
STRAIGHT = 0.1  # of the carrier's voltage: a departure that is heard (common practice, no source)


def sweep_page(swept: Sweep, look: Look) -> list[Text]:
    """Return the page of a sweep."""
    title = "standing-wave ratio of the load" if swept.circles else swept.path
    lines = heading(look, f"Steady state along {title}")
    lines += _circles(swept, look) if swept.circles else _table(swept, look)
    lines += _turning(swept, look) + _modulation(swept, look)
    if swept.path == "drive.amplitude" and swept.stage.drive.bias < swept.stage.device.threshold:
        lines += note(
            look,
            "The bias is below the threshold (class C): output does not follow the drive in proportion, so "
            "such a stage does not suit signals whose amplitude carries the message.",
        )
    return lines


def _shown(count: int) -> list[int]:
    if count <= ROWS:
        return list(range(count))
    return sorted({round(k * (count - 1) / (ROWS - 1)) for k in range(ROWS)})


def _table(swept: Sweep, look: Look) -> list[Text]:
    titles = [swept.path, "dc", "output", "eff.", "heat", "peak", "angle", "2nd", "3rd", "output"]
    rows = [[Cell(t, "dim", right=k < 9) for k, t in enumerate(titles)]]
    most = max(p.output_power for p in swept.points) or 1.0
    full, empty = ("#", ".") if look.ascii else ("█", "·")
    for k in _shown(len(swept.values)):
        p = swept.points[k]
        length = round(BAR * p.output_power / most)
        levels = [next((h.level for h in p.harmonics if h.order == n), None) for n in (2, 3)]
        rows.append(
            [
                Cell(show(swept.values[k], swept.unit, 4), "bold", right=True),
                Cell(_figure(p.dc_current, "A"), right=True),
                Cell(_figure(p.output_power, "W"), right=True),
                Cell("none" if p.efficiency is None else f"{100 * p.efficiency:.0f} %", right=True),
                Cell(_figure(p.dissipation, "W"), right=True),
                Cell(show(p.peak_voltage, "V"), right=True),
                Cell(f"{p.conduction_angle_deg:.0f}°", right=True),
                *(Cell("none" if level is None else f"{level:.0f}".replace("-", "−"), right=True) for level in levels),
                Cell(full * length + empty * (BAR - length) if look.width >= 96 else ""),
            ]
        )
    return columns(look, rows, gap=1) + note(
        look, "2nd and 3rd are dBc in the load; heat is the device's.", style="dim"
    )


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
                        f"{circle.dissipation_phase:.0f}°",
                        show(circle.peak_voltage, "V"),
                        f"{circle.peak_voltage_phase:.0f}°",
                        _figure(circle.least_output, "W"),
                        _figure(circle.greatest_output, "W"),
                    )
                )
            ]
        )
    line = show(swept.stage.limit_load or 50.0, "ohm")
    return columns(look, rows) + note(
        look,
        f"Ratios against {line}; the angles are those of the reflection where the worst is "
        "reached. The tank is not retuned.",
        style="dim",
    )


def _turning(swept: Sweep, look: Look) -> list[Text]:
    named: list[tuple[str, Extreme, str]] = [
        (name, extreme, unit)
        for name, extreme, unit in (
            ("dip of the dc current", swept.dip, "A"),
            ("best efficiency", swept.efficiency_peak, ""),
            ("greatest output", swept.output_peak, "W"),
        )
        if extreme is not None
    ]
    if not named:
        if swept.circles:
            return []
        return note(look, "Dip, best efficiency and greatest output all lie at an edge of this sweep or beyond it.")
    now = fitted_value(swept.stage, swept.path)
    rows = []
    for name, extreme, unit in named:
        figure = show(extreme.figure, unit) if unit else f"{100 * extreme.figure:.1f} %"
        rows.append(
            [
                Cell(name),
                Cell(show(extreme.value, swept.unit, 4), "bold", right=True),
                Cell(figure, right=True),
                Cell(_way(now, extreme.value, swept.path)),
            ]
        )
    return heading(look, "Turning points, and the way there from what is set now") + columns(look, rows)


def _way(now: float | None, there: float, path: str) -> str:
    if not now:
        return ""
    percent = 100 * (there / now - 1)
    if abs(percent) < 0.05:
        return "where it is set now"
    return f"{'raise' if percent > 0 else 'lower'} {path} by {abs(percent):.2g} %"


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
    return lines + note(
        look, "Class C suits this, and does not suit signals that come in through the drive.", style="dim"
    )
