"""The keys of a job: option, unit, range and help of each. Standard library only.

The order is that of the summary and of ``--help``. A path is the key of the job file, a name the
attribute of `rfstage.job.Job`.
"""

from __future__ import annotations

from rfstage.errors import InputError
from rfstage.fields import Field
from rfstage.limits import limit_named
from rfstage.quantity import exact_text

FAMILIES = ("bipolar", "fet", "tube")
NETWORKS = ("l", "l-high-pass", "pi", "pi-l", "t", "tapped-coil", "link", "capacitive-divider")
AUTO = "auto"
NONE = "none"
LINKS = ("tuned", "untuned")
FILTER_KINDS = ("butterworth", "chebyshev", "elliptic", "chebyshev-trap")
FILTER_ORDERS = range(2, 12)
REQUIRED = ("carrier", "power", "conduction_angle", "supply")

CARRIER = Field("stage.carrier", "carrier", "real", "Hz", 1e3, 3e10, option="--carrier", help="carrier frequency")
LOADED_Q = Field(
    "tank.loaded_q",
    "loaded_q",
    "real",
    "",
    0,
    1000,
    True,
    "--loaded-q",
    "loaded Q of the tank [10, or the least that works + 2]",
)
INPUT_Q = Field(
    "tank.input_q",
    "input_q",
    "real",
    "",
    0,
    1000,
    True,
    "--input-q",
    "input-side Q instead: load resistance over the reactance across the device",
)
COIL_Q = Field("tank.coil_q", "coil_q", "q", "", 1, 1e7, False, "--coil-q", "Q of the tank's coils, or lossless [150]")
CAPACITOR_Q = Field(
    "tank.capacitor_q",
    "capacitor_q",
    "q",
    "",
    1,
    1e7,
    False,
    "--capacitor-q",
    "Q of the capacitors, or lossless [1000]",
)
NETWORK = Field(
    "tank.network",
    "network",
    "choice",
    option="--network",
    help="the tank's network [auto: all are tried and ranked]",
    choices=(*NETWORKS, AUTO),
)
SPECIAL: tuple[Field, ...] = (
    Field(
        "tank.middle_resistance",
        "middle_resistance",
        "real",
        "ohm",
        0,
        1e7,
        True,
        "--middle-resistance",
        "pi-l: resistance between its pi and its L [5 times the load's; 2 times from below it]",
    ),
    Field(
        "tank.coupling",
        "coupling",
        "real",
        "",
        0,
        0.9999,
        True,
        "--coupling",
        "tapped-coil, link: coupling of the coil's parts [0.4], of the link [0.35]",
    ),
    Field(
        "tank.tap",
        "tap",
        "real",
        "",
        0,
        0.9999,
        True,
        "--tap",
        "tapped-coil: the tap's share of the turns from the grounded end, instead of a Q",
    ),
    Field(
        "tank.link",
        "link",
        "choice",
        option="--link",
        help="link: its reactance tuned out by a series capacitor, or not [tuned]",
        choices=LINKS,
    ),
)
FILTERS: tuple[Field, ...] = (
    Field(
        "tank.filter",
        "filter",
        "choice",
        option="--filter",
        help="low-pass filter behind the tank: auto where the limit needs one, or its order [none]",
        choices=(AUTO, NONE, *(str(order) for order in FILTER_ORDERS)),
    ),
    Field(
        "tank.filter_kind",
        "filter_kind",
        "choice",
        option="--filter-kind",
        help="kind of filter [whichever does it with the lowest order]",
        choices=FILTER_KINDS,
    ),
    Field(
        "tank.trap",
        "trap",
        "count",
        "",
        2,
        10,
        False,
        "--trap",
        "harmonic that the trap of a chebyshev-trap filter is tuned to [2]",
    ),
)
TRANSFORMER: tuple[Field, ...] = (
    Field(
        "tank.transformer",
        "transformer",
        "real",
        "",
        0.01,
        100,
        False,
        "--transformer",
        "wide-band transformer before the network: N of 1:N turns from device to network [no transformer]",
    ),
    Field(
        "tank.transformer_magnetizing",
        "transformer_magnetizing",
        "real",
        "H",
        0,
        1.0,
        True,
        "--transformer-magnetizing",
        "its magnetizing inductance at the device's side [10 times the load resistance]",
    ),
    Field(
        "tank.transformer_leakage",
        "transformer_leakage",
        "real",
        "H",
        0,
        1.0,
        False,
        "--transformer-leakage",
        "its leakage inductance there [1 % of the magnetizing inductance]",
    ),
)

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
    Field("device.family", "family", "choice", option="--family", help="kind of device [bipolar]", choices=FAMILIES),
    Field(
        "device.output_capacitance",
        "output_capacitance",
        "real",
        "F",
        0,
        1e-3,
        False,
        "--output-capacitance",
        "capacitance across the device's output, effective over the swing [0]",
    ),
    Field(
        "device.exponent",
        "exponent",
        "real",
        "",
        1,
        3,
        False,
        "--exponent",
        "power law of the device: 1 linear, 1.5 space charge, 2 square law [1]",
    ),
    Field(
        "device.threshold",
        "threshold",
        "real",
        "V",
        -1e5,
        1e5,
        False,
        "--threshold",
        "control voltage where current starts [bipolar 0.7 V]",
    ),
    Field(
        "device.transfer_factor",
        "transfer_factor",
        "real",
        "",
        0,
        1e6,
        True,
        "--transfer-factor",
        "K in A/V^exponent: current = K (control voltage - threshold)^exponent",
    ),
    Field(
        "device.amplification_factor",
        "amplification_factor",
        "real",
        "",
        1,
        1e4,
        True,
        "--amplification-factor",
        "triode: amplification factor mu",
    ),
    Field(
        "device.knee_voltage",
        "knee_voltage",
        "real",
        "V",
        0,
        1e6,
        True,
        "--knee-voltage",
        "constant part of the knee voltage [from the lowest voltage]",
    ),
    Field(
        "device.knee_resistance",
        "knee_resistance",
        "real",
        "ohm",
        0,
        1e7,
        False,
        "--knee-resistance",
        "what the knee voltage grows by with current [from the lowest voltage]",
    ),
    Field("device.max_voltage", "max_voltage", "real", "V", 0, 1e6, True, "--max-voltage", "rating: peak voltage"),
    Field("device.max_current", "max_current", "real", "A", 0, 1e6, True, "--max-current", "rating: peak current"),
    Field(
        "device.max_dissipation",
        "max_dissipation",
        "real",
        "W",
        0,
        1e7,
        True,
        "--max-dissipation",
        "rating: dissipation",
    ),
    Field(
        "device.gate_resistance",
        "gate_resistance",
        "real",
        "ohm",
        0,
        1e6,
        True,
        "--gate-resistance",
        "FET: series gate resistance, for the drive power",
    ),
    Field(
        "device.input_capacitance",
        "input_capacitance",
        "real",
        "F",
        0,
        1e-3,
        True,
        "--input-capacitance",
        "FET: input capacitance, for the drive power",
    ),
    Field(
        "device.power_gain",
        "power_gain",
        "real",
        "dB",
        0,
        60,
        True,
        "--power-gain",
        "bipolar: power gain, for the drive power",
    ),
    Field("drive.bias", "bias", "real", "V", -1e5, 1e5, False, "--bias", "bias of the control electrode"),
    Field(
        "drive.amplitude",
        "amplitude",
        "real",
        "V",
        0,
        1e5,
        True,
        "--amplitude",
        "peak drive voltage, instead of the transfer factor",
    ),
    Field(
        "drive.grid_current",
        "grid_current",
        "real",
        "A",
        0,
        1e3,
        True,
        "--grid-current",
        "tube: direct grid current, for the drive power",
    ),
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
)

# what only some networks have, and what is of use only beside something else
_NETWORKS_OF = {
    "middle_resistance": ("pi-l",),
    "coupling": ("tapped-coil", "link"),
    "tap": ("tapped-coil",),
    "link": ("link",),
}
_BESIDE = {
    "filter_kind": "filter",
    "trap": "filter",
    "transformer_magnetizing": "transformer",
    "transformer_leakage": "transformer",
}
# what only one family of device has
_BELONGS_TO = {
    "amplification_factor": "tube",
    "grid_current": "tube",
    "gate_resistance": "fet",
    "input_capacitance": "fet",
    "power_gain": "bipolar",
}


def conflicts(values: dict[str, object]) -> list[str]:
    """Return one line for each pair of given values that can't stand together."""
    found = []
    supply, lowest = values.get("supply"), values.get("minimum_voltage")
    if isinstance(supply, float | int) and isinstance(lowest, float | int) and lowest >= supply > 0:
        found.append(
            f"stage.minimum_voltage: got {exact_text(lowest, 'V')}; allowed below the supply of "
            f"{exact_text(supply, 'V')}"
        )
    found += misfits(values)
    family = values.get("family") or "bipolar"
    for field in JOB_FIELDS:
        owner = _BELONGS_TO.get(field.name)
        if owner is not None and owner != family and values.get(field.name) is not None:
            found.append(f"{field.path}: is of no use for device.family {family}; it belongs to {owner}")
    for field in JOB_FIELDS:
        needed = _BESIDE.get(field.name)
        if needed and values.get(field.name) is not None and values.get(needed) in (None, NONE):
            found.append(f"{field.path}: is of no use without tank.{needed}")
    if values.get("filter") == AUTO and values.get("limit") is None:
        found.append("tank.filter: auto needs limit.rule, since it fits what a limit wants; or give the filter's order")
    if values.get("trap") is not None and values.get("filter_kind") not in (None, "chebyshev-trap"):
        found.append(f"tank.trap: is of no use for a {values['filter_kind']} filter; it belongs to chebyshev-trap")
    if isinstance(values.get("limit"), str):
        try:
            limit_named(str(values["limit"]))
        except InputError as error:
            found += error.problems
    return found


def misfits(values: dict[str, object]) -> list[str]:
    """Return one line for each given value of a network that can't stand with another, or is another network's."""
    found = []
    if values.get("loaded_q") is not None and values.get("input_q") is not None:
        found.append("tank.input_q: got both a loaded Q and an input-side Q; give one of them")
    if values.get("tap") is not None and (values.get("loaded_q"), values.get("input_q")) != (None, None):
        found.append("tank.tap: got both a tap and a Q, which follows from it; give one of them")
    network = values.get("network") or AUTO
    for field in SPECIAL:
        owners = _NETWORKS_OF[field.name]
        if values.get(field.name) is not None and network in NETWORKS and network not in owners:
            found.append(f"{field.path}: is of no use for network {network}; it belongs to {' and '.join(owners)}")
    return found
