"""The verdict: a measured level with its uncertainty against a limit, by a decision rule that is said.

::

    rule      pass                          fail                       undecided
    --------  ----------------------------  -------------------------  ---------------------
    simple    level at or below the limit   level above it             only a bound, above it
    guarded   upper end at or below it      lower end above it         the limit lies between

The uncertainty is taken at k = 2. Terms of the rules as in JCGM 106: simple acceptance, and guarded acceptance with a
guard band as wide as the uncertainty.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import NamedTuple

from rfstage.verify.levels import Level

PASS, FAIL, UNDECIDED = "pass", "fail", "undecided"
SIMPLE, GUARDED = "simple", "guarded"
DECISIONS = {
    SIMPLE: "simple acceptance: a level at or below the limit passes, whatever its uncertainty",
    GUARDED: "guarded acceptance: a level passes when its uncertainty (k = 2) too lies below the limit, fails when it "
    "lies above with all of it, and is undecided between",
}


class OrderVerdict(NamedTuple):
    """One order: as measured, ``predicted`` and ``limit`` [dBc], ``margin`` [dB], verdict; None where there is none.

    The margin is the limit less the level, or less what the level is below.
    """

    measured: Level
    predicted: float | None
    limit: float | None
    margin: float | None
    verdict: str | None
    source: str


def decide(level: Level, limit: float | None, *, decision: str) -> str | None:
    """Return the verdict on one level [dBc] against a limit [dBc], None where there is no limit.

    Examples
    --------
    >>> near = Level(2, 14.2e6, -43.5, -44.5, -42.5, None, 1.0)
    >>> decide(near, -43.0, decision="simple"), decide(near, -43.0, decision="guarded")
    ('pass', 'undecided')
    """
    if limit is None:
        return None
    if decision == SIMPLE and level.level is not None:
        return PASS if level.level <= limit else FAIL
    if level.high <= limit:
        return PASS
    return FAIL if level.low is not None and level.low > limit else UNDECIDED


def margin_of(level: Level, limit: float | None) -> float | None:
    """Return the limit less the level [dB], or less what the level is below."""
    if limit is None:
        return None
    return limit - (level.high if level.level is None else level.level)


def overall(verdicts: Iterable[str | None]) -> str | None:
    """Return the verdict of several: fail before undecided before pass; None where none was given."""
    given = {v for v in verdicts if v is not None}
    return next((v for v in (FAIL, UNDECIDED, PASS) if v in given), None)
