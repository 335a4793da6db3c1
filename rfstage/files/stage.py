"""Read a stage file: what is built, checked key by key, every problem in one go."""

from __future__ import annotations

import math
import re
from pathlib import Path
from typing import Any

from rfstage.device import PAIRS, Device, JunctionCapacitance, ReverseConduction
from rfstage.errors import InputError
from rfstage.fields import Field, plain, shown
from rfstage.files.job import load_file_problem
from rfstage.files.stagefields import (
    ASKED,
    BRANCH,
    DEVICE,
    DRIVE,
    JUNCTION,
    LIMIT,
    LOAD,
    OWN,
    OWN_QS,
    PAIR,
    REVERSE,
    SUPPLY,
    TABLES,
    TOP,
    WINDING,
)
from rfstage.files.tables import kind_of, parse_toml, read_table
from rfstage.kinds import BETWEEN, KEYS, THROUGH, Key, stands, unit
from rfstage.ladder import Branch
from rfstage.limits import limit_named
from rfstage.load import Load, SeriesLoad
from rfstage.quantity import QuantityError, exact_text, parse_real
from rfstage.stage import CHOKE, OUTPUT_CAPACITANCE, Asked, Drive, PartData, Stage, Supply
from rfstage.stagevalues import LOSSES_AND_STRAYS, has_one_value, losses_and_strays

NAME = re.compile(r"[A-Za-z0-9_-]{1,12}", re.ASCII)
RESERVED = ("load", "carrier", "drive", "supply", "device")  # what else a sweep or a page may name


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
    top = read_table(document, TOP, prefix=f"{path}: ", problems=problems, also=TABLES)
    tables = {name: document.get(name, {}) for name in TABLES}
    read: dict[str, dict[str, Any]] = {}
    for name, fields, also in (
        ("device", (*DEVICE, *PAIR), ("junction_capacitance", "reverse_conduction")),
        ("drive", DRIVE, ()),
        ("supply", SUPPLY, ()),
        ("load", LOAD, ()),
        ("asked", ASKED, ()),
        ("limit", LIMIT, ()),
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
    junction = _read_inline(tables["device"], "junction_capacitance", JUNCTION, JunctionCapacitance, path, problems)
    reverse = _read_inline(tables["device"], "reverse_conduction", REVERSE, ReverseConduction, path, problems)
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
        values = read_table(table, BRANCH, prefix=where, problems=problems, also=(*OWN, "trim", "winding"))
        kind, place = values.get("kind", ""), values.get("place", "")
        for key in ("name", "place", "kind"):
            if key not in values and len(problems) == before:
                problems.append(f"{where}{key}: missing")
        if not isinstance(table, dict) or not kind:
            continue
        if place and not stands(kind, place):
            may = " | ".join(BETWEEN) if place == THROUGH else THROUGH
            problems.append(f"{where}place: got {shown(place)} for kind {kind}; allowed {may}")
        _refuse_other_keys(table, kind, place, where, problems)
        numbers = {key.attribute: _own_number(table, key, values, where, problems) for key in KEYS[kind]}
        if "q" in values and "series_resistance" in values:
            problems.append(f"{where}q: got both a Q and a series resistance; give one of them")
        name = values.get("name", "")
        if "name" in values:
            _check_name(name, (*data, CHOKE, OUTPUT_CAPACITANCE), f"{where}name", problems)
        trim = None
        if has_one_value(kind):
            trim = _read_trim(table.get("trim"), KEYS[kind][0], f"{where}trim", problems)
        value = numbers["value"]
        if trim is not None and value is not None and not trim[0] <= value <= trim[1] and len(problems) == before:
            got, low, high = (exact_text(number, unit(kind)) for number in (value, *trim))
            problems.append(f"{where}value: got {got}; allowed by its own trim {low} to {high}")
        winding = None
        if "winding" in table:
            wound = read_table(table["winding"], WINDING, prefix=f"{where}winding.", problems=problems)
            winding = tuple(wound.items())
        data[name] = PartData(trim, values.get("tolerance"), winding, values.get("max_voltage"))
        if len(problems) == before:
            given: dict[str, Any] = {key: values[key] for key in ("tap", *LOSSES_AND_STRAYS) if key in values}
            given |= {key: number for key, number in numbers.items() if number is not None}
            finite = {key: number for key, number in given.items() if number != math.inf}  # a lossless Q is none
            branches.append(Branch(name, place, kind, q_frequency=carrier, **finite))
    return tuple(branches), data


def _refuse_other_keys(table: dict[str, Any], kind: str, place: str, where: str, problems: list[str]) -> None:
    """Refuse the keys that other kinds of branch have, or the same kind in another place."""
    own = (*(key.name for key in KEYS[kind]), *losses_and_strays(kind, place))
    own = (*own, "trim") if has_one_value(kind) else (*own, "tap") if kind == "coupled" else own
    standing = f" in {place}" if kind == "trap" and place in BETWEEN else ""
    for key in (*OWN, *LOSSES_AND_STRAYS, "tap", "trim"):
        if key in table and key not in own:
            problems.append(
                f"{where}{key}: got {shown(table[key])}, but kind {kind}{standing} has no such key; "
                f"allowed {', '.join(own)}"
            )


def _own_number(
    table: dict[str, Any], key: Key, values: dict[str, Any], where: str, problems: list[str]
) -> float | None:
    """Return a number of the branch's own kind; None where it may be left out and is, or is wrong."""
    if key.name in OWN_QS:
        return values.get(key.name)
    if key.needed or key.name in table:
        return _number(table.get(key.name), key, f"{where}{key.name}", problems)
    return None


def _check_name(name: str, taken: tuple[str, ...], where: str, problems: list[str]) -> None:
    """Refuse a name that a page, a path of a sweep or a SPICE deck can't carry."""
    if not NAME.fullmatch(name) or name.lower() in RESERVED:
        problems.append(
            f"{where}: got {shown(name)}; allowed letters, digits, _ and -, at most 12, and not {', '.join(RESERVED)}"
        )
    elif name.lower() in (other.lower() for other in taken):  # a SPICE deck knows no capitals
        problems.append(f"{where}: {name!r} is taken; give each branch a name of its own, whatever its capitals")


def _number(raw: object, key: Key, where: str, problems: list[str]) -> float | None:
    if raw is None:
        problems.append(f"{where}: missing")
        return None
    allowed = f"above 0 {key.unit}".rstrip() if key.needed else f"0 {key.unit} or more"
    if key.high < math.inf:
        allowed += f" and below {exact_text(key.high, key.unit)}"
    try:
        if isinstance(raw, bool) or not isinstance(raw, str | int | float):
            raise QuantityError(f"got {shown(raw)}; wanted a number {allowed}")
        value = parse_real(raw, key.unit) if isinstance(raw, str) else float(raw)
        if not 0 <= value < key.high or (key.needed and value == 0):
            raise QuantityError(f"got {exact_text(value, key.unit)}; allowed {allowed}")
    except (QuantityError, OverflowError) as error:
        problems.append(f"{where}: {error}")
        return None
    return value


def _read_trim(raw: object, key: Key, where: str, problems: list[str]) -> tuple[float, float] | None:
    if raw is None:
        return None
    if not isinstance(raw, list) or len(raw) != 2:
        problems.append(f"{where}: got {shown(raw)}; wanted the least and the most that can be set, as a list of two")
        return None
    low, high = (_number(value, key, where, problems) for value in raw)
    if low is None or high is None:
        return None
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
