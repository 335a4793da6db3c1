"""Evaluations of a ladder that share no line with the package: a scikit-rf cascade, and node equations."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
import skrf
from numpy.typing import ArrayLike, NDArray

from rfstage.ladder import Branch

Z0 = 50.0


def element_impedance(branch: Branch, frequency: ArrayLike) -> NDArray[np.complex128]:
    """One part by its definition: resistance, then reactance, then what stands beside it."""
    f = np.atleast_1d(np.asarray(frequency, dtype=float))
    s = 2j * math.pi * f
    resistance = np.zeros_like(f)
    if branch.series_resistance is not None:
        resistance = resistance + float(branch.series_resistance)
    if branch.kind == "coil":
        if branch.q is not None:
            at_carrier = 2 * math.pi * branch.q_frequency * float(branch.value) / float(branch.q)
            resistance = resistance + at_carrier * np.sqrt(f / branch.q_frequency)
        inner = resistance + s * float(branch.value)
        return 1 / (1 / inner + s * float(branch.self_capacitance))
    if branch.kind == "capacitor":
        reactance = 1 / (2 * math.pi * f * float(branch.value))
        if branch.q is not None:
            resistance = resistance + reactance / float(branch.q)
        return resistance - 1j * reactance + s * float(branch.lead_inductance)
    return float(branch.value) + resistance + s * float(branch.lead_inductance)


def cascade(branches: Sequence[Branch], frequency: ArrayLike) -> skrf.Network:
    """The two-port from device node to load as a scikit-rf cascade of one two-port a branch."""
    f = np.atleast_1d(np.asarray(frequency, dtype=float))
    grid = skrf.Frequency.from_f(f, unit="Hz")
    whole = None
    for branch in branches:
        z = element_impedance(branch, f)
        s = np.empty((f.size, 2, 2), dtype=complex)
        if branch.place == "series":
            s[:, 0, 0] = s[:, 1, 1] = z / (z + 2 * Z0)
            s[:, 0, 1] = s[:, 1, 0] = 2 * Z0 / (z + 2 * Z0)
        else:
            s[:, 0, 0] = s[:, 1, 1] = -Z0 / (2 * z + Z0)
            s[:, 0, 1] = s[:, 1, 0] = 2 * z / (2 * z + Z0)
        part = skrf.Network(frequency=grid, s=s, z0=Z0)
        whole = part if whole is None else whole**part
    assert whole is not None
    return whole


def seen_impedance(branches: Sequence[Branch], load: ArrayLike, frequency: ArrayLike) -> NDArray[np.complex128]:
    """What the device sees with the cascade closed by the load's reflection coefficient."""
    two_port = cascade(branches, frequency)
    z = np.broadcast_to(np.asarray(load, dtype=complex), two_port.f.shape)
    reflection = ((z - Z0) / (z + Z0)).reshape(-1, 1, 1)
    closed = two_port ** skrf.Network(frequency=two_port.frequency, s=reflection, z0=Z0)
    s = closed.s[:, 0, 0]
    return Z0 * (1 + s) / (1 - s)


def load_volts(branches: Sequence[Branch], load: ArrayLike, frequency: ArrayLike) -> NDArray[np.complex128]:
    """Voltage at the load for one ampere from the device, by the cascade's chain matrix."""
    a = cascade(branches, frequency).a
    z = np.asarray(load, dtype=complex)
    return z / (a[:, 1, 0] * z + a[:, 1, 1])


def node_solution(
    branches: Sequence[Branch], load: complex, frequency: float
) -> tuple[NDArray[np.complex128], list[complex], list[complex]]:
    """Node voltages for one ampere into the first node; voltage across and current through each branch."""
    places, node = [], 0
    for branch in branches:
        places.append((node, node + 1) if branch.place == "series" else (node, None))
        node += branch.place == "series"
    y = np.zeros((node + 1, node + 1), dtype=complex)
    z = [complex(element_impedance(branch, frequency)[0]) for branch in branches]
    for (one, other), impedance in zip(places, z, strict=True):
        y[one, one] += 1 / impedance
        if other is not None:
            y[other, other] += 1 / impedance
            y[one, other] -= 1 / impedance
            y[other, one] -= 1 / impedance
    y[node, node] += 1 / load
    drive = np.zeros(node + 1, dtype=complex)
    drive[0] = 1
    volts = np.linalg.solve(y, drive)
    across = [complex(volts[a] - (0 if b is None else volts[b])) for a, b in places]
    return volts, across, [v / impedance for v, impedance in zip(across, z, strict=True)]


def loaded_q_by_energy(branches: Sequence[Branch], counted: Sequence[bool], load: complex, frequency: float) -> float:
    """Loaded Q by its definition from the node solution; ``counted`` marks whose energy belongs to it."""
    omega = 2 * math.pi * frequency
    volts, across, current = node_solution(branches, load, frequency)
    energy = 0.0
    for branch, v, i, use in zip(branches, across, current, counted, strict=True):
        if not use:
            continue
        if branch.kind == "coil":
            energy += float(branch.value) * abs(i - 1j * omega * float(branch.self_capacitance) * v) ** 2 / 4
            energy += float(branch.self_capacitance) * abs(v) ** 2 / 4
        elif branch.kind == "capacitor":
            energy += abs(i) ** 2 / (4 * omega**2 * float(branch.value))
            energy += float(branch.lead_inductance) * abs(i) ** 2 / 4
    return omega * energy / (volts[0].real / 2)
