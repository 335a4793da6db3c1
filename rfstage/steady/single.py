"""What the entries ask of a block of stages, and the answers of stages with one device each.

::

    circuit → (solve) → cycle → figures, which choose the orders → states
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple, Protocol

from rfstage.stage import Stage
from rfstage.steady.circuit import Circuit
from rfstage.steady.enough import Figures, voltage_beyond
from rfstage.steady.network import Complex, Network, networks
from rfstage.steady.report import Cycle, account, states
from rfstage.steady.solve import Solution
from rfstage.steady.state import OrdersChange, SteadyState


class System(Protocol):
    """A block of stages with their networks, walked up to ``orders``."""

    @property
    def orders(self) -> int:
        """The most orders that can be asked."""

    def circuit(self, orders: int) -> Circuit:
        """Return what is to be solved."""

    def guess(self, deviation: Complex) -> Complex:
        """Return unknowns that suit the first device's deviation from the supply [V], shape (S, N + 1)."""

    def cycle(self, circuit: Circuit, solution: Solution) -> Cycle:
        """Return the solved cycle of every device."""

    def figures(self, cycle: Cycle) -> Figures:
        """Return those of the first stage."""

    def voltage_beyond(self, cycle: Cycle) -> float:
        """Return the voltage [V] that the orders walked but not solved may still make in the first stage."""

    def states(self, cycle: Cycle, solution: Solution, change: OrdersChange | None) -> list[SteadyState]:
        """Return the steady states, in the stages' order."""


class Singles(NamedTuple):
    """Stages with one device each; ``ladders`` with the rows they hold."""

    stages: Sequence[Stage]
    ladders: Sequence[tuple[Network, list[int]]]

    @classmethod
    def of(cls, stages: Sequence[Stage], orders: int) -> Singles:
        """Walk the ladders of the stages."""
        return cls(stages, networks(stages, orders))

    @property
    def orders(self) -> int:
        """The most orders that can be asked."""
        return self.ladders[0][0].frequencies.size

    def circuit(self, orders: int) -> Circuit:
        """Return what is to be solved."""
        return Circuit.of(self.stages, [ladder for ladder, _ in self.ladders], orders)

    def guess(self, deviation: Complex) -> Complex:
        """Return the deviation itself: it is what is unknown."""
        return deviation

    def cycle(self, circuit: Circuit, solution: Solution) -> Cycle:
        """Return the solved cycle of every device."""
        return Cycle.of(circuit, solution)

    def figures(self, cycle: Cycle) -> Figures:
        """Return those of the first stage."""
        drawn = (cycle.device + cycle.charging)[0]
        return Figures.of(cycle.device[0, 0], drawn, self.ladders[0][0], cycle.volts[0])

    def voltage_beyond(self, cycle: Cycle) -> float:
        """Return the voltage [V] that the orders walked but not solved may still make in the first stage."""
        return voltage_beyond(self.stages[0], self.ladders[0][0].impedance[0], cycle.device[0, 1:], cycle.volts[0])

    def states(self, cycle: Cycle, solution: Solution, change: OrdersChange | None) -> list[SteadyState]:
        """Return the steady states, in the stages' order."""
        found: list[SteadyState] = []
        for whole, rows in self.ladders:
            stages, ladder, part = [self.stages[row] for row in rows], whole.first(cycle.orders), cycle.take(rows)
            found += states(stages, ladder, part, account(stages, ladder, part), solution.take(rows), change)
        return found
