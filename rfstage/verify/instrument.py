r"""What the instrument adds to a capture: steps of its converter, clipping, distortion of its own.

Steps of size Δ turn a clean sine of amplitude A into harmonics too. Their size follows from the Fourier series of the
rounding error, with Bessel functions taken at their envelope and Gaussian noise of rms σ before the converter:

.. math:: \text{at most } \frac{2\Delta}{\pi^2}\sqrt{\frac{\Delta}{A}}
          \sum_m m^{-3/2} e^{-2(\pi m\sigma/\Delta)^2}

so half a step of noise takes them away, and then the steps are noise like any other. Distortion of the instrument's
input is coherent with the carrier: no averaging shows or lessens it.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.verify.sums import Array, taken

LOOKED_AT = 65536  # samples, for steps and clipping
FINEST = 2**17  # steps within the range: beyond, values count as not quantised
# bits -> how far below the carrier the instrument's own harmonics lie [dB]: common practice, no source
DISTORTION = {8: 45.0, 10: 52.0, 12: 60.0, 14: 70.0, 16: 80.0}
FLAT = 0.02  # of the samples: more than that at the very top, beyond what steps explain, are clipped
FEW_PERIODS = 8  # after which the sampling may begin anew
UNKNOWN_BITS = 8  # where no steps are seen


class Steps(NamedTuple):
    """Steps of a capture: their ``size``, 0 where none are seen, and the ``bits`` that its range would need."""

    size: float
    bits: int | None


def steps_of(samples: NDArray[np.generic]) -> Steps:
    """Return the steps in which a capture's values lie, judged by its beginning.

    Examples
    --------
    >>> values = np.round(100 * np.sin(np.arange(4000) / 7)) * 0.04
    >>> found = steps_of(values)
    >>> round(found.size, 12), found.bits
    (0.04, 8)
    """
    values = np.unique(taken(samples, slice(0, min(samples.size, LOOKED_AT))))
    none = Steps(0.0, None)
    if values.size < 3:
        return none
    reach = float(values[-1] - values[0])
    gaps = np.diff(values)
    gaps = gaps[gaps > 1e-9 * reach]  # closer ones are one value, written twice with rounding between
    size = float(gaps.min())
    if reach / size > FINEST:
        return none
    counted = (values - values[0]) / size
    size *= float(counted[-1] / np.round(counted[-1]))
    counted = (values - values[0]) / size
    if float(np.abs(counted - np.round(counted)).max()) > 0.1:
        return none
    return Steps(size, max(1, math.ceil(math.log2(reach / size + 1))))


def default_distortion(bits: int | None) -> float:
    """Return how far below the carrier the harmonics of an instrument lie [dB] by its bits.

    Common practice, no source. Where no steps are seen the coarsest is taken.
    """
    if bits is None:
        bits = UNKNOWN_BITS
    return next((level for most, level in DISTORTION.items() if bits <= most), DISTORTION[16])


def step_harmonic(size: float, amplitude: float, noise: float) -> float:
    """Return the greatest amplitude that steps give any one harmonic of a sine.

    ``size`` of the steps, ``amplitude`` of the sine and ``noise`` rms, steps' own noise included, in one unit.

    Examples
    --------
    A clean sine over eight bits: about −69 dB below it; with half a step of noise nothing.

    >>> round(20 * math.log10(step_harmonic(1.0, 127.0, 0.0) / 127.0))
    -69
    >>> step_harmonic(1.0, 127.0, 0.6) < 0.001
    True
    """
    if size == 0 or amplitude == 0:
        return 0.0
    dither = max(noise**2 - size**2 / 12, 0.0)  # below the steps' own noise there is none to speak of
    m = np.arange(1, 200)
    series = float((m**-1.5 * np.exp(-2 * (math.pi * m) ** 2 * dither / size**2)).sum())
    return 2 * size / math.pi**2 * math.sqrt(size / amplitude) * series


def clipped(samples: NDArray[np.generic], size: float, a_period: float, *, both: bool) -> bool:
    """Return whether a wave stands flat at its top, or bottom if ``both``, for longer than steps explain.

    ``size`` of the steps and ``a_period`` samples a period; for waves that are near a sine at their crest. Where the
    samples fall on the same few phases of every period, only a flat of several samples in a row tells.
    """
    some = taken(samples, slice(0, min(samples.size, LOOKED_AT)))
    return _flat_top(some, size, a_period) or (both and _flat_top(-some, size, a_period))


def _flat_top(values: Array, size: float, a_period: float) -> bool:
    top, low = float(values.max()), float(values.min())
    reach = max((top - low) / 2, 1e-300)
    at_top = values >= top - max(size / 2, 1e-9 * reach)
    share = math.acos(max(-1.0, 1 - size / reach)) / math.pi  # of a sine that just reaches its highest step
    if _repeats(a_period, values.size):
        edges = np.flatnonzero(np.diff(np.concatenate(([0], at_top.astype(np.int8), [0]))))
        return bool((edges[1::2] - edges[::2]).mean() > 1.5 * share * a_period + 2)
    return bool(at_top.mean() > 2 * share + FLAT)


def _repeats(a_period: float, count: int) -> bool:
    """Return whether a record's samples fall on the same few phases of the carrier throughout."""
    few = a_period * np.arange(1, FEW_PERIODS + 1)
    return bool(np.any(np.abs(few - np.round(few)) * count / few < 0.5))
