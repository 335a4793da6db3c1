"""The tune-up of a stage: what to turn in which order, what the meters show there, and what the wrong way looks like.

::

    dc      ╲          ╱      tuning: turn for the dip of the dc current; the greatest output lies a little beside it
    current  ╲___╱‾‾‾‾        loading: more of it, the dip less deep and the current there higher
             dip
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from rfstage.cautions import Caution
from rfstage.designs.judging import settled_cautions
from rfstage.designs.safety import exposed_when_settled, safety_cautions
from rfstage.errors import ImpossibleError
from rfstage.retuning.fitting import seen_by_device, tuning_parts
from rfstage.stage import Stage
from rfstage.stagevalues import fitted_value, with_value
from rfstage.steady import SteadyState, settle
from rfstage.sweep import Sweep, sweep

REDUCED = 0.5  # of the supply, while nothing is tuned yet (common practice, no source)
AROUND = (0.75, 1.35)  # times a value without a trimmer: what is looked at around it
ASIDE = 0.05  # of the value at the dip: how far off is called the wrong way
LOADED = 0.10  # by which the loading is moved
POINTS, FEWER = 27, 19  # of the sweep at the full supply, and of the others


class Point(NamedTuple):
    """Value of the tuning part [F or H], dc current [A] and output [W]."""

    value: float
    dc_current: float
    output_power: float


class Loading(NamedTuple):
    """The dip with the loading part at another value [F or H]: ``tuned`` is None where there is no dip."""

    value: float
    tuned: Point | None


@dataclass(frozen=True, slots=True)
class Procedure:
    """What a tune-up needs to know, as `procedure` returns it.

    ``tuning`` and ``loading`` name the parts to turn, ``adjustable`` whether the first can be turned, ``loading`` None
    where nothing else can. ``start_supply`` [V] is the reduced supply; ``first_dip`` and ``dip`` are the dips at that
    and at the full supply, None where there is none; ``output_peak`` the greatest output along the tuning part;
    ``below`` and ``above`` are 5 % to either side of the dip. ``loadings`` has the loading part 10 % lower, as it is,
    and 10 % higher.
    """

    stage: Stage
    now: SteadyState
    cautions: tuple[Caution, ...]
    tuning: str
    adjustable: bool
    loading: str | None
    start_supply: float
    first_dip: Point | None
    dip: Point | None
    output_peak: Point | None
    below: Point | None
    above: Point | None
    loadings: tuple[Loading, ...]


def procedure(stage: Stage) -> Procedure:
    """Return what the tune-up of a stage should show.

    Parameters
    ----------
    stage : Stage
        As it is built.

    Returns
    -------
    Procedure

    Raises
    ------
    ImpossibleError
        If no part of the stage tunes it.
    ConvergenceError
        If the stage does not settle along its tuning.

    Examples
    --------
    >>> from rfstage.device import Device
    >>> from rfstage.ladder import Branch
    >>> from rfstage.load import SeriesLoad
    >>> from rfstage.stage import Drive, PartData, Supply
    >>> fet = Device(family="fet", transfer_factor=9.2, exponent=1.0, threshold=3.0, threshold_softness=0.01,
    ...              knee_voltage=0.2, knee_resistance=0.04)
    >>> parts = (Branch("Cblock", "series", "capacitor", 83e-9), Branch("C1", "shunt", "capacitor", 8.7e-9),
    ...          Branch("L1", "series", "coil", 191e-9), Branch("C2", "shunt", "capacitor", 3.5e-9))
    >>> stage = Stage(carrier=7.1e6, device=fet, drive=Drive(bias=2.5, amplitude=1.0), branches=parts,
    ...               supply=Supply(voltage=13.8, choke=1.6e-6), load=SeriesLoad(50 + 0j, 7.1e6),
    ...               part_data={"C1": PartData(trim=(7e-9, 11e-9))})
    >>> steps = procedure(stage)
    >>> steps.tuning, steps.loading, steps.dip.dc_current < steps.above.dc_current
    ('C1', None, True)
    """
    tuning, loading, adjustable = _parts(stage)
    now = settle(stage)
    safe = safety_cautions(stage, dc_current=now.dc_current, exposed=exposed_when_settled(now), power=now.output_power)
    start_supply = float(f"{REDUCED * stage.supply.voltage:.2g}")
    first = _tuned(with_value(stage, "supply.voltage", start_supply), tuning, FEWER)
    full = _tuned(stage, tuning, POINTS)
    dip = _dip(full)
    below = above = None
    if dip is not None:
        below, above = (_at(stage, tuning, dip.value * (1 + share)) for share in (-ASIDE, ASIDE))
    return Procedure(
        stage=stage,
        now=now,
        cautions=(*safe, *settled_cautions(now)),
        tuning=tuning,
        adjustable=adjustable,
        loading=loading,
        start_supply=start_supply,
        first_dip=_dip(first),
        dip=dip,
        output_peak=None if full.output_peak is None else _at(stage, tuning, full.output_peak.value),
        below=below,
        above=above,
        loadings=() if loading is None else _loadings(stage, tuning, loading, dip),
    )


def _parts(stage: Stage) -> tuple[str, str | None, bool]:
    """Return the part to tune with, the one to load with or None, and whether the first can be turned.

    Of what can be turned, the part nearest the device is for tuning and the one nearest the load for loading (common
    practice, no source). Where nothing can be turned it is the first capacitor that tunes, or else the first coil.
    """
    names = tuning_parts(seen_by_device(stage))
    if not names:
        raise ImpossibleError("no coil or capacitor of this stage tunes it: the device feels none of them")
    turned = [n for n in names if (data := stage.part_data.get(n)) is not None and data.trim is not None]
    if turned:
        return turned[0], (turned[-1] if len(turned) > 1 else None), True
    kinds = {b.name: b.kind for b in stage.branches}
    return next((n for n in names if kinds[n] == "capacitor"), names[0]), None, False


def _tuned(stage: Stage, part: str, points: int) -> Sweep:
    """Return the sweep of a part over its trimmer, or around its value."""
    now = float(fitted_value(stage, part) or 0.0)
    low, high = AROUND[0] * now, AROUND[1] * now
    data = stage.part_data.get(part)
    if data is not None and data.trim is not None:
        low, high = max(low, data.trim[0]), min(high, data.trim[1])
    return sweep(stage, part, np.linspace(low, high, points).tolist())


def _dip(swept: Sweep) -> Point | None:
    return None if swept.dip is None else _at(swept.stage, swept.path, swept.dip.value)


def _at(stage: Stage, part: str, value: float) -> Point:
    state = settle(with_value(stage, part, value))
    return Point(value, state.dc_current, state.output_power)


def _loadings(stage: Stage, tuning: str, loading: str, dip: Point | None) -> tuple[Loading, ...]:
    """Return the dip with the loading part a step lower, as it is, where ``dip`` is known, and a step higher."""
    now = float(fitted_value(stage, loading) or 0.0)
    trim = stage.part_data[loading].trim
    assert trim is not None
    found = []
    for share in (-LOADED, 0.0, LOADED):
        value = min(max(now * (1 + share), trim[0]), trim[1])
        if share and value == now:
            continue  # at the end of its trimmer
        tuned = _dip(_tuned(with_value(stage, loading, value), tuning, FEWER)) if share else dip
        found.append(Loading(value, tuned))
    return tuple(found)
