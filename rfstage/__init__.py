"""rfstage: tuned power stages of radio transmitters, from carrier and power to parts and harmonics.

The names below are loaded when first used, so that ``import rfstage`` costs nothing.
"""

from __future__ import annotations

from importlib import import_module

TYPE_CHECKING = False  # type checkers take this name as true; the typing module itself costs a start
if TYPE_CHECKING:
    from rfstage.designs.carriers import design_carriers
    from rfstage.designs.design import Design, design
    from rfstage.designs.single import SingleNetwork, single_network
    from rfstage.errors import RfstageError
    from rfstage.files.captures import read_measurement
    from rfstage.files.job import load_job, load_jobs
    from rfstage.files.stage import load_stage
    from rfstage.fitting.fitted import fit_parts
    from rfstage.job import Job
    from rfstage.ladder import Branch, Ladder
    from rfstage.load import MeasuredLoad, SeriesLoad
    from rfstage.parts.coil import AirCoil, air_coil
    from rfstage.parts.cores import core_named
    from rfstage.parts.toroid import ToroidCoil, toroid_coil
    from rfstage.pulse import angle_from_ratio, pulse_coefficients
    from rfstage.retuning.carrier import retuned
    from rfstage.retuning.causes import causes
    from rfstage.retuning.reading import Reading
    from rfstage.stage import Stage
    from rfstage.steady import SteadyState, settle

_HOME = {
    "AirCoil": "parts.coil",
    "Branch": "ladder",
    "Design": "designs.design",
    "Job": "job",
    "Ladder": "ladder",
    "MeasuredLoad": "load",
    "Reading": "retuning.reading",
    "RfstageError": "errors",
    "SeriesLoad": "load",
    "SingleNetwork": "designs.single",
    "Stage": "stage",
    "SteadyState": "steady",
    "ToroidCoil": "parts.toroid",
    "air_coil": "parts.coil",
    "angle_from_ratio": "pulse",
    "causes": "retuning.causes",
    "core_named": "parts.cores",
    "design": "designs.design",
    "design_carriers": "designs.carriers",
    "fit_parts": "fitting.fitted",
    "load_job": "files.job",
    "load_jobs": "files.job",
    "load_stage": "files.stage",
    "pulse_coefficients": "pulse",
    "read_measurement": "files.captures",
    "retuned": "retuning.carrier",
    "settle": "steady",
    "single_network": "designs.single",
    "toroid_coil": "parts.toroid",
}
__all__ = [
    "AirCoil",
    "Branch",
    "Design",
    "Job",
    "Ladder",
    "MeasuredLoad",
    "Reading",
    "RfstageError",
    "SeriesLoad",
    "SingleNetwork",
    "Stage",
    "SteadyState",
    "ToroidCoil",
    "air_coil",
    "angle_from_ratio",
    "causes",
    "core_named",
    "design",
    "design_carriers",
    "fit_parts",
    "load_job",
    "load_jobs",
    "load_stage",
    "pulse_coefficients",
    "read_measurement",
    "retuned",
    "settle",
    "single_network",
    "toroid_coil",
]


def __getattr__(name: str) -> object:
    if name not in _HOME:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    value: object = getattr(import_module(f"{__name__}.{_HOME[name]}"), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted({*globals(), *_HOME})
