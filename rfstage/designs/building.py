"""A stage that can be built, from circuit and operating point; and what stands in for data nobody gave."""

from __future__ import annotations

import math
from typing import NamedTuple

from rfstage.designs.settings import Settings
from rfstage.designs.textbook import Circuit
from rfstage.device import Device, ReverseConduction, knee_from_lowest_voltage
from rfstage.drive import DriveVoltages, drive_power, drive_voltages
from rfstage.operating import OperatingPoint
from rfstage.stage import Asked, Drive, Stage

SOFTNESS = 0.02  # of the peak control voltage above threshold: a corner real devices have
# Stand-ins where no data fix the control voltages: threshold [V], and peak above it [V]
STAND_INS = {"bipolar": (0.7, 0.5), "fet": (3.0, 3.0), "tube": (-40.0, 60.0)}


class Built(NamedTuple):
    """Circuit, operating point, drive and stage of one load resistance; ``stand_ins`` by key."""

    circuit: Circuit
    point: OperatingPoint
    drive: DriveVoltages
    stage: Stage
    stand_ins: dict[str, object]


def build(settings: Settings, circuit: Circuit, point: OperatingPoint) -> Built:
    """Return the stage of a circuit and its operating point.

    Raises
    ------
    ImpossibleError
        If the given drive values contradict the angle.
    """
    drive = _drive(settings, point)
    stage, stand_ins = _stage(settings, circuit, point, drive)
    return Built(circuit, point, drive, stage, stand_ins)


def _drive(settings: Settings, point: OperatingPoint) -> DriveVoltages:
    job = settings.job
    bias, amplitude, unbiased = drive_voltages(
        half_angle=settings.half_angle,
        peak_current=point.peak_current,
        exponent=settings.exponent,
        threshold=settings.threshold,
        transfer_factor=job.transfer_factor,
        bias=job.bias,
        amplitude=job.amplitude,
        anode_feedback=_anode_feedback(settings, point),
    )
    power = drive_power(
        settings.family,
        carrier=job.carrier,
        device_rf_power=point.device_rf_power,
        amplitude=amplitude,
        gate_resistance=job.gate_resistance,
        input_capacitance=job.input_capacitance,
        power_gain=None if job.power_gain is None else 10 ** (job.power_gain / 10),
        grid_current=job.grid_current,
    )
    return DriveVoltages(bias, amplitude, unbiased, power)


def _anode_feedback(settings: Settings, point: OperatingPoint) -> tuple[float, float]:
    """Return direct anode voltage and swing over the amplification factor [V]; zeros without one."""
    mu = settings.job.amplification_factor
    return (0.0, 0.0) if mu is None else (point.electrode_voltage_dc / mu, point.swing / mu)


def _stage(
    settings: Settings, circuit: Circuit, point: OperatingPoint, drive: DriveVoltages
) -> tuple[Stage, dict[str, object]]:
    """Return the stage, and the values that stand in for data nobody gave, by key."""
    job = settings.job
    stand_ins: dict[str, object] = {}
    cosine = math.cos(settings.half_angle)
    if abs(cosine) < 1e-15:
        cosine = 0.0  # 180 degrees: no residue of pi in the bias
    peak_share = 2 * math.sin(settings.half_angle / 2) ** 2  # 1 − cos, with its digits at small angles
    threshold, above = STAND_INS[settings.family]
    lifted, opposed = _anode_feedback(settings, point)
    effective = above / peak_share if drive.amplitude is None else drive.amplitude - opposed
    if settings.threshold is not None:
        threshold = settings.threshold
    else:
        if drive.bias is not None:
            threshold = drive.bias + lifted + effective * cosine
        stand_ins["device.threshold"] = threshold
    bias = drive.bias
    if bias is None or (drive.amplitude is None and cosine != 0):
        bias = threshold - lifted - effective * cosine
    peak_above = effective * peak_share
    transfer = job.transfer_factor
    if transfer is None:
        transfer = point.peak_current / peak_above**settings.exponent
        stand_ins["device.transfer_factor"] = transfer
    knee_voltage, knee_resistance = knee_from_lowest_voltage(settings.minimum_voltage, point.peak_current, job.supply)
    device = Device(
        family=settings.family,
        transfer_factor=transfer,
        exponent=settings.exponent,
        threshold=threshold,
        threshold_softness=_rounded(SOFTNESS * peak_above),
        knee_voltage=_rounded(knee_voltage) if job.knee_voltage is None else job.knee_voltage,
        knee_resistance=_rounded(knee_resistance) if job.knee_resistance is None else job.knee_resistance,
        amplification_factor=job.amplification_factor,
        output_capacitance=settings.output_capacitance,
        reverse_conduction=_reverse(settings.family, point),
        max_voltage=job.max_voltage,
        max_current=job.max_current,
        max_dissipation=job.max_dissipation,
    )
    stand_ins["device.threshold_softness"] = device.threshold_softness
    for name in ("knee_voltage", "knee_resistance"):
        if getattr(job, name) is None:
            stand_ins[f"device.{name}"] = getattr(device, name)
    if device.reverse_conduction is not None:
        stand_ins["device.reverse_conduction"] = device.reverse_conduction.conductance
    stage = Stage(
        carrier=job.carrier,
        device=device,
        drive=Drive(bias, effective + opposed),
        supply=circuit.supply,
        branches=(*circuit.coupler, *circuit.tank, *circuit.filter),
        load=settings.load,
        asked=Asked(job.power, job.conduction_angle, settings.minimum_voltage),
        limit_rule=job.limit,
        limit_load=job.limit_load,
    )
    return stage, stand_ins


def _rounded(value: float) -> float:
    """Return four figures of a value that is an estimate anyway, so that the stage file can be read."""
    return float(f"{value:.4g}")


def _reverse(family: str, point: OperatingPoint) -> ReverseConduction | None:
    """Return the junction that conducts when the output swings below zero: a volt more at the peak current."""
    if family == "tube":
        return None
    return ReverseConduction(conductance=_rounded(point.peak_current), threshold=0.7, softness=0.03)
