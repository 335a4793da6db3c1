r"""Elliptic (Cauer) low-pass ladders of odd order: equal ripple in the pass band, equal minima in the stop band.

::

    capacitor-first   ──┬──[ L2 ‖ C2 ]──┬──[ L4 ‖ C4 ]──┬──       coil-first   ──[ L1 ]──┬──[ L3 ]──┬──[ L5 ]──
                        C1              C3              C5                             L2+C2      L4+C4
                        │               │               │                                │          │

    symbol   name          what it is
    -------  ------------  ----------------------------------------------------------------------------
    ωs       edge          where the stop band begins, the ripple's edge being 1; modular angle θ = asin(1/ωs)
    a        reflection    where nothing is reflected: a = sn(2i K/n), k = 1/ωs
    Ω        trap          where nothing passes: Ω = ωs/a; the nearest stand in the middle of the ladder

The natural modes give the input admittance and its slope at every Ω, where it is a pure susceptance, and from
those few numbers each arm comes off in turn, from both ends to the middle. What rounding takes in that (the
more, the deeper the stop band) Newton's method puts back, on what a ladder tells sharply: that nothing is
reflected at each a, and so much at the edge of the ripple.
"""

from __future__ import annotations

import math
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from rfstage.errors import ConvergenceError, ImpossibleError, OutOfRangeError
from rfstage.filters.jacobi import (
    ascend,
    discrimination,
    hyperbolic_sn,
    hyperbolic_sn_inverse,
    landen,
    modulus_for,
    sn,
)
from rfstage.filters.prototypes import Prototype, chebyshev, check_order, plain, ripple_factor
from rfstage.filters.sharpen import sharpened

ORDERS = range(3, 12, 2)
_DECIBEL = math.log(10) / 10  # nepers of power in one
_LEAST_EDGE, _WIDEST_EDGE = 1.001, 100.0
_ROUNDING_TAKES_ALL = 150.0  # dB of stop band from which the arms that come off are no start any more
_ROUNDS = 20

Array = NDArray[np.float64]


class Ladders(NamedTuple):
    """Ladders of many samples: shunt arms and trap capacitors [F], traps' frequencies [rad/s], and which came out.

    Shapes (arms, samples...), (traps, samples...) twice, and (samples...) of bool; what did not is no filter.
    """

    shunts: Array
    traps: Array
    zeros: Array
    realised: NDArray[np.bool_]

    def where(self, chosen: NDArray[np.bool_]) -> Ladders:
        """Return the chosen samples."""
        return Ladders(self.shunts[:, chosen], self.traps[:, chosen], self.zeros[:, chosen], self.realised[chosen])

    def prototype(self, ripple: Any) -> Prototype:
        """Return the `Prototype`, samples and all."""
        values: list[Any] = []
        traps: list[Any] = []
        for k, shunt in enumerate(self.shunts):
            values.append(plain(shunt))
            traps.append(0.0)
            if k < len(self.traps):
                values.append(plain(1 / (self.zeros[k] ** 2 * self.traps[k])))
                traps.append(plain(self.traps[k]))
        return Prototype("elliptic", plain(ripple), tuple(values), tuple(traps), 1.0)


def elliptic(order: int, *, ripple: float, edge: float | None = None, attenuation: float | None = None) -> Prototype:
    """Return the elliptic prototype; its cutoff is the edge of the ripple.

    Parameters
    ----------
    order : int
        3, 5, 7, 9 or 11.
    ripple : float
        Of the pass band [dB], above 0 and up to 20.
    edge, attenuation : float
        One of the two: where the stop band begins over the cutoff [-], 1.001 to 100 (1/sin θ for a modular angle
        θ); or its least attenuation [dB], from which the edge follows.

    Raises
    ------
    OutOfRangeError
        For a value outside its range.
    ImpossibleError
        If the ladder's parts do not all come out above nothing.

    Examples
    --------
    >>> c05_20_30 = elliptic(5, ripple=0.1773, edge=2.0)
    >>> [round(g, 3) for g in c05_20_30.values], [round(t, 3) for t in c05_20_30.traps]
    ([1.241, 1.271, 1.936, 1.132, 1.129], [0.0, 0.074, 0.0, 0.202, 0.0])
    """
    check_order(order, ORDERS, "3, 5, 7, 9 or 11", "an even order would not end alike at both sides")
    ripple_factor(ripple)
    if (edge is None) == (attenuation is None):
        raise OutOfRangeError("edge", edge, "given where attenuation is not, and only there")
    if edge is None:
        assert attenuation is not None
        edge = edge_for(order, ripple=ripple, attenuation=attenuation)
    elif not _LEAST_EDGE <= edge <= _WIDEST_EDGE:
        need = f"from {_LEAST_EDGE} to {_WIDEST_EDGE:g} times the cutoff"
        raise OutOfRangeError("edge", edge, need, "it is 1/sin of a modular angle")
    made = ladders(order, ripple=ripple, edge=edge)
    if not made.realised:
        where = f"order {order}, {ripple:.4g} dB ripple and a stop band from {edge:.4g} times the cutoff"
        if np.all(np.isfinite(made.shunts)) and min(made.shunts.min(), made.traps.min()) <= 0:
            raise ImpossibleError(
                f"elliptic filter of {where}: a part comes out at nothing or less; more ripple, or a stop band that "
                "begins farther out, helps"
            )
        raise ConvergenceError(f"elliptic filter of {where}: its parts can't be told in 16 digits")
    return made.prototype(ripple)


def edge_for(order: int, *, ripple: float, attenuation: float) -> float:
    """Return where the stop band begins [-], from its least attenuation [dB].

    Raises
    ------
    OutOfRangeError
        If the edge would not lie from 1.001 to 100 times the cutoff.

    Examples
    --------
    >>> round(edge_for(5, ripple=0.1773, attenuation=61.43), 3)
    2.0
    """
    limits = np.array([_LEAST_EDGE, _WIDEST_EDGE])
    low, high = (float(x) for x in elliptic_attenuation(limits, order=order, ripple=ripple, edge=limits))
    if not low <= attenuation <= high:
        raise OutOfRangeError(
            "attenuation", f"{attenuation} dB", f"from {low:.4g} to {high:.4g} dB at order {order} and this ripple"
        )
    factor = np.sqrt(np.expm1(attenuation * _DECIBEL))
    return 1 / float(modulus_for(order, ripple_factor(ripple) / factor))


def edge_for_trap(order: int, nearest: ArrayLike) -> Array:
    """Return the edge [-] with which the nearest trap falls on a frequency.

    Parameters
    ----------
    order : int
        Odd.
    nearest : array_like, shape (...)
        Over the cutoff [-], above 1.

    Raises
    ------
    ConvergenceError
        If it lies too near the cutoff to be told in 16 digits.

    Examples
    --------
    >>> round(float(edge_for_trap(5, 2.0892465)), 6)
    2.0
    """
    wanted = np.asarray(nearest, dtype=np.float64)

    def miss(edge: Array) -> Array:
        return np.asarray(edge / sn((order - 1) / order, 1 / edge) - wanted)

    # the trap lies nearly in proportion to the edge, both over the cutoff: secants close in at once
    before, edge = 1 + 0.7 * (wanted - 1), 1 + 0.9 * (wanted - 1)
    off = miss(before)
    for _ in range(_ROUNDS):
        now = miss(edge)
        moved = np.abs(now - off) > 0
        step = np.where(moved, now * (edge - before) / np.where(moved, now - off, 1.0), 0.0)
        before, off, edge = edge, now, edge - step
        if np.all(np.abs(step) < 1e-13 * edge):
            return np.asarray(edge)
    raise ConvergenceError(f"edge of the stop band for a trap at {wanted} times the cutoff: not found")


def elliptic_attenuation(frequency: ArrayLike, *, order: int, ripple: ArrayLike, edge: ArrayLike) -> Array:
    """Return the attenuation [dB] of the lossless filter between equal resistances.

    Parameters
    ----------
    frequency, ripple, edge : array_like, shapes that broadcast together
        Over the cutoff [-], 0 or above; dB; over the cutoff [-]. At a trap it is infinite.
    order : int
        Odd.

    Examples
    --------
    >>> round(float(elliptic_attenuation(2.0, order=5, ripple=0.1773, edge=2.0)), 2)
    61.43
    """
    omega, k = np.asarray(frequency, dtype=np.float64), 1 / np.asarray(edge, dtype=np.float64)
    function = omega
    for a in _reflection_zeros(order, landen(k)):
        with np.errstate(divide="ignore"):
            function = function * (a * a - omega**2) / (1 - (k * a * omega) ** 2) * ((1 - (k * a) ** 2) / (1 - a * a))
    return np.asarray(np.log1p((ripple_factor(ripple) * function) ** 2) / _DECIBEL)


def ladders(order: int, *, ripple: ArrayLike, edge: ArrayLike) -> Ladders:
    """Return the capacitor-first ladders of many ripples and edges at once, unchecked but for ``realised``.

    Parameters
    ----------
    order : int
        Odd.
    ripple, edge : array_like, shapes that broadcast together to (samples...)
        dB, and over the cutoff [-].
    """
    ripple, edge = np.broadcast_arrays(np.asarray(ripple, dtype=np.float64), np.asarray(edge, dtype=np.float64))
    shape = edge.shape
    ripple, edge = ripple.reshape(-1), edge.reshape(-1)
    steps = landen(1 / edge)
    reflections = _reflection_zeros(order, steps)
    count = order // 2
    middle_last = [*range(0, count, 2), *reversed(range(1, count, 2))]
    zeros = np.array([edge / reflections[i] for i in middle_last])
    factor = ripple_factor(ripple)
    ratio = discrimination(order, 1 / edge)
    with np.errstate(all="ignore"):  # what comes to nothing on the way is sorted out at the end
        shunts, traps = _arms(order, steps, reflections, zeros, factor=factor, ratio=ratio)
        deep = 20 * np.log10(factor / ratio) > _ROUNDING_TAKES_ALL
        if np.any(deep):  # so far out the traps hardly show in the pass band
            flat = chebyshev(order, ripple=ripple).values
            coils = np.array(flat[1::2]) * (1 - zeros**-2)
            shunts = np.where(deep, np.array(flat[::2]), shunts)
            traps = np.where(deep, 1 / (zeros**2 * coils), traps)
        shunts, traps, settled = sharpened(shunts, traps, zeros, np.array(reflections), factor)
        realised = settled & (shunts.min(axis=0) > 0) & (traps.min(axis=0) > 0)
    return Ladders(
        shunts.reshape(-1, *shape), traps.reshape(-1, *shape), zeros.reshape(-1, *shape), realised.reshape(shape)
    )


def _reflection_zeros(order: int, steps: tuple[Array, ...]) -> list[Array]:
    return [ascend(math.sin(i * math.pi / order), steps) for i in range(1, order // 2 + 1)]


def _arms(
    order: int, steps: tuple[Array, ...], reflections: list[Array], zeros: Array, *, factor: Array, ratio: Array
) -> tuple[Array, Array]:
    """Take the arms off from both ends: shunt capacitors (arms, samples) and trap capacitors (traps, samples).

    The filter looks the same from either end but for the order its traps are named in.
    """
    height = hyperbolic_sn_inverse(1 / factor, ratio) / order
    damping = [hyperbolic_sn(height, steps)]
    turning = [np.zeros_like(height)]
    for i in range(1, order // 2 + 1):
        mode = 1j * ascend(np.cos(((2 * i - 1) / order - 1j * height) * (math.pi / 2)), steps)
        damping += [-mode.real] * 2
        turning += [mode.imag, -mode.imag]
    angle = sum(np.arctan2(zeros - w, d) for d, w in zip(damping, turning, strict=True))
    delay = sum(d / ((zeros - w) ** 2 + d**2) for d, w in zip(damping, turning, strict=True))
    sign = np.prod([np.sign(a * a - zeros**2) for a in reflections], axis=0)
    # reflection coefficient −F/E: of size 1 at a trap, so the admittance is j tan of half its angle, turned round
    half = (angle - sign * (math.pi / 2)) / 2
    susceptance = -1 / np.tan(half)
    slope = delay / 2 * (1 + susceptance**2)
    front, front_traps = _from_one_end(susceptance, slope, zeros)
    back, back_traps = _from_one_end(susceptance[::-1], slope[::-1], zeros[::-1])
    count = len(zeros)
    near = (count + 1) // 2
    shunts = np.concatenate([front[:near], back[: count + 1 - near][::-1]])
    traps = np.concatenate([front_traps[:near], back_traps[: count - near][::-1]])
    return shunts, traps


def _from_one_end(susceptance: Array, slope: Array, zeros: Array) -> tuple[Array, Array]:
    """Take shunt capacitor and trap off in turn, keeping susceptance and slope at the traps still to come."""
    b, slope = susceptance.copy(), slope.copy()
    shunts, traps = np.empty_like(zeros), np.empty_like(zeros)
    for k, zero in enumerate(zeros):
        shunts[k] = b[k] / zero
        traps[k] = (slope[k] - shunts[k]) / 2
        rest = zeros[k + 1 :]
        left = b[k + 1 :] - rest * shunts[k]
        gap = zero**2 - rest**2
        reactance = -1 / left - rest / (traps[k] * gap)
        steepness = (slope[k + 1 :] - shunts[k]) / left**2 - (zero**2 + rest**2) / (traps[k] * gap**2)
        b[k + 1 :] = -1 / reactance
        slope[k + 1 :] = steepness / reactance**2
    return shunts, traps
