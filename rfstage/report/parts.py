"""What to wind and what to buy, what it must stand, and what these parts make of the stage."""

from __future__ import annotations

from rich.text import Text

from rfstage.fitting.capacitors import Bought
from rfstage.fitting.coils import Winding
from rfstage.fitting.fitted import Comparison, Fitting
from rfstage.quantity import show, show_complex
from rfstage.report.judged import signed
from rfstage.report.page import Cell, Look, columns, heading, note


def parts_lines(fitting: Fitting, look: Look) -> list[Text]:
    """Return the parts list and the comparison with the ideal stage."""
    lines = heading(look, "Capacitors to buy")
    rows = [
        [Cell(t, "dim", right=k > 1) for k, t in enumerate(("part", "to fit", "each rated", "amps to stand", "loss"))]
    ]
    for bought in fitting.bought:
        rows += _bought_rows(bought)
    lines += columns(look, rows)
    for bought in fitting.bought:
        lines += _trimmer_line(bought, look)
    lines += note(
        look,
        "Voltages and amperes with their margins, dc where a part blocks, all orders where the stage was settled; each "
        "in series with its leads.",
        style="dim",
    )
    lines += heading(look, "Coils to wind")
    for winding in fitting.wound:
        lines += _coil_lines(winding, look)
    for name, reason in fitting.ideal:
        lines += note(look, f"{name}: stays as designed: {reason}", hanging=2)
    return lines + _compared(fitting, look)


def _bought_rows(bought: Bought) -> list[list[Cell]]:
    words = [show(value, "F") for value in bought.values]
    if bought.trimmer is not None:
        words.append(f"trimmer {show(bought.trimmer.least, 'F')} to {show(bought.trimmer.most, 'F')}")
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
    return note(
        look,
        f"{bought.name}: trimmer at {show(bought.setting, 'F')}, {show(bought.total, 'F')} in all; with its leads of "
        f"{show(bought.lead, 'H')} that is the {show(bought.wanted, 'F')} the circuit wants, or what brings the "
        "impedance back",
        hanging=2,
    )


def _coil_lines(winding: Winding, look: Look) -> list[Text]:
    coil = winding.coil
    q = "Q unknown" if coil.unloaded_q is None else f"Q {coil.unloaded_q:.0f}"
    resonance = "" if coil.self_resonance is None else f", self-resonance {show(coil.self_resonance, 'Hz')}"
    lines = note(
        look,
        f"{winding.name}: {coil.turns:g} turns of {show(coil.wire_diameter, 'm')} copper, mean diameter "
        f"{show(coil.diameter, 'm')}, {show(coil.length, 'm')} long (pitch {show(coil.pitch, 'm')}); "
        f"{show(winding.wanted, 'H')} at the carrier, {q}{resonance}, {show(coil.wire_length, 'm')} of wire",
        hanging=2,
    )
    return lines + (note(look, winding.note, indent=4, hanging=2) if winding.note else [])


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
    moved = " and ".join(fitting.moved)
    return lines + note(
        look,
        f"As chosen the device would see {show_complex(fitting.impedance)}; {moved} are set so that it sees "
        f"{show_complex(fitting.retrimmed)}. Drive and supply stay as designed.",
        style="dim",
    )


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
