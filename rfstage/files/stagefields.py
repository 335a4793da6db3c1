"""The keys of a stage file: unit and range of each, table by table."""

from __future__ import annotations

from rfstage.device import PAIRS
from rfstage.devicefields import FAMILIES
from rfstage.fields import Field
from rfstage.files.tables import STAGE_FORMAT
from rfstage.jobfields import CARRIER
from rfstage.kinds import KEYS, PLACES, TAPS

VERSION = 1
OWN = tuple(dict.fromkeys(key.name for keys in KEYS.values() for key in keys))  # of some kind of branch, not of all
OWN_QS = tuple(name for name in OWN if name.endswith("_q"))

TOP = (
    Field("format", "format", "choice", choices=(STAGE_FORMAT,)),
    Field("version", "version", "count", "", VERSION, VERSION),
    Field("carrier", "carrier", "real", "Hz", CARRIER.low, CARRIER.high),
)
DEVICE = (
    Field("family", "family", "choice", choices=FAMILIES),
    Field("transfer_factor", "transfer_factor", "real", "", 0, 1e9, True),
    Field("exponent", "exponent", "real", "", 1, 3),
    Field("threshold", "threshold", "real", "V", -1e6, 1e6),
    Field("threshold_softness", "threshold_softness", "real", "V", 0, 1e6),
    Field("knee_voltage", "knee_voltage", "real", "V", 0, 1e6, True),
    Field("knee_resistance", "knee_resistance", "real", "ohm", 0, 1e7),
    Field("amplification_factor", "amplification_factor", "real", "", 1, 1e4, True),
    Field("output_capacitance", "output_capacitance", "real", "F", 0, 1e-3),
    Field("max_voltage", "max_voltage", "real", "V", 0, 1e7, True),
    Field("max_current", "max_current", "real", "A", 0, 1e7, True),
    Field("max_dissipation", "max_dissipation", "real", "W", 0, 1e8, True),
)
PAIR = (
    Field("pair", "pair", "choice", choices=PAIRS),
    Field("imbalance", "imbalance", "real", "", 0, 2),
)
JUNCTION = (
    Field("at_zero", "at_zero", "real", "F", 0, 1e-3, True),
    Field("potential", "potential", "real", "V", 0, 1e4, True),
    Field("grading", "grading", "real", "", 0, 0.95, True),
)
REVERSE = (
    Field("conductance", "conductance", "real", "S", 0, 1e6, True),
    Field("threshold", "threshold", "real", "V", 0, 1e4),
    Field("softness", "softness", "real", "V", 0, 1e4, True),
)
DRIVE = (
    Field("bias", "bias", "real", "V", -1e6, 1e6),
    Field("amplitude", "amplitude", "real", "V", 0, 1e6),
)
SUPPLY = (
    Field("voltage", "voltage", "real", "V", 0, 1e6, True),
    Field("choke", "choke", "real", "H", 0, 1e3, True),
    Field("choke_resistance", "choke_resistance", "real", "ohm", 0, 1e6),
    Field("choke_q", "choke_q", "q", "", 1, 1e7),
)
BRANCH = (
    Field("name", "name", "text"),
    Field("place", "place", "choice", choices=PLACES),
    Field("kind", "kind", "choice", choices=tuple(KEYS)),
    Field("q", "q", "q", "", 1, 1e7),
    Field("series_resistance", "series_resistance", "real", "ohm", 0, 1e7),
    Field("lead_inductance", "lead_inductance", "real", "H", 0, 1.0),
    Field("self_capacitance", "self_capacitance", "real", "F", 0, 1e-3),
    Field("tap", "tap", "choice", choices=TAPS),
    Field("tolerance", "tolerance", "real", "%", 0, 100),
    Field("max_voltage", "max_voltage", "real", "V", 0, 1e7, True),
    *(Field(name, name, "q", "", 1, 1e7) for name in OWN_QS),
)
LOAD = (
    Field("impedance", "impedance", "impedance", "ohm", 0, 1e7, True),
    Field("file", "file", "text"),
    Field("resistance", "resistance", "real", "ohm", 0, 1e7, True),
    Field("inductance", "inductance", "real", "H", 0, 1e3),
    Field("capacitance", "capacitance", "real", "F", 0, 1.0, True),
)
ASKED = (
    Field("output_power", "output_power", "real", "W", 0, 1e7, True),
    Field("conduction_angle", "conduction_angle", "real", "deg", 0, 360, True),
    Field("minimum_voltage", "minimum_voltage", "real", "V", 0, 1e6),
)
LIMIT = (Field("rule", "rule", "text"), Field("load", "load", "real", "ohm", 0, 1e7, True))
WINDING = (
    Field("turns", "turns", "real", "", 0, 1e5, True),
    Field("diameter", "diameter", "real", "m", 0, 100, True),
    Field("length", "length", "real", "m", 0, 100, True),
    Field("wire", "wire", "real", "m", 0, 1, True),
    Field("core", "core", "text"),
)
TABLES = ("device", "drive", "supply", "branch", "load", "asked", "limit")
