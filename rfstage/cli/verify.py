"""``rfstage verify``: measured against predicted, and against the limit."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from rfstage.cli.words import Parser, _pieces, given, output, read_all
from rfstage.errors import InputError
from rfstage.fields import Field

if TYPE_CHECKING:
    from rich.text import Text

    from rfstage.report.page import Look

ABOUT = """\
Measured against predicted, and against the limit: level lists (CSV of
frequency and dBm or dBc), waveforms (CSV or .npy of time and volts at the
load or amperes of the device), a network analyser's file of the tank (.s1p
with the load attached, .s2p with port 2 in its place).

  rfstage verify examples/beacon-as-built.toml examples/beacon-tank.s2p
  rfstage verify examples/beacon-as-built.toml examples/beacon-levels.csv \\
      --sampler examples/beacon-sampler.csv --attenuation 20dB

--limit judges the levels; the exit status is then 1 unless they pass.
"""
SIMPLE, GUARDED = "simple", "guarded"
FIELDS = (
    Field("", "limit", "text", "", option="--limit", help="limit on harmonics, as in design [the stage's]"),
    Field(
        "",
        "decision",
        "choice",
        option="--decision",
        help="decision rule [guarded]: whether the uncertainty must lie below the limit, too",
        choices=(SIMPLE, GUARDED),
    ),
    Field("", "attenuation", "real", "dB", 0, 200, False, "--attenuation", "between line and instrument [0]"),
    Field(
        "", "probe", "real", "", 0, 1e6, True, "--probe", "what the probe divides by, unless the instrument knows [1]"
    ),
    Field(
        "", "uncertainty", "real", "dB", 0, 30, False, "--uncertainty", "of a level against the carrier's, k = 2 [1 dB]"
    ),
    Field(
        "",
        "distortion",
        "real",
        "dB",
        0,
        300,
        True,
        "--instrument-distortion",
        "how far below the carrier the instrument's own harmonics lie [captures: by its bits; lists: left out]",
    ),
    Field(
        "", "sample_rate", "real", "Hz", 0, 1e15, True, "--sample-rate", "of waveforms, instead of the time in the file"
    ),
    Field("", "shunt", "real", "ohm", 0, 1e9, True, "--shunt", "the last channel is a current, in volts across this"),
    Field(
        "",
        "device",
        "choice",
        option="--device",
        help="whether the device was in place at the analyser, switched off, or out [out]",
        choices=("in", "out"),
    ),
)


class _Several(Parser):
    """A parser whose last positional takes several words."""

    def read(self, words: Sequence[str]) -> argparse.Namespace:
        """Return the words by name; ``measurements`` holds all after the first that belong to no option."""
        flags = {name for action in self._actions if action.nargs == 0 for name in action.option_strings}
        options, loose = [], []
        for name, value in _pieces(words, flags):
            if name:
                options.append(name if value is None else f"{name}={value}")
            else:
                loose.append(str(value))
        found = super().read([*options, "--", *loose[:2]])
        found.measurements = loose[1:]
        return found


def parser() -> Parser:
    """Return the command's parser."""
    made = _Several("verify", ABOUT)
    made.positional("stage", "STAGE.toml", "stage file, with the load that stood there")
    made.positional("measurement", "MEASUREMENT...", "one or more files")
    measured = made.add_fields("measurement", FIELDS)
    measured.add_argument("--sampler", metavar="FILE", help="response of the sampler: .s2p, or CSV of frequency and dB")
    return made


def run(words: Sequence[str]) -> int:
    """Run the command and return its exit status."""
    found = parser().read(words)
    texts = given(found, FIELDS)
    values = read_all({field.name: (field, texts[field.name]) for field in FIELDS if field.name in texts})

    from rfstage.limits import limit_named

    limit = None
    if "limit" in values:
        try:
            limit = limit_named(values["limit"])
        except InputError as error:
            raise InputError(*(p.replace("limit.rule:", "--limit:") for p in error.problems)) from None

    from rfstage.files.captures import read_measurement
    from rfstage.files.levellists import read_sampler
    from rfstage.files.stage import load_stage
    from rfstage.steady import settle
    from rfstage.verify.levels import Setup
    from rfstage.verify.verdict import FAIL, UNDECIDED
    from rfstage.verify.verification import SHOWN, Asked, verify

    stage = load_stage(found.stage)
    if limit is None and stage.limit_rule is not None:
        limit = limit_named(stage.limit_rule)
    setup = Setup(
        attenuation=values.get("attenuation", 0.0),
        sampler=None if found.sampler is None else read_sampler(found.sampler),
        probe=values.get("probe", 1.0),
        uncertainty=values.get("uncertainty", 1.0),
        distortion=values.get("distortion"),
    )
    asked = Asked(
        limit, values.get("decision", GUARDED), setup, values.get("shunt"), values.get("device", "out") == "in"
    )
    measurements = [read_measurement(name, sample_rate=values.get("sample_rate")) for name in found.measurements]
    state = settle(stage, listed=SHOWN)
    if not state.has_output:
        raise InputError(f"{found.stage}: the stage has no output in steady state: its drive stays below the threshold")
    verified = verify(state, measurements, asked)

    def record() -> dict[str, Any]:
        from rfstage.files.verifyrecord import verify_record

        return verify_record(verified)

    def page(look: Look) -> list[Text]:
        from rfstage.report.verify import verify_page

        return verify_page(verified, look)

    output(found, record, page)
    return 1 if verified.verdict in (FAIL, UNDECIDED) else 0
