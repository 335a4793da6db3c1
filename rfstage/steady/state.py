"""The steady state as it is handed out: meters, heat, stresses, harmonics, waveform, and how far to trust it."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.stage import Stage

ORDERS_DC = 1e-3  # relative change of the dc current below which more orders would not be seen on a meter
ORDERS_POWER = 0.01  # dB, of the output power
ORDERS_HARMONICS = 0.1  # dB, of the harmonics that count
ORDERS_VOLTAGE = 5e-3  # relative change of the peak voltage, and what unsolved orders may add, of the supply


class HarmonicLevel(NamedTuple):
    """One order: frequency [Hz], power in the load [W], level against the carrier [dBc].

    The level is None where the device's current has no such harmonic, or where there is no carrier.
    """

    order: int
    frequency: float
    load_power: float
    level: float | None


class BranchStress(NamedTuple):
    """What one branch bears: loss [W], peak voltage across it [V], rms current through it [A].

    All orders and dc together: a blocking capacitor's voltage has the supply in it, a choke's current the
    supply current. The choke's loss is that of its dc resistance and of its RF loss.
    """

    name: str
    loss: float
    peak_voltage: float
    rms_current: float


class DeviceShare(NamedTuple):
    """One device of a pair: direct current [A], heat [W], peak electrode voltage [V], peak device current [A]."""

    dc_current: float
    dissipation: float
    peak_voltage: float
    peak_current: float


class Waveform(NamedTuple):
    """One cycle, from the drive's crest: phase [deg], electrode voltage [V], device current [A], shape (M,).

    The current is that of the law; what flows into capacitances is not in it.
    """

    phase_deg: NDArray[np.float64]
    voltage: NDArray[np.float64]
    current: NDArray[np.float64]


class OrdersChange(NamedTuple):
    """What moved when the orders were last doubled.

    ``dc_current`` relative [-], ``output_power_db`` [dB], the largest move of a harmonic to the tenth above
    −80 dBc, ``harmonics_db`` [dB], and the electrode's ``peak_voltage`` relative [-].
    """

    dc_current: float
    output_power_db: float
    harmonics_db: float
    peak_voltage: float

    @property
    def settled(self) -> bool:
        """Whether more orders would change nothing that matters: 1e-3, 0.01 dB, 0.1 dB and 5e-3."""
        return (
            self.dc_current < ORDERS_DC
            and self.output_power_db < ORDERS_POWER
            and self.harmonics_db < ORDERS_HARMONICS
            and self.peak_voltage < ORDERS_VOLTAGE
        )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SteadyState:
    """The steady state of one stage; SI units, phasors are peak values.

    Of a pair, currents, powers and losses are those of both devices, extremes those of the one that goes further;
    phasors of the device, conduction angle and waveform are the first device's.

    Attributes
    ----------
    stage : Stage
        What was solved.
    device_voltage, device_current : ndarray, shape (orders_solved + 1,)
        Phasors of the device node's voltage [V] and of the device's current [A]; entry 0 is the mean.
        The drive is the phase reference.
    dc_current, dc_power : float
        From the supply [A], [W].
    output_power : float
        The carrier's power in the load [W].
    efficiency : float or None
        Output power over dc power; None where no dc flows.
    dissipation : float
        The device's heat [W].
    charge_power : float
        Power of the lossless junction charge [W]: zero but for the sampling, so a free check on it.
    branches : tuple of BranchStress
        Every branch from device to load, output capacitance and choke among them. A push-pull pair has two of
        these: losses are of both, voltage and current of the one that bears more; voltages of the other branches
        are from one side to the other.
    choke_loss : float
        Direct current and RF [W].
    branch_losses : dict
        Loss of every branch but these two, by name [W].
    minimum_voltage, peak_voltage, peak_current : float
        Extremes over the cycle of electrode voltage [V] and device current [A].
    conduction_angle_deg : float
        Part of the cycle in which the effective drive exceeds the threshold.
    harmonics : tuple of HarmonicLevel
        From order 2 to half the orders solved, and to the tenth at least.
    waveform : Waveform
        One cycle.
    orders_solved : int
        Orders in the balance.
    balance_error : float
        Supply power that is not found again, over supply power [-]. It proves the bookkeeping, not the orders.
    residual : float
        Of the balance of harmonics, over the supply voltage [-].
    change_from_half_the_orders : OrdersChange or None
        None where half the orders were not solved, or had no carrier yet.
    iterations, method : int, str
        What it took at the last order number.
    devices : tuple of DeviceShare
        Both devices of a pair, empty for a single device.
    """

    stage: Stage = field(repr=False)
    device_voltage: NDArray[np.complex128] = field(repr=False)
    device_current: NDArray[np.complex128] = field(repr=False)
    dc_current: float
    dc_power: float
    output_power: float
    efficiency: float | None
    dissipation: float
    charge_power: float
    branches: tuple[BranchStress, ...]
    choke_loss: float
    branch_losses: dict[str, float]
    minimum_voltage: float
    peak_voltage: float
    peak_current: float
    conduction_angle_deg: float
    harmonics: tuple[HarmonicLevel, ...]
    waveform: Waveform = field(repr=False)
    orders_solved: int
    balance_error: float
    residual: float
    change_from_half_the_orders: OrdersChange | None
    iterations: int
    method: str
    devices: tuple[DeviceShare, ...] = ()

    @property
    def has_output(self) -> bool:
        """Whether any carrier reaches the load: a drive that stays below the threshold makes none."""
        return self.output_power > 0
