"""A waveform capture: harmonics of the voltage at the load as levels, with the instrument's share in the uncertainty.

::

    line or load ── sampler, attenuator, probe ── converter of so many bits ── samples
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.errors import InputError
from rfstage.load import Load
from rfstage.quantity import show, show_orders
from rfstage.verify.instrument import Steps, clipped, default_distortion, step_harmonic, steps_of
from rfstage.verify.levels import NEAR_CARRIER, Measured, Other, Setup, decibels, told
from rfstage.verify.phasors import HarmonicFit, harmonic_fit
from rfstage.verify.sums import Array

LISTED = 10  # the highest order listed
SECOND_CARRIER = 6.0  # dB below the carrier: a line above that, at no harmonic, is a carrier of its own
STANDS_OUT = 5.0  # of the residual's own lines' rms: what noise alone does once in a hundred thousand million lines
WINDOW = (0.35875, -0.48829, 0.14128, -0.01168)  # Blackman-Harris, four terms
OTHERS = 8  # lines listed at most
FOLDED = 30  # the highest order looked at for folding back
_CONFIDENT = 2.0  # k


class Channel(NamedTuple):
    """One channel: its ``name``, ``unit`` (V, A, or empty for counts) and evenly spaced ``samples``."""

    name: str
    unit: str
    samples: NDArray[np.generic]


@dataclass(frozen=True, slots=True, eq=False)
class Capture:
    """A record of one or two channels with one interval [s]; ``remarks`` say what was assumed in reading it."""

    name: str
    interval: float
    channels: tuple[Channel, ...]
    remarks: tuple[str, ...] = ()


class Analysed(NamedTuple):
    """One channel analysed: the fit, the steps seen, the distortion taken [dB], whether it is clipped."""

    fit: HarmonicFit
    steps: Steps
    distortion: float
    clipped: bool

    def uncertainty(self, order: int) -> float:
        """Return the uncertainty at k = 2 of an order's amplitude, in the channel's unit.

        Distortion of steps and instrument has a bound and an unknown phase, and does not average: its standard
        uncertainty is the bound over √2, beside the standard error that noise leaves. Where it is less, twice that
        error and the bounds themselves added up, which no phase exceeds.
        """
        carrier = abs(self.fit.phasors[1])
        random = _CONFIDENT * float(self.fit.errors[order])
        stepped = step_harmonic(self.steps.size, carrier, self.fit.noise)
        own = carrier * 10 ** (-self.distortion / 20) if order > 1 else 0.0
        return min(math.hypot(random, math.sqrt(2) * stepped, math.sqrt(2) * own), random + stepped + own)


def analysed(capture: Capture, channel: Channel, *, carrier: float, distortion: float | None, both: bool) -> Analysed:
    """Return a channel's harmonics, and what the instrument did to it.

    ``carrier`` is the stage's [Hz], ``distortion`` the instrument's [dB] or None for the usual one of its bits;
    ``both`` looks for clipping at the bottom, too.

    Raises
    ------
    InputError
        If the record shows no carrier, another one, or two.
    """
    where = f"{capture.name}: channel {channel.name}"
    try:
        fit = harmonic_fit(channel.samples, capture.interval)
    except InputError as error:
        raise InputError(*(f"{where} {problem}" for problem in error.problems)) from None
    if abs(fit.frequency / carrier - 1) > NEAR_CARRIER:
        raise InputError(
            f"{where}: the strongest line lies at {show(fit.frequency, 'Hz', 5)}, and the stage's carrier at "
            f"{show(carrier, 'Hz', 5)} (is the time in the right unit?)"
        )
    steps = steps_of(channel.samples)
    a_period = 1 / (fit.frequency * capture.interval)
    return Analysed(
        fit,
        steps,
        default_distortion(steps.bits) if distortion is None else distortion,
        clipped(channel.samples, steps.size, a_period, both=both),
    )


def capture_levels(
    capture: Capture, channel: Channel, *, carrier: float, load: Load, line: float, setup: Setup
) -> tuple[Measured, Analysed]:
    """Return a voltage channel as levels, and its analysis.

    Parameters
    ----------
    capture, channel : Capture, Channel
        The record and its channel at the load.
    carrier : float
        The stage's [Hz].
    load : Load
        What the voltage stands across where neither sampler nor attenuator is given.
    line : float
        Resistance of the instrument's input behind one of those [ohm].
    setup : Setup
        How it was measured; ``distortion`` None takes the usual one of the instrument's bits.

    Raises
    ------
    InputError
        As `analysed`; or if the sampler does not reach the carrier.
    """
    found = analysed(capture, channel, carrier=carrier, distortion=setup.distortion, both=True)
    fit = found.fit
    direct = setup.sampler is None and setup.attenuation == 0
    base = setup.passes(fit.frequency)
    if base is None:
        raise InputError(
            f"{capture.name}: the carrier, {show(fit.frequency, 'Hz', 5)}, lies beyond the sampler's response"
        )
    size = abs(fit.phasors[1])

    def conductance(frequency: float) -> float:
        return float((1 / complex(load.impedance(frequency))).real) if direct else 1 / line

    def level_at(frequency: float, passed: float) -> float:
        return base - passed + 10 * math.log10(conductance(frequency) / conductance(fit.frequency))

    levels, uncorrected = [], []
    for order in range(2, min(LISTED, fit.orders) + 1):
        frequency = order * fit.frequency
        passed = setup.passes(frequency)
        if passed is None:
            uncorrected.append(order)
            continue
        own = found.uncertainty(order) / size
        ratio = abs(fit.phasors[order]) / size
        levels.append(told(order, frequency, ratio, own=own, setup=setup, shift=level_at(frequency, passed)))
    others = []
    for frequency, amplitude in other_lines(fit, capture.interval):
        passed = setup.passes(frequency)
        shift = 0.0 if passed is None else level_at(frequency, passed)
        others.append(Other(frequency, decibels(amplitude / size) + shift))
    strong = [o for o in others if o.level > -SECOND_CARRIER]
    if strong:
        raise InputError(
            f"{capture.name}: channel {channel.name} holds two carriers, {show(fit.frequency, 'Hz', 5)} and "
            f"{show(strong[0].frequency, 'Hz', 5)}; wanted one"
        )
    power = None
    if channel.unit == "V":
        volts = size * setup.probe * 10 ** (-base / 20)
        power = volts**2 / 2 * conductance(fit.frequency)
    remarks = [*capture.remarks, *_remarks(channel, found, capture.interval)]
    for other in others:
        folded = folded_from(fit, capture.interval, other.frequency)
        if folded is not None:
            remarks.append(
                f"the line at {show(other.frequency, 'Hz', 5)} lies where order {folded} folds back: sample faster, or "
                "filter before the instrument"
            )
    return Measured(fit.frequency, power, tuple(levels), tuple(others), tuple(uncorrected), tuple(remarks)), found


def _remarks(channel: Channel, found: Analysed, interval: float) -> list[str]:
    fit, remarks = found.fit, []
    a_period = fit.samples / fit.periods
    if found.clipped:
        remarks.append(
            f"channel {channel.name} is clipped: its harmonics are the instrument's; lower the sensitivity and record "
            "again"
        )
    if fit.orders < LISTED:
        beyond = show_orders(range(fit.orders + 1, LISTED + 1))
        remarks.append(
            f"channel {channel.name} has {a_period:.3g} samples a period: orders {beyond} can't be seen; sample faster"
        )
    onto = folded_orders(fit, interval)
    if onto:
        pairs = ", ".join(f"{high} onto {low}" for high, low in onto)
        remarks.append(
            f"channel {channel.name} is sampled so that orders fold back onto others ({pairs}): move the sample rate a "
            "little"
        )
    return remarks


def folded_orders(fit: HarmonicFit, interval: float) -> list[tuple[int, int]]:
    """Return orders above half the sample rate that fall onto a fitted order, each with that order."""
    found = []
    for high in range(fit.orders + 1, FOLDED + 1):
        turns = high * fit.frequency * interval
        seen = abs(turns - round(turns)) / interval / fit.frequency
        low = round(seen)
        if 1 <= low <= min(fit.orders, LISTED) and abs(seen - low) * fit.periods < 2:
            found.append((high, low))
    return found


def folded_from(fit: HarmonicFit, interval: float, frequency: float) -> int | None:
    """Return the least order above half the sample rate that is seen at a frequency [Hz], or None."""
    for order in range(fit.orders + 1, FOLDED + 1):
        turns = order * fit.frequency * interval
        seen = abs(turns - round(turns)) / interval
        if abs(seen - frequency) * fit.samples * interval < 1:
            return order
    return None


def other_lines(fit: HarmonicFit, interval: float) -> list[tuple[float, float]]:
    """Return frequency [Hz] and amplitude of lines in what the harmonics leave, the strongest first.

    Seen through a window of four cosines, whose side lobes lie 92 dB down; lines within its main lobe of the carrier or
    a harmonic are noise of those, and are left out.
    """
    left = fit.left
    x = 2 * math.pi * np.arange(left.size) / left.size
    window = sum(a * np.cos(k * x) for k, a in enumerate(WINDOW))
    spectrum: Array = np.abs(np.fft.rfft((left - left.mean()) * window)) * 2 / np.sum(window)
    frequencies = np.fft.rfftfreq(left.size, interval)
    usual = float(np.sqrt(np.median(spectrum**2) / math.log(2)))
    n = np.round(frequencies / fit.frequency)
    lobe = len(WINDOW) / (left.size * interval)
    # what rounding of the numbers leaves of a clean record, a ten thousandth of a millionth of it, is no line
    least = max(STANDS_OUT * usual, 1e-10 * abs(fit.phasors[1]))
    free = (np.abs(frequencies - n * fit.frequency) > lobe) & (spectrum > least)
    free[[0, -1]] = False
    found: list[tuple[float, float]] = []
    for k in np.argsort(spectrum)[::-1]:
        if spectrum[k] <= least or len(found) == OTHERS:
            break
        if free[k] and all(abs(frequencies[k] - f) > 1.5 * lobe for f, _ in found):
            offset, peak = _crest(spectrum[k - 1 : k + 2])
            found.append((float(frequencies[k] + offset / (left.size * interval)), peak))
    return found


def _crest(three: Array) -> tuple[float, float]:
    """Return place, from the middle one, and height of the parabola through the logarithms of three numbers."""
    a, b, c = np.log(np.maximum(three, 1e-300)).tolist()
    bend = a - 2 * b + c
    offset = max(-0.5, min(0.5, 0.5 * (a - c) / bend)) if bend < 0 else 0.0
    return offset, math.exp(b - 0.25 * (a - c) * offset)
