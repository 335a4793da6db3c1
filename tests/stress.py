"""Random stages, seeded: the ordinary kind and an extreme kind, for the tests of the steady state.

Carrier 1.8 … 450 MHz, power 0.5 … 1500 W, supply 5 … 4000 V (load resistance 0.3 … 8000 ohm), conduction angle
60 … 220°, drive 0.8 … 2 times, L, pi and pi-L ladders with lossy parts and Q 2 … 20, the tuning capacitor off by up
to 20 %, a load of standing-wave ratio 1 … 10 at any phase. The extreme kind has a knee down to 0.03 times, drive 1 … 4
times, a standing-wave ratio to 30 and a detuning of 40 %.
"""

from __future__ import annotations

import cmath
import math
from dataclasses import dataclass, replace

import numpy as np

from rfstage.device import Device, JunctionCapacitance, ReverseConduction
from rfstage.errors import RfstageError
from rfstage.ladder import Branch
from rfstage.load import SeriesLoad
from rfstage.pulse import pulse_coefficients
from rfstage.stage import Drive, Stage, Supply

SEED = 20240611


@dataclass(frozen=True)
class Limits:
    """What the two kinds differ in."""

    knee: tuple[float, float] = (1.0, 1.0)
    drive: tuple[float, float] = (0.8, 2.0)
    standing_wave_ratio: float = 10.0
    detuning: float = 0.2


NOMINAL = Limits()
EXTREME = Limits(knee=(0.03, 1.0), drive=(1.0, 4.0), standing_wave_ratio=30.0, detuning=0.4)


def stages(count: int, limits: Limits = NOMINAL, seed: int = SEED) -> list[Stage]:
    """Return ``count`` random stages; the same for the same seed."""
    random = np.random.default_rng(seed)
    found: list[Stage] = []
    while len(found) < count:
        try:
            stage = _draw(random, limits)
        except RfstageError:
            continue
        if stage is not None:
            found.append(stage)
    return found


def _log(random: np.random.Generator, low: float, high: float) -> float:
    return float(math.exp(random.uniform(math.log(low), math.log(high))))


def _draw(random: np.random.Generator, limits: Limits) -> Stage | None:
    carrier = _log(random, 1.8e6, 450e6)
    omega = 2 * math.pi * carrier
    power, supply = _log(random, 0.5, 1500), _log(random, 5, 4000)
    swing = supply * random.uniform(0.8, 0.95)
    resistance = swing**2 / (2 * power)
    if not 0.3 < resistance < 8000:
        return None
    family = "tube" if supply > 300 else str(random.choice(["bipolar", "fet"]))
    exponent = float(random.choice([1.0, 1.5, 2.0]))
    half = math.radians(random.uniform(60, 220)) / 2
    a = pulse_coefficients(half, highest_order=1, exponent=exponent)
    peak = swing / resistance / float(a[1])

    mu = _log(random, 5, 100) if family == "tube" and random.random() < 0.5 else None
    threshold = {"bipolar": 0.7, "fet": 3.0, "tube": -0.1 * supply}[family]
    cosine = math.cos(half)
    above = {"bipolar": 0.5, "fet": 3.0, "tube": 0.08 * supply}[family]
    amplitude = above / (1 - cosine)
    bias = threshold - amplitude * cosine
    if mu is not None:  # the plate's swing works against the grid's
        effective = amplitude
        amplitude = effective + swing / mu
        bias = threshold - supply / mu - effective * cosine
    knee_at_peak = supply * _log(random, 0.02, 0.12) * _log(random, *limits.knee)
    share = random.uniform(0.2, 0.8)
    coss = random.uniform(0.05, 3.0) / (omega * resistance)
    kind, tank = _tank(random, resistance, omega, carrier)
    shunt_input = kind != "l-series"
    junction = None
    if family == "fet" and shunt_input and random.random() < 0.4:
        grading = random.uniform(0.33, 0.5)
        at_supply = coss / 1.1
        junction = JunctionCapacitance(
            at_zero=at_supply * (1 + supply / 0.8) ** grading, potential=0.8, grading=grading
        )
        coss *= 0.2
    reverse = None
    if family == "fet" and random.random() < 0.8:
        reverse = ReverseConduction(conductance=3 * peak, threshold=0.7, softness=0.03)
    softness = 0.0 if random.random() < 0.1 else above * random.uniform(0.01, 0.05)
    device = Device(
        family=family,
        transfer_factor=peak / above**exponent,
        exponent=exponent,
        threshold=threshold,
        threshold_softness=softness,
        knee_voltage=max(share * knee_at_peak, 1e-4 * supply),
        knee_resistance=(1 - share) * knee_at_peak / peak,
        amplification_factor=mu,
        output_capacitance=coss,
        junction_capacitance=junction,
        reverse_conduction=reverse,
    )

    which = int(random.choice([i for i, b in enumerate(tank) if b.kind == "capacitor"]))
    detuned = 1 + random.uniform(-limits.detuning, limits.detuning)
    tank[which] = replace(tank[which], value=float(tank[which].value) * detuned)
    reflection = 1 - 2 / (1 + _log(random, 1, limits.standing_wave_ratio))
    gamma = reflection * cmath.exp(2j * math.pi * random.random())
    load = SeriesLoad(50 * (1 + gamma) / (1 - gamma), carrier)
    choke = resistance * random.uniform(5, 20) / omega
    feed_q = float(random.choice([50.0, 100.0, 200.0]))
    blocking = Branch("Cblock", "series", "capacitor", 20 / (omega * min(resistance, 50.0)), q=1000.0)
    return Stage(
        carrier=carrier,
        device=device,
        drive=Drive(bias, amplitude * random.uniform(*limits.drive)),
        supply=Supply(
            voltage=supply, choke=choke, choke_q=feed_q, choke_resistance=random.choice([0.0, 0.005]) * resistance
        ),
        branches=(blocking, *tank),
        load=load,
    )


def _tank(random: np.random.Generator, resistance: float, omega: float, carrier: float) -> tuple[str, list[Branch]]:
    """Return a matching ladder from the resistance to 50 ohm, and what kind."""
    coil_q, capacitor_q = random.uniform(60, 300), random.uniform(300, 2000)

    def coil(name: str, reactance: float) -> Branch:
        return Branch(name, "series", "coil", reactance / omega, q=coil_q, q_frequency=carrier)

    def shunt(name: str, reactance: float) -> Branch:
        return Branch(name, "shunt", "capacitor", 1 / (omega * reactance), q=capacitor_q)

    kind = str(random.choice(["l", "pi", "pi-l"]))
    load = 50.0
    if kind == "l":
        high, low = max(resistance, load), min(resistance, load)
        q = math.sqrt(max(high / low - 1, 0.04))
        parts = [shunt("C1", high / q), coil("L1", q * low)]
        return ("l-shunt", parts) if resistance > load else ("l-series", parts[::-1])
    middle = load if kind == "pi" else math.sqrt(max(load, 1.0) * 300)
    least = math.sqrt(max(max(resistance, middle) / min(resistance, middle) - 1, 0.0))
    q = max(_log(random, 2, 20), 1.05 * least + 0.1)
    # two L sections back to back at a virtual resistance whose Qs are shared between the ends
    virtual = max(resistance, middle) / (1 + q * q)
    q1, q2 = math.sqrt(max(resistance / virtual - 1, 0.01)), math.sqrt(max(middle / virtual - 1, 0.01))
    parts = [shunt("C1", resistance / q1), coil("L1", virtual * (q1 + q2)), shunt("C2", middle / q2)]
    if kind == "pi-l":
        q3 = math.sqrt(middle / load - 1)
        # the second L section: shunt capacitor at the middle, joined with C2, and a coil to the load
        joined = 1 / (q2 / middle + q3 / middle)
        parts[2] = shunt("C2", joined)
        parts.append(coil("L2", q3 * load))
    return kind, parts
