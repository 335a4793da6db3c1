"""The stage file: what is built, in TOML that a person edits to what was actually fitted."""

from __future__ import annotations

import dataclasses
import json
import math
import os
import re
from pathlib import Path
from typing import Any

from rfstage.device import PAIRS, Device, JunctionCapacitance, ReverseConduction
from rfstage.errors import InputError
from rfstage.fields import LOSSLESS, Field, plain, shown
from rfstage.files.job import load_file_problem
from rfstage.files.tables import STAGE_FORMAT, kind_of, parse_toml, read_table
from rfstage.jobfields import CARRIER, FAMILIES
from rfstage.ladder import Branch
from rfstage.limits import limit_named
from rfstage.load import Load, MeasuredLoad, SeriesLoad
from rfstage.quantity import QuantityError, exact_complex, exact_text, parse_real
from rfstage.stage import CHOKE, OUTPUT_CAPACITANCE, Asked, Drive, PartData, Stage, Supply

VERSION = 1
DIGITS = 12  # of every number written: enough for any part, and 200 mV stays 200 mV
NAME = re.compile(r"[A-Za-z0-9_-]{1,12}", re.ASCII)
RESERVED = ("load", "carrier", "drive", "supply", "device")  # what else a sweep or a page may name
VALUE_UNIT = {"capacitor": "F", "coil": "H", "resistor": "ohm"}

_TOP = (
    Field("format", "format", "choice", choices=(STAGE_FORMAT,)),
    Field("version", "version", "count", "", VERSION, VERSION),
    Field("carrier", "carrier", "real", "Hz", CARRIER.low, CARRIER.high),
)
_DEVICE = (
    Field("family", "family", "choice", choices=FAMILIES),
    Field("transfer_factor", "transfer_factor", "real", "", 0, 1e9, True),
    Field("exponent", "exponent", "real", "", 1, 3),
    Field("threshold", "threshold", "real", "V", -1e6, 1e6),
    Field("threshold_softness", "threshold_softness", "real", "V", 0, 1e6),
    Field("knee_voltage", "knee_voltage", "real", "V", 0, 1e6, True),
    Field("knee_resistance", "knee_resistance", "real", "ohm", 0, 1e7),
    Field("amplification_factor", "amplification_factor", "real", "", 1, 1e4, True),
    Field("output_capacitance", "output_capacitance", "real", "F", 0, 1e-3),
    Field("max_voltage", "max_voltage", "real", "V", 0, 1e7, True),
    Field("max_current", "max_current", "real", "A", 0, 1e7, True),
    Field("max_dissipation", "max_dissipation", "real", "W", 0, 1e8, True),
)
_PAIR = (
    Field("pair", "pair", "choice", choices=PAIRS),
    Field("imbalance", "imbalance", "real", "", 0, 2),
)
_JUNCTION = (
    Field("at_zero", "at_zero", "real", "F", 0, 1e-3, True),
    Field("potential", "potential", "real", "V", 0, 1e4, True),
    Field("grading", "grading", "real", "", 0, 0.95, True),
)
_REVERSE = (
    Field("conductance", "conductance", "real", "S", 0, 1e6, True),
    Field("threshold", "threshold", "real", "V", 0, 1e4),
    Field("softness", "softness", "real", "V", 0, 1e4, True),
)
_DRIVE = (
    Field("bias", "bias", "real", "V", -1e6, 1e6),
    Field("amplitude", "amplitude", "real", "V", 0, 1e6),
)
_SUPPLY = (
    Field("voltage", "voltage", "real", "V", 0, 1e6, True),
    Field("choke", "choke", "real", "H", 0, 1e3, True),
    Field("choke_resistance", "choke_resistance", "real", "ohm", 0, 1e6),
    Field("choke_q", "choke_q", "q", "", 1, 1e7),
)
_BRANCH = (
    Field("name", "name", "text"),
    Field("place", "place", "choice", choices=("series", "shunt")),
    Field("kind", "kind", "choice", choices=tuple(VALUE_UNIT)),
    Field("q", "q", "q", "", 1, 1e7),
    Field("series_resistance", "series_resistance", "real", "ohm", 0, 1e7),
    Field("lead_inductance", "lead_inductance", "real", "H", 0, 1.0),
    Field("self_capacitance", "self_capacitance", "real", "F", 0, 1e-3),
    Field("tolerance", "tolerance", "real", "%", 0, 100),
)
_LOAD = (
    Field("impedance", "impedance", "impedance", "ohm", 0, 1e7, True),
    Field("file", "file", "text"),
    Field("resistance", "resistance", "real", "ohm", 0, 1e7, True),
    Field("inductance", "inductance", "real", "H", 0, 1e3),
    Field("capacitance", "capacitance", "real", "F", 0, 1.0, True),
)
_ASKED = (
    Field("output_power", "output_power", "real", "W", 0, 1e7, True),
    Field("conduction_angle", "conduction_angle", "real", "deg", 0, 360, True),
    Field("minimum_voltage", "minimum_voltage", "real", "V", 0, 1e6),
)
_LIMIT = (Field("rule", "rule", "text"), Field("load", "load", "real", "ohm", 0, 1e7, True))
_WINDING = (
    Field("turns", "turns", "real", "", 0, 1e5, True),
    Field("diameter", "diameter", "real", "m", 0, 100, True),
    Field("length", "length", "real", "m", 0, 100, True),
    Field("wire", "wire", "real", "m", 0, 1, True),
    Field("core", "core", "text"),
)
_TABLES = ("device", "drive", "supply", "branch", "load", "asked", "limit")


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
    lines += _lines(_DEVICE[1:], device)
    if device.pair is not None:
        lines += _lines(_PAIR, device)
    if device.junction_capacitance is not None:
        lines.append(f"junction_capacitance = {_inline(_JUNCTION, device.junction_capacitance)}")
    if device.reverse_conduction is not None:
        lines.append(f"reverse_conduction = {_inline(_REVERSE, device.reverse_conduction)}")
    lines += ["", "[drive]", *_lines(_DRIVE, stage.drive), "", "[supply]", *_lines(_SUPPLY, supply)]
    for branch in stage.branches:
        lines += ["", *_branch_lines(branch, stage.part_data.get(branch.name, PartData()))]
    lines += ["", "[load]", *_load_lines(stage.load, folder)]
    asked = _lines(_ASKED, stage.asked)
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
        f'value = "{exact_text(float(branch.value), VALUE_UNIT[branch.kind])}"',
    ]
    if branch.q is not None:
        lines.append(f"q = {float(branch.q)!r}")
    if branch.series_resistance is not None:
        lines.append(f'series_resistance = "{exact_text(float(branch.series_resistance), "ohm")}"')
    if branch.lead_inductance != 0:
        lines.append(f'lead_inductance = "{exact_text(float(branch.lead_inductance), "H")}"')
    if branch.self_capacitance != 0:
        lines.append(f'self_capacitance = "{exact_text(float(branch.self_capacitance), "F")}"')
    if data.trim is not None:
        unit = VALUE_UNIT[branch.kind]
        lines.append("trim = [" + ", ".join(f'"{exact_text(v, unit)}"' for v in data.trim) + "]")
    if data.tolerance is not None:
        lines.append(f'tolerance = "{exact_text(data.tolerance, "%")}"')
    if data.winding is not None:
        kinds = {field.name: field for field in _WINDING}
        lines.append("winding = { " + ", ".join(f"{k} = {_written(kinds[k], v)}" for k, v in data.winding) + " }")
    return lines


def _load_lines(load: Load, folder: Path) -> list[str]:
    if isinstance(load, MeasuredLoad):
        relative = Path(os.path.relpath(load.name, folder)).as_posix()
        return [f"file = {_quoted(relative)}"]
    assert isinstance(load, SeriesLoad)
    return [f'impedance = "{exact_complex(load.at_carrier)} ohm"']


def load_stage(path: str | Path) -> Stage:
    """Read a stage file.

    Parameters
    ----------
    path : str or Path
        A TOML file; its keys are in the README.

    Returns
    -------
    Stage

    Raises
    ------
    InputError
        With one line for each value that is unknown, missing, malformed or out of range.
    FileError
        If the file, or the load file it names, can't be read.
    """
    path = Path(path)
    document = parse_toml(path)
    if kind_of(document) == "job":
        raise InputError(f"{path}: is a job file; use 'rfstage design {path}'")
    problems: list[str] = []
    top = read_table(document, _TOP, prefix=f"{path}: ", problems=problems, also=_TABLES)
    tables = {name: document.get(name, {}) for name in _TABLES}
    read: dict[str, dict[str, Any]] = {}
    for name, fields, also in (
        ("device", (*_DEVICE, *_PAIR), ("junction_capacitance", "reverse_conduction")),
        ("drive", _DRIVE, ()),
        ("supply", _SUPPLY, ()),
        ("load", _LOAD, ()),
        ("asked", _ASKED, ()),
        ("limit", _LIMIT, ()),
    ):
        read[name] = read_table(tables[name], fields, prefix=f"{path}: {name}.", problems=problems, also=also)
    branches, data = _read_branches(tables["branch"], top.get("carrier"), f"{path}: branch", problems)
    needed = {
        "device": ("family", "transfer_factor", "threshold", "knee_voltage"),
        "drive": ("bias", "amplitude"),
        "supply": ("voltage", "choke"),
    }
    _missing({"": top}, {"": ("carrier",)}, str(path), problems)
    _missing(read, needed, str(path), problems)
    junction = _read_inline(tables["device"], "junction_capacitance", _JUNCTION, JunctionCapacitance, path, problems)
    reverse = _read_inline(tables["device"], "reverse_conduction", _REVERSE, ReverseConduction, path, problems)
    _check_imbalance(read["device"], path, problems)
    load = _read_load(read["load"], top.get("carrier"), path, problems)
    rule = read["limit"].get("rule")
    if rule is not None:
        try:
            limit_named(rule)
        except InputError as error:
            problems += [f"{path}: {line}" for line in error.problems]
    if problems:
        raise InputError(*problems)
    assert load is not None
    device = {"exponent": 1.0, "threshold_softness": 0.0, "knee_resistance": 0.0, **read["device"]}
    return Stage(
        carrier=top["carrier"],
        device=Device(**device, junction_capacitance=junction, reverse_conduction=reverse),
        drive=Drive(**read["drive"]),
        supply=Supply(**read["supply"]),
        branches=branches,
        load=load,
        asked=Asked(**read["asked"]),
        limit_rule=rule,
        limit_load=read["limit"].get("load"),
        part_data=data,
    )


def _missing(
    read: dict[str, dict[str, Any]], needed: dict[str, tuple[str, ...]], path: str, problems: list[str]
) -> None:
    for table, keys in needed.items():
        for key in keys:
            full = f"{path}: {table}.{key}" if table else f"{path}: {key}"
            if key not in read[table] and not any(problem.startswith(full + ":") for problem in problems):
                problems.append(f"{full}: missing")


def _check_imbalance(device: dict[str, Any], path: Path, problems: list[str]) -> None:
    where = f"{path}: device.imbalance"
    if "imbalance" in device and "pair" not in device:
        if not any(problem.startswith(f"{path}: device.pair:") for problem in problems):
            problems.append(f"{where}: only a pair has one; give device.pair ({' or '.join(PAIRS)}) or leave it out")
    elif device.get("imbalance") == 2:
        problems.append(f"{where}: got 2; allowed 0 to below 2, since at 2 the second device gives nothing")


def _read_inline(
    device: object, key: str, fields: tuple[Field, ...], make: Any, path: Path, problems: list[str]
) -> Any:
    if not isinstance(device, dict) or key not in device:
        return None
    before = len(problems)
    prefix = f"{path}: device.{key}."
    values = read_table(device[key], fields, prefix=prefix, problems=problems)
    _missing({f"device.{key}": values}, {f"device.{key}": tuple(f.name for f in fields)}, str(path), problems)
    return make(**values) if len(problems) == before else None


def _read_branches(
    raw: object, carrier: float | None, prefix: str, problems: list[str]
) -> tuple[tuple[Branch, ...], dict[str, PartData]]:
    if not isinstance(raw, list) or not raw:
        problems.append(f"{prefix}: missing; a stage has one [[branch]] for each part from device to load")
        return (), {}
    branches: list[Branch] = []
    data: dict[str, PartData] = {}
    for k, table in enumerate(raw, start=1):
        where = f"{prefix}[{k}]."
        before = len(problems)
        values = read_table(table, _BRANCH, prefix=where, problems=problems, also=("value", "trim", "winding"))
        unit = VALUE_UNIT.get(values.get("kind", ""), "")
        for key in ("name", "place", "kind"):
            if key not in values and len(problems) == before:
                problems.append(f"{where}{key}: missing")
        if not isinstance(table, dict) or not unit:
            continue
        value = _positive(table.get("value"), unit, f"{where}value", problems)
        q = values.get("q")
        if q is not None and "series_resistance" in values:
            problems.append(f"{where}q: got both a Q and a series resistance; give one of them")
        name = values.get("name", "")
        if "name" in values:
            _check_name(name, (*data, CHOKE, OUTPUT_CAPACITANCE), f"{where}name", problems)
        trim = _read_trim(table.get("trim"), unit, f"{where}trim", problems)
        if trim is not None and not trim[0] <= value <= trim[1] and len(problems) == before:
            low, high = (exact_text(end, unit) for end in trim)
            problems.append(f"{where}value: got {exact_text(value, unit)}; allowed by its own trim {low} to {high}")
        winding = None
        if "winding" in table:
            wound = read_table(table["winding"], _WINDING, prefix=f"{where}winding.", problems=problems)
            winding = tuple(wound.items())
        data[name] = PartData(trim, values.get("tolerance"), winding)
        if len(problems) == before:
            branches.append(
                Branch(
                    name,
                    values["place"],
                    values["kind"],
                    value,
                    q=None if q is None or math.isinf(q) else q,
                    q_frequency=carrier,
                    series_resistance=values.get("series_resistance"),
                    lead_inductance=values.get("lead_inductance", 0.0),
                    self_capacitance=values.get("self_capacitance", 0.0),
                )
            )
    return tuple(branches), data


def _check_name(name: str, taken: tuple[str, ...], where: str, problems: list[str]) -> None:
    """Refuse a name that a page, a path of a sweep or a SPICE deck can't carry."""
    if not NAME.fullmatch(name) or name.lower() in RESERVED:
        problems.append(
            f"{where}: got {shown(name)}; allowed letters, digits, _ and -, at most 12, and not {', '.join(RESERVED)}"
        )
    elif name.lower() in (other.lower() for other in taken):  # a SPICE deck knows no capitals
        problems.append(f"{where}: {name!r} is taken; give each branch a name of its own, whatever its capitals")


def _positive(raw: object, unit: str, where: str, problems: list[str]) -> float:
    if raw is None:
        problems.append(f"{where}: missing")
        return math.nan
    try:
        if isinstance(raw, bool) or not isinstance(raw, str | int | float):
            raise QuantityError(f"got {shown(raw)}; wanted a number above 0 {unit}")
        value = parse_real(raw, unit) if isinstance(raw, str) else float(raw)
        if not 0 < value < math.inf:
            raise QuantityError(f"got {exact_text(value, unit)}; allowed above 0 {unit}")
    except (QuantityError, OverflowError) as error:
        problems.append(f"{where}: {error}")
        return math.nan
    return value


def _read_trim(raw: object, unit: str, where: str, problems: list[str]) -> tuple[float, float] | None:
    if raw is None:
        return None
    if not isinstance(raw, list) or len(raw) != 2:
        problems.append(f"{where}: got {shown(raw)}; wanted the least and the most that can be set, as a list of two")
        return None
    low, high = (_positive(value, unit, where, problems) for value in raw)
    if low >= high:
        problems.append(f"{where}: the least must be below the most")
    return low, high


def _read_load(values: dict[str, Any], carrier: float | None, path: Path, problems: list[str]) -> Load | None:
    ways = [key for key in ("impedance", "file", "resistance") if key in values]
    if len(ways) != 1:
        if not any(f"{path}: load" in problem for problem in problems):
            problems.append(
                f"{path}: load: got {' and '.join(ways) or 'nothing'}; wanted one of impedance, file, resistance"
            )
        return None
    if carrier is None:
        return None
    if "file" in values:
        file = path.parent / values["file"]
        if wrong := load_file_problem(str(file)):
            problems.append(f"{path}: load.file: {wrong}")
            return None
        from rfstage.files.touchstone import read_load

        load = read_load(file)
        if not load.reaches(carrier):
            problems.append(
                f"{path}: load.file: {plain(load.name)} does not reach the carrier of {exact_text(carrier, 'Hz')}"
            )
        return load
    if "impedance" in values:
        return SeriesLoad(values["impedance"], carrier)
    if "inductance" in values and "capacitance" in values:
        problems.append(f"{path}: load: got both an inductance and a capacitance in series; give one of them")
        return None
    omega = 2 * math.pi * carrier
    reactance = omega * values.get("inductance", 0.0)
    if "capacitance" in values:
        reactance = -1 / (omega * values["capacitance"])
    return SeriesLoad(complex(values["resistance"], reactance), carrier)
