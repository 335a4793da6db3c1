r"""Harmonic phasors of a capture, its carrier refined, with standard errors.

.. math:: y_k = A_0 + \sum_{n=1}^{H} \mathrm{Re}\,(A_n e^{jn\omega\tau_k}) + \text{noise}

Mean, phasors and frequency are found together by least squares, over a record that need not hold a whole number of
periods: linear in the phasors, and by a few steps in the frequency, which for white noise is the estimate of least
variance. τ counts from the middle of the record, where the errors of phase and frequency do not depend on each other.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.errors import ConvergenceError, ImpossibleError, InputError
from rfstage.quantity import show
from rfstage.verify.sums import BLOCK, Array, Complex, block_phasors, harmonic_sums, residual, taken

HIGHEST = 20  # orders fitted, where the sampling allows: those above the listed ones would pass for noise
FEWEST_PERIODS = 3.0
FEWEST_SAMPLES = 64
FEWEST_A_PERIOD = 2.5  # samples: fewer show no carrier, let alone a harmonic
_FIRST = 65536  # samples of the first look
_STEPS = 12
_STILL = 1e-6  # rad over half the record: moves below it change a phasor by parts in a billion
_TELLS = 1e7  # condition of the equations above which two of the unknowns are one


class HarmonicFit(NamedTuple):
    """Harmonics of one channel.

    ``frequency`` and its standard error [Hz]; ``phasors`` (H + 1,), peak values at the middle of the record, entry 0
    the mean; ``errors`` (H + 1,), standard errors of the real and of the imaginary part alike, the greater of both;
    ``noise`` rms of what is left; ``left`` its first samples; how many ``samples`` and ``periods``.
    """

    frequency: float
    frequency_error: float
    phasors: Complex
    errors: Array
    noise: float
    left: Array
    samples: int
    periods: float

    @property
    def orders(self) -> int:
        """The highest order fitted."""
        return self.phasors.size - 1


def harmonic_fit(
    samples: NDArray[np.generic], interval: float, *, highest_order: int = HIGHEST, frequency: float | None = None
) -> HarmonicFit:
    """Return carrier frequency, mean and harmonic phasors of evenly spaced samples.

    Parameters
    ----------
    samples : ndarray, shape (n,)
        Any real numbers; may be mapped from a file.
    interval : float
        Between samples [s].
    highest_order : int
        Orders to fit; fewer are fitted where they would pass half the sampling frequency.
    frequency : float or None
        Where to begin [Hz]; None begins at the strongest line.

    Raises
    ------
    InputError
        If the record is too short, or sampled too coarsely, to show a carrier, or nothing in it varies.
    ImpossibleError, ConvergenceError
        If the unknowns can't be told apart, or the frequency does not come to rest.

    Examples
    --------
    >>> t = np.arange(5000) * 1e-9
    >>> fit = harmonic_fit(3 + 2 * np.cos(2 * np.pi * 7.1003e6 * t) + 0.01 * np.cos(2 * np.pi * 14.2006e6 * t), 1e-9)
    >>> round(fit.frequency), np.round(np.abs(fit.phasors[:3]), 6).tolist()
    (7100300, [3.0, 2.0, 0.01])
    """
    if samples.size < FEWEST_SAMPLES:
        raise InputError(f"holds {samples.size} samples; wanted {FEWEST_SAMPLES} or more")
    first = strongest_line(samples, interval) if frequency is None else frequency
    span = samples.size * interval
    _check_record(samples.size, interval, first)
    omega = 2 * math.pi * (first if samples.size < 4 * BLOCK else _by_phase(samples, interval, first))
    resolved = 2 / span
    orders = min(highest_order, math.floor((0.5 / interval - resolved) * 2 * math.pi / omega))
    for _ in range(_STEPS):
        coefficients, step, covariance, square = _solve(samples, interval, omega, orders)
        phasors = np.concatenate((coefficients[orders : orders + 1], 2 * coefficients[orders + 1 :]))
        omega += step
        if abs(step) * span / 2 < _STILL:
            break
        if abs(omega / (2 * math.pi * first) - 1) > 0.5 / (first * span) + 1e-3:
            raise ConvergenceError("no steady carrier is found: the frequency runs away from the strongest line")
    else:
        raise ConvergenceError(f"no steady carrier is found near {show(first, 'Hz', 5)}")
    rest = residual(samples, interval, omega, phasors)
    freedom = samples.size - 2 * orders - 2
    noise = math.sqrt(rest.square / freedom)
    if noise**2 * samples.size < 1e-30 * square:
        noise = math.sqrt(1e-30 * square / samples.size)  # what rounding alone would leave
    return HarmonicFit(
        omega / (2 * math.pi),
        noise * math.sqrt(covariance[-1, -1].real) / (2 * math.pi),
        phasors,
        noise * _spread(covariance, orders),
        noise,
        rest.beginning,
        samples.size,
        span * omega / (2 * math.pi),
    )


def _check_record(count: int, interval: float, frequency: float) -> None:
    a_period = 1 / (frequency * interval)
    if a_period < FEWEST_A_PERIOD:
        raise InputError(
            f"has {a_period:.2g} samples a period of {show(frequency, 'Hz', 4)}; wanted {FEWEST_A_PERIOD:g} or more, "
            "and more than twice as many as the highest order that matters: sample faster"
        )
    if count / a_period < FEWEST_PERIODS:
        raise InputError(
            f"holds {count / a_period:.2g} periods of {show(frequency, 'Hz', 4)}; wanted {FEWEST_PERIODS:g} or more: "
            "record for longer"
        )


def strongest_line(samples: NDArray[np.generic], interval: float) -> float:
    """Return the frequency [Hz] of the strongest line of a record's beginning, its mean left out.

    Raises
    ------
    InputError
        If nothing varies.
    """
    some = taken(samples, slice(0, min(samples.size, _FIRST)))
    some = some - some.mean()
    if not np.any(np.abs(some) > 1e-12 * max(1.0, float(np.abs(samples[:1])[0]))):
        raise InputError("holds the same value throughout: nothing was recorded")
    window = np.hanning(some.size)
    some = some - (some @ window) / window.sum()
    padded = 4 * some.size
    spectrum = np.abs(np.fft.rfft(some * window, padded))
    lowest = 8  # of the padded lines: two of the record's own, where the mean's remains stand
    k = lowest + int(np.argmax(spectrum[lowest:-1]))
    left, peak, right = np.log(np.maximum(spectrum[k - 1 : k + 2], 1e-300))
    bend = left - 2 * peak + right
    offset = 0.5 * (left - right) / bend if bend < 0 else 0.0
    return float((k + max(-0.5, min(0.5, offset))) / (padded * interval))


def _by_phase(samples: NDArray[np.generic], interval: float, frequency: float) -> float:
    """Return a frequency [Hz] bettered by how the carrier's phase goes on along the whole record."""
    times, sums = block_phasors(samples, interval, 2 * math.pi * frequency)
    phase = np.unwrap(np.angle(sums))
    weight = np.abs(sums) ** 2
    middle = (weight @ times) / weight.sum()
    away = times - middle
    slope = (weight * away) @ phase / ((weight * away) @ away)
    return frequency + float(slope) / (2 * math.pi)


def _solve(
    samples: NDArray[np.generic], interval: float, omega: float, orders: int
) -> tuple[Complex, float, Complex, float]:
    """Return the two-sided coefficients, the step in omega [rad/s], (AᴴA)⁻¹ and the sum of squares.

    Unknowns are the coefficients of exp(jnωτ), n from −H to H, which come out in conjugate pairs, and the step.
    """
    sums = harmonic_sums(samples, interval, omega, orders)
    n = np.arange(-orders, orders + 1)
    gram = _of(sums.powers[0], n[np.newaxis, :] - n[:, np.newaxis])
    right = np.where(n >= 0, sums.plain[np.abs(n)], sums.plain[np.abs(n)].conj())
    x = np.linalg.solve(gram, right)
    slopes = 1j * n * x  # of Σ x·exp(jnωτ) with omega, but for the factor τ
    timed = np.where(n >= 0, sums.timed[np.abs(n)], sums.timed[np.abs(n)].conj())
    beside = _of(sums.powers[1], n[np.newaxis, :] - n[:, np.newaxis]) @ slopes
    own = (slopes.conj() @ _of(sums.powers[2], n[np.newaxis, :] - n[:, np.newaxis]) @ slopes).real
    full = np.empty((n.size + 1, n.size + 1), dtype=np.complex128)
    full[:-1, :-1], full[:-1, -1], full[-1, :-1], full[-1, -1] = gram, beside, beside.conj(), own
    scale = np.sqrt(np.diag(full).real)
    if not np.all(scale > 0):
        raise ConvergenceError("no steady carrier is found: nothing in the record goes with the strongest line")
    scaled = full / np.outer(scale, scale)
    if np.linalg.cond(scaled) > _TELLS:
        raise ImpossibleError("the record is too short to tell its harmonics apart: record for longer")
    inverse = np.linalg.inv(scaled) / np.outer(scale, scale)
    found = inverse @ np.concatenate((right, [(slopes.conj() @ timed).real]))
    return found[:-1], float(found[-1].real), inverse, sums.square


def _of(powers: Complex, difference: NDArray[np.int64]) -> Complex:
    """Return Σ τᵏ·exp(jmωτ) for differences m of either sign."""
    values = powers[np.abs(difference)]
    return np.where(difference >= 0, values, values.conj())


def _spread(covariance: Complex, orders: int) -> Array:
    """Return the standard errors, for noise of 1, of mean and phasors: of each, its worse part."""
    middle = orders
    errors = [math.sqrt(covariance[middle, middle].real)]
    for n in range(1, orders + 1):
        up, down = middle + n, middle - n
        both = covariance[up, up].real + covariance[down, down].real
        across = 2 * abs(covariance[up, down])
        errors.append(math.sqrt(both + across))
    return np.array(errors)
