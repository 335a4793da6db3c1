"""``rfstage sweep``: the steady state along one value of a stage."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from rfstage.cli.progress import progress
from rfstage.cli.words import Parser, given, output, read_all, targets
from rfstage.errors import InputError
from rfstage.fields import Field
from rfstage.files.write import check_targets, write_files
from rfstage.quantity import exact_text

if TYPE_CHECKING:
    from rich.text import Text

    from rfstage.report.page import Look

ABOUT = """\
The steady state along one value of a stage: a branch (C1, L1.q),
drive.amplitude, supply.voltage, any number of the stage file; or the load:
circles of standing-wave ratio.

  rfstage sweep examples/beacon-as-built.toml --of C1 --from 7nF --to 11nF
  rfstage sweep examples/beacon-as-built.toml --of load --from 1 --to 3 \\
      --points 5
"""
_POINTS = Field(
    "", "points", "count", "", 2, 100_000, False, "--points", "how many points, evenly spaced [41; 10 along load]"
)
ZERO_ALLOWED = (
    "lead_inductance",
    "self_capacitance",
    "choke_resistance",
    "knee_resistance",
    "series_resistance",
    "leakage",
)
FAR = 1000.0  # a bare number this many times off the value now set is taken for one that wants a prefix


def parser() -> Parser:
    """Return the command's parser."""
    made = Parser("sweep", ABOUT)
    made.positional("stage", "STAGE.toml", "stage file")
    along = made.add_fields("sweep", (_POINTS,))
    along.add_argument("--of", metavar="PATH", required=True, help="the value to move")
    along.add_argument("--from", dest="first", metavar="X", required=True, help="where it begins, with its unit")
    along.add_argument("--to", dest="last", metavar="Y", required=True, help="where it ends")
    along.add_argument("--csv", metavar="FILE", help="write the points as a table")
    return made


def run(words: Sequence[str]) -> int:
    """Run the command and return its exit status."""
    found = parser().read(words)
    wanted = list(targets(found, "csv").values())
    check_targets(wanted, overwrite=found.overwrite, inputs={"stage file": found.stage})

    import numpy as np

    from rfstage.files.stage import load_stage
    from rfstage.stagevalues import fitted_value, unit_of
    from rfstage.sweep import sweep

    stage = load_stage(found.stage)
    inputs = {"stage file": found.stage, "load file": getattr(stage.load, "name", None)}
    check_targets(wanted, overwrite=found.overwrite, inputs=inputs)
    path = found.of.strip()
    unit = unit_of(stage, path)
    ends = _ends(path, unit, found.first, found.last)
    values = read_all(
        {**ends, "points": (_POINTS, given(found, (_POINTS,)).get("points", "10" if path == "load" else "41"))}
    )
    now = None if path == "load" else fitted_value(stage, path)
    _check_ends(path, now, {name: (field, text, values[name]) for name, (field, text) in ends.items()})
    swept = sweep(stage, path, list(np.linspace(values["first"], values["last"], values["points"])), progress())
    if wanted:
        from rfstage.files.sweeprecord import sweep_table

        write_files([(wanted[0], sweep_table(swept))], overwrite=found.overwrite, inputs=inputs)

    def record() -> dict[str, Any]:
        from rfstage.files.sweeprecord import sweep_record

        return sweep_record(swept)

    def page(look: Look) -> list[Text]:
        from rfstage.report.sweep import sweep_page

        return sweep_page(swept, look)

    output(found, record, page, wanted)
    return 0


def _ends(path: str, unit: str, first: str, last: str) -> dict[str, tuple[Field, str]]:
    """Return the two ends as fields with the range that the path allows, and their texts."""
    head, _, key = path.partition(".")
    low, above, high = (1.0, False, 100.0) if path == "load" else (0.0, True, math.inf)
    if head in ("drive", "device") or key in ZERO_ALLOWED:
        above = False
    if key == "coupling":
        high = 0.9999
    if path in ("drive.bias", "device.threshold", "load.reactance"):
        low = -1e6
    return {
        name: (Field("", name, "real", unit, low, high, above, f"--{option}"), text)
        for name, option, text in (("first", "from", first), ("last", "to", last))
    }


def _check_ends(path: str, now: float | None, ends: dict[str, tuple[Field, str, float]]) -> None:
    """Refuse two ends that are the same, and bare numbers that are far off the value now set.

    Raises
    ------
    InputError
        With one line for each.
    """
    problems = []
    for field, text, value in ends.values():
        bare = not any(c.isalpha() for c in text.lower().replace("e", ""))
        if not (field.unit and bare and value and now and math.isfinite(now)):
            continue
        off = math.log10(abs(value / now))
        if abs(off) > math.log10(FAR):
            got, here = exact_text(value, field.unit), exact_text(float(f"{now:.4g}"), field.unit)
            meant = exact_text(float(f"{value * 1000.0 ** -round(off / 3):.12g}"), field.unit)
            problems.append(f"{field.option}: got {got} where {path} is {here} (did you mean {meant}?)")
    field, _, last = ends["last"]
    if last == ends["first"][2]:
        problems.append(f"{field.option}: got {exact_text(last, field.unit)}, the same as --from")
    if problems:
        raise InputError(*problems)
