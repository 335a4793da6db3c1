"""How long the search for a harmonic filter takes, against one walk of the circuit over a hundred cutoffs.

Both in one run, best of several: ``python tests/bench/filter_speed.py``. A search is some dozens
of such walks, more where nothing does it and all orders are tried.
"""

from __future__ import annotations

import contextlib
import math
import sys
import time
from collections.abc import Callable, Sequence
from functools import partial

import numpy as np
from numpy.typing import NDArray

from rfstage.errors import ImpossibleError
from rfstage.filters.candidates import grid
from rfstage.filters.choose import choose_filter
from rfstage.filters.lowpass import low_pass
from rfstage.filters.prototypes import chebyshev
from rfstage.ladder import Branch, Ladder
from rfstage.pulse import pulse_coefficients

CARRIER = 7.1e6
HARMONICS = CARRIER * np.arange(1, 11)
PULSE = np.abs(pulse_coefficients(math.radians(60), highest_order=10))[1:]
TANK = (
    Branch("C1", "shunt", "capacitor", 7.0e-9, q=1000.0),
    Branch("L1", "series", "coil", 0.2e-6, q=150.0, q_frequency=CARRIER),
    Branch("C2", "shunt", "capacitor", 3.0e-9, q=1000.0),
)
ROUNDS = 15
GOAL = 100  # walks a search; four times that is a goal missed by far


def search(limit: float) -> None:
    """Search the filter for one limit [dB]."""

    def levels(parts: Sequence[Branch]) -> NDArray[np.float64]:
        volts = np.abs(Ladder((*TANK, *parts)).transimpedance(HARMONICS, 50.0)) * PULSE
        level = 20 * np.log10(volts / volts[..., :1])
        return np.asarray(-level[..., 1:] - limit)

    with contextlib.suppress(ImpossibleError):
        choose_filter(-levels(()), levels, carrier=CARRIER, resistance=50.0, coil_q=150.0, capacitor_q=1000.0)


def best(call: Callable[[], object]) -> float:
    """Return the shortest time of several calls [s]."""
    times = []
    for _ in range(ROUNDS):
        start = time.perf_counter()
        call()
        times.append(time.perf_counter() - start)
    return min(times)


def main() -> int:
    """Print the ratios."""
    cutoffs = CARRIER * np.linspace(1.15, 1.8, 110)
    parts = low_pass(
        chebyshev(7, ripple=0.1), form="coil-first", cutoff=cutoffs, resistance=50.0, coil_q=150.0, carrier=CARRIER
    )
    walk = best(lambda: Ladder((*TANK, *parts)).transimpedance(HARMONICS, 50.0))
    print(f"one walk, ten branches, 110 cutoffs, 10 frequencies: {walk * 1e3:.2f} ms")
    worst = 0.0
    for limit in (46.0, 63.0, 73.0, 200.0):
        warm = best(partial(search, limit))

        def cold(limit: float = limit) -> None:
            grid.cache_clear()
            search(limit)

        first = best(cold)
        worst = max(worst, first / walk)
        print(f"limit {limit:g} dB: {first * 1e3:5.1f} ms first, {warm * 1e3:5.1f} ms again, {first / walk:.0f} walks")
    print(f"goal: at most {GOAL} walks")
    return 1 if worst > 4 * GOAL else 0


if __name__ == "__main__":
    sys.exit(main())
