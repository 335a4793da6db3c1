"""What to wind and what to buy, what it must stand, and what these parts make of the stage."""

from __future__ import annotations

import math

from rich.text import Text

from rfstage.designs.judging import ratings_of
from rfstage.fitting.capacitors import BLOCKING, TIGHT, Bought
from rfstage.fitting.coils import HOT, Winding
from rfstage.fitting.fitted import Comparison, Fitting
from rfstage.fitting.rings import Ring
from rfstage.parts.leads import check_short, self_resonance
from rfstage.parts.toroid import FLUX_SOURCE
from rfstage.quantity import show, show_complex
from rfstage.report.judged import rating_lines, signed
from rfstage.report.page import NO_BREAK, Cell, Look, columns, heading, note
from rfstage.report.ranking import ROOMY

NEAR_RESONANCE = 2.0  # self-resonance over carrier: below it leads weigh more than tolerances
BLOCKING_SHARE = 0.1  # of the load resistance, that a blocking capacitor may leave (common practice, no source)
AIR = 500.0  # V: above it a trimmer has air or vacuum between its plates (common practice, no source)
MOST_AMPERES = 10.0  # rms with its margin, that one usual part stands (common practice, no source)
LUCKY = 10.0  # dB below the ideal level, that only a resonance of leads makes
CHANGED = 0.1  # of the power, from where the parts have made another stage of it


def parts_lines(fitting: Fitting, look: Look) -> list[Text]:
    """Return the parts list and the comparison with the ideal stage."""
    lines = heading(look, "Capacitors to buy")
    rows = [
        [Cell(t, "dim", right=k > 1) for k, t in enumerate(("part", "to fit", "each rated", "amps to stand", "loss"))]
    ]
    for bought in fitting.bought:
        rows += _bought_rows(bought)
    lines += columns(look, rows, gap=1 if look.width < ROOMY else 2)
    for bought in fitting.bought:
        lines += _trimmer_line(bought, look)
        lines += _lead_line(bought, fitting, look)
        lines += _current_line(bought, look)
    lines += note(
        look,
        "Volts (dc and RF peak) and amperes rms with their margins, all orders, "
        + ("as the stage settles with these parts." if fitting.state else "from the design."),
        style="dim",
    )
    lines += heading(look, "Coils to wind")
    for winding in fitting.wound:
        lines += _coil_lines(winding, look)
    for ring in fitting.rings:
        lines += _ring_lines(ring, look)
    for name, reason in fitting.ideal:
        lines += note(look, f"{name}: stays as designed: {reason}", hanging=2)
    return lines + _compared(fitting, look)


def _bought_rows(bought: Bought) -> list[list[Cell]]:
    words = [show(value, "F") for value in bought.values]
    if bought.trimmer is not None:
        rating = bought.stresses[-1].voltage_rating
        kind = "trimmer" if rating is not None and rating <= AIR else "air variable"
        words.append(f"{kind} {show(bought.trimmer.least, 'F')} to {show(bought.trimmer.most, 'F')}")
    rows = []
    for k, (word, stress) in enumerate(zip(words, bought.stresses, strict=True)):
        rated = "special" if stress.voltage_rating is None else show(stress.voltage_rating, "V")
        rows.append(
            [
                Cell(bought.name if k == 0 else "", "bold"),
                Cell(word if k == 0 else f"with {word}"),
                Cell(rated, right=True),
                Cell(show(stress.current_to_stand, "A"), right=True),
                Cell("none" if not stress.loss else show(stress.loss, "W"), right=True),
            ]
        )
    return rows


def _trimmer_line(bought: Bought, look: Look) -> list[Text]:
    if bought.setting is None:
        return []
    words = (
        f"{bought.name}: set to {show(bought.setting, 'F')}, {show(bought.total, 'F')} in all, with leads of "
        f"{show(bought.lead, 'H')}; the design has {show(bought.wanted, 'F')} without leads"
    )
    if bought.spare < TIGHT:
        words += f". Only {bought.spare:.1f} % is left to one side: measure the fixed parts, and choose them for it"
    return note(look, words, hanging=2)


def _lead_line(bought: Bought, fitting: Fitting, look: Look) -> list[Text]:
    """Return what the leads do at the carrier, where they do much."""
    carrier = fitting.stage.carrier
    if bought.lead == 0:
        return []
    if bought.role == BLOCKING:
        allowed = BLOCKING_SHARE * abs(fitting.retrimmed)
        found = check_short(
            bought.total, frequency=carrier, allowed_reactance=allowed, lead_inductance=bought.lead
        ).problem
    else:
        resonance = self_resonance(bought.total, lead_inductance=bought.lead)
        found = (
            f"with its leads of {show(bought.lead, 'H')} it is in resonance at {show(resonance, 'Hz')}, near the "
            "carrier: each millimetre counts; chips, or shorter leads (--lead)"
            if resonance < NEAR_RESONANCE * carrier
            else ""
        )
    return note(look, f"! {bought.name}: {found}", hanging=2, style="yellow") if found else []


def _current_line(bought: Bought, look: Look) -> list[Text]:
    """Return into how many parts to share the largest, where one does not stand its current."""
    most = max(stress.current_to_stand for stress in bought.stresses)
    if most <= MOST_AMPERES:
        return []
    share = math.ceil(most / MOST_AMPERES)
    words = (
        f"! {bought.name}: {show(most, 'A')} is more than one usual part stands: share the capacitance among {share} "
        "or more side by side, or take one made for it"
    )
    return note(look, words, hanging=2, style="yellow")


def _ring_lines(ring: Ring, look: Look) -> list[Text]:
    coil = ring.coil
    turns = f"{coil.turns} turns" if ring.far_turns is None else f"{coil.turns} : {ring.far_turns} turns"
    return note(
        look,
        f"{ring.name}: {turns} on {coil.core.name}, wire to {show(coil.wire_diameter, 'm')}; "
        f"{show(coil.inductance, 'H')} for the {show(ring.wanted, 'H')} wanted; {1e3 * ring.flux:.2g} mT peak, all "
        f"orders and dc, of {1e3 * ring.limit:.2g} mT ({FLUX_SOURCE}); its core loss is not in the data",
        hanging=2,
    )


def _coil_lines(winding: Winding, look: Look) -> list[Text]:
    coil = winding.coil
    q = f"Q{NO_BREAK}" + ("unknown" if coil.unloaded_q is None else f"{coil.unloaded_q:.0f}")
    resonance = "" if coil.self_resonance is None else f", self-resonance {show(coil.self_resonance, 'Hz')}"
    heat = "" if winding.loss is None else f" and {show(winding.loss, 'W')} of heat"
    lines = note(
        look,
        f"{winding.name}: {coil.turns:g} turns of {show(coil.wire_diameter, 'm')} copper on "
        f"{show(coil.diameter - coil.wire_diameter, 'm')} (mean diameter {show(coil.diameter, 'm')}), "
        f"{show(coil.length, 'm')} long (pitch {show(coil.pitch, 'm')}), {show(coil.wire_length, 'm')} of wire and its "
        f"ends; {show(winding.wanted, 'H')} at the carrier, {q}{resonance}; {show(winding.current, 'A')}{heat}",
        hanging=2,
    )
    if winding.tap is not None:
        lines += note(look, f"tap at {winding.tap:.2f} turns from the grounded end", indent=4, hanging=2)
    if winding.note:
        lines += note(look, winding.note, indent=4, hanging=2)
    if winding.hot:
        lines += note(
            look,
            f"! it runs hot, with over {HOT / 1e4:g} W from each square centimetre of wire: thicker wire or tube, or "
            "moving air",
            indent=4,
            hanging=2,
            style="yellow",
        )
    return lines


def _compared(fitting: Fitting, look: Look) -> list[Text]:
    lines = heading(look, "The stage with these parts")
    rows = [[Cell(""), Cell("ideal", "dim", right=True), Cell("with parts", "dim", right=True)]]
    rows += [
        [Cell(c.name, "dim"), Cell(_figure(c, c.ideal), right=True), Cell(_figure(c, c.fitted), "bold", right=True)]
        for c in fitting.compared
    ]
    lines += columns(look, rows)
    if fitting.trouble:
        lines += note(look, f"! no steady state with these parts: {fitting.trouble}", style="bold red")
    power = fitting.compared[0]
    if power.ideal and power.fitted is not None and abs(power.fitted / power.ideal - 1) > CHANGED:
        way = "less drive" if power.fitted > power.ideal else "shorter leads (--lead), or another network"
        lines += note(
            look,
            f"! with these parts it gives {show(power.fitted, 'W')} instead of {show(power.ideal, 'W')}: leads and "
            f"self-capacitances leave the device's harmonics another impedance; {way}",
            style="bold red",
        )
    lines += _judged(fitting, look)
    moved = " and ".join(fitting.moved)
    return lines + note(
        look,
        f"As chosen the device would see {show_complex(fitting.impedance)}; {moved} are set so that it sees "
        f"{show_complex(fitting.retrimmed)}. Drive and supply stay as designed.",
        style="dim",
    )


def _judged(fitting: Fitting, look: Look) -> list[Text]:
    """Return what the stage with these parts is held against: its ratings, and the limit."""
    lines = [] if fitting.state is None else rating_lines(look, ratings_of(fitting.state))
    margin = next((c.fitted for c in fitting.compared if c.unit == "dB"), None)
    if margin is not None and margin < 0:
        lines += note(look, f"MISSES the limit with these parts by {-margin:.1f} dB", style="bold red")
    elif margin is not None:
        lines += note(look, f"MEETS the limit with these parts, {margin:.1f} dB to spare", style="bold green")
    leap = [
        c.name
        for c in fitting.compared
        if c.unit == "dBc" and c.ideal is not None and c.fitted is not None and c.fitted < c.ideal - LUCKY
    ]
    if leap:
        lines += note(
            look,
            f"Far lower than ideal: {', '.join(leap)}. Leads and capacitors in series resonance do that, near one "
            "frequency and with just these leads: measure, don't trust.",
            style="dim",
        )
    return lines


def _figure(compared: Comparison, value: float | None) -> str:
    if value is None:
        return "none"
    if compared.unit == "":
        return f"{100 * value:.1f} %"
    if compared.unit == "dBc":
        return f"{value:.1f} dBc".replace("-", "−")
    if compared.unit == "dB":
        return f"{signed(value)} dB"
    return show(value, compared.unit) if value else f"0 {compared.unit}"
