"""A verification as JSON: ``rfstage.verify``, version 1."""

from __future__ import annotations

from typing import Any

from rfstage.files.records import VERSION, complex_pair, numbers
from rfstage.verify.capture import LISTED
from rfstage.verify.correction import PartVerdict
from rfstage.verify.tankfit import PartEstimate
from rfstage.verify.verdict import DECISIONS, OrderVerdict
from rfstage.verify.verification import Source, Verification

_UNIT = {"capacitor": "F", "coil": "H"}


def verify_record(found: Verification) -> dict[str, Any]:
    """Return a verification; what was not measured or not told is null.

    An order with ``measured_dbc`` null lies below its ``floor_dbc``; ``lowest_dbc`` and ``highest_dbc`` are the ends
    of its uncertainty at k = 2. Phasors of a capture are peak values in its channel's unit, at the record's middle.
    """
    setup, tank, pulse = found.asked.setup, found.tank, found.pulse
    parts = {p.name: p for p in found.part_verdicts}
    return {
        "format": "rfstage.verify",
        "version": VERSION,
        "verdict": found.verdict,
        "carrier_hz": found.carrier,
        "carrier_power_w": found.power,
        "carrier_power_measured": found.power_measured,
        "limit": None if found.asked.limit is None else found.asked.limit.name,
        "decision": found.asked.decision,
        "decision_rule": DECISIONS[found.asked.decision],
        "orders": [_order(v) for v in found.orders],
        "not_measured": list(found.missing),
        "not_measured_near_limit": list(found.near),
        "other_readings": [
            {"frequency_hz": other.frequency, "level_dbc": other.level, "file": name} for other, name in found.others
        ],
        "power_meters": None
        if found.meters is None
        else {
            "thermal_db": found.meters.thermal,
            "peak_least_db": found.meters.peak_least,
            "peak_most_db": found.meters.peak_most,
        },
        "current_pulse": None
        if pulse is None
        else {
            "conduction_angle_deg": pulse.conduction_angle_deg,
            "conduction_angle_standard_error_deg": pulse.angle_error_deg,
            "conduction_angle_from_ratio_deg": pulse.angle_from_ratio_deg,
            "conduction_angle_predicted_deg": found.state.conduction_angle_deg,
            "peak_current_a": pulse.peak,
            "dc_current_a": pulse.mean,
            "fundamental_to_dc": pulse.fundamental_to_dc,
            "shape_misfit": pulse.shape_misfit,
            "harmonics_to_fundamental": list(pulse.ratios),
            "waveform": {"phase_deg": numbers(pulse.phase_deg), "current_a": numbers(pulse.current)},
        },
        "branches": None if tank is None else [_part(part, parts.get(part.name)) for part in tank.parts],
        "told_only_together": None if tank is None else [list(group) for group in tank.together],
        "fit": None
        if tank is None
        else {
            "noise": tank.noise,
            "noise_point_to_point": tank.seen_noise,
            "systematic": tank.systematic,
            "frequencies": int(tank.data.frequencies.size),
            "ports": tank.data.ports,
        },
        "setting": None
        if found.setting is None
        else {
            "name": found.setting.name,
            "unit": _UNIT[found.setting.kind],
            "found": found.setting.found,
            "wanted": found.setting.wanted,
            "reflection_before": found.setting.before,
            "reflection_after": found.setting.after,
        },
        "settings": {
            "attenuation_db": setup.attenuation,
            "sampler": None if setup.sampler is None else setup.sampler.name,
            "probe": setup.probe,
            "uncertainty_db": setup.uncertainty,
            "instrument_distortion_db": setup.distortion,
            "shunt_ohm": found.asked.shunt,
            "device_in": found.asked.device_in,
        },
        "files": [_source(source) for source in found.sources],
        "remarks": list(found.remarks),
    }


def _order(v: OrderVerdict) -> dict[str, Any]:
    m = v.measured
    return {
        "order": m.order,
        "frequency_hz": m.frequency,
        "measured_dbc": m.level,
        "uncertainty_db": m.uncertainty,
        "lowest_dbc": m.low,
        "highest_dbc": m.high,
        "floor_dbc": m.floor,
        "predicted_dbc": v.predicted,
        "limit_dbc": v.limit,
        "margin_db": v.margin,
        "verdict": v.verdict,
        "file": v.source,
    }


def _part(part: PartEstimate, verdict: PartVerdict | None) -> dict[str, Any]:
    return {
        "name": part.name,
        "kind": part.kind,
        "unit": _UNIT[part.kind],
        "nominal": part.nominal,
        "estimated": part.estimated,
        "standard_error": part.standard_error,
        "q_nominal": part.q_nominal,
        "q_estimated": part.q_estimated,
        "q_standard_error": part.q_standard_error,
        "off_percent": None if verdict is None else verdict.off,
        "tolerance_percent": None if verdict is None else verdict.tolerance,
        "tolerance_stated": None if verdict is None else verdict.stated,
        "beyond_tolerance": None if verdict is None else verdict.beyond,
        "verdict": None if verdict is None else verdict.verdict,
    }


def _source(source: Source) -> dict[str, Any]:
    record: dict[str, Any] = {"name": source.name, "kind": source.kind}
    if source.analysed is not None:
        fit, steps = source.analysed.fit, source.analysed.steps
        record |= {
            "frequency_hz": fit.frequency,
            "frequency_standard_error_hz": fit.frequency_error,
            "phasors": [
                {"order": n, "phasor": complex_pair(complex(fit.phasors[n])), "standard_error": float(fit.errors[n])}
                for n in range(min(LISTED, fit.orders) + 1)
            ],
            "samples": fit.samples,
            "periods": fit.periods,
            "noise": fit.noise,
            "step": steps.size or None,
            "bits_seen": steps.bits,
            "instrument_distortion_db": source.analysed.distortion,
            "clipped": source.analysed.clipped,
        }
    return record
