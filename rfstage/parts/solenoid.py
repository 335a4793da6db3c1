r"""The air solenoid: inductance of a single layer of round wire, exact sheet and exact corrections.

::

        ├──────── length ────────┤        length = turns × pitch;  diameter from wire centre to wire centre
        ○  ○  ○  ○  ○  ○  ○  ○  ○  ─┬─
        │← pitch →│                 │ diameter
        ○  ○  ○  ○  ○  ○  ○  ○  ○  ─┴─

    symbol  name            unit
    ------  --------------  ----
    N       turns           -      may be fractional, at least 1
    D       diameter        m      a = D/2
    l       length          m      p = l/N, the pitch
    d       wire_diameter   m      of the bare wire, at most p

The inductance is that of a current sheet with corrections for round wire (`rfstage.parts.sheet`). The sheet is closed
rings: the pitch of a helix counts only through ``length``, and a coil drawn out to a pitch beyond its own diameter is
refused.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from rfstage.errors import ImpossibleError, OutOfRangeError
from rfstage.parts.arrays import Real, checked, rising_root
from rfstage.parts.sheet import CLOSE, sheet_inductance, strip_correction, turns_correction
from rfstage.parts.wire import MU_0
from rfstage.quantity import show

MOST_TURNS = 1e5
_SLACK = 1e-12  # of an inductance: what stands at the end of a range comes back in spite of its last digit
_STEP = 1 + 1e-4  # of a length, to see whether the inductance falls
WIDEST_PITCH = 1.0  # in diameters: there the formula is 4 % off the sum over rings, beyond it a turn is no ring


def inductance(turns: ArrayLike, diameter: ArrayLike, length: ArrayLike, wire_diameter: ArrayLike) -> Any:
    """Return the low-frequency inductance of a single-layer coil of round wire [H].

    Parameters
    ----------
    turns : array_like, shape (...)
        1 or more, whole or not [-].
    diameter : array_like, shape (...)
        Wire centre to wire centre [m].
    length : array_like, shape (...)
        Turns times pitch [m]; the pitch is at most the diameter.
    wire_diameter : array_like, shape (...)
        Of the bare wire [m]; at most the pitch, and less than the diameter.

    Returns
    -------
    float or ndarray, shape (...)
        H. The parts of the formula are exact; that its corrections are those of straight wires shows by 0.15 of
        (pitch/diameter)² against the sum over rings, 4 % at most. Leads, and that turns are a helix and not rings,
        are left out.

    Raises
    ------
    OutOfRangeError
        If a number is not in its range: the wire thicker than the pitch, or the pitch wider than the diameter, say.

    References
    ----------
    Rosa, "Calculation of the self-inductance of single-layer coils", Bulletin of the Bureau of Standards 2 (1906).

    Examples
    --------
    >>> round(float(inductance(10, 50e-3, 50e-3, 2e-3)) * 1e6, 5)
    3.42646
    >>> [round(float(x) * 1e6, 3) for x in inductance([5, 10], 50e-3, 50e-3, 2e-3)]
    [0.98, 3.426]
    """
    n, diameter, wire = _winding(turns, diameter, wire_diameter)
    length = checked("length", length, "m", above=0)
    _check_pitch(length / n, diameter, wire)
    return _inductance(n, diameter, length, wire)


def _winding(turns: ArrayLike, diameter: ArrayLike, wire_diameter: ArrayLike) -> tuple[Real, Real, Real]:
    n = checked("turns", turns, "", least=1, most=MOST_TURNS)
    diameter = checked("diameter", diameter, "m", above=0)
    wire = checked("wire_diameter", wire_diameter, "m", above=0)
    if np.any(wire >= diameter):
        raise OutOfRangeError(
            "diameter",
            show(float(np.min(diameter)), "m", 4),
            f"above the wire's, {show(float(np.max(wire)), 'm', 4)}",
            "it is measured from wire centre to wire centre",
        )
    return n, diameter, wire


def _check_pitch(pitch: Real, diameter: Real, wire: Real) -> None:
    """Refuse turns that would lie in each other, and turns drawn out so far that they are no coil."""
    pitch, diameter, wire = np.broadcast_arrays(pitch, diameter, wire)
    for wrong, name, got, need, hint in (
        (
            wire > pitch * CLOSE,
            *("wire_diameter", wire, ("at most the pitch, {} (length over turns)", pitch)),
            "spread the turns, take fewer, or thinner wire",
        ),
        (
            pitch > diameter * WIDEST_PITCH * CLOSE,
            *("pitch", pitch, ("at most the diameter, {}", diameter)),
            "take more turns, or less length: so far drawn out they are no coil",
        ),
    ):
        if np.any(wrong):
            k = np.argmax(np.ravel(wrong))
            bad, bound = (show(float(np.ravel(x)[k]), "m", 4) for x in (got, need[1]))
            raise OutOfRangeError(name, bad, need[0].format(bound), hint)


def _inductance(n: Any, diameter: Any, length: Any, wire: Any) -> Any:
    corrections = strip_correction(n * wire / length) + turns_correction(n)
    return sheet_inductance(n, diameter, length) - MU_0 / 2 * n * diameter * corrections


def turns_for(
    inductance: ArrayLike,
    diameter: ArrayLike,
    wire_diameter: ArrayLike,
    *,
    length: ArrayLike | None = None,
    pitch: ArrayLike | None = None,
) -> Any:
    """Return the turns, fractions included, of a coil with a wanted inductance and a given length or pitch.

    Parameters
    ----------
    inductance : array_like, shape (...)
        Low-frequency, above 0 [H].
    diameter, wire_diameter : array_like, shape (...)
        As `inductance` takes them [m].
    length, pitch : array_like or None, shape (...)
        One of the two [m].

    Returns
    -------
    float or ndarray, shape (...)
        Turns [-].

    Raises
    ------
    ImpossibleError
        If fewer turns would be wanted than one, or than reach over the length; more than fit it close-wound; or more
        than 100,000: with the nearest inductance that can be had.
    OutOfRangeError
        If a number is not in its range, or not one of length and pitch is given.

    Examples
    --------
    >>> round(float(turns_for(3.42646e-6, 50e-3, 2e-3, length=50e-3)), 4)
    10.0
    >>> round(float(turns_for(3.4e-6, 50e-3, 2e-3, pitch=5e-3)), 3)
    9.941
    """
    wanted = checked("inductance", inductance, "H", above=0)
    _, diameter, wire = _winding(1, diameter, wire_diameter)
    if (length is None) == (pitch is None):
        raise OutOfRangeError("length, pitch", "both" if length is not None else "neither", "one of the two")
    if length is not None:
        room = checked("length", length, "m", above=0)
        if np.any(room * CLOSE < wire):
            room_text, wire_text = show(float(np.min(room)), "m", 4), show(float(np.max(wire)), "m", 4)
            raise OutOfRangeError("length", room_text, f"at least the wire's diameter, {wire_text}")
        low = np.maximum(room / diameter / WIDEST_PITCH, 1.0)
        high = np.maximum(np.minimum(room / wire, MOST_TURNS), low)
    else:
        room = checked("pitch", pitch, "m", above=0)  # type: ignore[arg-type]  # one of the two is there
        _check_pitch(room, diameter, wire)
        low, high = np.asarray(1.0), np.asarray(MOST_TURNS)
    wanted, diameter, wire, room, low, high = np.broadcast_arrays(wanted, diameter, wire, room, low, high)

    def reached(n: Real) -> Real:
        return np.asarray(_inductance(n, diameter, room if length is not None else n * room, wire))

    least, most = reached(low), reached(high)
    _refuse(wanted, least, most, low, high, closed=length is not None)
    return rising_root(reached, wanted, low, high)[()]


def _refuse(wanted: Real, least: Real, most: Real, low: Real, high: Real, *, closed: bool) -> None:
    """Refuse inductances beyond what the fewest and the most turns give; ``closed`` if the most are close-wound."""
    slack = _SLACK * wanted
    fewest, fullest = "spread as far as may be" if closed else "", "close-wound on that length" if closed else ""
    for outside, reached, turns, how in (
        (wanted < least - slack, least, low, fewest),
        (wanted > most + slack, most, high, fullest),
    ):
        if np.any(outside):
            k = np.argmax(np.ravel(outside))
            got, near, n = (float(np.ravel(x)[k]) for x in (wanted, reached, turns))
            what = "1 turn" if n == 1 else f"{n:.6g} turns {how}".rstrip()
            other = "length" if closed else "pitch"
            raise ImpossibleError(
                f"inductance: {show(got, 'H')} can't be had so; the nearest is {show(near, 'H', 4)} with {what} "
                f"(another diameter, {other} or wire gives {'less' if got < near else 'more'})"
            )


def longest(turns: ArrayLike, diameter: ArrayLike, wire_diameter: ArrayLike) -> Any:
    """Return the length up to which spreading the turns lowers the inductance [m].

    The pitch stays within one diameter. Near one turn there is little to spread, and the end comes sooner: what the
    turns lose in common flux is then outweighed by the corrections.

    Examples
    --------
    >>> float(longest(10, 50e-3, 2e-3))
    0.5
    """
    n, diameter, wire = _winding(turns, diameter, wire_diameter)
    n, diameter, wire = np.broadcast_arrays(n, diameter, wire)
    close, far = n * wire, n * diameter * WIDEST_PITCH

    def rising(length: Real) -> Real:  # forwards, since there is nothing below close-wound
        return np.asarray(_inductance(n, diameter, length * _STEP, wire) - _inductance(n, diameter, length, wire))

    ends = np.where(rising(close) >= 0, close, far)
    turns_within = (rising(far) > 0) & (ends == far)
    if np.any(turns_within):
        turning = rising_root(rising, np.zeros(n.shape), close, far)
        ends = np.where(turns_within, turning, ends)
    return ends[()]


def length_for(inductance: ArrayLike, turns: ArrayLike, diameter: ArrayLike, wire_diameter: ArrayLike) -> Any:
    """Return the length to which turns are to be squeezed or spread for a wanted inductance [m].

    Parameters
    ----------
    inductance : array_like, shape (...)
        Low-frequency, above 0 [H].
    turns, diameter, wire_diameter : array_like, shape (...)
        As `inductance` takes them.

    Returns
    -------
    float or ndarray, shape (...)
        From close-wound, turns × wire, up to `longest` [m].

    Raises
    ------
    ImpossibleError
        If the inductance is beyond what the turns can be squeezed or spread to, with the nearest that can be had.
    OutOfRangeError
        If a number is not in its range.

    Examples
    --------
    >>> round(float(length_for(3.42646e-6, 10, 50e-3, 2e-3)) * 1e3, 3)
    50.0
    """
    wanted = checked("inductance", inductance, "H", above=0)
    n, diameter, wire = _winding(turns, diameter, wire_diameter)
    wanted, n, diameter, wire = np.broadcast_arrays(wanted, n, diameter, wire)
    low, high = n * wire, np.asarray(longest(n, diameter, wire))
    most, least = _inductance(n, diameter, low, wire), _inductance(n, diameter, high, wire)
    slack = _SLACK * wanted
    for outside, reached, length, how in (
        (wanted > most + slack, most, low, "close-wound"),
        (wanted < least - slack, least, high, "spread as far as lowers it"),
    ):
        if np.any(outside):
            k = np.argmax(np.ravel(outside))
            got, near, at, count = (float(np.ravel(x)[k]) for x in (wanted, reached, length, n))
            raise ImpossibleError(
                f"inductance: {show(got, 'H')} can't be had of {count:.4g} turns; the nearest is {show(near, 'H', 4)}, "
                f"{how} at {show(at, 'm', 4)} ({'fewer' if got < near else 'more'} turns, or another diameter)"
            )
    return rising_root(lambda length: -np.asarray(_inductance(n, diameter, length, wire)), -wanted, low, high)[()]


def mutual_inductance(
    turns: ArrayLike, diameter: ArrayLike, length: ArrayLike, wire_diameter: ArrayLike, *, tap: ArrayLike
) -> tuple[Any, Any, Any, Any]:
    """Return what a tap makes of a coil: two parts of one winding that share their flux.

    Parameters
    ----------
    turns, diameter, length, wire_diameter : array_like, shape (...)
        Of the whole coil, as `inductance` takes them.
    tap : array_like, shape (...)
        Turns from the grounded end to the tap: at least 1, and at least 1 less than the coil has.

    Returns
    -------
    tuple of ndarray, shape (...)
        Inductance from the grounded end to the tap [H], that of the rest [H], their mutual inductance [H] and their
        coupling coefficient [-].

    Raises
    ------
    OutOfRangeError
        If a number is not in its range.

    Examples
    --------
    >>> low, high, mutual, coupling = mutual_inductance(10, 50e-3, 50e-3, 2e-3, tap=3)
    >>> f"{low * 1e6:.3f} {high * 1e6:.3f} {mutual * 1e6:.3f} uH, {coupling:.3f}"
    '0.618 2.121 0.344 uH, 0.300'
    """
    whole = inductance(turns, diameter, length, wire_diameter)
    n, m = checked("turns", turns, "", least=2), checked("tap", tap, "", least=1)
    if np.any(n - m < 1):
        raise OutOfRangeError(
            "tap", f"{float(np.max(m)):.6g}", f"1 to {float(np.min(n)) - 1:.6g} turns (1 fewer than the coil has)"
        )
    pitch = np.asarray(length, dtype=np.float64) / n
    low = inductance(m, diameter, m * pitch, wire_diameter)
    high = inductance(n - m, diameter, (n - m) * pitch, wire_diameter)
    mutual = (whole - low - high) / 2
    return low, high, mutual, mutual / np.sqrt(low * high)
