r"""An air coil at its carrier: what it is worth, what it loses, where it stops being a coil.

::

             effective: what a bridge sees at the carrier
          ┌──────────────────────────────┐
    ──┬───[ rf_inductance ]──[ resistance ]───┬──     unloaded Q = ω·rf_inductance/resistance
      └────────────┤├─────────────────────────┘       self-resonance = 1/(2π√(rf_inductance·self_capacitance))
             self_capacitance                         x = carrier/self-resonance

    effective inductance = rf_inductance/(1 − x²), effective resistance = resistance/(1 − x²)², effective Q = Q (1 − x²)

``inductance`` is that of low frequency, the current evenly over the wire. At the carrier it has gone to the skin, and
the part of the inductance inside the wire is the smaller: that is ``rf_inductance``. The resistance is that of the
straight wire, exact, times Medhurst's ratio. Where his data end, what needs them is None and ``notes`` says so.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from rfstage.errors import OutOfRangeError
from rfstage.parts import solenoid, wire
from rfstage.parts.arrays import checked
from rfstage.parts.medhurst import LEAST_WIRE_TO_PITCH, LONGEST, SHORTEST, resistance_ratio, self_capacitance
from rfstage.quantity import show

SKIN_DEPTHS = 10.0  # wire diameters below this many are not yet at high frequency (common practice, no source)
FEW_TURNS = 10.0  # below it end turns count for much of a coil (common practice, no source)
NEAR_RESONANCE = 0.5  # of the self-resonance: beyond it a lumped coil is a poor picture (common practice, no source)
STEEP_PITCH = 0.5  # of the diameter: beyond it rings are a poor picture of a helix (common practice, no source)
ROWS_EACH_SIDE = 4
MOST_TAPS = 12


class AirCoil(NamedTuple):
    """A coil at its carrier; SI, temperature in °C; None is what the data do not reach.

    ``wall`` is that of a tube, or None. ``resistance`` and ``unloaded_q`` are the winding's own, as a branch with that
    inductance and self-capacitance takes them; the effective figures are seen from the coil's ends.
    """

    turns: float
    diameter: float
    length: float
    wire_diameter: float
    wall: float | None
    carrier: float
    temperature: float
    inductance: float
    rf_inductance: float
    effective_inductance: float | None
    self_capacitance: float | None
    self_resonance: float | None
    resistance: float | None
    effective_resistance: float | None
    unloaded_q: float | None
    effective_q: float | None
    wire_length: float
    notes: tuple[str, ...]

    @property
    def pitch(self) -> float:
        """Length over turns [m]."""
        return self.length / self.turns

    def loss(self, rms_current: float) -> float | None:
        """Return the heat in the coil [W] for an rms current at the carrier through its ends [A], or None."""
        return None if self.effective_resistance is None else rms_current**2 * self.effective_resistance


class Tap(NamedTuple):
    """A tap: turns from the grounded end, inductance up to it [H], coupling with the rest, share of the voltage."""

    turns: float
    inductance: float
    mutual: float
    coupling: float
    voltage: float


def effective(
    inductance: float, resistance: float | None, *, self_resonance: float, frequency: float
) -> tuple[float, float | None] | None:
    """Return inductance [H] and resistance [ohm] seen from a coil's ends, or None from its self-resonance up.

    Parameters
    ----------
    inductance, resistance : float, float or None
        Of the winding by itself, at the frequency.
    self_resonance, frequency : float
        Hz.

    Examples
    --------
    >>> inductance, resistance = effective(1e-6, 5.0, self_resonance=60.155e6, frequency=25e6)
    >>> round(inductance * 1e6, 2), round(2 * math.pi * 25e6 * inductance / resistance)
    (1.21, 26)
    """
    left = 1 - (frequency / self_resonance) ** 2
    if left <= 0:
        return None
    return inductance / left, None if resistance is None else resistance / left**2


def air_coil(
    turns: float,
    *,
    diameter: float,
    length: float,
    wire_diameter: float,
    carrier: float,
    temperature: float = 20.0,
    wall: float | None = None,
) -> AirCoil:
    """Return all there is to know of a single-layer air coil of copper at its carrier.

    Parameters
    ----------
    turns : float
        1 or more, whole or not.
    diameter, length, wire_diameter : float
        As `rfstage.parts.solenoid.inductance` takes them [m].
    carrier : float
        Hz.
    temperature : float
        Of the copper [°C].
    wall : float or None
        Wall of a tube [m], at least three skin depths; None for wire.

    Raises
    ------
    OutOfRangeError
        If a number is not in its range. Where only Medhurst's data end, nothing is raised: see `AirCoil`.

    Examples
    --------
    >>> coil = air_coil(10, diameter=50e-3, length=50e-3, wire_diameter=2e-3, carrier=7.1e6)
    >>> f"{coil.inductance * 1e6:.3f} uH, Q {coil.unloaded_q:.0f}, {coil.self_resonance / 1e6:.0f} MHz"
    '3.426 uH, Q 586, 57 MHz'
    """
    low = float(solenoid.inductance(turns, diameter, length, wire_diameter))
    checked("carrier", carrier, "Hz", above=0)
    pitch, omega = length / turns, 2 * math.pi * carrier
    wire_length = turns * math.hypot(math.pi * diameter, pitch)
    straight = float(wire.ac_resistance(wire_diameter, carrier, temperature=temperature, wall=wall))
    inside = float(wire.internal_impedance(wire_diameter, carrier, temperature=temperature).imag) / omega
    # as rings, which is how the inductance counts them
    at_carrier = low - (wire.MU_0 / (8 * math.pi) - inside) * turns * math.pi * diameter
    depths = wire_diameter / float(wire.skin_depth(carrier, temperature=temperature))
    notes = _geometry_notes(turns, diameter, pitch, depths)

    ratio = _within_data(lambda: resistance_ratio(wire_diameter / pitch, length / diameter))
    resistance = None if ratio is None else straight * wire_length * ratio
    if ratio is None:
        notes.append(
            f"resistance and Q are unknown: wire over pitch is {wire_diameter / pitch:.3g}, and Medhurst's data begin "
            f"at {LEAST_WIRE_TO_PITCH:g}; the straight wire alone has {show(straight * wire_length, 'ohm')}"
        )
    capacitance = _within_data(lambda: self_capacitance(diameter, length))
    resonance = None if capacitance is None else 1 / (2 * math.pi * math.sqrt(at_carrier * capacitance))
    seen = None
    if resonance is None:
        notes.append(
            f"self-capacitance and self-resonance are unknown: length over diameter is {length / diameter:.4g}, and "
            f"Medhurst's data go from {SHORTEST:g} to {LONGEST:g}"
        )
    else:
        seen = effective(at_carrier, resistance, self_resonance=resonance, frequency=carrier)
        notes += _resonance_notes(carrier, resonance)
    seen_inductance, seen_resistance = seen or (None, None)
    known = seen_inductance is not None and seen_resistance is not None
    return AirCoil(
        turns=turns,
        diameter=diameter,
        length=length,
        wire_diameter=wire_diameter,
        wall=wall,
        carrier=carrier,
        temperature=temperature,
        inductance=low,
        rf_inductance=at_carrier,
        effective_inductance=seen_inductance,
        self_capacitance=capacitance,
        self_resonance=resonance,
        resistance=resistance,
        effective_resistance=seen_resistance,
        unloaded_q=None if resistance is None else omega * at_carrier / resistance,
        effective_q=omega * seen_inductance / seen_resistance if known else None,  # type: ignore[operator]  # known
        wire_length=wire_length,
        notes=tuple(notes),
    )


def _within_data(look_up: object) -> float | None:
    try:
        return float(look_up())  # type: ignore[operator]  # a lambda, by both callers
    except OutOfRangeError:
        return None


def _geometry_notes(turns: float, diameter: float, pitch: float, depths: float) -> list[str]:
    notes = []
    if pitch > STEEP_PITCH * diameter:
        notes.append(
            f"the pitch is {pitch / diameter:.2g} of the diameter: so steep a helix is poorly described by rings, and "
            "the inductance is rough"
        )
    if depths < SKIN_DEPTHS:
        notes.append(
            f"the wire is only {depths:.2g} skin depths thick: Medhurst's ratio is for high frequency, so the "
            "resistance is an upper figure, and the Q a lower one"
        )
    if turns < FEW_TURNS:
        notes.append(
            "Medhurst's ratio is for many turns; with few, the end turns lose less, so the resistance is rather an "
            "upper figure (from memory)"
        )
    return notes


def _resonance_notes(carrier: float, resonance: float) -> list[str]:
    if carrier >= resonance:
        return ["the carrier is above the self-resonance: the coil is no inductance there"]
    if carrier > NEAR_RESONANCE * resonance:
        return [
            f"the carrier is {carrier / resonance:.2g} of the self-resonance, which is known to some 5 %: the "
            "effective figures are rough"
        ]
    return []


def at_length(coil: AirCoil, length: float) -> AirCoil:
    """Return the same winding squeezed or spread to another length [m]."""
    return air_coil(
        coil.turns,
        diameter=coil.diameter,
        length=length,
        wire_diameter=coil.wire_diameter,
        carrier=coil.carrier,
        temperature=coil.temperature,
        wall=coil.wall,
    )


def squeezed_and_spread(coil: AirCoil) -> tuple[AirCoil, ...]:
    """Return the winding at lengths from close-wound up past its own, as far as spreading lowers the inductance.

    Its own length is one of them, and the lengths rise.

    Examples
    --------
    >>> coil = air_coil(10, diameter=50e-3, length=50e-3, wire_diameter=2e-3, carrier=7.1e6)
    >>> [round(c.length * 1e3) for c in squeezed_and_spread(coil)]
    [20, 25, 32, 40, 50, 59, 71, 84, 100]
    """
    if coil.turns == 1:  # nothing to squeeze
        return (coil,)
    own, close = coil.length, coil.turns * coil.wire_diameter
    far = min(2 * own, float(solenoid.longest(coil.turns, coil.diameter, coil.wire_diameter)))
    lengths = [own]
    if own > close * (1 + 1e-6):
        lengths = [*(float(x) for x in np.geomspace(close, own, ROWS_EACH_SIDE + 1)[:-1]), *lengths]
    if far > own * (1 + 1e-6):
        lengths += [float(x) for x in np.geomspace(own, far, ROWS_EACH_SIDE + 1)[1:]]
    return tuple(coil if length == own else at_length(coil, length) for length in lengths)


def taps(coil: AirCoil) -> tuple[Tap, ...]:
    """Return taps at whole turns from the grounded end, thinned to a dozen; none where the coil is too short for one.

    Inductances are those of low frequency; the voltage is the tap's share of the whole coil's with nothing drawn.

    Examples
    --------
    >>> coil = air_coil(10, diameter=50e-3, length=50e-3, wire_diameter=2e-3, carrier=7.1e6)
    >>> [f"{tap.turns:.0f}: {tap.inductance * 1e6:.2f} uH, {tap.voltage:.2f}" for tap in taps(coil)[1:3]]
    ['2: 0.33 uH, 0.18', '3: 0.62 uH, 0.28']
    """
    whole = np.arange(1.0, math.floor(coil.turns - 1 + 1e-9) + 1)
    if not whole.size:
        return ()
    step = -(-whole.size // MOST_TAPS)
    places = whole[step - 1 :: step]
    low, _, mutual, coupling = solenoid.mutual_inductance(
        coil.turns, coil.diameter, coil.length, coil.wire_diameter, tap=places
    )
    rows = zip(places, low, mutual, coupling, (low + mutual) / coil.inductance, strict=True)
    return tuple(Tap(*(float(x) for x in row)) for row in rows)
