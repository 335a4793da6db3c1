"""``rfstage design``: the main job."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from rfstage.cli.heatoptions import add_heat, check_heat
from rfstage.cli.words import Parser, given, output, targets
from rfstage.errors import InputError
from rfstage.files.job import read_jobs
from rfstage.files.write import check_targets, write_files
from rfstage.jobfields import JOB_FIELDS

if TYPE_CHECKING:
    from argparse import Namespace
    from pathlib import Path

    from rich.text import Text

    from rfstage.job import Job
    from rfstage.report.page import Look

ABOUT = """\
Design a stage: from carrier, conduction angle and power to pulse, operating
point, tank, harmonics. A job file, options, or both; options win.

  rfstage design examples/lantern.toml
  rfstage design --carrier 7.1MHz --power 10W --angle 120deg --supply 13.8V
"""
_GROUPS = {
    "stage": "stage",
    "device": "device and ratings",
    "drive": "drive",
    "load": "load",
    "tank": "tank",
    "supply": "supply",
    "limit": "limit",
    "parts": "parts, with --parts",
    "heat": "heat, with --heat",
}


def parser() -> Parser:
    """Return the command's parser."""
    made = Parser("design", ABOUT)
    made.positional("job", "JOB.toml", "job file", optional=True)
    for group, title in _GROUPS.items():
        made.add_fields(title, [f for f in JOB_FIELDS if f.path.startswith(f"{group}.")])
    files = made.add_argument_group("files and checks")
    files.add_argument(
        "--textbook",
        action="store_true",
        help="keep the book's design instead of correcting it to the settled power",
    )
    files.add_argument(
        "--parts",
        action="store_true",
        help="choose coils to wind and capacitors to buy, and settle the stage with them",
    )
    add_heat(files)
    files.add_argument("--touchstone", metavar="FILE.s2p", help="write the two-port from device node to load")
    files.add_argument("--spice", metavar="FILE", help="write the stage as a SPICE deck")
    files.add_argument("--save", metavar="STAGE.toml", help="write the stage file")
    return made


def run(words: Sequence[str]) -> int:
    """Run the command and return its exit status."""
    found = parser().read(words)
    wanted = targets(found, "touchstone", "save", "spice")
    check_heat(found)
    jobs = read_jobs(found.job, given(found, JOB_FIELDS))
    if len(jobs) > 1 or jobs[0].variable:
        return _several(found, jobs, wanted)
    job = jobs[0]
    inputs = {"job file": found.job, "load file": getattr(job.load, "name", None)}
    check_targets(list(wanted.values()), overwrite=found.overwrite, inputs=inputs)

    from rfstage.designs.design import design, with_settled

    made = with_settled(design(job, textbook=True)) if found.textbook else design(job)
    fitting = None
    if found.parts:
        from rfstage.fitting.fitted import fit_parts

        fitting = fit_parts(made)
    stage = made.stage if fitting is None else fitting.stage
    if found.heat:
        from rfstage.cli.progress import progress
        from rfstage.designs.design import with_heat

        state = made.settled if fitting is None else fitting.state
        made = with_heat(made, stage=stage, state=state, progress=progress())
    contents: list[tuple[str | Path, str]] = []
    if "touchstone" in wanted:
        from dataclasses import replace

        from rfstage.files.touchstone import touchstone_text

        contents.append((wanted["touchstone"], touchstone_text(replace(made, stage=stage))))
    if "save" in wanted:
        from pathlib import Path

        from rfstage.files.stagetext import stage_text

        contents.append((wanted["save"], stage_text(stage, Path(wanted["save"]).parent)))
    if "spice" in wanted:
        from rfstage.files.spice import spice_text
        from rfstage.files.stagetext import rounded

        contents.append((wanted["spice"], spice_text(rounded(stage))))
    write_files(contents, overwrite=found.overwrite, inputs=inputs)

    def record() -> dict[str, Any]:
        from rfstage.files.records import design_record

        record = design_record(made, list(wanted.values()))
        if fitting is not None:
            from rfstage.files.partsrecord import parts_record

            record["parts"] = parts_record(fitting)
        return record

    def page(look: Look) -> list[Text]:
        from rfstage.report.design import summary

        return summary(made, look, fitting)

    output(found, record, page, list(wanted.values()))
    failed = made.worst is not None and made.worst.margin is not None and made.worst.margin < 0
    if fitting is not None:
        failed = fitting.misses_limit
    return 1 if failed else 0


def _several(found: Namespace, jobs: tuple[Job, ...], wanted: dict[str, str]) -> int:
    """Design one tank for several carriers, or for variable parts, and return the exit status."""
    asked = [name for name in ("parts", "heat") if getattr(found, name)]
    if wanted or asked:
        wanted = {**wanted, **dict.fromkeys(asked, "")}
        options = ", ".join(f"--{name}" for name in wanted)
        raise InputError(
            f"{options}: for one stage only, and this job has several settings; give one --carrier, and a job "
            "without tank.variable"
        )
    from rfstage.designs.carriers import design_carriers

    tuned = design_carriers(jobs, textbook=found.textbook)
    if found.textbook:
        from rfstage.designs.design import with_settled

        tuned = tuple(t._replace(design=with_settled(t.design)) for t in tuned)

    def record() -> dict[str, Any]:
        from rfstage.files.carrierrecord import carriers_record

        return carriers_record(tuned)

    def page(look: Look) -> list[Text]:
        from rfstage.report.carriers import carriers_page

        return carriers_page(tuned, look)

    output(found, record, page, [])
    margins = [t.design.worst.margin for t in tuned if t.design.worst and t.design.worst.margin is not None]
    return 1 if min(margins, default=0.0) < 0 else 0
