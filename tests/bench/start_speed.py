"""How fast the program starts, as a ratio to importing numpy and rich on one thread.

Whole processes, interleaved, medians. Run it with the Python of a real (not editable) install:
``python tests/bench/start_speed.py``. The designs with a goal name ``--network pi``, so that it is one network they
start and solve; what the default costs, all networks ranked, stands beside them without a goal.
"""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import time
from pathlib import Path

ROUNDS = 25
PROGRAM = str(Path(sys.executable).parent / "rfstage")
JOB = ("--carrier", "7.1MHz", "--power", "10W", "--angle", "120deg", "--supply", "13.8V")
PI = ("--network", "pi")
CASES = (
    ("design --textbook", (PROGRAM, "design", *JOB, *PI, "--textbook"), 1.6),
    ("design (corrected)", (PROGRAM, "design", *JOB, *PI), 2.2),
    ("design, all ranked", (PROGRAM, "design", *JOB), None),
    ("--help", (PROGRAM, "--help"), 0.35),
    ("design --help", (PROGRAM, "design", "--help"), 0.35),
    ("a wrong option", (PROGRAM, "design", "--carier", "7MHz"), 0.35),
    ("a malformed job file", (PROGRAM, "design", str(Path(__file__).parent / "malformed.toml")), 0.35),
)


def seconds(words: tuple[str, ...], settings: dict[str, str]) -> float:
    """Return how long a process takes."""
    begin = time.perf_counter()
    subprocess.run(words, env=settings, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL, check=False)
    return time.perf_counter() - begin


def main() -> None:
    """Print one line a case: its ratio to the reference, and the goal."""
    settings = {key: value for key, value in os.environ.items() if key not in ("PYTHONDONTWRITEBYTECODE", "PYTHONPATH")}
    reference = (sys.executable, "-c", "import numpy, rich.console, rich.table")
    base: list[float] = []
    times: dict[str, list[float]] = {name: [] for name, _, _ in CASES}
    for _ in range(ROUNDS):
        base.append(seconds(reference, {**settings, "OPENBLAS_NUM_THREADS": "1"}))
        for name, words, _ in CASES:
            times[name].append(seconds(words, settings))
    unit = statistics.median(base)
    print(f"start-up, against importing numpy and rich on one thread ({1000 * unit:.0f} ms here):")
    for name, _, goal in CASES:
        ratio = statistics.median(times[name]) / unit
        goal_words = "" if goal is None else f"   goal at most {goal:.2f}   {'met' if ratio <= goal else 'MISSED'}"
        print(f"  {name:<22} {ratio:5.2f}{goal_words}")


if __name__ == "__main__":
    main()
