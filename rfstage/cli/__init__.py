"""The terminal program: parse, call, render. Results on stdout, messages on stderr.

Exit status: 0 done; 1 done, and a check that was asked for failed; 2 bad input, an impossible request, or an output
that can't be written.
"""

from __future__ import annotations

import io
import os
import re
import sys
from collections.abc import Sequence
from importlib import import_module

from rfstage.errors import FileError, InputError, RfstageError

# command -> (room in this package, what it does)
COMMANDS = {
    "design": ("design", "a stage from carrier, conduction angle and power: the main job"),
    "match": ("match", "one network by itself, between any two impedances"),
    "settle": ("settle", "the steady state of an as-built stage"),
    "sweep": ("sweep", "the steady state along one value: tuning, drive, supply, load"),
    "retune": ("retune", "what to change for a new carrier, or because of meter readings"),
    "coil": ("coil", "a coil to wind, in air or on a ring core: turns, Q, resonance, taps"),
    "verify": ("verify", "measured against predicted and the limit: levels, waveforms, tank"),
    "pulse": ("pulse", "Fourier coefficients of the current pulse of a conduction angle"),
}
OK, CHECK_FAILED, BAD_INPUT, STOPPED = 0, 1, 2, 130


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status; the console entry exits with it."""
    os.environ.setdefault(
        "OPENBLAS_NUM_THREADS", "1"
    )  # its thread pool costs a third of the start; nothing here uses it
    words = list(sys.argv[1:] if argv is None else argv)
    try:
        return _dispatch(words)
    except RfstageError as error:
        _complain(error.problems if isinstance(error, InputError) else str(error).split("\n"))
        return BAD_INPUT
    except BrokenPipeError:
        return OK  # the reader has gone: nothing more to say
    except KeyboardInterrupt:
        _complain(["stopped"])
        return STOPPED


def _dispatch(words: list[str]) -> int:
    if sys.stdout is None:
        raise FileError("the output can't be written (it is closed)")
    if isinstance(sys.stdout, io.TextIOWrapper):
        sys.stdout.reconfigure(errors="backslashreplace")  # for the name of a file that its encoding lacks
    if not words or words[0] in ("--help", "-h"):
        _say(overview())
        return OK
    if words[0] == "--version":
        _say(versions())
        return OK
    command = words[0]
    if command not in COMMANDS:
        from rfstage.fields import nearest

        raise InputError(f"{command!r} is no command{nearest(command, COMMANDS)}; 'rfstage --help' lists them")
    room = import_module(f"rfstage.cli.{COMMANDS[command][0]}")
    return int(room.run(words[1:]))


def _say(text: str) -> None:
    from rfstage.cli.words import deliver

    deliver(lambda: print(text))


def _complain(problems: Sequence[str]) -> None:
    """Print one line for each problem on stderr; with no stderr, or a full one, the exit status has to do."""
    if sys.stderr is None:
        return
    from rfstage.fields import plain

    try:
        for problem in problems:
            print(f"rfstage: {plain(_in_ascii_units(problem))}", file=sys.stderr, flush=True)
    except OSError:
        return


def _in_ascii_units(message: str) -> str:
    """Return a message with its figures in one spelling: ASCII units, and no powers of ten where digits do.

    Only figures are touched: the name of a file keeps its letters.

    Examples
    --------
    >>> _in_ascii_units("grün.s1p: 12.0 − j3.20 Ω at 20.0 °, 4.70 µH; at most 1.25e+03 ohm")
    'grün.s1p: 12.0 - j3.20 ohm at 20.0 deg, 4.70 uH; at most 1250 ohm'
    """
    message = re.sub(r"−(?=[\dj]| j?\d)", "-", message)
    message = re.sub(r"(?<=\d) ?°(C?)(?!\w)", r" deg\1", message)
    message = re.sub(r"(?<=\d )[µμ](?=[VAWFHSmΩ]|Hz|ohm)", "u", message)
    message = re.sub(r"(?<=\d )([munpkMGT]?)Ω(?!\w)", r"\1ohm", message)
    return re.sub(r"(?<![\w.'\"])\d(?:\.\d+)?e\+0[0-6](?![\w.])", lambda found: f"{float(found[0]):.12g}", message)


def overview() -> str:
    """Return the list of commands."""
    lines = ["rfstage: tuned power stages of radio transmitters", "", "usage: rfstage COMMAND ...", ""]
    lines += [f"  {name:<8} {what}" for name, (_, what) in COMMANDS.items()]
    lines += [
        "",
        "  rfstage COMMAND --help   what a command takes",
        "  rfstage --version        versions of rfstage and what it stands on",
        "",
        "  rfstage design --carrier 7.1MHz --power 10W --angle 120deg --supply 13.8V",
        "",
        "exit status: 0 done; 1 done, and a check that was asked for failed;",
        "2 bad input, or no way to write the output",
    ]
    return "\n".join(lines)


def versions() -> str:
    """Return the versions of the program and of the packages it stands on."""
    from importlib.metadata import PackageNotFoundError, version

    lines = []
    for name in ("rfstage", "numpy", "scipy", "scikit-rf", "rich"):
        try:
            lines.append(f"{name} {version(name)}")
        except PackageNotFoundError:
            lines.append(f"{name} (not installed)")
    return "\n".join(lines)
