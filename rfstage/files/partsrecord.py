"""The parts of a design as JSON: what to buy, what to wind, and what they make of the stage."""

from __future__ import annotations

from typing import Any

from rfstage.designs.judging import ratings_of
from rfstage.files.records import complex_pair, rating_record
from rfstage.fitting.fitted import Fitting


def parts_record(fitting: Fitting) -> dict[str, Any]:
    """Return the value of ``design``'s key ``parts``."""
    return {
        "capacitors": [
            {
                "branch": b.name,
                "role": b.role,
                "values_f": list(b.values),
                "trimmer_f": None if b.trimmer is None else list(b.trimmer),
                "setting_f": b.setting,
                "total_f": b.total,
                "wanted_f": b.wanted,
                "lead_inductance_h": b.lead,
                "spare_percent": None if b.trimmer is None else b.spare,
                "stresses": [
                    {
                        "value_f": s.value,
                        "peak_voltage_v": s.peak_voltage,
                        "rms_current_a": s.rms_current,
                        "loss_w": s.loss,
                        "voltage_to_stand_v": s.voltage_to_stand,
                        "current_to_stand_a": s.current_to_stand,
                        "voltage_rating_v": s.voltage_rating,
                        "self_resonance_hz": s.self_resonance,
                    }
                    for s in b.stresses
                ],
            }
            for b in fitting.bought
        ],
        "coils": [
            {
                "branch": w.name,
                "turns": w.coil.turns,
                "diameter_m": w.coil.diameter,
                "length_m": w.coil.length,
                "wire_diameter_m": w.coil.wire_diameter,
                "wire_length_m": w.coil.wire_length,
                "inductance_h": w.coil.inductance,
                "rf_inductance_h": w.coil.rf_inductance,
                "self_capacitance_f": w.coil.self_capacitance,
                "self_resonance_hz": w.coil.self_resonance,
                "unloaded_q": w.coil.unloaded_q,
                "rms_current_a": w.current,
                "loss_w": w.loss,
                "tap_turns": w.tap,
                "note": w.note or None,
            }
            for w in fitting.wound
        ],
        "rings": [
            {
                "branch": r.name,
                "core": r.coil.core.name,
                "turns": r.coil.turns,
                "far_turns": r.far_turns,
                "wire_diameter_m": r.coil.wire_diameter,
                "inductance_h": r.coil.inductance,
                "wanted_h": r.wanted,
                "peak_flux_density_t": r.flux,
                "flux_density_limit_t": r.limit,
            }
            for r in fitting.rings
        ],
        "as_designed": dict(fitting.ideal),
        "impedance_ohm": complex_pair(fitting.impedance),
        "retrimmed_impedance_ohm": complex_pair(fitting.retrimmed),
        "retrimmed": list(fitting.moved),
        "compared": [
            {"name": c.name, "unit": c.unit, "ideal": c.ideal, "with_parts": c.fitted} for c in fitting.compared
        ],
        "ratings": [] if fitting.state is None else [rating_record(r) for r in ratings_of(fitting.state)],
        "trouble": fitting.trouble or None,
    }
