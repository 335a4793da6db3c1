"""Whether standard errors say the truth: ``python tests/bench/verify_sets.py [captures tanks]``.

Captures of five harmonics over eight bits with half a step to two steps of noise, and perturbed tanks behind an
analyser with noise, one port and two in turn; 1000 captures and 500 tanks by default. A 95 % interval is to hold the
truth in 93 to 97 of 100, and the variance to stay within 1.5 of the Cramér-Rao bound.
"""

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import sys
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

import verifysets
from verifysets import K95


def verdict(met: bool) -> str:
    """Return the word beside a figure."""
    return "met" if met else "MISSED"


def share(name: str, off: np.ndarray) -> None:
    """Print how many of the errors, over their standard errors, lie within a 95 % interval."""
    within = float(np.mean(np.abs(off) < K95))
    met = 0.93 <= within <= 0.97
    print(f"  {name:<32} {within:7.1%} of {off.size:<6} goal 93 % to 97 %   {verdict(met)}")


def main() -> None:
    """Run both sets and print their figures."""
    captures, tanks = (int(a) for a in sys.argv[1:3]) if len(sys.argv) == 3 else (1000, 500)
    trials = [verifysets.trial(seed) for seed in range(captures)]
    print(f"{captures} captures:")
    parts = np.array([t.parts for t in trials])
    share("mean", parts[:, 0])
    for order in range(1, verifysets.ORDERS + 1):
        share(f"order {order}, both parts", parts[:, [order, verifysets.ORDERS + order]].reshape(-1))
    share("frequency", np.array([t.frequency for t in trials]))
    ratio = np.mean([(t.errors / t.bound) ** 2 for t in trials], axis=0)
    worst = float(ratio.max())
    print(f"  variance over Cramér-Rao, worst  {worst:7.2f}          goal at most 1.5    {verdict(worst <= 1.5)}")
    found = [verifysets.tank_trial(seed) for seed in range(tanks)]
    print(f"{tanks} tanks:")
    share("values told", np.array([v for values, _ in found for v in values]))
    share("Qs told", np.array([q for _, qs in found for q in qs]))


if __name__ == "__main__":
    main()
