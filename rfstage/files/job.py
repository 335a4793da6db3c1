"""Read a job: a TOML file, options, or both. Nothing heavy is loaded before the job is sound."""

from __future__ import annotations

import os
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from rfstage.errors import InputError
from rfstage.fields import Field, nearest, read
from rfstage.files.tables import parse_toml, read_table
from rfstage.jobfields import JOB_FIELDS, REQUIRED, conflicts
from rfstage.quantity import QuantityError

if TYPE_CHECKING:
    from rfstage.job import Job

LOAD_FILE_ENDING = ".s1p"
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
    problems: list[str] = []
    values: dict[str, Any] = {}
    where = {field.name: field.path for field in JOB_FIELDS}
    if path is not None:
        values = _from_file(os.fspath(path), problems)
        where = {name: f"{path}: {key}" for name, key in where.items()}
    for field in JOB_FIELDS:
        if field.name in options:
            for rival in _RIVALS.get(field.name, ()):
                if rival not in options:
                    values.pop(rival, None)
            _take_option(field, options[field.name], values, problems)
    for name in REQUIRED:
        if name not in values and not any(where[name] in p or _field(name).option in p for p in problems):
            field = _field(name)
            problems.append(f"{where[name]}: missing ({field.help}; option {field.option})")
    problems += conflicts(values)
    file = values.get("load_file")
    if file is not None and not os.path.isfile(file):
        problems.append(f"load.file: {file} is not there")
    if problems:
        raise InputError(*problems)
    if file is not None:
        from rfstage.files.touchstone import read_load

        values["load"] = read_load(file)
    from rfstage.job import Job

    return Job(**values)


def _field(name: str) -> Field:
    return next(field for field in JOB_FIELDS if field.name == name)


def _take_option(field: Field, text: str, values: dict[str, Any], problems: list[str]) -> None:
    if field.name == "load" and text.lower().endswith(LOAD_FILE_ENDING):
        values["load_file"] = text
        values.pop("load", None)
        return
    try:
        values[field.name] = read(field, text)
    except QuantityError as error:
        problems.append(f"{field.option}: {error}")


def _from_file(path: str, problems: list[str]) -> dict[str, Any]:
    values: dict[str, Any] = {}
    groups: dict[str, list[Field]] = {}
    for field in JOB_FIELDS:
        groups.setdefault(field.path.split(".")[0], []).append(field)
    for group, table in parse_toml(path).items():
        if group in groups:
            values |= read_table(table, groups[group], prefix=f"{path}: {group}.", problems=problems)
        else:
            problems.append(f"{path}: {group}: no such table{nearest(group, groups)}")
    if "load_file" in values:
        if "load" in values:
            problems.append(f"{path}: load: got both an impedance and a file; give one of them")
        values["load_file"] = os.path.join(os.path.dirname(path), values["load_file"])
    return values
