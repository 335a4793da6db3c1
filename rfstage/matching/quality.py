r"""Q, bandwidth and resonances of a tank.

Loaded Q is ω·(mean electric + magnetic energy in tank parts and output capacitance)/(power into the
network); choke, blocking capacitor and load reactance are left out. For a lossless pi it is Q1 + Q2.
Input-side Q is load resistance × ω × (output capacitance + input capacitor).
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from rfstage.kinds import THROUGH
from rfstage.ladder import Branch, Ladder
from rfstage.load import Load

# From the carrier downwards and upwards, relative to it, close together near it
_BOTH_WAYS = np.array(
    [
        1 - np.append(0, np.geomspace(1e-5, 0.9995, 500)),
        1 + np.append(0, np.geomspace(1e-5, 30.0, 500)),
    ]
)


def impedance_and_loaded_q(
    feed: Sequence[Branch], tank: Sequence[Branch], load: complex, carrier: float
) -> tuple[complex, float]:
    """Return the impedance [ohm] the device sees, and the loaded Q [-], from one walk.

    Arguments as `loaded_q`.
    """
    branches = (*feed, *tank)
    walk = Ladder(branches).walk(carrier, load)
    z = complex(walk.impedance)
    stored = 0.0
    for k, (branch, state) in enumerate(zip(branches, walk.branches, strict=True)):
        if k >= len(feed) or branch.origin == "device":
            seen = None if state.seen is None else complex(state.seen)
            stored += branch.stored_energy(carrier, complex(state.current), seen)
    return z, 2 * math.pi * carrier * stored / (z.real / 2)


def loaded_q(feed: Sequence[Branch], tank: Sequence[Branch], load: complex, carrier: float) -> float:
    """Return the loaded Q [-] of a tank behind its feed (output capacitance, choke, blocking capacitor).

    ``load`` [ohm] and ``carrier`` [Hz] are scalars; the definition is in the module's docstring.
    """
    return impedance_and_loaded_q(feed, tank, load, carrier)[1]


def input_side_q(feed: Sequence[Branch], tank: Sequence[Branch], resistance: float, carrier: float) -> float | None:
    """Return the input-side Q [-], or None where no capacitor stands across the device.

    What stands behind a transformer is not across the device.
    """
    near = [*feed, *tank[:1]]
    beyond = next((k for k, b in enumerate(near) if b.place == THROUGH), len(near))
    across = [b for b in near[:beyond] if b.place == "shunt" and b.kind == "capacitor"]
    return resistance * 2 * math.pi * carrier * sum(float(b.value) for b in across) if across else None


def bandwidth(branches: Sequence[Branch], load: Load, carrier: float) -> float | None:
    """Return the distance [Hz] of the −3 dB points of |V_load/I_device| nearest the carrier.

    Relative to its value at the carrier; None where one of the two is missing.
    """
    ladder = Ladder(branches)
    level = abs(complex(ladder.transimpedance(carrier, load))) / math.sqrt(2)
    frequencies = carrier * _BOTH_WAYS
    for _ in range(4):  # each time between the last point above the level and the first below it
        below = np.abs(ladder.transimpedance(frequencies, load)) < level
        if not below.any(axis=1).all():
            return None
        first = np.maximum(below.argmax(axis=1), 1)
        inner, outer = frequencies[(0, 1), first - 1], frequencies[(0, 1), first]
        frequencies = np.linspace(inner, outer, 65, axis=1)
    low, high = (inner + outer) / 2
    return float(high - low)


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
        low, at, high = (float(f) for f in frequencies[best - 1 : best + 2])
    reference = abs(complex(ladder.transimpedance(carrier, load)))
    return at, 20 * math.log10(float(level[best]) / reference)
