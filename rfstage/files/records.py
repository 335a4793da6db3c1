"""Results as JSON: the keys other programs rely on, SI and unrounded, complex numbers as [real, imaginary]."""

from __future__ import annotations

import json
import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from rfstage.designs.design import Design
from rfstage.designs.judging import Verdict, ratings_of
from rfstage.kinds import KEYS, THROUGH, unit
from rfstage.ladder import Branch
from rfstage.matching.tank import PartStress, Tank
from rfstage.operating import Rating
from rfstage.stagevalues import has_one_value

if TYPE_CHECKING:
    from rfstage.cautions import Caution
    from rfstage.designs.heat import Heat
    from rfstage.designs.ranking import Ranking
    from rfstage.filters.choose import Filter
    from rfstage.steady import SteadyState

VERSION = 1
_SUFFIX = {"F": "_f", "H": "_h", "ohm": "_ohm", "": ""}


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
            "choke_dc_loss_w": point.choke_loss,
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
        "ratings": [rating_record(r) for r in design.ratings],
        "tank": tank_record(design.tank),
        "harmonics": [
            {
                "order": h.order,
                "frequency_hz": h.frequency,
                "device_current_a": h.device_current,
                "load_power_w": h.load_power,
                "level_dbc": h.level,
                "settled_level_dbc": h.settled_level,
                "line_level_dbc": h.line_level,
                "limit_dbc": h.limit,
                "margin_db": h.margin,
                "strays_decide": h.strays_decide,
            }
            for h in design.harmonics
        ],
        "settled": None if design.settled is None else settled_record(design.settled),
        "heat": None if design.heat is None else _heat_record(design.heat),
        "filter": None if design.filter is None else _filter_record(design.filter, design.filter_terminations),
        "ranking": None if design.ranking is None else _ranking_record(design.ranking),
        "parts": None,
        "cautions": _cautions(design.cautions),
        "files": list(files),
    }


def _heat_record(heat: Heat) -> dict[str, Any]:
    from rfstage.files.heatrecord import heat_record

    return heat_record(heat)


def _filter_record(made: Filter, terminations: Sequence[tuple[int, complex]]) -> dict[str, Any]:
    return {
        "kind": made.kind,
        "order": made.order,
        "ripple_db": made.ripple_db,
        "cutoff_hz": made.cutoff,
        "form": made.form,
        "line_ohm": made.resistance,
        "parts": [branch.name for branch in made.parts],
        "impedance_ohm": [[order, *complex_pair(z)] for order, z in terminations],
        "insertion_loss_db": made.insertion_loss_db,
        "return_loss_db": made.return_loss_db if math.isfinite(made.return_loss_db) else None,
    }


def _ranking_record(ranking: Ranking) -> list[dict[str, Any]]:
    return [
        {
            "network": c.network,
            "filter": None if c.filter is None else {"kind": c.filter.kind, "order": c.filter.order},
            "chosen": place == ranking.chosen,
            "allowed": c.allowed,
            "refused": c.refused or None,
            "margin_db": c.margin,
            "trough_dip": c.trough_dip if c.fitted else None,
            "efficiency": c.efficiency if c.fitted else None,
            "parts": c.parts if c.fitted else None,
            "extremes": [extreme.words for extreme in c.extremes],
        }
        for place, c in enumerate(ranking.candidates)
    ]


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
    single, through = has_one_value(b.kind), b.place == THROUGH
    record = {
        "name": b.name,
        "place": b.place,
        "kind": b.kind,
        "value": float(b.value) if single else None,
        "unit": unit(b.kind) if single else None,
        "q": None if b.q is None else float(b.q),
        "series_resistance_ohm": None if b.series_resistance is None else float(b.series_resistance),
        "lead_inductance_h": 0.0 if through else float(b.lead_inductance),
        "self_capacitance_f": float(b.self_capacitance),
        "origin": b.origin,
        "peak_voltage_v": part.peak_voltage,
        "rms_current_a": part.rms_current,
        "loss_w": part.loss,
    }
    if single:
        return record
    own = {f"{key.name}{_SUFFIX[key.unit]}": getattr(b, key.attribute) for key in KEYS[b.kind]}
    record |= {name: None if value is None else float(value) for name, value in own.items()}
    if b.kind == "coupled":
        record["tap"] = b.tap or None
    if through:
        record |= {"secondary_peak_voltage_v": part.far_voltage, "secondary_rms_current_a": part.far_current}
    return record


def match_record(tank: Tank, transfer: Sequence[tuple[int, float]], continued: Sequence[int] = ()) -> dict[str, Any]:
    """Return one network by itself, with (order, dB) of its harmonic transfer, as ``rfstage.match``.

    ``continued`` names the orders at which a measured load was continued beyond its table.
    """
    return {
        "format": "rfstage.match",
        "version": VERSION,
        "tank": tank_record(tank),
        "harmonic_transfer_db": [[order, level] for order, level in transfer],
        "load_continued_at": list(continued),
    }


def pulse_record(
    *, angle: float, exponent: float, operating_class: str, coefficients: Sequence[float], fundamental_to_dc: float
) -> dict[str, Any]:
    """Return the coefficients of a current pulse, as ``rfstage.pulse``; the angle in degrees."""
    return {
        "format": "rfstage.pulse",
        "version": VERSION,
        "conduction_angle_deg": angle,
        "exponent": exponent,
        "operating_class": operating_class,
        "coefficients": list(coefficients),
        "fundamental_to_dc": fundamental_to_dc,
        "maximum_efficiency": fundamental_to_dc / 2,
    }


def _cautions(cautions: Sequence[Caution]) -> list[dict[str, str]]:
    return [{"topic": c.topic, "text": c.text} for c in cautions]


def settle_record(
    state: SteadyState, verdicts: Sequence[Verdict], cautions: Sequence[Caution] = (), heat: Heat | None = None
) -> dict[str, Any]:
    """Return a steady state as ``rfstage.settle``, version 1, with all that was found about it."""
    return {
        "format": "rfstage.settle",
        "version": VERSION,
        **settled_record(state),
        "verdicts": [
            {"order": v.order, "line_level_dbc": v.line_level, "limit_dbc": v.limit, "margin_db": v.margin}
            for v in verdicts
        ],
        "ratings": [rating_record(r) for r in ratings_of(state)],
        "heat": None if heat is None else _heat_record(heat),
        "cautions": _cautions(cautions),
    }


def rating_record(rating: Rating) -> dict[str, Any]:
    """Return a rating with what it is held against."""
    return {"name": rating.name, "limit": rating.limit, "value": rating.value, "exceeded": rating.exceeded}


def settled_record(state: SteadyState) -> dict[str, Any]:
    """Return a steady state, with its waveform."""
    change = state.change_from_half_the_orders
    return {
        **meters(state),
        "dc_power_w": state.dc_power,
        "devices": [
            {
                "dc_current_a": d.dc_current,
                "dissipation_w": d.dissipation,
                "peak_voltage_v": d.peak_voltage,
                "peak_current_a": d.peak_current,
            }
            for d in state.devices
        ],
        "choke_loss_w": state.choke_loss,
        "branch_losses_w": dict(state.branch_losses),
        "branch_stresses": [
            {"name": b.name, "peak_voltage_v": b.peak_voltage, "rms_current_a": b.rms_current, "loss_w": b.loss}
            for b in state.branches
        ],
        "harmonics": [
            {"order": h.order, "frequency_hz": h.frequency, "load_power_w": h.load_power, "level_dbc": h.level}
            for h in state.harmonics
        ],
        "waveform": {
            "phase_deg": numbers(state.waveform.phase_deg),
            "voltage_v": numbers(state.waveform.voltage),
            "current_a": numbers(state.waveform.current),
        },
        "orders_solved": state.orders_solved,
        "balance_error": state.balance_error,
        "residual": state.residual,
        "change_from_half_the_orders": None
        if change is None
        else {
            "dc_current": change.dc_current,
            "output_power_db": change.output_power_db,
            "harmonics_db": change.harmonics_db,
            "peak_voltage": change.peak_voltage,
        },
    }


def meters(state: SteadyState) -> dict[str, Any]:
    """Return what the meters of a settled stage read."""
    return {
        "dc_current_a": state.dc_current,
        "output_power_w": state.output_power,
        "efficiency": state.efficiency,
        "dissipation_w": state.dissipation,
        "minimum_voltage_v": state.minimum_voltage,
        "peak_voltage_v": state.peak_voltage,
        "peak_current_a": state.peak_current,
        "conduction_angle_deg": state.conduction_angle_deg,
    }
