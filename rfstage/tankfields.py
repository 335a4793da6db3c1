"""The keys of a job that say what the tank and its filter are. Standard library only."""

from __future__ import annotations

from rfstage.fields import Field

NETWORKS = ("l", "l-high-pass", "pi", "pi-l", "t", "tapped-coil", "link", "capacitive-divider")
AUTO = "auto"
NONE = "none"
LINKS = ("tuned", "untuned")
FILTER_KINDS = ("butterworth", "chebyshev", "elliptic", "chebyshev-trap")
FILTER_ORDERS = range(2, 12)

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
        "wide-band transformer before the network: 4 for 1:4 turns from device to network [no transformer]",
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

# what only some networks have
_NETWORKS_OF = {
    "middle_resistance": ("pi-l",),
    "coupling": ("tapped-coil", "link"),
    "tap": ("tapped-coil",),
    "link": ("link",),
}
# what is of use only beside something else
_BESIDE = {
    "filter_kind": "filter",
    "trap": "filter",
    "transformer_magnetizing": "transformer",
    "transformer_leakage": "transformer",
}


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


def lonely(values: dict[str, object]) -> list[str]:
    """Return one line for each given value that is of no use without another one."""
    found = [
        f"{field.path}: is of no use without tank.{needed}"
        for field in (*FILTERS, *TRANSFORMER)
        if (needed := _BESIDE.get(field.name))
        and values.get(field.name) is not None
        and values.get(needed) in (None, NONE)
    ]
    if values.get("filter") == AUTO and values.get("limit") is None:
        found.append("tank.filter: auto needs limit.rule, since it fits what a limit wants; or give the filter's order")
    order, kind = values.get("filter"), values.get("filter_kind")
    if isinstance(order, str) and order.isdigit() and int(order) % 2 == 0 and kind not in (None, "butterworth"):
        found.append(f"tank.filter: got order {order} for a {kind} filter; of even orders only butterworth fits a line")
    if values.get("trap") is not None and values.get("filter_kind") not in (None, "chebyshev-trap"):
        found.append(f"tank.trap: is of no use for a {values['filter_kind']} filter; it belongs to chebyshev-trap")
    return found
