"""Evaluations of a ladder that share no line with the package: a scikit-rf cascade, and node equations.

The node equations have every element's current as an unknown beside the voltages, so that coupled coils and
an ideal transformer are equations like the others.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import skrf
from numpy.typing import ArrayLike, NDArray

from rfstage.ladder import Branch

Z0 = 50.0


def coil_resistance(inductance: float, q: float | None, carrier: float | None, f: NDArray) -> NDArray:
    """Series resistance of a coil with this Q at the carrier, rising as the root of frequency."""
    if q is None:
        return np.zeros_like(f)
    return 2 * math.pi * carrier * float(inductance) / float(q) * np.sqrt(f / carrier)


def capacitor_impedance(capacitance: float, q: float | None, f: NDArray) -> NDArray[np.complex128]:
    """A capacitor with the same Q at every frequency, as a resistance and a reactance in series."""
    reactance = 1 / (2 * math.pi * f * float(capacitance))
    return (0 if q is None else reactance / float(q)) - 1j * reactance


def element_impedance(branch: Branch, frequency: ArrayLike) -> NDArray[np.complex128]:
    """One part by its definition: resistance, then reactance, then what stands beside it."""
    f = np.atleast_1d(np.asarray(frequency, dtype=float))
    s = 2j * math.pi * f
    resistance = np.zeros_like(f)
    if branch.series_resistance is not None:
        resistance = resistance + float(branch.series_resistance)
    lead = resistance + s * float(branch.lead_inductance)
    if branch.kind == "capacitor":
        return capacitor_impedance(branch.value, branch.q, f) + lead
    if branch.kind == "resistor":
        return float(branch.value) + lead
    inner = coil_resistance(branch.value, branch.q, branch.q_frequency, f) + s * float(branch.value)
    if branch.kind == "trap":
        beside = capacitor_impedance(branch.second, branch.second_q, f)
        return 1 / (1 / inner + 1 / beside) if branch.place == "series" else inner + beside + lead
    inner = inner + resistance
    return 1 / (1 / inner + s * float(branch.self_capacitance))


def windings(branch: Branch, frequency: ArrayLike) -> tuple[NDArray, NDArray, NDArray]:
    """First and second winding with their resistances, and s times the mutual inductance of a coupled pair."""
    f = np.atleast_1d(np.asarray(frequency, dtype=float))
    s = 2j * math.pi * f
    first = coil_resistance(branch.value, branch.q, branch.q_frequency, f) + s * float(branch.value)
    second = coil_resistance(branch.second, branch.second_q, branch.q_frequency, f) + s * float(branch.second)
    return first, second, s * float(branch.coupling) * math.sqrt(float(branch.value) * float(branch.second))


def through_chain(branch: Branch, frequency: ArrayLike) -> NDArray[np.complex128]:
    """Chain matrices of a through branch: of a pair by scikit-rf from its open-circuit impedances."""
    f = np.atleast_1d(np.asarray(frequency, dtype=float))
    if branch.kind == "transformer":
        turns = float(branch.value)
        core = windings(branch, f)[1]
        leak = 2j * math.pi * f * float(branch.lead_inductance) + float(branch.series_resistance or 0.0)
        series, shunt, ideal = (np.tile(np.eye(2, dtype=complex), (f.size, 1, 1)) for _ in range(3))
        series[:, 0, 1], shunt[:, 1, 0] = leak, 1 / core
        ideal[:, 0, 0], ideal[:, 1, 1] = turns, 1 / turns
        return series @ shunt @ ideal
    first, second, mutual = windings(branch, f)
    whole, shared = first + second + 2 * mutual, second + mutual
    terms = {"": (first, mutual, second), "load": (whole, shared, second), "device": (second, shared, whole)}
    near, across, far = terms[branch.tap]
    z = np.moveaxis(np.array([[near, across], [across, far]]), -1, 0)
    return skrf.network.z2a(z)


def cascade(branches: Sequence[Branch], frequency: ArrayLike) -> skrf.Network:
    """The two-port from device node to load as a scikit-rf cascade of one two-port a branch."""
    f = np.atleast_1d(np.asarray(frequency, dtype=float))
    grid = skrf.Frequency.from_f(f, unit="Hz")
    whole = None
    for branch in branches:
        s = np.empty((f.size, 2, 2), dtype=complex)
        if branch.place == "through":
            s = skrf.network.a2s(through_chain(branch, f), Z0)
        elif branch.place == "series":
            z = element_impedance(branch, f)
            s[:, 0, 0] = s[:, 1, 1] = z / (z + 2 * Z0)
            s[:, 0, 1] = s[:, 1, 0] = 2 * Z0 / (z + 2 * Z0)
        else:
            z = element_impedance(branch, f)
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


class Element(NamedTuple):
    """Resistance, inductance and capacitance in series between two nodes; node 0 is ground."""

    start: int
    end: int
    resistance: float
    inductance: float = 0.0
    capacitance: float = math.inf


class Reading(NamedTuple):
    """One branch for one ampere from the device: voltage and current at its device's side, loss, mean stored energy.

    Of a through branch also what comes out at the load's side.
    """

    across: complex
    current: complex
    loss: float
    energy: float
    far_voltage: complex = 0j
    far_current: complex = 0j


def elements_of(branch: Branch, a: int, b: int, inner: int, f: float) -> tuple[list[Element], float, float]:
    """Elements of a branch between nodes a and b, mutual inductance of its first two, and ratio of a transformer.

    The transformer's ideal part stands between the node ``inner`` and b.
    """
    one = np.array([f])
    own, lead = float(branch.series_resistance or 0.0), float(branch.lead_inductance)
    value, second = float(branch.value), float(branch.second)

    def wound(henry: float, q: float | None) -> float:
        return float(coil_resistance(henry, q, branch.q_frequency, one)[0])

    def leaky(farad: float, q: float | None) -> float:
        return float(capacitor_impedance(farad, q, one)[0].real)

    if branch.kind == "coil":
        strays = [Element(a, b, 0.0, 0.0, float(branch.self_capacitance))] if branch.self_capacitance else []
        return [Element(a, b, own + wound(value, branch.q), value), *strays], 0.0, 0.0
    if branch.kind == "capacitor":
        return [Element(a, b, own + leaky(value, branch.q), lead, value)], 0.0, 0.0
    if branch.kind == "resistor":
        return [Element(a, b, own + value, lead)], 0.0, 0.0
    if branch.kind == "trap":
        coil, capacitor = wound(value, branch.q), leaky(second, branch.second_q)
        if branch.place == "series":
            return [Element(a, b, coil, value), Element(a, b, capacitor, 0.0, second)], 0.0, 0.0
        return [Element(a, b, own + coil + capacitor, value + lead, second)], 0.0, 0.0
    if branch.kind == "transformer":
        return [Element(a, inner, own, lead), Element(inner, 0, wound(second, branch.second_q), second)], 0.0, value
    top, foot, tap = {"": (a, 0, b), "load": (a, b, b), "device": (b, a, a)}[branch.tap]
    first = Element(top, foot, wound(value, branch.q), value)
    other = Element(tap, 0, wound(second, branch.second_q), second)
    return [first, other], float(branch.coupling) * math.sqrt(value * second), 0.0


def solve_nodes(
    branches: Sequence[Branch], load: complex, frequency: float
) -> tuple[NDArray[np.complex128], list[Reading]]:
    """Voltages from the device's node to the load's for one ampere into the first, and every branch's reading."""
    omega = 2 * math.pi * frequency
    ends, node = [], 1
    for branch in branches:
        ends.append((node, 0) if branch.place == "shunt" else (node, node + 1))
        node += branch.place != "shunt"
    last, inner = node, node
    parts, owners, mutuals, ideals = [], [], [], []
    for k, (branch, (a, b)) in enumerate(zip(branches, ends, strict=True)):
        inner += branch.kind == "transformer"
        found, mutual, ratio = elements_of(branch, a, b, inner, frequency)
        if mutual:
            mutuals.append((len(parts), len(parts) + 1, mutual, k))
        if ratio:
            ideals.append((inner, b, ratio, k))
        parts += found
        owners += [k] * len(found)
    size = inner + 1 + len(parts) + len(ideals)
    first = inner + 1  # of the currents
    m, right = np.zeros((size, size), dtype=complex), np.zeros(size, dtype=complex)
    m[0, 0] = 1
    right[1] = 1
    m[last, last] = 1 / load
    for k, part in enumerate(parts):
        row = first + k
        z = part.resistance + 1j * (omega * part.inductance - 1 / (omega * part.capacitance))
        for end, sign in ((part.start, 1), (part.end, -1)):
            m[row, end] += sign
            if end:
                m[end, row] += sign
        m[row, row] -= z
    for one, other, mutual, _ in mutuals:
        m[first + one, first + other] -= 1j * omega * mutual
        m[first + other, first + one] -= 1j * omega * mutual
    for k, (a, b, ratio, _) in enumerate(ideals):
        row = first + len(parts) + k
        m[row, a], m[row, b] = 1, -ratio
        m[a, row], m[b, row] = 1, -ratio
    scale = np.abs(m).max(axis=1)
    x = np.linalg.solve(m / scale[:, np.newaxis], right / scale)
    x = x + np.linalg.solve(m / scale[:, np.newaxis], (right - m @ x) / scale)
    readings = []
    for k, (a, b) in enumerate(ends):
        mine = [(part, complex(x[first + j])) for j, part in enumerate(parts) if owners[j] == k]
        out = {a: 0j, b: 0j}
        for part, i in mine:
            for end, sign in ((part.start, 1), (part.end, -1)):
                if end in out:
                    out[end] += sign * i
        for j, (_, far, ratio, owner) in enumerate(ideals):
            if owner == k:
                out[far] -= ratio * complex(x[first + len(parts) + j])
        energy = sum(abs(i) ** 2 * (p.inductance + 1 / (omega**2 * p.capacitance)) / 4 for p, i in mine)
        for one, other, mutual, owner in mutuals:
            if owner == k:
                energy += mutual * (x[first + one] * np.conj(x[first + other])).real / 2
        through = branches[k].place == "through"
        readings.append(
            Reading(
                complex(x[a] - (0 if through else x[b])),
                out[a],
                sum(abs(i) ** 2 * p.resistance / 2 for p, i in mine),
                float(energy),
                complex(x[b]) if through else 0j,
                -out[b] if through else 0j,
            )
        )
    return x[1 : last + 1], readings


def node_solution(
    branches: Sequence[Branch], load: complex, frequency: float
) -> tuple[NDArray[np.complex128], list[complex], list[complex]]:
    """Node voltages for one ampere into the first node; voltage across and current through each branch."""
    volts, readings = solve_nodes(branches, load, frequency)
    return volts, [r.across for r in readings], [r.current for r in readings]


def loaded_q_by_energy(branches: Sequence[Branch], counted: Sequence[bool], load: complex, frequency: float) -> float:
    """Loaded Q by its definition from the node solution; ``counted`` marks whose energy belongs to it."""
    volts, readings = solve_nodes(branches, load, frequency)
    energy = sum(reading.energy for reading, use in zip(readings, counted, strict=True) if use)
    return 2 * math.pi * frequency * energy / (volts[0].real / 2)
