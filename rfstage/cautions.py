"""Cautions from the job's own numbers. They defer to local codes, the licence and licensed practice."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

from rfstage.constants import SAFE_VOLTAGE
from rfstage.quantity import show, show_orders

RF_BURN = 30.0  # V peak: RF above about this burns skin on contact (common practice, no source)
HIGH_CURRENT = 10.0  # A: a low-voltage supply that gives this heats rings and tools (common practice, no source)
RESONANCE, FAILED_BLOCKING = "choke resonance", "blocking capacitor"  # topics that others look for
DIP_CAUTION, DIP_STRONG = 0.03, 0.10
FAR_ABOVE_SUPPLY = 3.0  # times the supply
POWER_MISSED = 0.01  # of the asked power: below it a meter shows no difference
LOSSY_TANK = 0.85  # efficiency below which a tank is mostly heat (common practice, no source)
LEADS = 10  # times the reactance of its leads that a capacitor should have
LOW_RESISTANCE = 4.0  # ohm
LEAD = 5e-9  # H, of an input capacitor; its reactance must stay ten times below the capacitor's


class Caution(NamedTuple):
    """One caution: a topic in a word or two, and the text."""

    topic: str
    text: str


def safety(
    *,
    family: str,
    supply: float,
    dc_current: float,
    volts: tuple[float, str],
    amperes: tuple[float, str],
    power: float,
    output: str,
    carrier: float,
) -> list[Caution]:
    """Return what can hurt someone in a stage of these volts, amperes, watts and hertz.

    ``volts`` (peak) and ``amperes`` (rms) are the most RF in the open, with the name of the part that carries it;
    ``output`` says what to do where a failed blocking capacitor puts the supply on the load, else it is empty.
    """
    found = []
    if supply > SAFE_VOLTAGE:
        found.append(
            Caution(
                "high voltage",
                (
                    f"{show(supply, 'V')} dc can kill, and stays on the capacitors after switch-off; bleeders fail "
                    "open. Switch off, unplug, wait, measure, then short with an insulated stick before touching; work "
                    "with one hand, never alone."
                ),
            )
        )
    if dc_current > HIGH_CURRENT:
        found.append(
            Caution(
                "high current",
                (
                    f"{show(dc_current, 'A')} from the supply burns through rings, tools and thin wire: take jewellery "
                    "off, fuse the lead at the supply."
                ),
            )
        )
    if volts[0] > RF_BURN:
        found.append(
            Caution(
                "RF burns",
                (
                    f"{show(volts[0], 'V')} peak RF stands on {volts[1]}, {show(amperes[0], 'A')} rms flow in "
                    f"{amperes[1]}; it burns deeply, at low supply voltages too. Enclose the tank and never adjust it "
                    "by bare hand with power on."
                ),
            )
        )
    if output:
        found.append(
            Caution(
                FAILED_BLOCKING,
                f"if the blocking capacitor fails, {show(supply, 'V')} reaches the antenna: {output}.",
            )
        )
    found.append(
        Caution(
            "load",
            (
                "never key without a load; tune first at reduced power into a dummy load rated for "
                f"{show(power, 'W')} or more."
            ),
        )
    )
    if family == "tube":
        found.append(Caution("tube", "never apply screen voltage without anode voltage; glass and anodes stay hot."))
    elif carrier >= 30e6 or power >= 50:
        found.append(Caution("beryllium oxide", "some RF power packages hold it: never file, crush or break one."))
    found.append(
        Caution(
            "rules",
            (
                "exposure, spurious limits and wiring follow local codes, the licence and licensed practice; they "
                "decide, not this program."
            ),
        )
    )
    return found


def about_dip(dip: float, *, network: str, corrected: bool) -> list[Caution]:
    """Return what a trough dip [-] says of the textbook's figures, and what lessens it."""
    if dip <= DIP_CAUTION:
        return []
    strength = "do not hold" if dip > DIP_STRONG else "are optimistic"
    shunt = network in ("pi", "pi-l", "tapped-coil", "link")
    cure = "a higher Q shorts them" if shunt else "network pi shorts them"
    held = "; the correction to the settled power makes up for it" if corrected else ""
    return [
        Caution(
            "harmonic terminations",
            f"trough dip {dip:.2f}: the network leaves the device's harmonics an impedance, so that the textbook's "
            f"figures {strength}{held}; {cure}.",
        )
    ]


def about_settled(
    *,
    supply: float,
    peak_voltage: float,
    rating: float | None,
    one_way: bool,
    minimum_voltage: float,
    moved: tuple[float, float] | None,
    asked_power: float | None,
    output_power: float,
) -> list[Caution]:
    """Return what a steady state (V, W) says of the stage; a peak beyond what the device stands comes first.

    ``one_way``: nothing conducts when the voltage falls below zero. ``moved``: how much dc current [-] and output
    [dB] still moved when the orders were last doubled, or None where they have settled.
    """
    found = []
    if rating is not None and peak_voltage > rating:
        found.append(
            Caution(
                "peak voltage",
                f"the settled peak of {show(peak_voltage, 'V')} is beyond the rating of {show(rating, 'V')}: the "
                "settled figures are not those of a living device.",
            )
        )
    elif peak_voltage > FAR_ABOVE_SUPPLY * supply:
        found.append(
            Caution(
                "peak voltage",
                f"the settled peak of {show(peak_voltage, 'V')} is more than {FAR_ABOVE_SUPPLY:g} times the supply: "
                "few devices stand that.",
            )
        )
    if asked_power is not None and abs(output_power / asked_power - 1) > POWER_MISSED:
        found.append(
            Caution(
                "settled power",
                f"in steady state this stage gives {show(output_power, 'W')} where {show(asked_power, 'W')} is asked.",
            )
        )
    if minimum_voltage < 0 and one_way:
        found.append(
            Caution(
                "negative voltage",
                f"the settled output voltage falls to {show(minimum_voltage, 'V')}: the law has no current there; in "
                "a tube grid and screen take it, in a transistor its junction (reverse_conduction).",
            )
        )
    if moved is not None:
        found.append(
            Caution(
                "harmonic orders",
                f"the last doubling of the orders still moved the dc current by {100 * moved[0]:.2g} % and the output "
                f"by {moved[1]:.2g} dB: a narrow pulse, or a network that leaves the device's harmonics nowhere to go.",
            )
        )
    return found


def short_of_reactance(input_capacitance: float | None, carrier: float) -> bool:
    """Return whether a capacitor [F] has under ten times the reactance of its own leads at the carrier [Hz]."""
    omega = 2 * math.pi * carrier
    return input_capacitance is not None and 1 / (omega * input_capacitance) < LEADS * omega * LEAD


def about_low_resistance(
    resistance: float, input_capacitance: float | None, carrier: float, ways: Sequence[str]
) -> list[Caution]:
    """Return what is too small to build of load resistance [ohm] and input capacitor [F], and the ways out."""
    if resistance < LOW_RESISTANCE:
        why = f"a load resistance of {show(resistance, 'ohm')} is hard to build"
    elif input_capacitance is not None and short_of_reactance(input_capacitance, carrier):
        why = (
            f"the input capacitor of {show(input_capacitance, 'F')} has under ten times the reactance of its own "
            f"leads ({show(LEAD, 'H')})"
        )
    else:
        return []
    out = "; ".join(ways) or "a higher supply, two devices or a wide-band transformer, none of which does it alone here"
    return [Caution("low resistance", f"{why}. Ways out, best first: {out}.")]


def about_load_file(continued: Sequence[int]) -> list[Caution]:
    """Return what was done at the harmonic orders that a measured load does not reach."""
    if not continued:
        return []
    return [
        Caution(
            "load file",
            f"the measured load does not reach orders {show_orders(continued)}; it was continued from its nearest end "
            "as a series resistance with a coil or capacitor, so those levels are estimates.",
        )
    ]


def about_tank_loss(efficiency: float, loaded_q: float) -> list[Caution]:
    """Return what to change where the tank keeps much of the power; ``efficiency`` and ``loaded_q`` [-]."""
    if efficiency >= LOSSY_TANK:
        return []
    return [
        Caution(
            "tank loss",
            f"the tank keeps {100 * (1 - efficiency):.0f} % of the device's power at a loaded Q of {loaded_q:.3g}: "
            "coils of higher Q, or a lower loaded Q where harmonics and output capacitance allow it.",
        )
    ]


def about_resonance(resonance: tuple[float, float] | None, cure: str = "") -> list[Caution]:
    """Return the warning of a choke resonance (Hz, dB) that stands above the carrier's level, and its cure."""
    if resonance is None or resonance[1] <= 0:
        return []
    return [
        Caution(
            RESONANCE,
            (
                f"the choke resonates with the capacitors behind it at {show(resonance[0], 'Hz')}, "
                f"{resonance[1]:.0f} dB above the carrier's level, where the stage may oscillate: {cure or 'damp it'}."
            ),
        )
    ]
