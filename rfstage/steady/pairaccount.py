"""What the solution of a pair comes to: powers, losses and stresses of both devices and of what they share."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from rfstage.devicelaw import Array
from rfstage.stage import Stage
from rfstage.steady.modes import EVEN, ODD, modes
from rfstage.steady.network import Complex, Network
from rfstage.steady.report import Account, Cycle, account, borne, charge_power, dc_across
from rfstage.steady.state import DeviceShare


class PairNetwork(NamedTuple):
    """Pairs of one build, by the ladders of their modes.

    In push-pull ``even`` is one device's feed and ``odd`` its feed with half of what stands between; in parallel
    ``even`` is what both devices share, and ``odd`` None.
    """

    even: Network
    odd: Network | None

    @property
    def loaded(self) -> Network:
        """The mode with the load in it, and with all branches."""
        return self.even if self.odd is None else self.odd

    @property
    def impedance(self) -> Complex:
        """Each mode's impedance for each device [ohm], shape (S, 2, N)."""
        even = self.even.impedance
        return np.stack((2 * even, np.zeros_like(even)) if self.odd is None else (even, self.odd.impedance), axis=1)

    def first(self, orders: int) -> PairNetwork:
        """Return the first orders only."""
        return PairNetwork(self.even.first(orders), None if self.odd is None else self.odd.first(orders))


def drawn_by_load(network: PairNetwork, cycle: Cycle) -> Complex:
    """Return device and charging current that drive the loaded mode [A], shape (S, N + 1).

    Its square times the mode's gain is the load power: both halves of a push-pull pair bring the same.
    """
    drawn = cycle.device + cycle.charging
    together: Complex = drawn.sum(axis=1) if network.odd is None else drawn[:, 0] - drawn[:, 1]
    return together if network.odd is None else together / math.sqrt(2)


def pair_account(stages: Sequence[Stage], network: PairNetwork, cycle: Cycle) -> Account:
    """Return the account of pairs of one build; all arguments are of the same rows."""
    current, heat = cycle.device[:, :, 0].real, (cycle.volts * cycle.amperes).mean(axis=-1)
    volts, amperes = cycle.volts.max(axis=-1), cycle.amperes.max(axis=-1)
    devices = [
        tuple(map(DeviceShare, *columns))
        for columns in zip(current.tolist(), heat.tolist(), volts.tolist(), amperes.tolist(), strict=True)
    ]
    if network.odd is None:
        at_node = Cycle(
            cycle.volts[:, 0],
            cycle.amperes.sum(axis=1),
            cycle.node[:, 0],
            cycle.device.sum(axis=1),
            cycle.charging.sum(axis=1),
        )
        return account(stages, network.even, at_node)._replace(peak_current=amperes.max(axis=1), devices=devices)
    powers = network.odd.gain * np.abs(drawn_by_load(network, cycle)[:, 1:]) ** 2
    return Account(
        current.sum(axis=1),
        heat.sum(axis=1),
        charge_power(cycle).sum(axis=1),
        cycle.volts.min(axis=(1, 2)),
        volts.max(axis=1),
        amperes.max(axis=1),
        powers,
        modes(cycle.device)[:, ODD],
        *_stresses(stages, network.even, network.odd, cycle),
        devices,
    )


def _stresses(stages: Sequence[Stage], even: Network, odd: Network, cycle: Cycle) -> tuple[Array, Array, Array]:
    """Return loss [W], peak voltage [V] and rms current [A] of a push-pull pair's branches, shape (B, S)."""
    into = -modes(cycle.device + cycle.charging)[:, :, 1:]
    fed = len(even.branches)
    # a sum and a difference of modes, squared: the mixed terms of both devices cancel
    losses = 2 * (odd.losses * np.abs(into[:, ODD]) ** 2).sum(axis=2)
    losses[:fed] += 2 * (even.losses * np.abs(into[:, EVEN]) ** 2).sum(axis=2)
    mean, drawn = cycle.node[:, :, 0].real.T, cycle.device[:, :, 0].real.T
    losses[fed - 1] += (drawn**2).sum(axis=0) * [stage.supply.choke_resistance for stage in stages]
    opposed, common = odd.currents * into[:, ODD], even.currents * into[:, EVEN]
    own = []
    for device, sign in enumerate((1, -1)):
        volts = dc_across(even.branches, mean[device])
        amperes = np.zeros_like(volts)
        volts[-1] -= [stage.supply.voltage for stage in stages]
        amperes[-1] = drawn[device]
        own.append(borne(common + sign * opposed[:fed], even.branch_impedances(), volts, amperes))
    held = dc_across(odd.branches[fed:], mean[0] - mean[1])
    between = borne(opposed[fed:], 2 * odd.branch_impedances()[fed:], held, np.zeros_like(held))
    peaks, rms = (np.concatenate((np.maximum(a, b), c)) for a, b, c in zip(*own, between, strict=True))
    return losses, peaks, rms
