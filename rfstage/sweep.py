"""The steady state along one value of a stage: tuning, drive, supply, load.

::

    C1, L1, …              the value of a branch, or C1.q, C1.lead_inductance, … of it
    drive.amplitude, …     any number under drive, supply or device; carrier
    load.resistance        a resistive load
    load                   circles of standing-wave ratio around the line's resistance, the worst of each

All points share one order number, the largest that three probes along the way need, so that curves are smooth.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np

from rfstage.errors import OutOfRangeError
from rfstage.load import SeriesLoad
from rfstage.stage import Stage
from rfstage.stagevalues import LOAD, unit_of, with_value
from rfstage.steady import SteadyState, settle, settle_many

PHASES = 36  # of each circle of standing-wave ratio
TOGETHER = 64  # orders: up to here a batch from the middle is fastest, beyond it a chain from point to point
CHUNK = 10  # points solved between two reports of progress


class Extreme(NamedTuple):
    """A turning point inside a sweep: where it is, and the figure there (A, W or a ratio)."""

    value: float
    figure: float


@dataclass(frozen=True, slots=True)
class CircleWorst:
    """The worst around one circle of standing-wave ratio, over all phases.

    Dissipation [W] and peak voltage [V] with the phase of the reflection [deg] where they are reached, and the
    least and greatest output [W].
    """

    dissipation: float
    dissipation_phase: float
    peak_voltage: float
    peak_voltage_phase: float
    least_output: float
    greatest_output: float


@dataclass(frozen=True, slots=True)
class Sweep:
    """The steady states along ``values`` of ``path`` in ``unit``.

    For a sweep of the load, ``values`` are standing-wave ratios, ``points`` the states of greatest
    dissipation on each circle, and ``circles`` the worst of each; ``circles`` is empty otherwise.
    """

    stage: Stage
    path: str
    unit: str
    values: tuple[float, ...]
    points: tuple[SteadyState, ...]
    circles: tuple[CircleWorst, ...]
    dip: Extreme | None
    efficiency_peak: Extreme | None
    output_peak: Extreme | None


def sweep(
    stage: Stage, path: str, values: Sequence[float], progress: Callable[[int, int], None] | None = None
) -> Sweep:
    """Solve a stage along one of its values.

    Parameters
    ----------
    stage : Stage
        The stage.
    path : str
        One of `paths`.
    values : sequence of float
        At least two, rising or falling, in the path's unit; standing-wave ratios for ``"load"``.
    progress : callable or None
        Called with the number of points done and of all, now and then.

    Returns
    -------
    Sweep

    Raises
    ------
    InputError
        For a path that is not in the stage.
    OutOfRangeError
        For values the stage can't have.
    ConvergenceError
        If a point does not converge; no part of a sweep is returned.
    """
    unit = unit_of(stage, path)
    steps = np.diff(values)
    if steps.size == 0 or not (np.all(steps > 0) or np.all(steps < 0)):
        raise OutOfRangeError("values", list(values)[:3], "two or more, rising or falling")
    if path == LOAD:
        return _load_circles(stage, values, progress)
    stages = [with_value(stage, path, float(value)) for value in values]
    points = _solve(stages, progress)
    alive = [k for k, p in enumerate(points) if p.has_output]
    places, living = [float(values[k]) for k in alive], [points[k] for k in alive]
    return Sweep(
        stage,
        path,
        unit,
        tuple(float(v) for v in values),
        points,
        (),
        dip=_dip(places, [p.dc_current for p in living]),
        efficiency_peak=_greatest(places, [p.efficiency or 0.0 for p in living]),
        output_peak=_greatest(places, [p.output_power for p in living]),
    )


def _solve(stages: Sequence[Stage], progress: Callable[[int, int], None] | None) -> tuple[SteadyState, ...]:
    """Solve all stages with the orders that the hardest of three probes needs: together, or as a chain."""
    middle = len(stages) // 2
    probe, orders = None, 0
    for k in sorted({middle, len(stages) - 1, 0}, reverse=True):
        probe = settle(stages[k], start=probe)
        orders = max(orders, probe.orders_solved)
    together = CHUNK if orders <= TOGETHER else 1
    points: list[SteadyState] = []
    for first in range(0, len(stages), together):
        points += settle_many(
            stages[first : first + together], orders=orders, start=_predicted(points, together) if points else probe
        )
        if progress is not None:
            progress(len(points), len(stages))
    return tuple(points)


def _predicted(points: Sequence[SteadyState], together: int) -> SteadyState:
    """Return a guess for the next ``together`` points: the last, moved on to their middle as it moved before."""
    if len(points) < 2:
        return points[-1]
    last, before = points[-1].device_voltage, points[-2].device_voltage
    return replace(points[-1], device_voltage=last + (together + 1) / 2 * (last - before))


def _greatest(values: Sequence[float], figures: Sequence[float]) -> Extreme | None:
    """Return the place of the greatest figure; None where it lies at an edge, or nothing has output."""
    k = int(np.argmax(figures)) if figures else 0
    return None if k in (0, max(len(figures) - 1, 0)) else _turning(values, figures, k)


def _dip(values: Sequence[float], currents: Sequence[float]) -> Extreme | None:
    """Return the lowest dip between two rises; far off resonance the current may fall below it again."""
    dips = [k for k in range(1, len(currents) - 1) if currents[k - 1] >= currents[k] < currents[k + 1]]
    if not dips:
        return None
    found = _turning(values, [-i for i in currents], min(dips, key=lambda k: currents[k]))
    return found._replace(figure=-found.figure)


def _turning(values: Sequence[float], figures: Sequence[float], k: int) -> Extreme:
    """Return the top of a parabola through a greatest figure and its neighbours."""
    x, y = np.asarray(values[k - 1 : k + 2], dtype=float), np.asarray(figures[k - 1 : k + 2], dtype=float)
    left, right = (y[1] - y[0]) / (x[1] - x[0]), (y[2] - y[1]) / (x[2] - x[1])
    curvature = (right - left) / (x[2] - x[0])
    if curvature >= 0:
        return Extreme(float(x[1]), float(y[1]))
    slope = left + curvature * (x[1] - x[0])
    shift = -slope / (2 * curvature)
    return Extreme(float(x[1] + shift), float(y[1] + slope * shift + curvature * shift**2))


def mismatched(stage: Stage, ratio: float, phase_deg: float) -> Stage:
    """Return the stage with a load of this standing-wave ratio and reflection phase [deg] on its line.

    The line is the stage's own ``limit_load``, or 50 Ω.
    """
    line = stage.limit_load or 50.0
    reflection = cmath.rect((ratio - 1) / (ratio + 1), math.radians(phase_deg))
    return replace(stage, load=SeriesLoad(line * (1 + reflection) / (1 - reflection), stage.carrier))


def _load_circles(stage: Stage, ratios: Sequence[float], progress: Callable[[int, int], None] | None) -> Sweep:
    if min(ratios) < 1 or max(ratios) > 100:
        raise OutOfRangeError("standing-wave ratio", [min(ratios), max(ratios)], "from 1 to 100")
    phases = [360 * k / PHASES for k in range(PHASES)]
    around = [(ratio, [0.0] if ratio == 1 else phases) for ratio in ratios]
    states = _solve([mismatched(stage, ratio, phase) for ratio, some in around for phase in some], progress)
    points, circles, first = [], [], 0
    for _, some in around:
        circle = states[first : first + len(some)]
        first += len(some)
        hottest = max(range(len(some)), key=lambda k: circle[k].dissipation)
        highest = max(range(len(some)), key=lambda k: circle[k].peak_voltage)
        points.append(circle[hottest])
        circles.append(
            CircleWorst(
                circle[hottest].dissipation,
                some[hottest],
                circle[highest].peak_voltage,
                some[highest],
                min(s.output_power for s in circle),
                max(s.output_power for s in circle),
            )
        )
    return Sweep(stage, LOAD, "", tuple(float(r) for r in ratios), tuple(points), tuple(circles), None, None, None)


@dataclass(frozen=True, slots=True)
class Modulation:
    """What a supply sweep says of collector or anode modulation about one supply voltage [V].

    ``depth`` [-] is what the sweep reaches; ``modulator_load`` [ohm] is supply voltage over direct current;
    ``audio_power`` [W] that of a full sine at this depth; ``nonlinearity`` [-] the largest departure of the output
    voltage from a straight line through zero and the carrier, over the carrier's; peaks in V at the
    envelope's crest, for the device and by branch name; ``mean_dissipation`` [W] over one audio cycle.
    """

    carrier_supply: float
    depth: float
    modulator_load: float
    audio_power: float
    envelope_power: float
    nonlinearity: float
    peak_voltage: float
    branch_peaks: dict[str, float]
    mean_dissipation: float


def modulation(swept: Sweep) -> Modulation | None:
    """Return the modulation that a sweep of ``supply.voltage`` allows; None for other sweeps or no headroom."""
    carrier = swept.stage.supply.voltage
    if swept.path != "supply.voltage" or not min(swept.values) < carrier < max(swept.values):
        return None
    order = np.argsort(swept.values)
    volts = np.asarray(swept.values)[order]
    points = [swept.points[k] for k in order]
    depth = min(1.0, (volts[-1] - carrier) / carrier, (carrier - volts[0]) / carrier)
    middle = settle(swept.stage)
    amplitude = np.sqrt([p.output_power for p in points])
    straight = math.sqrt(middle.output_power) * volts / carrier
    within = np.abs(volts / carrier - 1) <= depth * (1 + 1e-9)
    crest = points[int(np.flatnonzero(within)[-1])]
    phase = np.linspace(0, 2 * math.pi, 96, endpoint=False)
    heat = np.interp(carrier * (1 + depth * np.sin(phase)), volts, [p.dissipation for p in points])
    return Modulation(
        carrier_supply=carrier,
        depth=float(depth),
        modulator_load=carrier / middle.dc_current,
        audio_power=depth**2 * middle.dc_power / 2,
        envelope_power=crest.output_power,
        nonlinearity=float(np.abs(amplitude - straight)[within].max() / math.sqrt(middle.output_power)),
        peak_voltage=crest.peak_voltage,
        branch_peaks={b.name: b.peak_voltage for b in crest.branches},
        mean_dissipation=float(heat.mean()),
    )
