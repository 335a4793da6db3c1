"""How fast the coefficients of the current pulse are, against quadrature and against the textbook form.

10,000 conduction angles × 16 coefficients, all sides in one run, interleaved, medians:
``python tests/bench/pulse_speed.py``. The quadrature is sampled and extrapolated.
"""

from __future__ import annotations

import math
import statistics
import time
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.integrate import quad

from rfstage.pulse import pulse_coefficients

ANGLES = 10_000
ORDERS = 16  # 0 to 15
SAMPLED = 20
ROUNDS = 15


def by_quadrature(half_angles: NDArray[np.float64]) -> list[list[float]]:
    """Integrate every coefficient of every angle by itself."""
    rows = []
    for theta in half_angles.tolist():
        cosine = math.cos(theta)

        def integrand(x: float, n: int, cosine: float = cosine) -> float:
            return (math.cos(x) - cosine) / (1 - cosine) * math.cos(n * x)

        rows.append([(2 if n else 1) / math.pi * quad(integrand, 0, theta, args=(n,))[0] for n in range(ORDERS)])
    return rows


def by_the_textbook(half_angles: NDArray[np.float64]) -> NDArray[np.float64]:
    """Evaluate the printed closed form over all angles and orders at once; it loses digits at both ends."""
    t = half_angles[:, np.newaxis]
    n = np.arange(2, ORDERS)
    sine, cosine = np.sin(t), np.cos(t)
    scale = math.pi * (1 - cosine)
    upper = 2 * (np.sin(n * t) * cosine - n * np.cos(n * t) * sine) / (n * (n * n - 1)) / scale
    return np.hstack([(sine - t * cosine) / scale, (t - sine * cosine) / scale, upper])


def seconds(call: Callable[[], object]) -> float:
    """Return how long a call takes: the best of three in a row, so that neither side pays for the other's memory."""
    taken = []
    for _ in range(3):
        begin = time.perf_counter()
        call()
        taken.append(time.perf_counter() - begin)
    return min(taken)


def verdict(met: bool) -> str:
    """Return the word beside a ratio."""
    return "met" if met else "MISSED"


def main() -> None:
    """Print the two ratios with their goals."""
    angles = np.random.default_rng(1).uniform(math.radians(0.5), math.pi, ANGLES)
    ours, textbook, quadrature = [], [], []
    for round_number in range(ROUNDS):
        some = angles[round_number * SAMPLED : (round_number + 1) * SAMPLED]
        quadrature.append(seconds(lambda some=some: by_quadrature(some)) * ANGLES / SAMPLED)
        for _ in range(8):
            textbook.append(seconds(lambda: by_the_textbook(angles)))
            ours.append(seconds(lambda: pulse_coefficients(angles, highest_order=ORDERS - 1)))
    own = statistics.median(ours)
    print(f"pulse: {ANGLES} angles × {ORDERS} coefficients in {1e3 * own:.2f} ms")
    ratio = statistics.median(quadrature) / own
    print(f"  times faster than a quadrature loop    {ratio:8.0f}   goal ≥ 1500   {verdict(ratio >= 1500)}")
    ratio = statistics.median(textbook) / own
    print(f"  times faster than the textbook form    {ratio:8.2f}   goal ≥ 1      {verdict(ratio >= 1)}")


if __name__ == "__main__":
    main()
