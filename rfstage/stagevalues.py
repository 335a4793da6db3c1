"""Every number of a stage by its path: what there is, in which unit, what it is now, and the stage with another.

::

    C1, C1.q, C1.lead_inductance, …             a branch: its value, Q, series resistance and strays
    drive.amplitude, supply.choke_q, …          any number under drive, supply or device
    device.reverse_conduction.conductance, …    and of the device's junctions
    carrier, load.resistance, load.reactance    the last two at the carrier, of a load that is no file
    load                                        the load itself, to be led around circles
"""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

from rfstage.errors import InputError
from rfstage.fields import nearest
from rfstage.ladder import Branch
from rfstage.load import SeriesLoad
from rfstage.stage import Stage

LOAD = "load"
_UNITS = {"capacitor": "F", "coil": "H", "resistor": "ohm"}
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


def _branch_units(branch: Branch) -> dict[str, str]:
    """Return what can be set of a branch; a Q and a series resistance stand in each other's place."""
    found = {"": _UNITS[branch.kind]}
    if branch.q is not None:
        found[".q"] = ""
    else:
        found[".series_resistance"] = "ohm"
    found |= {".self_capacitance": "F"} if branch.kind == "coil" else {".lead_inductance": "H"}
    return found


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
    """Return the stage with one value changed; the path is one of `paths`, but not the load itself."""
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
    name, key = (owner, key) if owner else (key, "value")
    return replace(stage, branches=tuple(_changed(b, key, value) if b.name == name else b for b in stage.branches))


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
    name, key = (owner, key) if owner else (key, "value")
    branch = next(b for b in stage.branches if b.name == name)
    return float(getattr(branch, key) or 0.0)


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
