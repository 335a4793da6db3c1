"""The stage: carrier, device, drive, supply, the branches from device to load, and the load.

::

    supply ── choke ──┐
                      │
    drive ── device ──┼── branches: blocking capacitor, tank, filter ── load
                      │
              output capacitance
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field

from rfstage.device import Device
from rfstage.ladder import Branch, Ladder
from rfstage.load import Load

OUTPUT_CAPACITANCE = "Cout"
CHOKE = "Lchoke"
BLOCKING = "Cblock"
TRANSFORMER = "T1"


@dataclass(frozen=True, slots=True)
class Drive:
    """Bias and peak amplitude of the sine at the control electrode [V]."""

    bias: float
    amplitude: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Supply:
    """Supply voltage [V] and choke: inductance [H], dc resistance [ohm], RF quality factor [-] or None.

    With no ``choke_q`` the dc resistance is the RF loss too; an infinite one is lossless at RF.
    """

    voltage: float
    choke: float
    choke_resistance: float = 0.0
    choke_q: float | None = None

    def branch(self, carrier: float) -> Branch:
        """Return the choke as a shunt branch; the carrier [Hz] is where its Q holds."""
        if self.choke_q is None:
            return Branch(CHOKE, "shunt", "coil", self.choke, series_resistance=self.choke_resistance or None)
        q = None if math.isinf(self.choke_q) else self.choke_q
        return Branch(CHOKE, "shunt", "coil", self.choke, q=q, q_frequency=carrier)


@dataclass(frozen=True, slots=True)
class PartData:
    """What a stage file says of a part beyond its circuit: setting range, tolerance [%], winding, rating [V dc]."""

    trim: tuple[float, float] | None = None
    tolerance: float | None = None
    winding: tuple[tuple[str, float | str], ...] | None = None
    max_voltage: float | None = None


@dataclass(frozen=True, slots=True)
class Asked:
    """What the stage was designed for: W, degrees and V, or None."""

    output_power: float | None = None
    conduction_angle: float | None = None
    minimum_voltage: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Stage:
    """An as-built stage; ``part_data`` maps a branch's name to what is known of the part."""

    carrier: float
    device: Device
    drive: Drive
    supply: Supply
    branches: tuple[Branch, ...]
    load: Load
    asked: Asked = Asked()
    limit_rule: str | None = None
    limit_load: float | None = None
    part_data: dict[str, PartData] = field(default_factory=dict)

    @property
    def feed(self) -> tuple[Branch, ...]:
        """What stands across the device before the first branch: output capacitance and choke."""
        return feed(self.device.output_capacitance, self.supply.branch(self.carrier))

    @property
    def ladder(self) -> Ladder:
        """Everything from the device's current generator to the load."""
        return Ladder((*self.feed, *self.branches))


def feed(output_capacitance: float, choke: Branch) -> tuple[Branch, ...]:
    """Return output capacitance [F] and choke as branches; a capacitance of 0 is no branch."""
    if output_capacitance == 0:
        return (choke,)
    return (Branch(OUTPUT_CAPACITANCE, "shunt", "capacitor", output_capacitance, origin="device"), choke)
