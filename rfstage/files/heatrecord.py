"""The heat of a stage as JSON."""

from __future__ import annotations

from typing import Any

from rfstage.designs.heat import Heat


def heat_record(heat: Heat) -> dict[str, Any]:
    """Return the heat of a stage in four conditions; a key of what isn't known or doesn't exist is null."""
    cooling = heat.cooling
    return {
        "ambient_c": cooling.ambient,
        "junction_limit_c": cooling.junction_limit,
        "junction_to_case_k_per_w": cooling.junction_to_case,
        "case_to_sink_k_per_w": cooling.case_to_sink,
        "sink_to_ambient_k_per_w": cooling.sink_to_ambient,
        "duty": cooling.duty,
        "conditions": [
            {
                "name": row.condition.name,
                "dissipation_w": row.condition.dissipation,
                "device_dissipation_w": row.condition.device_dissipation,
                "mean_device_dissipation_w": row.mean,
                "mean_dissipation_w": row.stage_mean,
                "dc_current_a": row.condition.dc_current,
                "peak_voltage_v": row.condition.peak_voltage,
                "sink_needed_k_per_w": row.sink_needed,
                "junction_c": row.junction,
                "case_c": row.case,
                "rating_share": None if row.use is None else row.use.share,
                "note": row.condition.note,
                "reason": row.reason or None,
            }
            for row in heat.conditions
        ],
        "max_voltage_v": heat.max_voltage,
        "worst": None if heat.worst is None else heat.worst.condition.name,
        "sink_k_per_w": heat.sink,
        "most_w": heat.most,
        "derating_w_per_k": heat.per_kelvin,
        "rating_w": heat.rating,
        "derated_rating_w": heat.derated_rating,
        "sink_for_rating_k_per_w": heat.sink_for_rating,
        "missing": heat.missing or None,
    }
