"""The keys of a job: option, unit, range and help of each. Standard library only.

The order is that of the summary and of ``--help``. A path is the key of the job file, a name the
attribute of `rfstage.job.Job`.
"""

from __future__ import annotations

from rfstage.devicefields import DEVICE, DRIVE, strangers
from rfstage.errors import InputError
from rfstage.fields import Field
from rfstage.limits import limit_named
from rfstage.partfields import PARTS
from rfstage.quantity import exact_text
from rfstage.safetyfields import ANTENNA_GAIN, CHOKE_LIMITS, HEAT, RESERVOIR, heat_misfits
from rfstage.tankfields import (
    CAPACITOR_Q,
    COIL_Q,
    FILTERS,
    INPUT_Q,
    LOADED_Q,
    NETWORK,
    SPECIAL,
    TRANSFORMER,
    lonely,
    misfits,
)

REQUIRED = ("carrier", "power", "conduction_angle", "supply")

CARRIER = Field("stage.carrier", "carrier", "real", "Hz", 1e3, 3e10, option="--carrier", help="carrier frequency")

JOB_FIELDS: tuple[Field, ...] = (
    CARRIER,
    Field("stage.power", "power", "real", "W", 0, 1e7, True, "--power", "carrier power at the load"),
    Field(
        "stage.conduction_angle",
        "conduction_angle",
        "real",
        "deg",
        0,
        360,
        True,
        "--angle",
        "full conduction angle: 360 class A, 180 class B, below class C",
    ),
    Field("stage.supply", "supply", "real", "V", 0, 1e6, True, "--supply", "supply voltage"),
    Field(
        "stage.minimum_voltage",
        "minimum_voltage",
        "real",
        "V",
        0,
        1e6,
        False,
        "--minimum-voltage",
        "lowest output-electrode voltage [8 % of the supply and at least 1 V; tube 12 %]",
    ),
    Field(
        "stage.harmonics", "harmonics", "count", "", 2, 100, False, "--harmonics", "highest harmonic order shown [10]"
    ),
    *DEVICE,
    *DRIVE,
    Field(
        "load.impedance",
        "load",
        "impedance",
        "ohm",
        0,
        1e7,
        True,
        "--load",
        "load: an impedance, or a Touchstone one-port ending in .s1p [50 ohm]",
    ),
    Field("load.file", "load_file", "text"),
    ANTENNA_GAIN,
    NETWORK,
    LOADED_Q,
    INPUT_Q,
    COIL_Q,
    CAPACITOR_Q,
    *SPECIAL,
    *FILTERS,
    *TRANSFORMER,
    Field("supply.choke", "choke", "real", "H", 0, 1e3, True, "--choke", "supply choke [see the assumptions shown]"),
    Field(
        "supply.choke_q",
        "choke_q",
        "q",
        "",
        1,
        1e7,
        False,
        "--choke-q",
        "the choke's Q at the carrier, or lossless [100]",
    ),
    Field(
        "supply.choke_resistance",
        "choke_resistance",
        "real",
        "ohm",
        0,
        1e6,
        False,
        "--choke-resistance",
        "dc resistance of the choke [0]",
    ),
    *CHOKE_LIMITS,
    *RESERVOIR,
    Field(
        "tank.blocking",
        "blocking",
        "real",
        "F",
        0,
        1.0,
        True,
        "--blocking",
        "blocking capacitor [a tenth of the reactance it works into]",
    ),
    Field(
        "limit.rule",
        "limit",
        "text",
        option="--limit",
        help="limit on harmonics: us-amateur, us-amateur-before-2003, 43+10log, itu-amateur, or an amount (60dB, 25uW)",
    ),
    Field(
        "limit.load",
        "limit_load",
        "real",
        "ohm",
        0,
        1e7,
        True,
        "--limit-load",
        "resistive line load for the verdict [50 ohm]",
    ),
    Field(
        "limit.margin",
        "margin",
        "real",
        "dB",
        0,
        60,
        False,
        "--margin",
        "what a filter must keep under the limit, and a ranked network should [3 dB]",
    ),
    *HEAT,
    *PARTS,
)


def conflicts(values: dict[str, object]) -> list[str]:
    """Return one line for each pair of given values that can't stand together."""
    found = []
    supply, lowest = values.get("supply"), values.get("minimum_voltage")
    if isinstance(supply, float | int) and isinstance(lowest, float | int) and lowest >= supply > 0:
        found.append(
            f"stage.minimum_voltage: got {exact_text(lowest, 'V')}; allowed below the supply of "
            f"{exact_text(supply, 'V')}"
        )
    found += misfits(values) + heat_misfits(values)
    found += strangers(values)
    found += lonely(values)
    if isinstance(values.get("limit"), str):
        try:
            limit_named(str(values["limit"]))
        except InputError as error:
            found += error.problems
    return found
