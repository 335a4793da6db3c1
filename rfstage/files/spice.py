"""A SPICE deck of a stage: the same device law as behavioural sources, for any SPICE3-style simulator.

Losses are written as constant resistances at the carrier, since a transient run knows no Q; a choke's RF loss
stands as a resistance across it, so that the supply's direct current does not feel it.
"""

from __future__ import annotations

import math
from typing import NamedTuple

from rfstage.device import Device
from rfstage.errors import ImpossibleError
from rfstage.ladder import Branch
from rfstage.load import MeasuredLoad
from rfstage.quantity import exact_complex, exact_text
from rfstage.stage import Stage

NODE = "out"  # the device's output node
STEPS_PER_PERIOD = 400
MEASURED_PERIODS = 10
FEWEST_PERIODS, MOST_PERIODS = 200, 4000
SLOWEST = 14.0  # time constants that a start-up takes: what is left then is a millionth


class Run(NamedTuple):
    """How a deck runs: periods in all, of which the last are measured, and time steps in each."""

    periods: int
    steps: int = STEPS_PER_PERIOD
    measured: int = MEASURED_PERIODS


def default_run(stage: Stage) -> Run:
    """Return a run long enough for the choke and the blocking capacitor to settle.

    The choke's current settles against the load that the device is to the supply; its time constants are
    estimated from the choke and the largest capacitor with the load's resistance.
    """
    period = 1 / stage.carrier
    resistance = complex(stage.load.impedance(stage.carrier)).real
    seen = abs(complex(stage.ladder.impedance(stage.carrier, stage.load)))
    largest = max((float(b.value) for b in stage.branches if b.kind == "capacitor"), default=0.0)
    slow = max(stage.supply.choke / max(seen, 1e-9) * 2, largest * (resistance + seen))
    periods = math.ceil(SLOWEST * slow / period)
    return Run(min(max(periods, FEWEST_PERIODS), MOST_PERIODS))


def spice_text(stage: Stage, run: Run | None = None) -> str:
    """Return the deck.

    Parameters
    ----------
    stage : Stage
        What to write.
    run : Run or None
        Its length and steps; `default_run` if None.

    Returns
    -------
    str
        Start-up with the device off, a transient analysis, and a Fourier analysis of the load voltage.

    Raises
    ------
    ImpossibleError
        For a pair of devices.
    """
    if stage.device.pair is not None:
        raise ImpossibleError("a SPICE deck holds one device, and this stage has a pair; leave the deck out")
    run = run or default_run(stage)
    period = 1 / stage.carrier
    begin, end = (run.periods - run.measured) * period, run.periods * period
    lines = [
        *_head(stage, run),
        *_supply(stage),
        *_drive(stage),
        *_device(stage.device),
        *_capacitances(stage.device, stage.supply.voltage),
        *_branches(stage),
        *_load(stage),
    ]
    lines += [
        "",
        "* start-up with the device off; the last periods are measured",
        f".tran {period / run.steps:.12g} {end:.12g} {begin:.12g} {period / run.steps:.12g} uic",
        f".four {stage.carrier:.12g} v(load) v({NODE})",
        ".options reltol=1e-6 abstol=1e-9 vntol=1e-7 itl4=100 method=trap",
        f".print tran v(load) v({NODE}) i(vsupply)",
        ".end",
    ]
    return "\n".join(lines) + "\n"


def _head(stage: Stage, run: Run) -> list[str]:
    lines = [
        f"* rfstage: {exact_text(stage.carrier, 'Hz')} stage, {stage.device.family}, "
        f"{exact_text(stage.supply.voltage, 'V')}",
        "* losses are constant resistances at the carrier; the device is rfstage's law as behavioural sources",
        f"* {run.periods} periods of start-up and settling, the last {run.measured} measured, {run.steps} steps each",
    ]
    if isinstance(stage.load, MeasuredLoad):
        z = complex(stage.load.impedance(stage.carrier))
        lines.append(
            f"* the measured load is written as {exact_complex(z)} ohm at the carrier, continued as R and L or C"
        )
    return lines


def _value(number: float) -> str:
    return f"{number:.12g}"


def _supply(stage: Stage) -> list[str]:
    supply, omega = stage.supply, 2 * math.pi * stage.carrier
    lines = ["", "* supply and choke", f"Vsupply vdd 0 {_value(supply.voltage)}"]
    node = "vdd"
    if supply.choke_resistance > 0:
        lines.append(f"Rchoke vdd choke {_value(supply.choke_resistance)}")
        node = "choke"
    lines.append(f"Lchoke {node} {NODE} {_value(supply.choke)}")
    if supply.choke_q is not None and not math.isinf(supply.choke_q):
        across = omega * supply.choke * (supply.choke_q + 1 / supply.choke_q)
        lines.append(f"Rchokerf {node} {NODE} {_value(across)}")
    return lines


def _drive(stage: Stage) -> list[str]:
    drive = stage.drive
    return [
        "",
        "* drive, from its trough",
        f"Vdrive control 0 SIN({_value(drive.bias)} {_value(drive.amplitude)} {_value(stage.carrier)} 0 0 -90)",
    ]


def _soft(x: str, softness: float) -> str:
    """Return the softened max(x, 0) as an expression."""
    if softness == 0:
        return f"max({x}, 0)"
    e = _value(softness)
    return f"(max({x}, 0) + {e}*ln(1 + exp(-abs({x})/{e})))"


def _device(device: Device) -> list[str]:
    feedback = "" if device.amplification_factor is None else f" + v({NODE})/{_value(device.amplification_factor)}"
    above = f"(v(control) - {_value(device.threshold)}{feedback})"
    knee = f"({_value(device.knee_voltage)} + {_value(device.knee_resistance)}*v(flat))"
    ratio = "v(ratio)" if device.family == "fet" else _soft("v(ratio)", 0.1)
    lines = [
        "",
        "* device: drive above the threshold, flat current, voltage over the knee, current",
        f"Babove above 0 V = {_soft(above, device.threshold_softness)}",
        f"Bflat flat 0 V = {_value(device.transfer_factor)}*v(above)^{_value(device.exponent)}",
        f"Bratio ratio 0 V = v({NODE})/{knee}",
        f"Bdevice {NODE} 0 I = v(flat)*tanh({ratio})",
    ]
    diode = device.reverse_conduction
    if diode is not None:
        below = _soft(f"(-v({NODE}) - {_value(diode.threshold)})", diode.softness)
        lines.append(f"Breverse 0 {NODE} I = {_value(diode.conductance)}*{below}")
    return lines


def _capacitances(device: Device, start: float) -> list[str]:
    lines = []
    if device.output_capacitance > 0:
        lines.append(f"Coutput {NODE} 0 {_value(device.output_capacitance)} ic={_value(start)}")
    junction = device.junction_capacitance
    if junction is not None:
        phi, m = junction.potential, junction.grading
        # the charge of the junction in units of at_zero, its slope going on straight below -phi/2
        inside = f"max(1 + v({NODE})/{_value(phi)}, 0.5)"
        beyond = f"min(0.5 + v({NODE})/{_value(phi)}, 0)"
        end = 0.5**-m
        charge = (
            f"{_value(phi / (1 - m))}*({inside}^{_value(1 - m)} - 1)"
            f" + {_value(phi)}*{beyond}*({_value(end)} - {_value(m * end)}*{beyond})"
        )
        first = phi / (1 - m) * ((1 + start / phi) ** (1 - m) - 1)
        lines += [
            "* junction capacitance: its charge as a voltage, differentiated by a capacitor, fed back as a current",
            f"Bcharge charge 0 V = {charge}",
            f"Cjunction charge sense {_value(junction.at_zero)} ic={_value(first)}",
            "Vsense sense 0 0",
            f"Fjunction {NODE} 0 Vsense 1",
        ]
    return ["", "* the device's capacitances", *lines] if lines else []


def _branches(stage: Stage) -> list[str]:
    """Return the parts from device to load; the first capacitor in series starts charged to the supply."""
    lines = ["", "* branches from device to load"]
    node, blocked = NODE, False
    last = max((k for k, b in enumerate(stage.branches) if b.place == "series"), default=-1)
    for k, branch in enumerate(stage.branches):
        if branch.place == "series":
            after = "load" if k == last else f"n{k + 1}"
            charged = branch.kind == "capacitor" and not blocked
            lines += _part(branch, node, after, k + 1, stage, stage.supply.voltage if charged else 0.0)
            blocked = blocked or branch.kind == "capacitor"
            node = after
        else:
            lines += _part(branch, node, "0", k + 1, stage, 0.0 if blocked else stage.supply.voltage)
    if last < 0:
        lines.append(f"Vthrough {NODE} load 0")
    return lines


def _part(branch: Branch, start: str, end: str, number: int, stage: Stage, charged: float) -> list[str]:
    omega = 2 * math.pi * stage.carrier
    value, tag = float(branch.value), f"{number}"
    resistance = 0.0 if branch.series_resistance is None else float(branch.series_resistance)
    if branch.q is not None:
        reactance = omega * value if branch.kind == "coil" else 1 / (omega * value)
        resistance += reactance / float(branch.q)
    if branch.kind == "resistor":
        resistance, value = resistance + value, 0.0
    elements = []
    if branch.kind == "coil":
        elements.append(("L", value, ""))
    elif branch.kind == "capacitor":
        elements.append(("C", value, f" ic={_value(charged)}" if charged else ""))
    if resistance > 0:
        elements.append(("R", resistance, ""))
    if branch.lead_inductance != 0:
        elements.append(("L", float(branch.lead_inductance), ""))
    nodes = [start, *(f"n{tag}{letter}" for letter in "abc"[: len(elements) - 1]), end]
    lines = [f"* {branch.name}"]
    for k, (letter, amount, extra) in enumerate(elements):
        suffix = "lead" if letter == "L" and branch.kind != "coil" else ""
        lines.append(f"{letter}{tag}{suffix} {nodes[k]} {nodes[k + 1]} {_value(amount)}{extra}")
    if branch.self_capacitance != 0:
        lines.append(f"C{tag}self {start} {end} {_value(float(branch.self_capacitance))}")
    return lines


def _load(stage: Stage) -> list[str]:
    z, omega = complex(stage.load.impedance(stage.carrier)), 2 * math.pi * stage.carrier
    lines = ["", "* load"]
    if z.imag == 0:
        return [*lines, f"Rload load 0 {_value(z.real)}"]
    second = (
        f"Lload loadr 0 {_value(z.imag / omega)}" if z.imag > 0 else f"Cload loadr 0 {_value(-1 / (omega * z.imag))}"
    )
    return [*lines, f"Rload load loadr {_value(z.real)}", second]
