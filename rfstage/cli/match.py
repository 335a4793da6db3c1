"""``rfstage match``: one network by itself."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from rfstage.cli.words import Parser, add_field_options, given, output, read_all
from rfstage.errors import InputError
from rfstage.fields import Field
from rfstage.files.job import LOAD_FILE_ENDING
from rfstage.jobfields import CAPACITOR_Q, CARRIER, COIL_Q, INPUT_Q, LOADED_Q, NETWORK

if TYPE_CHECKING:
    from rich.text import Text

    from rfstage.report.page import Look

ABOUT = """\
One network that turns the load into what the device should see, without choke, blocking capacitor
or output capacitance.

  rfstage match 1000 50 --carrier 3.5MHz --network pi --input-q 12 --coil-q lossless --capacitor-q lossless
"""
_WANTED = Field("RESISTANCE", "wanted", "impedance", "ohm", 0, 1e7, True)
_LOAD = Field("LOAD", "load", "impedance", "ohm", 0, 1e7, True)
_POWER = Field("", "power", "real", "W", 0, 1e7, True, "--power", "power at the load, to show the parts' stresses")
_HARMONICS = Field("", "harmonics", "count", "", 2, 100, False, "--harmonics", "highest harmonic order shown [10]")
_OPTIONS = (CARRIER, NETWORK, LOADED_Q, INPUT_Q, COIL_Q, CAPACITOR_Q, _POWER, _HARMONICS)


def parser() -> Parser:
    """Return the command's parser."""
    made = Parser("match", ABOUT)
    made.positional("wanted", "RESISTANCE", "what the device should see: a resistance or R+jX")
    made.positional("load", "LOAD", "the load: an impedance, or a file ending in .s1p")
    add_field_options(made, "network", _OPTIONS)
    return made


def run(words: Sequence[str]) -> int:
    """Run the command and return its exit status."""
    found = parser().read(words)
    texts = {
        field.name: (field, text) for field in _OPTIONS for text in [given(found, _OPTIONS).get(field.name)] if text
    }
    texts["wanted"] = (_WANTED, found.wanted)
    measured = found.load.strip().lower().endswith(LOAD_FILE_ENDING)
    if not measured:
        texts["load"] = (_LOAD, found.load)
    values = read_all(texts)
    if "carrier" not in values:
        raise InputError("--carrier: missing; a network is designed at one frequency, such as --carrier 7.1MHz")
    if "loaded_q" in values and "input_q" in values:
        raise InputError("--input-q: got both a loaded Q and an input-side Q; give one of them")
    if measured:
        from rfstage.files.touchstone import read_load

        values["load"] = read_load(found.load.strip())

    from rfstage.designs.single import single_network

    made = single_network(**values)

    def record() -> dict[str, Any]:
        from rfstage.files.records import match_record

        return match_record(made.tank, made.transfer)

    def page(look: Look) -> list[Text]:
        from rfstage.report.small import match_page

        return match_page(look, tank=made.tank, load=made.load, carrier=values["carrier"], transfer=made.transfer)

    output(found, record, page)
    return 0
