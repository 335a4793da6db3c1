"""Random captures and perturbed tanks for the statistical tests of `rfstage verify`, the same for the same seed."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.ladder import Branch, Ladder
from rfstage.load import SeriesLoad
from rfstage.verify.phasors import harmonic_fit
from rfstage.verify.scattering import reflection, two_port
from rfstage.verify.tankfit import AnalyserData, tank_fit

Array = NDArray[np.float64]

K95 = 1.959964  # standard errors on either side of a 95 % interval
INTERVAL = 4e-9  # s
CARRIER = 7.1e6  # Hz
ORDERS = 5  # in the captures


class Trial(NamedTuple):
    """One capture: errors of real and imaginary parts over their standard errors, of the frequency, and in absolute."""

    parts: Array
    frequency: float
    errors: Array
    claimed: float
    bound: float


def capture(seed: int, count: int) -> tuple[Array, float, NDArray[np.complex128], float]:
    """Return samples quantised over eight bits, with noise of half a step to two steps, and the truth."""
    rng = np.random.default_rng(seed)
    frequency = CARRIER * (1 + 1e-3 * rng.uniform(-1, 1))
    sizes = np.array([0.3, 1.0, 0.03, 0.01, 0.003, 0.001])
    phasors = sizes * np.exp(2j * np.pi * rng.uniform(size=sizes.size))
    phasors[0] = phasors[0].real
    t = (np.arange(count) - (count - 1) / 2) * INTERVAL
    wave = (phasors * np.exp(2j * np.pi * frequency * np.outer(t, np.arange(sizes.size)))).real.sum(axis=1)
    step = 3 / 256
    noise = step * rng.uniform(0.5, 2)
    samples = np.round((wave + noise * rng.normal(size=count)) / step) * step
    return samples, frequency, phasors, math.sqrt(noise**2 + step**2 / 12)


def trial(seed: int, count: int = 1500) -> Trial:
    """Return how far one capture's estimates lie from the truth."""
    samples, frequency, phasors, noise = capture(seed, count)
    fit = harmonic_fit(samples, INTERVAL, highest_order=ORDERS)
    off = fit.phasors - phasors
    parts = np.concatenate(([off[0].real], off[1:].real, off[1:].imag))
    errors = np.concatenate(([fit.errors[0]], fit.errors[1:], fit.errors[1:]))
    return Trial(
        parts / errors,
        (fit.frequency - frequency) / fit.frequency_error,
        parts[1:] / noise,
        float(fit.errors[1] / noise),
        math.sqrt(2 / count),  # Cramér-Rao, of real and imaginary parts with frequency and all other orders unknown
    )


TANK = (
    Branch("Lchoke", "shunt", "coil", 1.8e-6, q=100.0, q_frequency=CARRIER),
    Branch("Cblock", "series", "capacitor", 82e-9, q=1000.0),
    Branch("C1", "shunt", "capacitor", 8.8e-9, q=1000.0, lead_inductance=3e-9),
    Branch("L1", "series", "coil", 192e-9, q=160.0, q_frequency=CARRIER, self_capacitance=1.2e-12),
    Branch("C2", "shunt", "capacitor", 3.6e-9, q=1000.0, lead_inductance=3e-9),
)
LOAD = SeriesLoad(50.0, CARRIER)
FREQUENCIES = np.linspace(2e6, 26e6, 81)


def measured(branches: Sequence[Branch], ports: int, noise: float, rng: np.random.Generator) -> AnalyserData:
    """Return what an analyser with noise shows of a tank."""
    ladder = Ladder(branches)
    s = two_port(ladder, FREQUENCIES, 50.0) if ports == 2 else reflection(ladder, FREQUENCIES, LOAD, 50.0)
    return AnalyserData(
        "tank", FREQUENCIES, s + noise * (rng.normal(size=s.shape) + 1j * rng.normal(size=s.shape)), 50.0
    )


def tank_trial(seed: int) -> tuple[list[float], list[float]]:
    """Return errors over standard errors of the values told, and of the Qs told, of one perturbed tank."""
    rng = np.random.default_rng(seed)
    real = [replace(b, value=b.value * math.exp(0.1 * rng.normal())) for b in TANK]
    real = [replace(b, q=b.q * math.exp(0.2 * rng.normal())) for b in real]
    data = measured(real, 1 + seed % 2, 10 ** rng.uniform(-3.5, -2.5), rng)
    fit = tank_fit(TANK, data, carrier=CARRIER, load=LOAD)
    values = [
        (p.estimated - b.value) / p.standard_error
        for p, b in zip(fit.parts, real, strict=True)
        if p.estimated is not None
    ]
    qs = [
        (1 / p.q_estimated - 1 / b.q) / (p.q_standard_error / p.q_estimated**2)
        for p, b in zip(fit.parts, real, strict=True)
        if p.q_estimated is not None
    ]
    return values, qs
