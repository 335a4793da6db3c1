"""A network as designed, and what it is like: its parts with what they bear, Qs, bandwidth, efficiency."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

from rfstage.kinds import THROUGH
from rfstage.ladder import Branch, BranchState, Ladder
from rfstage.load import Load
from rfstage.matching.quality import bandwidth, input_side_q, loaded_q


class PartStress(NamedTuple):
    """A part with what it carries at the carrier: peak voltage [V], rms current [A], loss [W], or None.

    Of a through branch these are the device's side; ``far_voltage`` and ``far_current`` are the load's.
    """

    branch: Branch
    peak_voltage: float | None
    rms_current: float | None
    loss: float | None
    far_voltage: float | None = None
    far_current: float | None = None


def _stress(branch: Branch, state: BranchState, carrier: float, current: float) -> PartStress:
    """Return what a part carries for a peak ``current`` [A] of the device."""
    near = complex(state.current) * current
    voltage = near * complex(state.drop(branch, carrier))
    found = PartStress(branch, abs(voltage), abs(near) / math.sqrt(2), float(state.loss) * current**2)
    if branch.place != THROUGH:
        return found
    far_voltage, far = branch.ports(carrier).outwards(voltage, near)
    return found._replace(far_voltage=abs(far_voltage), far_current=abs(far) / math.sqrt(2))


class Tank(NamedTuple):
    """A network as designed, and what it is like.

    ``parts`` run from device to load and hold all that shapes the RF; ``impedance`` [ohm] is what the
    device's current generator sees; ``bandwidth`` in Hz; ``terminations`` are (order, |Z(n)|/R);
    ``link_qs`` the Qs of tank and link winding as they stand coupled, None without a link.
    """

    network: str
    parts: tuple[PartStress, ...]
    impedance: complex
    loaded_q: float
    input_q: float | None
    bandwidth: float | None
    efficiency: float
    terminations: tuple[tuple[int, float], ...]
    trough_dip: float | None
    link_qs: tuple[float, float] | None = None


def stresses(branches: Sequence[Branch], load: complex, carrier: float, current: float) -> tuple[PartStress, ...]:
    """Return what every part carries at the carrier [Hz] for a peak ``current`` [A] of the device."""
    walk = Ladder(branches).walk(carrier, load)
    return tuple(
        _stress(branch, state, carrier, current) for branch, state in zip(branches, walk.branches, strict=True)
    )


def tank_efficiency(branches: Sequence[Branch], load: complex, carrier: float) -> float:
    """Return the power in the load over the power into the ladder [-]."""
    z, h = Ladder(branches).transfer(carrier, load)
    return float(abs(h) ** 2 * (1 / load).real / z.real)


def describe(
    network: str,
    feed: Sequence[Branch],
    tank: Sequence[Branch],
    *,
    behind: Sequence[Branch] = (),
    load: Load,
    carrier: float,
    current: float | None,
    terminations: tuple[tuple[int, float], ...],
    trough_dip: float | None,
) -> Tank:
    """Return the `Tank` for a peak fundamental ``current`` [A] of the device, or without stresses.

    ``behind`` is a filter between tank and load: in the parts, the efficiency and the bandwidth, but not in the Q.
    """
    branches = (*feed, *tank, *behind)
    at_carrier = complex(load.impedance(carrier))
    if current is None:
        parts = tuple(PartStress(branch, None, None, None) for branch in branches)
    else:
        parts = stresses(branches, at_carrier, carrier, current)
    z = complex(Ladder(branches).impedance(carrier, at_carrier))
    return Tank(
        network=network,
        parts=parts,
        impedance=z,
        loaded_q=loaded_q(feed, tank, complex(Ladder(behind).impedance(carrier, at_carrier)), carrier),
        input_q=input_side_q(feed, tank, 1 / (1 / z).real, carrier),
        bandwidth=bandwidth(branches, load, carrier),
        efficiency=tank_efficiency(branches, at_carrier, carrier),
        terminations=terminations,
        trough_dip=trough_dip,
        link_qs=_link_qs(branches, at_carrier, carrier),
    )


def _link_qs(branches: Sequence[Branch], load: complex, carrier: float) -> tuple[float, float] | None:
    """Return susceptance over conductance seen at a link's tank, and its winding's reactance over the load's part."""
    place = next((k for k, b in enumerate(branches) if b.kind == "coupled" and not b.tap), None)
    if place is None:
        return None
    pair = branches[place]
    near = 1 / complex(Ladder(branches[place:]).impedance(carrier, load))
    beyond = complex(Ladder(branches[place + 1 :]).impedance(carrier, load))
    return -near.imag / near.real, 2 * math.pi * carrier * float(pair.second) / beyond.real
