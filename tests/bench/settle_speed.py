"""The steady state against transient runs of ngspice at equal loose accuracy, and a tuning curve, as ratios.

``python tests/bench/settle_speed.py``; where ngspice is not installed only the ratios without it are printed.
Equal accuracy: dc current 2e-3, output 0.02 dB, harmonics above −80 dBc 0.1 dB, each against 128 orders.
"""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import math
import shutil
import statistics
import sys
import tempfile
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parent.parent))

from test_spice import STAGES, simulated

from rfstage.stage import Stage
from rfstage.stagevalues import fitted_value, with_value
from rfstage.steady import SteadyState, settle, settle_many
from rfstage.sweep import sweep

STEPS = (50, 75, 100, 150, 200, 300, 400, 600, 800)  # of a period, tried until the transient is accurate enough


def verdict(ratio: float, goal: float) -> str:
    """Return the ratio with its goal."""
    return f"{ratio:7.0f}   goal at least {goal:.0f}   {'met' if ratio >= goal else 'MISSED'}"


def median_seconds(stage: Stage, times: int = 9) -> float:
    """Return how long one cold `settle` takes, orders chosen."""
    taken = []
    for _ in range(times):
        begin = time.perf_counter()
        settle(stage)
        taken.append(time.perf_counter() - begin)
    return statistics.median(taken)


def accurate(stage: Stage, exact: SteadyState, current: float, phasors: np.ndarray) -> bool:
    """Return whether a transient's figures are within the loose accuracy."""
    powers = np.abs(phasors) ** 2 / 2 * (1 / stage.load.impedance(stage.carrier * np.arange(1, 8))).real
    levels = 10 * np.log10(powers / powers[0])
    harmonics = all(
        abs(levels[h.order - 1] - h.level) < 0.1 for h in exact.harmonics[:6] if h.level is not None and h.level > -80
    )
    return bool(
        abs(current / exact.dc_current - 1) < 2e-3
        and abs(10 * math.log10(powers[0] / exact.output_power)) < 0.02
        and harmonics
    )


def transient_seconds(stage: Stage, exact: SteadyState) -> float | None:
    """Return the time of the cheapest transient run that is accurate enough."""
    with tempfile.TemporaryDirectory() as folder:
        for steps in STEPS:
            begin = time.perf_counter()
            try:
                current, phasors = simulated(stage, steps, Path(folder))
            except (OSError, ArithmeticError, ValueError):
                continue
            if accurate(stage, exact, current, phasors):
                return time.perf_counter() - begin
    return None


def main() -> None:
    """Print ratios of single solves, of a 101-point tuning curve, and of the curve to its own cold solves."""
    curves, singles, units = [], [], []
    have = shutil.which("ngspice") is not None
    print("steady state, one thread" + ("" if have else " (ngspice is not installed: only the ratios without it)"))
    for name, stage in STAGES.items():
        alone = median_seconds(stage)
        tuned = next(b.name for b in stage.branches if b.kind == "capacitor" and b.place == "shunt")
        value = fitted_value(stage, tuned) or 0.0
        along = list(np.linspace(0.75 * value, 1.25 * value, 101))
        curve = used = cold = math.inf
        for _ in range(3):
            begin, spent = time.perf_counter(), time.process_time()
            found = sweep(stage, tuned, along)
            curve, used = min(curve, time.perf_counter() - begin), min(used, time.process_time() - spent)
            orders = found.points[0].orders_solved
            spent = time.process_time()
            for point in along[::5]:
                settle_many([with_value(stage, tuned, point)], orders=orders)
            cold = min(cold, (time.process_time() - spent) / len(along[::5]))
        units.append(used / cold)
        line = f"  {name:<32} {1000 * alone:6.1f} ms a solve"
        line += f"; 101-point curve {units[-1]:3.0f} cold solves of {orders} orders"
        if have:
            transient = transient_seconds(stage, settle(stage, orders=128))
            if transient is None:
                line += "; no transient was accurate enough"
            else:
                singles.append(transient / alone)
                curves.append(101 * transient / curve)
                line += f"; a transient takes {singles[-1]:5.0f} times as long"
        print(line)
    most = max(units)
    print(f"  101-point curve in cold solves{most:7.0f}   goal at most 50   {'met' if most <= 50 else 'MISSED'}")
    if singles:
        print(f"  ngspice over settle, median   {verdict(statistics.median(singles), 50)}")
        print(f"  ngspice over settle, least    {verdict(min(singles), 10)}")
        print(f"  101-point curve, median       {verdict(statistics.median(curves), 200)}")
        print(f"  101-point curve, least        {verdict(min(curves), 75)}")


if __name__ == "__main__":
    main()
