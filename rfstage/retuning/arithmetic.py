r"""Bench arithmetic: what a dip meter or an analyser's frequencies say of a coil, a Q or a coupling.

::

    ┌──◠◠──┐         ┌──◠◠──┐          f1 = 1/(2π √(L Cs))          alone
    │  L   │         │  L   │          f2 = 1/(2π √(L (Cs + Ca)))   with a known capacitor across it
    ├──┤├──┤         ├──┤├──┤
       Cs            ├──┤├──┤  Ca

    symbol  name                unit
    ------  ------------------  ----
    L       inductance          H
    Cs      stray_capacitance   F      self-capacitance, fixture and meter together
    Ca      added               F
    k       coupling            -      M/√(L1 L2)

All arguments are arrays that broadcast.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from rfstage.errors import OutOfRangeError

Array = NDArray[np.float64]


class CoilFound(NamedTuple):
    """Inductance [H] and the stray capacitance across it [F], arrays of one shape."""

    inductance: Array
    stray_capacitance: Array


class Resonance(NamedTuple):
    """Centre [Hz], distance of the half-power points [Hz] and Q [-], arrays of one shape."""

    centre: Array
    bandwidth: Array
    q: Array


class QShare(NamedTuple):
    """Q [-] of what is coupled to a circuit alone, and the share of the power that reaches it [-]."""

    external_q: Array
    efficiency: Array


class Coupling(NamedTuple):
    """Coefficient of coupling [-], and the frequency [Hz] to which both circuits are tuned by themselves."""

    coupling: Array
    centre: Array


class Bench(NamedTuple):
    """What was found of one stage at the bench; None where it was not asked."""

    coil: CoilFound | None = None
    loaded: Resonance | None = None
    unloaded: Resonance | None = None
    shared: QShare | None = None
    coupling: Coupling | None = None


def coil_from_resonances(alone: ArrayLike, with_added: ArrayLike, *, added: ArrayLike) -> CoilFound:
    r"""Return inductance and stray capacitance from two resonances.

    .. math:: C_s = C_a f_2^2 / (f_1^2 - f_2^2), \quad L = (1/f_2^2 - 1/f_1^2) / (4 \pi^2 C_a)

    Parameters
    ----------
    alone, with_added : array_like, shape (...)
        Resonance without and with the known capacitor across the coil [Hz]; the second is the lower.
    added : array_like, shape (...)
        The known capacitor [F], above 0.

    Returns
    -------
    CoilFound

    Raises
    ------
    OutOfRangeError
        If a value is not above 0, or the second resonance is not below the first.

    Notes
    -----
    The stray capacitance is the difference of nearly equal numbers where the added capacitor is small beside it: one
    of at least its own size keeps the error of a frequency from growing more than about threefold.

    Examples
    --------
    50 µH with 10 pF of its own, then with 30 pF more:

    >>> coil, stray = coil_from_resonances(7.1176e6, 3.5588e6, added=30e-12)
    >>> round(float(coil) * 1e6, 1), round(float(stray) * 1e12, 1)
    (50.0, 10.0)
    """
    f1, f2 = _above_zero("alone", alone, "Hz"), _above_zero("with_added", with_added, "Hz")
    ca = _above_zero("added", added, "F")
    if np.any(f2 >= f1):
        raise OutOfRangeError(
            "with_added", f"{_first(f2):.6g} Hz", f"below the resonance alone, {_first(f1):.6g} Hz", "swapped?"
        )
    stray = ca * f2**2 / ((f1 - f2) * (f1 + f2))
    inductance = (1 / f2 - 1 / f1) * (1 / f2 + 1 / f1) / (4 * math.pi**2 * ca)
    return CoilFound(*_one_shape(inductance, stray))


def resonance_from_half_power(low: ArrayLike, high: ArrayLike) -> Resonance:
    r"""Return centre, bandwidth and Q from the two half-power (−3 dB) frequencies of one tuned circuit.

    .. math:: f_0 = \sqrt{f_1 f_2}, \quad Q = f_0 / (f_2 - f_1)

    Parameters
    ----------
    low, high : array_like, shape (...)
        Half-power frequencies [Hz], the second the higher.

    Returns
    -------
    Resonance
        Exact for a single series or parallel circuit; a loaded Q with the load coupled, nearly the unloaded one
        with meter and source coupled so loosely that looser changes nothing.

    Raises
    ------
    OutOfRangeError
        If a value is not above 0, or the second is not the higher.

    Examples
    --------
    >>> found = resonance_from_half_power(7.0764e6, 7.1237e6)
    >>> round(float(found.bandwidth)), round(float(found.q))
    (47300, 150)
    """
    f1, f2 = _rising(low, high)
    centre = np.sqrt(f1 * f2)
    return Resonance(*_one_shape(centre, f2 - f1, centre / (f2 - f1)))


def q_shared(loaded: ArrayLike, unloaded: ArrayLike) -> QShare:
    r"""Return the external Q, and how much of the power the load gets, from loaded and unloaded Q.

    .. math:: 1/Q_L = 1/Q_U + 1/Q_e, \quad \eta = 1 - Q_L/Q_U

    Parameters
    ----------
    loaded, unloaded : array_like, shape (...)
        Q with and without the load [-]; the first is the lower.

    Returns
    -------
    QShare

    Raises
    ------
    OutOfRangeError
        If a value is not above 0, or the loaded Q is not the lower.

    Examples
    --------
    >>> external, efficiency = q_shared(50, 100)
    >>> float(external), float(efficiency)
    (100.0, 0.5)
    """
    ql, qu = _above_zero("loaded", loaded, ""), _above_zero("unloaded", unloaded, "")
    if np.any(ql >= qu):
        raise OutOfRangeError("loaded", f"{_first(ql):.6g}", f"below the unloaded Q, {_first(qu):.6g}", "swapped?")
    return QShare(*_one_shape(ql * qu / (qu - ql), 1 - ql / qu))


def coupling_from_peaks(low: ArrayLike, high: ArrayLike, *, q: ArrayLike = math.inf) -> Coupling:
    r"""Return the coupling of two like tuned circuits from the two peaks into which their response splits.

    .. math:: k^2 = \left(\frac{f_2^2 - f_1^2}{f_2^2 + f_1^2}\right)^2 + \frac{1}{Q^2}, \quad
              f_0 = f_1 f_2 \sqrt{2/(f_1^2 + f_2^2)}

    Parameters
    ----------
    low, high : array_like, shape (...)
        The two peaks of the current in the second circuit [Hz].
    q : array_like, shape (...)
        Q of each circuit [-], both the same; infinite leaves their losses out.

    Returns
    -------
    Coupling

    Raises
    ------
    OutOfRangeError
        If a value is not above 0, the second peak is not the higher, or the coupling would be 1 or more.

    Notes
    -----
    Two circuits coupled by their coils alone, tuned to one frequency: without losses they resonate together at
    f0/√(1 ± k), which is exact. Losses draw the peaks together, by the term in Q: from memory, and within 1 % of k
    against the circuit's own equations for k·Q from 2 and k to 0.2.

    Examples
    --------
    >>> k, centre = coupling_from_peaks(6.9e6, 7.3e6)
    >>> round(float(k), 4), round(float(centre) / 1e6, 3)
    (0.0563, 7.092)
    """
    f1, f2 = _rising(low, high)
    quality = np.asarray(q, dtype=np.float64)
    if not np.all(quality > 0):
        raise OutOfRangeError("q", _first(quality), "above 0")
    split = (f2 - f1) * (f2 + f1) / (f2**2 + f1**2)
    k = np.hypot(split, 1 / quality)
    if np.any(k >= 1):
        raise OutOfRangeError("coupling", f"{float(np.max(k)):.3g}", "below 1", "is the Q right?")
    return Coupling(*_one_shape(k, f1 * f2 * np.sqrt(2 / (f1**2 + f2**2))))


def _above_zero(name: str, values: ArrayLike, unit: str) -> Array:
    array = np.asarray(values, dtype=np.float64)
    wrong = array[~((array > 0) & np.isfinite(array))]
    if wrong.size:
        raise OutOfRangeError(name, f"{wrong.flat[0]:.6g} {unit}".strip(), f"finite and above 0 {unit}".strip())
    return array


def _rising(low: ArrayLike, high: ArrayLike) -> tuple[Array, Array]:
    f1, f2 = _above_zero("low", low, "Hz"), _above_zero("high", high, "Hz")
    if np.any(f1 >= f2):
        raise OutOfRangeError("high", f"{_first(f2):.6g} Hz", f"above the low frequency, {_first(f1):.6g} Hz")
    return f1, f2


def _first(values: Array) -> float:
    return float(values.flat[0])


def _one_shape(*values: Array) -> tuple[Array, ...]:
    return tuple(np.broadcast_arrays(*values))
