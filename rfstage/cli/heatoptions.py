"""The options about heat and safety that a design and a settled stage share."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from rfstage.cli.words import given, read_all
from rfstage.errors import InputError
from rfstage.safetyfields import HEAT, SAFETY, heat_misfits

if TYPE_CHECKING:
    from argparse import Namespace


def add_heat(group: Any) -> None:
    """Add the option that asks for heat."""
    group.add_argument(
        "--heat",
        action="store_true",
        help="heat as built, detuned, mismatched and undriven: heat sink, junction or anode",
    )


def check_heat(found: Namespace) -> None:
    """Refuse options about heat where none is asked for.

    Raises
    ------
    InputError
        With one line for each.
    """
    if not found.heat:
        options = {field.name: field.option for field in HEAT}
        problems = [f"{options[name]}: is of no use without --heat" for name in given(found, HEAT)]
        if problems:
            raise InputError(*problems)


def read_values(found: Namespace) -> dict[str, Any]:
    """Return the values of the options about heat and safety, by field name.

    Raises
    ------
    InputError
        With one line for each that can't be read.
    """
    fields = (*SAFETY, *HEAT)
    texts = given(found, fields)
    return read_all({field.name: (field, texts[field.name]) for field in fields if field.name in texts})


def check_values(values: dict[str, Any], family: str) -> None:
    """Refuse values that can't stand together, or with a stage's family of device.

    Raises
    ------
    InputError
        With one line for each.
    """
    options = {field.path: field.option for field in (*SAFETY, *HEAT)}
    problems = []
    for line in heat_misfits({**values, "family": family}):
        path, colon, rest = line.partition(":")
        problems.append(f"{options[path]}{colon}{rest}")
    if problems:
        raise InputError(*problems)
