"""How far a coil that is wound goes: squeezed or spread, its tap or turns moved.

::

    ◠◠◠◠◠◠◠◠   squeezed: more inductance, until the turns touch
    ◠ ◠ ◠ ◠    spread: less, while it still stands by itself
    ◠◠◠┬◠◠◠    tapped: less, in whole and parts of turns
       │

The inductance that the stage file gives is the coil as it is; the winding's geometry only says in which ratio it
changes. A toroid goes with the square of its turns, and a little by moving them on the core.
"""

from __future__ import annotations

import math
from typing import NamedTuple

from rfstage.errors import ImpossibleError
from rfstage.parts.solenoid import inductance, length_for, longest, turns_for

MOST_SPREAD = 1.5  # times the length as wound: beyond it turns sag, forms end (common practice, no source)
CLOSEST = 1.02  # wire diameters from turn to turn: bare turns that nearly touch, or enamelled ones that do
ON_CORE = 0.10  # of the inductance: what moving the turns on a toroid gives (common practice, no source)
FEWEST_TURNS = 1.0  # of which the inductance is known

Winding = tuple[tuple[str, float | str], ...]


class Rewound(NamedTuple):
    """How a coil comes to a wanted inductance.

    ``way`` is ``spread`` (or squeezed), ``tap`` (fewer turns of what is wound) or ``new``; ``length`` [m] after
    spreading, ``turns`` in use or to be wound; None where it is not that.
    """

    way: str
    length: float | None = None
    turns: float | None = None


def spread_range(winding: Winding | None, now: float) -> tuple[float, float] | None:
    """Return the inductances [H] a coil of ``now`` [H] takes by squeezing and spreading; None if that isn't known."""
    wound = dict(winding or ())
    if "core" in wound:
        return now * (1 - ON_CORE), now * (1 + ON_CORE)
    air = _air_wound(wound)
    if air is None:
        return None
    turns, diameter, length, wire = air
    present = inductance(turns, diameter, length, wire)
    shortest = min(length, CLOSEST * turns * wire)
    most = max(length, min(MOST_SPREAD * length, float(longest(turns, diameter, wire))))
    ends = (inductance(turns, diameter, long, wire) for long in (most, shortest))
    low, high = (now * float(end / present) for end in ends)
    return low, high


def wound_inductance(winding: Winding | None) -> float | None:
    """Return the inductance [H] that an air winding's geometry makes, None where it isn't all known."""
    air = _air_wound(dict(winding or ()))
    return None if air is None else float(inductance(*air))


def rewound(winding: Winding | None, *, now: float, wanted: float) -> Rewound:
    """Return what makes a coil of ``now`` [H] one of ``wanted`` [H]: spreading before a tap before a new coil.

    The turns of a new coil are given for the same diameter, wire and pitch, or the same core; None where no number
    of turns does it.
    """
    wound = dict(winding or ())
    ratio = wanted / now
    reach = spread_range(winding, now)
    near = reach is not None and reach[0] <= wanted <= reach[1]
    if "core" in wound:
        turns = _number(wound, "turns")
        if near:
            return Rewound("spread", turns=turns)
        found = None if turns is None else max(1.0, float(round(turns * math.sqrt(ratio))))
        return Rewound("new", turns=found)
    air = _air_wound(wound)
    if air is None:
        return Rewound("new")
    turns, diameter, length, wire = air
    target = float(inductance(turns, diameter, length, wire)) * ratio
    if near:
        return Rewound("spread", length=float(length_for(target, turns, diameter, wire)), turns=turns)
    found = _turns_at_pitch(target, diameter, length / turns, wire)
    return Rewound("tap" if found is not None and FEWEST_TURNS <= found < turns else "new", turns=found)


def _turns_at_pitch(target: float, diameter: float, pitch: float, wire: float) -> float | None:
    """Return how many turns of a pitch [m] have an inductance [H], or None if no number of them has."""
    try:
        return float(turns_for(target, diameter, wire, pitch=pitch))
    except ImpossibleError:
        return None


def _air_wound(wound: dict[str, float | str]) -> tuple[float, float, float, float] | None:
    figures = [_number(wound, key) for key in ("turns", "diameter", "length", "wire")]
    if any(figure is None for figure in figures):
        return None
    turns, diameter, length, wire = (float(figure or 0.0) for figure in figures)
    return turns, diameter, length, wire


def _number(wound: dict[str, float | str], key: str) -> float | None:
    value = wound.get(key)
    return float(value) if isinstance(value, int | float) else None
