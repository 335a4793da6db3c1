"""Which single part, off by how much, explains the readings best; what they can't tell apart; what to read next.

::

    misfit          departures of the readings from the model, in meter errors, as a root mean square
    plausibility    a part off by 10 % is likelier than one off by 200 %: it costs 2·ln(1 + (ln factor/0.3)²)
    group           causes whose cost is within 6 of the group's best: a chance of one in twenty by the meters alone

One fault at a time is looked for. A cause is a value of the stage; a part that was set is off by its dial's factor.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.errors import ImpossibleError, OutOfRangeError
from rfstage.quantity import show
from rfstage.retuning.explaining import APART, TABLE_ERROR, Fit, explain, refined
from rfstage.retuning.explored import Explored, meter_logs, suspects
from rfstage.retuning.reading import Implied, Reading, as_set, check_readings, implied
from rfstage.stage import Stage
from rfstage.stagevalues import fitted_value, unit_of, with_value

METER_ERROR = 0.01  # relative, of each meter: one per cent
EXPLAINED = 3.0  # misfit beyond which no single part explains the readings
USELESS = 1.0  # meter errors: a next reading that differs by less from all of them tells nothing
TOLD_APART = 3.0  # meter errors: a next reading that differs by less between two causes will hardly tell them apart

Array = NDArray[np.float64]


class Cause(NamedTuple):
    """One suspect [F, H, ohm or V] at the value that explains the readings best.

    ``misfit`` [meter errors] is 0 where it explains them exactly; ``cost`` has the plausibility in it; causes of
    one ``group``, from 1, can't be told apart.
    """

    part: str
    unit: str
    nominal: float
    estimated: float
    misfit: float
    cost: float
    group: int


class Next(NamedTuple):
    """The setting to read next, and what each cause of the leading group would show there.

    ``expected`` has cause, dc current [A] and output [W]; ``apart`` is the least difference from the first cause to
    any other, in meter errors.
    """

    setting: Reading
    expected: tuple[tuple[str, float, float], ...]
    apart: float


@dataclass(frozen=True, slots=True)
class Diagnosis:
    """What readings say of a stage, as `causes` returns it.

    ``as_built_misfit`` is that of the stage as its file says; ``implied`` has one entry a reading.
    """

    stage: Stage
    readings: tuple[Reading, ...]
    meter_error: float
    implied: tuple[Implied, ...]
    as_built_misfit: float
    causes: tuple[Cause, ...]
    next_reading: Next | None

    @property
    def leading(self) -> tuple[Cause, ...]:
        """The causes of the first group."""
        return tuple(cause for cause in self.causes if cause.group == 1)

    @property
    def explained(self) -> bool:
        """Whether a single cause explains the readings."""
        return bool(self.causes) and self.causes[0].misfit <= EXPLAINED


def causes(
    stage: Stage, readings: Sequence[Reading], *, meter_error: float = METER_ERROR, explored: Explored | None = None
) -> Diagnosis:
    """Return what explains the readings of a stage, best first.

    Parameters
    ----------
    stage : Stage
        As its file says it is built.
    readings : sequence of Reading
        One or more, each at one setting.
    meter_error : float
        Standard error of a reading, relative [-]; from 0.001, what the model itself is good to, to 0.5.
    explored : Explored or None
        What was solved of this stage before, to be used and added to.

    Returns
    -------
    Diagnosis

    Raises
    ------
    InputError
        If the stage can't have given these readings.
    OutOfRangeError
        If the meter error is out of range.
    ImpossibleError
        If nothing of this stage can be off so that it still gives output at these settings.
    """
    check_readings(stage, readings)
    if not 1e-3 <= meter_error <= 0.5:
        raise OutOfRangeError("meter_error", meter_error, "from 0.001 to 0.5")
    if explored is None:
        explored = Explored(stage)
    fits = [
        fit
        for suspect in suspects(stage, readings)
        for fit in explain(explored, suspect, readings, meter_error)
        if math.isfinite(fit.cost)
    ]
    if not fits:
        raise ImpossibleError(
            "nothing of this stage explains these readings: it gives no output at these settings "
            "(is the drive of the stage file right?)"
        )
    # whose cost may come within the leading group's once the columns' own error is off it
    close = min(fit.cost for fit in fits) + APART + 2 * len(readings) * (TABLE_ERROR / meter_error) ** 2
    fits = [refined(fit, explored, readings, meter_error) if fit.cost <= close else fit for fit in fits]
    fits.sort(key=lambda fit: (fit.cost, fit.suspect))
    found = _grouped(stage, _worth_telling(fits))
    return Diagnosis(
        stage=stage,
        readings=tuple(readings),
        meter_error=meter_error,
        implied=tuple(implied(stage, reading) for reading in readings),
        as_built_misfit=min(fit.as_built for fit in fits),
        causes=found,
        next_reading=_next_reading(stage, readings, found, meter_error),
    )


def _worth_telling(fits: Sequence[Fit]) -> list[Fit]:
    """Return the best value of each suspect, and its others where they are in the leading group."""
    told: list[Fit] = []
    for fit in fits:
        if fit.cost <= fits[0].cost + APART or all(fit.suspect != other.suspect for other in told):
            told.append(fit)
    return told


def _grouped(stage: Stage, fits: Sequence[Fit]) -> tuple[Cause, ...]:
    found: list[Cause] = []
    group, lead = 1, fits[0].cost
    for fit in fits:
        if fit.cost > lead + APART:
            group, lead = group + 1, fit.cost
        nominal = fitted_value(stage, fit.suspect)
        assert nominal is not None
        unit, estimated = unit_of(stage, fit.suspect), nominal * math.exp(fit.log)
        found.append(Cause(fit.suspect, unit, nominal, estimated, fit.misfit, fit.cost, group))
    return tuple(found)


def _next_reading(stage: Stage, readings: Sequence[Reading], found: Sequence[Cause], meter_error: float) -> Next | None:
    """Return the setting at which the first cause shows the greatest least difference from all others of its group.

    Where no setting tells it from all, the one that tells it from most; None where none tells it from any.
    """
    leading = [cause for cause in found if cause.group == 1]
    if len(leading) < 2 or leading[0].misfit > EXPLAINED:
        return None
    settings = _settings_to_offer(stage, readings)
    tried = [
        with_value(as_set(stage, setting), cause.part, _off(stage, setting, cause))
        for setting in settings
        for cause in leading
    ]
    logs = meter_logs(tried).reshape(2, len(settings), len(leading))
    each = np.sqrt((((logs[:, :, 1:] - logs[:, :, :1]) / meter_error) ** 2).sum(axis=0))
    apart = np.where(np.isfinite(each).all(axis=1), each.min(axis=1), -1.0)
    best = int(np.argmax(apart))
    if apart[best] < TOLD_APART:
        best = int(np.argmax(np.where(apart >= 0, np.minimum(each, TOLD_APART).sum(axis=1), -1.0)))
    if apart[best] < 0 or each[best].max() < USELESS:
        return None
    expected = tuple(
        (cause.part, float(np.exp(logs[0, best, k])), float(np.exp(logs[1, best, k])))
        for k, cause in enumerate(leading)
    )
    return Next(settings[best], expected, float(apart[best]))


def _off(stage: Stage, setting: Reading, cause: Cause) -> float:
    """Return what a cause really is at a setting: what it is set to, times its factor."""
    now = fitted_value(as_set(stage, setting), cause.part)
    assert now is not None
    return now * cause.estimated / cause.nominal


def _settings_to_offer(stage: Stage, readings: Sequence[Reading]) -> list[Reading]:
    """Return settings that can be tried: along each trimmer, with less supply, with less drive."""
    last = readings[-1]
    offered: list[Reading] = []
    for name, data in stage.part_data.items():
        if data.trim is None or not any(b.name == name and b.kind in ("coil", "capacitor") for b in stage.branches):
            continue
        now = float(fitted_value(stage, name) or 0.0)
        low, high = max(data.trim[0], 0.75 * now), min(data.trim[1], 1.35 * now)
        offered += [
            Reading(supply=last.supply, drive=last.drive, settings=((name, float(f"{value:.3g}")),))
            for value in np.linspace(low, high, 7)
            if data.trim[0] <= float(f"{value:.3g}") <= data.trim[1]
        ]
    settings = last.settings if last.dip is None else ()
    volts = stage.supply.voltage if last.supply is None else last.supply
    offered.append(Reading(supply=float(f"{0.7 * volts:.2g}"), drive=last.drive, settings=settings))
    if any(reading.drive is not None for reading in readings):
        drive = stage.drive.amplitude if last.drive is None else last.drive
        offered.append(Reading(supply=last.supply, drive=float(f"{0.85 * drive:.2g}"), settings=settings))
    known = {(r.supply, r.drive, tuple(sorted(r.settings))) for r in readings}
    return [o for o in offered if (o.supply, o.drive, tuple(sorted(o.settings))) not in known]


def next_words(diagnosis: Diagnosis) -> str | None:
    """Return in words what to set and read next and what each cause of the leading group would show, or None."""
    found = diagnosis.next_reading
    if found is None:
        return None
    setting, stage = found.setting, diagnosis.stage
    acts = [f"set {part} to {show(value, unit_of(stage, part))}" for part, value in setting.settings]
    last = diagnosis.readings[-1]
    turned = [part for part, _ in last.settings] + ([last.dip] if last.dip else [])
    for part in dict.fromkeys(turned):
        now = fitted_value(stage, part)
        if part not in dict(setting.settings) and now is not None:
            acts.insert(0, f"put {part} back to {show(now, unit_of(stage, part))}")
    if setting.supply is not None and setting.supply != last.supply:
        acts.append(f"lower the supply to {show(setting.supply, 'V', 2)}")
    if setting.drive is not None and setting.drive != last.drive:
        acts.append(f"lower the drive to {show(setting.drive, 'V', 2)} peak")
    names = [_name(diagnosis, cause) for cause in diagnosis.leading]
    shown = "; ".join(
        f"{show(current, 'A')} and {show(power, 'W')} if it is {name}"
        for name, (_, current, power) in zip(names, found.expected, strict=True)
    )
    words = f"{' and '.join(acts)}, then read dc current and output: {shown}"
    _, first_current, first_power = found.expected[0]
    alike = [
        name
        for name, (_, current, power) in zip(names, found.expected, strict=True)
        if math.hypot(math.log(current / first_current), math.log(power / first_power))
        < TOLD_APART * diagnosis.meter_error
    ]
    if len(alike) > 1:
        words += f" (that hardly tells {alike[0]} from {', '.join(alike[1:])})"
    return words


def _name(diagnosis: Diagnosis, cause: Cause) -> str:
    """Return a cause by its part, with its value where the leading group has that part twice."""
    twice = [other.part for other in diagnosis.leading].count(cause.part) > 1
    return f"{cause.part} at {show(cause.estimated, cause.unit)}" if twice else cause.part


def untold_words(diagnosis: Diagnosis) -> str | None:
    """Return in words which causes the readings do not tell apart, or None where one is left."""
    if len(diagnosis.leading) < 2:
        return None
    names = ", ".join(_name(diagnosis, cause) for cause in diagnosis.leading)
    return f"The readings do not tell apart: {names}."
