"""``rfstage match``: one network by itself."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from rfstage.cli.words import Parser, given, output, read_all
from rfstage.fields import Field
from rfstage.files.job import impedance_or_file, load_file_problem
from rfstage.jobfields import CARRIER
from rfstage.quantity import QuantityError
from rfstage.tankfields import CAPACITOR_Q, COIL_Q, INPUT_Q, LOADED_Q, NETWORK, NETWORKS, SPECIAL, misfits

if TYPE_CHECKING:
    from rich.text import Text

    from rfstage.report.page import Look

ABOUT = """\
One network between any two impedances: it turns the load into what the
device should see, without choke, blocking capacitor or output capacitance.

  rfstage match 1000 50 --carrier 3.5MHz --network pi --input-q 12
  rfstage match 12+j3 50-j20 --carrier 14.2MHz --network l
"""
_WANTED = Field("RESISTANCE", "wanted", "impedance", "ohm", 0, 1e7, True)
_LOAD = Field("LOAD", "load", "impedance", "ohm", 0, 1e7, True)
_POWER = Field("", "power", "real", "W", 0, 1e7, True, "--power", "power at the load, to show the parts' stresses")
_HARMONICS = Field("", "harmonics", "count", "", 2, 100, False, "--harmonics", "highest harmonic order shown [10]")
_NETWORK = NETWORK._replace(help="the network [pi]", choices=NETWORKS)
_OPTIONS = (CARRIER, _NETWORK, LOADED_Q, INPUT_Q, COIL_Q, CAPACITOR_Q, *SPECIAL, _POWER, _HARMONICS)


def parser() -> Parser:
    """Return the command's parser."""
    made = Parser("match", ABOUT)
    made.positional("wanted", "RESISTANCE", "what the device should see: a resistance or R+jX")
    made.positional("load", "LOAD", "the load: an impedance, or a file ending in .s1p")
    made.add_fields("network", _OPTIONS)
    return made


def run(words: Sequence[str]) -> int:
    """Run the command and return its exit status."""
    found = parser().read(words)
    words_given = given(found, _OPTIONS)
    texts = {field.name: (field, words_given[field.name]) for field in _OPTIONS if field.name in words_given}
    texts["wanted"] = (_WANTED, found.wanted)
    problems = []
    name, load = found.load.strip(), None
    try:
        load = impedance_or_file(_LOAD, name)
        wrong = load_file_problem(name) if load is None else ""
    except QuantityError as error:
        wrong = str(error)
    if wrong:
        problems.append(f"LOAD: {wrong}")
    if "carrier" not in texts:
        problems.append("--carrier: missing; a network is designed at one frequency, such as --carrier 7.1MHz")
    options = {field.path: field.option for field in _OPTIONS}
    for line in misfits({"network": "pi", **words_given}):
        key, colon, rest = line.partition(":")
        problems.append(options[key] + colon + rest)
    values = read_all(texts, problems)
    values["load"] = load
    if load is None:
        from rfstage.files.touchstone import read_load

        values["load"] = read_load(name)

    from rfstage.designs.single import single_network

    made = single_network(**values)

    def record() -> dict[str, Any]:
        from rfstage.files.records import match_record

        return match_record(made.tank, made.transfer, made.continued)

    def page(look: Look) -> list[Text]:
        from rfstage.report.small import match_page

        return match_page(
            look,
            tank=made.tank,
            load=made.load,
            carrier=values["carrier"],
            transfer=made.transfer,
            continued=made.continued,
        )

    output(found, record, page)
    return 0
