"""Settle thousands of random stages and print how it went: ``python tests/bench/stress_set.py [ordinary extreme]``.

4000 ordinary and 2000 extreme stages by default, at 32 orders from a cold start, and the first 300 ordinary ones with
their orders chosen, the first 200 of them against 512 orders. Times are processor time of one thread, solution and
report together.
"""

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import sys
import time
from collections import Counter
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

import stress

from rfstage.errors import ConvergenceError
from rfstage.stage import Stage
from rfstage.steady import SteadyState, settle, settle_many


def run(name: str, stages: list[Stage], orders: int | None) -> None:
    """Settle each stage by itself and print the figures."""
    times, states, lost = [], [], 0
    for stage in stages:
        begun = time.process_time()
        try:
            states.append(settle(stage) if orders is None else settle_many([stage], orders=orders)[0])
        except ConvergenceError as error:
            lost += 1
            print(f"  not settled: {error}")
        times.append(1e3 * (time.process_time() - begun))
    print(f"{name}: {len(states)} of {len(states) + lost} settled, by {dict(Counter(s.method for s in states))}")
    if orders is None:
        print(f"  orders {dict(sorted(Counter(s.orders_solved for s in states).items()))}")
    print(f"  ms          {_spread(times)}")
    print(f"  iterations  {_spread([s.iterations for s in states])}")
    if orders is None:
        _peaks(states[:200])
    _accuracy(states)


def _peaks(chosen: list[SteadyState]) -> None:
    fine = settle_many([state.stage for state in chosen], orders=512)
    error = np.abs([one.peak_voltage / other.peak_voltage - 1 for one, other in zip(chosen, fine, strict=True)])
    print(f"  peak volts  99 % within {np.percentile(error, 99):.1e} of 512 orders, max {error.max():.1e}")


def _accuracy(states: list[SteadyState]) -> None:
    balance = np.abs([s.balance_error for s in states])
    print(
        f"  balance     max {balance.max():.1e}, 99 % below {np.percentile(balance, 99):.1e}; "
        f"residual max {max(s.residual for s in states):.1e}"
    )
    swing = [s.minimum_voltage / s.stage.supply.voltage for s in states]
    print(
        f"  reach a tenth of the supply {np.mean(np.less(swing, 0.1)):.0%}, "
        f"swing below zero {np.mean(np.less(swing, 0)):.0%}"
    )


def _spread(values: list[float] | list[int]) -> str:
    return (
        f"median {np.median(values):.3g}, 95 % below {np.percentile(values, 95):.3g}, "
        f"max {max(values):.3g}, mean {np.mean(values):.3g}"
    )


def main() -> None:
    """Run the sets of the sizes on the command line."""
    ordinary, extreme = (int(a) for a in sys.argv[1:3]) if len(sys.argv) == 3 else (4000, 2000)
    usual = stress.stages(ordinary)
    run("ordinary, 32 orders", usual, 32)
    run("ordinary, orders chosen", usual[:300], None)
    run("extreme, 32 orders", stress.stages(extreme, stress.EXTREME), 32)


if __name__ == "__main__":
    main()
