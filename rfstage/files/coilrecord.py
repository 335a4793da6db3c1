"""A coil as JSON: ``rfstage.coil``, version 1; SI and unrounded, null for what is unknown or does not exist."""

from __future__ import annotations

import math
from typing import Any

from rfstage.files.records import VERSION
from rfstage.parts.coil import AirCoil, squeezed_and_spread, taps
from rfstage.parts.toroid import ToroidCoil, flux_limit


def coil_record(coil: AirCoil | ToroidCoil, *, current: float | None) -> dict[str, Any]:
    """Return a coil as ``rfstage.coil``, version 1; ``current`` is the rms current at the carrier [A], or None."""
    if isinstance(coil, AirCoil):
        return _air_record(coil, current)
    return _toroid_record(coil, current)


def _air_record(coil: AirCoil, current: float | None) -> dict[str, Any]:
    return {
        "format": "rfstage.coil",
        "version": VERSION,
        "turns": coil.turns,
        "diameter_m": coil.diameter,
        "length_m": coil.length,
        "pitch_m": coil.pitch,
        "wire_diameter_m": coil.wire_diameter,
        "wall_m": coil.wall,
        "wire_length_m": coil.wire_length,
        "core": None,
        "inductance_h": coil.inductance,
        "rf_inductance_h": coil.rf_inductance,
        "effective_inductance_h": coil.effective_inductance,
        "self_capacitance_f": coil.self_capacitance,
        "self_resonance_hz": coil.self_resonance,
        "resistance_ohm": coil.resistance,
        "effective_resistance_ohm": coil.effective_resistance,
        "unloaded_q": coil.unloaded_q,
        "effective_q": coil.effective_q,
        "carrier_hz": coil.carrier,
        "temperature_c": coil.temperature,
        "rms_current_a": current,
        "loss_w": None if current is None else coil.loss(current),
        "squeezed_and_spread": [
            {
                "length_m": other.length,
                "inductance_h": other.inductance,
                "unloaded_q": other.unloaded_q,
                "self_resonance_hz": other.self_resonance,
            }
            for other in squeezed_and_spread(coil)
        ],
        "taps": [
            {
                "turns": tap.turns,
                "inductance_h": tap.inductance,
                "mutual_inductance_h": tap.mutual,
                "coupling": tap.coupling,
                "voltage_share": tap.voltage,
            }
            for tap in taps(coil)
        ],
        "notes": list(coil.notes),
    }


def _toroid_record(coil: ToroidCoil, current: float | None) -> dict[str, Any]:
    return {
        "format": "rfstage.coil",
        "version": VERSION,
        "turns": coil.turns,
        "diameter_m": None,
        "length_m": None,
        "wire_diameter_m": coil.wire_diameter,
        "largest_wire_m": coil.largest_wire,
        "wire_length_m": coil.wire_length,
        "core": coil.core.name,
        "inductance_factor_h": coil.core.factor,
        "inductance_factor_source": coil.core.source,
        "inductance_h": coil.inductance,
        "effective_inductance_h": None,
        "self_capacitance_f": None,
        "self_resonance_hz": None,
        "resistance_ohm": None,
        "copper_resistance_ohm": coil.copper_resistance,
        "unloaded_q": None,
        "carrier_hz": coil.carrier,
        "temperature_c": coil.temperature,
        "rms_current_a": current,
        "loss_w": None,
        "peak_flux_density_t": None if current is None else coil.flux_density(math.sqrt(2) * current),
        "flux_density_limit_t": flux_limit(coil.carrier),
        "notes": list(coil.notes),
    }
