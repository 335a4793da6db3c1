"""The page of a steady state: meters first, then heat, parts, harmonics, and how far to trust it."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from rich.text import Text

from rfstage.designs.judging import (
    LINE,
    Verdict,
    load_file_cautions,
    ratings_of,
    settled_cautions,
    worst,
)
from rfstage.designs.safety import Station, settled_safety
from rfstage.device import PARALLEL, PUSH_PULL
from rfstage.limits import limit_named
from rfstage.matching.tank import PartStress
from rfstage.quantity import show, show_complex
from rfstage.report.circuit import ELECTRODE, FAMILY, circuit
from rfstage.report.judged import caution_lines, rating_lines, signed, verdict_lines
from rfstage.report.page import Cell, Look, columns, heading, note, pairs
from rfstage.steady import SteadyState
from rfstage.steady.pair import shared_node

if TYPE_CHECKING:
    from rfstage.designs.heat import Heat

BETWEEN = (
    "Branches and load stand between the two outputs, and their volts are from one side to the other. Output "
    "capacitance and choke are each device's own: watts of both, volts and amperes of the one that bears more."
)
LEFT_OUT = (
    "Not in the law: feedback through the device, the drive source's impedance, charge stored in junctions, heating, "
    "grid and screen current. A steady state says nothing about stability."
)


def settled_page(
    state: SteadyState,
    look: Look,
    verdicts: Sequence[Verdict],
    *,
    station: Station | None = None,
    heat: Heat | None = None,
) -> list[Text]:
    """Return the page of an as-built stage: verdicts on its limit, heat where asked, cautions for what is around it."""
    stage = state.stage
    electrode = ELECTRODE[stage.device.family]
    pair = stage.device.pair
    lines = note(
        look,
        f"{show(stage.carrier, 'Hz', 5)} stage in steady state: {f'{pair} pair, ' if pair else ''}"
        f"{FAMILY[stage.device.family]}, "
        f"{show(stage.supply.voltage, 'V')}",
        style="bold",
        indent=0,
    )
    for caution in (*settled_cautions(state), *load_file_cautions(stage)):
        lines += note(look, f"! {caution.topic}: {caution.text}", style="bold red", hanging=2)
    if not state.has_output:
        lines += note(look, "No output: the drive stays below the threshold.", style="bold red")
    lines += heading(look, "Meters") + pairs(look, meters(state)) + rating_lines(look, ratings_of(state))
    if state.devices:
        lines += heading(look, "Devices") + _devices(state, look)
    feed = shared_node(stage).feed if pair == PARALLEL else stage.feed
    stresses = {b.name: b for b in state.branches}
    parts = [
        PartStress(b, stresses[b.name].peak_voltage, stresses[b.name].rms_current, stresses[b.name].loss)
        for b in (*feed, *stage.branches)
    ]
    lines += heading(look, f"Circuit, {electrode} to load; stresses of all orders and dc")
    load = complex(stage.load.impedance(stage.carrier))
    lines += circuit(look, parts, start=electrode, end=f"load {show_complex(load)}")
    if pair == PUSH_PULL:
        lines += note(look, BETWEEN, style="dim")
    lines += heading(look, "Harmonics") + _harmonics(state, look, verdicts) + _limit(state, look, verdicts)
    if heat is not None:
        from rfstage.report.heat import heat_lines

        lines += heat_lines(heat, look)
    return lines + _trust(state, look) + caution_lines(look, settled_safety(state, station))


def meters(state: SteadyState) -> list[tuple[str, str]]:
    """Return names and figures of what a bench would read."""
    electrode = ELECTRODE[state.stage.device.family]
    return [
        ("dc current", _or_none(state.dc_current, "A")),
        ("dc power", _or_none(state.dc_power, "W")),
        ("carrier power at the load", _or_none(state.output_power, "W")),
        ("efficiency", "none" if state.efficiency is None else f"{100 * state.efficiency:.1f} %"),
        ("dissipation of both devices" if state.devices else "device dissipation", _or_none(state.dissipation, "W")),
        ("choke loss", _or_none(state.choke_loss, "W")),
        (f"peak {electrode} voltage", show(state.peak_voltage, "V")),
        (f"lowest {electrode} voltage", show(state.minimum_voltage, "V")),
        (f"peak {electrode} current", _or_none(state.peak_current, "A")),
        ("conduction angle", f"{state.conduction_angle_deg:.1f}°"),
    ]


def _or_none(value: float, unit: str) -> str:
    return show(value, unit) if value else f"0 {unit}"


def _devices(state: SteadyState, look: Look) -> list[Text]:
    titles = ("", "dc current", "dissipation", "peak volts", "peak amps")
    rows = [[Cell(t, "dim", right=True) for t in titles]]
    for name, d in zip(("first", "second"), state.devices, strict=True):
        shown = (
            _or_none(d.dc_current, "A"),
            _or_none(d.dissipation, "W"),
            show(d.peak_voltage, "V"),
            _or_none(d.peak_current, "A"),
        )
        rows.append([Cell(name, "bold"), *(Cell(text, right=True) for text in shown)])
    return columns(look, rows)


def _harmonics(state: SteadyState, look: Look, verdicts: Sequence[Verdict]) -> list[Text]:
    by_order = {v.order: v for v in verdicts}
    titles = ("n", "frequency", "in load", "dBc", *(("line", "limit", "margin") if verdicts else ()))
    rows = [[Cell(t, "dim", right=True) for t in titles]]
    for h in state.harmonics[:9]:
        row = [str(h.order), show(h.frequency, "Hz", 4), _or_none(h.load_power, "W"), _level(h.level)]
        if verdicts:
            v = by_order[h.order]
            row += [_level(v.line_level), _level(v.limit), "none" if v.margin is None else signed(v.margin)]
        rows.append([Cell(words, right=True) for words in row])
    return columns(look, rows)


def _level(decibels: float | None) -> str:
    return "none" if decibels is None else f"{decibels:.1f}".replace("-", "−")


def _limit(state: SteadyState, look: Look, verdicts: Sequence[Verdict]) -> list[Text]:
    stage, least = state.stage, worst(verdicts)
    if stage.limit_rule is None or not verdicts:
        return []
    return verdict_lines(
        look,
        limit_named(stage.limit_rule),
        worst=None if least is None or least.margin is None else (least.order, least.margin),
        highest=verdicts[-1].order,
        line=stage.limit_load or LINE,
        carrier=stage.carrier,
        power=state.output_power,
    )


def _trust(state: SteadyState, look: Look) -> list[Text]:
    words = f"{state.orders_solved} harmonic orders; the power balance closes to {_rough(abs(state.balance_error))}"
    change = state.change_from_half_the_orders
    if change is not None:
        words += (
            f". The last doubling of the orders moved the dc current by {_percent(change.dc_current)}, the output "
            f"by {_percent(change.output_power_db / 4.34)}, the peak voltage by {_percent(change.peak_voltage)}, the "
            f"harmonics by {max(change.harmonics_db, 0.001):.2g} dB or less"
        )
    return heading(look, "How far to trust it") + note(look, words + ".") + note(look, LEFT_OUT, style="dim")


def _rough(share: float) -> str:
    return "a part in a billion" if share < 1e-9 else f"{100 * share:.1g} %"


def _percent(share: float) -> str:
    return "under 0.01 %" if share < 1e-4 else f"{100 * share:.2g} %"
