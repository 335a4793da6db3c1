"""What solutions mean: currents, powers, losses by walking the ladder, stresses, harmonics.

::

    Cycle      the solution's waves and phasors
    Account    what they come to in the stage's circuit, by `account` here or `rfstage.steady.pair`
    states     the steady states made of both
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any, NamedTuple

import numpy as np

from rfstage.devicelaw import Array, junction_charge
from rfstage.kinds import THROUGH
from rfstage.ladder import Branch
from rfstage.stage import Stage
from rfstage.steady.balance import spectrum, voltage
from rfstage.steady.circuit import Circuit
from rfstage.steady.modes import each
from rfstage.steady.network import Complex, Network
from rfstage.steady.solve import Solution
from rfstage.steady.state import BranchStress, DeviceShare, HarmonicLevel, OrdersChange, SteadyState, Waveform

LISTED = 10  # harmonics listed at least; beyond, up to half of the orders solved
ABSENT = 1e-12  # of the fundamental: the accuracy of the balance; a weaker harmonic is not there
NO_CURRENT = 1e-12  # of supply over load resistance: the far foot of a threshold, where nothing flows


class Cycle(NamedTuple):
    """Solutions over the cycle: samples of voltage [V] and current [A], shape (S, M), and phasors.

    ``node`` [V], ``device`` and ``charging`` current [A], shape (S, N + 1), entry 0 the mean. All of them have an
    axis of two behind the stages where those are pairs.
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
        node = each(unknowns) if circuit.paired else unknowns.copy()
        node[..., :1] += circuit.supply
        device = spectrum(amperes, n)
        device[..., 0] /= 2
        charging = np.zeros_like(device)
        if circuit.law.parts.charge:
            charging = 1j * circuit.omega * spectrum(junction_charge(circuit.law, volts)[0], n)
        most = np.abs(amperes).reshape(len(amperes), -1).max(axis=1)
        idle = most * circuit.resistance < NO_CURRENT * circuit.supply.reshape(-1)
        if idle.any():
            volts[idle] = circuit.supply[idle]
            for current in (amperes, device, charging):
                current[idle] = 0
            node[idle] = 0
            node[idle, ..., :1] = circuit.supply[idle]
        return cls(volts, amperes, node, device, charging)

    @property
    def orders(self) -> int:
        """Orders solved."""
        return int(self.node.shape[-1]) - 1

    def of_device(self, which: int) -> Cycle:
        """Return one device of every pair."""
        return self.take((slice(None), which))

    def take(self, rows: Any) -> Cycle:
        """Return the chosen rows."""
        return Cycle(self.volts[rows], self.amperes[rows], self.node[rows], self.device[rows], self.charging[rows])


class Account(NamedTuple):
    """What solutions come to, a row for each stage.

    ``dc_current`` [A], ``dissipation`` and ``charge_power`` [W], ``minimum_voltage`` and ``peak_voltage`` [V] and
    ``peak_current`` [A] (S,); ``load_powers`` [W] (S, N); ``generated`` device current that the load can feel [A]
    (S, N + 1); ``losses`` [W], ``peaks`` [V] and ``rms`` [A] of the branches (B, S); ``devices`` of each stage.
    """

    dc_current: Array
    dissipation: Array
    charge_power: Array
    minimum_voltage: Array
    peak_voltage: Array
    peak_current: Array
    load_powers: Array
    generated: Complex
    losses: Array
    peaks: Array
    rms: Array
    devices: Sequence[tuple[DeviceShare, ...]]


def account(stages: Sequence[Stage], ladder: Network, cycle: Cycle) -> Account:
    """Return the account of stages of one build, each with one device or devices at one node."""
    into_ladder = -(cycle.device + cycle.charging)[:, 1:]
    squared = (into_ladder * into_ladder.conj()).real
    losses, peaks, rms = _stresses(stages, ladder, cycle, into_ladder, squared)
    return Account(
        cycle.device[:, 0].real,
        (cycle.volts * cycle.amperes).mean(axis=-1),
        charge_power(cycle),
        cycle.volts.min(axis=-1),
        cycle.volts.max(axis=-1),
        cycle.amperes.max(axis=-1),
        ladder.gain * squared,
        cycle.device,
        losses,
        peaks,
        rms,
        [()] * len(stages),
    )


def charge_power(cycle: Cycle) -> Array:
    """Return the power of the junction charge [W], of each device."""
    power: Array = (cycle.node[..., 1:] * cycle.charging[..., 1:].conj()).real.sum(axis=-1) / 2
    return power


def states(
    stages: Sequence[Stage],
    ladder: Network,
    first: Cycle,
    found: Account,
    solution: Solution,
    change: OrdersChange | None,
) -> list[SteadyState]:
    """Return the steady states of stages of one build; all arguments are of the same rows.

    ``ladder`` has the branches, ``first`` is the cycle of the one device or of a pair's first.
    """
    orders, samples = ladder.frequencies.size, first.volts.shape[1]
    supply = np.array([stage.supply.voltage for stage in stages])
    spent = found.dissipation + found.charge_power + found.load_powers.sum(axis=1) + found.losses.sum(axis=0)
    levels = _levels(found.load_powers, found.generated)
    phase = 360 / samples * np.arange(samples)
    for shared in (phase, first.volts, first.amperes, first.node, first.device):
        shared.flags.writeable = False
    names = [branch.name for branch in ladder.branches]
    frequencies = ladder.frequencies.tolist()
    listed = []
    for row, stage in enumerate(stages):
        branches = tuple(
            map(
                BranchStress,
                names,
                found.losses[:, row].tolist(),
                found.peaks[:, row].tolist(),
                found.rms[:, row].tolist(),
            )
        )
        powers = found.load_powers[row].tolist()
        fed = len(stage.feed)
        current = float(found.dc_current[row])
        power = float(supply[row]) * current
        listed.append(
            SteadyState(
                stage=stage,
                device_voltage=first.node[row],
                device_current=first.device[row],
                dc_current=current,
                dc_power=power,
                output_power=powers[0],
                efficiency=powers[0] / power if power > 0 else None,
                dissipation=float(found.dissipation[row]),
                charge_power=float(found.charge_power[row]),
                branches=branches,
                choke_loss=branches[fed - 1].loss,
                branch_losses={branch.name: branch.loss for branch in branches[fed:]},
                minimum_voltage=float(found.minimum_voltage[row]),
                peak_voltage=float(found.peak_voltage[row]),
                peak_current=float(found.peak_current[row]),
                conduction_angle_deg=conduction_angle_deg(stage, first.node[row], samples),
                harmonics=tuple(map(HarmonicLevel, range(2, orders + 1), frequencies[1:], powers[1:], levels[row])),
                waveform=Waveform(phase, first.volts[row], first.amperes[row]),
                orders_solved=orders,
                balance_error=(power - float(spent[row])) / power if power > 0 else 0.0,
                residual=float(solution.merit[row]),
                change_from_half_the_orders=change,
                iterations=int(solution.iterations[row]),
                method=solution.methods[row],
                devices=found.devices[row],
            )
        )
    return listed


def _stresses(
    stages: Sequence[Stage], ladder: Network, cycle: Cycle, into_ladder: Complex, squared: Array
) -> tuple[Array, Array, Array]:
    """Return loss [W], peak voltage [V] and rms current [A] of every branch, shape (B, S)."""
    currents = ladder.currents * into_ladder
    losses = (ladder.losses * squared).sum(axis=2)
    mean = cycle.node[:, 0].real
    volts = dc_across(ladder.branches, mean)
    amperes = np.zeros_like(volts)
    choke = len(stages[0].feed) - 1
    volts[choke] = mean - [stage.supply.voltage for stage in stages]
    amperes[choke] = cycle.device[:, 0].real
    losses[choke] += amperes[choke] ** 2 * [stage.supply.choke_resistance for stage in stages]
    return losses, *borne(currents, ladder.branch_impedances(), volts, amperes)


def dc_across(branches: Sequence[Branch], held: Array) -> Array:
    """Return the direct voltage across every branch [V] (B, S), of what is held at the first (S,).

    A through branch has none across a winding, and passes none on.
    """
    volts = np.zeros((len(branches), held.size))
    for row, branch in enumerate(branches):
        if branch.blocks or branch.place == "shunt":
            volts[row] = held
        if branch.blocks or branch.place == THROUGH:
            held = np.zeros_like(held)
    return volts


def borne(currents: Complex, impedances: Complex, volts: Array, amperes: Array) -> tuple[Array, Array]:
    """Return peak voltage [V] and rms current [A] of branches (B, S).

    From their phasors [A], impedances [ohm] (B, S, N), direct voltage [V] and direct current [A] (B, S).
    """
    orders = currents.shape[2]
    half = np.empty((*currents.shape[:2], orders + 1), dtype=np.complex128)
    np.multiply(impedances, currents / 2, out=half[:, :, 1:])
    half[:, :, 0] = volts
    samples = 1 << (8 * orders - 1).bit_length()
    peaks = np.abs(np.fft.irfft(half, samples, norm="forward")).max(axis=2)
    return peaks, np.sqrt(amperes**2 + (currents * currents.conj()).real.sum(axis=2) / 2)


def _levels(load_powers: Array, device: Complex) -> list[list[float | None]]:
    """Return the harmonics' levels against the carrier [dBc], as many as are listed, None where there is none."""
    orders = load_powers.shape[1]
    listed = min(orders, max(LISTED, orders // 2))
    size = np.abs(device[:, 1 : listed + 1])
    powers = load_powers[:, :listed]
    there = (size > ABSENT * size[:, :1]) & (powers > 0) & (powers[:, :1] > 0)
    ratio = np.divide(powers, powers[:, :1], out=np.ones_like(powers), where=there)
    levels = 10 * np.log10(ratio)
    return [
        [level if present else None for level, present in zip(row[1:], known[1:], strict=True)]
        for row, known in zip(levels.tolist(), there.tolist(), strict=True)
    ]


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
