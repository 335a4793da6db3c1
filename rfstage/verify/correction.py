"""From a fitted tank: which part is off, and what setting of which trimmer brings the tank back."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import NamedTuple

import numpy as np

from rfstage.ladder import Branch, Ladder
from rfstage.load import Load
from rfstage.stage import PartData
from rfstage.verify.tankfit import PartEstimate
from rfstage.verify.verdict import FAIL, PASS, SIMPLE, UNDECIDED

USUAL_TOLERANCE = 5.0  # %, where a part states none: common practice, no source
GOOD = 0.02  # reflection against the wanted impedance below which nothing needs to be set
_GRID = 401
_ZOOMS = 4


class PartVerdict(NamedTuple):
    """One part: how far it is ``off`` [%] and the error of that (k = 2), its tolerance [%], verdict.

    ``stated`` tells whether the stage file gives the tolerance; only then is there a verdict.
    """

    name: str
    off: float
    uncertainty: float
    tolerance: float
    stated: bool
    beyond: bool
    verdict: str | None


class Setting(NamedTuple):
    """One part set anew: from the value it has to the value to set [SI].

    ``before`` and ``after``: size of the reflection of the impedance at the device against the wanted one.
    """

    name: str
    kind: str
    found: float
    wanted: float
    before: float
    after: float


def part_verdicts(
    parts: Sequence[PartEstimate], data: Mapping[str, PartData], *, decision: str
) -> tuple[PartVerdict, ...]:
    """Return how far each told part is off its nominal value, against its tolerance by the decision rule.

    A part is ``beyond`` when its distance exceeds the tolerance, or 5 % where none is stated, by more than what
    the fit leaves open.
    """
    found = []
    for part in parts:
        if part.estimated is None or part.standard_error is None:
            continue
        stated = data[part.name].tolerance if part.name in data else None
        tolerance = USUAL_TOLERANCE if stated is None else stated
        off = 100 * (part.estimated / part.nominal - 1)
        wide = 200 * part.standard_error / part.nominal
        beyond = abs(off) - wide > tolerance
        if decision == SIMPLE:
            verdict = PASS if abs(off) <= tolerance else FAIL
        else:
            verdict = PASS if abs(off) + wide <= tolerance else FAIL if beyond else UNDECIDED
        found.append(
            PartVerdict(
                part.name, off, wide, tolerance, stated is not None, beyond, verdict if stated is not None else None
            )
        )
    return tuple(found)


def worst_part(verdicts: Sequence[PartVerdict]) -> PartVerdict | None:
    """Return the part furthest beyond its tolerance, or None where none is."""
    return max(
        (v for v in verdicts if v.beyond), key=lambda v: (abs(v.off) - v.uncertainty) / v.tolerance, default=None
    )


def best_setting(
    fitted: Sequence[Branch],
    *,
    wanted: Sequence[Branch],
    before: Sequence[Branch],
    data: Mapping[str, PartData],
    carrier: float,
    load: Load,
) -> Setting | None:
    """Return the setting of one trimmer that brings the impedance at the device nearest to what it should be.

    Parameters
    ----------
    fitted, wanted : sequence of Branch
        The tank as it is, and as it should be.
    before : sequence of Branch
        What stands between the device and those, the same for both.
    data : mapping
        What is known of the parts by name; those with a ``trim`` range can be set.
    carrier, load : float, Load
        Hz, and what the tank ends in.

    Returns
    -------
    Setting or None
        None where no part can be set, or where nothing needs to be.
    """
    target = complex(Ladder([*before, *wanted]).impedance(carrier, load))

    def reflection(branches: Sequence[Branch]) -> np.ndarray:
        z = np.asarray(Ladder([*before, *branches]).impedance(np.array([carrier]), load))[..., 0]
        return np.abs((z - target) / (z + target.conjugate()))

    now = float(reflection(fitted))
    if now < GOOD:
        return None
    best: Setting | None = None
    for row, branch in enumerate(fitted):
        trim = data[branch.name].trim if branch.name in data else None
        if trim is None:
            continue
        low, high = trim
        for _ in range(_ZOOMS):
            values = np.linspace(low, high, _GRID)
            sizes = reflection([*fitted[:row], _with_values(branch, values), *fitted[row + 1 :]])
            k = int(np.argmin(sizes))
            low, high = float(values[max(k - 1, 0)]), float(values[min(k + 1, _GRID - 1)])
        found = Setting(branch.name, branch.kind, float(branch.value), float(values[k]), now, float(sizes[k]))
        if found.after < now and (best is None or found.after < best.after):
            best = found
    return best


def _with_values(branch: Branch, values: np.ndarray) -> Branch:
    return replace(branch, value=values)
