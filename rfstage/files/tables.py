"""TOML tables read through field descriptions: every problem is collected, none stops the reading."""

from __future__ import annotations

import os
import re
from collections.abc import Iterable, Sequence
from typing import Any

from rfstage.errors import FileError, InputError
from rfstage.fields import Field, nearest, plain, read, shown
from rfstage.quantity import QuantityError

STAGE_FORMAT = "rfstage.stage"


def parse_toml(path: str | os.PathLike[str]) -> dict[str, Any]:
    """Return a TOML file's content.

    Raises
    ------
    FileError
        If it can't be read.
    InputError
        If it is not TOML, with the line, and a hint at quotes around quantities.
    """
    name = plain(os.fspath(path))
    if not name.strip():
        raise FileError("an empty name is no file; give the name of a job or stage file")
    try:
        with open(path, "rb") as file:
            text = file.read().decode("utf-8-sig")
    except OSError as error:
        raise FileError(unreadable(name, error)) from None
    except UnicodeDecodeError:
        raise FileError(f"{name}: is not a text file in UTF-8") from None
    import tomllib

    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise InputError(f"{name}: {_in_plain_words(text, str(error))}") from None
    except ValueError:
        raise InputError(f"{name}: holds a number too long to be read") from None
    except RecursionError:
        raise InputError(f"{name}: is nested too deeply to be a job or stage file") from None


def unreadable(name: str, error: OSError) -> str:
    """Return why a file can't be read, in the same words whatever kind of file was wanted."""
    return (
        f"{name}: is not there" if isinstance(error, FileNotFoundError) else f"{name}: can't be read ({error.strerror})"
    )


def _in_plain_words(text: str, message: str) -> str:
    """Return what is wrong with a TOML text: the line first, a key or a table given twice by its name."""
    found = re.fullmatch(r"(.*) \(at line (\d+), column \d+\)", message, re.DOTALL)
    if not found:
        return message
    lines = text.splitlines()
    number = int(found[2])
    line = lines[number - 1] if number <= len(lines) else ""
    key = re.match(r"""\s*([\w."'-]+)\s*=""", line)
    table = re.match(r"\s*(\[[^\]]*\]+)", line)
    what = found[1][:1].lower() + found[1][1:] + _quotes_hint(line)
    if found[1].startswith("Cannot overwrite"):
        what = f"{key[1] if key else 'a key'} is given twice"
    elif found[1].startswith("Cannot declare") and found[1].endswith("twice"):
        what = f"{table[1] if table else 'a table'} is given twice"
    return f"line {number}: {what}"


def _quotes_hint(line: str) -> str:
    value = re.fullmatch(r"\s*([\w-]+)\s*=\s*([\d.,+\-j]+\s*[A-Za-zµμΩΩ%°]+\w*)\s*(#.*)?", line)
    if value:
        return f'; a quantity needs quotes: {value[1]} = "{_with_point(value[2].strip())}"'
    number = re.fullmatch(r"\s*([\w-]+)\s*=\s*([+-]?\d+,\d+)\s*(#.*)?", line)
    return f"; write the decimal point as in {number[1]} = {_with_point(number[2])}" if number else ""


def _with_point(text: str) -> str:
    """Return a quantity with its single comma, if it has one, as the decimal point."""
    return text.replace(",", ".") if text.count(",") == 1 and "." not in text else text


def kind_of(document: dict[str, Any]) -> str:
    """Return ``"stage"`` or ``"job"`` for a document that is clearly one of the two, or nothing."""
    if document.get("format") == STAGE_FORMAT or isinstance(document.get("branch"), list):
        return "stage"
    return "job" if isinstance(document.get("stage"), dict) and "carrier" not in document else ""


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
        problems.append(f"{prefix.rstrip('.')}: got {shown(table)}; wanted a table of keys")
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
            problems.append(f"{prefix}{plain(key)}: no such key{nearest(key, [*by_key, *also])}")
    return values
