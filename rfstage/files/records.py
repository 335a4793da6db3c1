"""Results as JSON: the keys other programs rely on, SI and unrounded, complex numbers as [real, imaginary]."""

from __future__ import annotations

import json
import math
from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from rfstage.designs.design import Design
from rfstage.ladder import Branch
from rfstage.matching.networks import PartStress, Tank

VERSION = 1
_UNIT = {"capacitor": "F", "coil": "H", "resistor": "ohm"}


def json_text(record: dict[str, Any]) -> str:
    """Return one JSON object; a number that is not finite is a bug and refused."""
    return json.dumps(record, allow_nan=False, ensure_ascii=False, indent=1)


def complex_pair(value: complex) -> list[float]:
    """Return [real, imaginary]."""
    return [float(value.real), float(value.imag)]


def design_record(design: Design, files: Sequence[str]) -> dict[str, Any]:
    """Return a design as ``rfstage.design``, version 1; ``files`` are the paths written."""
    job, point, settings = design.job, design.point, design.settings
    return {
        "format": "rfstage.design",
        "version": VERSION,
        "designed_to": design.designed_to,
        "stage": {
            "carrier_hz": job.carrier,
            "output_power_w": job.power,
            "conduction_angle_deg": job.conduction_angle,
            "operating_class": design.operating_class,
            "supply_v": job.supply,
            "minimum_voltage_v": settings.minimum_voltage,
            "family": settings.family,
            "load_ohm": complex_pair(settings.load_impedance),
        },
        "assumed": {key: complex_pair(v) if isinstance(v, complex) else v for key, v in design.assumed.items()},
        "pulse": {"exponent": settings.exponent, "coefficients": numbers(design.coefficients)},
        "operating_point": {
            "load_resistance_ohm": point.load_resistance,
            "swing_v": point.swing,
            "peak_current_a": point.peak_current,
            "dc_current_a": point.dc_current,
            "fundamental_current_a": point.fundamental_current,
            "dc_power_w": point.dc_power,
            "device_rf_power_w": point.device_rf_power,
            "dissipation_w": point.dissipation,
            "choke_loss_w": point.choke_loss,
            "device_efficiency": point.device_efficiency,
            "overall_efficiency": point.overall_efficiency,
            "peak_voltage_v": point.peak_voltage,
            "output_power_w": point.output_power,
        },
        "drive": {
            "bias_v": design.drive.bias,
            "amplitude_v": design.drive.amplitude,
            "unbiased_amplitude_v": design.drive.unbiased_amplitude,
            "drive_power_w": design.drive.power,
        },
        "ratings": [
            {"name": r.name, "limit": r.limit, "value": r.value, "exceeded": r.exceeded} for r in design.ratings
        ],
        "tank": tank_record(design.tank),
        "harmonics": [
            {
                "order": h.order,
                "frequency_hz": h.frequency,
                "device_current_a": h.device_current,
                "load_power_w": h.load_power,
                "level_dbc": h.level,
                "line_level_dbc": h.line_level,
                "limit_dbc": h.limit,
                "margin_db": h.margin,
                "strays_decide": h.strays_decide,
            }
            for h in design.harmonics
        ],
        "settled": None,
        "cautions": [{"topic": c.topic, "text": c.text} for c in design.cautions],
        "files": list(files),
    }


def numbers(values: NDArray[np.float64]) -> list[float]:
    """Return an array as plain numbers."""
    return [float(value) for value in values]


def tank_record(tank: Tank) -> dict[str, Any]:
    """Return a tank with its branches from device to load."""
    return {
        "network": tank.network,
        "branches": [_part_record(part) for part in tank.parts],
        "impedance_ohm": complex_pair(tank.impedance),
        "loaded_q": tank.loaded_q,
        "input_q": tank.input_q,
        "bandwidth_hz": tank.bandwidth,
        "efficiency": tank.efficiency,
        "harmonic_termination": [[order, ratio] for order, ratio in tank.terminations],
        "trough_dip": tank.trough_dip,
    }


def _part_record(part: PartStress) -> dict[str, Any]:
    b: Branch = part.branch
    return {
        "name": b.name,
        "place": b.place,
        "kind": b.kind,
        "value": float(b.value),
        "unit": _UNIT[b.kind],
        "q": None if b.q is None else float(b.q),
        "series_resistance_ohm": None if b.series_resistance is None else float(b.series_resistance),
        "lead_inductance_h": float(b.lead_inductance),
        "self_capacitance_f": float(b.self_capacitance),
        "origin": b.origin,
        "peak_voltage_v": part.peak_voltage,
        "rms_current_a": part.rms_current,
        "loss_w": part.loss,
    }


def match_record(tank: Tank, transfer: Sequence[tuple[int, float]]) -> dict[str, Any]:
    """Return one network by itself, with (order, dB) of its harmonic transfer, as ``rfstage.match``."""
    return {
        "format": "rfstage.match",
        "version": VERSION,
        "tank": tank_record(tank),
        "harmonic_transfer_db": [[order, level] for order, level in transfer],
    }


def pulse_record(
    *, angle: float, exponent: float, operating_class: str, coefficients: NDArray[np.float64]
) -> dict[str, Any]:
    """Return the coefficients of a current pulse, as ``rfstage.pulse``; the angle in degrees."""
    a = numbers(coefficients)
    ratio = a[1] / a[0] if len(a) > 1 else math.nan
    return {
        "format": "rfstage.pulse",
        "version": VERSION,
        "conduction_angle_deg": angle,
        "exponent": exponent,
        "operating_class": operating_class,
        "coefficients": a,
        "fundamental_to_dc": ratio,
        "maximum_efficiency": ratio / 2,
    }
