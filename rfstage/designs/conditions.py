"""The heat of a stage when not all is well: as built, detuned, mismatched, undriven; each from its own steady state.

::

    normal        the stage as it is
    detuned       the part that tunes it 10 % low and 10 % high, the hotter of the two
    mismatched    circles of standing-wave ratio 1 … 3 around the line, the hottest place of all
    undriven      no drive, the bias stays

A heat sink is chosen for the hottest that is to last, and the device's ratings are held against all of them.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import NamedTuple

from rfstage.errors import ConvergenceError
from rfstage.ladder import Branch
from rfstage.quantity import show
from rfstage.stage import BLOCKING, Stage
from rfstage.stagevalues import LOAD, fitted_value, with_value
from rfstage.steady import SteadyState, settle
from rfstage.sweep import sweep

DETUNING = 0.1  # of the tuning part's value, either way
RATIOS = (1.0, 2.0, 3.0)  # standing-wave ratios of the circles


class Condition(NamedTuple):
    """What one condition asks of the device; None where it did not settle, with the reason in ``note``.

    ``dissipation`` [W] of the stage's device or both of a pair, ``device_dissipation`` [W] of the hotter one,
    ``dc_current`` [A] where the dissipation is greatest, ``peak_voltage`` [V] the highest met in the condition, at
    whichever place.
    """

    name: str
    dissipation: float | None
    device_dissipation: float | None
    dc_current: float | None
    peak_voltage: float | None
    note: str


class Conditions(NamedTuple):
    """The four conditions of a stage."""

    normal: Condition
    detuned: Condition
    mismatched: Condition
    undriven: Condition

    @property
    def hottest(self) -> Condition | None:
        """The condition of greatest dissipation, or None where none settled."""
        return max((c for c in self if c.dissipation is not None), key=lambda c: c.dissipation or 0.0, default=None)


def conditions(
    stage: Stage,
    *,
    state: SteadyState | None = None,
    ratios: tuple[float, ...] = RATIOS,
    progress: Callable[[int, int], None] | None = None,
) -> Conditions:
    """Return what a stage dissipates in normal, detuned, mismatched and undriven condition.

    Parameters
    ----------
    stage : Stage
        The stage.
    state : SteadyState or None
        Its steady state, if known already.
    ratios : tuple of float
        Rising standing-wave ratios from 1 to 100, two or more, of the circles walked.
    progress : callable or None
        Called with the number of mismatched points done and of all, now and then.

    Returns
    -------
    Conditions
        A condition that does not settle has None for its numbers, and says so.

    Raises
    ------
    OutOfRangeError, ImpossibleError
        If the stage's values make no circuit, or the ratios are out of range.

    Notes
    -----
    The supply and the bias stay what they are: neither a supply that sags nor a bias made by the drive (a grid leak,
    self-bias) is modelled, and heating changes nothing.

    Examples
    --------
    >>> from rfstage.designs.design import design
    >>> from rfstage.job import Job
    >>> stage = design(Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8, network="pi")).stage
    >>> found = conditions(stage, ratios=(1.0, 3.0))
    >>> round(found.normal.dissipation, 1), found.hottest.name, found.undriven.dissipation
    (2.6, 'mismatched', 0.0)
    """
    if state is None:
        try:
            state = settle(stage)
        except ConvergenceError as error:
            normal = _unsettled("normal", "as built", error)
        else:
            normal = _condition("normal", state, "as built")
    else:
        normal = _condition("normal", state, "as built")
    return Conditions(normal, _detuned(stage, state), _mismatched(stage, ratios, progress), _undriven(stage))


def tuning_part(stage: Stage) -> Branch | None:
    """Return the part that tunes a stage: the first with a setting range, else the first shunt capacitor, else coil.

    The blocking capacitor is none of them; None where there is neither.
    """
    parts = [b for b in stage.branches if b.kind in ("capacitor", "coil") and b.name != BLOCKING]
    with_range = [b for b in parts if b.name in stage.part_data and stage.part_data[b.name].trim is not None]
    shunt = [b for b in parts if b.kind == "capacitor" and b.place == "shunt"]
    coils = [b for b in parts if b.kind == "coil"]
    return next(iter((*with_range, *shunt, *coils)), None)


def _detuned(stage: Stage, normal: SteadyState | None) -> Condition:
    part = tuning_part(stage)
    value = None if part is None else fitted_value(stage, part.name)
    if part is None or value is None:
        return Condition("detuned", None, None, None, None, "nothing to detune: the stage has no tuned part")
    sides = []
    for factor, words in ((1 - DETUNING, "low"), (1 + DETUNING, "high")):
        where = f"{part.name} {100 * DETUNING:g} % {words}"
        try:
            sides.append((settle(with_value(stage, part.name, factor * value), start=normal), where))
        except ConvergenceError as error:
            return _unsettled("detuned", where, error)
    hottest, where = max(sides, key=lambda side: side[0].dissipation)
    found = _condition("detuned", hottest, where)
    return found._replace(peak_voltage=max(side.peak_voltage for side, _ in sides))


def _mismatched(stage: Stage, ratios: tuple[float, ...], progress: Callable[[int, int], None] | None) -> Condition:
    try:
        swept = sweep(stage, LOAD, ratios, progress)
    except ConvergenceError as error:
        return _unsettled("mismatched", f"standing-wave ratios to {ratios[-1]:g}", error)
    k = max(range(len(ratios)), key=lambda k: swept.circles[k].dissipation)
    circle = swept.circles[k]
    where = "the matched load is the hottest"
    if ratios[k] > 1:
        where = f"hottest at a standing-wave ratio of {ratios[k]:g}, reflection at {circle.dissipation_phase:g}°"
    found = _condition("mismatched", swept.points[k], where)
    return found._replace(peak_voltage=max(circle.peak_voltage for circle in swept.circles))


def _undriven(stage: Stage) -> Condition:
    try:
        state = settle(replace(stage, drive=replace(stage.drive, amplitude=0.0)))
    except ConvergenceError as error:
        return _unsettled("undriven", "no drive", error)
    resting = f"rests at {show(state.dc_current, 'A')}" if state.dc_current > 0 else "draws no current"
    return _condition("undriven", state, f"{resting} at its bias of {show(stage.drive.bias, 'V')}")


def _condition(name: str, state: SteadyState, note: str) -> Condition:
    change = state.change_from_half_the_orders
    if change is not None and not change.settled:
        note += f"; the figures still moved at {state.orders_solved} orders"
    hotter = max((share.dissipation for share in state.devices), default=state.dissipation)
    return Condition(name, state.dissipation, hotter, state.dc_current, state.peak_voltage, note)


def _unsettled(name: str, where: str, error: ConvergenceError) -> Condition:
    return Condition(name, None, None, None, None, f"{where}: no steady state was found ({error})")
