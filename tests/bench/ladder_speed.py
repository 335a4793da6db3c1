"""How fast the ladder and a textbook design are, against scikit-rf and against the bare walk.

All sides in one run, interleaved, medians: ``python tests/bench/ladder_speed.py``. The loop of scikit-rf
cascades is sampled and extrapolated.
"""

from __future__ import annotations

import math
import statistics
import time
from collections.abc import Callable, Sequence

import numpy as np
import skrf
from numpy.typing import NDArray
from skrf.media import DefinedGammaZ0

from rfstage.designs.design import design
from rfstage.job import Job
from rfstage.ladder import Branch, Ladder

CARRIER = 7.1e6
SAMPLES = 10_000
HARMONICS = CARRIER * np.arange(1, 17)
SAMPLED = 20
ROUNDS = 15
POINTS = 201
JOB = Job(network="pi", carrier=CARRIER, power=10.0, conduction_angle=120.0, supply=13.8)


def sampled_pi_l() -> tuple[Branch, ...]:
    """Return a lossy pi-L, each of its four values in 10,000 samples."""
    spread = 1 + 0.05 * np.random.default_rng(1).standard_normal((4, SAMPLES))
    coil, capacitor = {"q": 150.0, "q_frequency": CARRIER}, {"q": 1000.0}
    return (
        Branch("C1", "shunt", "capacitor", 180e-12 * spread[0], **capacitor),
        Branch("L1", "series", "coil", 4.0e-6 * spread[1], **coil),
        Branch("C2", "shunt", "capacitor", 560e-12 * spread[2], **capacitor),
        Branch("L2", "series", "coil", 2.5e-6 * spread[3], **coil),
    )


def two_port(frequency: skrf.Frequency, place: str, z: NDArray[np.complex128]) -> skrf.Network:
    """Return a bare network of one part, by its scattering parameters at 50 ohm."""
    s = np.empty((z.size, 2, 2), dtype=complex)
    if place == "series":
        s[:, 0, 0] = s[:, 1, 1] = z / (z + 100)
        s[:, 0, 1] = s[:, 1, 0] = 100 / (z + 100)
    else:
        s[:, 0, 0] = s[:, 1, 1] = -50 / (2 * z + 50)
        s[:, 0, 1] = s[:, 1, 0] = 2 * z / (2 * z + 50)
    return skrf.Network(frequency=frequency, s=s, z0=50)


def by_cascades(branches: Sequence[Branch], samples: range) -> None:
    """Cascade every sample by itself."""
    frequency = skrf.Frequency.from_f(HARMONICS, unit="Hz")
    for k in samples:
        whole = None
        for branch in branches:
            value = float(branch.value[k])
            omega = 2 * math.pi * HARMONICS
            if branch.kind == "coil":
                z = 1j * omega * value + omega[0] * value / branch.q * np.sqrt(HARMONICS / CARRIER)
            else:
                z = (1 / branch.q - 1j) / (omega * value)
            part = two_port(frequency, branch.place, z)
            whole = part if whole is None else whole**part
        s = whole.s[:, 0, 0]
        _ = 50 * (1 + s) / (1 - s), whole.s[:, 1, 0]


def from_media(branches: Sequence[Branch], load: complex) -> skrf.Network:
    """Build a designed ladder from Media elements and cascade it to its load at 201 points."""
    frequency = skrf.Frequency(0.1 * CARRIER, 10 * CARRIER, POINTS, unit="Hz")
    media = DefinedGammaZ0(frequency=frequency, z0=50)
    short = media.short()
    whole = None
    for branch in branches:
        value = float(branch.value)
        if branch.kind == "coil":
            part = media.inductor_q(value, CARRIER, q_factor=float(branch.q))
        else:
            part = media.capacitor_q(value, CARRIER, q_factor=float(branch.q))
        if branch.place == "shunt":
            part = media.shunt(part**short)
        whole = part if whole is None else whole**part
    return whole ** media.load((load - 50) / (load + 50))


def seconds(call: Callable[[], object]) -> float:
    """Return how long a call takes."""
    begin = time.perf_counter()
    call()
    return time.perf_counter() - begin


def verdict(met: bool) -> str:
    """Return the word beside a ratio."""
    return "met" if met else "MISSED"


def compare_ladders() -> None:
    """Print the ratios of the sampled ladder."""
    branches = sampled_pi_l()
    ladder = Ladder(branches)
    transfer, walk, cascades, pairs = [], [], [], []
    for k in range(ROUNDS):
        some = range(k * SAMPLED, (k + 1) * SAMPLED)
        cascades.append(seconds(lambda some=some: by_cascades(branches, some)) * SAMPLES / SAMPLED)
        for _ in range(3):
            transfer.append(seconds(lambda: ladder.transfer(HARMONICS, 50)))
            walk.append(seconds(lambda: ladder.walk(HARMONICS, 50)))
    pairs = [all_of_it / bare for all_of_it, bare in zip(*block_by_block(branches), strict=True)]
    own = statistics.median(transfer)
    print(f"ladder: {SAMPLES} samples × {HARMONICS.size} harmonics of a lossy pi-L in {1e3 * own:.2f} ms")
    ratio = statistics.median(cascades) / own
    print(f"  times faster than a loop of cascades   {ratio:8.0f}   goal ≥ 700    {verdict(ratio >= 700)}")
    ratio = statistics.median(pairs)
    print(f"  with currents and losses, to the bare  {ratio:8.2f}   goal ≤ 1.6    {verdict(ratio <= 1.6)}")
    print(f"    the same with every block kept       {statistics.median(walk) / own:8.2f}")


def block_by_block(branches: Sequence[Branch]) -> tuple[list[float], list[float]]:
    """Time both walks on blocks of the size that fits the cache, results used and let go."""
    rows = 500
    blocks = [
        Ladder(
            [Branch(b.name, b.place, b.kind, b.value[k : k + rows], q=b.q, q_frequency=b.q_frequency) for b in branches]
        )
        for k in range(0, SAMPLES, rows)
    ]
    everything, bare = [], []
    for _ in range(ROUNDS):
        bare.append(seconds(lambda: [block.transfer(HARMONICS, 50) and None for block in blocks]))
        everything.append(seconds(lambda: [block.walk(HARMONICS, 50) and None for block in blocks]))
    return everything, bare


def compare_design() -> None:
    """Print the ratio of a whole textbook design to one cascade of its ladder."""
    branches = [part.branch for part in design(JOB, textbook=True).tank.parts]
    ours, media = [], []
    for _ in range(8 * ROUNDS):
        media.append(seconds(lambda: from_media(branches, 50)))
        ours.append(seconds(lambda: design(JOB, textbook=True)))
    own, other = statistics.median(ours), statistics.median(media)
    print(f"design: a textbook design in process in {1e3 * own:.2f} ms")
    print(f"  to its ladder from Media elements      {own / other:8.2f}   goal ≤ 1      {verdict(own <= other)}")


if __name__ == "__main__":
    compare_ladders()
    compare_design()
