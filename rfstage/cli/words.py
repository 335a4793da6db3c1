"""What the commands share: options that are read with plain words for what is wrong, values, output."""

from __future__ import annotations

import argparse
import os
import re
import sys
from collections.abc import Callable, Iterator, Sequence
from typing import TYPE_CHECKING, Any

from rfstage.errors import FileError, InputError
from rfstage.fields import Field, nearest, plain, read
from rfstage.quantity import QuantityError

if TYPE_CHECKING:
    from rich.text import Text

    from rfstage.report.page import Look

_MINUS_VALUE = re.compile(r"-(?:\.?\d|[jJ][\d.]|[jJ]$)")
HELP_WIDTH = 78  # columns; to ask the terminal loads a dozen modules, at every start
LONGEST_METAVAR = 40  # characters: an option with longer choices has them in its help instead
_FILE = re.compile(r"\.s\d+p\Z", re.IGNORECASE)


class Parser(argparse.ArgumentParser):
    """What a command takes; argparse writes its help, and `read` reads its words.

    No option may be abbreviated, or given twice unless it is `repeatable`; a value such as ``-10W`` or ``-j10``
    stays a value, and all problems of a command line come at once.
    """

    def __init__(self, command: str, about: str) -> None:
        super().__init__(
            prog=f"rfstage {command}",
            description=about,
            allow_abbrev=False,
            formatter_class=lambda prog: argparse.RawDescriptionHelpFormatter(prog, width=HELP_WIDTH),
        )
        self._fields: list[Field] = []
        self._repeatable: set[str] = set()
        # in a group of its own: an argument added to the parser itself loads what only --help needs
        self._given = self.add_argument_group("given")
        everywhere = self.add_argument_group("output")
        everywhere.add_argument("--json", action="store_true", help="one JSON object on stdout and nothing else")
        everywhere.add_argument("--plain", action="store_true", help="no colour, no box art, ASCII")
        everywhere.add_argument(
            "--overwrite", action="store_true", help="replace files that exist, where any is written"
        )

    def positional(self, name: str, metavar: str, about: str, *, optional: bool = False) -> None:
        """Add an argument that is known by its place."""
        self._given.add_argument(name, metavar=metavar, help=about, nargs="?" if optional else None)

    def repeatable(self, group: argparse._ArgumentGroup, option: str, metavar: str, about: str) -> None:
        """Add an option that may be given more than once; its value is a tuple of texts, in their order."""
        self._repeatable.add(group.add_argument(option, metavar=metavar, help=about, default=()).dest)

    def add_fields(self, title: str, fields: Sequence[Field]) -> argparse._ArgumentGroup:
        """Add one option for each field; its text is read later, so that all errors come at once."""
        group = self.add_argument_group(title)
        for field in fields:
            if field.option:
                metavar = "|".join(field.choices) if field.choices else field.unit.upper() or "N"
                about = field.help
                if len(metavar) > LONGEST_METAVAR:
                    metavar, about = field.option.rpartition("-")[2].upper(), f"{about}: {', '.join(field.choices)}"
                group.add_argument(
                    field.option,
                    dest=field.name,
                    metavar=metavar if field.kind != "text" else "RULE",
                    help=about.replace("%", "%%"),
                )
                self._fields.append(field)
        return group

    def read(self, words: Sequence[str]) -> argparse.Namespace:
        """Return the words by name, as texts; ``--help`` prints the help and ends the program.

        Raises
        ------
        InputError
            For unknown options (with the nearest known one), missing values, options given twice, what is wanted
            and not there, and surplus words; then with the values that can't be read, too.
        """
        options = {name: action for action in self._actions for name in action.option_strings}
        found = argparse.Namespace(**{a.dest: a.default for a in self._actions if a.dest != "help"})
        problems: list[str] = []
        seen: set[str] = set()
        loose: list[str] = []
        unsure = False
        for name, value in _pieces(words, {name for name, action in options.items() if action.nargs == 0}):
            action = options.get(name)
            if not name:
                loose.append(str(value))
            elif action is None:
                problems.append(f"{plain(name)!r} is no option of {self.prog}{nearest(name, options)}")
                unsure |= value is not None  # the word after it may have been its value, or not
            elif action.nargs == 0:
                if value is not None:
                    problems.append(f"{name} takes no value")
                elif action.dest == "help":
                    self.print_help()
                    raise SystemExit(0)
                setattr(found, action.dest, True)
            else:
                if value is None:
                    problems.append(f"{name}: wants a value")
                many = action.dest in self._repeatable
                if name in seen and not many:
                    problems.append(f"{name} is given twice")
                seen.add(name)
                setattr(found, action.dest, (*getattr(found, action.dest), value) if many else value)
        wanted = []
        for action in self._actions:
            if not action.option_strings:
                if loose:
                    setattr(found, action.dest, loose.pop(0))
                elif action.nargs is None and not unsure:
                    wanted.append(str(action.metavar))
            elif action.required and action.option_strings[0] not in seen:
                wanted.append(f"{action.option_strings[0]} {action.metavar}")
        problems += [f"{word!r} is one word too many for {self.prog}" for word in loose]
        if wanted:
            command = self.prog.split()[-1]
            problems.append(f"{command} wants {', '.join(wanted)}; '{self.prog} --help' shows what it takes")
        if problems:
            raise InputError(*dict.fromkeys([*problems, *self._misread(found)]))
        return found

    def _misread(self, found: argparse.Namespace) -> Iterator[str]:
        """Yield what is wrong with the values of the options, too, where the line is refused anyway."""
        for field in self._fields:
            text = getattr(found, field.name)
            if text is not None and not (field.kind == "impedance" and _FILE.search(text)):
                try:
                    read(field, text.strip())
                except QuantityError as error:
                    yield f"{field.option}: {error}"

    def print_help(self, file: object = None) -> None:  # noqa: ARG002 - argparse's own signature
        """Print the help on stdout."""
        deliver(lambda: print(self.format_help(), end=""))


def _is_option(word: str) -> bool:
    return word.startswith("-") and word != "-" and not _MINUS_VALUE.match(word)


def _pieces(words: Sequence[str], flags: set[str]) -> Iterator[tuple[str, str | None]]:
    """Yield options with their values or None, and the words that belong to none under an empty name."""
    rest = list(words)
    while rest:
        word = rest.pop(0)
        if word == "--":
            yield from (("", other) for other in rest)
            return
        if not _is_option(word):
            yield "", word
            continue
        name, equals, value = word.partition("=")
        if equals:
            yield name, value
        elif name in flags or not rest or _is_option(rest[0]):
            yield name, None
        else:
            yield name, rest.pop(0)


def given(found: argparse.Namespace, fields: Sequence[Field]) -> dict[str, str]:
    """Return the texts of the options that were given, by field name."""
    return {
        field.name: value.strip()
        for field in fields
        if field.option and (value := getattr(found, field.name, None)) is not None
    }


def read_all(texts: dict[str, tuple[Field, str]], problems: Sequence[str] = ()) -> dict[str, Any]:
    """Return the values of texts by name.

    Raises
    ------
    InputError
        With ``problems``, and one line for each text that is wrong.
    """
    values: dict[str, Any] = {}
    problems = list(problems)
    for name, (field, text) in texts.items():
        try:
            values[name] = read(field, text)
        except QuantityError as error:
            problems.append(f"{field.option or field.path}: {error}")
    if problems:
        raise InputError(*problems)
    return values


def targets(found: argparse.Namespace, *options: str) -> dict[str, str]:
    """Return the names of the files to be written, by option; an empty name is an error.

    Raises
    ------
    InputError
        With one line for each empty name.
    """
    names = {option: getattr(found, option) for option in options if getattr(found, option) is not None}
    problems = [
        f"--{option}: got an empty name; give a file name" for option, name in names.items() if not name.strip()
    ]
    if problems:
        raise InputError(*problems)
    return names


def output(
    found: argparse.Namespace,
    record: Callable[[], dict[str, Any]],
    page: Callable[[Look], list[Text]],
    wrote: Sequence[str] = (),
) -> None:
    """Print what ``record()`` builds as JSON, or what ``page(look)`` builds for a person; only one is built.

    The page ends with the files in ``wrote``.
    """
    if found.json:
        from rfstage.files.records import json_text

        text = json_text(record())
        if not _fits(text, sys.stdout.encoding):
            import json

            text = json.dumps(json.loads(text), indent=1)  # with escapes for all that is not ASCII
        deliver(lambda: print(text))
        return
    from rich.text import Text

    from rfstage.report.page import look_for, print_page

    lines = page(look_for(sys.stdout, plain=found.plain))
    if wrote:
        lines += [Text(""), Text(f"Wrote {', '.join(map(plain, wrote))}")]
    deliver(lambda: print_page(lines, plain=found.plain))


def _fits(text: str, encoding: str | None) -> bool:
    try:
        text.encode(encoding or "utf-8")
    except (UnicodeEncodeError, LookupError):
        return False
    return True


def deliver(write: Callable[[], object]) -> None:
    """Have something written to stdout, and see it leave.

    Raises
    ------
    FileError
        If stdout can't take it; a `BrokenPipeError` passes, since a reader may stop reading.
    """
    try:
        write()
        sys.stdout.flush()
    except BrokenPipeError:
        _drop_stdout()
        raise
    except OSError as error:
        _drop_stdout()
        raise FileError(f"the output can't be written ({error.strerror})") from None


def _drop_stdout() -> None:
    """Lead stdout nowhere, so that what is left in it makes no complaint at the program's end."""
    try:
        out = sys.stdout.fileno()
    except OSError:  # no file, but something that stands in for one
        return
    nowhere = os.open(os.devnull, os.O_WRONLY)
    os.dup2(nowhere, out)
    os.close(nowhere)
