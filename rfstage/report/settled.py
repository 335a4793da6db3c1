"""The page of a steady state: meters first, then heat, parts, harmonics, and how far to trust it."""

from __future__ import annotations

from rich.text import Text

from rfstage.cautions import about_settled
from rfstage.device import PARALLEL, PUSH_PULL
from rfstage.matching.networks import PartStress
from rfstage.quantity import show, show_complex
from rfstage.report.circuit import ELECTRODE, circuit
from rfstage.report.page import Cell, Look, columns, heading, note, pairs
from rfstage.steady import SteadyState
from rfstage.steady.pair import shared_node

BETWEEN = (
    "Branches and load stand between the two outputs, and their volts are from one side to the other. Output "
    "capacitance and choke are each device's own: watts of both, volts and amperes of the one that bears more."
)
LEFT_OUT = (
    "Not in the law: feedback through the device, the drive source's impedance, charge stored in junctions, heating, "
    "grid and screen current. A steady state says nothing about stability."
)


def settled_page(state: SteadyState, look: Look) -> list[Text]:
    """Return the page of an as-built stage."""
    stage = state.stage
    electrode = ELECTRODE[stage.device.family]
    pair = stage.device.pair
    lines = note(
        look,
        f"{show(stage.carrier, 'Hz', 5)} stage in steady state: {f'{pair} pair, ' if pair else ''}"
        f"{stage.device.family}, "
        f"{show(stage.supply.voltage, 'V')}",
        style="bold",
        indent=0,
    )
    change = state.change_from_half_the_orders
    first = about_settled(
        family=stage.device.family,
        supply=stage.supply.voltage,
        peak_voltage=state.peak_voltage,
        rating=stage.device.max_voltage,
        minimum_voltage=state.minimum_voltage,
        orders_settled=change is None or change.settled,
        asked_power=stage.asked.output_power,
        output_power=state.output_power,
    )
    for caution in first:
        lines += note(look, f"! {caution.topic}: {caution.text}", style="bold red", hanging=2)
    if not state.has_output:
        lines += note(look, "No output: the drive stays below the threshold.", style="bold red")
    lines += heading(look, "Meters") + pairs(look, meters(state))
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
    lines += heading(look, "Harmonics in the load") + _harmonics(state, look)
    return lines + _trust(state, look)


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


def _harmonics(state: SteadyState, look: Look) -> list[Text]:
    rows = [[Cell(t, "dim", right=True) for t in ("n", "frequency", "in load", "dBc")]]
    for h in state.harmonics[:9]:
        level = "none" if h.level is None else f"{h.level:.1f}".replace("-", "−")
        rows.append(
            [
                Cell(str(h.order), right=True),
                Cell(show(h.frequency, "Hz", 4), right=True),
                Cell(_or_none(h.load_power, "W"), right=True),
                Cell(level, right=True),
            ]
        )
    return columns(look, rows)


def _trust(state: SteadyState, look: Look) -> list[Text]:
    words = f"{state.orders_solved} orders; power balance closes to {abs(state.balance_error):.0e}"
    change = state.change_from_half_the_orders
    if change is not None:
        words += (
            f"; against half the orders dc current moved {100 * change.dc_current:.2g} %, output "
            f"{change.output_power_db:.2g} dB, harmonics {change.harmonics_db:.2g} dB"
        )
    return heading(look, "How far to trust it") + note(look, words + ".") + note(look, LEFT_OUT, style="dim")
