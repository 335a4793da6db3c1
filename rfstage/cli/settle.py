"""``rfstage settle``: the steady state of an as-built stage."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from rfstage.cli.heatoptions import add_heat, check_heat, check_values, read_values
from rfstage.cli.words import Parser, output, targets
from rfstage.files.write import check_targets, write_files
from rfstage.safetyfields import HEAT, SAFETY

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
    made.add_fields("supply, choke and antenna", SAFETY)
    add_heat(made.add_fields("heat, with --heat", HEAT))
    files = made.add_argument_group("files")
    files.add_argument("--spice", metavar="FILE", help="write the stage as a SPICE deck")
    return made


def run(words: Sequence[str]) -> int:
    """Run the command and return its exit status."""
    found = parser().read(words)
    wanted = list(targets(found, "spice").values())
    check_heat(found)
    values = read_values(found)
    check_targets(wanted, overwrite=found.overwrite, inputs={"stage file": found.stage})

    from rfstage.designs.judging import judged, load_file_cautions, settled_cautions, worst
    from rfstage.designs.safety import Station, settled_safety
    from rfstage.files.stage import load_stage
    from rfstage.steady import settle

    stage = load_stage(found.stage)
    inputs = {"stage file": found.stage, "load file": getattr(stage.load, "name", None)}
    check_targets(wanted, overwrite=found.overwrite, inputs=inputs)
    check_values(values, stage.device.family)
    station = Station(**{field.name: values.get(field.name) for field in SAFETY})
    state = settle(stage)
    verdicts = judged(state)
    heat = None
    if found.heat:
        from rfstage.cli.progress import progress
        from rfstage.designs.heat import heat_of

        cooling = {field.name: values.get(field.name) for field in HEAT}
        heat = heat_of(stage, cooling, state=state, progress=progress())
    if wanted:
        from rfstage.files.spice import spice_text

        write_files([(wanted[0], spice_text(stage))], overwrite=found.overwrite, inputs=inputs)

    def record() -> dict[str, Any]:
        from rfstage.files.records import settle_record

        cautions = [*settled_cautions(state), *load_file_cautions(stage), *settled_safety(state, station)]
        return settle_record(state, verdicts, cautions, heat)

    def page(look: Look) -> list[Text]:
        from rfstage.report.settled import settled_page

        return settled_page(state, look, verdicts, station=station, heat=heat)

    output(found, record, page, wanted)
    least = worst(verdicts)
    return 1 if least is not None and least.margin is not None and least.margin < 0 else 0
