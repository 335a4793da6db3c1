r"""The current pulse of a stage that conducts for part of each cycle.

::

    current/peak       1 ┤      ╭─╮            i(x) = [(cos x − cos θ)/(1 − cos θ)]^p,  |x| < θ
                         │     ╱   ╲           θ  half angle [rad];  2θ is the conduction angle
                       0 ┼────╯─────╰────      p  exponent of the device's law, 1 = linear
                        −π   −θ  0  θ    π

The Fourier series is ``i(x) = a0 + Σ a_n cos(n x)``: coefficients are signed and the peak is 1. For the
linear law they are closed forms, rewritten so that no near-equal terms are subtracted at either end; the
printed form ``2 (sin nθ cos θ − n cos nθ sin θ)/(π n (n²−1)(1−cos θ))`` loses all digits at small angles.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from rfstage.errors import OutOfRangeError

_ODD_TERMS, _CUBIC_TERMS = 10, 13  # of the power series used below one radian: the next terms are under 1e-17


def operating_class(conduction_angle_deg: float) -> str:
    """Return the letter of the class: A at 360°, AB above 180°, B at 180°, C below.

    Examples
    --------
    >>> [operating_class(angle) for angle in (360, 270, 180, 120)]
    ['A', 'AB', 'B', 'C']
    """
    if conduction_angle_deg >= 360:
        return "A"
    if conduction_angle_deg > 180:
        return "AB"
    return "B" if conduction_angle_deg == 180 else "C"


def pulse_coefficients(half_angle: ArrayLike, *, highest_order: int, exponent: float = 1.0) -> NDArray[np.float64]:
    r"""Return the Fourier coefficients of the current pulse, divided by its peak.

    Parameters
    ----------
    half_angle : array_like, shape (...)
        Half of the conduction angle [rad], in (0, π].
    highest_order : int
        Highest harmonic order wanted, 0 or more.
    exponent : float
        Power law of the device [-], in [1, 3]: 1 linear, 3/2 space charge, 2 square law.

    Returns
    -------
    ndarray, shape (..., highest_order + 1)
        Signed coefficients ``a0, a1, …`` [-]. Against 50-digit arithmetic the error is below 1e-13 of
        ``a1`` for exponent 1 and below 1e-12 otherwise, from 0.001° to 360° and orders to 25.

    Raises
    ------
    OutOfRangeError
        If an angle, the order or the exponent is outside its range.

    Notes
    -----
    The pulse of an ideal device: saturation and knee are not in it.

    References
    ----------
    The reduced-cosine coefficients are in every text on power amplifiers; the bracket of the printed form is
    ``−sin²θ d/dθ (sin nθ/sin θ)``, a Gegenbauer polynomial, whose recurrence is the one used from order 2 on.

    Examples
    --------
    Half a cycle: the mean is 1/π, the fundamental one half, the third harmonic absent.

    >>> [round(float(a), 4) + 0.0 for a in pulse_coefficients(math.pi / 2, highest_order=3)]
    [0.3183, 0.5, 0.2122, 0.0]
    """
    theta = np.asarray(half_angle, dtype=np.float64)
    if not np.all((theta > 0) & (theta <= math.pi)):
        raise OutOfRangeError("half_angle", half_angle, "in (0, pi] rad", "is it in degrees?")
    if highest_order < 0:
        raise OutOfRangeError("highest_order", highest_order, "0 or more")
    if not 1 <= exponent <= 3:
        raise OutOfRangeError("exponent", exponent, "from 1 to 3")
    if exponent == 1:
        return _linear(theta, highest_order)
    return _power_law(theta, highest_order, exponent)


def _linear(theta: NDArray[np.float64], highest_order: int) -> NDArray[np.float64]:
    """Evaluate closed forms for a0 and a1, then (n + 2) a_{n+1} = 2 n cos θ a_n − (n − 2) a_{n−1} from a2 on."""
    t = theta.reshape(-1)
    out = np.empty((highest_order + 1, t.size))  # an order a row: every pass below runs through memory in a line
    sine_half, cosine_half = np.sin(t / 2), np.cos(t / 2)
    sine, cosine = 2 * sine_half * cosine_half, 1 - 2 * sine_half * sine_half
    small = t < 1
    scale = 2 * math.pi * np.where(small, 1.0, sine_half * sine_half)
    first_two = (sine - t * cosine, t - sine * cosine)[: highest_order + 1]
    series = _by_series(t[small], sine_half[small])
    for order, numerator in enumerate(first_two):
        np.divide(numerator, scale, out=out[order])
        out[order, small] = series[order]
    if highest_order >= 2:
        out[2] = (8 / (3 * math.pi)) * sine_half * cosine_half * cosine_half * cosine_half
    for n in range(2, highest_order):
        np.multiply(cosine, out[n], out=out[n + 1])
        out[n + 1] *= 2 * n / (n + 2)
        out[n + 1] -= ((n - 2) / (n + 2)) * out[n - 1]
    return np.moveaxis(out.reshape(highest_order + 1, *theta.shape), 0, -1)


def _by_series(t: NDArray[np.float64], sine_half: NDArray[np.float64]) -> tuple[NDArray[np.float64], ...]:
    """Return a0 and a1 below one radian: sin t − t cos t = t³/3 · S(t²), 2t − sin 2t = (2t)³/6 · T(4t²)."""
    sinc = 2 * sine_half / t
    scale = 2 * t / (3 * math.pi * sinc**2)
    return scale * _odd_series(t * t), 2 * scale * _cubic_series(4 * t * t)


def _odd_series(square: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return 3 (sin t − t cos t)/t³ = Σ (−1)^k 3 (2k+2)/(2k+3)! t^{2k}."""
    total = np.zeros_like(square)
    for k in range(_ODD_TERMS - 1, -1, -1):
        total = 3.0 * (2 * k + 2) / math.factorial(2 * k + 3) - square * total
    return total


def _cubic_series(square: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return 6 (u − sin u)/u³ = Σ (−1)^k 6/(2k+3)! u^{2k}."""
    total = np.zeros_like(square)
    for k in range(_CUBIC_TERMS - 1, -1, -1):
        total = 6.0 / math.factorial(2 * k + 3) - square * total
    return total


def _power_law(theta: NDArray[np.float64], highest_order: int, exponent: float) -> NDArray[np.float64]:
    """Integrate with the double-exponential rule in δ = θ − x, where the integrand is a plain product."""
    half_count = 60 + 4 * highest_order
    step = 7.2 / (2 * half_count)
    u = step * np.arange(-half_count, half_count + 1)
    # δ/θ runs from 0 to 1 as 1/(1 + exp(−π sinh u)), with full relative accuracy near 0
    tail = np.exp(-math.pi * np.sinh(u))
    fraction = 1 / (1 + tail)
    weight = step * math.pi * np.cosh(u) * tail * fraction**2
    angles = theta.reshape(-1, 1)
    out = np.empty((angles.shape[0], highest_order + 1))
    orders = np.arange(highest_order + 1)[:, np.newaxis]
    scale = np.where(np.arange(highest_order + 1) == 0, 1.0, 2.0) / math.pi
    for row, angle in enumerate(angles[:, 0]):
        delta = angle * fraction
        # sin(θ − δ/2) sin(δ/2)/sin²(θ/2); past a quarter cycle by the supplement, so that 360° keeps its digits
        turned = angle - delta / 2 if angle < math.pi / 2 else (math.pi - angle) + delta / 2
        product = np.sin(turned) * np.sin(delta / 2) / math.sin(angle / 2) ** 2
        pulse = product**exponent * weight * angle
        out[row] = scale * (np.cos(orders * (angle * (1 - fraction))) @ pulse)
    return out.reshape(*theta.shape, highest_order + 1)


def angle_from_ratio(fundamental_to_dc: ArrayLike, *, exponent: float = 1.0) -> NDArray[np.float64]:
    """Return the half angle from the ratio of the fundamental's peak to the direct current.

    Parameters
    ----------
    fundamental_to_dc : array_like, shape (...)
        Ratio ``a1/a0`` [-]: below 2, and at least its value at 360° (1 for exponent 1).
    exponent : float
        Power law of the device [-], in [1, 3].

    Returns
    -------
    ndarray, shape (...)
        Half angle [rad]. Near 2 the ratio falls as the square of the angle, so its last digits decide.

    Raises
    ------
    OutOfRangeError
        If a ratio belongs to no angle.

    Examples
    --------
    >>> half = angle_from_ratio(math.pi / 2)
    >>> round(float(np.degrees(2 * half)), 9)
    180.0
    """
    ratio = np.asarray(fundamental_to_dc, dtype=np.float64)
    at_full = pulse_coefficients(math.pi, highest_order=1, exponent=exponent)
    lowest = float(at_full[1] / at_full[0])
    if not np.all((ratio >= lowest * (1 - 1e-15)) & (ratio < 2)):
        raise OutOfRangeError("fundamental_to_dc", fundamental_to_dc, f"from {lowest:.6g} (360°) to below 2 (0°)")
    low, high = np.full(ratio.shape, 1e-9), np.full(ratio.shape, math.pi)
    for _ in range(60):
        middle = (low + high) / 2
        a = pulse_coefficients(middle, highest_order=1, exponent=exponent)
        wider = a[..., 1] / a[..., 0] > ratio
        low, high = np.where(wider, middle, low), np.where(wider, high, middle)
    return np.asarray((low + high) / 2)
