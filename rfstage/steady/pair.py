r"""Pairs of devices: the impedance of each mode, and how a balanced pair is solved as one device.

::

    push-pull      a ──┬── branches and load ──┬── b        odd:   feed ∥ half of what stands between
                     feed                    feed           even:  feed alone
    parallel       a ──┬── b                                odd:   0
                     feed, branches, load                   even:  twice what stands there, for each device

    W_even + Z_even D_even = 0          D  device and charging current of a and b, in modes
    W_odd  + Z_odd  D_odd  = 0          W  deviation of their voltages from the supply, in modes

In terms of the devices these are W_a + Zs D_a + Zm D_b = 0 and its mirror image, Zs = (Zo + Ze)/2 and
Zm = (Ze − Zo)/2. With nothing between the devices to tell them apart the pair has one device's solution. In
push-pull the second device does what the first did half a cycle before, so that odd orders are odd modes and even
orders even ones; in parallel everything is even.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from rfstage.branch import Branch, Real
from rfstage.device import PUSH_PULL, Device
from rfstage.devicelaw import Law
from rfstage.kinds import KEYS
from rfstage.load import Load
from rfstage.stage import Stage
from rfstage.steady.circuit import Circuit, sources
from rfstage.steady.enough import Figures, voltage_beyond
from rfstage.steady.modes import EVEN, ODD, modes
from rfstage.steady.network import Complex, networks
from rfstage.steady.pairaccount import PairNetwork, drawn_by_load, pair_account
from rfstage.steady.report import Cycle, states
from rfstage.steady.solve import Solution
from rfstage.steady.state import OrdersChange, SteadyState


@dataclass(frozen=True, slots=True)
class Halved:
    """Half of a load."""

    whole: Load

    def impedance(self, frequency: ArrayLike) -> NDArray[np.complex128]:
        """Return the impedance [ohm] at each frequency [Hz], same shape."""
        return self.whole.impedance(frequency) / 2


@dataclass(frozen=True, slots=True)
class Open:
    """No load at all."""

    def impedance(self, frequency: ArrayLike) -> NDArray[np.complex128]:
        """Return infinity [ohm] for each frequency [Hz], same shape."""
        return np.full(np.shape(frequency), np.inf, dtype=np.complex128)


def both(device: Device) -> tuple[Device, Device]:
    """Return the two devices of a pair.

    Examples
    --------
    >>> fet = Device(family="fet", transfer_factor=2.0, exponent=1.0, threshold=3.0, threshold_softness=0.04,
    ...              knee_voltage=0.07, knee_resistance=0.1, pair="push-pull", imbalance=0.1)
    >>> [one.transfer_factor for one in both(fet)]
    [2.1, 1.9]
    """

    def of(share: float) -> Device:
        return replace(device, pair=None, imbalance=0.0, transfer_factor=device.transfer_factor * share)

    return of(1 + device.imbalance / 2), of(1 - device.imbalance / 2)


def shared_node(stage: Stage) -> Stage:
    """Return the stage whose ladder both devices of a parallel pair look into: two output capacitances."""
    device, _ = both(stage.device)
    return replace(stage, device=replace(device, output_capacitance=2 * device.output_capacitance))


def half_between(stage: Stage) -> Stage:
    """Return the stage whose ladder each device of a push-pull pair sees in the odd mode."""
    branches = tuple(_halved(branch) for branch in stage.branches)
    return replace(stage, device=both(stage.device)[0], branches=branches, load=Halved(stage.load))


def feed_alone(stage: Stage) -> Stage:
    """Return the stage whose ladder each device of a push-pull pair sees in the even mode."""
    return replace(stage, device=both(stage.device)[0], branches=(), load=Open())


def _halved(branch: Branch) -> Branch:
    """Return a branch of half the impedance; a ratio and a coupling stay."""
    resistance = branch.series_resistance
    unit = {key.attribute: key.unit for key in KEYS[branch.kind]}
    return replace(
        branch,
        value=_halved_value(branch.value, unit["value"]),
        series_resistance=None if resistance is None else resistance / 2,
        lead_inductance=branch.lead_inductance / 2,
        self_capacitance=branch.self_capacitance * 2,
        second=_halved_value(branch.second, unit.get("second", "")),
    )


def _halved_value(value: Real, unit: str) -> Real:
    return value * 2 if unit == "F" else value if unit == "" else value / 2


@dataclass(frozen=True, slots=True)
class Pairs:
    """Stages that are all push-pull or all parallel, and all balanced or none; ``ladders`` with their rows.

    Examples
    --------
    >>> from rfstage.load import SeriesLoad
    >>> from rfstage.stage import Drive, Supply
    >>> fet = Device(family="fet", transfer_factor=2.0, exponent=1.0, threshold=3.0, threshold_softness=0.02,
    ...              knee_voltage=0.2, knee_resistance=0.1, output_capacitance=2.5e-9, pair="push-pull")
    >>> parts = (Branch("L1", "series", "coil", 686e-9), Branch("C2", "shunt", "capacitor", 991e-12))
    >>> stage = Stage(carrier=7.1e6, device=fet, drive=Drive(bias=3.0, amplitude=2.0), branches=parts,
    ...               supply=Supply(voltage=28.0, choke=2e-6), load=SeriesLoad(50 + 0j, 7.1e6))
    >>> Pairs.of([stage], 16).circuit(16).impedance.shape
    (1, 17)
    >>> unlike = replace(stage, device=replace(fet, imbalance=0.1))
    >>> Pairs.of([unlike], 16).circuit(16).impedance.shape
    (1, 2, 17)
    """

    stages: Sequence[Stage]
    ladders: Sequence[tuple[PairNetwork, list[int]]]

    @classmethod
    def of(cls, stages: Sequence[Stage], orders: int) -> Pairs:
        """Walk the ladders of both modes.

        Raises
        ------
        ImpossibleError
            If a mode's impedance is not finite at some order.
        """
        if stages[0].device.pair != PUSH_PULL:
            shared = networks([shared_node(stage) for stage in stages], orders)
            return cls(stages, [(PairNetwork(even, None), rows) for even, rows in shared])
        ladders = []
        for odd, rows in networks([half_between(stage) for stage in stages], orders):
            [(even, _)] = networks([feed_alone(stages[row]) for row in rows], orders)
            ladders.append((PairNetwork(even, odd), rows))
        return cls(stages, ladders)

    @property
    def orders(self) -> int:
        """The most orders that can be asked."""
        return self.ladders[0][0].even.frequencies.size

    @property
    def balanced(self) -> bool:
        """Whether one device stands for both."""
        return self.stages[0].device.imbalance == 0

    def circuit(self, orders: int) -> Circuit:
        """Return what is to be solved: one device for balanced pairs, else both."""
        if not self.balanced:
            return self.coupled(orders)
        seen = self._seen(orders)
        law = Law.of([both(stage.device)[0] for stage in self.stages])
        return Circuit.assembled(law, *sources(self.stages), seen, np.abs(seen[:, 1]))

    def coupled(self, orders: int) -> Circuit:
        """Return the circuit of both devices."""
        devices = [device for stage in self.stages for device in both(stage.device)]
        law = Law.of(devices).take(np.arange(len(devices)).reshape(-1, 2))
        supply, bias, amplitude, carrier = (column[:, np.newaxis] for column in sources(self.stages))
        drive = amplitude * np.array([[1.0], [-1.0 if self._push_pull else 1.0]])
        impedance = self._impedance(orders)
        resistance = np.abs(impedance[:, self._carried(orders)[1], 1])
        return Circuit.assembled(law, supply, bias, drive, carrier, impedance, resistance)

    def guess(self, deviation: Complex) -> Complex:
        """Return unknowns that suit the first device's deviation from the supply [V], as if it were balanced."""
        return deviation if self.balanced else self._spread(deviation)

    def cycle(self, circuit: Circuit, solution: Solution) -> Cycle:
        """Return the solved cycle of both devices."""
        if circuit.paired:
            return Cycle.of(circuit, solution)
        return Cycle.of(self.coupled(circuit.orders), solution._replace(unknowns=self._spread(solution.unknowns)))

    def figures(self, cycle: Cycle) -> Figures:
        """Return those of the first stage."""
        ladder = self.ladders[0][0]
        return Figures.of(cycle.device[0, :, 0].sum(), drawn_by_load(ladder, cycle)[0], ladder.loaded, cycle.volts[0])

    def voltage_beyond(self, cycle: Cycle) -> float:
        """Return the voltage [V] that the orders walked but not solved may still make in the first pair."""
        seen = self._seen(self.orders) if self.balanced else self._impedance(self.orders)
        currents = cycle.device[:, 0] if self.balanced else modes(cycle.device)
        return voltage_beyond(self.stages[0], seen[0, ..., 1:], currents[0, ..., 1:], cycle.volts[0])

    def states(self, cycle: Cycle, solution: Solution, change: OrdersChange | None) -> list[SteadyState]:
        """Return the steady states, in the stages' order."""
        found: list[SteadyState] = []
        for whole, rows in self.ladders:
            stages, ladder, part = [self.stages[row] for row in rows], whole.first(cycle.orders), cycle.take(rows)
            figures = pair_account(stages, ladder, part)
            found += states(stages, ladder.loaded, part.of_device(0), figures, solution.take(rows), change)
        return found

    @property
    def _push_pull(self) -> bool:
        return self.stages[0].device.pair == PUSH_PULL

    def _carried(self, orders: int) -> NDArray[np.int64]:
        """Return the mode that each order has in a balanced pair."""
        order = np.arange(orders + 1)
        return np.where(order % 2 == 1, ODD, EVEN) if self._push_pull else np.full_like(order, EVEN)

    def _seen(self, orders: int) -> Complex:
        """Return what each device of a balanced pair sees [ohm], shape (S, N + 1)."""
        seen: Complex = self._impedance(orders)[:, self._carried(orders), np.arange(orders + 1)]
        return seen

    def _spread(self, deviation: Complex) -> Complex:
        """Return the modes (S, 2, N + 1) of balanced pairs from the first device's voltages (S, N + 1)."""
        stages, size = deviation.shape
        spread = np.zeros((stages, 2, size), dtype=np.complex128)
        spread[:, self._carried(size - 1), np.arange(size)] = deviation
        return spread

    def _impedance(self, orders: int) -> Complex:
        """Return each mode's impedance for each device [ohm], shape (S, 2, N + 1)."""
        impedance = np.zeros((len(self.stages), 2, orders + 1), dtype=np.complex128)
        np.concatenate([ladder.impedance[:, :, :orders] for ladder, _ in self.ladders], out=impedance[:, :, 1:])
        resistance = np.array([[stage.supply.choke_resistance] for stage in self.stages])
        impedance[:, :, 0] = resistance * ([1, 1] if self._push_pull else [2, 0])
        return impedance
