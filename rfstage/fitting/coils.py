"""A coil to wind for an inductance and a current: former, wire and turns, whole, and the length that is exact.

Formers, wires and what is asked of them are common practice, no source: wire of a quarter of a millimetre for each
ampere, and above some 9 MHz, where the skin is so thin that this would run hot, what its heat wants; turns a wire's
breadth apart, coils about as long as wide.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.errors import ImpossibleError, RfstageError
from rfstage.parts import solenoid
from rfstage.parts.arrays import rising_root
from rfstage.parts.coil import AirCoil, air_coil
from rfstage.parts.medhurst import resistance_ratio
from rfstage.parts.wire import MU_0, ac_resistance, internal_impedance
from rfstage.quantity import show

FORMERS = np.array([4, 5, 6, 7, 8, 10, 12, 16, 20, 25, 32, 40, 50, 63, 80, 100, 125, 160]) * 1e-3  # m
WIRES = np.array([0.5, 0.8, 1.0, 1.2, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0]) * 1e-3  # m
PER_AMPERE = 0.25e-3  # m of wire diameter for each ampere rms
WARM = 2000.0  # W/m² of the wire's surface: bare copper in still air is then about 100 K above it
HOT = 2 * WARM  # from here on it is said
WOUND = 1.6  # times its straight resistance, to choose a wire by: Medhurst's ratio for turns a wire's breadth apart
THINNER, THICKER = 0.7, 2.1  # times that: the wires tried
STIFFEST = 0.25  # of the coil's diameter: thicker wire is not wound on it
CLOSEST, WIDEST = 1.15, 4.0  # pitch over wire
TIGHTEST, LOOSEST = 1.05, 5.0  # the same, after squeezing or spreading
LONGEST, SHORTEST = 2.5, 0.3  # length over diameter
TRIED = 8  # of the candidates, best first
_TURNS = np.concatenate((np.arange(1.0, 6.0, 0.5), np.arange(6.0, 61.0)))  # legs on opposite sides: half a turn


Array = NDArray[np.float64]


class Winding(NamedTuple):
    """A coil as it is to be wound.

    ``wanted`` is the inductance [H] at the carrier that the circuit wants of it, without self-capacitance; ``current``
    [A rms] what it carries, of a tapped coil both parts' together; ``heat`` [W] in it where that is known better than
    from the current; ``tap`` in turns from the grounded end, or None; ``note`` what else to mind.
    """

    name: str
    coil: AirCoil
    wanted: float
    current: float = 0.0
    heat: float | None = None
    tap: float | None = None
    note: str = ""

    @property
    def loss(self) -> float | None:
        """Heat in the coil [W], all its current at the carrier; None where its resistance is not known."""
        return self.coil.loss(self.current) if self.heat is None else self.heat

    @property
    def hot(self) -> bool:
        """Whether it loses more from each bit of the wire's surface than still air takes from copper unhurt."""
        surface = math.pi * self.coil.wire_diameter * self.coil.wire_length
        return (self.loss or 0.0) > HOT * surface

    def retrimmed(self, inductance: float) -> Winding:
        """Return the coil squeezed or spread to another inductance at the carrier [H].

        Raises
        ------
        ImpossibleError
            If its turns can't be moved so far: until they nearly touch, or are five wires apart; or if it is then no
            coil for the ladder.
        """
        coil = self.coil
        low = inductance + coil.inductance - coil.rf_inductance  # what the skin takes does not depend on the length
        length = float(solenoid.length_for(low, coil.turns, coil.diameter, coil.wire_diameter))
        spacing = length / coil.turns / coil.wire_diameter
        if coil.turns > 1 and not TIGHTEST <= spacing <= LOOSEST:
            raise ImpossibleError(
                f"{self.name}: {coil.turns:g} turns would have to be {show(length, 'm')} long for "
                f"{show(inductance, 'H')}, a pitch of {spacing:.3g} wires; allowed {TIGHTEST:g} to {LOOSEST:g}"
            )
        moved = _coil(coil.turns, coil.diameter, length, coil.wire_diameter, coil.carrier)
        if wrong := flaw(moved):
            raise ImpossibleError(f"{self.name}: {wrong}")
        return self._replace(coil=moved, wanted=inductance)


def usual_wire(rms_current: float, carrier: float) -> float:
    """Return the wire's diameter [m] for a current [A rms] at a carrier [Hz].

    Examples
    --------
    >>> [round(usual_wire(10.0, f) * 1e3, 2) for f in (1.8e6, 14.2e6, 145e6)]
    [2.5, 2.85, 5.06]
    """
    # a metre of it loses I²·R/(π d), and has a surface of π d, R being the skin's resistance
    skin = math.pi * 1e-3 * float(ac_resistance(1e-3, carrier))
    return rms_current * max(PER_AMPERE, math.sqrt(WOUND * skin / WARM) / math.pi)


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
    '10 turns, 16 mm, Q 196'
    """
    usual = usual_wire(rms_current, carrier)
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
    inside = internal_impedance(wires, carrier).imag / (2 * np.pi * carrier)  # by the metre, of each wire
    skin = (MU_0 / (8 * np.pi) - np.interp(thick, wires, inside)) * turns * np.pi * diameter
    close, wide = (
        solenoid.inductance(turns, diameter, turns * ratio * thick, thick) - skin for ratio in (CLOSEST, WIDEST)
    )
    fits = (close >= inductance) & (wide <= inductance)
    if not fits.any():
        raise ImpossibleError(
            f"{name}: no air coil of such wire gives {show(inductance, 'H')} at {show(rms_current, 'A')}; "
            f"{_nearest(inductance, close, wide)} (another parts.former or parts.wire; for so little, a strap)"
        )
    turns, diameter, thick, close, wide = (x[fits] for x in (turns, diameter, thick, close, wide))
    share = np.log(close / inductance) / np.log(close / wide)
    lengths = turns * thick * CLOSEST * (WIDEST / CLOSEST) ** share  # near enough to choose by
    cost = _cost(turns, diameter, lengths, thick, carrier, inductance, q, usual)
    why = ""
    for k in np.argsort(cost)[:TRIED]:
        try:
            n, d, t = float(turns[k]), float(diameter[k]), float(thick[k])
            first = _coil(n, d, float(lengths[k]), t, carrier)
            return Winding(name, first, inductance, rms_current).retrimmed(inductance)
        except RfstageError as error:
            why = why or str(error).removeprefix(f"{name}: ")
    raise ImpossibleError(f"{name}: no air coil for {show(inductance, 'H')}: {why}")


def _nearest(inductance: float, close: Array, wide: Array) -> str:
    """Return what can be had on either side of an inductance [H] that can't."""
    below, above = close[close < inductance], wide[wide > inductance]
    words = [show(float(value), "H") for value in (*sorted(below)[-1:], *sorted(above)[:1])]
    return f"nearest {' and '.join(words)}"


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
    # self-resonance by half a picofarad for each centimetre of diameter: too near, and it is no coil
    near = np.where((2 * np.pi * carrier) ** 2 * inductance * 0.5e-10 * diameter > 0.4, 5.0, 0.0)
    thin = 2 * np.maximum(np.log(max(usual, 1e-9) / thick), 0.0)
    cost: Array = np.log(diameter**2 * lengths) / 3 + away + odd + lacking + near + thin
    return cost


def _coil(turns: float, diameter: float, length: float, wire: float, carrier: float) -> AirCoil:
    return air_coil(turns, diameter=diameter, length=length, wire_diameter=wire, carrier=carrier)


def tap_for(coil: AirCoil, inductance: float) -> float:
    """Return the turns from the grounded end at which a coil has an inductance at the carrier [H].

    Raises
    ------
    ImpossibleError
        If that is within a turn of an end.

    Examples
    --------
    >>> coil = choose_coil("L1", 2.0e-6, 3.0, carrier=7.1e6, q=150).coil
    >>> turns = tap_for(coil, 0.4e-6)
    >>> f"{turns:.1f} of {coil.turns:g} turns, coupling {tapped(coil, turns)[2]:.2f}"
    '4.6 of 14 turns, coupling 0.32'
    """
    if coil.turns < 2:
        raise ImpossibleError(f"a coil of {coil.turns:g} turns has no room for a tap")

    def below(turns: Array) -> Array:
        found = solenoid.mutual_inductance(coil.turns, coil.diameter, coil.length, coil.wire_diameter, tap=turns)
        return np.asarray(found[0]) - _inside(coil) * turns

    first, last = np.array(1.0), np.array(coil.turns - 1.0)
    if not below(first) <= inductance <= below(last):
        raise ImpossibleError(
            f"a tap for {show(inductance, 'H')} would lie within a turn of an end of the coil of {coil.turns:g} turns"
        )
    return float(rising_root(below, np.array(inductance), first, last))


def _inside(coil: AirCoil) -> float:
    """Return what the skin takes of the inductance of a turn [H]."""
    return (coil.inductance - coil.rf_inductance) / coil.turns


def tapped(coil: AirCoil, turns: float) -> tuple[float, float, float]:
    """Return what a tap makes of a coil at the carrier: inductance above and below it [H], and their coupling [-]."""
    below, above, mutual, _ = (
        float(x)
        for x in solenoid.mutual_inductance(coil.turns, coil.diameter, coil.length, coil.wire_diameter, tap=turns)
    )
    inside = _inside(coil)
    above, below = above - inside * (coil.turns - turns), below - inside * turns
    return above, below, mutual / math.sqrt(above * below)


def flaw(coil: AirCoil) -> str:
    """Return why a coil can't stand in the ladder, or nothing."""
    if coil.unloaded_q is None or coil.self_capacitance is None:
        return "; ".join(coil.notes)
    assert coil.self_resonance is not None
    if coil.self_resonance <= coil.carrier * math.sqrt(2):
        return f"its self-resonance of {show(coil.self_resonance, 'Hz')} is too near the carrier"
    return ""
