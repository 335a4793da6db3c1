"""Every number of a stage by its path: what there is, in which unit, what it is now, and the stage with another.

::

    C1, C1.q, C1.lead_inductance, …             a branch: its value, Q, series resistance and strays
    F1.capacitance, T1.ratio, L1.coupling, …    a branch of more than one number; its name alone is the first
    drive.amplitude, supply.choke_q, …          any number under drive, supply or device
    device.reverse_conduction.conductance, …    and of the device's junctions
    carrier, load.resistance, load.reactance    the last two at the carrier, of a load that is no file
    load                                        the load itself, to be led around circles
"""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

from rfstage.errors import InputError, OutOfRangeError
from rfstage.fields import nearest
from rfstage.kinds import KEYS, Key
from rfstage.ladder import Branch
from rfstage.load import SeriesLoad
from rfstage.quantity import show
from rfstage.stage import Stage

LOAD = "load"
LOSSES_AND_STRAYS = {"q": "", "series_resistance": "ohm", "lead_inductance": "H", "self_capacitance": "F"}
_BESIDE = {
    "capacitor": ("q", "series_resistance", "lead_inductance"),
    "coil": ("q", "series_resistance", "self_capacitance"),
    "resistor": ("series_resistance", "lead_inductance"),
    "trap": ("q",),
    "coupled": ("q",),
    "transformer": ("series_resistance",),
}
_PART_UNITS: dict[str, dict[str, str]] = {
    "drive": {"bias": "V", "amplitude": "V"},
    "supply": {"voltage": "V", "choke": "H", "choke_resistance": "ohm", "choke_q": ""},
    "device": {
        "transfer_factor": "",
        "exponent": "",
        "threshold": "V",
        "threshold_softness": "V",
        "knee_voltage": "V",
        "knee_resistance": "ohm",
        "amplification_factor": "",
        "imbalance": "",
        "output_capacitance": "F",
    },
    "device.junction_capacitance": {"at_zero": "F", "potential": "V", "grading": ""},
    "device.reverse_conduction": {"conductance": "S", "threshold": "V", "softness": "V"},
}


def paths(stage: Stage) -> dict[str, str]:
    """Return every path of a stage, with its unit."""
    found = {"carrier": "Hz", LOAD: ""}
    if isinstance(stage.load, SeriesLoad):
        found |= {"load.resistance": "ohm", "load.reactance": "ohm"}
    for branch in stage.branches:
        found |= {f"{branch.name}{key}": unit for key, unit in _branch_units(branch).items()}
    for part, units in _PART_UNITS.items():
        owner = _get(stage, part)
        if owner is not None:
            found |= {f"{part}.{key}": unit for key, unit in units.items() if getattr(owner, key) is not None}
    if stage.device.pair is None:
        del found["device.imbalance"]
    return found


def losses_and_strays(kind: str, place: str) -> tuple[str, ...]:
    """Return which of `LOSSES_AND_STRAYS` a kind of branch has beside its own keys.

    Examples
    --------
    >>> losses_and_strays("coil", "series"), losses_and_strays("trap", "shunt")
    (('q', 'series_resistance', 'self_capacitance'), ('q', 'series_resistance', 'lead_inductance'))
    """
    both = kind == "trap" and place == "shunt"  # in series its two arms part, and there is no lead to both
    return (*_BESIDE[kind], "series_resistance", "lead_inductance") if both else _BESIDE[kind]


def has_one_value(kind: str) -> bool:
    """Return whether a kind of branch is told by one value.

    Examples
    --------
    >>> has_one_value("coil"), has_one_value("trap")
    (True, False)
    """
    return KEYS[kind][0].name == "value"


def described(branch: Branch, digits: int = 3) -> tuple[str, ...]:
    """Return a branch's numbers in words, without its losses and strays.

    Examples
    --------
    >>> described(Branch("F1", "series", "trap", 120e-9, second=33e-12))
    ('120 nH', '33.0 pF', 'resonant at 80.0 MHz')
    >>> described(Branch("L1", "through", "coupled", 4e-6, second=1e-6, coupling=0.3))
    ('4.00 µH : 1.00 µH', 'k 0.300')
    >>> described(Branch("L1", "through", "coupled", 4e-6, second=1e-6, coupling=0.3, tap="load"))
    ('4.00 µH above the tap', '1.00 µH below', 'k 0.300', 'tap at 33.3 % of the turns, load there')
    >>> described(Branch("T1", "through", "transformer", 0.25, second=1e-6, lead_inductance=2e-8))
    ('1 : 4', 'magnetizing 1.00 µH', 'leakage 20.0 nH')
    """
    value, second = float(branch.value), float(branch.second)
    if has_one_value(branch.kind):
        return (show(value, KEYS[branch.kind][0].unit, digits),)
    if branch.kind == "trap":
        around = value + (float(branch.lead_inductance) if branch.place == "shunt" else 0.0)
        resonance = 1 / (2 * math.pi * math.sqrt(around * second))
        return show(value, "H", digits), show(second, "F", digits), f"resonant at {show(resonance, 'Hz', digits)}"
    if branch.kind == "transformer":
        ratio = f"{value:.4g} : 1" if value >= 1 else f"1 : {1 / value:.4g}"
        leakage = float(branch.lead_inductance)
        leak = f"leakage {show(leakage, 'H', digits)}" if leakage else "no leakage"
        return ratio, f"magnetizing {show(second, 'H', digits)}", leak
    near, far, coupling = (
        show(value, "H", digits),
        show(second, "H", digits),
        f"k {show(float(branch.coupling), '', digits)}",
    )
    if not branch.tap:
        return f"{near} : {far}", coupling
    turns = 100 * math.sqrt(second) / (math.sqrt(value) + math.sqrt(second))  # of one winding: turns as roots
    return f"{near} above the tap", f"{far} below", coupling, f"tap at {turns:.3g} % of the turns, {branch.tap} there"


def losses_described(branch: Branch, digits: int = 6) -> tuple[str, ...]:
    """Return a branch's losses in words: its own, then those of a trap's capacitor, a second winding or a core.

    Examples
    --------
    >>> losses_described(Branch("F1", "series", "trap", 120e-9, q=150.0, second=33e-12))
    ('Q 150', 'capacitor lossless')
    """
    own = "lossless" if branch.q is None else f"Q {float(branch.q):.{digits}g}"
    if branch.series_resistance is not None:
        own = f"series resistance {show(float(branch.series_resistance), 'ohm', digits)}"
    keys = [key for key in KEYS[branch.kind] if key.attribute == "second_q"]
    label = "below the tap" if branch.tap else keys[0].name.removesuffix("_q") if keys else ""
    far = "lossless" if branch.second_q is None else f"Q {float(branch.second_q):.{digits}g}"
    return (own, f"{label} {far}") if label else (own,)


def _branch_units(branch: Branch) -> dict[str, str]:
    """Return what can be set of a branch; a Q and a series resistance stand in each other's place."""
    keys = KEYS[branch.kind]
    found = {"": keys[0].unit}
    if not has_one_value(branch.kind):
        found |= {f".{key.name}": key.unit for key in keys if getattr(branch, key.attribute) is not None}
    other = "q" if branch.q is None else "series_resistance"
    beside = losses_and_strays(branch.kind, branch.place)
    return found | {f".{key}": LOSSES_AND_STRAYS[key] for key in beside if key != other}


def _own_key(branch: Branch, key: str) -> Key | None:
    """Return the key of the branch's kind by this name, the first one for no name."""
    keys = KEYS[branch.kind]
    return keys[0] if not key else next((own for own in keys if own.name == key), None)


def unit_of(stage: Stage, path: str) -> str:
    """Return the unit of a path.

    Raises
    ------
    InputError
        If the stage has no such value, with the nearest names.
    """
    known = paths(stage)
    if path not in known:
        raise InputError(f"--of: {path!r} is nothing in this stage{nearest(path, known)}; it has {', '.join(known)}")
    return known[path]


def with_value(stage: Stage, path: str, value: float) -> Stage:
    """Return the stage with one value changed; the path is one of `paths`, but not the load itself.

    Raises
    ------
    OutOfRangeError
        For a coupling of 1 or more.
    """
    if path == "carrier":
        # the choke stays the coil it is: its resistance goes as the root of the frequency, its reactance as that
        q = stage.supply.choke_q
        supply = stage.supply if q is None else replace(stage.supply, choke_q=q * math.sqrt(value / stage.carrier))
        return replace(stage, carrier=value, supply=supply)
    owner, _, key = path.rpartition(".")
    if owner == LOAD:
        z = complex(stage.load.impedance(stage.carrier))
        z = complex(value, z.imag) if key == "resistance" else complex(z.real, value)
        return replace(stage, load=SeriesLoad(z, stage.carrier))
    if owner in _PART_UNITS:
        return _put(stage, owner, _changed(_get(stage, owner), key, value))
    name, key = (owner, key) if owner else (key, "")
    return replace(stage, branches=tuple(_with(b, key, value) if b.name == name else b for b in stage.branches))


def _with(branch: Branch, key: str, value: float) -> Branch:
    own = _own_key(branch, key)
    if own is not None and value >= own.high:
        raise OutOfRangeError(f"{branch.name}.{own.name}", value, f"above 0 and below {own.high:g}")
    made: Branch = _changed(branch, key if own is None else own.attribute, value)
    return made


def fitted_value(stage: Stage, path: str) -> float | None:
    """Return the value that the stage has now, 0 where none is given, or None for the load itself."""
    if path == "carrier":
        return stage.carrier
    owner, _, key = path.rpartition(".")
    if LOAD in (owner, path):
        z = complex(stage.load.impedance(stage.carrier))
        return {"resistance": z.real, "reactance": z.imag}.get(key) if owner else None
    if owner in _PART_UNITS:
        return float(getattr(_get(stage, owner), key))
    name, key = (owner, key) if owner else (key, "")
    branch = next(b for b in stage.branches if b.name == name)
    own = _own_key(branch, key)
    return float(getattr(branch, key if own is None else own.attribute) or 0.0)


def _get(stage: Stage, part: str) -> Any:
    found: Any = stage
    for name in part.split("."):
        found = getattr(found, name)
    return found


def _put(stage: Stage, part: str, new: Any) -> Stage:
    head, _, inner = part.partition(".")
    if inner:
        new = _changed(getattr(stage, head), inner, new)
    changed: Stage = _changed(stage, head, new)
    return changed


def _changed(thing: Any, key: str, value: Any) -> Any:
    return replace(thing, **{key: value})
