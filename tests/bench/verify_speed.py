"""How fast ten million samples are verified: ``python tests/bench/verify_speed.py [samples of .npy, rows of CSV]``.

Reading and analysing a mapped .npy file against one numpy rfft of its samples, and a CSV file against numpy.loadtxt of
it: processor time of one thread, best of several, in one run; and the memory that each takes above what the interpreter
had before (as Linux tells it). The CSV has a million rows by default, to be done within a minute on any machine; its
memory is carried on to ten million from what half a million more rows take.
"""

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import json
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np

from rfstage import load_stage, settle
from rfstage.files.captures import read_measurement
from rfstage.verify.levels import Setup
from rfstage.verify.verification import Asked, verify

RATE = 2.5e9  # samples a second
CARRIER = 7.1004e6
ROOT = Path(__file__).parents[2]
MEMORY = """
import json, sys
from rfstage import load_stage, settle
from rfstage.files.captures import read_measurement
from rfstage.verify.levels import Setup
from rfstage.verify.verification import Asked, verify



def taken(key):
    with open("/proc/self/status") as status:
        return next(int(line.split()[1]) for line in status if line.startswith(key)) / 1024


state = settle(load_stage(sys.argv[1]))
before = taken("VmRSS")
verify(state, [read_measurement(sys.argv[2])], Asked(None, "guarded", Setup()))
print(json.dumps(taken("VmHWM") - before))
"""


def wave(first: int, count: int) -> tuple[np.ndarray, np.ndarray]:
    """Return time [s] and volts of a part of the record, with noise, over eight bits."""
    rng = np.random.default_rng(first)
    t = np.arange(first, first + count) / RATE
    v = 10 * np.cos(2 * np.pi * CARRIER * t + 1) + 0.08 * np.cos(4 * np.pi * CARRIER * t)
    step = 24 / 256
    return t, np.round((v + step * rng.normal(size=count)) / step) * step


def write_csv(path: Path, rows: int) -> None:
    """Write a record as an instrument would: time and volts, a line a sample."""
    with open(path, "w") as file:
        file.write("Time (s),CH1 (V)\n")
        for first in range(0, rows, 100_000):
            t, v = wave(first, min(100_000, rows - first))
            file.write("".join(f"{a:.9e},{b:.6g}\n" for a, b in zip(t.tolist(), v.tolist(), strict=True)))


def ratio_of(ours: Callable[[], object], other: Callable[[], object], rounds: int = 3) -> float:
    """Return how long one call takes over another, in turn, the best of several of each."""
    taken: tuple[list[float], list[float]] = ([], [])
    for _ in range(rounds):
        for call, times in zip((ours, other), taken, strict=True):
            begin = time.process_time()
            call()
            times.append(time.process_time() - begin)
    return min(taken[0]) / min(taken[1])


def against_transform(mapped: Path, whole: Callable[[Path], object]) -> float:
    """Return how long a mapped file takes over one transform of its samples."""
    volts = np.ascontiguousarray(np.load(mapped, mmap_mode="r")[:, 1])
    return ratio_of(lambda: whole(mapped), lambda: np.fft.rfft(volts))


def memory(path: Path) -> float:
    """Return how many megabytes reading and analysing a file takes, in a process of its own."""
    words = [sys.executable, "-c", MEMORY, str(ROOT / "examples" / "beacon-as-built.toml"), str(path)]
    done = subprocess.run(words, capture_output=True, text=True, check=True)
    return float(json.loads(done.stdout))


def verdict(met: bool) -> str:
    """Return the word beside a figure."""
    return "met" if met else "MISSED"


def main() -> None:
    """Print the ratios and the memory with their goals."""
    samples, rows = (int(float(a)) for a in sys.argv[1:3]) if len(sys.argv) == 3 else (10_000_000, 1_000_000)
    state = settle(load_stage(ROOT / "examples" / "beacon-as-built.toml"))
    asked = Asked(None, "guarded", Setup())

    def whole(path: Path) -> object:
        return verify(state, [read_measurement(path)], asked)

    with tempfile.TemporaryDirectory() as folder:
        mapped, table = Path(folder) / "a.npy", Path(folder) / "a.csv"
        record = np.lib.format.open_memmap(mapped, mode="w+", dtype=np.float64, shape=(samples, 2))
        for first in range(0, samples, 1_000_000):
            part = slice(first, min(first + 1_000_000, samples))
            record[part, 0], record[part, 1] = wave(first, part.stop - first)
        del record
        ratio = against_transform(mapped, whole)
        print(f"{samples} samples mapped, in rffts         {ratio:6.2f}   goal at most 4     {verdict(ratio <= 4)}")
        size = memory(mapped)
        print(f"  memory above the interpreter [MB]  {size:6.0f}   goal at most 300   {verdict(size <= 300)}")
        write_csv(table, rows)
        ratio = ratio_of(lambda: whole(table), lambda: np.loadtxt(table, delimiter=",", skiprows=1))
        print(f"{rows} rows of CSV, in numpy.loadtxt  {ratio:6.2f}   goal at most 1.3   {verdict(ratio <= 1.3)}")
        size = memory(table)
        write_csv(table, rows // 2)
        size += (size - memory(table)) / (rows - rows // 2) * (samples - rows)
        print(f"  memory for {samples} rows [MB]   {size:6.0f}   goal at most 300   {verdict(size <= 300)}")


if __name__ == "__main__":
    main()
