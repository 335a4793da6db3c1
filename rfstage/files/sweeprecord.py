"""A sweep as JSON and as a table of comma-separated values."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from rfstage.files.records import VERSION, meters

if TYPE_CHECKING:
    from rfstage.sweep import Extreme, Sweep


def sweep_record(swept: Sweep) -> dict[str, Any]:
    """Return a sweep as ``rfstage.sweep``, version 1; a turning point is its value or null.

    For a sweep of the load each point is the hottest of its circle, with the worst of the circle beside it.
    """
    points = []
    for k, state in enumerate(swept.points):
        point = {
            **meters(state),
            "dc_power_w": state.dc_power,
            "harmonics_dbc": [[h.order, h.level] for h in state.harmonics],
        }
        if swept.circles:
            circle = swept.circles[k]
            point["circle"] = {
                "dissipation_w": circle.dissipation,
                "dissipation_phase_deg": circle.dissipation_phase,
                "peak_voltage_v": circle.peak_voltage,
                "peak_voltage_phase_deg": circle.peak_voltage_phase,
                "least_output_w": circle.least_output,
                "greatest_output_w": circle.greatest_output,
            }
        points.append(point)
    return {
        "format": "rfstage.sweep",
        "version": VERSION,
        "path": swept.path,
        "unit": swept.unit,
        "values": list(swept.values),
        "points": points,
        "dip": _turning(swept.dip),
        "efficiency_peak": _turning(swept.efficiency_peak),
        "output_peak": _turning(swept.output_peak),
    }


def _turning(extreme: Extreme | None) -> float | None:
    return None if extreme is None else extreme.value


def sweep_table(swept: Sweep) -> str:
    """Return a sweep as CSV: a line of names with units, a line a point."""
    unit = f"_{swept.unit}" if swept.unit else ""
    names = [f"{swept.path}{unit}", *meters(swept.points[0]), "dc_power_w"]
    names += [f"harmonic_{h.order}_dbc" for h in swept.points[0].harmonics[:9]]
    lines = [",".join(names)]
    for value, state in zip(swept.values, swept.points, strict=True):
        row = [value, *meters(state).values(), state.dc_power, *(h.level for h in state.harmonics[:9])]
        lines.append(",".join("" if cell is None else repr(float(cell)) for cell in row))
    return "\n".join(lines) + "\n"
