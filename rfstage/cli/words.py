"""What the commands share: a parser that says what was meant, values that begin with a minus, output."""

from __future__ import annotations

import argparse
import re
import sys
from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any, NoReturn

from rfstage.errors import InputError
from rfstage.fields import Field, nearest, read
from rfstage.quantity import QuantityError

if TYPE_CHECKING:
    from rich.text import Text

    from rfstage.report.page import Look

_MINUS_VALUE = re.compile(r"-(?:\.?\d|[jJ][\d.]|[jJ]$)")


class Parser(argparse.ArgumentParser):
    """An argument parser that raises `InputError`, takes no abbreviations and suggests the nearest option."""

    def __init__(self, command: str, about: str) -> None:
        super().__init__(
            prog=f"rfstage {command}",
            description=about,
            allow_abbrev=False,
            formatter_class=argparse.RawDescriptionHelpFormatter,
        )
        # in a group of its own: an argument added to the parser itself loads what only --help needs
        self._given = self.add_argument_group("given")
        everywhere = self.add_argument_group("output")
        everywhere.add_argument("--json", action="store_true", help="one JSON object on stdout and nothing else")
        everywhere.add_argument("--plain", action="store_true", help="no colour, no box art, ASCII")
        everywhere.add_argument("--overwrite", action="store_true", help="replace files that exist")

    def positional(self, name: str, metavar: str, about: str, *, optional: bool = False) -> None:
        """Add an argument that is known by its place."""
        self._given.add_argument(name, metavar=metavar, help=about, nargs="?" if optional else None)

    def error(self, message: str) -> NoReturn:
        """Raise instead of exiting, so that every error takes the same way out."""
        raise InputError(f"{message}; 'rfstage {self.prog.split()[-1]} --help' shows what it takes")

    def read(self, words: Sequence[str]) -> argparse.Namespace:
        """Return the parsed words; a value such as ``-10W`` or ``-j10`` stays a value.

        Raises
        ------
        InputError
            For unknown options (with the nearest known one), missing values and surplus words.
        """
        shielded = [f" {word}" if _MINUS_VALUE.match(word) else word for word in words]
        found, extra = self.parse_known_args(shielded)
        problems = []
        known = [option for action in self._actions for option in action.option_strings]
        for word in extra:
            name = word.split("=")[0]
            if name.startswith("-"):
                problems.append(f"{name!r} is no option of {self.prog}{nearest(name, known)}")
            else:
                problems.append(f"{word.strip()!r} is one word too many for {self.prog}")
        if problems:
            raise InputError(*problems)
        return found


def add_field_options(parser: Parser, title: str, fields: Sequence[Field]) -> None:
    """Add one option for each field; its text is read later, so that all errors come at once."""
    group = parser.add_argument_group(title)
    for field in fields:
        if field.option:
            metavar = "|".join(field.choices) if field.choices else field.unit.upper() or "N"
            group.add_argument(
                field.option,
                dest=field.name,
                metavar=metavar if field.kind != "text" else "RULE",
                help=field.help.replace("%", "%%"),
            )


def given(found: argparse.Namespace, fields: Sequence[Field]) -> dict[str, str]:
    """Return the texts of the options that were given, by field name."""
    return {
        field.name: value.strip()
        for field in fields
        if field.option and (value := getattr(found, field.name, None)) is not None
    }


def read_all(texts: dict[str, tuple[Field, str]]) -> dict[str, Any]:
    """Return the values of texts by name.

    Raises
    ------
    InputError
        With one line for each that is wrong.
    """
    values: dict[str, Any] = {}
    problems = []
    for name, (field, text) in texts.items():
        try:
            values[name] = read(field, text)
        except QuantityError as error:
            problems.append(f"{field.option or field.path}: {error}")
    if problems:
        raise InputError(*problems)
    return values


def output(found: argparse.Namespace, record: Callable[[], dict[str, Any]], page: Callable[[Look], list[Text]]) -> None:
    """Print what ``record()`` builds as JSON, or what ``page(look)`` builds for a person; only one is built."""
    if found.json:
        from rfstage.files.records import json_text

        print(json_text(record()))
        return
    from rfstage.report.page import look_for, print_page

    lines = page(look_for(sys.stdout, plain=found.plain))
    print_page(lines, plain=found.plain)
