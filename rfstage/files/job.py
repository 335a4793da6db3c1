"""Read a job: a TOML file, options, or both. Nothing heavy is loaded before the job is sound."""

from __future__ import annotations

import os
import re
from collections.abc import Mapping
from itertools import pairwise
from typing import TYPE_CHECKING, Any

from rfstage.errors import InputError
from rfstage.fields import Field, nearest, plain, read, shown
from rfstage.files.tables import kind_of, parse_toml, read_table
from rfstage.jobfields import CARRIER, JOB_FIELDS, REQUIRED, conflicts
from rfstage.quantity import QuantityError, exact_text

if TYPE_CHECKING:
    from rfstage.job import Job

LOAD_FILE_ENDING = ".s1p"
_SEVERAL = re.compile(r"(?<=[A-Za-z])\s*,\s*")  # between carriers: a comma behind a unit, which no decimal comma is
# an option puts aside what the file says of these
_RIVALS = {"load": ("load_file",), "loaded_q": ("input_q",), "input_q": ("loaded_q",)}


def load_job(path: str | os.PathLike[str]) -> Job:
    """Read a job file.

    Parameters
    ----------
    path : str or path
        A TOML file with the keys of `rfstage.jobfields.JOB_FIELDS`.

    Returns
    -------
    Job

    Raises
    ------
    InputError
        With one line for each value that is unknown, missing, malformed or out of range.
    FileError
        If the job file can't be read.
    """
    return read_job(path, {})


def read_job(path: str | os.PathLike[str] | None, options: Mapping[str, str]) -> Job:
    """Return the job of a file and options by field name; options win. Errors as `load_job`."""
    jobs = read_jobs(path, options)
    if len(jobs) > 1:
        raise InputError(f"stage.carrier: got {len(jobs)} carriers; wanted one (load_jobs reads several)")
    return jobs[0]


def load_jobs(path: str | os.PathLike[str]) -> tuple[Job, ...]:
    """Read a job file with one carrier or several, rising: a job for each. Arguments and errors as `load_job`."""
    return read_jobs(path, {})


def read_jobs(path: str | os.PathLike[str] | None, options: Mapping[str, str]) -> tuple[Job, ...]:
    """Return the jobs of a file and options by field name, one a carrier; options win. Errors as `load_job`."""
    problems: list[str] = []
    values: dict[str, Any] = {}
    where = {field.name: field.path for field in JOB_FIELDS}
    misplaced: set[str] = set()
    if path is not None:
        values, misplaced = _from_file(os.fspath(path), problems)
        where = {name: f"{path}: {key}" for name, key in where.items()}
    carriers = values.pop("carriers", None)
    if _SEVERAL.search(options.get("carrier", "")):
        where["carrier"] = CARRIER.option
        carriers = _carriers(_SEVERAL.split(options["carrier"]), CARRIER.option, problems)
        options = {name: text for name, text in options.items() if name != "carrier"}
    if carriers:
        values["carrier"] = carriers[0]
    for field in JOB_FIELDS:
        if field.name in options:
            if field is CARRIER:
                carriers = None
            where[field.name] = field.option
            for rival in _RIVALS.get(field.name, ()):
                if rival not in options:
                    values.pop(rival, None)
            _take_option(field, options[field.name], values, problems)
    for name in REQUIRED:
        if name not in values and name not in misplaced and not any(p.startswith(where[name] + ":") for p in problems):
            field = _field(name)
            problems.append(f"{where[name]}: missing ({field.help}; option {field.option})")
    problems += [_placed(line, where) for line in conflicts(values)]
    carriers = carriers or [values.get("carrier")]
    file = values.get("load_file")
    if file is not None and (wrong := load_file_problem(file)):
        problems.append(f"{where['load'] if 'load' in options else where['load_file']}: {wrong}")
    if problems:
        raise InputError(*problems)
    if file is not None:
        from rfstage.files.touchstone import read_load

        values["load"] = read_load(file)
    from rfstage.job import Job, Variable

    variable = tuple(Variable(*v) for v in values.pop("variable", ()))
    return tuple(Job(**{**values, "carrier": carrier}, variable=variable) for carrier in carriers)


def load_file_problem(name: str) -> str:
    """Return what is wrong with the name of a load file, or nothing if it can be opened as one."""
    if not name.lower().endswith(LOAD_FILE_ENDING) or os.path.isdir(name):
        return f"{plain(name)}: a load file ends in {LOAD_FILE_ENDING} and is a one-port"
    return "" if os.path.exists(name) else f"{plain(name)}: is not there"


def impedance_or_file(field: Field, text: str) -> complex | None:
    """Return the impedance that a text is, or None if it names a load file.

    Raises
    ------
    QuantityError
        If it is neither; a file of another kind is said to be that.
    """
    if text.lower().endswith(LOAD_FILE_ENDING):
        return None
    try:
        return complex(read(field, text))
    except QuantityError:
        if re.search(r"\.s\d+p\Z", text, re.IGNORECASE) or (text and os.path.exists(text)):
            raise QuantityError(load_file_problem(text)) from None
        raise


def _placed(line: str, where: Mapping[str, str]) -> str:
    """Return a line about a key with the file or the option that the key's value came from."""
    key, colon, rest = line.partition(":")
    return next((where[field.name] for field in JOB_FIELDS if field.path == key), key) + colon + rest


def _field(name: str) -> Field:
    return next(field for field in JOB_FIELDS if field.name == name)


def _take_option(field: Field, text: str, values: dict[str, Any], problems: list[str]) -> None:
    try:
        value = impedance_or_file(field, text) if field.name == "load" else read(field, text)
    except QuantityError as error:
        problems.append(f"{field.option}: {error}")
        return
    values[field.name] = value
    if value is None:
        values["load_file"] = text
        del values[field.name]


def _special(group: str, table: object, path: str, problems: list[str]) -> dict[str, Any]:
    """Return what a table holds beside plain values: several carriers, and the ranges of variable parts."""
    if not isinstance(table, dict):
        return {}
    if group == "stage" and isinstance(table.get("carrier"), list):
        return {"carriers": _carriers(table["carrier"], f"{path}: {CARRIER.path}", problems)}
    if group == "tank" and "variable" in table:
        return {"variable": _variable(table["variable"], f"{path}: tank.variable", problems)}
    return {}


def _carriers(raw: list[Any], where: str, problems: list[str]) -> list[float]:
    """Return several carriers [Hz], which must rise."""
    found: list[float] = []
    for text in raw:
        try:
            found.append(read(CARRIER, text.strip() if isinstance(text, str) else text))
        except QuantityError as error:
            problems.append(f"{where}: {error}")
    if not raw:
        problems.append(f"{where}: got an empty list; wanted one carrier or several")
    if len(found) == len(raw) and any(b <= a for a, b in pairwise(found)):
        rising = ", ".join(exact_text(f, "Hz") for f in sorted(set(found)))
        fault = "one carrier twice" if len(set(found)) < len(found) else "carriers out of order"
        problems.append(f"{where}: got {fault}; wanted them rising, each once: {rising}")
    return found


def _variable(raw: object, where: str, problems: list[str]) -> list[tuple[str, float, float]]:
    """Return the ranges of variable parts: a table of names, each with a list of the least and the most."""
    if not isinstance(raw, dict):
        problems.append(f'{where}: got {shown(raw)}; wanted a table such as {{ C1 = ["20 pF", "500 pF"] }}')
        return []
    found = []
    for name, ends in raw.items():
        unit = {"C": "F", "L": "H"}.get(name[:1], "")
        if not unit:
            problems.append(f"{where}.{plain(name)}: a variable part is a capacitor or a coil, such as C1 or L1")
        elif not isinstance(ends, list) or len(ends) != 2:
            got = f"a list of {len(ends)}" if isinstance(ends, list) else shown(ends)
            problems.append(f"{where}.{plain(name)}: got {got}; wanted a list of the least and the most")
        else:
            end = Field("", "", "real", unit, 0, 1.0, True)
            try:
                least, most = (read(end, value) for value in ends)
            except QuantityError as error:
                problems.append(f"{where}.{plain(name)}: {error}")
                continue
            if least >= most:
                problems.append(f"{where}.{plain(name)}: the least must be below the most")
            found.append((name, least, most))
    return found


def _from_file(path: str, problems: list[str]) -> tuple[dict[str, Any], set[str]]:
    """Return the values of a job file, and the names of those that stand at its top instead of in their table."""
    document = parse_toml(path)
    if kind_of(document) == "stage":
        raise InputError(f"{path}: is a stage file; use 'rfstage settle {path}'")
    values: dict[str, Any] = {}
    misplaced: set[str] = set()
    groups: dict[str, list[Field]] = {}
    for field in JOB_FIELDS:
        groups.setdefault(field.path.split(".")[0], []).append(field)
    homes = {field.path.split(".")[1]: field for field in JOB_FIELDS} | {field.name: field for field in JOB_FIELDS}
    for group, table in document.items():
        if group in homes and not isinstance(table, dict):
            home, key = homes[group].path.split(".")
            misplaced.add(homes[group].name)
            problems.append(f"{path}: {group}: belongs under [{home}]" + (f" as {key}" if key != group else ""))
        elif group in groups:
            values |= _special(group, table, path, problems)
            also = ("carrier",) if "carriers" in values and group == "stage" else ("variable",) * (group == "tank")
            fields = [field for field in groups[group] if field is not CARRIER or "carriers" not in values]
            values |= read_table(table, fields, prefix=f"{path}: {group}.", problems=problems, also=also)
        else:
            problems.append(f"{path}: {plain(group)}: no such table{nearest(group, groups)}")
    if "load_file" in values:
        if "load" in values:
            problems.append(f"{path}: load: got both an impedance and a file; give one of them")
        values["load_file"] = os.path.join(os.path.dirname(path), values["load_file"])
    return values, misplaced
