"""The keys of a job that say how its parts are to be chosen. Standard library only."""

from __future__ import annotations

from rfstage.fields import Field

PARTS: tuple[Field, ...] = (
    Field(
        "parts.former",
        "former",
        "real",
        "m",
        0,
        10,
        True,
        "--former",
        "mean diameter of the coils to wind, wire centre to wire centre [chosen]",
    ),
    Field("parts.wire", "wire", "real", "m", 0, 0.1, True, "--wire", "diameter of their wire [by the current]"),
    Field(
        "parts.series",
        "series",
        "choice",
        option="--series",
        help="E series of the capacitors to buy [E12]",
        choices=("E6", "E12", "E24", "E48", "E96"),
    ),
    Field(
        "parts.voltage_margin",
        "voltage_margin",
        "real",
        "",
        1,
        20,
        False,
        "--voltage-margin",
        "times its voltage that a capacitor is to stand [2]",
    ),
    Field(
        "parts.current_margin",
        "current_margin",
        "real",
        "",
        1,
        20,
        False,
        "--current-margin",
        "times its current that a capacitor is to stand [1.5]",
    ),
    Field(
        "parts.lead",
        "lead",
        "real",
        "H",
        0,
        1e-6,
        True,
        "--lead",
        "lead inductance of each capacitor [5 nH, from 30 MHz 1 nH]",
    ),
)
