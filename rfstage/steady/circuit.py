"""Stages as arrays: what stands around the device, and the device under drive, a row for each stage.

::

    supply ── dc resistance ──┐            k = 0: the supply's voltage behind the choke's dc resistance
                              ├── device
    ladder with its load ─────┘            k = 1 … N: the ladder's impedance at k times the carrier

Everything linear, the choke and the output capacitance included, comes from one walk of the stage's ladder
over all orders. Rows of impedance are scaled by R0/(R0 + |Z_k|), R0 = |Z_1|: a measure like a wave's, which
stays of the size of the supply voltage whether the ladder is a short or an open at some order.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.device import PUSH_PULL
from rfstage.devicelaw import Array, DrivenLaw, Law
from rfstage.errors import ImpossibleError, OutOfRangeError
from rfstage.ladder import Ladder
from rfstage.stage import Stage
from rfstage.steady.network import Network

SAMPLES_PER_ORDER = 8  # times the orders: the least number of samples in a cycle, then the next power of two
SAMPLES_PER_ORDER_HARD = 32  # the same for a hard threshold corner, whose spectrum falls slowly
NEARLY_DC = 1e-6  # of the carrier: where a ladder shows whether it conducts direct current


class Circuit(NamedTuple):
    """Stages of one order number N as arrays with a stage axis S in front, M samples a cycle.

    Pairs have an axis of two behind that of the stages: devices a and b for drive and law, modes even and odd
    (`rfstage.steady.modes`) for impedance and scale; and supply, bias and ω one of length one.

    ``supply`` [V] (S, 1); ``bias`` and ``amplitude`` of the drive [V] (S, 1); ``law`` the devices;
    ``driven`` the same under drive; ``impedance`` scaled [ohm] (S, N + 1), that of dc halved since a mean
    counts once where a peak counts twice; ``scale`` of each equation [-] (S, N + 1); ``resistance`` |Z_1| [ohm]
    (S,); ``omega`` k times the carrier [rad/s] (S, N + 1).
    """

    orders: int
    samples: int
    supply: Array
    bias: Array
    amplitude: Array
    law: Law
    driven: DrivenLaw
    impedance: NDArray[np.complex128]
    scale: Array
    resistance: Array
    omega: Array

    @classmethod
    def of(cls, stages: Sequence[Stage], ladders: Sequence[Network], orders: int) -> Circuit:
        """Build the arrays of stages that passed `check`, from the first orders of their ladders, in order."""
        impedance = np.empty((len(stages), orders + 1), dtype=np.complex128)
        impedance[:, 0] = [stage.supply.choke_resistance for stage in stages]
        np.concatenate([ladder.impedance[:, :orders] for ladder in ladders], out=impedance[:, 1:])
        law = Law.of([stage.device for stage in stages])
        supply, bias, amplitude, carrier = sources(stages)
        return cls.assembled(law, supply, bias, amplitude, carrier, impedance, np.abs(impedance[:, 1]))

    @classmethod
    def assembled(
        cls,
        law: Law,
        supply: Array,
        bias: Array,
        amplitude: Array,
        carrier: Array,
        impedance: NDArray[np.complex128],
        resistance: Array,
    ) -> Circuit:
        """Build the arrays from devices, sources as columns, and impedances [ohm] still to be scaled."""
        orders = impedance.shape[-1] - 1
        hard = bool((law.softness == 0).any())
        least = orders * (SAMPLES_PER_ORDER_HARD if hard else SAMPLES_PER_ORDER)
        samples = 1 << (least - 1).bit_length()
        reference = resistance.reshape(supply.shape)
        scale = reference / (reference + np.abs(impedance))
        scaled = impedance * scale
        scaled[..., 0] /= 2
        driven = DrivenLaw.at(law, bias + amplitude * _cosine(samples))
        omega = 2 * math.pi * carrier * np.arange(orders + 1)
        return cls(orders, samples, supply, bias, amplitude, law, driven, scaled, scale, resistance, omega)

    @property
    def paired(self) -> bool:
        """Whether the stages are pairs of devices."""
        return self.impedance.ndim == 3

    def take(self, rows: Any) -> Circuit:
        """Return the chosen rows."""
        return Circuit(
            self.orders,
            self.samples,
            self.supply[rows],
            self.bias[rows],
            self.amplitude[rows],
            self.law.take(rows),
            self.driven.take(rows),
            self.impedance[rows],
            self.scale[rows],
            self.resistance[rows],
            self.omega[rows],
        )

    def softened(self, factor: float) -> Circuit:
        """Return the same stages with knees and reverse junctions ``factor`` times as soft."""
        return self._with_law(self.law.softened(factor))

    def driven_at(self, fraction: float) -> Circuit:
        """Return the same stages with a fraction of the drive amplitude; the bias stays."""
        return self._replace(amplitude=self.amplitude * fraction)._with_law(self.law)

    def _with_law(self, law: Law) -> Circuit:
        control = self.bias + self.amplitude * _cosine(self.samples)
        return self._replace(law=law, driven=DrivenLaw.at(law, control))


def sources(stages: Sequence[Stage]) -> tuple[Array, Array, Array, Array]:
    """Return supply, bias and drive amplitude [V] and carrier [Hz], each of shape (S, 1)."""
    rows = [(s.supply.voltage, s.drive.bias, s.drive.amplitude, s.carrier) for s in stages]
    supply, bias, amplitude, carrier = np.array(rows).T[:, :, np.newaxis]
    return supply, bias, amplitude, carrier


def _cosine(samples: int) -> Array:
    wave: Array = np.cos(2 * math.pi / samples * np.arange(samples))
    return wave


def check(stage: Stage) -> None:
    """Raise unless a steady state can be asked of this stage.

    Raises
    ------
    OutOfRangeError
        If the carrier, supply or choke is not above 0, or its resistance or the drive amplitude is below 0.
    ImpossibleError
        If nothing keeps the supply's direct current out of the ladder, or that of unlike devices out of what stands
        between them.
    """
    supply, drive = stage.supply, stage.drive
    for name, value, unit in (
        ("carrier", stage.carrier, "Hz"),
        ("supply voltage", supply.voltage, "V"),
        ("choke", supply.choke, "H"),
    ):
        if not (value > 0 and math.isfinite(value)):
            raise OutOfRangeError(name, value, f"above 0 {unit}")
    for name, value, unit in (
        ("choke_resistance", supply.choke_resistance, "ohm"),
        ("drive amplitude", drive.amplitude, "V"),
    ):
        if not (value >= 0 and math.isfinite(value)):
            raise OutOfRangeError(name, value, f"0 {unit} or more")
    if not math.isfinite(drive.bias):
        raise OutOfRangeError("drive bias", drive.bias, "finite")
    push_pull = stage.device.pair == PUSH_PULL
    level = push_pull and (stage.device.imbalance == 0 or supply.choke_resistance == 0)  # no dc between the outputs
    if level or _blocked(stage):
        return
    low = Ladder(stage.branches).impedance(np.array([NEARLY_DC * stage.carrier]), stage.load)[0]
    if not -low.imag > abs(low.real):
        if push_pull:
            raise ImpossibleError(
                "direct current of the unlike devices would flow between them through the branches: "
                "put a blocking capacitor in series first"
            )
        raise ImpossibleError(
            "the supply's direct current would flow through the ladder: put a blocking capacitor "
            "in series before the first coil to ground and before the load"
        )


def _blocked(stage: Stage) -> bool:
    """Whether a series capacitor stands before anything that conducts to ground: no need to look closer."""
    first = next((branch for branch in stage.branches if branch.blocks or branch.grounds), None)
    return first is not None and first.blocks
