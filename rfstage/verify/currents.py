r"""A captured device current: conduction angle and shape of the pulse.

The samples are folded onto one cycle and averaged. On the outer flanks, below half of the crest, the pulse is that of
the device's power law whatever saturation does to its top:

.. math:: i^{1/p} = \alpha\cos x + \beta\sin x + \gamma, \qquad \cos\theta = -\gamma/\sqrt{\alpha^2 + \beta^2}

which is linear in the three unknowns. A second route is the ratio of fundamental to direct current, which holds for
a pulse with its whole crest.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.errors import InputError, OutOfRangeError
from rfstage.pulse import angle_from_ratio, pulse_coefficients
from rfstage.verify.capture import Channel
from rfstage.verify.phasors import HarmonicFit
from rfstage.verify.sums import Array, Grid, taken

BINS = 256  # of a cycle
FLANK = (0.1, 0.5)  # of the crest: where the flanks are read
FEWEST_ON_FLANKS = 6
NEVER_OFF = 0.05  # of the crest: a current that stays above it flows throughout
TURNED = 0.05  # of the crest: a flank that falls back by so much is over
TOP = 0.95  # of a flank that turns back: nearer to its top saturation has set in


class CurrentPulse(NamedTuple):
    """A current pulse as captured.

    ``conduction_angle_deg``, the full angle from the flanks, and its standard error; ``angle_from_ratio_deg``, the
    same from fundamental over direct current, None where the ratio belongs to no angle; ``peak`` and ``mean`` [A],
    ``fundamental_to_dc``; ``shape_misfit``: rms distance from the power law's pulse of that angle over the peak;
    ``ratios``: orders 2 … against the fundamental, measured; ``phase_deg`` and ``current`` [A] of the folded cycle.
    """

    conduction_angle_deg: float
    angle_error_deg: float
    angle_from_ratio_deg: float | None
    peak: float
    mean: float
    fundamental_to_dc: float
    shape_misfit: float
    ratios: tuple[float, ...]
    phase_deg: Array
    current: Array


def folded(channel: Channel, interval: float, frequency: float) -> tuple[Array, Array]:
    """Return phase [rad] and mean of the samples in each part of the cycle, and leave out the parts without any."""
    grid = Grid(channel.samples.size, interval)
    sums, counts, phases = np.zeros(BINS), np.zeros(BINS), np.zeros(BINS)
    for part, length, times in grid.rows():
        turns = frequency * (times[:, np.newaxis] + interval * np.arange(length)).reshape(-1)
        turns -= np.floor(turns)
        place = np.minimum((turns * BINS).astype(np.int64), BINS - 1)
        sums += np.bincount(place, taken(channel.samples, part), BINS)
        phases += np.bincount(place, turns, BINS)
        counts += np.bincount(place, minlength=BINS)
    some = counts > 0
    return 2 * math.pi * phases[some] / counts[some], sums[some] / counts[some]


def current_pulse(
    channel: Channel, interval: float, fit: HarmonicFit, *, exponent: float, scale: float = 1.0
) -> CurrentPulse:
    """Return conduction angle and shape of a captured current.

    Parameters
    ----------
    channel, interval, fit : Channel, float, HarmonicFit
        The record, its interval [s] and its harmonics.
    exponent : float
        Power law of the device [-].
    scale : float
        From the channel's numbers to amperes.

    Raises
    ------
    InputError
        If the current has no flanks to read an angle from.
    """
    x, values = folded(channel, interval, fit.frequency)
    if float(fit.phasors[0].real) * scale < 0 and -values.min() * scale > values.max() * scale:
        scale = -scale  # the probe was the other way round
    values = values * scale
    mean = float(fit.phasors[0].real) * scale
    law = _Law(exponent, channel.name)
    if values.min() > NEVER_OFF * values.max():
        half, error, centre, base = math.pi, 0.0, math.atan2(*_first(x, values)), 0.0
    else:
        resting = _resting(values)
        base = float(np.median(values[resting[resting.size // 4 : -(resting.size // 4) or None]]))
        half, error, centre = law.angle(x, values - base, resting)
    crest = float(values.max()) - base
    there = (np.cos(x - centre) - math.cos(half)) / (1 - math.cos(half))
    ideal = np.where(np.cos(x - centre) > math.cos(half), np.maximum(there, 0.0), 0.0) ** exponent
    best = float(ideal @ (values - base)) / float(ideal @ ideal)
    first, direct = float(abs(fit.phasors[1] * scale)), mean - base
    ratio = first / direct if direct > 0 else math.inf
    return CurrentPulse(
        2 * math.degrees(half),
        2 * math.degrees(error),
        _by_ratio(ratio, exponent),
        crest,
        direct,
        ratio,
        float(np.sqrt(np.mean((values - base - best * ideal) ** 2))) / crest,
        tuple(float(abs(p * scale) / first) for p in fit.phasors[2:11]),
        np.degrees(x),
        values,
    )


def _first(x: Array, values: Array) -> tuple[float, float]:
    return float(np.sin(x) @ values), float(np.cos(x) @ values)


def _resting(values: Array) -> NDArray[np.int64]:
    """Return the places, in turn, of the longest stretch of the cycle in which hardly anything flows."""
    low = values - values.min() < FLANK[0] * (values.max() - values.min())
    begins = np.flatnonzero(low & ~np.roll(low, 1))
    if begins.size == 0:
        return np.arange(values.size)
    longest = np.arange(0)
    for begin in begins:
        turned = np.roll(low, -begin)
        length = int(np.argmin(turned)) if not turned.all() else values.size
        if length > longest.size:
            longest = (begin + np.arange(length)) % values.size
    return longest


class _Law(NamedTuple):
    """The device's power law on the flanks of a pulse, of the channel with this name."""

    exponent: float
    name: str

    def angle(self, x: Array, values: Array, resting: NDArray[np.int64]) -> tuple[float, float, float]:
        """Return half angle, its standard error and the pulse's centre [rad]."""
        awake = (resting[-1] + 1 + np.arange(values.size - resting.size)) % values.size
        crest = float(values.max())
        on = np.concatenate((self._flank(values, awake, crest), self._flank(values, awake[::-1], crest)))
        if on.size < FEWEST_ON_FLANKS:
            raise InputError(
                f"channel {self.name}: the current shows too little of its flanks to read an angle from "
                f"({on.size} parts of a cycle, wanted {FEWEST_ON_FLANKS}): sample faster or record for longer"
            )
        on = np.unique(on)
        columns = np.stack([np.cos(x[on]), np.sin(x[on]), np.ones(on.size)], axis=1)
        wanted = values[on] ** (1 / self.exponent)
        (a, b, c), *_ = np.linalg.lstsq(columns, wanted, rcond=None)
        reach = math.hypot(a, b)
        cosine = -c / reach
        if not -1 < cosine < 1:
            raise InputError(f"channel {self.name}: the current's flanks are those of no pulse of the device's law")
        rest = wanted - columns @ np.array([a, b, c])
        spread = float(rest @ rest) / (on.size - 3) * np.linalg.inv(columns.T @ columns)
        slope = np.array([-cosine * a / reach, -cosine * b / reach, -1.0]) / reach  # of cos θ with a, b, c
        error = math.sqrt(slope @ spread @ slope) / math.sqrt(1 - cosine**2)
        return math.acos(cosine), error, math.atan2(b, a)

    @staticmethod
    def _flank(values: Array, inwards: NDArray[np.int64], crest: float) -> NDArray[np.int64]:
        """Return the places of one outer flank, going inwards: to half of the crest, or to where it turns back."""
        wave = values[inwards]
        highest = np.maximum.accumulate(wave)
        over = np.flatnonzero((wave > FLANK[1] * crest) | (wave < highest - TURNED * crest))
        end = int(over[0]) if over.size else wave.size
        top = float(wave[:end].max()) if end else 0.0
        rising = wave[: int(np.argmax(wave[:end])) + 1] if end else wave[:0]
        good = (rising > FLANK[0] * crest) & (rising < FLANK[1] * crest) & (rising <= TOP * top)
        found: NDArray[np.int64] = inwards[: rising.size][good]
        return found


def _by_ratio(ratio: float, exponent: float) -> float | None:
    try:
        return 2 * math.degrees(float(angle_from_ratio(ratio, exponent=exponent)))
    except OutOfRangeError:
        return None


def expected_ratios(conduction_angle_deg: float, exponent: float) -> tuple[float, ...]:
    """Return orders 2 to 10 over the fundamental of the power law's pulse of a full angle [deg], unsigned."""
    a = np.abs(pulse_coefficients(math.radians(conduction_angle_deg / 2), highest_order=10, exponent=exponent))
    return tuple((a[2:] / a[1]).tolist())
