"""Which loads a network with variable parts matches, as its coils are tapped or with a tap moved.

::

    load of each VSWR and phase ──► all settings in the ranges, coil as it is ──► matched
                                │   all settings in the ranges, a tap moved   ──► matched, with the tap
                                └─► the settings least far beyond the ranges  ──► what it would take

All settings: the variable part next to the load runs through its range, and for each of its values the other one
would have to be what the impedances leave; where that is a part of its own phase there is a match, made exact then.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Iterator, Sequence
from dataclasses import replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.designs.result import Design
from rfstage.errors import ConvergenceError
from rfstage.job import Variable
from rfstage.ladder import Branch, Ladder
from rfstage.matching.exact import Free, close
from rfstage.quantity import show

VSWRS = (1.0, 1.5, 2.0, 3.0)
PHASES = tuple(range(0, 360, 30))  # degrees of the reflection coefficient
_POINTS, _COARSE = 1000, 160  # over a range, and over each of two: a match within less of a step may be missed
_TAPS = 4.0  # times the inductance, up and down, that a moved tap may give
_REACH = 10.0  # times beyond the ranges that is looked for what it would take
_NEARLY = 1.002  # times that is let pass before a setting is known exactly
_MOST_TRIED = 6  # settings made exact for a load


class Matched(NamedTuple):
    """Whether a load [ohm] of a VSWR and phase [deg] is matched, with the coil where it is or its tap moved.

    ``settings`` [F or H] by part, where a match was found at all, in or out of the ranges; ``change`` says in words
    what it would take.
    """

    vswr: float
    phase: float
    load: complex
    matched: bool
    tap_moved: bool
    settings: tuple[tuple[str, float], ...]
    change: str


def tank_of(made: Design) -> list[Branch]:
    """Return the parts of the network itself."""
    own = len(made.filter.parts) if made.filter else 0
    coupler = 2 if made.job.transformer is not None else 1
    parts = [p.branch for p in made.tank.parts if p.branch.origin != "device"][1 + coupler :]
    return parts[: len(parts) - own]


def loads_of(made: Design) -> tuple[Matched, ...]:
    """Return what the variable parts can match around the resistive line at the carrier; nothing without any."""
    if not made.job.variable:
        return ()
    found = []
    for vswr in VSWRS:
        for phase in PHASES if vswr > 1 else PHASES[:1]:
            size = (vswr - 1) / (vswr + 1)
            reflected = cmath.rect(size, math.radians(phase))
            load = made.settings.line.at_carrier.real * (1 + reflected) / (1 - reflected)
            found.append(_matched(made, vswr, float(phase), load))
    return tuple(found)


def _matched(made: Design, vswr: float, phase: float, load: complex) -> Matched:
    """Return how a load [ohm] is matched: as the coil is tapped, else with a tap moved least, else what it takes."""
    ranges = {v.name: v for v in made.job.variable}
    seen = _through_filter(made, load)
    best: tuple[float, tuple[tuple[str, float], ...]] = (math.inf, ())
    for reach in (1.0, _REACH):
        for moved in _thirds(made):
            for parts in _settings_for(made, seen, moved, reach):
                names = {own.name for own in parts if own.name in ranges}
                tapped = moved is not None and parts[moved].name not in ranges
                if tapped and moved is not None:
                    names.add(parts[moved].name)
                values = tuple((b.name, float(b.value)) for b in parts if b.name in names)
                if all(ranges[name].holds(value) for name, value in values if name in ranges):
                    return Matched(vswr, phase, load, True, tapped, values, "")
                best = min(best, (stretch(values, ranges), values))
    return Matched(vswr, phase, load, False, False, best[1], _change(best[1], ranges))


def stretch(values: Sequence[tuple[str, float]], ranges: dict[str, Variable]) -> float:
    """Return how far beyond its range the furthest of some settings lies, as a ratio; infinite without any."""
    return max(
        (max(v / ranges[n].most, ranges[n].least / v) for n, v in values if n in ranges),
        default=math.inf,
    )


def _free(made: Design) -> list[int]:
    names = {v.name for v in made.job.variable}
    return [k for k, b in enumerate(tank_of(made)) if b.name in names]


def _thirds(made: Design) -> list[int | None]:
    """Return which part moves beside two variable ones: none, then each coil; of three that are variable, one."""
    own, free = tank_of(made), _free(made)
    if len(free) == 3:
        return [next((k for k in free if own[k].kind == "coil"), free[1])]
    return [None, *(k for k, b in enumerate(own) if b.kind == "coil" and k not in free)]


def _settings_for(made: Design, load: complex, moved: int | None, reach: float) -> Iterator[list[Branch]]:
    """Yield the network set for a load [ohm]: its variable parts, and the part ``moved`` beside two of them.

    Of the two the second runs through its range, stretched by ``reach``, and the first is what is then wanted there,
    which it can give where that is its own phase. Where ``moved`` runs too, the least moved come first.
    """
    own, ranges, carrier = tank_of(made), {v.name: v for v in made.job.variable}, made.job.carrier
    i, j = (k for k in _free(made) if k != moved)
    first, wanted, before = own[i], made.point.load_resistance, _before(made)
    parts = list(own)
    parts[j] = replace(own[j], value=_over(ranges[own[j].name], reach, _POINTS if moved is None else _COARSE))
    third = np.ones(1)
    if moved is not None:
        now = float(own[moved].value)
        span = ranges.get(own[moved].name, Variable("", now / _TAPS, now * _TAPS))
        third = _over(span, 1.0 if own[moved].name not in ranges else reach, _COARSE)
        third = np.sort(np.append(third, now))
        parts[moved] = replace(own[moved], value=third[:, np.newaxis])
    a, b, c, d = Ladder((*before, *parts[:i])).chain(carrier)
    needed = (d * wanted - b) / (a - c * wanted)
    beyond = Ladder(parts[i + 1 :]).impedance(carrier, np.asarray(load))
    one = complex(replace(first, value=1.0).impedance(carrier))
    times = (1 / needed - 1 / beyond) * one if first.place == "shunt" else (needed - beyond) / one
    times = np.broadcast_to(times, (third.size, np.size(parts[j].value)))
    row, place = np.nonzero(np.signbit(times.imag[:, 1:]) != np.signbit(times.imag[:, :-1]))
    low, high = times[row, place], times[row, place + 1]
    weight = low.imag / (low.imag - high.imag)
    size = low.real + weight * (high.real - low.real)
    second = np.asarray(parts[j].value)
    other = second[place] * (second[place + 1] / second[place]) ** weight
    fit = size > 0
    value = size[fit] if (first.place == "shunt") == (first.kind == "capacitor") else 1 / size[fit]
    found = []
    for x, y, z in zip(value.tolist(), other[fit].tolist(), third[row[fit]].tolist(), strict=True):
        off = stretch(((first.name, x), (own[j].name, y)), ranges)
        if off <= reach * _NEARLY:
            start = list(own)
            start[i], start[j] = replace(first, value=x), replace(own[j], value=y)
            far = 0.0
            if moved is not None:
                start[moved], far = replace(own[moved], value=z), abs(math.log(z / float(own[moved].value)))
            found.append((far if reach == 1 else off, start))
    for _, start in sorted(found, key=lambda f: f[0])[:_MOST_TRIED]:
        try:
            parts = list(
                close(before, start, wanted=complex(wanted), load=load, carrier=carrier, free=(Free(i), Free(j)))
            )
        except ConvergenceError:
            continue
        if all(float(b.value) > 0 for b in parts):
            yield parts


def _over(span: Variable, reach: float, points: int) -> NDArray[np.float64]:
    """Return values over a range [F or H] stretched by ``reach``, its ends a little beyond so that they count."""
    slack = 1 + 1e-6
    return np.geomspace(span.least / (reach * slack), span.most * reach * slack, points)


def _before(made: Design) -> tuple[Branch, ...]:
    """Return what stands before the network."""
    branches = [part.branch for part in made.tank.parts]
    first = tank_of(made)[0].name
    return tuple(branches[: [b.name for b in branches].index(first)])


def _through_filter(made: Design, load: complex) -> complex:
    return complex(Ladder(made.settings.filter).impedance(made.job.carrier, load))


def _change(values: tuple[tuple[str, float], ...], ranges: dict[str, Variable]) -> str:
    """Return what a range would have to be, in words."""
    if not values:
        return f"no setting to {_REACH:g} times beyond these ranges matches it"
    words = []
    tapped = [f"{name} tapped to {show(value, 'H')}" for name, value in values if name not in ranges]
    for name, value in values:
        given = ranges.get(name)
        if given is None or given.holds(value):
            continue
        of = "F" if name.startswith("C") else "H"
        end = given.most if value > given.most else given.least
        digits = next((n for n in (3, 6) if show(value, of, n) != show(end, of, n)), 9)
        wants, there = show(value, of, digits), show(end, of, digits)
        beyond = f"{show(value - end, of)} more than its {there}" if value > end else f"below its least of {there}"
        words.append(f"{name} wants {wants}, {beyond}")
    return "; ".join(words) + "".join(f", with {word}" for word in tapped)
