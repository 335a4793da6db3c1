"""The terminal program: parse, call, render. Results on stdout, messages on stderr.

Exit status: 0 done; 1 done, and a check that was asked for failed; 2 bad input or an impossible request.
"""

from __future__ import annotations

import os
import sys
from collections.abc import Sequence
from importlib import import_module

from rfstage.errors import InputError, RfstageError

# command -> (room in this package, what it does)
COMMANDS = {
    "design": ("design", "a stage from carrier, conduction angle and power: the main job"),
    "match": ("match", "one network by itself, from a resistance to a load"),
    "settle": ("settle", "the steady state of an as-built stage"),
    "sweep": ("sweep", "the steady state along one value: tuning, drive, supply, load"),
    "pulse": ("pulse", "Fourier coefficients of the current pulse of a conduction angle"),
}
OK, CHECK_FAILED, BAD_INPUT = 0, 1, 2


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status; the console entry exits with it."""
    os.environ.setdefault(
        "OPENBLAS_NUM_THREADS", "1"
    )  # its thread pool costs a third of the start; nothing here uses it
    words = list(sys.argv[1:] if argv is None else argv)
    try:
        return _dispatch(words)
    except RfstageError as error:
        for line in str(error).splitlines():
            print(f"rfstage: {line}", file=sys.stderr)
        return BAD_INPUT
    except BrokenPipeError:
        os.dup2(
            os.open(os.devnull, os.O_WRONLY), 1
        )  # the reader has gone: nothing more to say, and no complaint at exit
        return OK
    except KeyboardInterrupt:
        print("rfstage: stopped", file=sys.stderr)
        return 130


def _dispatch(words: list[str]) -> int:
    if not words or words[0] in ("--help", "-h"):
        print(overview())
        return OK
    if words[0] == "--version":
        print(versions())
        return OK
    command = words[0]
    if command not in COMMANDS:
        from rfstage.fields import nearest

        raise InputError(f"{command!r} is no command{nearest(command, COMMANDS)}; 'rfstage --help' lists them")
    room = import_module(f"rfstage.cli.{COMMANDS[command][0]}")
    return int(room.run(words[1:]))


def overview() -> str:
    """Return the list of commands."""
    lines = ["rfstage: tuned power stages of radio transmitters", "", "usage: rfstage COMMAND ...", ""]
    lines += [f"  {name:<8} {what}" for name, (_, what) in COMMANDS.items()]
    lines += [
        "",
        "  rfstage COMMAND --help   what a command takes",
        "  rfstage --version        versions of rfstage and what it stands on",
        "",
        "  for example: rfstage design --carrier 7.1MHz --power 10W --angle 120deg --supply 13.8V --limit us-amateur",
        "",
        "exit status: 0 done; 1 done, and a check that was asked for failed; 2 bad input",
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
