"""The book's design, closed exactly: for a load resistance the network, for a power the resistance.

The device must see a resistance R; the network that shows it has losses; so the device must give more
than the load gets, and R is lower than the lossless one. The loop below is that sentence.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.cautions import LOW_RESISTANCE, short_of_reactance
from rfstage.designs.settings import Settings
from rfstage.errors import ConvergenceError
from rfstage.ladder import Branch
from rfstage.matching.exact import behind
from rfstage.matching.networks import shunt_reactance, solve_network
from rfstage.matching.parts import parallel_resistance
from rfstage.matching.tank import tank_efficiency
from rfstage.matching.task import DEFAULT_LOADED_Q
from rfstage.operating import OperatingPoint, operating_point, operating_point_at
from rfstage.stage import BLOCKING, TRANSFORMER, Supply, feed

if TYPE_CHECKING:
    from rfstage.filters.choose import Filter

SMALL_RESISTANCE = 500.0  # ohm: up to here the choke is sized against it, above against the input capacitor
SETTLED = 1e-13  # relative change of the load resistance
NEAR = 0.05  # relative change of the load resistance over which the parts found are a good start for the next
MAGNETIZING = 10.0  # times the load resistance: reactance of a transformer's magnetizing inductance
LEAKAGE = 0.01  # of the magnetizing inductance
CORE_Q = 20.0  # of the magnetizing inductance
_ROUNDS = 60


class Circuit(NamedTuple):
    """Supply with its choke, blocking capacitor, transformer or none, network, filter, for one load resistance."""

    supply: Supply
    output_capacitance: float
    coupler: tuple[Branch, ...]
    tank: tuple[Branch, ...]
    filter: tuple[Branch, ...]
    carrier: float

    @property
    def feed(self) -> tuple[Branch, ...]:
        """What stands before the network: output capacitance, choke, blocking capacitor, transformer."""
        return (*feed(self.output_capacitance, self.supply.branch(self.carrier)), *self.coupler)

    @property
    def branches(self) -> tuple[Branch, ...]:
        """Everything from the device to the load."""
        return (*self.feed, *self.tank, *self.filter)

    @property
    def input_capacitance(self) -> float | None:
        """The network's capacitor across its input [F], or None where it begins otherwise."""
        first = self.tank[0]
        return float(first.value) if first.place == "shunt" and first.kind == "capacitor" else None

    def network_resistance(self, resistance: float) -> float:
        """Return what the network begins at [ohm]: the device's, or behind a transformer what that makes of it."""
        if len(self.coupler) == 1:
            return resistance
        return parallel_resistance(behind(self.feed, complex(resistance), self.carrier))

    def is_low(self, resistance: float) -> bool:
        """Return whether the network begins at too low a resistance [ohm], or with a capacitor that leads decide."""
        low = self.network_resistance(resistance) < LOW_RESISTANCE
        return low or short_of_reactance(self.input_capacitance, self.carrier)


class Fitted(NamedTuple):
    """A circuit with its operating point and what it was made from, and the filter in it, or None."""

    settings: Settings
    circuit: Circuit
    point: OperatingPoint
    filter: Filter | None


def circuit_for(settings: Settings, resistance: float, near: tuple[Branch, ...] = ()) -> Circuit:
    """Return the circuit that shows a resistance [ohm] to the device, exact with its losses.

    Raises
    ------
    ImpossibleError
        If the network can't.
    """
    job = settings.job
    omega = 2 * math.pi * job.carrier
    across = _input_reactance(settings, resistance)
    choke = job.choke
    if choke is None:
        # with a fixed input-side Q the input capacitor does not grow to tune the choke out
        ratio = 10 if settings.request.input_q is not None else 9
        choke = (10 * resistance if resistance < SMALL_RESISTANCE or across is None else ratio * across) / omega
    blocking = job.blocking
    if blocking is None:
        # the coil that tunes the output capacitance out stands behind it, where no capacitor of the network does
        own = 1 / (omega * settings.output_capacitance) if settings.output_capacitance else resistance
        blocking = 10 / (omega * min(resistance, across or own))
    supply = Supply(
        voltage=job.supply, choke=choke, choke_resistance=settings.choke_resistance, choke_q=settings.choke_q
    )
    capacitor_q = settings.request.capacitor_q
    blocker = Branch(BLOCKING, "series", "capacitor", blocking, q=None if math.isinf(capacitor_q) else capacitor_q)
    coupler = (blocker, *_transformer(settings, resistance))
    before = (*feed(settings.output_capacitance, supply.branch(job.carrier)), *coupler)
    tank = solve_network(
        settings.request,
        feed=before,
        wanted=complex(resistance),
        load=settings.tank_load,
        carrier=job.carrier,
        near=near,
    )
    return Circuit(supply, settings.output_capacitance, coupler, tank, settings.filter, job.carrier)


def _transformer(settings: Settings, resistance: float) -> tuple[Branch, ...]:
    """Return the transformer that was asked for, sized for a load resistance [ohm], or nothing."""
    job = settings.job
    if job.transformer is None:
        return ()
    magnetizing = job.transformer_magnetizing
    if magnetizing is None:
        magnetizing = MAGNETIZING * resistance / (2 * math.pi * job.carrier)
    leakage = LEAKAGE * magnetizing if job.transformer_leakage is None else job.transformer_leakage
    return (
        Branch(
            TRANSFORMER,
            "through",
            "transformer",
            1 / job.transformer,
            q_frequency=job.carrier,
            lead_inductance=leakage,
            second=magnetizing,
            second_q=CORE_Q,
        ),
    )


def _input_reactance(settings: Settings, resistance: float) -> float | None:
    """Return the reactance [ohm] of the capacitance a network needs across the device, or None without one.

    Where the load resistance is high this is what choke and blocking capacitor are sized against: both
    see the current of the input capacitor. The input capacitor also tunes the choke out, so that it is
    1/0.9 of what the network needs without one, and the choke ten times its reactance is nine times this.
    Behind a transformer it is not across the device.
    """
    if settings.job.transformer is not None:
        return None
    return shunt_reactance(
        settings.request,
        resistance=resistance,
        capacitance=settings.output_capacitance,
        load=settings.tank_load,
        carrier=settings.job.carrier,
    )


def point_for(settings: Settings, coefficients: NDArray[np.float64], efficiency: float) -> OperatingPoint:
    """Return the operating point that gives the asked power through a tank of this efficiency [-]."""
    return operating_point(
        output_power=settings.job.power, tank_efficiency=efficiency, **_given(settings, coefficients)
    )


def circuit_at(
    settings: Settings, coefficients: NDArray[np.float64], resistance: float
) -> tuple[Circuit, OperatingPoint]:
    """Return circuit and operating point of a load resistance [ohm], whatever power it gives."""
    circuit = circuit_for(settings, resistance)
    return circuit, operating_point_at(
        resistance, tank_efficiency=_efficiency(settings, circuit), **_given(settings, coefficients)
    )


def _given(settings: Settings, coefficients: NDArray[np.float64]) -> dict[str, float]:
    return {
        "supply": settings.job.supply,
        "minimum_voltage": settings.minimum_voltage,
        "dc_coefficient": float(coefficients[0]),
        "fundamental_coefficient": float(coefficients[1]),
        "choke_resistance": settings.choke_resistance,
    }


def _efficiency(settings: Settings, circuit: Circuit) -> float:
    return tank_efficiency(circuit.branches, settings.load_impedance, settings.job.carrier)


def _efficiency_at_first_sight(settings: Settings) -> float:
    """Return 1 − loaded over unloaded Q [-], about the efficiency of a tank, as a start."""
    request = settings.request
    if request.network in ("l", "l-high-pass") or request.input_q is not None:
        return 1.0
    lost = (request.loaded_q or DEFAULT_LOADED_Q) * (1 / request.coil_q + 1 / request.capacitor_q)
    return 1 - lost if lost < 0.5 else 1.0


def by_the_book(settings: Settings, coefficients: NDArray[np.float64]) -> tuple[Circuit, OperatingPoint]:
    """Return circuit and operating point that put the asked power into the load, losses and all.

    Raises
    ------
    ImpossibleError
        If no network or operating point does it.
    ConvergenceError
        If the loop does not settle.
    """

    def next_for(resistance: float, near: tuple[Branch, ...]) -> tuple[Circuit, OperatingPoint]:
        circuit = circuit_for(settings, resistance, near)
        return circuit, point_for(settings, coefficients, _efficiency(settings, circuit))

    resistance = point_for(settings, coefficients, _efficiency_at_first_sight(settings)).load_resistance
    before: tuple[float, float] | None = None
    near: tuple[Branch, ...] = ()
    for _ in range(_ROUNDS):
        circuit, point = next_for(resistance, near)
        miss = point.load_resistance - resistance
        if abs(miss) <= SETTLED * resistance:
            return circuit, point
        step = miss
        if before is not None and before[1] != miss:
            step = -miss * (resistance - before[0]) / (miss - before[1])  # secant
        before, near = (resistance, miss), circuit.tank if abs(step) < NEAR * resistance else ()
        resistance = max(resistance + step, resistance / 2)
    raise ConvergenceError(
        "the load resistance did not settle between power and tank losses: the tank loses nearly all the power; "
        "raise tank.coil_q or lower the loaded Q"
    )
