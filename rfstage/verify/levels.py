"""Levels as measured: brought back to the line, matched to the harmonics of the carrier, the rest listed apart.

::

    line ── sampler (S21, in dB) ── attenuator ── analyser          level in line = reading + attenuation − S21
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.errors import InputError, OutOfRangeError
from rfstage.quantity import exact_text, show

NEAR_CARRIER = 0.02  # of the frequency: a reading further off is not this stage's carrier
MATCH = 2e-3  # of the frequency: how far a reading may lie from a harmonic, as read off a screen
MOST = 200  # readings in a list; more is a trace
USUAL_UNCERTAINTY = 1.0  # dB at k = 2, of a level against the carrier: common practice, no source
SURE = 2.0  # an amplitude below this many of its uncertainties is not told as a level


class Level(NamedTuple):
    """One order as measured, against the carrier [dBc].

    ``level`` is None where it is not told from nothing; then it lies below ``floor``. ``low`` (None: no lower end)
    and ``high`` are the ends of its uncertainty at k = 2, ``uncertainty`` [dB] the greater of both sides. ``floor``
    is the least level that would have been told, or None where that is not known.
    """

    order: int
    frequency: float
    level: float | None
    low: float | None
    high: float
    floor: float | None
    uncertainty: float | None


class Other(NamedTuple):
    """A reading that is no harmonic of the carrier: frequency [Hz], level [dBc]."""

    frequency: float
    level: float


class Measured(NamedTuple):
    """What one file says of the line: carrier [Hz], its power [W] or None, levels of the orders, others, remarks.

    ``uncorrected`` are the orders that the sampler's response does not reach.
    """

    carrier: float
    power: float | None
    levels: tuple[Level, ...]
    others: tuple[Other, ...]
    uncorrected: tuple[int, ...]
    remarks: tuple[str, ...]


class Reading(NamedTuple):
    """One line of a level list: frequency [Hz], level, and whether it is only an upper bound."""

    frequency: float
    level: float
    below: bool = False


class LevelList(NamedTuple):
    """Readings in ``dBm`` or ``dBc``."""

    name: str
    unit: str
    readings: tuple[Reading, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Response:
    """What a sampler passes from the line to its port: rising frequencies [Hz] and decibels, shape (n,).

    Raises
    ------
    InputError
        If the frequencies do not rise, or it passes more than it takes.
    """

    frequencies: NDArray[np.float64]
    decibels: NDArray[np.float64]
    name: str

    def __post_init__(self) -> None:
        if self.frequencies.size == 0:
            raise InputError(f"{self.name}: the sampler's response is empty")
        if self.frequencies[0] <= 0 or np.any(np.diff(self.frequencies) <= 0):
            raise InputError(f"{self.name}: the frequencies of the sampler's response must be above 0 and rise")
        if np.any(self.decibels > 0.5):
            most = int(np.argmax(self.decibels))
            raise InputError(
                f"{self.name}: the sampler passes {self.decibels[most]:.3g} dB at "
                f"{exact_text(float(self.frequencies[most]), 'Hz')}; wanted its transmission, below 0 dB "
                "(a coupling of 40 dB is -40 dB)"
            )

    def at(self, frequency: float) -> float | None:
        """Return the response [dB] at a frequency [Hz], straight between its points; None beyond its ends."""
        if not self.frequencies[0] <= frequency <= self.frequencies[-1]:
            return None
        return float(np.interp(frequency, self.frequencies, self.decibels))


class Setup(NamedTuple):
    """How it was measured.

    ``attenuation`` [dB] and ``sampler`` between line and instrument; ``probe`` the factor it divides by;
    ``uncertainty`` [dB], k = 2, of a level against the carrier's; ``distortion`` [dB], how far below the carrier the
    instrument's own harmonics lie, or None.
    """

    attenuation: float = 0.0
    sampler: Response | None = None
    probe: float = 1.0
    uncertainty: float = USUAL_UNCERTAINTY
    distortion: float | None = None

    def passes(self, frequency: float) -> float | None:
        """Return what reaches the instrument against the line [dB]; None where the sampler's response ends."""
        sampled = 0.0 if self.sampler is None else self.sampler.at(frequency)
        return None if sampled is None else sampled - self.attenuation


def told(order: int, frequency: float, ratio: float, *, own: float, setup: Setup, shift: float = 0.0) -> Level:
    """Return the level of an order from its amplitude over the carrier's at the instrument.

    Parameters
    ----------
    order, frequency : int, float
        Frequency in Hz.
    ratio, own : float
        Amplitude and its uncertainty at k = 2 from noise, steps and distortion, over the carrier's amplitude [-].
    setup : Setup
        Its ``uncertainty`` comes on top, in decibels.
    shift : float
        From the ratio at the instrument to the level in the line [dB].
    """
    if ratio < SURE * own:
        high = decibels(ratio + own) + shift + setup.uncertainty
        return Level(order, frequency, None, None, high, high, None)
    level = decibels(ratio) + shift
    up = math.hypot(setup.uncertainty, decibels(1 + own / ratio))
    down = math.hypot(setup.uncertainty, decibels(1 - own / ratio))
    floor = decibels(SURE * own) + shift if own > 0 else None
    return Level(order, frequency, level, level - down, level + up, floor, max(up, down))


def decibels(ratio: float) -> float:
    """Return 20 log10 of an amplitude ratio."""
    return 20 * math.log10(ratio)


def measured_levels(levels: LevelList, *, carrier: float, setup: Setup) -> Measured:
    """Return a level list as levels in the line.

    Parameters
    ----------
    levels : LevelList
        In dBm with the carrier among them, or in dBc.
    carrier : float
        The stage's [Hz]; the list's own is the strongest reading within 2 % of it.
    setup : Setup
        Attenuation and sampler count for the carrier's power, and the sampler for the levels.

    Raises
    ------
    InputError
        If the carrier is wanted and missing, readings of one order differ, or there are too many of them.

    Examples
    --------
    >>> some = LevelList("a.csv", "dBm", (Reading(7.1e6, 0.1), Reading(14.2e6, -44.9), Reading(9.0e6, -70.0)))
    >>> found = measured_levels(some, carrier=7.1e6, setup=Setup(attenuation=40.0))
    >>> round(found.levels[0].level, 3), round(found.power, 2), [round(o.level, 1) for o in found.others]
    (-45.0, 10.23, [-70.1])
    """
    if len(levels.readings) > MOST:
        raise InputError(
            f"{levels.name}: holds {len(levels.readings)} readings; wanted {MOST} or fewer: a trace is no list, keep "
            "its peaks"
        )
    near = [r for r in levels.readings if abs(r.frequency / carrier - 1) <= NEAR_CARRIER and not r.below]
    if not near and levels.unit == "dBm":
        raise InputError(
            f"{levels.name}: no reading lies at the stage's carrier, {exact_text(carrier, 'Hz')}; in dBm it is "
            "wanted, as what the others are held against"
        )
    first = max(near, key=lambda r: r.level) if near else Reading(carrier, 0.0)
    at_carrier = _passes(setup, first.frequency, levels.name)
    grouped: dict[int, list[Reading]] = {}
    others, uncorrected = [], []
    for reading in levels.readings:
        order = round(reading.frequency / first.frequency)
        if reading is first:
            continue
        if order >= 2 and abs(reading.frequency - order * first.frequency) <= MATCH * reading.frequency:
            grouped.setdefault(order, []).append(reading)
        elif not reading.below:
            passed = setup.passes(reading.frequency)
            shift = 0.0 if passed is None else at_carrier - passed
            others.append(Other(reading.frequency, reading.level - first.level + shift))
    found = []
    for order, readings in sorted(grouped.items()):
        if len(readings) > 1:
            where = ", ".join(exact_text(r.frequency, "Hz") for r in readings)
            raise InputError(f"{levels.name}: order {order} is given {len(readings)} times ({where}); keep one")
        passed = setup.passes(readings[0].frequency)
        if passed is None:
            uncorrected.append(order)
        else:
            found.append(_level(order, readings[0], first, at_carrier - passed, setup))
    power = None
    if levels.unit == "dBm" and first in levels.readings:
        power = 1e-3 * 10 ** ((first.level - at_carrier) / 10)
    return Measured(first.frequency, power, tuple(found), tuple(others), tuple(uncorrected), ())


def _passes(setup: Setup, frequency: float, name: str) -> float:
    passed = setup.passes(frequency)
    if passed is None:
        assert setup.sampler is not None
        ends = (show(float(setup.sampler.frequencies[k]), "Hz", 4) for k in (0, -1))
        raise InputError(
            f"{name}: the carrier, {show(frequency, 'Hz', 5)}, lies beyond the response of the sampler "
            f"({setup.sampler.name}: {' to '.join(ends)})"
        )
    return passed


def _level(order: int, reading: Reading, first: Reading, shift: float, setup: Setup) -> Level:
    relative = reading.level - first.level
    if reading.below:
        high = relative + shift + setup.uncertainty
        return Level(order, reading.frequency, None, None, high, high, None)
    own = 0.0 if setup.distortion is None else 10 ** (-setup.distortion / 20)
    return told(order, reading.frequency, 10 ** (relative / 20), own=own, setup=setup, shift=shift)


class MeterReadings(NamedTuple):
    """What power meters make of carrier and harmonics, against the carrier's power alone [dB].

    ``thermal``: the power of all of them. ``peak_least`` and ``peak_most``: a peak detector marked in the power of a
    sine, for the phases of the harmonics that give least and most.
    """

    thermal: float
    peak_least: float
    peak_most: float


def meter_readings(levels: Sequence[float]) -> MeterReadings:
    """Return what a thermal meter and a peak detector read, from the levels of the harmonics [dBc].

    A thermal meter takes in the harmonics' power. A peak detector follows the crest, which a harmonic moves by its
    amplitude, either way.

    Raises
    ------
    OutOfRangeError
        If the harmonics together are as large as the carrier: then no crest is the carrier's.

    Examples
    --------
    One harmonic 20 dB down: 1 % of power on a thermal meter, up to 21 % on a peak detector.

    >>> [round(10 ** (decibels / 10), 3) for decibels in meter_readings([-20.0])]
    [1.01, 0.81, 1.21]
    """
    ratios = np.power(10.0, np.asarray(levels, dtype=np.float64) / 20)
    together = float(ratios.sum())
    if together >= 1:
        raise OutOfRangeError("levels", f"harmonics of {together:.3g} times the carrier together", "below 1 times it")
    thermal = 10 * math.log10(1 + float(ratios @ ratios))
    return MeterReadings(thermal, decibels(1 - together), decibels(1 + together))
