"""The ladders of many stages over all orders: one walk where the stages are of one build, else one walk each.

::

    sweep of one part, of the drive, of the load ──► same branches, other values ──► one ladder with arrays for values
    stages that have nothing in common           ──► one ladder a stage

There is no evaluator here: `Ladder.walk` gives everything, and this room only lines up what it is given.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.devicelaw import Array
from rfstage.errors import ImpossibleError
from rfstage.ladder import SAMPLED, Branch, BranchState, Ladder
from rfstage.load import Load
from rfstage.stage import Stage

Complex = NDArray[np.complex128]

_TRAITS = ("name", "place", "kind", "q_frequency", "origin", "tap")


class Network(NamedTuple):
    """Stages of one build: what 1 A peak from the device does at orders 1 … N, with a stage axis S in front.

    ``frequencies`` [Hz] (N,); ``impedance`` at the device [ohm] (S, N); ``gain`` load power over squared peak
    current [ohm] (S, N); ``currents`` [A/A] (B, S, N) and ``losses`` [W/A²] (B, S, N) of the B ``branches``, and
    what each of them has ``seen`` [ohm] (S, N) if it is a through branch, else None.
    """

    frequencies: Array
    impedance: Complex
    gain: Array
    branches: tuple[Branch, ...]
    currents: Complex
    losses: Array
    seen: tuple[Complex | None, ...]

    @classmethod
    def of(cls, stages: Sequence[Stage], branches: Sequence[Branch], orders: int) -> Network:
        """Walk the ladder that stands for all the stages, which have one carrier.

        Raises
        ------
        ImpossibleError
            If an impedance is not finite.
        """
        first = stages[0]
        frequencies = first.carrier * np.arange(1.0, orders + 1)
        load: Load | Complex = first.load
        if any(stage.load != load for stage in stages):
            load = np.array([stage.load.impedance(frequencies) for stage in stages])
        with np.errstate(divide="ignore", invalid="ignore"):
            walk = Ladder(branches).walk(frequencies, load)
        shape = (len(stages), orders)
        z = np.broadcast_to(walk.impedance, shape)
        usable = np.isfinite(z) & (np.arange(orders) + abs(z) > 0)
        if not usable.all():
            raise ImpossibleError(
                f"the ladder has no finite impedance at order {int(np.argmin(usable.all(axis=0))) + 1} of the carrier "
                "(is a lossless trap tuned exactly there? give its parts a Q)"
            )
        squared = (walk.transimpedance * np.conj(walk.transimpedance)).real
        gain = np.broadcast_to(squared / 2 * (1 / walk.load_impedance).real, shape)
        currents = np.array([np.broadcast_to(state.current, shape) for state in walk.branches])
        losses = np.array([np.broadcast_to(state.loss, shape) for state in walk.branches])
        seen = tuple(None if s.seen is None else np.broadcast_to(s.seen, shape) for s in walk.branches)
        return cls(frequencies, z, gain, tuple(branches), currents, losses, seen)

    def first(self, orders: int) -> Network:
        """Return the first orders only."""
        if orders == self.frequencies.size:
            return self
        return Network(
            self.frequencies[:orders],
            self.impedance[:, :orders],
            self.gain[:, :orders],
            self.branches,
            self.currents[:, :, :orders],
            self.losses[:, :, :orders],
            tuple(None if seen is None else seen[:, :orders] for seen in self.seen),
        )

    def branch_impedances(self) -> Complex:
        """Return the impedance [ohm] of every branch, of a through branch that at its device's side, (B, S, N)."""
        shape = self.impedance.shape
        drops = [
            BranchState(current, loss, seen).drop(branch, self.frequencies)
            for branch, current, loss, seen in zip(self.branches, self.currents, self.losses, self.seen, strict=True)
        ]
        return np.array([np.broadcast_to(drop, shape) for drop in drops])


def network(stage: Stage, orders: int) -> Network:
    """Return the network of one stage."""
    return Network.of([stage], stage.ladder.branches, orders)


def networks(stages: Sequence[Stage], orders: int) -> list[tuple[Network, list[int]]]:
    """Return the networks of the stages, each with the rows it holds, in order."""
    merged = None
    if all(stage.carrier == stages[0].carrier for stage in stages):
        merged = _merged([stage.ladder.branches for stage in stages])
    if merged is None:
        return [(network(stage, orders), [row]) for row, stage in enumerate(stages)]
    return [(Network.of(stages, merged, orders), list(range(len(stages))))]


def _merged(ladders: Sequence[Sequence[Branch]]) -> tuple[Branch, ...] | None:
    """Return one ladder whose differing values are arrays over the stages, or None for unlike ladders."""
    first = ladders[0]
    if len(ladders) == 1:
        return tuple(first)
    if any(len(ladder) != len(first) for ladder in ladders):
        return None
    merged = []
    for place, branch in enumerate(first):
        same = [ladder[place] for ladder in ladders]
        if any(getattr(other, trait) != getattr(branch, trait) for trait in _TRAITS for other in same):
            return None
        changed: dict[str, Any] = {}
        for name in SAMPLED:
            values = [getattr(other, name) for other in same]
            if any(value != values[0] for value in values):
                if None in values:
                    return None
                changed[name] = np.array(values, dtype=np.float64)
        merged.append(replace(branch, **changed) if changed else branch)
    return tuple(merged)
