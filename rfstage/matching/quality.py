r"""Q, bandwidth and resonances of a tank.

Loaded Q is ω·(mean electric + magnetic energy in tank parts and output capacitance)/(power into the
network); choke, blocking capacitor and load reactance are left out. For a lossless pi it is Q1 + Q2.
Input-side Q is load resistance × ω × (output capacitance + input capacitor).
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from rfstage.ladder import Branch, Ladder
from rfstage.load import Load

_OFFSETS = np.geomspace(1e-5, 0.9995, 500)  # distance from the carrier, as a fraction of it
_UPWARD = np.geomspace(1e-5, 30.0, 500)


def reactive_power(branches: Sequence[Branch], load: complex, carrier: float) -> float:
    """Return ω × mean stored energy [var] in the branches, for 1 A peak into the first."""
    total = 0.0
    for branch, state in zip(branches, Ladder(branches).walk(carrier, load).branches, strict=True):
        current = complex(state.current)
        total += branch.stored_energy(carrier, current * complex(branch.impedance(carrier)), current)
    return 2 * math.pi * carrier * total


def loaded_q(feed: Sequence[Branch], tank: Sequence[Branch], load: complex, carrier: float) -> float:
    """Return the loaded Q [-] of a tank behind its feed (output capacitance, choke, blocking capacitor).

    ``load`` [ohm] and ``carrier`` [Hz] are scalars; the definition is in the module's docstring.
    """
    behind = complex(Ladder(tank).impedance(carrier, load))
    walk = Ladder(feed).walk(carrier, behind)
    into_tank = abs(complex(walk.transimpedance) / behind) ** 2
    stored = into_tank * reactive_power(tank, load, carrier)
    stored += sum(2 * math.pi * carrier * float(b.value) * abs(walk.impedance) ** 2 / 4
                  for b in feed if b.origin == "device")
    return stored / (complex(walk.impedance).real / 2)


def input_side_q(feed: Sequence[Branch], tank: Sequence[Branch], resistance: float, carrier: float) -> float | None:
    """Return the input-side Q [-], or None where no capacitor stands across the device."""
    across = [b for b in (*feed, *tank[:1]) if b.place == "shunt" and b.kind == "capacitor"]
    return resistance * 2 * math.pi * carrier * sum(float(b.value) for b in across) if across else None


def bandwidth(branches: Sequence[Branch], load: Load, carrier: float) -> float | None:
    """Return the distance [Hz] of the −3 dB points of |V_load/I_device| nearest the carrier.

    Relative to its value at the carrier; None where one of the two is missing.
    """
    ladder = Ladder(branches)
    level = abs(complex(ladder.transimpedance(carrier, load))) / math.sqrt(2)
    edges = []
    for frequencies in (carrier * (1 - _OFFSETS), carrier * (1 + _UPWARD)):
        below = np.abs(ladder.transimpedance(frequencies, load)) < level
        first = int(np.argmax(below))
        if not below[first]:
            return None
        edge = float(frequencies[first])
        inner = float(frequencies[first - 1]) if first else carrier
        for _ in range(3):
            between = np.linspace(inner, edge, 65)
            beyond = np.abs(ladder.transimpedance(between, load)) < level
            at = max(1, int(np.argmax(beyond)))
            inner, edge = float(between[at - 1]), float(between[at])
        edges.append((inner + edge) / 2)
    return edges[1] - edges[0]


def strongest_resonance_below(branches: Sequence[Branch], load: Load, carrier: float) -> tuple[float, float] | None:
    """Return frequency [Hz] and level [dB against the carrier] of the strongest peak below carrier/2.

    None if |V_load/I_device| has no peak there. Choke and blocking capacitor make one, often near a
    tenth of the carrier.
    """
    ladder = Ladder(branches)
    low, high = carrier / 1000, carrier / 2
    at = 0.0
    for _ in range(3):
        frequencies = np.geomspace(low, high, 241)
        level = np.abs(ladder.transimpedance(frequencies, load))
        inner = level[1:-1]
        peaks = np.flatnonzero((inner >= level[:-2]) & (inner > level[2:])) + 1
        if peaks.size == 0:
            return None
        best = int(peaks[np.argmax(level[peaks])])
        low, at, high = (float(f) for f in frequencies[best - 1: best + 2])
    reference = abs(complex(ladder.transimpedance(carrier, load)))
    return at, 20 * math.log10(float(level[best]) / reference)
