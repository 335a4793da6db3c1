"""``rfstage pulse``: the coefficients of a current pulse."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from rfstage.cli.words import Parser, given, output, read_all
from rfstage.fields import Field

if TYPE_CHECKING:
    from rich.text import Text

    from rfstage.report.page import Look

ABOUT = """\
Fourier coefficients of the current pulse of a device that conducts for part
of each cycle.

  rfstage pulse 120deg --orders 5
"""
_ANGLE = Field("ANGLE", "angle", "real", "deg", 0, 360, True)
_EXPONENT = Field("", "exponent", "real", "", 1, 3, False, "--exponent", "power law of the device, 1 to 3 [1]")
_ORDERS = Field("", "orders", "count", "", 0, 10_000, False, "--orders", "highest order [10]")
_OPTIONS = (_EXPONENT, _ORDERS)


def parser() -> Parser:
    """Return the command's parser."""
    made = Parser("pulse", ABOUT)
    made.positional("angle", "ANGLE", "full conduction angle in degrees")
    made.add_fields("pulse", _OPTIONS)
    return made


def run(words: Sequence[str]) -> int:
    """Run the command and return its exit status."""
    found = parser().read(words)
    texts = {"exponent": "1", "orders": "10", **given(found, _OPTIONS)}
    fields = {field.name: (field, texts[field.name]) for field in _OPTIONS}
    values = read_all({"angle": (_ANGLE, found.angle), **fields})

    from rfstage.pulse import operating_class, pulse_coefficients

    angle, exponent = values["angle"], values["exponent"]
    # the fundamental is always there, for the ratio; what is shown ends where it was asked to
    full = pulse_coefficients(math.radians(angle / 2), highest_order=max(1, values["orders"]), exponent=exponent)
    a, ratio = [float(x) for x in full[: values["orders"] + 1]], float(full[1] / full[0])
    letter = operating_class(angle)

    def record() -> dict[str, Any]:
        from rfstage.files.records import pulse_record

        return pulse_record(
            angle=angle, exponent=exponent, operating_class=letter, coefficients=a, fundamental_to_dc=ratio
        )

    def page(look: Look) -> list[Text]:
        from rfstage.report.small import pulse_page

        return pulse_page(
            look, angle=angle, exponent=exponent, operating_class=letter, coefficients=a, fundamental_to_dc=ratio
        )

    output(found, record, page)
    return 0
