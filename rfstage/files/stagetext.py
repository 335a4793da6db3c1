"""Write a stage file: TOML that a person edits to what was actually fitted."""

from __future__ import annotations

import dataclasses
import json
import math
import os
from pathlib import Path
from typing import Any

from rfstage.fields import LOSSLESS, Field
from rfstage.files.stagefields import (
    ASKED,
    DEVICE,
    DRIVE,
    JUNCTION,
    PAIR,
    REVERSE,
    SUPPLY,
    VERSION,
    WINDING,
)
from rfstage.files.tables import STAGE_FORMAT
from rfstage.kinds import KEYS, unit
from rfstage.ladder import Branch
from rfstage.load import Load, MeasuredLoad, SeriesLoad
from rfstage.quantity import exact_complex, exact_text
from rfstage.stage import PartData, Stage
from rfstage.stagevalues import LOSSES_AND_STRAYS, losses_and_strays

DIGITS = 12  # of every number written: enough for any part, and 200 mV stays 200 mV


def stage_text(stage: Stage, folder: Path) -> str:
    """Return a stage as TOML, `rounded`; a load file is named as seen from ``folder``."""
    stage = rounded(stage)
    device, supply = stage.device, stage.supply
    lines = [
        f'format = "{STAGE_FORMAT}"',
        f"version = {VERSION}",
        f'carrier = "{exact_text(stage.carrier, "Hz")}"',
        "",
        "[device]",
        f'family = "{device.family}"',
    ]
    lines += _lines(DEVICE[1:], device)
    if device.pair is not None:
        lines += _lines(PAIR, device)
    if device.junction_capacitance is not None:
        lines.append(f"junction_capacitance = {_inline(JUNCTION, device.junction_capacitance)}")
    if device.reverse_conduction is not None:
        lines.append(f"reverse_conduction = {_inline(REVERSE, device.reverse_conduction)}")
    lines += ["", "[drive]", *_lines(DRIVE, stage.drive), "", "[supply]", *_lines(SUPPLY, supply)]
    for branch in stage.branches:
        lines += ["", *_branch_lines(branch, stage.part_data.get(branch.name, PartData()))]
    lines += ["", "[load]", *_load_lines(stage.load, folder)]
    asked = _lines(ASKED, stage.asked)
    if asked:
        lines += ["", "[asked]", *asked]
    if stage.limit_rule or stage.limit_load:
        lines += ["", "[limit]"]
        lines += [f'rule = "{stage.limit_rule}"'] if stage.limit_rule else []
        lines += [f'load = "{exact_text(stage.limit_load, "ohm")}"'] if stage.limit_load else []
    return "\n".join(lines) + "\n"


def rounded(stage: Stage) -> Stage:
    """Return the stage as its file has it: every number to twelve significant digits."""
    made: Stage = _rounded(stage)
    return made


def _rounded(value: Any) -> Any:
    if isinstance(value, float):
        return float(f"{value:.{DIGITS}g}")
    if isinstance(value, complex):
        return complex(_rounded(value.real), _rounded(value.imag))
    if isinstance(value, tuple):
        return tuple(_rounded(item) for item in value)
    if isinstance(value, dict):
        return {key: _rounded(item) for key, item in value.items()}
    if isinstance(value, MeasuredLoad) or not dataclasses.is_dataclass(value) or isinstance(value, type):
        return value
    return dataclasses.replace(value, **{f.name: _rounded(getattr(value, f.name)) for f in dataclasses.fields(value)})


def _quoted(text: str) -> str:
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")  # JSON's escapes are TOML's too


def _written(field: Field, value: Any) -> str:
    if field.kind in ("text", "choice"):
        return _quoted(value)
    if field.kind == "q" and math.isinf(value):
        return f'"{LOSSLESS}"'
    return f'"{exact_text(value, field.unit)}"' if field.unit else repr(value)


def _lines(fields: tuple[Field, ...], source: object) -> list[str]:
    found = ((field, getattr(source, field.name)) for field in fields)
    return [f"{field.name} = {_written(field, value)}" for field, value in found if value is not None]


def _inline(fields: tuple[Field, ...], source: object) -> str:
    return "{ " + ", ".join(_lines(fields, source)) + " }"


def _branch_lines(branch: Branch, data: PartData) -> list[str]:
    lines = [
        "[[branch]]",
        f'name = "{branch.name}"',
        f'place = "{branch.place}"',
        f'kind = "{branch.kind}"',
    ]
    numbers = [(key.name, getattr(branch, key.attribute), key.unit, key.needed) for key in KEYS[branch.kind]]
    for name in losses_and_strays(branch.kind, branch.place):
        numbers.append((name, getattr(branch, name), LOSSES_AND_STRAYS[name], name == "series_resistance"))
    lines += [
        f'{name} = "{exact_text(float(value), of)}"' if of else f"{name} = {float(value)!r}"
        for name, value, of, even_zero in numbers
        if value is not None and (even_zero or value != 0)
    ]
    if branch.tap:
        lines.append(f'tap = "{branch.tap}"')
    if data.trim is not None:
        lines.append("trim = [" + ", ".join(f'"{exact_text(v, unit(branch.kind))}"' for v in data.trim) + "]")
    if data.tolerance is not None:
        lines.append(f'tolerance = "{exact_text(data.tolerance, "%")}"')
    if data.max_voltage is not None:
        lines.append(f'max_voltage = "{exact_text(data.max_voltage, "V")}"')
    if data.winding is not None:
        kinds = {field.name: field for field in WINDING}
        lines.append("winding = { " + ", ".join(f"{k} = {_written(kinds[k], v)}" for k, v in data.winding) + " }")
    return lines


def _load_lines(load: Load, folder: Path) -> list[str]:
    if isinstance(load, MeasuredLoad):
        relative = Path(os.path.relpath(load.name, folder)).as_posix()
        return [f"file = {_quoted(relative)}"]
    assert isinstance(load, SeriesLoad)
    return [f'impedance = "{exact_complex(load.at_carrier)} ohm"']
