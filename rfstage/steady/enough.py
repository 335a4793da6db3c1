"""Whether the orders are enough: what moved since half of them, what the unsolved may still do, how wide a pulse is.

::

    Figures          dc current, load powers and peak voltage, at one order number and at half of it
    voltage_beyond   a resonance above the orders solved moves none of these, until it is among them
    too_narrow       a pulse between two samples has no width at all
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.devicelaw import Array, Law, junction_charge
from rfstage.stage import Stage
from rfstage.steady.balance import voltage
from rfstage.steady.circuit import Circuit
from rfstage.steady.network import Complex, Network
from rfstage.steady.solve import Solution
from rfstage.steady.state import OrdersChange

WATCHED = 10  # orders whose load power is watched
COUNTED = 1e-8  # of the carrier's power: harmonics below −80 dBc do not decide the orders
LEAST_SAMPLES = 6  # of the cycle, that a pulse must cover
FOOT = 8.0  # softnesses below the crest, where the pulse of a drive that hardly reaches the threshold is e^−8


class Figures(NamedTuple):
    """What decides whether orders suffice: dc current [A], load powers of the first orders [W], peak voltage [V]."""

    dc_current: float
    load_powers: Array
    peak_voltage: float

    @classmethod
    def of(cls, dc_current: complex, drawn: Complex, ladder: Network, volts: Array) -> Figures:
        """Return those of one stage.

        From dc current and the phasors drawn from its ladder [A], shape (N + 1,), and the samples of its electrodes'
        voltages [V], shape (..., M).
        """
        first = drawn[1 : WATCHED + 1]
        powers = ladder.gain[0, : first.size] * np.abs(first) ** 2
        return cls(float(dc_current.real), powers, float(volts.max()))

    def change_from(self, before: Figures) -> OrdersChange | None:
        """Return what moved since ``before``; None where there was no carrier yet, and so nothing to compare with."""
        shared = min(self.load_powers.size, before.load_powers.size)
        new, old = self.load_powers[:shared], before.load_powers[:shared]
        if not new[0] > 0:
            return OrdersChange(0.0, 0.0, 0.0, 0.0)
        if not old[0] > 0:
            return None
        counted = (new > COUNTED * new[0]) & (old > 0)
        moved = np.abs(10 * np.log10(new[counted] / old[counted]))
        return OrdersChange(
            abs(1 - before.dc_current / self.dc_current),
            float(moved[0]),
            float(moved[1:].max(initial=0.0)),
            abs(1 - before.peak_voltage / self.peak_voltage),
        )


def voltage_beyond(stage: Stage, impedance: Complex, currents: Complex, volts: Array) -> float:
    """Return the voltage [V] at the device that the orders not solved may still make.

    Parameters
    ----------
    stage : Stage
        Its carrier, and its junction, whose mean capacitance over the cycle lies across the impedance.
    impedance : ndarray, shape (..., W)
        Of the ladder at orders 1 … W [ohm], more than are solved.
    currents : ndarray, shape (..., N)
        The device's phasors at the orders solved, 1 … N [A].
    volts : ndarray, shape (..., M)
        The device's voltage over the cycle [V].

    Notes
    -----
    Beyond N the currents are taken to fall off as those of a corner do, (N/k)² times the largest of the last
    quarter. Their voltages add as squares, since their phases are not known.

    Examples
    --------
    >>> from rfstage.device import Device
    >>> from rfstage.load import SeriesLoad
    >>> from rfstage.stage import Drive, Supply
    >>> fet = Device(family="fet", transfer_factor=2.0, exponent=1.0, threshold=3.0, threshold_softness=0.04,
    ...              knee_voltage=0.07, knee_resistance=0.1)
    >>> stage = Stage(carrier=7.1e6, device=fet, drive=Drive(bias=3.0, amplitude=1.0), branches=(),
    ...               supply=Supply(voltage=13.8, choke=1.6e-6), load=SeriesLoad(50 + 0j, 7.1e6))
    >>> trap_at_20 = np.where(np.arange(1, 33) == 20, 100.0 + 0j, 0.0)
    >>> round(voltage_beyond(stage, trap_at_20, np.full(10, 0.04 + 0j), np.full(64, 13.8)), 9)
    1.0
    """
    solved, known = currents.shape[-1], impedance.shape[-1]
    ahead, orders = impedance[..., solved:], np.arange(solved + 1.0, known + 1)
    if stage.device.junction_capacitance is not None:
        capacitance = junction_charge(Law.of([stage.device]), volts)[1].mean()
        ahead = ahead / (1 + 2j * math.pi * stage.carrier * capacitance * orders * ahead)
    largest = np.abs(currents[..., solved - solved // 4 :]).max(axis=-1, keepdims=True)
    fallen = largest * (solved / orders) ** 2
    return float(np.linalg.norm(ahead * fallen))


def too_narrow(circuit: Circuit, solution: Solution, amperes: Array) -> NDArray[np.bool_]:
    """Return whether a current pulse covers too few samples of the cycle to mean anything, shape (S,).

    ``amperes`` are the devices' currents [A], shape (S, M), or (S, 2, M): of a pair the narrower pulse counts. It is
    measured at the threshold, and lower where a soft one is hardly reached or not at all: the foot's rounded pulse
    has a width too.
    """
    drive = circuit.driven.overdrive
    if circuit.law.parts.mu:
        drive = circuit.driven.effective_drive(voltage(circuit, solution.unknowns))
    level = np.minimum(drive.max(axis=-1, keepdims=True) - FOOT * circuit.law.softness, 0.0)
    covered = (drive > level).sum(axis=-1)
    narrow: NDArray[np.bool_] = (covered < LEAST_SAMPLES).reshape(len(drive), -1).any(axis=1)
    if narrow.any():
        narrow &= amperes.reshape(len(drive), -1).max(axis=1) > 0
    return narrow
