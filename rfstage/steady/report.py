"""What a solution means: currents, powers, losses by walking the ladder, stresses, harmonics."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from rfstage.devicelaw import Array, junction_charge
from rfstage.ladder import Walk
from rfstage.stage import Stage
from rfstage.steady.balance import spectrum, voltage
from rfstage.steady.circuit import Circuit
from rfstage.steady.solve import Solution
from rfstage.steady.state import BranchStress, HarmonicLevel, OrdersChange, SteadyState, Waveform

Complex = NDArray[np.complex128]

LISTED = 10  # harmonics listed at least; beyond, up to half of the orders solved
ABSENT = 1e-12  # of the fundamental: the accuracy of the balance; a weaker harmonic is not there
NO_CURRENT = 1e-12  # of supply over load resistance: the far foot of a threshold, where nothing flows
COUNTED = 1e-8  # of the carrier's power: harmonics below −80 dBc do not decide the orders


@dataclass(frozen=True, slots=True)
class Cycle:
    """One stage's solution over the cycle: samples of voltage [V] and current [A], shape (M,), and phasors.

    ``node`` [V], ``device`` and ``charging`` current [A], shape (N + 1,), entry 0 the mean.
    """

    volts: Array
    amperes: Array
    node: Complex
    device: Complex
    charging: Complex

    @classmethod
    def of(cls, circuit: Circuit, solution: Solution) -> Cycle:
        """Return the cycle of a solution of one row; a current too faint to be one becomes none."""
        n, supply, unknowns = circuit.orders, float(circuit.supply[0, 0]), solution.unknowns
        volts = voltage(circuit, unknowns)
        amperes = circuit.driven.current(volts)[0]
        resistance = abs(circuit.impedance[0, 1] / circuit.scale[0, 1])
        nothing = np.zeros(n + 1, dtype=np.complex128)
        node = nothing.copy()
        node[0] = supply
        if float(np.abs(amperes).max()) * resistance < NO_CURRENT * supply:
            return cls(np.full(circuit.samples, supply), np.zeros(circuit.samples), node, nothing, nothing)
        node += unknowns[0, :n + 1]
        node[1:] += 1j * unknowns[0, n + 1:]
        device = spectrum(amperes, n)[0]
        device[0] /= 2
        charging = nothing
        if circuit.law.has_charge:
            charging = 1j * circuit.omega[0] * spectrum(junction_charge(circuit.law, volts)[0], n)[0]
        return cls(volts[0], amperes[0], node, device, charging)


@dataclass(frozen=True, slots=True)
class Figures:
    """What decides whether the orders suffice: dc current [A] and load powers of the first orders [W]."""

    dc_current: float
    load_powers: Array

    @classmethod
    def of(cls, cycle: Cycle, gains: Array) -> Figures:
        """Return them from `power_gains`; the orders are those that both have."""
        drawn = (cycle.device + cycle.charging)[1:gains.size + 1]
        return cls(float(cycle.device[0].real), gains[:drawn.size] * np.abs(drawn)**2)

    def change_from(self, before: Figures) -> OrdersChange:
        """Return what moved since ``before``."""
        shared = min(self.load_powers.size, before.load_powers.size)
        new, old = self.load_powers[:shared], before.load_powers[:shared]
        if not (new[0] > 0 and old[0] > 0):
            return OrdersChange(0.0, 0.0, 0.0)
        counted = (new > COUNTED * new[0]) & (old > 0)
        moved = np.abs(10 * np.log10(new[counted] / old[counted]))
        return OrdersChange(abs(1 - before.dc_current / self.dc_current), float(moved[0]),
                            float(moved[1:].max(initial=0.0)))


def power_gains(stage: Stage, highest: int = LISTED) -> Array:
    """Return load power over squared peak current out of the device [ohm], orders 1 … highest."""
    frequencies = stage.carrier * np.arange(1.0, highest + 1)
    z = stage.load.impedance(frequencies)
    gains: Array = np.abs(stage.ladder.transimpedance(frequencies, z))**2 / 2 * (1 / z).real
    return gains


def report(stage: Stage, circuit: Circuit, solution: Solution, cycle: Cycle,
           change: OrdersChange | None) -> SteadyState:
    """Return the steady state of a stage from its circuit and solution, both of one row."""
    frequencies = stage.carrier * np.arange(1.0, circuit.orders + 1)
    supply = stage.supply.voltage
    dc_current = float(cycle.device[0].real)
    dc_power = supply * dc_current
    into_ladder = -(cycle.device + cycle.charging)[1:]
    walk = stage.ladder.walk(frequencies, stage.load)
    load_powers = np.abs(walk.transimpedance * into_ladder)**2 / 2 * (1 / walk.load_impedance).real
    branches = _stresses(stage, frequencies, walk, into_ladder, node_dc=float(cycle.node[0].real),
                         dc_current=dc_current)
    fed = len(stage.feed)
    dissipation = float((cycle.volts * cycle.amperes).mean())
    charge_power = float((cycle.node[1:] * cycle.charging[1:].conj()).real.sum()) / 2
    lost = dissipation + charge_power + float(load_powers.sum()) + sum(branch.loss for branch in branches)
    output = float(load_powers[0])
    return SteadyState(
        stage=stage, device_voltage=cycle.node, device_current=cycle.device,
        dc_current=dc_current, dc_power=dc_power, output_power=output,
        efficiency=output / dc_power if dc_power > 0 else None,
        dissipation=dissipation, charge_power=charge_power, branches=branches, choke_loss=branches[fed - 1].loss,
        branch_losses={branch.name: branch.loss for branch in branches[fed:]},
        minimum_voltage=float(cycle.volts.min()), peak_voltage=float(cycle.volts.max()),
        peak_current=float(cycle.amperes.max()), conduction_angle_deg=conduction_angle_deg(stage, cycle),
        harmonics=_harmonics(frequencies, load_powers, cycle.device),
        waveform=Waveform(360 / circuit.samples * np.arange(circuit.samples), cycle.volts, cycle.amperes),
        orders_solved=circuit.orders, balance_error=(dc_power - lost) / dc_power if dc_power > 0 else 0.0,
        residual=float(solution.merit[0]), change_from_half_the_orders=change,
        iterations=int(solution.iterations[0]), method=solution.methods[0])


def _stresses(stage: Stage, frequencies: Array, walk: Walk, into_ladder: Complex, *, node_dc: float,
              dc_current: float) -> tuple[BranchStress, ...]:
    """Return what every branch bears: RF from the walk, dc from where the first series capacitor stands."""
    branches = stage.ladder.branches
    choke = len(stage.feed) - 1
    currents = np.array([state.current for state in walk.branches]) * into_ladder
    losses = np.array([state.loss for state in walk.branches]) @ np.abs(into_ladder)**2
    squares = (currents * currents.conj()).real.sum(axis=1) / 2
    phasors = np.zeros((len(branches), frequencies.size + 1), dtype=np.complex128)
    phasors[:, 1:] = np.array([branch.impedance(frequencies) for branch in branches]) * currents / 2
    held = node_dc
    for row, branch in enumerate(branches):
        blocks = branch.place == "series" and branch.kind == "capacitor"
        if blocks or branch.place == "shunt":
            phasors[row, 0] = held
        if blocks:
            held = 0.0
    phasors[choke, 0] = node_dc - stage.supply.voltage
    squares[choke] += dc_current**2
    losses[choke] += stage.supply.choke_resistance * dc_current**2
    samples = 1 << (8 * frequencies.size - 1).bit_length()
    peaks = np.abs(np.fft.irfft(phasors, samples, norm="forward")).max(axis=1)
    return tuple(BranchStress(branch.name, loss, peak, rms) for branch, loss, peak, rms in zip(
        branches, losses.tolist(), peaks.tolist(), np.sqrt(squares).tolist(), strict=True))


def _harmonics(frequencies: Array, load_powers: Array, device: Complex) -> tuple[HarmonicLevel, ...]:
    listed = min(frequencies.size, max(LISTED, frequencies.size // 2))
    present = np.abs(device) > ABSENT * abs(device[1])
    carrier = float(load_powers[0])
    return tuple(HarmonicLevel(
        k + 1, float(frequencies[k]), float(load_powers[k]),
        10 * math.log10(load_powers[k] / carrier) if present[k + 1] and load_powers[k] > 0 and carrier > 0 else None)
        for k in range(1, listed))


def conduction_angle_deg(stage: Stage, cycle: Cycle) -> float:
    """Return the part of the cycle [deg] in which the effective drive exceeds the threshold.

    Without a μ that is the drive alone, and closed; with one the output voltage takes part.
    """
    device, drive = stage.device, stage.drive
    below = device.threshold - drive.bias
    if device.amplification_factor is None:
        if drive.amplitude == 0:
            return 360.0 if below < 0 else 0.0
        return math.degrees(2 * math.acos(max(-1.0, min(1.0, below / drive.amplitude))))
    phasors = cycle.node / device.amplification_factor
    phasors[0] -= below
    phasors[1] += drive.amplitude
    step = 2 * math.pi / cycle.volts.size
    wave = (np.fft.irfft(np.concatenate((phasors[:1], phasors[1:] / 2)), cycle.volts.size, norm="forward"))
    following = np.roll(wave, -1)
    start = np.flatnonzero((wave > 0) != (following > 0))
    # where the wave crosses within a sample: a straight line, then Newton on the sum of orders itself
    share = wave[start] / (wave[start] - following[start])
    orders = np.arange(phasors.size)
    for _ in range(2):
        terms = phasors * np.exp(1j * np.outer((start + share) * step, orders))
        slope = -(terms.imag @ orders) * step
        moved = share - terms.real.sum(axis=1) / np.where(slope == 0, np.inf, slope)
        share = np.clip(moved, 0.0, 1.0)
    whole = np.count_nonzero((wave > 0) & (following > 0))
    part = np.where(wave[start] > 0, share, 1 - share).sum()
    return math.degrees(step * (whole + float(part)))
