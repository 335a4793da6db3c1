"""Meter readings of a stage, checked against it, and what they imply by themselves.

::

    efficiency          output / (supply × dc current)
    conduction angle    the device's law passes this dc current at this angle, with voltage to spare
    load resistance     2 × (output / tank efficiency) / fundamental current², the fundamental from dc and angle

The last two are the textbook's, so they hold where the device does not run out of voltage. Between the electrodes of a
push-pull pair the fundamental of one device flows, which takes half of the dc.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.device import PUSH_PULL
from rfstage.errors import InputError
from rfstage.fields import nearest
from rfstage.pulse import pulse_coefficients
from rfstage.quantity import exact_text
from rfstage.retuning.fitting import seen_by_device
from rfstage.stage import Stage
from rfstage.stagevalues import with_value

LEAST_ANGLE = 1e-6  # rad: what stands for none, where a pulse has no coefficients
SUPPLY, DRIVE = "supply.voltage", "drive.amplitude"


@dataclass(frozen=True, slots=True, kw_only=True)
class Reading:
    """One set of meter readings at one setting; None is not read.

    ``dc_current`` [A], ``output_power`` [W], ``supply`` [V], peak ``drive`` [V]; ``settings`` are parts that were set,
    with their values [F, H or ohm]. ``dip`` names a part that was turned until the dc current dips; its value there may
    stand in the settings, and is then a reading too.
    """

    dc_current: float | None = None
    output_power: float | None = None
    supply: float | None = None
    drive: float | None = None
    settings: tuple[tuple[str, float], ...] = ()
    dip: str | None = None

    @property
    def found_at(self) -> float | None:
        """The value at which the dip was found, where that was read [F or H]."""
        return dict(self.settings).get(self.dip) if self.dip else None


class Implied(NamedTuple):
    """What one reading implies: efficiency [-], load resistance [ohm], conduction angle [deg]; None where unknown."""

    efficiency: float | None
    load_resistance: float | None
    conduction_angle_deg: float | None


def check_readings(stage: Stage, readings: Sequence[Reading]) -> None:
    """Refuse readings that this stage can't have given.

    Raises
    ------
    InputError
        With one line for each: nothing read, a part that is not in the stage, a setting beyond its trimmer, more
        output than dc power, values that are not above 0.
    """
    problems = []
    names = [b.name for b in stage.branches if b.kind in ("coil", "capacitor")]
    for number, reading in enumerate(readings, start=1):
        where = f"--reading {number}"
        for key, unit in (("dc_current", "A"), ("output_power", "W"), ("supply", "V"), ("drive", "V")):
            value = getattr(reading, key)
            if value is not None and not (value > 0 and math.isfinite(value)):
                problems.append(f"{where}: {key}: got {exact_text(value, unit)}; allowed above 0 {unit}")
        if reading.dc_current is None and reading.output_power is None and reading.found_at is None:
            problems.append(f"{where}: nothing is read; give dc_current or output_power, or both")
        for part in dict.fromkeys([name for name, _ in reading.settings] + ([reading.dip] if reading.dip else [])):
            if part not in names:
                problems.append(
                    f"{where}: {part!r} is no coil or capacitor of this stage{nearest(part, names)}; it has "
                    f"{', '.join(names)}"
                )
        problems += [f"{where}: {line}" for line in _set_beyond(stage, reading)]
        power, current = reading.output_power, reading.dc_current
        if power is not None and current is not None and current > 0:
            volts = stage.supply.voltage if reading.supply is None else reading.supply
            if power > volts * current:
                problems.append(
                    f"{where}: output_power of {exact_text(power, 'W')} is more than the dc power of "
                    f"{exact_text(float(f'{volts * current:.4g}'), 'W')} ({exact_text(current, 'A')} from "
                    f"{exact_text(volts, 'V')}); is a meter on another range, or the supply another (supply=…)?"
                )
    if not readings:
        problems.append("no reading is given")
    if problems:
        raise InputError(*problems)


def _set_beyond(stage: Stage, reading: Reading) -> list[str]:
    found = []
    for part, value in reading.settings:
        data = stage.part_data.get(part)
        kind = next((b.kind for b in stage.branches if b.name == part), None)
        unit = {"capacitor": "F", "coil": "H"}.get(kind or "", "")
        if not value > 0:
            found.append(f"{part}: got {exact_text(value, unit)}; allowed above 0 {unit}")
        elif data is not None and data.trim is not None and not data.trim[0] <= value <= data.trim[1]:
            low, high = (exact_text(end, unit) for end in data.trim)
            found.append(f"{part}: got {exact_text(value, unit)}; its trim goes from {low} to {high}")
    return found


def as_set(stage: Stage, reading: Reading) -> Stage:
    """Return the stage with the supply, drive and settings of a reading; a dip's own value counts too."""
    for path, value in ((SUPPLY, reading.supply), (DRIVE, reading.drive), *reading.settings):
        if value is not None:
            stage = with_value(stage, path, value)
    return stage


def implied(stage: Stage, reading: Reading) -> Implied:
    """Return efficiency, load resistance and conduction angle that a reading implies by itself.

    Angle and resistance are None without a dc current, and for a device whose output voltage works on its current
    (an amplification factor); the resistance also without an output.
    """
    stage = as_set(stage, reading)
    current, power = reading.dc_current, reading.output_power
    if current is None:
        return Implied(None, None, None)
    efficiency = None if power is None else power / (stage.supply.voltage * current)
    half = _half_angle(stage, current, fixed=reading.drive is not None)
    if half is None:
        return Implied(efficiency, None, None)
    resistance = None
    if power is not None:
        a = pulse_coefficients(half, highest_order=1, exponent=stage.device.exponent)
        walk = seen_by_device(stage).ladder.walk(stage.carrier, stage.load)
        z = complex(walk.impedance)
        delivered = abs(complex(walk.transimpedance)) ** 2 * (1 / complex(walk.load_impedance)).real
        fundamental = current * float(a[1] / a[0]) / (2 if stage.device.pair == PUSH_PULL else 1)
        resistance = 2 * power * (z.real / delivered) / fundamental**2
    return Implied(efficiency, resistance, math.degrees(2 * half))


def _half_angle(stage: Stage, dc_current: float, *, fixed: bool) -> float | None:
    """Return the half angle [rad]: of the drive where that was read, else of the drive that passes this current."""
    device, drive = stage.device, stage.drive
    if device.amplification_factor is not None:
        return None
    below = device.threshold - drive.bias
    if fixed:
        cosine = below / drive.amplitude
        return math.acos(max(-1.0, cosine)) if cosine < 1 else None
    many = 2 if device.pair else 1

    def passed(amplitude: NDArray[np.float64]) -> NDArray[np.float64]:
        cosine = np.clip(below / amplitude, -1.0, 1.0)
        half = np.maximum(np.arccos(cosine), LEAST_ANGLE)
        a0 = pulse_coefficients(half, highest_order=0, exponent=device.exponent)[..., 0]
        flat = many * a0 * device.transfer_factor * (amplitude * (1 - cosine)) ** device.exponent
        return np.asarray(flat, dtype=np.float64)

    low = abs(below) if below else 1e-9 * max(drive.amplitude, 1.0)
    tried: NDArray[np.float64] = low * 2.0 ** np.arange(62, dtype=np.float64)
    if not passed(tried[:1]) <= dc_current <= passed(tried[-1:]):
        return None  # conducts all the time and carries more than this with no drive at all, or never so much
    for _ in range(7):  # each time 64 times closer
        k = int(np.clip(np.searchsorted(passed(tried), dc_current), 1, tried.size - 1))
        tried = np.asarray(np.linspace(tried[k - 1], tried[k], 65), dtype=np.float64)
    return math.acos(max(-1.0, below / float(tried[32])))
