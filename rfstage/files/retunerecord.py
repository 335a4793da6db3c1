"""What a retuning says, as JSON: ``rfstage.retune``, version 1."""

from __future__ import annotations

from typing import Any

from rfstage.files.records import complex_pair, settled_record
from rfstage.retuning.arithmetic import Bench, Resonance
from rfstage.retuning.carrier import Retuned
from rfstage.retuning.causes import Diagnosis, next_words
from rfstage.retuning.procedure import Point, Procedure
from rfstage.stage import Stage

VERSION = 1


def retune_record(
    stage: Stage,
    *,
    retuned: Retuned | None = None,
    diagnosis: Diagnosis | None = None,
    procedure: Procedure | None = None,
    bench: Bench | None = None,
) -> dict[str, Any]:
    """Return what was asked of a stage; ``changes`` and ``causes`` are empty where they were not asked.

    ``changes`` has one entry for each part of each option, best option first; ``option`` numbers them from 1, and
    entries of one option share its ``settled``.
    """
    return {
        "format": "rfstage.retune",
        "version": VERSION,
        "carrier_hz": stage.carrier if retuned is None else retuned.carrier,
        "changes": [] if retuned is None else _changes(retuned),
        "causes": []
        if diagnosis is None
        else [
            {
                "part": c.part,
                "unit": c.unit,
                "nominal": c.nominal,
                "estimated": c.estimated,
                "misfit": c.misfit,
                "group": c.group,
            }
            for c in diagnosis.causes
        ],
        "next_reading": None if diagnosis is None else next_words(diagnosis),
        "wanted_impedance_ohm": None if retuned is None else complex_pair(retuned.wanted),
        "nearest_carrier_hz": None if retuned is None else retuned.nearest,
        "readings": [] if diagnosis is None else _readings(diagnosis),
        "as_built_misfit": None if diagnosis is None else diagnosis.as_built_misfit,
        "procedure": None if procedure is None else _procedure(procedure),
        "bench": None if bench is None else _bench(bench),
    }


def _changes(retuned: Retuned) -> list[dict[str, Any]]:
    return [
        {
            "option": number,
            "part": change.part,
            "unit": change.unit,
            "now": change.now,
            "wanted": change.wanted,
            "within_reach": change.within_reach,
            "way": change.way,
            "length_m": change.length,
            "turns": change.turns,
            "serves": option.serves,
            "mismatch": option.mismatch,
            "impedance_ohm": complex_pair(option.impedance),
            "loaded_q": option.loaded_q,
            "limit_margin_db": option.limit_margin,
            "settled": settled_record(option.state),
        }
        for number, option in enumerate(retuned.options, start=1)
        for change in option.changes
    ]


def _readings(diagnosis: Diagnosis) -> list[dict[str, Any]]:
    return [
        {
            "dc_current_a": reading.dc_current,
            "output_power_w": reading.output_power,
            "supply_v": reading.supply,
            "drive_v": reading.drive,
            "settings": dict(reading.settings),
            "dip": reading.dip,
            "efficiency": found.efficiency,
            "load_resistance_ohm": found.load_resistance,
            "conduction_angle_deg": found.conduction_angle_deg,
        }
        for reading, found in zip(diagnosis.readings, diagnosis.implied, strict=True)
    ]


def _procedure(steps: Procedure) -> dict[str, Any]:
    return {
        "tuning": steps.tuning,
        "loading": steps.loading,
        "start_supply_v": steps.start_supply,
        "first_dip": _point(steps.first_dip),
        "dip": _point(steps.dip),
        "output_peak": _point(steps.output_peak),
        "below_dip": _point(steps.below),
        "above_dip": _point(steps.above),
        "loadings": [{"value": loading.value, "dip": _point(loading.tuned)} for loading in steps.loadings],
        "cautions": [{"topic": c.topic, "text": c.text} for c in steps.cautions],
    }


def _point(point: Point | None) -> dict[str, float] | None:
    if point is None:
        return None
    return {"value": point.value, "dc_current_a": point.dc_current, "output_power_w": point.output_power}


def _bench(bench: Bench) -> dict[str, Any]:
    return {
        "inductance_h": None if bench.coil is None else float(bench.coil.inductance),
        "stray_capacitance_f": None if bench.coil is None else float(bench.coil.stray_capacitance),
        "loaded": _resonance(bench.loaded),
        "unloaded": _resonance(bench.unloaded),
        "external_q": None if bench.shared is None else float(bench.shared.external_q),
        "efficiency": None if bench.shared is None else float(bench.shared.efficiency),
        "coupling": None if bench.coupling is None else float(bench.coupling.coupling),
        "coupled_centre_hz": None if bench.coupling is None else float(bench.coupling.centre),
    }


def _resonance(found: Resonance | None) -> dict[str, float] | None:
    if found is None:
        return None
    return {"centre_hz": float(found.centre), "bandwidth_hz": float(found.bandwidth), "q": float(found.q)}
