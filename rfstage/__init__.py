"""rfstage: tuned power stages of radio transmitters, from carrier and power to parts and harmonics.

The names below are loaded when first used, so that ``import rfstage`` costs nothing.
"""

from __future__ import annotations

from importlib import import_module

TYPE_CHECKING = False  # type checkers take this name as true; the typing module itself costs a start
if TYPE_CHECKING:
    from rfstage.designs.design import Design, design
    from rfstage.designs.single import SingleNetwork, single_network
    from rfstage.errors import RfstageError
    from rfstage.files.job import load_job
    from rfstage.files.stage import load_stage
    from rfstage.job import Job
    from rfstage.ladder import Branch, Ladder
    from rfstage.load import MeasuredLoad, SeriesLoad
    from rfstage.pulse import angle_from_ratio, pulse_coefficients
    from rfstage.stage import Stage
    from rfstage.steady import SteadyState, settle

_HOME = {
    "Branch": "ladder",
    "Design": "designs.design",
    "Job": "job",
    "Ladder": "ladder",
    "MeasuredLoad": "load",
    "RfstageError": "errors",
    "SeriesLoad": "load",
    "SingleNetwork": "designs.single",
    "Stage": "stage",
    "SteadyState": "steady",
    "angle_from_ratio": "pulse",
    "design": "designs.design",
    "load_job": "files.job",
    "load_stage": "files.stage",
    "pulse_coefficients": "pulse",
    "settle": "steady",
    "single_network": "designs.single",
}
__all__ = [
    "Branch",
    "Design",
    "Job",
    "Ladder",
    "MeasuredLoad",
    "RfstageError",
    "SeriesLoad",
    "SingleNetwork",
    "Stage",
    "SteadyState",
    "angle_from_ratio",
    "design",
    "load_job",
    "load_stage",
    "pulse_coefficients",
    "settle",
    "single_network",
]


def __getattr__(name: str) -> object:
    if name not in _HOME:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    value: object = getattr(import_module(f"{__name__}.{_HOME[name]}"), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted({*globals(), *_HOME})
