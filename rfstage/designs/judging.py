"""What a settled stage is held against: ratings, the limit in a resistive line, and what its figures warn of."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

from rfstage.cautions import Caution, about_load_file, about_settled
from rfstage.ladder import Branch
from rfstage.limits import limit_named
from rfstage.load import MeasuredLoad, SeriesLoad
from rfstage.operating import Rating
from rfstage.stage import Stage
from rfstage.steady import SteadyState, settle

SHOWN = 10  # orders on the page of a settled stage
LINE = 50.0  # ohm, where a stage names no other


class Verdict(NamedTuple):
    """One order in the resistive line: level and limit [dBc], margin [dB]; None where there is no figure."""

    order: int
    line_level: float | None
    limit: float | None
    margin: float | None


def in_line(stage: Stage, state: SteadyState, line: SeriesLoad) -> SteadyState:
    """Return the steady state with the stage on a resistive line, which a reactive load would flatter."""
    if stage.load == line:
        return state
    return settle(replace(stage, load=line), start=state)


def judged(state: SteadyState) -> tuple[Verdict, ...]:
    """Return the harmonics of a settled stage against its own limit rule; empty where it has none.

    Raises
    ------
    ConvergenceError
        If the stage does not settle on the line.
    """
    stage = state.stage
    if stage.limit_rule is None or not state.has_output:
        return ()
    needed = limit_named(stage.limit_rule).suppression(stage.carrier, state.output_power)
    line = SeriesLoad(complex(stage.limit_load or LINE), stage.carrier)
    return tuple(
        Verdict(
            h.order,
            h.level,
            None if needed is None else -needed,
            None if needed is None or h.level is None else -needed - h.level,
        )
        for h in in_line(stage, state, line).harmonics
    )


def worst(verdicts: Sequence[Verdict]) -> Verdict | None:
    """Return the order with the least margin, or None where none is judged."""
    return min((v for v in verdicts if v.margin is not None), key=lambda v: v.margin or 0.0, default=None)


def ratings_of(state: SteadyState) -> tuple[Rating, ...]:
    """Return the stage's ratings [V, A, W] against what one device bears in steady state."""
    device = state.stage.device
    heat = max((share.dissipation for share in state.devices), default=state.dissipation)
    held = (
        ("max_voltage", device.max_voltage, state.peak_voltage),
        ("max_current", device.max_current, state.peak_current),
        ("max_dissipation", device.max_dissipation, heat),
    )
    return tuple(Rating(name, limit, value) for name, limit, value in held if limit is not None)


def settled_cautions(state: SteadyState) -> list[Caution]:
    """Return what the steady state says against the stage, a peak beyond the rating first."""
    stage, change = state.stage, state.change_from_half_the_orders
    moved = None if change is None or change.settled else (change.dc_current, change.output_power_db)
    return about_settled(
        supply=stage.supply.voltage,
        peak_voltage=state.peak_voltage,
        rating=stage.device.max_voltage,
        one_way=stage.device.family != "fet" and stage.device.reverse_conduction is None,
        minimum_voltage=state.minimum_voltage,
        moved=moved,
        asked_power=stage.asked.output_power,
        output_power=state.output_power,
    )


def load_file_cautions(stage: Stage) -> list[Caution]:
    """Return what was done where a measured load does not reach the orders shown."""
    load = stage.load
    return about_load_file(load.beyond(stage.carrier, SHOWN) if isinstance(load, MeasuredLoad) else ())


def supply_reaches_load(branches: Sequence[Branch]) -> bool:
    """Return whether the supply reaches the load when the first series capacitor fails as a short."""
    failed = False
    for branch in branches:
        if branch.blocks:
            if failed:
                return False
            failed = True
        elif branch.grounds and branch.kind != "resistor":  # a winding or coil to ground shorts it
            return False
    return True
