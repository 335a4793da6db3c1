r"""Coils on ring cores: whole turns, the inductance they really give, the wire that fits, the flux in the core.

::

    symbol  name      unit
    ------  --------  ------
    A_L     factor    H/turn²   published, of the core (`rfstage.parts.cores`)
    N       turns     -         whole: a wire goes through the hole or it does not
    A       area      m²        cross-section of the core
    B       —         T         peak flux density L·I/(N·A), I the peak of the whole current, dc included

    L = A_L N²

Core loss is not in the data, so no Q is given: the copper's resistance is that of the straight wire, and the loss of
the core and of turns side by side comes on top of it.
"""

from __future__ import annotations

import math
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from rfstage.errors import ImpossibleError, OutOfRangeError
from rfstage.parts.arrays import checked
from rfstage.parts.cores import Core
from rfstage.parts.gauge import gauge_diameter, largest_gauge
from rfstage.parts.wire import ac_resistance
from rfstage.quantity import show

FINEST = gauge_diameter(40)  # thinner wire is not wound by hand (common practice, no source)
STIFFEST = 0.1  # of the inner diameter: thicker wire does not lie down on the ring (common practice, no source)
INSULATION = 0.9  # of the window's wire is bare copper: enamel and a little air (common practice, no source)
# frequency [Hz], peak flux density [T] that a core of either kind is kept below: common practice, from memory
_FLUX_LIMIT = ((0.1e6, 50e-3), (1e6, 15e-3), (7e6, 5.7e-3), (14e6, 4.2e-3), (21e6, 3.6e-3), (28e6, 3.0e-3))
FLUX_SOURCE = "common practice, from memory"
# Hz: above it the permeability of a ferrite falls and its loss rises (from memory)
_FERRITE_KNEE = {"43": 1e6, "61": 15e6}


class ToroidCoil(NamedTuple):
    """A coil on a ring core; SI, temperature in °C. The resistance is the straight wire's alone."""

    core: Core
    turns: int
    carrier: float
    temperature: float
    inductance: float
    wire_diameter: float
    largest_wire: float
    wire_length: float
    copper_resistance: float
    notes: tuple[str, ...]

    def flux_density(self, peak_current: float) -> float:
        """Return the peak flux density [T] for the peak of the whole current [A], dc included."""
        return float(flux_density(self.inductance, peak_current, turns=self.turns, area=self.core.area))


def flux_density(inductance: ArrayLike, peak_current: ArrayLike, *, turns: ArrayLike, area: ArrayLike) -> Any:
    """Return the peak flux density in a core [T]: L·I/(N·A).

    Parameters
    ----------
    inductance, peak_current, turns, area : array_like, shape (...)
        H, A (the peak of the whole current), turns, and the core's cross-section [m²].

    Examples
    --------
    >>> round(float(flux_density(4.9e-6, 1.0, turns=32, area=12e-6)) * 1e3, 2)
    12.76
    """
    inductance = checked("inductance", inductance, "H", above=0)
    current = checked("peak_current", peak_current, "A", least=0)
    return inductance * current / (checked("turns", turns, "", least=1) * checked("area", area, "m2", above=0))


def flux_limit(frequency: float) -> float | None:
    """Return the peak flux density [T] that a core is kept below at a frequency [Hz], or None outside 0.1 to 28 MHz.

    Common practice, from memory: the same for powder and ferrite, a straight line between its points on logarithmic
    scales.

    Examples
    --------
    >>> flux_limit(7e6), flux_limit(50e6)
    (0.0057, None)
    """
    frequencies, limits = zip(*_FLUX_LIMIT, strict=True)
    if not frequencies[0] <= frequency <= frequencies[-1]:
        return None
    if frequency in frequencies:
        return float(limits[frequencies.index(frequency)])
    return math.exp(float(np.interp(math.log(frequency), np.log(frequencies), np.log(limits))))


def window_wire(inner: ArrayLike, turns: ArrayLike) -> Any:
    """Return the diameter of the thickest wire of which so many turns lie side by side inside a ring [m].

    A single layer on the circle of the inner radius: N round wires that touch each other and the core.

    Parameters
    ----------
    inner : array_like, shape (...)
        Inner diameter of the core, above 0 [m].
    turns : array_like, shape (...)
        1 or more.

    Examples
    --------
    >>> round(float(window_wire(7.7e-3, 49)) * 1e3, 3), float(window_wire(10e-3, 2))
    (0.464, 0.005)
    """
    inner = checked("inner", inner, "m", above=0)
    n = checked("turns", turns, "", least=1)
    sine = np.where(n < 2, 1.0, np.sin(math.pi / np.maximum(n, 2)))
    return np.where(n < 2, inner, inner * sine / (1 + sine))[()]


def turns_in_window(inner: float, wire_diameter: float) -> int:
    """Return how many turns of a wire [m] lie side by side inside a ring of that inner diameter [m].

    Examples
    --------
    >>> turns_in_window(7.7e-3, 0.463e-3), turns_in_window(10e-3, 8e-3), turns_in_window(10e-3, 11e-3)
    (49, 1, 0)
    """
    checked("inner", inner, "m", above=0)
    checked("wire_diameter", wire_diameter, "m", above=0)
    if wire_diameter > inner / 2:
        return int(wire_diameter <= inner)
    return math.floor(math.pi / math.asin(wire_diameter / (inner - wire_diameter)) + 1e-9)


def exact_turns(inductance: ArrayLike, factor: ArrayLike) -> Any:
    """Return the turns, fractions included, for an inductance [H] by an inductance factor [H/turn²].

    Examples
    --------
    >>> round(float(exact_turns(12e-6, 4.9e-9)), 2)
    49.49
    """
    return np.sqrt(checked("inductance", inductance, "H", above=0) / checked("factor", factor, "H", above=0))


def whole_turns(inductance: float, factor: float) -> int:
    """Return the whole turns, at least 1, that come nearest to an inductance [H] by a factor [H/turn²].

    Examples
    --------
    >>> whole_turns(5e-6, 4.0e-9), whole_turns(1e-3, 523e-9), whole_turns(12e-6, 4.9e-9)
    (35, 44, 49)
    """
    below = max(1, math.floor(float(exact_turns(inductance, factor))))
    return min((below, below + 1), key=lambda n: abs(factor * n**2 - inductance))


def turns_on(core: Core, inductance: float) -> int:
    """Return the whole turns on a core that come nearest to an inductance [H].

    Raises
    ------
    ImpossibleError
        If one turn gives more than half as much again, or more turns are wanted than a layer of the finest wire holds:
        with the nearest that can be had.
    """
    turns, most = whole_turns(inductance, core.factor), turns_in_window(core.inner, FINEST)
    if turns == 1 and core.factor > 1.5 * inductance:
        raise ImpossibleError(
            f"inductance: {show(inductance, 'H')} can't be had on {core.name}; the nearest is "
            f"{show(core.factor, 'H')} with 1 turn (take a core with a smaller factor, or an air coil)"
        )
    if turns > most:
        raise ImpossibleError(
            f"inductance: {show(inductance, 'H')} can't be had in one layer on {core.name}, which wants {turns} turns; "
            f"the nearest is {show(core.factor * most**2, 'H')} with {most} turns of AWG 40 (take a larger core, or "
            "one with a larger factor)"
        )
    return turns


def toroid_coil(
    core: Core, turns: int, *, carrier: float, wire_diameter: float | None = None, temperature: float = 20.0
) -> ToroidCoil:
    """Return a coil on a ring core.

    Parameters
    ----------
    core : Core
        From `rfstage.parts.cores.core_named`.
    turns : int
        1 or more.
    carrier : float
        Hz.
    wire_diameter : float or None
        Of the bare wire [m]; None takes the thickest American gauge that leaves room for its insulation
        and can be bent round the ring.
    temperature : float
        Of the copper [°C].

    Raises
    ------
    OutOfRangeError
        If the wire, or even the finest one, does not go through the core so often, or a number is not in its range.

    Examples
    --------
    >>> from rfstage.parts.cores import core_named
    >>> coil = toroid_coil(core_named("T-50-2"), 21, carrier=7.1e6)
    >>> f"{coil.inductance * 1e6:.3f} uH, wire to {coil.largest_wire * 1e3:.2f} mm, {coil.wire_length * 100:.0f} cm"
    '2.161 uH, wire to 1.00 mm, 37 cm'
    """
    checked("turns", turns, "", least=1)
    checked("carrier", carrier, "Hz", above=0)
    fits, room = turns_in_window(core.inner, FINEST), float(window_wire(core.inner, turns))
    if turns > fits:
        raise OutOfRangeError(
            "turns", turns, f"1 to {fits} on {core.name}", "a single layer of AWG 40 holds no more; take a larger core"
        )
    if wire_diameter is None:
        gauge = largest_gauge(min(INSULATION * room, STIFFEST * core.inner))
        assert (
            gauge is not None
        )  # a tenth of the smallest ring, and the room of the finest wire, are thicker than AWG 50
        wire_diameter = gauge_diameter(gauge)
    elif wire_diameter > room * (1 + 1e-9):
        raise OutOfRangeError(
            "wire_diameter",
            show(wire_diameter, "m", 4),
            f"at most {show(room, 'm', 4)}, for {turns} turns in one layer through {core.name}",
            f"of this wire it takes {turns_in_window(core.inner, wire_diameter)}",
        )
    around = 2 * core.height + (core.outer - core.inner) + 4 * wire_diameter
    length = turns * around
    return ToroidCoil(
        core=core,
        turns=turns,
        carrier=carrier,
        temperature=temperature,
        inductance=core.factor * turns**2,
        wire_diameter=wire_diameter,
        largest_wire=room,
        wire_length=length,
        copper_resistance=float(ac_resistance(wire_diameter, carrier, temperature=temperature)) * length,
        notes=tuple(_notes(core, carrier)),
    )


def _notes(core: Core, carrier: float) -> list[str]:
    notes = [
        "core loss is not in the data, so resistance and Q are unknown; the copper's resistance is the straight "
        "wire's, and the core and the nearness of the turns add to it"
    ]
    if core.older_factor is not None:
        notes.append(
            f"an older table of the maker has {core.older_factor * 1e9:.4g} nH for a turn where the newer one has "
            f"{core.factor * 1e9:.4g} nH: older cores give {100 * (core.older_factor / core.factor - 1):.0f} % more"
        )
    knee = _FERRITE_KNEE.get(core.material) if core.kind == "ferrite" else None
    if knee is not None and carrier > knee:
        notes.append(
            f"the factor is for low frequency; above about {show(knee, 'Hz', 2)} the permeability of type "
            f"{core.material} falls and its loss rises (from memory)"
        )
    return notes
