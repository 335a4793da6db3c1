"""A coil to wind for an inductance and a current: former, wire and turns, whole, and the length that is exact.

Formers, wires and what is asked of them are common practice, no source: wire of a quarter of a millimetre for each
ampere, turns a wire's breadth apart, coils about as long as wide.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.errors import ImpossibleError, RfstageError
from rfstage.parts import solenoid
from rfstage.parts.coil import AirCoil, air_coil
from rfstage.parts.medhurst import resistance_ratio
from rfstage.parts.wire import MU_0, ac_resistance
from rfstage.quantity import show

FORMERS = np.array([4, 5, 6, 7, 8, 10, 12, 16, 20, 25, 32, 40, 50, 63, 80, 100, 125, 160]) * 1e-3  # m
WIRES = np.array([0.5, 0.8, 1.0, 1.2, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0]) * 1e-3  # m
PER_AMPERE = 0.25e-3  # m of wire diameter for each ampere rms
THINNER, THICKER = 0.6, 2.1  # times that: the wires tried
STIFFEST = 0.25  # of the coil's diameter: thicker wire is not wound on it
CLOSEST, WIDEST = 1.15, 4.0  # pitch over wire
LONGEST, SHORTEST = 2.5, 0.3  # length over diameter
TRIED = 8  # of the candidates, best first
_TURNS = np.concatenate((np.arange(1.0, 6.0, 0.5), np.arange(6.0, 61.0)))  # legs on opposite sides: half a turn


Array = NDArray[np.float64]


class Winding(NamedTuple):
    """A coil as it is to be wound, the inductance [H] at the carrier that the circuit wants of it, and what to mind."""

    name: str
    coil: AirCoil
    wanted: float
    note: str = ""

    def retrimmed(self, inductance: float) -> Winding:
        """Return the coil squeezed or spread to another inductance at the carrier [H].

        Raises
        ------
        ImpossibleError
            If its turns can't be moved so far.
        """
        coil = self.coil
        low = inductance + coil.inductance - coil.rf_inductance  # what the skin takes does not depend on the length
        length = float(solenoid.length_for(low, coil.turns, coil.diameter, coil.wire_diameter))
        moved = _coil(coil.turns, coil.diameter, length, coil.wire_diameter, coil.carrier)
        return self._replace(coil=moved, wanted=inductance)


def choose_coil(
    name: str,
    inductance: float,
    rms_current: float,
    *,
    carrier: float,
    q: float = 0.0,
    former: float | None = None,
    wire: float | None = None,
) -> Winding:
    """Return the smallest sensible air coil for an inductance at the carrier.

    Parameters
    ----------
    name : str
        Of the part.
    inductance : float
        H, without self-capacitance.
    rms_current : float
        A, which chooses the wire where none is given.
    carrier : float
        Hz.
    q : float
        What it should have [-]: a smaller coil with less is taken only where no sensible one has it.
    former, wire : float or None
        Mean diameter of the winding and diameter of the wire [m].

    Raises
    ------
    ImpossibleError
        If no former gives it, with the nearest.

    Examples
    --------
    >>> made = choose_coil("L1", 1.0e-6, 3.0, carrier=7.1e6, q=150)
    >>> f"{made.coil.turns:g} turns, {made.coil.diameter * 1e3:g} mm, Q {made.coil.unloaded_q:.0f}"
    '8 turns, 16 mm, Q 186'
    """
    usual = PER_AMPERE * rms_current
    wires = np.array([wire]) if wire else WIRES[(THINNER * usual <= WIRES) & (max(THICKER * usual, 1e-3) >= WIRES)]
    diameters = np.array([former]) if former else FORMERS
    turns, diameter, thick = (x.reshape(-1) for x in np.meshgrid(_TURNS, diameters, wires))
    windable = diameter * STIFFEST >= thick * (1 - 1e-9)
    if not windable.any():
        raise ImpossibleError(
            f"{name}: {show(rms_current, 'A')} rms wants wire of about {show(wire or usual, 'm')}, which can't be "
            "wound on these diameters; a larger parts.former, another parts.wire, or a strap"
        )
    wanted = windable & _about(turns, diameter, thick, inductance)
    # where the formula sees none at all, all are tried, to name the nearest
    turns, diameter, thick = (x[wanted if wanted.any() else windable] for x in (turns, diameter, thick))
    close, wide = (solenoid.inductance(turns, diameter, turns * ratio * thick, thick) for ratio in (CLOSEST, WIDEST))
    fits = (close >= inductance) & (wide <= inductance)
    if not fits.any():
        raise ImpossibleError(
            f"{name}: no air coil of such wire gives {show(inductance, 'H')} at {show(rms_current, 'A')}; from "
            f"{show(float(wide.min()), 'H')} to {show(float(close.max()), 'H')} can be had (another parts.former or "
            "parts.wire; below it, a strap)"
        )
    turns, diameter, thick, close, wide = (x[fits] for x in (turns, diameter, thick, close, wide))
    share = np.log(close / inductance) / np.log(close / wide)
    lengths = turns * thick * CLOSEST * (WIDEST / CLOSEST) ** share  # near enough to choose by
    cost = _cost(turns, diameter, lengths, thick, carrier, inductance, q, usual)
    for k in np.argsort(cost)[:TRIED]:
        try:
            n, d, t = float(turns[k]), float(diameter[k]), float(thick[k])
            first = _coil(n, d, float(lengths[k]), t, carrier)
            return Winding(name, first, inductance).retrimmed(inductance)
        except RfstageError:
            continue
    raise ImpossibleError(f"{name}: no air coil for {show(inductance, 'H')} can be trimmed to it")


def _about(turns: Array, diameter: Array, thick: Array, inductance: float) -> NDArray[np.bool_]:
    """Return which coils may have the inductance at some length, by Wheeler's formula with a third to spare."""
    area = MU_0 * np.pi / 4 * (turns * diameter) ** 2
    most, least = (area / (turns * ratio * thick + 0.45 * diameter) for ratio in (CLOSEST, WIDEST))
    found: NDArray[np.bool_] = (most >= inductance / 1.35) & (least <= inductance * 1.35)
    return found


def _cost(
    turns: Array,
    diameter: Array,
    lengths: Array,
    thick: Array,
    carrier: float,
    inductance: float,
    q: float,
    usual: float,
) -> Array:
    """Return what speaks against each coil: its size, an odd shape, too little Q, thin wire."""
    shape, spacing = lengths / diameter, lengths / turns / thick
    straight = ac_resistance(thick, carrier) * turns * np.hypot(np.pi * diameter, lengths / turns)
    spread = resistance_ratio(np.clip(1 / spacing, 0.1, 1.0), np.clip(shape, SHORTEST, LONGEST))
    reached = 2 * np.pi * carrier * inductance / (straight * spread)
    odd = np.where((shape > LONGEST) | (shape < SHORTEST), 5.0, 0.0)
    away = np.abs(np.log(shape)) + np.abs(np.log(spacing / 2))
    lacking = 3 * np.maximum(np.log(max(q, 1e-9) / reached), 0.0)
    thin = 2 * np.maximum(np.log(max(usual, 1e-9) / thick), 0.0)
    cost: Array = np.log(diameter**2 * lengths) / 3 + away + odd + lacking + thin
    return cost


def _coil(turns: float, diameter: float, length: float, wire: float, carrier: float) -> AirCoil:
    return air_coil(turns, diameter=diameter, length=length, wire_diameter=wire, carrier=carrier)


def tap_for(coil: AirCoil, inductance: float) -> tuple[float, float]:
    """Return the turns from the grounded end at which a coil has an inductance [H], and its parts' coupling [-] there.

    Raises
    ------
    ImpossibleError
        If that is within a turn of an end.

    Examples
    --------
    >>> coil = choose_coil("L1", 2.0e-6, 3.0, carrier=7.1e6, q=150).coil
    >>> turns, coupling = tap_for(coil, 0.4e-6)
    >>> f"{turns:.1f} of {coil.turns:g} turns, coupling {coupling:.2f}"
    '3.4 of 10 turns, coupling 0.35'
    """
    if coil.turns < 2:
        raise ImpossibleError(f"a coil of {coil.turns:g} turns has no room for a tap")
    places = np.linspace(1.0, coil.turns - 1.0, 4 * math.ceil(coil.turns))
    below, _, _, coupling = solenoid.mutual_inductance(
        coil.turns, coil.diameter, coil.length, coil.wire_diameter, tap=places
    )
    if not below[0] <= inductance <= below[-1]:
        raise ImpossibleError(
            f"a tap for {show(inductance, 'H')} would lie within a turn of an end of the coil of {coil.turns:g} turns"
        )
    turns = float(np.interp(math.sqrt(inductance), np.sqrt(below), places))
    return turns, float(np.interp(turns, places, coupling))


def flaw(coil: AirCoil) -> str:
    """Return why a coil can't stand in the ladder, or nothing."""
    if coil.unloaded_q is None or coil.self_capacitance is None:
        return "; ".join(coil.notes)
    assert coil.self_resonance is not None
    if coil.self_resonance <= coil.carrier * math.sqrt(2):
        return f"its self-resonance of {show(coil.self_resonance, 'Hz')} is too near the carrier"
    return ""
