"""The job: what a person asks of a stage, checked as one."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, NamedTuple

from rfstage.errors import InputError
from rfstage.fields import check
from rfstage.jobfields import JOB_FIELDS, REQUIRED, conflicts
from rfstage.quantity import QuantityError

if TYPE_CHECKING:
    from rfstage.load import MeasuredLoad


_SLACK = 1e-9  # relative, of a range's ends


class Variable(NamedTuple):
    """A part that can be set: its name, and the least and most of it [F or H]."""

    name: str
    least: float
    most: float

    def holds(self, value: float) -> bool:
        """Return whether the part can be set to a value [F or H]."""
        return self.least * (1 - _SLACK) <= value <= self.most * (1 + _SLACK)


# with this many fields the usual generated methods cost a start milliseconds: those below go over the fields instead
@dataclass(frozen=True, slots=True, kw_only=True, eq=False, repr=False)
class Job:
    """What is asked, in SI units, the angle in degrees; None where nothing was given.

    The keys, units and ranges are those of `rfstage.jobfields.JOB_FIELDS`. ``load`` is an impedance
    [ohm] or a measured load; an infinite Q is lossless. ``power_gain`` is in dB, ``antenna_gain`` in dBi,
    temperatures in degrees Celsius, ``duty`` in percent. ``variable`` holds the
    parts of the network that can be set, for the loads they match.

    Raises
    ------
    InputError
        With one line for each value that is missing, out of range or at odds with another.

    Examples
    --------
    >>> job = Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8)
    >>> Job(carrier=7.1e6, power=-10.0, conduction_angle=400.0, supply=13.8)
    Traceback (most recent call last):
    rfstage.errors.InputError: stage.power: got -10 W; allowed above 0 W, to 10 MW (is the minus sign meant?)
    stage.conduction_angle: got 400 deg; allowed above 0 deg, to 360 deg
    """

    carrier: float
    power: float
    conduction_angle: float
    supply: float
    minimum_voltage: float | None = None
    harmonics: int | None = None
    family: str | None = None
    output_capacitance: float | None = None
    exponent: float | None = None
    threshold: float | None = None
    transfer_factor: float | None = None
    amplification_factor: float | None = None
    knee_voltage: float | None = None
    knee_resistance: float | None = None
    max_voltage: float | None = None
    max_current: float | None = None
    max_dissipation: float | None = None
    gate_resistance: float | None = None
    input_capacitance: float | None = None
    power_gain: float | None = None
    bias: float | None = None
    amplitude: float | None = None
    grid_current: float | None = None
    load: complex | MeasuredLoad | None = None
    load_file: str | None = None
    antenna_gain: float | None = None
    network: str | None = None
    loaded_q: float | None = None
    input_q: float | None = None
    coil_q: float | None = None
    capacitor_q: float | None = None
    middle_resistance: float | None = None
    coupling: float | None = None
    tap: float | None = None
    link: str | None = None
    filter: str | None = None
    filter_kind: str | None = None
    trap: int | None = None
    transformer: float | None = None
    transformer_magnetizing: float | None = None
    transformer_leakage: float | None = None
    choke: float | None = None
    choke_q: float | None = None
    choke_resistance: float | None = None
    choke_self_capacitance: float | None = None
    choke_max_current: float | None = None
    reservoir: float | None = None
    bleeder: float | None = None
    blocking: float | None = None
    limit: str | None = None
    limit_load: float | None = None
    margin: float | None = None
    ambient: float | None = None
    junction_limit: float | None = None
    junction_to_case: float | None = None
    case_to_sink: float | None = None
    sink_to_ambient: float | None = None
    duty: float | None = None
    former: float | None = None
    wire: float | None = None
    series: str | None = None
    voltage_margin: float | None = None
    current_margin: float | None = None
    lead: float | None = None
    variable: tuple[Variable, ...] = ()

    def __eq__(self, other: object) -> bool:
        """Return whether two jobs ask the same."""
        return self._values() == other._values() if isinstance(other, Job) else NotImplemented

    def __hash__(self) -> int:
        """Return a hash of all that is asked."""
        return hash(self._values())

    def __repr__(self) -> str:
        """Return what is given, and nothing of what is not."""
        given = zip(self.__dataclass_fields__, self._values(), strict=True)
        return f"Job({', '.join(f'{name}={value!r}' for name, value in given if value not in (None, ()))})"

    def _values(self) -> tuple[object, ...]:
        return tuple(getattr(self, name) for name in self.__dataclass_fields__)

    def __post_init__(self) -> None:
        problems = []
        for field in JOB_FIELDS:
            value = getattr(self, field.name)
            if value is None or not isinstance(value, int | float | complex):
                if value is None and field.name in REQUIRED:
                    problems.append(f"{field.path}: missing ({field.help}; option {field.option})")
                elif field.choices and value is not None and value not in field.choices:
                    problems.append(f"{field.path}: got {value!r}; allowed {' | '.join(field.choices)}")
                continue
            try:
                check(field, value)
            except QuantityError as error:
                problems.append(f"{field.path}: {error}")
        problems += conflicts({field.name: getattr(self, field.name) for field in JOB_FIELDS})
        if problems:
            raise InputError(*problems)
