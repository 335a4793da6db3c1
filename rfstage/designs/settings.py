"""A job with its defaults filled in, and the record of what was assumed.

All defaults are common practice, no source: reactances of a choke ten times what it stands across, of a
blocking capacitor a tenth of the load resistance and of the input capacitor's reactance, loaded Q 10, coil Q 150,
capacitor Q 1000.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TypeVar

from rfstage.errors import InputError
from rfstage.job import Job
from rfstage.ladder import Branch, Ladder
from rfstage.limits import Limit, limit_named
from rfstage.load import Load, MeasuredLoad, SeriesLoad
from rfstage.matching.task import Request
from rfstage.quantity import exact_text
from rfstage.tankfields import AUTO

BIPOLAR_THRESHOLD = 0.7  # V
T = TypeVar("T")


@dataclass(frozen=True, slots=True, kw_only=True)
class Settings:
    """Every value of a job, given or assumed, in SI units; ``assumed`` holds the second kind by key.

    ``filter`` holds the parts of a low-pass filter behind the tank once one is chosen; ``margin`` [dB] is what it
    keeps under the limit.
    """

    job: Job
    family: str
    minimum_voltage: float
    exponent: float
    output_capacitance: float
    threshold: float | None
    load: Load
    load_impedance: complex
    request: Request
    filter: tuple[Branch, ...]
    margin: float
    choke_q: float
    choke_resistance: float
    highest_order: int
    limit: Limit | None
    line: SeriesLoad
    assumed: dict[str, object]

    @property
    def tank_load(self) -> complex:
        """What the tank works into at the carrier [ohm]: the load, through the filter where there is one."""
        if not self.filter:
            return self.load_impedance
        return complex(Ladder(self.filter).impedance(self.job.carrier, self.load_impedance))

    @property
    def half_angle(self) -> float:
        """Half of the conduction angle [rad]."""
        return math.radians(self.job.conduction_angle / 2)


def with_defaults(job: Job) -> Settings:
    """Return the job with its defaults.

    Raises
    ------
    InputError
        If a default contradicts what was given, or the load's table does not reach the carrier.
    """
    assumed: dict[str, object] = {}

    def use(key: str, given: T | None, default: T) -> T:
        if given is not None:
            return given
        assumed[key] = default
        return default

    family = use("device.family", job.family, "bipolar")
    lowest = use(
        "stage.minimum_voltage",
        job.minimum_voltage,
        0.12 * job.supply if family == "tube" else max(0.08 * job.supply, 1.0),
    )
    if lowest >= job.supply:
        raise InputError(
            f"stage.minimum_voltage: the assumed {exact_text(lowest, 'V')} is not below the supply of "
            f"{exact_text(job.supply, 'V')}; give the device's own lowest voltage"
        )
    fifty: complex | MeasuredLoad = 50 + 0j
    load = load_over_frequency(use("load.impedance", job.load, fifty), job.carrier)
    request = Request(
        network=job.network or AUTO,
        coil_q=use("tank.coil_q", job.coil_q, 150.0),
        capacitor_q=use("tank.capacitor_q", job.capacitor_q, 1000.0),
        loaded_q=job.loaded_q,
        input_q=job.input_q,
        middle_resistance=job.middle_resistance,
        coupling=job.coupling,
        tap=job.tap,
        link=job.link,
    )
    return Settings(
        job=job,
        family=family,
        minimum_voltage=lowest,
        exponent=use("device.exponent", job.exponent, 1.0),
        output_capacitance=use("device.output_capacitance", job.output_capacitance, 0.0),
        threshold=use("device.threshold", job.threshold, BIPOLAR_THRESHOLD) if family == "bipolar" else job.threshold,
        load=load,
        load_impedance=complex(load.impedance(job.carrier)),
        request=request,
        filter=(),
        margin=3.0 if job.margin is None else job.margin,
        choke_q=use("supply.choke_q", job.choke_q, 100.0),
        choke_resistance=use("supply.choke_resistance", job.choke_resistance, 0.0),
        highest_order=use("stage.harmonics", job.harmonics, 10),
        limit=limit_named(job.limit) if job.limit else None,
        line=SeriesLoad(complex(use("limit.load", job.limit_load, 50.0)), job.carrier),
        assumed=assumed,
    )


def load_over_frequency(load: complex | MeasuredLoad, carrier: float) -> Load:
    """Return a load [ohm, or measured] as one over frequency, given at the carrier [Hz].

    Raises
    ------
    InputError
        If a measured load does not reach the carrier.
    """
    if not isinstance(load, MeasuredLoad):
        return SeriesLoad(complex(load), carrier)
    if not load.reaches(carrier):
        raise InputError(
            f"load.file: {load.name} reaches from {exact_text(float(load.frequencies[0]), 'Hz')} to "
            f"{exact_text(float(load.frequencies[-1]), 'Hz')}, which does not hold the carrier of "
            f"{exact_text(carrier, 'Hz')}"
        )
    return load
