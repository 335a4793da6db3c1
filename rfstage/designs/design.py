"""The main job: from what is asked to a stage with its tank, harmonics, ratings and cautions."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from rfstage.cautions import Caution, about_dip, about_low_resistance, about_resonance, safety
from rfstage.designs.settings import Settings, with_defaults
from rfstage.designs.textbook import Circuit, by_the_book, default_loaded_q
from rfstage.device import Device, ReverseConduction, knee_from_lowest_voltage
from rfstage.harmonics import Harmonic, harmonics, terminations, trough_dip
from rfstage.job import Job
from rfstage.ladder import Branch, Ladder
from rfstage.load import MeasuredLoad
from rfstage.matching.networks import Tank, describe
from rfstage.matching.quality import strongest_resonance_below
from rfstage.operating import DriveVoltages, OperatingPoint, Rating, drive_power, drive_voltages, ratings
from rfstage.pulse import operating_class, pulse_coefficients
from rfstage.quantity import show
from rfstage.stage import Asked, Drive, Stage

WAVEFORM_ORDERS = 24  # of the textbook current, for the trough dip
SOFTNESS = 0.02  # of the peak control voltage above threshold: a corner real devices have
# Stand-ins where no data fix the control voltages: threshold [V], and peak above it [V]
STAND_INS = {"bipolar": (0.7, 0.5), "fet": (3.0, 3.0), "tube": (-40.0, 60.0)}


@dataclass(frozen=True, slots=True, kw_only=True)
class Design:
    """A finished design; ``job`` and ``settings`` are what it came from, ``stage`` is what can be built.

    ``coefficients`` are those of the current pulse, from order 0; ``continued`` names the harmonic
    orders at which a measured load had to be continued beyond its table; ``assumed`` holds what was not
    given and taken by default, by key.
    """

    job: Job
    settings: Settings
    designed_to: str
    coefficients: NDArray[np.float64]
    operating_class: str
    point: OperatingPoint
    drive: DriveVoltages
    ratings: tuple[Rating, ...]
    tank: Tank
    harmonics: tuple[Harmonic, ...]
    continued: tuple[int, ...]
    cautions: tuple[Caution, ...]
    stage: Stage
    assumed: dict[str, object]

    @property
    def worst(self) -> Harmonic | None:
        """The harmonic with the least margin, or None without a limit that applies."""
        judged = [h for h in self.harmonics if h.margin is not None]
        return min(judged, key=lambda h: h.margin or 0.0) if judged else None


def design(job: Job, textbook: bool = False) -> Design:
    """Design a stage.

    Parameters
    ----------
    job : Job
        What is asked.
    textbook : bool
        Keep the book's design. The steady state is not in this version, so both give the same.

    Raises
    ------
    RfstageError
        If the job contradicts itself or no circuit does it.

    Examples
    --------
    >>> d = design(Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8))
    >>> round(d.point.load_resistance, 2), d.operating_class, [p.branch.name for p in d.tank.parts]
    (7.53, 'C', ['Lchoke', 'Cblock', 'C1', 'L1', 'C2'])
    """
    settings = with_defaults(job)
    orders = max(WAVEFORM_ORDERS, settings.highest_order)
    coefficients = pulse_coefficients(settings.half_angle, highest_order=orders, exponent=settings.exponent)
    circuit, point = by_the_book(settings, coefficients)
    branches = (*circuit.feed, *circuit.tank)
    ladder = Ladder(branches)
    shown_orders = range(2, settings.highest_order + 1)
    dip = trough_dip(
        ladder,
        settings.load,
        carrier=job.carrier,
        coefficients=coefficients,
        peak_current=point.peak_current,
        swing=point.swing,
    )
    tank = describe(
        settings.request.network,
        circuit.feed,
        circuit.tank,
        load=settings.load,
        carrier=job.carrier,
        current=point.fundamental_current,
        trough_dip=dip,
        terminations=terminations(ladder, settings.load, job.carrier, point.load_resistance, shown_orders),
    )
    drive = _drive(settings, point)
    levels = harmonics(
        ladder,
        load=settings.load,
        line=settings.line,
        carrier=job.carrier,
        coefficients=coefficients,
        peak_current=point.peak_current,
        highest_order=settings.highest_order,
        output_power=job.power,
        limit=settings.limit,
    )
    continued = tuple(
        n
        for n in shown_orders
        if isinstance(settings.load, MeasuredLoad) and not settings.load.reaches(n * job.carrier)
    )
    stage, stand_ins = _stage(settings, circuit, point, drive)
    return Design(
        job=job,
        settings=settings,
        designed_to="textbook",
        coefficients=coefficients,
        operating_class=operating_class(job.conduction_angle),
        point=point,
        drive=drive,
        ratings=tuple(
            ratings(
                point, max_voltage=job.max_voltage, max_current=job.max_current, max_dissipation=job.max_dissipation
            )
        ),
        tank=tank,
        harmonics=levels,
        continued=continued,
        cautions=_cautions(settings, point, tank, levels, ladder, continued),
        stage=stage,
        assumed={**settings.assumed, **_sized(settings, circuit, point), **stand_ins},
    )


def _sized(settings: Settings, circuit: Circuit, point: OperatingPoint) -> dict[str, object]:
    """Return the defaults that follow from the load resistance, by key."""
    job = settings.job
    found: dict[str, object] = {}
    if job.choke is None:
        found["supply.choke"] = circuit.supply.choke
    if job.blocking is None:
        found["tank.blocking"] = float(circuit.blocking.value)
    if settings.request.network == "pi" and job.loaded_q is None and job.input_q is None:
        found["tank.loaded_q"] = default_loaded_q(settings, point.load_resistance)
    return found


def _drive(settings: Settings, point: OperatingPoint) -> DriveVoltages:
    job = settings.job
    bias, amplitude, unbiased = drive_voltages(
        half_angle=settings.half_angle,
        peak_current=point.peak_current,
        exponent=settings.exponent,
        threshold=settings.threshold,
        transfer_factor=job.transfer_factor,
        bias=job.bias,
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


def _stage(
    settings: Settings, circuit: Circuit, point: OperatingPoint, drive: DriveVoltages
) -> tuple[Stage, dict[str, object]]:
    """Return the stage, and the values that stand in for data nobody gave, by key."""
    job = settings.job
    stand_ins: dict[str, object] = {}
    cosine = math.cos(settings.half_angle)
    threshold, above = STAND_INS[settings.family]
    if settings.threshold is not None:
        threshold = settings.threshold
    else:
        stand_ins["device.threshold"] = threshold
    amplitude, bias = drive.amplitude, drive.bias
    if amplitude is None or bias is None:
        amplitude = above / (1 - cosine)
        bias = threshold - amplitude * cosine
    peak_above = amplitude * (1 - cosine)
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
        knee_voltage=_rounded(knee_voltage),
        knee_resistance=_rounded(knee_resistance),
        output_capacitance=settings.output_capacitance,
        reverse_conduction=_reverse(settings.family, point),
        max_voltage=job.max_voltage,
        max_current=job.max_current,
        max_dissipation=job.max_dissipation,
    )
    stage = Stage(
        carrier=job.carrier,
        device=device,
        drive=Drive(bias, amplitude),
        supply=circuit.supply,
        branches=(circuit.blocking, *circuit.tank),
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


def _cautions(
    settings: Settings,
    point: OperatingPoint,
    tank: Tank,
    levels: tuple[Harmonic, ...],
    ladder: Ladder,
    continued: tuple[int, ...],
) -> tuple[Caution, ...]:
    job = settings.job
    found = about_dip(tank.trough_dip or 0.0)
    found += about_low_resistance(point.load_resistance, _input_capacitance(tank), job.carrier)
    found += about_resonance(strongest_resonance_below(ladder.branches, settings.load, job.carrier))
    if continued:
        orders = ", ".join(str(n) for n in continued)
        found.append(
            Caution(
                "load file",
                (
                    f"the measured load does not reach orders {orders}; it was continued from its nearest end as a "
                    "series resistance with a coil or capacitor, so those levels are estimates."
                ),
            )
        )
    if any(h.strays_decide for h in levels):
        orders = ", ".join(str(h.order) for h in levels if h.strays_decide)
        found.append(
            Caution(
                "strays",
                (
                    f"at orders {orders} the level moves by more than 3 dB with {show(5e-9, 'H')} of lead in each "
                    "shunt capacitor: measure, don't trust."
                ),
            )
        )
    highest = max(part.peak_voltage or 0.0 for part in tank.parts)
    return tuple(
        found
        + safety(
            family=settings.family,
            supply=job.supply,
            dc_current=point.dc_current,
            highest_rf=highest,
            power=job.power,
            blocked=True,
            carrier=job.carrier,
        )
    )


def _input_capacitance(tank: Tank) -> float | None:
    """Return the capacitor across the device [F] that a person fits, or None."""
    for part in tank.parts:
        branch: Branch = part.branch
        if branch.name == "C1" and branch.place == "shunt":
            return float(branch.value)
    return None
