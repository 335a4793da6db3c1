"""A SPICE deck of a stage: the same device law as behavioural sources, for any SPICE3-style simulator.

Losses are written as constant resistances at the carrier, since a transient run knows no Q; a choke's RF loss
stands as a resistance across it, so that the supply's direct current does not feel it.

::

    trap         series: L, R beside C, R;  shunt: L, C, R and lead one after the other
    coupled      L, R to ground on both sides, and K;  tapped: the two parts meet at the tap
    transformer  leakage, R, then magnetizing L, R to ground, and E and F for the ratio
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

from rfstage.branch import Real
from rfstage.device import Device
from rfstage.errors import ImpossibleError
from rfstage.kinds import THROUGH
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
    estimated from the choke, or a larger winding, and the largest capacitor with the load's resistance.
    """
    period = 1 / stage.carrier
    resistance = complex(stage.load.impedance(stage.carrier)).real
    seen = abs(complex(stage.ladder.impedance(stage.carrier, stage.load)))
    largest = max((float(b.value) for b in stage.branches if b.kind == "capacitor"), default=0.0)
    omega = 2 * math.pi * stage.carrier
    wound = [complex(b.ports(stage.carrier).own).imag / omega for b in stage.branches if b.place == THROUGH]
    slow = max(max([stage.supply.choke, *wound]) / max(seen, 1e-9) * 2, largest * (resistance + seen))
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
    last = max((k for k, b in enumerate(stage.branches) if b.place != "shunt"), default=-1)
    for k, branch in enumerate(stage.branches):
        tag, held = f"{k + 1}", 0.0 if blocked else stage.supply.voltage
        lines.append(f"* {branch.name}")
        if branch.place == "shunt":
            lines += _part(branch, node, "0", tag, stage, held)
            continue
        after = "load" if k == last else f"n{tag}"
        if branch.place == THROUGH:
            two_port = _transformer if branch.kind == "transformer" else _coupled
            lines += two_port(branch, node, after, tag, stage)
        else:
            lines += _part(branch, node, after, tag, stage, held if branch.blocks else 0.0)
        blocked = blocked or branch.blocks or branch.place == THROUGH
        node = after
    if last < 0:
        lines.append(f"Vthrough {NODE} load 0")
    return lines


def _part(branch: Branch, start: str, end: str, tag: str, stage: Stage, charged: float) -> list[str]:
    omega = 2 * math.pi * stage.carrier
    value = float(branch.value)
    own, lead = _series_resistance(branch), ("L", "lead", float(branch.lead_inductance))
    capacitor = ("C", "", value)
    if branch.kind == "resistor":
        return _chain([("R", "", value + own), lead], start, end, tag)
    if branch.kind == "capacitor":
        return _chain(
            [capacitor, ("R", "", own + _loss(1 / (omega * value), branch.q)), lead], start, end, tag, charged
        )
    coil, loss = ("L", "", value), _loss(omega * value, branch.q)
    if branch.kind == "coil":
        lines = _chain([coil, ("R", "", own + loss)], start, end, tag)
        if branch.self_capacitance != 0:
            lines.append(f"C{tag}self {start} {end} {_value(float(branch.self_capacitance))}")
        return lines
    second = float(branch.second)
    capacitor, second_loss = ("C", "", second), _loss(1 / (omega * second), branch.second_q)
    if branch.place == "shunt":
        return _chain([coil, capacitor, ("R", "", own + loss + second_loss), lead], start, end, tag, charged)
    beside = [capacitor, ("R", "beside", second_loss)]
    return _chain([coil, ("R", "", loss)], start, end, tag) + _chain(beside, start, end, tag, letters="xyz")


def _coupled(branch: Branch, start: str, end: str, tag: str, stage: Stage) -> list[str]:
    """Return two windings and their coupling; a tapped coil's first part lies between device and load."""
    omega = 2 * math.pi * stage.carrier
    near, far = float(branch.value), float(branch.second)
    above = [("L", "", near), ("R", "", _loss(omega * near, branch.q))]
    below = [("L", "far", far), ("R", "far", _loss(omega * far, branch.second_q))]
    top, foot, second = {"": (start, "0", end), "load": (start, end, end), "device": (end, start, start)}[branch.tap]
    return [
        *_chain(above, top, foot, tag),
        *_chain(below, second, "0", tag, letters="xyz"),
        f"K{tag} L{tag} L{tag}far {_value(float(branch.coupling))}",
    ]


def _transformer(branch: Branch, start: str, end: str, tag: str, stage: Stage) -> list[str]:
    """Return leakage and winding, the core, and an ideal ratio: a voltage made there, its current fed back."""
    second, share = float(branch.second), _value(1 / float(branch.value))
    core, behind = f"n{tag}core", f"n{tag}far"
    winding = [("L", "leak", float(branch.lead_inductance)), ("R", "", _series_resistance(branch))]
    magnetizing = [("L", "", second), ("R", "core", _loss(2 * math.pi * stage.carrier * second, branch.second_q))]
    return [
        *_chain(winding, start, core, tag),
        *_chain(magnetizing, core, "0", tag, letters="xyz"),
        f"E{tag} {behind} 0 {core} 0 {share}",
        f"V{tag} {behind} {end} 0",
        f"F{tag} {core} 0 V{tag} {share}",
    ]


def _series_resistance(branch: Branch) -> float:
    return 0.0 if branch.series_resistance is None else float(branch.series_resistance)


def _loss(reactance: float, q: Real | None) -> float:
    return 0.0 if q is None else reactance / float(q)


def _chain(
    elements: Sequence[tuple[str, str, float]],
    start: str,
    end: str,
    tag: str,
    charged: float = 0.0,
    letters: str = "abc",
) -> list[str]:
    """Return elements one after the other, as letter, what their name ends in, and amount; one of 0 is left out.

    A capacitor among them starts with its charge; if nothing is left a source of 0 V stands for the wire.
    """
    there = [element for element in elements if element[2] != 0] or [("V", "wire", 0.0)]
    nodes = [start, *(f"n{tag}{letter}" for letter in letters[: len(there) - 1]), end]
    return [
        f"{letter}{tag}{name} {nodes[k]} {nodes[k + 1]} {_value(amount)}"
        + (f" ic={_value(charged)}" if letter == "C" and charged else "")
        for k, (letter, name, amount) in enumerate(there)
    ]


def _load(stage: Stage) -> list[str]:
    z, omega = complex(stage.load.impedance(stage.carrier)), 2 * math.pi * stage.carrier
    lines = ["", "* load"]
    if z.imag == 0:
        return [*lines, f"Rload load 0 {_value(z.real)}"]
    second = (
        f"Lload loadr 0 {_value(z.imag / omega)}" if z.imag > 0 else f"Cload loadr 0 {_value(-1 / (omega * z.imag))}"
    )
    return [*lines, f"Rload load loadr {_value(z.real)}", second]
