"""TOML tables read through field descriptions: every problem is collected, none stops the reading."""

from __future__ import annotations

import os
import re
from collections.abc import Iterable, Sequence
from typing import Any

from rfstage.errors import FileError, InputError
from rfstage.fields import Field, nearest, read
from rfstage.quantity import QuantityError


def parse_toml(path: str | os.PathLike[str]) -> dict[str, Any]:
    """Return a TOML file's content.

    Raises
    ------
    FileError
        If it can't be read.
    InputError
        If it is not TOML, with the line, and a hint at quotes around quantities.
    """
    try:
        with open(path, "rb") as file:
            text = file.read().decode("utf-8")
    except OSError as error:
        raise FileError(f"{path}: can't be read ({error.strerror})") from None
    except UnicodeDecodeError:
        raise FileError(f"{path}: is not a text file in UTF-8") from None
    import tomllib

    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise InputError(f"{path}: {error}{_quotes_hint(text, str(error))}") from None
    except RecursionError:
        raise InputError(f"{path}: is nested too deeply to be a job or stage file") from None


def _quotes_hint(text: str, message: str) -> str:
    found = re.search(r"line (\d+)", message)
    lines = text.splitlines()
    line = lines[int(found[1]) - 1] if found and int(found[1]) <= len(lines) else ""
    value = re.fullmatch(r"\s*([\w-]+)\s*=\s*([\d.,+\-j]+\s*[A-Za-zµμΩΩ%°]+\w*)\s*(#.*)?", line)
    return f'; a quantity needs quotes: {value[1]} = "{value[2].strip()}"' if value else ""


def read_table(
    table: object, fields: Sequence[Field], *, prefix: str, problems: list[str], also: Iterable[str] = ()
) -> dict[str, Any]:
    """Return the values of a table's keys by field name; problems are appended, unknown keys among them.

    Parameters
    ----------
    table : object
        What TOML gave; anything but a table is a problem.
    fields : sequence of Field
        Those of this table; the last part of ``path`` is the key.
    prefix : str
        What stands before the key in messages, such as ``"job.toml: stage."``.
    problems : list of str
        Where problems go.
    also : iterable of str
        Keys that are known but read elsewhere.
    """
    if not isinstance(table, dict):
        problems.append(f"{prefix.rstrip('.')}: got {table!r}; wanted a table of keys")
        return {}
    by_key = {field.path.rsplit(".", 1)[-1]: field for field in fields}
    values: dict[str, Any] = {}
    for key, raw in table.items():
        if key in by_key:
            try:
                values[by_key[key].name] = read(by_key[key], raw)
            except QuantityError as error:
                problems.append(f"{prefix}{key}: {error}")
        elif key not in also:
            problems.append(f"{prefix}{key}: no such key{nearest(key, [*by_key, *also])}")
    return values
