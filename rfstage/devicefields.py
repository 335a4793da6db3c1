"""The keys of a job that say what the device and its drive are. Standard library only."""

from __future__ import annotations

from rfstage.fields import Field

FAMILIES = ("bipolar", "fet", "tube")
DEVICE: tuple[Field, ...] = (
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
)
DRIVE: tuple[Field, ...] = (
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
)

# what only one family of device has
_BELONGS_TO = {
    "amplification_factor": "tube",
    "grid_current": "tube",
    "gate_resistance": "fet",
    "input_capacitance": "fet",
    "power_gain": "bipolar",
}


def strangers(values: dict[str, object]) -> list[str]:
    """Return one line for each given value that belongs to another family of device."""
    family = values.get("family") or "bipolar"
    return [
        f"{field.path}: is of no use for device.family {family}; it belongs to {owner}"
        for field in (*DEVICE, *DRIVE)
        if (owner := _BELONGS_TO.get(field.name)) not in (None, family) and values.get(field.name) is not None
    ]
