"""``rfstage coil``: inductance to winding, winding to inductance, in air or on a ring core."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from rfstage.cli.words import Parser, given, output, read_all
from rfstage.errors import InputError, OutOfRangeError
from rfstage.fields import Field
from rfstage.jobfields import CARRIER
from rfstage.parts.cores import Core, core_named
from rfstage.parts.gauge import wire_diameter
from rfstage.quantity import QuantityError, exact_text

if TYPE_CHECKING:
    from rich.text import Text

    from rfstage.parts.coil import AirCoil
    from rfstage.parts.toroid import ToroidCoil
    from rfstage.report.page import Look

ABOUT = """\
A coil to wind: inductance from a winding, or the winding for an inductance,
in air (turns, length or both) or on a ring core; with its Q, self-resonance,
taps, and what squeezing or spreading the turns does.

  rfstage coil --turns 10 --diameter 50mm --length 50mm --wire 2mm \\
      --carrier 7.1MHz
  rfstage coil --inductance 3.4uH --diameter 50mm --wire 'AWG 12' \\
      --pitch 5mm --carrier 7.1MHz
  rfstage coil --inductance 2.2uH --core T-50-2 --carrier 7.1MHz
"""
_WINDING = (
    Field("", "turns", "real", "", 1, 1e5, False, "--turns", "turns, whole or not"),
    Field("", "diameter", "real", "m", 0, 100, True, "--diameter", "wire centre to wire centre"),
    Field("", "length", "real", "m", 0, 1000, True, "--length", "turns times pitch"),
    Field("", "pitch", "real", "m", 0, 100, True, "--pitch", "from turn to turn, instead of the length"),
    Field("", "wall", "real", "m", 0, 1, True, "--wall", "wall of a copper tube [solid wire]"),
)
_WANTED = (
    CARRIER,
    Field("", "inductance", "real", "H", 0, 1, True, "--inductance", "low-frequency inductance wanted"),
    Field("", "current", "real", "A", 0, 1e5, True, "--current", "rms current at the carrier, for loss or flux"),
    Field(
        *("", "temperature", "real", "", -100, 200, False, "--temperature"), "of the copper, in degrees Celsius [20]"
    ),
)
_FIELDS = (*_WANTED, *_WINDING)
_WIRE = Field("", "wire", "real", "m", 0, 1, True, "--wire")


def parser() -> Parser:
    """Return the command's parser."""
    made = Parser("coil", ABOUT)
    made.add_fields("wanted", _WANTED)
    winding = made.add_fields("winding", _WINDING)
    winding.add_argument("--wire", metavar="WIRE", help="a diameter (2mm) or an American gauge (AWG 14)")
    winding.add_argument("--core", metavar="NAME", help="a ring core, such as T-50-2 or FT-50-43")
    return made


def run(words: Sequence[str]) -> int:
    """Run the command and return its exit status."""
    found = parser().read(words)
    values, core = _request(found)
    current = values.get("current")

    from rfstage.parts.toroid import toroid_coil, turns_on

    coil: AirCoil | ToroidCoil
    if core is None:
        coil = _air(values)
    else:
        turns = values.get("turns")
        turns = turns_on(core, values["inductance"]) if turns is None else turns
        coil = toroid_coil(
            core,
            int(turns),
            carrier=values["carrier"],
            wire_diameter=values.get("wire"),
            temperature=values.get("temperature", 20.0),
        )

    def record() -> dict[str, Any]:
        from rfstage.files.coilrecord import coil_record

        return coil_record(coil, current=current)

    def page(look: Look) -> list[Text]:
        from rfstage.report.coil import coil_page

        return coil_page(look, coil, wanted=values.get("inductance"), current=current)

    output(found, record, page)
    return 0


def _air(values: dict[str, Any]) -> AirCoil:
    """Return the air coil of a request, its turns or its length found where they were not given."""
    from rfstage.parts.coil import air_coil
    from rfstage.parts.solenoid import length_for, turns_for

    turns, length, pitch = (values.get(name) for name in ("turns", "length", "pitch"))
    diameter, wire = values["diameter"], values["wire"]
    if turns is None:
        turns = float(turns_for(values["inductance"], diameter, wire, length=length, pitch=pitch))
    if length is None:
        length = turns * pitch if pitch is not None else float(length_for(values["inductance"], turns, diameter, wire))
    return air_coil(
        turns,
        diameter=diameter,
        length=length,
        wire_diameter=wire,
        carrier=values["carrier"],
        temperature=values.get("temperature", 20.0),
        wall=values.get("wall"),
    )


def _request(found: argparse.Namespace) -> tuple[dict[str, Any], Core | None]:
    """Return the values given and the core, all checked against each other.

    Raises
    ------
    InputError
        With one line for each thing that is wrong.
    """
    texts = given(found, _FIELDS)
    names = {*texts, *(name for name in ("wire", "core") if getattr(found, name) is not None)}
    problems = _misfits(names)
    core, wire = None, None
    if found.core is not None:
        try:
            core = core_named(found.core)
        except InputError as error:
            problems += [f"--{problem}" for problem in error.problems]
    if found.wire is not None:
        try:
            wire = wire_diameter(found.wire)
        except (QuantityError, OutOfRangeError) as error:
            problems.append(f"--wire: {error}")
    fields = {field.name: field for field in _FIELDS}
    read = {name: (fields[name], text) for name, text in texts.items()}
    if wire is not None:
        read["wire"] = (_WIRE, exact_text(wire, "m"))
    values = read_all(read, problems)
    problems = _core_misfits(values) if core is not None else _air_misfits(values)
    if problems:
        raise InputError(*problems)
    return values, core


def _misfits(names: set[str]) -> list[str]:
    """Return what is wrong with the options as a set, whatever their values."""
    problems, wants = [], [] if "carrier" in names else ["--carrier HZ"]
    goals = names & {"turns", "inductance"}
    if not goals:
        wants.append("--turns N or --inductance H")
    if "core" in names:
        problems += [
            f"--{name}: a core has its own shape; leave this out, or leave out --core"
            for name in ("diameter", "length", "pitch", "wall")
            if name in names
        ]
        if len(goals) == 2:
            problems.append("--turns and --inductance: on a core the one gives the other; give one of them")
    else:
        wants += [f"--{name} {'WIRE' if name == 'wire' else 'M'}" for name in ("diameter", "wire") if name not in names]
        if {"length", "pitch"} <= names:
            problems.append("--length and --pitch: give one of them; length is turns times pitch")
        spacing = next((name for name in ("length", "pitch") if name in names), None)
        if len(goals) == 2 and spacing:
            problems.append(
                f"--turns, --inductance and --{spacing}: nothing is left to be found; leave out one of them"
            )
        if len(goals) == 1 and not spacing:
            other = ", or --turns N to find the length" if "inductance" in goals else ""
            wants.append(f"--length M or --pitch M{other}")
    if wants:
        problems.append(f"coil wants {'; '.join(wants)}; 'rfstage coil --help' shows what it takes")
    return problems


def _core_misfits(values: dict[str, Any]) -> list[str]:
    turns = values.get("turns")
    if turns is not None and turns != int(turns):
        return [f"--turns: got {turns:g}; on a core turns are whole, since a wire goes through the hole or it does not"]
    return []


def _air_misfits(values: dict[str, Any]) -> list[str]:
    """Return what is wrong with the measures of an air coil against each other."""
    wire, diameter, turns, length = (values.get(name) for name in ("wire", "diameter", "turns", "length"))
    pitch = length / turns if length and turns else values.get("pitch")
    assert wire is not None
    assert diameter is not None
    problems, thick = [], exact_text(float(f"{wire:.4g}"), "m")
    if wire >= diameter:
        problems.append(
            f"--wire: got {thick}, not thinner than the coil's diameter, {exact_text(diameter, 'm')}, which is "
            "measured from wire centre to wire centre"
        )
    elif pitch is not None and wire > pitch * (1 + 1e-9):
        problems.append(
            f"--wire: got {thick}, thicker than the pitch, {exact_text(float(f'{pitch:.4g}'), 'm')} (spread the turns, "
            "take fewer, or thinner wire)"
        )
    elif pitch is not None and pitch > diameter * (1 + 1e-9):
        given = "length" if length is not None else "pitch"
        problems.append(
            f"--{given}: makes the pitch {exact_text(float(f'{pitch:.4g}'), 'm')}, above the diameter, "
            f"{exact_text(diameter, 'm')} (take more turns, or less length: so far drawn out they are no coil)"
        )
    elif pitch is None and length is not None and wire > length * (1 + 1e-9):
        problems.append(f"--wire: got {thick}, thicker than the coil is long, {exact_text(length, 'm')}")
    if values.get("wall") is not None and 2 * values["wall"] >= wire:
        problems.append(
            f"--wall: got {exact_text(values['wall'], 'm')}; allowed less than half the tube's diameter, "
            f"{exact_text(float(f'{wire / 2:.4g}'), 'm')} (--wire is the outer diameter)"
        )
    return problems
