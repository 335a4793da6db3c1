"""What its leads make of a capacitor: series resonance, the capacitance in effect below it, the reactance above.

::

    ──[ L ]──┤├──      f₀ = 1/(2π√(LC));  below it the part looks like C/(1 − (f/f₀)²), above it like a coil
"""

from __future__ import annotations

import math
from typing import NamedTuple

from rfstage.errors import OutOfRangeError
from rfstage.parts.ranges import need
from rfstage.quantity import show

LEADED, CHIP = 5e-9, 1e-9  # H: lead inductance of a part on short wires, and of a chip (common practice, no source)

VHF = 30e6  # Hz: from here on capacitors are taken for chips (common practice, no source)


def lead_for(carrier: float) -> float:
    """Return the lead inductance [H] that a capacitor is taken to have at a carrier [Hz].

    Examples
    --------
    >>> lead_for(7.1e6), lead_for(145e6)
    (5e-09, 1e-09)
    """
    return LEADED if carrier < VHF else CHIP


class ShortState(NamedTuple):
    """A capacitor that is to be a short at the carrier: blocking, coupling or bypass.

    ``self_resonance`` [Hz]; ``reactance`` [ohm] with its leads, positive above self-resonance; ``problem`` in words,
    empty where there is none.
    """

    self_resonance: float
    reactance: float
    problem: str


def self_resonance(value: float, *, lead_inductance: float = LEADED) -> float:
    """Return where a capacitor [F] and its leads [H] are in series resonance [Hz].

    Raises
    ------
    OutOfRangeError
        If either is not above 0.

    Examples
    --------
    >>> round(self_resonance(8.8e-9) / 1e6, 1)
    24.0
    """
    need("value", value, "F", above=0)
    need("lead_inductance", lead_inductance, "H", above=0)
    return 1 / (2 * math.pi * math.sqrt(lead_inductance * value))


def apparent_capacitance(value: float, *, frequency: float, lead_inductance: float = LEADED) -> float:
    """Return the capacitance [F] that a capacitor with leads [H] has in effect at a frequency [Hz].

    Raises
    ------
    OutOfRangeError
        If a value is not above 0, or the frequency not below self-resonance: the part is a coil there.

    Examples
    --------
    >>> round(1e9 * apparent_capacitance(8.8e-9, frequency=7.1e6), 2)
    9.64
    """
    need("frequency", frequency, "Hz", above=0)
    resonance = self_resonance(value, lead_inductance=lead_inductance)
    if not frequency < resonance:
        raise OutOfRangeError(
            "frequency",
            show(frequency, "Hz"),
            f"below the self-resonance of {show(resonance, 'Hz')}",
            "above it the part is a coil: shorter leads, or smaller parts in parallel",
        )
    return value / (1 - (frequency / resonance) ** 2)


def nominal_capacitance(wanted: float, *, frequency: float, lead_inductance: float = LEADED) -> float:
    """Return the capacitor [F] to fit so that with its leads [H] it is the wanted capacitance [F] at a frequency [Hz].

    Raises
    ------
    OutOfRangeError
        If a value is not above 0.

    Examples
    --------
    >>> round(1e9 * nominal_capacitance(8.8e-9, frequency=7.1e6), 2)
    8.09
    """
    need("wanted", wanted, "F", above=0)
    need("frequency", frequency, "Hz", above=0)
    need("lead_inductance", lead_inductance, "H", above=0)
    return wanted / (1 + (2 * math.pi * frequency) ** 2 * lead_inductance * wanted)


def check_short(
    value: float, *, frequency: float, allowed_reactance: float, lead_inductance: float = LEADED
) -> ShortState:
    """Return whether a blocking or bypass capacitor [F] with its leads [H] is as good as a short at a frequency [Hz].

    Above self-resonance it may still be: what counts is the size of the reactance left, against what is allowed [ohm];
    a tenth of the resistance it works into is common practice, no source.

    Raises
    ------
    OutOfRangeError
        If a value is not above 0.

    Examples
    --------
    >>> found = check_short(82e-9, frequency=7.1e6, allowed_reactance=0.7)
    >>> round(found.reactance, 3), found.problem
    (-0.05, '')
    >>> check_short(82e-9, frequency=50e6, allowed_reactance=0.7).problem
    'its leads of 5.00 nH leave 1.53 Ω, more than 700 mΩ: shorter leads, or parts in parallel'
    """
    need("frequency", frequency, "Hz", above=0)
    need("allowed_reactance", allowed_reactance, "ohm", above=0)
    resonance = self_resonance(value, lead_inductance=lead_inductance)
    omega = 2 * math.pi * frequency
    reactance = omega * lead_inductance - 1 / (omega * value)
    problem = ""
    if abs(reactance) > allowed_reactance:
        left = f"{show(abs(reactance), 'ohm')}, more than {show(allowed_reactance, 'ohm')}"
        leads = f"its leads of {show(lead_inductance, 'H')} leave {left}: shorter leads, or parts in parallel"
        problem = leads if reactance > 0 else f"it leaves {left}: a larger capacitor"
    return ShortState(resonance, reactance, problem)
