"""``rfstage design``: the main job."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from rfstage.cli.words import Parser, add_field_options, given, output
from rfstage.files.job import read_job
from rfstage.files.write import check_targets, write_files
from rfstage.jobfields import JOB_FIELDS

if TYPE_CHECKING:
    from pathlib import Path

    from rich.text import Text

    from rfstage.report.page import Look

ABOUT = """\
Design a stage: from carrier, conduction angle and power to pulse, operating point, tank, harmonics.
A job file, options, or both; options win.

  rfstage design --carrier 7.1MHz --power 10W --angle 120deg --supply 13.8V --limit us-amateur
"""
_GROUPS = {
    "stage": "stage",
    "device": "device and ratings",
    "drive": "drive",
    "load": "load",
    "tank": "tank",
    "supply": "supply",
    "limit": "limit",
}


def parser() -> Parser:
    """Return the command's parser."""
    made = Parser("design", ABOUT)
    made.positional("job", "JOB.toml", "job file", optional=True)
    for group, title in _GROUPS.items():
        add_field_options(made, title, [f for f in JOB_FIELDS if f.path.startswith(f"{group}.")])
    files = made.add_argument_group("files and checks")
    files.add_argument("--textbook", action="store_true", help="keep the book's design")
    files.add_argument("--touchstone", metavar="FILE.s2p", help="write the two-port from device node to load")
    files.add_argument("--spice", metavar="FILE", help="write the stage as a SPICE deck")
    files.add_argument("--save", metavar="STAGE.toml", help="write the stage file")
    return made


def run(words: Sequence[str]) -> int:
    """Run the command and return its exit status."""
    found = parser().read(words)
    job = read_job(found.job.strip() if found.job else None, given(found, JOB_FIELDS))
    check_targets([name for name in (found.touchstone, found.save, found.spice) if name], overwrite=found.overwrite)

    from rfstage.designs.design import design, with_settled

    made = with_settled(design(job, textbook=True)) if found.textbook else design(job)
    contents: list[tuple[str | Path, str]] = []
    if found.touchstone:
        from rfstage.files.touchstone import touchstone_text

        contents.append((found.touchstone, touchstone_text(made)))
    if found.save:
        from pathlib import Path

        from rfstage.files.stage import stage_text

        contents.append((found.save, stage_text(made.stage, Path(found.save).parent)))
    if found.spice:
        from rfstage.files.spice import spice_text

        contents.append((found.spice, spice_text(made.stage)))
    write_files(contents, overwrite=found.overwrite)

    def record() -> dict[str, Any]:
        from rfstage.files.records import design_record

        return design_record(made, [str(path) for path, _ in contents])

    def page(look: Look) -> list[Text]:
        from rfstage.report.design import summary

        return summary(made, look)

    output(found, record, page)
    failed = made.worst is not None and made.worst.margin is not None and made.worst.margin < 0
    return 1 if failed else 0
