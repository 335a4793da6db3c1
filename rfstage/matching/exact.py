"""Close a network exactly over its own losses.

A closed form knows lossless parts. Here the parts get their Qs, and damped Newton moves the values that are
free until the network shows the wanted impedance, and has the loaded Q that was asked where a third value is
free. What stands before the network (output capacitance, choke, blocking capacitor, transformer) is taken off
exactly beforehand, so every network goes through this one step.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.errors import ConvergenceError
from rfstage.ladder import Branch, Ladder
from rfstage.matching.quality import impedance_and_loaded_q

_TOLERANCE = 1e-12  # of the impedance at the device
_ROUNDING = 500  # times that is let pass where rounding leaves no better, in networks of high Q
_ITERATIONS = 60
_STEP = 1e-7  # of the one-sided differences; Newton then gains about seven digits an iteration
_KEPT = 5e-10  # of the impedance, and of the power balance, in what is returned
_GOOD = 0.2  # an iteration that leaves less than this of the miss lets the derivatives be carried along

Residual = Callable[[NDArray[np.float64]], NDArray[np.float64]]


class Free(NamedTuple):
    """A number of a network that may move: which part, which of its numbers; ``tied`` ones keep their ratio to it."""

    part: int
    attribute: str = "value"
    tied: tuple[str, ...] = ()


def free_values(tank: Sequence[Branch]) -> tuple[Free, ...]:
    """Return the values of all parts, both windings of a coupled pair."""
    found = []
    for k, branch in enumerate(tank):
        found.append(Free(k))
        if branch.kind == "coupled":
            found.append(Free(k, "second"))
    return tuple(found)


def behind(feed: Sequence[Branch], wanted: complex, carrier: float) -> complex:
    """Return the impedance [ohm] that must follow ``feed`` for the device to see ``wanted`` [ohm]."""
    a, b, c, d = (complex(x) for x in Ladder(feed).chain(carrier))
    return (d * wanted - b) / (a - c * wanted)


def with_losses(tank: Sequence[Branch], *, coil_q: float, capacitor_q: float, carrier: float) -> tuple[Branch, ...]:
    """Return the parts with their Qs [-]; an infinite Q is lossless. A tapped coil has its Q as a whole."""
    coil, capacitor = (None if math.isinf(q) else q for q in (coil_q, capacitor_q))
    made = []
    for branch in tank:
        q, second = {"capacitor": (capacitor, None), "trap": (coil, capacitor), "coupled": (coil, coil)}.get(
            branch.kind, (coil, None)
        )
        if branch.tap and coil is not None:
            above, below = float(branch.value), float(branch.second)
            mutual = float(branch.coupling) * math.sqrt(above * below)
            q = second = coil * (above + below) / (above + below + 2 * mutual)
        made.append(replace(branch, q_frequency=carrier, q=q, second_q=second))
    return tuple(made)


def close(
    feed: Sequence[Branch],
    tank: Sequence[Branch],
    *,
    wanted: complex,
    load: complex,
    carrier: float,
    free: Sequence[Free],
    asked_loaded_q: float | None = None,
) -> tuple[Branch, ...]:
    """Return the tank with values that meet the wanted impedance to 1e-12 relative.

    Parameters
    ----------
    feed, tank : sequences of Branch
        What stands before the network, and the network with its losses, values as a start.
    wanted, load : complex
        Impedance for the device, and of the load [ohm].
    carrier : float
        Hz.
    asked_loaded_q : float or None
        Where three values are free: the loaded Q [-] they must also give.
    free : sequence of Free
        Two values that move, or three with a loaded Q.

    Raises
    ------
    ConvergenceError
        If no values near the start do it.
    """
    a, b, c, d = (complex(x) for x in Ladder(feed).chain(carrier))
    target = (d * wanted - b) / (a - c * wanted)
    # relative misses behind the feed show at the device as many times larger as this
    steepness = max(1.0, abs(target / wanted / (c * target + d) ** 2))
    scale = np.array([_scale(tank[f.part], f.attribute, target, carrier) for f in free])

    def rebuilt(x: NDArray[np.float64]) -> tuple[Branch, ...]:
        parts = list(tank)
        for f, v in zip(free, (x * scale).tolist(), strict=True):
            branch = parts[f.part]
            old = float(getattr(branch, f.attribute))
            changes = {name: float(getattr(branch, name)) * v / old for name in f.tied}
            parts[f.part] = replace(branch, **{f.attribute: v}, **changes)
        return tuple(parts)

    def residual(x: NDArray[np.float64]) -> NDArray[np.float64]:
        parts = rebuilt(x)
        try:
            if asked_loaded_q is None:
                miss = complex(Ladder(parts).impedance(carrier, load)) / target - 1
                return np.array([miss.real, miss.imag])
            z, q = impedance_and_loaded_q(feed, parts, load, carrier)
            miss = (d * z - b) / (a - c * z) / target - 1
        except ZeroDivisionError:  # a part of exactly nothing on the way: as far off as can be
            return np.full(x.size, math.inf)
        return np.array([miss.real, miss.imag, q / asked_loaded_q - 1])

    start = np.array([float(getattr(tank[f.part], f.attribute)) for f in free]) / scale
    parts = rebuilt(_newton(residual, start, tolerance=_TOLERANCE / steepness))
    if not _holds((*feed, *parts), wanted, load, carrier):
        raise ConvergenceError("its Q is beyond what 16 digits can tell")
    return parts


def _holds(branches: Sequence[Branch], wanted: complex, load: complex, carrier: float) -> bool:
    """Return whether impedance and power balance stand to nine digits; extreme ratios lose them to rounding."""
    walk = Ladder(branches).walk(carrier, load)
    z = complex(walk.impedance)
    taken = abs(complex(walk.transimpedance)) ** 2 * (1 / load).real + 2 * sum(float(s.loss) for s in walk.branches)
    return bool(abs(z - wanted) <= _KEPT * abs(wanted) and abs(z.real - taken) <= _KEPT * z.real)


def _scale(branch: Branch, attribute: str, target: complex, carrier: float) -> float:
    """Return the number's own size, or that of a small part where it is next to nothing."""
    omega = 2 * math.pi * carrier
    size = abs(float(getattr(branch, attribute)))
    if branch.kind == "coupled":
        return size  # a winding comes from a closed form that has none of no size
    return max(size, 0.1 * abs(target) / omega if branch.kind == "coil" else 0.1 / (omega * abs(target)))


def _newton(residual: Residual, start: NDArray[np.float64], *, tolerance: float) -> NDArray[np.float64]:
    """Solve by Newton's method, its derivatives carried along by Broyden's update while that goes well."""
    x, r = start, residual(start)
    size = float(np.abs(r).max())
    fresh = good = False
    for _ in range(_ITERATIONS if math.isfinite(size) else 0):
        if size <= tolerance:
            return x
        if not good:
            jacobian, fresh = _derivatives(residual, x, r), True
        if not np.isfinite(jacobian).all():
            break
        try:
            step = np.linalg.solve(jacobian, -r)
        except np.linalg.LinAlgError:
            break
        longest = float(np.abs(step).max())
        shrink = min(1.0, 0.5 / longest) if longest > 0 else 1.0
        for _ in range(12):
            trial = x + shrink * step
            new = residual(trial)
            new_size = float(np.abs(new).max())
            if new_size < size:
                break
            shrink /= 2
        else:
            if fresh:
                break
            good = False
            continue
        good = new_size < _GOOD * size
        if good:
            moved = trial - x
            jacobian = jacobian + np.outer(new - r - jacobian @ moved, moved) / (moved @ moved)
        x, r, size, fresh = trial, new, new_size, False
    if size <= _ROUNDING * tolerance:
        return x
    raise ConvergenceError(f"the network did not close: {size:.3g} left of the wanted impedance")


def _derivatives(residual: Residual, x: NDArray[np.float64], r: NDArray[np.float64]) -> NDArray[np.float64]:
    jacobian = np.empty((r.size, x.size))
    for k in range(x.size):
        moved = x.copy()
        moved[k] += _STEP
        jacobian[:, k] = (residual(moved) - r) / _STEP
    return jacobian
