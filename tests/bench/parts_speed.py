"""How long real parts take to choose, against one textbook design of the same job.

Both in one run, turn about, medians: ``python tests/bench/parts_speed.py``. Choosing parts settles the stage twice
(in the given load and in the resistive line), which is most of its time.
"""

from __future__ import annotations

import statistics
import sys
import time
from collections.abc import Callable
from dataclasses import replace
from functools import partial
from pathlib import Path

from rfstage.designs.design import design
from rfstage.files.job import read_jobs
from rfstage.fitting.fitted import fit_parts
from rfstage.fitting.request import request_of

EXAMPLES = Path(__file__).resolve().parents[2] / "examples"
JOBS = ("lantern", "gallery", "tower")
ROUNDS = 25
GOAL = 12  # textbook designs a choice of parts
FAR = 4  # times that is a goal missed by far


def took(call: Callable[[], object]) -> float:
    """Return how long a call takes [s]."""
    start = time.perf_counter()
    call()
    return time.perf_counter() - start


def main() -> int:
    """Print the ratios."""
    worst = 0.0
    for name in JOBS:
        job = replace(read_jobs(str(EXAMPLES / f"{name}.toml"), {})[0], network="pi")  # comparing networks takes longer
        made, asked = design(job), request_of(job)
        pairs = [
            (took(partial(design, job, textbook=True)), took(partial(fit_parts, made, asked)))
            for _ in range(ROUNDS + 2)
        ][2:]  # the first two warm caches
        book, parts = (statistics.median(times) for times in zip(*pairs, strict=True))
        worst = max(worst, parts / book)
        ratio = parts / book
        verdict = "met" if ratio <= GOAL else "MISSED"
        print(f"  {name:<8} textbook {book * 1e3:6.2f} ms  parts {parts * 1e3:6.2f} ms", end="")
        print(f"  {ratio:5.1f} designs   goal at most {GOAL}   {verdict}")
    return 1 if worst > FAR * GOAL else 0


if __name__ == "__main__":
    sys.exit(main())
