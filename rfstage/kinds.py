r"""The kinds of branch: where each may stand, and what is said of it in files, results and sweeps.

A coil, capacitor or resistor has one ``value``. Three kinds have more than one, each by a name of its own:

=============== =================== ==============================================================
kind            key                 what it is
=============== =================== ==============================================================
``trap``        inductance          of its coil [H]; ``q`` is the coil's
\               capacitance         of its capacitor [F]
\               capacitor_q         of its capacitor
``coupled``     primary             winding at the device [H]; ``q`` is this winding's. With a ``tap``
\                                   the part of the coil above the tap
\               secondary           winding at the load [H]. With a ``tap`` the part below it
\               coupling            coefficient between the two, above 0 and below 1
\               secondary_q         of the second winding
``transformer`` ratio               turns at the device over turns at the load
\               magnetizing         inductance at the device's side, load side open [H]
\               leakage             inductance at the device's side, load side shorted [H]
\               core_q              Q of the magnetizing inductance at the carrier
=============== =================== ==============================================================

A trap in series is its coil and capacitor in parallel, in shunt the two in series. A coupled pair and a
transformer stand ``through``: device on one side, load on the other, both windings to ground. With
``tap = "load"`` the pair is one coil from the device's node to ground and the load is at the tap; with
``tap = "device"`` the device is at the tap and the load at the top.
"""

from typing import NamedTuple


class Key(NamedTuple):
    """One number of a kind: public name, attribute of a branch, unit, upper end, and whether it must be given.

    All are above 0, but one that need not be given and is no Q may be 0.
    """

    name: str
    attribute: str
    unit: str
    high: float = float("inf")
    needed: bool = True


KEYS: dict[str, tuple[Key, ...]] = {
    "capacitor": (Key("value", "value", "F"),),
    "coil": (Key("value", "value", "H"),),
    "resistor": (Key("value", "value", "ohm"),),
    "trap": (
        Key("inductance", "value", "H"),
        Key("capacitance", "second", "F"),
        Key("capacitor_q", "second_q", "", needed=False),
    ),
    "coupled": (
        Key("primary", "value", "H"),
        Key("secondary", "second", "H"),
        Key("coupling", "coupling", "", 1.0),
        Key("secondary_q", "second_q", "", needed=False),
    ),
    "transformer": (
        Key("ratio", "value", ""),
        Key("magnetizing", "second", "H"),
        Key("leakage", "lead_inductance", "H", needed=False),
        Key("core_q", "second_q", "", needed=False),
    ),
}
BETWEEN = ("series", "shunt")
THROUGH = "through"
PLACES = (*BETWEEN, THROUGH)
TAPS = ("load", "device")


def unit(kind: str) -> str:
    """Return the unit of a kind's first number.

    Examples
    --------
    >>> unit("coil"), unit("transformer")
    ('H', '')
    """
    return KEYS[kind][0].unit


def stands(kind: str, place: str) -> bool:
    """Return whether a kind of branch may stand in a place.

    Examples
    --------
    >>> stands("coupled", "through"), stands("coil", "through")
    (True, False)
    """
    return (place == THROUGH) == (kind in ("coupled", "transformer"))
