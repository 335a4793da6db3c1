"""The summary of a design: circuit, operating point, tank, harmonics against the limit, cautions."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from rich.text import Text

from rfstage.designs.design import Design
from rfstage.matching.tank import Tank
from rfstage.quantity import exact_text, show, show_complex
from rfstage.report.circuit import CONTROL, ELECTRODE, FAMILY, circuit
from rfstage.report.harmonics import harmonic_lines
from rfstage.report.judged import caution_lines, rating_lines
from rfstage.report.page import NO_BREAK, Cell, Look, columns, heading, note, pairs

if TYPE_CHECKING:
    from rfstage.fitting.fitted import Fitting

_ORDER_NAMES = ("dc", "fundamental", "second", "third")


def summary(design: Design, look: Look, fitting: Fitting | None = None) -> list[Text]:
    """Return the whole summary as lines of text, with the parts where they were chosen."""
    return [
        *_title(design, look),
        *_circuit(design, look),
        *_point(design, look),
        *_tank(design, look),
        *harmonic_lines(design, look),
        *_compared_networks(design, look),
        *_parts(fitting, look),
        *_heat(design, look, "Heat" if fitting is None else "Heat with these parts"),
        *_assumed(design, look),
        *caution_lines(look, design.cautions),
    ]


def _title(design: Design, look: Look) -> list[Text]:
    job, settings = design.job, design.settings
    words = look.text(
        f"{show(job.carrier, 'Hz', 5)} class-{design.operating_class} stage: {exact_text(job.power, 'W')} into "
        f"{show_complex(settings.load_impedance)} from {exact_text(job.supply, 'V')}, {FAMILY[settings.family]}, "
        f"{job.conduction_angle:g}° conduction"
    )
    return note(look, words, style="bold", indent=0)


def _parts(fitting: Fitting | None, look: Look) -> list[Text]:
    if fitting is None:
        return []
    from rfstage.report.parts import parts_lines

    return parts_lines(fitting, look)


def _compared_networks(design: Design, look: Look) -> list[Text]:
    if design.ranking is None:
        return []
    from rfstage.report.ranking import ranking_lines

    return ranking_lines(design.ranking, look)


def _heat(design: Design, look: Look, title: str) -> list[Text]:
    if design.heat is None:
        return []
    from rfstage.report.heat import heat_lines

    return heat_lines(design.heat, look, title)


def _circuit(design: Design, look: Look) -> list[Text]:
    electrode = ELECTRODE[design.settings.family]
    lines = heading(look, f"Circuit, {electrode} to load")
    lines += circuit(
        look, design.tank.parts, start=electrode, end=f"load {show_complex(design.settings.load_impedance)}"
    )
    point = design.point
    loss = f" and loses {show(point.choke_loss, 'W')} in its dc resistance" if point.choke_loss > 0 else ""
    return lines + note(
        look,
        f"Stresses are the carrier's, by the book. Cblock also stands off the supply's {show(design.job.supply, 'V')}; "
        f"Lchoke also carries {show(point.dc_current, 'A')} dc{loss}.",
        style="dim",
    )


def _point(design: Design, look: Look) -> list[Text]:
    point, drive, settings = design.point, design.drive, design.settings
    electrode, control = ELECTRODE[settings.family], CONTROL[settings.family]
    items = [
        ("load resistance", show(point.load_resistance, "ohm", 4)),
        (f"{electrode} swing", show(point.swing, "V")),
        ("fundamental current, peak", show(point.fundamental_current, "A")),
        ("RF power from the device", show(point.device_rf_power, "W")),
        ("device efficiency", f"{100 * point.device_efficiency:.1f} %"),
    ]
    if drive.bias is not None and drive.amplitude is not None:
        items += [(f"{control} bias", _volts(drive.bias)), (f"{control} drive, peak", show(drive.amplitude, "V"))]
    if drive.unbiased_amplitude is not None and design.job.transfer_factor is None:
        items.append((f"{control} drive without bias", f"{show(drive.unbiased_amplitude, 'V')} peak"))
    items.append(("drive power", show(drive.power, "W") if drive.power is not None else "not known"))
    if drive.power is not None and settings.family == "fet":
        items[-1] = ("drive power, gate loss", items[-1][1])
    lines = heading(look, f"Operating point, designed to the {design.designed_to} power") + _compared(design, look)
    lines += pairs(look, items)
    shares = "  ".join(f"{_ORDER_NAMES[n]}{NO_BREAK}{design.coefficients[n] + 0.0:z.4f}" for n in range(4))
    lines += note(look, f"Current pulse over its peak: {shares}".replace("-", "−"))
    return lines + rating_lines(look, design.ratings)


def _compared(design: Design, look: Look) -> list[Text]:
    """Return the figures that textbook and steady state both have, side by side."""
    point, state = design.point, design.settled
    electrode = ELECTRODE[design.settings.family]
    book = [
        ("power at the load", show(point.output_power, "W")),
        ("dc current", show(point.dc_current, "A")),
        ("dc power", show(point.dc_power, "W")),
        ("overall efficiency", f"{100 * point.overall_efficiency:.1f} %"),
        ("device dissipation", show(point.dissipation, "W")),
        (f"peak {electrode} voltage", show(point.peak_voltage, "V")),
        (f"lowest {electrode} voltage", _volts(design.settings.minimum_voltage)),
        (f"peak {electrode} current", show(point.peak_current, "A")),
    ]
    if state is None:
        return pairs(look, book)
    real = [
        show(state.output_power, "W") if state.has_output else "no output",
        _volts(state.dc_current, "A"),
        _volts(state.dc_power, "W"),
        "none" if state.efficiency is None else f"{100 * state.efficiency:.1f} %",
        _volts(state.dissipation, "W"),
        show(state.peak_voltage, "V"),
        _volts(state.minimum_voltage),
        _volts(state.peak_current, "A"),
    ]
    rows = [[Cell(""), Cell("textbook", "dim", right=True), Cell("settled", "dim", right=True)]]
    rows += [
        [Cell(name, "dim"), Cell(value, right=True), Cell(settled, "bold", right=True)]
        for (name, value), settled in zip(book, real, strict=True)
    ]
    lines = columns(look, rows)
    if design.designed_to == "settled":
        change = 100 * (point.load_resistance / design.book_resistance - 1)
        lines += note(
            look,
            f"The book alone would have {show(design.book_resistance, 'ohm', 4)}; corrected by {change:+.1f} %, so "
            "that the steady state gives the power asked.".replace("-", "−"),
            style="dim",
        )
    return lines


def _volts(value: float, unit: str = "V") -> str:
    return f"0 {unit}" if value == 0 else show(value, unit)


def _tank(design: Design, look: Look) -> list[Text]:
    lines = heading(look, f"Tank, network {design.tank.network}") + tank_lines(design.tank, look)
    made = design.filter
    if made is None:
        return lines
    shown = "  ".join(f"{n}:{NO_BREAK}{show_complex(z)}" for n, z in design.filter_terminations[:3])
    ripple = f"{made.ripple_db:g} dB ripple to" if made.ripple_db else "3 dB at"
    return lines + note(
        look,
        f"Filter: {made.kind} of order {made.order}, {made.form}, {ripple} {show(made.cutoff, 'Hz', 4)}, for a line of "
        f"{show(made.resistance, 'ohm')}; insertion loss {made.insertion_loss_db:.2f} dB and return loss "
        f"{made.return_loss_db:.1f} dB at the carrier. The tank is closed on what the filter shows it; efficiency and "
        f"bandwidth hold both. It shows the tank, by order: {shown}",
    )


def tank_lines(tank: Tank, look: Look) -> list[Text]:
    """Return what a tank is like, with what each Q means."""
    items = [
        ("loaded Q", f"{tank.loaded_q:.3g}"),
        ("input-side Q", "none" if tank.input_q is None else f"{tank.input_q:.3g}"),
        ("bandwidth, −3 dB", "no −3 dB points" if tank.bandwidth is None else show(tank.bandwidth, "Hz")),
        ("tank efficiency", f"{100 * tank.efficiency:.1f} %"),
    ]
    if tank.trough_dip is not None:
        items.append(("trough dip, of the swing", f"{tank.trough_dip:.3f}"))
    seen = "  ".join(f"{n}:{NO_BREAK}{ratio:.2g}" for n, ratio in tank.terminations[:4])
    meaning = (
        "Loaded Q counts the energy in tank and output capacitance; input-side Q is the load resistance over the "
        "reactance across the device."
    )
    if tank.trough_dip is not None:
        meaning += " The device is a current generator; no source resistance stands in parallel."
    return (
        pairs(look, items)
        + _link_lines(tank, look)
        + note(look, f"Harmonic impedance over the load resistance, by order: {seen}")
        + note(look, meaning, style="dim")
    )


def _link_lines(tank: Tank, look: Look) -> list[Text]:
    """Return mutual inductance and critical coupling of a link."""
    if tank.link_qs is None:
        return []
    pair = next(p.branch for p in tank.parts if p.branch.kind == "coupled")
    mutual = float(pair.coupling) * math.sqrt(float(pair.value) * float(pair.second))
    of_tank, of_link = tank.link_qs
    return note(
        look,
        f"Link: mutual inductance {show(mutual, 'H')}; tank Q {of_tank:.3g} and link Q {of_link:.3g} are at critical "
        f"coupling with {1 / math.sqrt(of_tank * of_link):.2f}, and {float(pair.coupling):.2f} is fitted.",
    )


def _assumed(design: Design, look: Look) -> list[Text]:
    if not design.assumed:
        return []
    words = "; ".join(
        f"{key} {_assumed_value(key, value, design.settings.exponent)}" for key, value in design.assumed.items()
    )
    return heading(look, "Assumed, common practice or stand-ins for the device") + note(look, words)


def _assumed_value(key: str, value: object, exponent: float) -> str:
    if isinstance(value, complex):
        return show_complex(value)
    if isinstance(value, str):
        return value
    assert isinstance(value, int | float)
    unit = {
        "stage.minimum_voltage": "V",
        "device.threshold": "V",
        "supply.choke": "H",
        "tank.blocking": "F",
        "supply.choke_resistance": "ohm",
        "limit.load": "ohm",
        "limit.margin": "dB",
        "tank.middle_resistance": "ohm",
        "tank.transformer_magnetizing": "H",
        "tank.transformer_leakage": "H",
        "device.output_capacitance": "F",
        "device.threshold_softness": "V",
        "device.knee_voltage": "V",
        "device.knee_resistance": "ohm",
        "device.reverse_conduction": "S",
        "device.transfer_factor": "A/V",
        "heat.ambient": "degC",
        "heat.junction_limit": "degC",
        "heat.case_to_sink": "K/W",
        "heat.duty": "%",
    }.get(key)
    if unit == "A/V":
        return f"{value:.4g} A/V" + ("" if exponent == 1 else f"^{exponent:g}")
    if unit:
        return show(value, unit) if value else f"0 {unit}".replace("ohm", "Ω")
    return f"{value:.4g}"
