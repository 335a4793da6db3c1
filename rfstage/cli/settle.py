"""``rfstage settle``: the steady state of an as-built stage."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from rfstage.cli.words import Parser, output, targets
from rfstage.files.write import check_targets, write_files

if TYPE_CHECKING:
    from rich.text import Text

    from rfstage.report.page import Look

ABOUT = """\
The steady state of a stage as it is built: what the meters read, what gets
hot, what each part bears, the harmonics, and how far to trust it all.

  rfstage settle examples/beacon-as-built.toml
"""


def parser() -> Parser:
    """Return the command's parser."""
    made = Parser("settle", ABOUT)
    made.positional("stage", "STAGE.toml", "stage file, such as 'rfstage design --save' writes")
    files = made.add_argument_group("files")
    files.add_argument("--spice", metavar="FILE", help="write the stage as a SPICE deck")
    return made


def run(words: Sequence[str]) -> int:
    """Run the command and return its exit status."""
    found = parser().read(words)
    wanted = list(targets(found, "spice").values())
    check_targets(wanted, overwrite=found.overwrite, inputs={"stage file": found.stage})

    from rfstage.designs.judging import judged, worst
    from rfstage.files.stage import load_stage
    from rfstage.steady import settle

    stage = load_stage(found.stage)
    inputs = {"stage file": found.stage, "load file": getattr(stage.load, "name", None)}
    check_targets(wanted, overwrite=found.overwrite, inputs=inputs)
    state = settle(stage)
    verdicts = judged(state)
    if wanted:
        from rfstage.files.spice import spice_text

        write_files([(wanted[0], spice_text(stage))], overwrite=found.overwrite, inputs=inputs)

    def record() -> dict[str, Any]:
        from rfstage.files.records import settle_record

        return settle_record(state, verdicts)

    def page(look: Look) -> list[Text]:
        from rfstage.report.settled import settled_page

        return settled_page(state, look, verdicts)

    output(found, record, page, wanted)
    least = worst(verdicts)
    return 1 if least is not None and least.margin is not None and least.margin < 0 else 0
