"""What the meters would read along each suspect, from settled stages; solved once, then read off between.

::

    suspect      a coil, a capacitor, the load, the drive, the supply: one value of the stage
    factor       how far it is off: 1 as the file says; a part that was set is off by the same factor
    column       for one setting and one suspect: dc current, output and, at a dip, where that is, over all factors
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.errors import ConvergenceError, ImpossibleError, InputError
from rfstage.load import SeriesLoad
from rfstage.retuning.fitting import seen_by_device, tuning_parts
from rfstage.retuning.reading import DRIVE, SUPPLY, Reading, as_set
from rfstage.stage import Stage
from rfstage.stagevalues import fitted_value, with_value
from rfstage.steady import settle_many

LOAD = "load.resistance"
ORDERS = 32  # to which currents and powers are good to a part in a thousand, several times finer than meters
WIDEST = 2.5  # times, either way, that a suspect may be off
POINTS = 49
CROWDED = 3.5  # how much closer together the factors of a column are around 1 than at its ends
BETWEEN = 50  # points of `FINE` from one of `LOGS` to the next
DIP_STEPS = np.array([-0.03, -0.015, 0.0, 0.015, 0.03])
DIP_MOVES = 3  # times that a search for a dip is moved on

Array = NDArray[np.float64]


def factor_logs() -> Array:
    """Return the logarithms of the factors of a column: close together around 1."""
    t = np.linspace(-1, 1, POINTS)
    return np.asarray(math.log(WIDEST) * np.sinh(CROWDED * t) / math.sinh(CROWDED), dtype=np.float64)


LOGS = factor_logs()
MIDDLE = POINTS // 2


def _between() -> tuple[Array, Array]:
    """Return logarithms of factors, finely spaced, and what they take from each of `LOGS`: cubics through four."""
    steps = (POINTS - 1) * BETWEEN
    at = np.arange(steps + 1) / BETWEEN
    fine = np.interp(at, np.arange(POINTS), LOGS)
    first = np.clip(at.astype(int) - 1, 0, POINTS - 4)
    shares = np.zeros((fine.size, POINTS))
    for k in range(4):
        others = [first + other for other in range(4) if other != k]
        share = np.prod([(fine - LOGS[o]) / (LOGS[first + k] - LOGS[o]) for o in others], axis=0)
        shares[np.arange(fine.size), first + k] = share
    return fine, shares


FINE, _SHARES = _between()


class Column(NamedTuple):
    """Logarithms of dc current [A], output [W] and place of the dip [F or H] over `LOGS`, shape (3, POINTS).

    NaN where a stage has no output or does not settle; the last row too where no dip is asked.
    """

    logs: Array

    def along(self, row: int) -> Array:
        """Return one row over `FINE`; NaN beyond the stretch around factor 1 in which all is known."""
        known = np.isfinite(self.logs[row])
        first = MIDDLE - int(np.argmin(np.append(known[MIDDLE::-1], False))) + 1
        last = MIDDLE + int(np.argmin(np.append(known[MIDDLE:], False))) - 1
        inside = np.zeros(POINTS, dtype=bool)
        inside[first : last + 1] = True
        curve = _SHARES @ np.where(inside, self.logs[row], 0.0)
        return np.asarray(np.where((_SHARES[:, ~inside] == 0).all(axis=1), curve, math.nan), dtype=np.float64)


def suspects(stage: Stage, readings: Sequence[Reading]) -> tuple[str, ...]:
    """Return the paths of what may be off: parts that are felt, a load that is no file, and what was not read."""
    found = list(tuning_parts(seen_by_device(stage)))
    if isinstance(stage.load, SeriesLoad):
        found.append(LOAD)
    if all(reading.drive is None for reading in readings):
        found.append(DRIVE)
    if all(reading.supply is None for reading in readings):
        found.append(SUPPLY)
    return tuple(found)


@dataclass(frozen=True, slots=True)
class Explored:
    """The columns of one stage as far as they were asked for; each is solved once."""

    stage: Stage
    columns: dict[tuple[Reading, str], Column] = field(default_factory=dict, repr=False)

    def column(self, reading: Reading, suspect: str) -> Column:
        """Return the column of a suspect at the setting of a reading; its meters don't matter."""
        setting = _setting(reading)
        key = (setting, suspect)
        if key not in self.columns:
            self.columns[key] = self._solved(setting, suspect)
        return self.columns[key]

    def settled_at(self, reading: Reading, suspect: str, logs: Array) -> Array:
        """Return what a column has, settled afresh at these logarithms of the factor; shape (3, logs)."""
        setting = _setting(reading)
        stages = self._stages(setting, suspect, logs)
        found = np.full((3, logs.size), math.nan)
        if setting.dip is None:
            found[:2] = meter_logs(stages)
            return found
        dial = logs if suspect == setting.dip else np.zeros(logs.size)
        places = np.interp(logs, FINE, self.column(reading, suspect).along(2)) + dial
        near = {k: float(place) for k, place in enumerate(places) if math.isfinite(place)}
        for k, bottom in _bottoms(stages, setting.dip, near).items():
            found[:, k] = bottom
        found[2] -= dial
        return found

    def _stages(self, setting: Reading, suspect: str, logs: Array) -> list[Stage]:
        base = as_set(self.stage, setting)
        nominal = fitted_value(base, suspect)
        assert nominal is not None
        return [with_value(base, suspect, nominal * math.exp(x)) for x in logs]

    def _solved(self, setting: Reading, suspect: str) -> Column:
        if setting.dip is None:
            return Column(self.settled_at(setting, suspect, LOGS))
        base = as_set(self.stage, setting)
        if suspect != setting.dip:
            return Column(_dips(base, setting.dip, self._stages(setting, suspect, LOGS)))
        bottom = _bottoms([base], suspect, {0: math.log(dip_of(base, suspect))}).get(0, (math.nan,) * 3)
        found = np.tile(np.array(bottom)[:, None], POINTS)
        found[2] -= LOGS  # it is found where it really is, and its dial reads what the file would have it
        return Column(found)


def _setting(reading: Reading) -> Reading:
    """Return what columns of a reading depend on: all but its meters, and but the place where a dip was found."""
    held = tuple(sorted((part, value) for part, value in reading.settings if part != reading.dip))
    return Reading(supply=reading.supply, drive=reading.drive, settings=held, dip=reading.dip)


def meter_logs(stages: Sequence[Stage]) -> Array:
    """Return logarithms of dc current [A] and output [W], shape (2, stages); NaN where there is none."""
    try:
        states = settle_many(stages, orders=ORDERS)
    except (ConvergenceError, ImpossibleError):
        if len(stages) == 1:
            return np.full((2, 1), math.nan)
        half = len(stages) // 2
        return np.hstack([meter_logs(stages[:half]), meter_logs(stages[half:])])
    most = max((s.output_power for s in states), default=0.0)
    figures = [
        (s.dc_current, s.output_power) if s.dc_current > 0 and s.output_power > 1e-6 * most else (math.nan, math.nan)
        for s in states
    ]
    return np.log(np.array(figures, dtype=np.float64).reshape(-1, 2)).T


def _dips(base: Stage, part: str, stages: Sequence[Stage]) -> Array:
    """Return a column at the dips of a part, followed from the stage as it is to both sides while there is one."""
    found = np.full((3, POINTS), math.nan)
    places = {MIDDLE: math.log(dip_of(base, part))}
    while places:
        bottoms = _bottoms(stages, part, places)
        places = {}
        for k, bottom in bottoms.items():
            found[:, k] = bottom
            for step in (1, -1) if k == MIDDLE else (int(math.copysign(1, k - MIDDLE)),):
                if 0 <= k + step < POINTS:
                    before = found[2, k - step]
                    slope = (found[2, k] - before) / (LOGS[k] - LOGS[k - step]) if math.isfinite(before) else 0.0
                    places[k + step] = found[2, k] + slope * (LOGS[k + step] - LOGS[k])
    return found


def _bottoms(stages: Sequence[Stage], part: str, places: dict[int, float]) -> dict[int, tuple[float, float, float]]:
    """Return what `_bottom` finds near each of ``places`` (logarithms), for those where there is a dip."""
    found = {}
    for _ in range(DIP_MOVES):
        tried = [with_value(stages[k], part, math.exp(x + step)) for k, x in places.items() for step in DIP_STEPS]
        logs = meter_logs(tried).reshape(2, -1, DIP_STEPS.size)
        moved = {}
        for row, (k, place) in enumerate(places.items()):
            if not np.isfinite(logs[:, row]).all():
                continue
            lowest = int(np.argmin(logs[0, row]))
            if lowest in (0, DIP_STEPS.size - 1):
                moved[k] = place + 1.5 * DIP_STEPS[lowest]
            else:
                found[k] = _bottom(place + DIP_STEPS, logs[0, row], logs[1, row])
        places = moved
        if not places:
            break
    return found


def _bottom(x: Array, current: Array, power: Array) -> tuple[float, float, float]:
    """Return current and power (logarithms) at the bottom of a fourth-degree curve through five points, and where."""
    middle, scale = x[2], x[4] - x[0]
    u = (x - middle) / scale
    curve = np.polynomial.Polynomial.fit(u, current, 4)
    fine = np.linspace(u[0], u[-1], 801)
    at = float(fine[int(np.argmin(curve(fine)))])
    along = np.polynomial.Polynomial.fit(u, power, 4)
    return float(curve(at)), float(along(at)), float(middle + scale * at)


def dip_of(stage: Stage, part: str) -> float:
    """Return the value of a part [F or H] where the dc current dips, the lowest dip from 0.6 to 1.6 times its value.

    Raises
    ------
    InputError
        If there is none.
    """
    now = fitted_value(stage, part)
    assert now is not None
    values = now * np.geomspace(0.6, 1.6, 41)
    current = meter_logs([with_value(stage, part, float(v)) for v in values])[0]
    dips = [k for k in range(1, values.size - 1) if current[k - 1] >= current[k] < current[k + 1]]
    if not dips:
        raise InputError(
            f"dip={part}: as its file says this stage has no dip of the dc current along {part}; read it at known "
            f"settings of {part} instead ({part}=…)"
        )
    return float(values[min(dips, key=lambda k: current[k])])
