"""What solutions mean: currents, powers, losses by walking the ladder, stresses, harmonics."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from rfstage.devicelaw import Array, junction_charge
from rfstage.stage import Stage
from rfstage.steady.balance import spectrum, voltage
from rfstage.steady.circuit import Circuit
from rfstage.steady.network import Complex, Network
from rfstage.steady.solve import Solution
from rfstage.steady.state import BranchStress, HarmonicLevel, OrdersChange, SteadyState, Waveform

LISTED = 10  # harmonics listed at least; beyond, up to half of the orders solved
ABSENT = 1e-12  # of the fundamental: the accuracy of the balance; a weaker harmonic is not there
NO_CURRENT = 1e-12  # of supply over load resistance: the far foot of a threshold, where nothing flows
COUNTED = 1e-8  # of the carrier's power: harmonics below −80 dBc do not decide the orders


@dataclass(frozen=True, slots=True)
class Cycle:
    """Solutions over the cycle: samples of voltage [V] and current [A], shape (S, M), and phasors.

    ``node`` [V], ``device`` and ``charging`` current [A], shape (S, N + 1), entry 0 the mean.
    """

    volts: Array
    amperes: Array
    node: Complex
    device: Complex
    charging: Complex

    @classmethod
    def of(cls, circuit: Circuit, solution: Solution) -> Cycle:
        """Return the cycle of every stage; a current too faint to be one becomes none."""
        n, unknowns = circuit.orders, solution.unknowns
        volts = voltage(circuit, unknowns)
        amperes = circuit.driven.current(volts)[0]
        node = unknowns.copy()
        node[:, :1] += circuit.supply
        device = spectrum(amperes, n)
        device[:, 0] /= 2
        charging = np.zeros_like(device)
        if circuit.law.parts.charge:
            charging = 1j * circuit.omega * spectrum(junction_charge(circuit.law, volts)[0], n)
        idle = np.abs(amperes).max(axis=1) * circuit.resistance < NO_CURRENT * circuit.supply[:, 0]
        if idle.any():
            volts[idle] = circuit.supply[idle]
            for current in (amperes, device, charging):
                current[idle] = 0
            node[idle] = 0
            node[idle, 0] = circuit.supply[idle, 0]
        return cls(volts, amperes, node, device, charging)

    def take(self, rows: Sequence[int]) -> Cycle:
        """Return the chosen rows."""
        return Cycle(self.volts[rows], self.amperes[rows], self.node[rows], self.device[rows], self.charging[rows])


@dataclass(frozen=True, slots=True)
class Figures:
    """What decides whether the orders suffice: dc current [A] and load powers of the first orders [W]."""

    dc_current: float
    load_powers: Array

    @classmethod
    def of(cls, cycle: Cycle, ladder: Network) -> Figures:
        """Return those of one stage."""
        drawn = (cycle.device + cycle.charging)[0, 1:LISTED + 1]
        return cls(float(cycle.device[0, 0].real), ladder.gain[0, :drawn.size] * np.abs(drawn)**2)

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


def report(stages: Sequence[Stage], ladder: Network, cycle: Cycle, solution: Solution, *,
           change: OrdersChange | None = None) -> list[SteadyState]:
    """Return the steady states of stages of one build; all arguments are of the same rows."""
    orders, samples = ladder.frequencies.size, cycle.volts.shape[1]
    supply = np.array([stage.supply.voltage for stage in stages])
    dc_current = cycle.device[:, 0].real
    into_ladder = -(cycle.device + cycle.charging)[:, 1:]
    squared = (into_ladder * into_ladder.conj()).real
    load_powers = ladder.gain * squared
    losses, peaks, rms = _stresses(stages, ladder, cycle, into_ladder, squared)
    dissipation = (cycle.volts * cycle.amperes).mean(axis=1)
    charge_power = (cycle.node[:, 1:] * cycle.charging[:, 1:].conj()).real.sum(axis=1) / 2
    found = dissipation + charge_power + load_powers.sum(axis=1) + losses.sum(axis=0)
    levels = _levels(load_powers, cycle.device)
    phase = 360 / samples * np.arange(samples)
    for shared in (phase, cycle.volts, cycle.amperes, cycle.node, cycle.device):
        shared.flags.writeable = False
    extremes = zip(cycle.volts.min(axis=1).tolist(), cycle.volts.max(axis=1).tolist(),
                   cycle.amperes.max(axis=1).tolist(), strict=True)
    names = [branch.name for branch in ladder.branches]
    frequencies = ladder.frequencies.tolist()
    states = []
    for row, (stage, (lowest, highest, most)) in enumerate(zip(stages, extremes, strict=True)):
        branches = tuple(map(BranchStress, names, losses[:, row].tolist(), peaks[:, row].tolist(),
                             rms[:, row].tolist()))
        powers = load_powers[row].tolist()
        fed = len(stage.feed)
        current = float(dc_current[row])
        power = float(supply[row]) * current
        states.append(SteadyState(
            stage=stage, device_voltage=cycle.node[row], device_current=cycle.device[row],
            dc_current=current, dc_power=power, output_power=powers[0],
            efficiency=powers[0] / power if power > 0 else None,
            dissipation=float(dissipation[row]), charge_power=float(charge_power[row]),
            branches=branches, choke_loss=branches[fed - 1].loss,
            branch_losses={branch.name: branch.loss for branch in branches[fed:]},
            minimum_voltage=lowest, peak_voltage=highest, peak_current=most,
            conduction_angle_deg=conduction_angle_deg(stage, cycle.node[row], samples),
            harmonics=tuple(map(HarmonicLevel, range(2, orders + 1), frequencies[1:], powers[1:], levels[row])),
            waveform=Waveform(phase, cycle.volts[row], cycle.amperes[row]), orders_solved=orders,
            balance_error=(power - float(found[row])) / power if power > 0 else 0.0,
            residual=float(solution.merit[row]), change_from_half_the_orders=change,
            iterations=int(solution.iterations[row]), method=solution.methods[row]))
    return states


def _stresses(stages: Sequence[Stage], ladder: Network, cycle: Cycle, into_ladder: Complex,
              squared: Array) -> tuple[Array, Array, Array]:
    """Return loss [W], peak voltage [V] and rms current [A] of every branch, shape (B, S)."""
    currents = ladder.currents * into_ladder
    losses = (ladder.losses * squared).sum(axis=2)
    squares = (currents * currents.conj()).real.sum(axis=2) / 2
    half = np.zeros((*currents.shape[:2], currents.shape[2] + 1), dtype=np.complex128)
    np.multiply(ladder.branch_impedances(), currents / 2, out=half[:, :, 1:])
    held = cycle.node[:, 0]
    for row, branch in enumerate(ladder.branches):
        blocks = branch.place == "series" and branch.kind == "capacitor"
        if blocks or branch.place == "shunt":
            half[row, :, 0] = held
        if blocks:
            held = np.zeros_like(held)
    choke = len(stages[0].feed) - 1
    half[choke, :, 0] = cycle.node[:, 0] - [stage.supply.voltage for stage in stages]
    dc_square = cycle.device[:, 0].real**2
    squares[choke] += dc_square
    losses[choke] += dc_square * [stage.supply.choke_resistance for stage in stages]
    samples = 1 << (8 * into_ladder.shape[1] - 1).bit_length()
    peaks = np.abs(np.fft.irfft(half, samples, norm="forward")).max(axis=2)
    return losses, peaks, np.sqrt(squares)


def _levels(load_powers: Array, device: Complex) -> list[list[float | None]]:
    """Return the harmonics' levels against the carrier [dBc], as many as are listed, None where there is none."""
    orders = load_powers.shape[1]
    listed = min(orders, max(LISTED, orders // 2))
    size = np.abs(device[:, 1:listed + 1])
    powers = load_powers[:, :listed]
    there = (size > ABSENT * size[:, :1]) & (powers > 0) & (powers[:, :1] > 0)
    ratio = np.divide(powers, powers[:, :1], out=np.ones_like(powers), where=there)
    levels = 10 * np.log10(ratio)
    return [[level if present else None for level, present in zip(row[1:], known[1:], strict=True)]
            for row, known in zip(levels.tolist(), there.tolist(), strict=True)]


def conduction_angle_deg(stage: Stage, node: Complex, samples: int) -> float:
    """Return the part of the cycle [deg] in which the effective drive exceeds the threshold.

    Without a μ that is the drive alone, and closed; with one the output voltage's phasors [V] take part.
    """
    device, drive = stage.device, stage.drive
    below = device.threshold - drive.bias
    if device.amplification_factor is None:
        if drive.amplitude == 0:
            return 360.0 if below < 0 else 0.0
        return math.degrees(2 * math.acos(max(-1.0, min(1.0, below / drive.amplitude))))
    phasors = node / device.amplification_factor
    phasors[0] -= below
    phasors[1] += drive.amplitude
    step = 2 * math.pi / samples
    wave = np.fft.irfft(np.concatenate((phasors[:1], phasors[1:] / 2)), samples, norm="forward")
    following = np.roll(wave, -1)
    start = np.flatnonzero((wave > 0) != (following > 0))
    # where the wave crosses within a sample: a straight line, then Newton on the sum of orders itself
    share = wave[start] / (wave[start] - following[start])
    orders = np.arange(phasors.size)
    for _ in range(2):
        terms = phasors * np.exp(1j * np.outer((start + share) * step, orders))
        slope = -(terms.imag @ orders) * step
        share = np.clip(share - terms.real.sum(axis=1) / np.where(slope == 0, np.inf, slope), 0.0, 1.0)
    whole = np.count_nonzero((wave > 0) & (following > 0))
    part = np.where(wave[start] > 0, share, 1 - share).sum()
    return math.degrees(step * (whole + float(part)))
