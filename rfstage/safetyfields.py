"""The keys of a job that safety and heat are reckoned from; a settled stage takes them as options too.

Standard library only, as `rfstage.jobfields`, which they are part of.
"""

from __future__ import annotations

from rfstage.constants import AMBIENT, JUNCTION_LIMIT
from rfstage.fields import Field
from rfstage.quantity import exact_text

ANTENNA_GAIN = Field(
    "load.antenna_gain",
    "antenna_gain",
    "real",
    "dBi",
    -50,
    60,
    False,
    "--antenna-gain",
    "gain of the antenna over an isotropic radiator, for the exposure estimate",
)
CHOKE_LIMITS: tuple[Field, ...] = (
    Field(
        "supply.choke_self_capacitance",
        "choke_self_capacitance",
        "real",
        "F",
        0,
        1e-6,
        True,
        "--choke-self-capacitance",
        "self-capacitance of the choke, for its own resonance",
    ),
    Field(
        "supply.choke_max_current",
        "choke_max_current",
        "real",
        "A",
        0,
        1e6,
        True,
        "--choke-max-current",
        "rating: rms current of the choke",
    ),
)
RESERVOIR: tuple[Field, ...] = (
    Field(
        "supply.reservoir",
        "reservoir",
        "real",
        "F",
        0,
        1e3,
        True,
        "--reservoir",
        "reservoir capacitance of the supply, for stored energy and bleeder",
    ),
    Field(
        "supply.bleeder",
        "bleeder",
        "real",
        "ohm",
        0,
        1e9,
        True,
        "--bleeder",
        "bleeder across the reservoir [one to fit is named]",
    ),
)
SAFETY: tuple[Field, ...] = (ANTENNA_GAIN, *CHOKE_LIMITS, *RESERVOIR)
HEAT: tuple[Field, ...] = (
    Field(
        "heat.ambient",
        "ambient",
        "real",
        "degC",
        -90,
        200,
        False,
        "--ambient",
        "temperature of the air at the heat sink [40 degC]",
    ),
    Field(
        "heat.junction_limit",
        "junction_limit",
        "real",
        "degC",
        0,
        500,
        False,
        "--junction-limit",
        "highest junction temperature [150 degC, plastic; metal cans stand 200]",
    ),
    Field(
        "heat.junction_to_case",
        "junction_to_case",
        "real",
        "K/W",
        0,
        1e4,
        True,
        "--junction-to-case",
        "thermal resistance of the device, junction to case, from its data sheet",
    ),
    Field(
        "heat.case_to_sink",
        "case_to_sink",
        "real",
        "K/W",
        0,
        1e4,
        False,
        "--case-to-sink",
        "thermal resistance of washer and paste [0.3 K/W]",
    ),
    Field(
        "heat.sink_to_ambient",
        "sink_to_ambient",
        "real",
        "K/W",
        0,
        1e4,
        True,
        "--sink-to-ambient",
        "thermal resistance of the heat sink that is there [the one needed]",
    ),
    Field(
        "heat.duty",
        "duty",
        "real",
        "%",
        0,
        100,
        True,
        "--duty",
        "part of the time on the air, over times short for the heat sink [100 %]",
    ),
)


def heat_misfits(values: dict[str, object]) -> list[str]:
    """Return one line for each value about heat or the reservoir that can't stand with another, or with a tube."""
    found = []
    ambient, limit = values.get("ambient"), values.get("junction_limit")
    air = ambient if isinstance(ambient, float | int) else AMBIENT
    most = limit if isinstance(limit, float | int) else JUNCTION_LIMIT
    if air >= most:
        path = "heat.junction_limit" if ambient is None else "heat.ambient"
        got, bound = (most, f"above the ambient of {exact_text(air, 'degC')}")
        if ambient is not None:
            got, bound = air, f"below the junction limit of {exact_text(most, 'degC')}"
        found.append(f"{path}: got {exact_text(got, 'degC')}; allowed {bound}")
    if values.get("family") == "tube":
        found += [
            f"{field.path}: is of no use for a tube, whose anode is held against device.max_dissipation"
            for field in HEAT
            if field.name != "duty" and values.get(field.name) is not None
        ]
    if values.get("bleeder") is not None and values.get("reservoir") is None:
        found.append("supply.bleeder: is of no use without supply.reservoir (--reservoir)")
    return found
