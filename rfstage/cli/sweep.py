"""``rfstage sweep``: the steady state along one value of a stage."""

from __future__ import annotations

import math
import sys
import time
from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any

from rfstage.cli.words import Parser, output, read_all
from rfstage.fields import Field
from rfstage.files.write import check_targets, write_files

if TYPE_CHECKING:
    from rich.text import Text

    from rfstage.report.page import Look

ABOUT = """\
The steady state along one value of a stage: a branch (C1, L1.q), drive.amplitude, supply.voltage, any number of
the stage file; or the load: circles of standing-wave ratio.

  rfstage sweep stage.toml --of C1 --from 0.9nF --to 1.5nF --points 41
  rfstage sweep stage.toml --of load --from 1 --to 3 --points 5
"""
POINTS = Field("", "points", "count", "", 2, 100_000, option="--points")
PATIENCE = 1.0  # s: past it a progress bar shows


def parser() -> Parser:
    """Return the command's parser."""
    made = Parser("sweep", ABOUT)
    made.positional("stage", "STAGE.toml", "stage file")
    made.add_argument("--of", metavar="PATH", required=True, help="the value to move")
    made.add_argument("--from", dest="first", metavar="X", required=True, help="where it begins, with its unit")
    made.add_argument("--to", dest="last", metavar="Y", required=True, help="where it ends")
    made.add_argument("--points", metavar="N", default="41", help="how many points, evenly spaced [41]")
    made.add_argument("--csv", metavar="FILE", help="write the points as a table")
    return made


def run(words: Sequence[str]) -> int:
    """Run the command and return its exit status."""
    found = parser().read(words)
    targets = [found.csv] if found.csv else []
    check_targets(targets, overwrite=found.overwrite)

    import numpy as np

    from rfstage.files.stage import load_stage
    from rfstage.sweep import sweep, unit_of

    stage = load_stage(found.stage.strip())
    unit = unit_of(stage, found.of)
    low, above, high = (1.0, False, 100.0) if found.of == "load" else (0.0, True, math.inf)
    if found.of.startswith(("drive", "device")):
        above = False
    if found.of in ("drive.bias", "device.threshold"):
        low = -1e6
    ends = {
        name: (Field("", name, "real", unit, low, high, above, f"--{option}"), text)
        for name, option, text in (("first", "from", found.first), ("last", "to", found.last))
    }
    values = read_all({**ends, "points": (POINTS, found.points)})
    swept = sweep(stage, found.of, list(np.linspace(values["first"], values["last"], values["points"])), _progress())
    if targets:
        from rfstage.files.records import sweep_table

        write_files([(targets[0], sweep_table(swept))], overwrite=found.overwrite)

    def record() -> dict[str, Any]:
        from rfstage.files.records import sweep_record

        return sweep_record(swept)

    def page(look: Look) -> list[Text]:
        from rfstage.report.sweep import sweep_page

        return sweep_page(swept, look)

    output(found, record, page)
    return 0


def _progress() -> Callable[[int, int], None]:
    """Return a progress report on stderr, silent for the first second and where that is no terminal."""
    began = time.monotonic()
    shown: list[object] = []

    def report(done: int, of: int) -> None:
        if not sys.stderr.isatty() or (not shown and time.monotonic() - began < PATIENCE):
            return
        from rich.console import Console
        from rich.progress_bar import ProgressBar

        console = Console(file=sys.stderr)
        shown.append(done)
        console.print(ProgressBar(total=of, completed=done, width=40), f" {done} of {of} points", end="\r")
        if done == of:
            console.print(" " * 78, end="\r")

    return report
