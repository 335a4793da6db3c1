"""The pages of a coil: in air with its Q, squeezing and taps; on a ring core with turns, wire and flux."""

from __future__ import annotations

import math

from rich.text import Text

from rfstage.errors import ImpossibleError
from rfstage.parts.coil import AirCoil, squeezed_and_spread, taps
from rfstage.parts.gauge import gauge_diameter, gauge_name, largest_gauge
from rfstage.parts.medhurst import SOURCE
from rfstage.parts.solenoid import length_for
from rfstage.parts.toroid import FLUX_SOURCE, ToroidCoil, flux_limit
from rfstage.quantity import show
from rfstage.report.page import Cell, Look, columns, heading, note, pairs

UNKNOWN = "unknown"


def coil_page(
    look: Look, coil: AirCoil | ToroidCoil, *, wanted: float | None = None, current: float | None = None
) -> list[Text]:
    """Return the page of a coil: ``wanted`` inductance [H] and rms ``current`` [A] as they were asked, or None."""
    if isinstance(coil, AirCoil):
        return _air_page(look, coil, wanted, current)
    return _toroid_page(look, coil, wanted, current)


def _known(value: float | None, unit: str, digits: int = 3) -> str:
    return UNKNOWN if value is None else show(value, unit, digits)


def _quality(value: float | None) -> str:
    return UNKNOWN if value is None else f"{float(f'{value:.3g}'):g}"


def _length(value: float, digits: int = 3) -> str:
    """Return a length for a reader: in millimetres below one metre, since nobody buys wire in micrometres."""
    return show(value, "m", digits) if value >= 1e-3 else f"{value * 1e3:#.{digits}g} mm"


def _wire(diameter: float, wall: float | None = None) -> str:
    """Return a wire for a reader: its gauge beside it where it is one."""
    if wall is not None:
        return f"{show(diameter, 'm')} tube, {show(wall, 'm')} wall"
    gauge = largest_gauge(diameter * 1.0005)  # 1.628 mm is AWG 14
    named = gauge is not None and abs(gauge_diameter(gauge) / diameter - 1) < 1e-3
    return _length(diameter, 4 if named else 3) + (f" ({gauge_name(gauge)})" if named and gauge is not None else "")


def _turns(turns: float) -> str:
    return f"{turns:.6g}" if turns == round(turns) else f"{turns:.2f}"


def _turn(turns: float) -> str:
    return "turn" if turns == 1 else "turns"


def _air_page(look: Look, coil: AirCoil, wanted: float | None, current: float | None) -> list[Text]:
    lines = heading(look, f"Air coil, {_turns(coil.turns)} {_turn(coil.turns)}, {show(coil.inductance, 'H', 4)}")
    lines += pairs(
        look,
        [
            ("turns", _turns(coil.turns)),
            ("diameter", _length(coil.diameter)),
            ("length", _length(coil.length)),
            ("pitch", _length(coil.pitch)),
            ("wire", _wire(coil.wire_diameter, coil.wall)),
            ("wire length", _length(coil.wire_length)),
        ],
    )
    lines += note(
        look, "Diameter from wire centre to wire centre; length is turns × pitch; leads come on top.", style="dim"
    )
    if wanted is not None and coil.turns != round(coil.turns):
        lines += note(look, _in_whole_turns(coil, wanted))
    lines += _at_carrier(look, coil, current)
    lines += _squeezed(look, coil) + _taps(look, coil)
    return lines


def _in_whole_turns(coil: AirCoil, wanted: float) -> str:
    """Return how the nearest whole turns are to be spread for the inductance that was wanted."""
    turns = max(1, round(coil.turns))
    try:
        length = float(length_for(wanted, turns, coil.diameter, coil.wire_diameter))
    except ImpossibleError:
        return f"{turns} whole {_turn(turns)} can't be squeezed or spread to {show(wanted, 'H', 4)}."
    return f"In whole turns: {turns} over {show(length, 'm', 4)} give the same."


def _at_carrier(look: Look, coil: AirCoil, current: float | None) -> list[Text]:
    items = [
        ("unloaded Q", _quality(coil.unloaded_q)),
        ("resistance", _known(coil.resistance, "ohm")),
        ("self-capacitance", _known(coil.self_capacitance, "F", 2)),
        ("self-resonance", _known(coil.self_resonance, "Hz", 2)),
        ("at low frequency", show(coil.inductance, "H", 4)),
        ("at the carrier", show(coil.rf_inductance, "H", 4)),
        ("seen from the ends", _known(coil.effective_inductance, "H", 4)),
        ("Q from the ends", _quality(coil.effective_q)),
    ]
    if current is not None:
        items.append((f"loss at {show(current, 'A')} rms", _known(coil.loss(current), "W")))
    lines = heading(look, f"At {show(coil.carrier, 'Hz', 4)}, copper at {coil.temperature:g} °C")
    lines += pairs(look, items)
    lines += note(
        look,
        "At the carrier less field is left inside the wire; from the ends the self-capacitance is seen too, with one "
        "end grounded. Copper alone: former, shield, joints and neighbours lower the Q. Resistance and "
        f"self-capacitance after {SOURCE}.",
        style="dim",
    )
    for words in coil.notes:
        lines += note(look, words[0].upper() + words[1:] + ".", style="yellow")
    return lines


def _squeezed(look: Look, coil: AirCoil) -> list[Text]:
    titles = ("length", "pitch", "gap", "inductance", "change", "Q", "resonance", "")
    rows = [[Cell(title, "dim", right=True) for title in titles]]
    lengths = squeezed_and_spread(coil)
    if len(lengths) == 1:
        return []
    for k, other in enumerate(lengths):
        own = other.length == coil.length
        gap = other.pitch - other.wire_diameter
        words = (
            _length(other.length),
            _length(other.pitch),
            _length(gap) if gap > 1e-6 * other.pitch else "none",
            show(other.inductance, "H", 4),
            "" if own else f"{100 * (other.inductance / coil.inductance - 1):+z.1f} %".replace("-", "−"),
            _quality(other.unloaded_q),
            _known(other.self_resonance, "Hz", 2),
        )
        mark = "as it is" if own else "close-wound" if k == 0 else ""
        style = "bold" if own else ""
        rows.append([*(Cell(word, style, right=True) for word in words), Cell(mark, "dim")])
    return heading(look, "Squeezed or spread") + columns(look, rows)


def _taps(look: Look, coil: AirCoil) -> list[Text]:
    rows = [
        [Cell(t, "dim", right=True) for t in ("turns", "inductance", "coupling", "of the voltage", "of the resistance")]
    ]
    for tap in taps(coil):
        words = (
            _turns(tap.turns),
            show(tap.inductance, "H"),
            f"{tap.coupling:.3f}",
            f"{100 * tap.voltage:.1f} %",
            f"{100 * tap.voltage**2:.2g} %" if tap.voltage < 0.1 else f"{100 * tap.voltage**2:.1f} %",
        )
        rows.append([Cell(word, right=True) for word in words])
    if len(rows) == 1:
        return []
    return (
        heading(look, "Taps, in turns from the grounded end")
        + columns(look, rows)
        + note(
            look,
            "Inductance from the grounded end to the tap; coupling of that part with the rest; the tap's share of the "
            "whole coil's voltage, and of the resistance across it, for a tap that draws little. Low frequency.",
            style="dim",
        )
    )


def _toroid_page(look: Look, coil: ToroidCoil, wanted: float | None, current: float | None) -> list[Text]:
    core = coil.core
    lines = heading(look, f"Coil on {core.name}, {coil.turns} {_turn(coil.turns)}, {show(coil.inductance, 'H')}")
    items = [
        ("turns", str(coil.turns)),
        ("inductance", show(coil.inductance, "H", 4)),
        ("factor", f"{core.factor * 1e9:.4g} nH/turn²"),
        ("wire", _wire(coil.wire_diameter)),
        ("window takes", _length(coil.largest_wire)),
        ("wire length", _length(coil.wire_length)),
    ]
    lines += pairs(look, items)
    if wanted is not None:
        rows = [[Cell(t, "dim", right=True) for t in ("turns", "inductance", "against the wish")]]
        for n in (coil.turns - 1, coil.turns, coil.turns + 1):
            if n >= 1:
                off = f"{100 * (core.factor * n**2 / wanted - 1):+z.1f} %".replace("-", "−")
                style = "bold" if n == coil.turns else ""
                rows.append([Cell(w, style, right=True) for w in (str(n), show(core.factor * n**2, "H", 4), off)])
        lines += heading(look, f"Whole turns for {show(wanted, 'H', 4)}") + columns(look, rows)
    lines += heading(look, f"Core {core.name}, at {show(coil.carrier, 'Hz', 4)}")
    lines += pairs(
        look,
        [
            ("outer", _length(core.outer)),
            ("inner", _length(core.inner)),
            ("height", _length(core.height)),
            ("section", f"{core.area * 1e6:.3g} mm²"),
            ("copper alone", show(coil.copper_resistance, "ohm")),
            ("unloaded Q", UNKNOWN),
        ],
    )
    lines += _flux(look, coil, current)
    for words in coil.notes:
        lines += note(look, words[0].upper() + words[1:] + ".", style="yellow")
    kind = f"iron powder, mix {core.material}" if core.kind == "powder" else f"ferrite, type {core.material}"
    return lines + note(
        look,
        f"{kind[0].upper()}{kind[1:]}. Factor: {core.source}; dimensions: {core.dimensions_source}. The window takes "
        "bare wire of that diameter in a single layer, turn beside turn on the circle of the inner radius: insulation "
        "takes its share. Leads come on top of the wire's length.",
        style="dim",
    )


def _flux(look: Look, coil: ToroidCoil, current: float | None) -> list[Text]:
    """Return the flux density for an rms current, or the current that reaches the limit."""
    limit = flux_limit(coil.carrier)
    bound = (
        "there is no figure for a limit at this frequency"
        if limit is None
        else f"kept below {show(limit * 1e3, '', 3)} mT at this frequency ({FLUX_SOURCE})"
    )
    if current is None:
        if limit is None:
            return note(look, f"Flux density: {bound}.")
        most = limit / coil.flux_density(1.0)
        return note(look, f"Flux density: {bound}, which {show(most, 'A')} peak reaches, dc and harmonics included.")
    flux = coil.flux_density(math.sqrt(2) * current)
    beyond = limit is not None and flux > limit
    words = f"Flux density: {show(flux * 1e3, '', 3)} mT peak for {show(current, 'A')} rms at the carrier; {bound}."
    return note(
        look, words + (" It is beyond that: take a larger core." if beyond else ""), style="red" if beyond else ""
    )
