"""``rfstage retune``: what to change for a new carrier or because of readings; the tune-up; bench arithmetic."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any

from rfstage.cli.words import Parser, given, output, read_all
from rfstage.errors import InputError, OutOfRangeError
from rfstage.fields import Field, nearest, plain, read
from rfstage.jobfields import CARRIER
from rfstage.quantity import QuantityError

if TYPE_CHECKING:
    from rich.text import Text

    from rfstage.report.page import Look
    from rfstage.retuning.arithmetic import Bench
    from rfstage.retuning.reading import Reading
    from rfstage.stage import Stage

ABOUT = """\
What to change on a stage that is built. For a new carrier: each part alone
and in pairs, by least work. From meter readings: which part is off, by how
much, and what to read next. With neither: the steps of its tune-up.

  rfstage retune examples/beacon-as-built.toml
  rfstage retune examples/beacon-as-built.toml --carrier 7.02MHz
  rfstage retune examples/beacon-as-built.toml \\
      --reading "dc_current=0.81A output_power=7.5W" \\
      --reading "C1=9.4nF dc_current=0.84A output_power=6.6W"
  rfstage retune examples/beacon-as-built.toml \\
      --resonances "7.12MHz 3.56MHz" --added 30pF

A reading names dc_current, output_power, supply, drive (peak), and parts
that were set: C1=9.4nF. dip=C1 says that C1 was turned until the dc current
dips.
"""
_CARRIER = Field("", "carrier", "real", "Hz", CARRIER.low, CARRIER.high, False, "--carrier", "the new carrier")
_ERROR = Field(
    "", "meter_error", "real", "%", 0.1, 50, False, "--meter-error", "standard error of the meters of the readings [1]"
)
_ADDED = Field("", "added", "real", "F", 0, 1e-3, True, "--added", "capacitor across the coil at the second resonance")
_METERS = (
    Field("dc_current", "dc_current", "real", "A", 0, 1e7, True),
    Field("output_power", "output_power", "real", "W", 0, 1e7, True),
    Field("supply", "supply", "real", "V", 0, 1e6, True),
    Field("drive", "drive", "real", "V", 0, 1e6, True),
)
DIP = "dip"
_FREQUENCY = Field("", "frequency", "real", "Hz", 0, 1e12, True)
_TWO = {
    "resonances": "of a coil alone, and with --added across it",
    "half_power": "half-power frequencies of the loaded tank",
    "half_power_unloaded": "the same with the load and all but the loosest coupling off",
    "peaks": "the two peaks of two coupled circuits",
}


def parser() -> Parser:
    """Return the command's parser."""
    made = Parser("retune", ABOUT)
    made.positional("stage", "STAGE.toml", "stage file")
    group = made.add_fields("retune", (_CARRIER, _ERROR))
    made.repeatable(group, "--reading", "READING", "meter readings at one setting; as many as there are")
    bench = made.add_fields("bench arithmetic", (_ADDED,))
    for name, about in _TWO.items():
        bench.add_argument(f"--{name.replace('_', '-')}", metavar='"F1 F2"', help=about)
    return made


def run(words: Sequence[str]) -> int:
    """Run the command and return its exit status."""
    found = parser().read(words)
    fields = (_CARRIER, _ERROR, _ADDED)
    texts = given(found, fields)
    problems: list[str] = []
    split = [_split(f"--reading {k}", text, problems) for k, text in enumerate(found.reading, start=1)]
    two = {name: _pair(name, text, problems) for name in _TWO if (text := getattr(found, name)) is not None}
    if ("resonances" in two) != ("added" in texts):
        problems.append("--resonances and --added go together: two frequencies, and the capacitor of the second")
    values = read_all({f.name: (f, texts[f.name]) for f in fields if f.name in texts}, problems)

    from rfstage.files.stage import load_stage

    stage = load_stage(found.stage)
    readings = _readings(stage, split)
    bench = _bench(two, values.get("added")) if two else None
    retuned = diagnosis = steps = None
    if "carrier" in values:
        from rfstage.retuning.carrier import retuned as to_carrier

        retuned = to_carrier(stage, values["carrier"])
    if readings:
        from rfstage.retuning.causes import causes

        diagnosis = causes(stage, readings, meter_error=values.get("meter_error", 1.0) / 100)
    if retuned is None and diagnosis is None and bench is None:
        from rfstage.retuning.procedure import procedure

        steps = procedure(stage)

    def record() -> dict[str, Any]:
        from rfstage.files.retunerecord import retune_record

        return retune_record(stage, retuned=retuned, diagnosis=diagnosis, procedure=steps, bench=bench)

    def page(look: Look) -> list[Text]:
        from rfstage.report.readings import causes_page
        from rfstage.report.retune import bench_page, carrier_page
        from rfstage.report.tuneup import procedure_page

        lines = [] if retuned is None else carrier_page(retuned, look)
        lines += [] if diagnosis is None else causes_page(diagnosis, look)
        lines += [] if steps is None else procedure_page(steps, look)
        return lines + ([] if bench is None else bench_page(bench, stage, look))

    output(found, record, page)
    return 0


def _split(where: str, text: str, problems: list[str]) -> dict[str, Any]:
    """Return names and values of one reading: meters read, everything else as text."""
    before, *pieces = re.split(r"([^\s=]+)\s*=", text)
    if before.strip() or not pieces:
        wanted = 'wanted name=value, such as "dc_current=1.9A output_power=14W"'
        problems.append(f"{where}: read {plain(repr(text))}; {wanted}")
        return {}
    meters = {field.name: field for field in _METERS}
    found: dict[str, Any] = {}
    for name, raw in zip(pieces[::2], pieces[1::2], strict=True):
        if name in found:
            problems.append(f"{where}: {plain(name)} is given twice")
        found[name] = raw.strip()
        if name in meters:
            try:
                found[name] = read(meters[name], raw.strip())
            except QuantityError as error:
                problems.append(f"{where}: {name}: {error}")
    return found


def _readings(stage: Stage, split: Sequence[dict[str, Any]]) -> list[Reading]:
    """Return the readings, the parts among their names read by the stage.

    Raises
    ------
    InputError
        With one line for each name that is neither a meter nor a part, and each value that can't be read.
    """
    from rfstage.retuning.reading import Reading

    units = {b.name: "H" if b.kind == "coil" else "F" for b in stage.branches if b.kind in ("coil", "capacitor")}
    meters = [field.name for field in _METERS]
    problems, found = [], []
    for number, values in enumerate(split, start=1):
        where = f"--reading {number}"
        settings = []
        for name, value in values.items():
            if name in meters or name == DIP:
                continue
            if name not in units:
                known = [*meters, DIP, *units]
                problems.append(
                    f"{where}: {plain(name)!r} is no meter and no coil or capacitor of this stage"
                    f"{nearest(name, known)}; allowed {', '.join(known)}"
                )
                continue
            try:
                settings.append((name, float(read(Field("", name, "real", units[name], 0, 1.0, True), value))))
            except QuantityError as error:
                problems.append(f"{where}: {name}: {error}")
        if values.get(DIP) == "":
            problems.append(f"{where}: dip: names no part; wanted one of {', '.join(units)}")
        found.append(Reading(**{m: values.get(m) for m in meters}, settings=tuple(settings), dip=values.get(DIP)))
    if problems:
        raise InputError(*problems)
    return found


def _pair(name: str, text: str, problems: list[str]) -> tuple[float, float]:
    """Return two frequencies [Hz] from one text."""
    option = f"--{name.replace('_', '-')}"
    words = re.findall(r"\S+(?:\s+[kMG]?Hz\b)?", text)
    values = []
    for word in words:
        try:
            values.append(float(read(_FREQUENCY, word)))
        except QuantityError as error:
            problems.append(f"{option}: {error}")
            return 1.0, 1.0
    if len(values) != 2:
        problems.append(f'{option}: got {plain(repr(text))}; wanted two frequencies, such as "7.30MHz 5.12MHz"')
        return 1.0, 1.0
    return values[0], values[1]


def _bench(two: dict[str, tuple[float, float]], added: float | None) -> Bench:
    """Return what the frequencies come to.

    Raises
    ------
    InputError
        With one line for each option whose frequencies make no sense, or two that are at odds.
    """
    from rfstage.retuning import arithmetic

    problems: list[str] = []

    def worked(name: str, sum_of: Callable[..., Any], **more: float) -> Any:
        if name not in two:
            return None
        try:
            return sum_of(*sorted(two[name], reverse="added" in more), **more)
        except OutOfRangeError as error:
            problems.append(f"--{name.replace('_', '-')}: {error}")
            return None

    loaded = worked("half_power", arithmetic.resonance_from_half_power)
    alone = worked("half_power_unloaded", arithmetic.resonance_from_half_power)
    shared = None
    if loaded is not None and alone is not None:
        if loaded.q < alone.q:
            shared = arithmetic.q_shared(loaded.q, alone.q)
        else:
            problems.append(
                f"--half-power: makes a loaded Q of {float(loaded.q):.4g}, and the unloaded one is "
                f"{float(alone.q):.4g}; the load can only lower it (swapped?)"
            )
    coil = worked("resonances", arithmetic.coil_from_resonances, added=added) if added is not None else None
    coupling = worked("peaks", arithmetic.coupling_from_peaks)
    if problems:
        raise InputError(*problems)
    return arithmetic.Bench(coil=coil, loaded=loaded, unloaded=alone, shared=shared, coupling=coupling)
