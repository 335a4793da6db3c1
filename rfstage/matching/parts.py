"""What the rooms of the networks share: reactances made into parts, and the shape of an answer."""

from __future__ import annotations

import math

from rfstage.ladder import Branch
from rfstage.quantity import exact_complex


def coil(name: str, place: str, reactance: float, carrier: float) -> Branch:
    """Return a lossless coil of a reactance [ohm] at the carrier [Hz]."""
    return Branch(name, place, "coil", reactance / (2 * math.pi * carrier))


def capacitor(name: str, place: str, reactance: float, carrier: float) -> Branch:
    """Return a lossless capacitor of a reactance [ohm, given positive] at the carrier [Hz]."""
    return Branch(name, place, "capacitor", 1 / (2 * math.pi * carrier * reactance))


def parallel_resistance(impedance: complex) -> float:
    """Return the resistance [ohm] of the parallel form of an impedance [ohm]."""
    return abs(impedance) ** 2 / impedance.real


def four_figures(impedance: complex) -> str:
    """Return an impedance [ohm] for a message, each part to four figures."""
    return exact_complex(complex(float(f"{impedance.real:.4g}"), float(f"{impedance.imag:.4g}")))
