"""Capacitors to buy for a branch: fixed parts or a trimmer beside them, with leads, and what each must stand."""

from __future__ import annotations

from typing import NamedTuple

from rfstage.errors import ImpossibleError, RfstageError
from rfstage.fitting.request import PartsRequest
from rfstage.parts.capacitor import FixedAndTrimmer, TrimmerRange, best_pair, fixed_and_trimmer, nearest_single
from rfstage.parts.leads import nominal_capacitance
from rfstage.parts.preferred import preferred_range
from rfstage.parts.stress import Burden, PartStress, stresses

NEAR_ENOUGH = 2.0  # %: one part serves, where it is so near; else two side by side
# % around the wanted value that a trimmer should reach, for the parts' tolerances; less where no trimmer reaches more
TRIM = (10.0, 7.0, 5.0, 2.0, 1.0)
TIGHT = 5.0  # %, the tolerance of usual parts: where less is left to either side, the fixed ones are to be measured
FIXED, TRIMMED, BLOCKING = "fixed", "trimmed", "blocking"


class Bought(NamedTuple):
    """The capacitors of one branch.

    ``values`` [F] of the fixed parts; ``trimmer`` and its ``setting`` [F], or None; ``total`` [F] of all at this
    setting; ``lead`` [H] in series with the whole; ``wanted`` [F] as the circuit wants it, leads counted;
    ``stresses`` of every part, the trimmer at its most.
    """

    name: str
    role: str
    values: tuple[float, ...]
    trimmer: TrimmerRange | None
    setting: float | None
    total: float
    lead: float
    wanted: float
    stresses: tuple[PartStress, ...]

    @property
    def reach(self) -> tuple[float, float] | None:
        """What the whole can be set to [F]."""
        if self.trimmer is None:
            return None
        return sum(self.values) + self.trimmer.least, sum(self.values) + self.trimmer.most

    @property
    def spare(self) -> float:
        """How far the whole can be set to either side of its setting [%]: nothing without a trimmer."""
        low, high = self.reach or (self.total, self.total)
        return 100 * min(self.total - low, high - self.total) / self.total

    def retrimmed(self, total: float) -> Bought:
        """Return the same with its trimmer set so that all together are ``total`` [F]."""
        return self._replace(setting=total - sum(self.values), total=total)

    def bearing(self, burden: Burden, q: float | None, asked: PartsRequest) -> Bought:
        """Return the same under a burden that was found for these parts as they are set."""
        return self._replace(stresses=_stresses(self.values, self.trimmer, burden, self.total, q, asked))


def choose_capacitor(
    name: str,
    wanted: float,
    role: str,
    burden: Burden,
    q: float | None,
    asked: PartsRequest,
    *,
    total: float | None = None,
) -> Bought:
    """Return the capacitors for a wanted capacitance [F] at the carrier, its leads counted.

    Parameters
    ----------
    name : str
        Of the branch.
    wanted : float
        F.
    role : str
        ``"fixed"``, ``"trimmed"``, or ``"blocking"``, where more does no harm.
    burden : Burden
        What the branch bears.
    q : float or None
        Of the parts [-].
    asked : PartsRequest
        Series, margins, leads.
    total : float or None
        What the parts are to be together [F], leads not counted, where that is known already.

    Raises
    ------
    ImpossibleError
        If no trimmer reaches it.
    """
    values: tuple[float, ...] = ()
    trimmer, setting = None, None
    for count in (1, 2, 3):  # parts side by side share their leads; how many there are is known only afterwards
        nominal = wanted if total is None else total
        if role != BLOCKING and total is None:
            nominal = nominal_capacitance(wanted, frequency=burden.carrier, lead_inductance=asked.lead / count)
        if role == BLOCKING:
            values = (preferred_range(wanted * (1 - 1e-9), 2 * wanted, series="E6")[0],)
        elif role == TRIMMED:
            found = _trimmer(nominal, asked.series)
            values, trimmer, setting = found.fixed, found.trimmer, found.setting
        else:
            values = _fixed(nominal, asked.series)
        if len(values) + (trimmer is not None) <= count:
            break
    parts = len(values) + (trimmer is not None)
    return Bought(
        name=name,
        role=role,
        values=values,
        trimmer=trimmer,
        setting=setting,
        total=sum(values) + (setting or 0.0),
        lead=asked.lead / parts,
        wanted=wanted,
        stresses=_stresses(values, trimmer, burden, nominal, q, asked),
    )


def _stresses(
    values: tuple[float, ...],
    trimmer: TrimmerRange | None,
    burden: Burden,
    holds_for: float,
    q: float | None,
    asked: PartsRequest,
) -> tuple[PartStress, ...]:
    highest = (*values, trimmer.most) if trimmer is not None else values
    return stresses(highest, burden, holds_for=holds_for, q=q, margins=asked.margins, lead_inductance=asked.lead)


def _trimmer(wanted: float, series: str) -> FixedAndTrimmer:
    for percent in TRIM[:-1]:
        try:
            return fixed_and_trimmer(wanted, percent=percent, series=series)
        except ImpossibleError:
            continue
    return fixed_and_trimmer(wanted, percent=TRIM[-1], series=series)


def _fixed(wanted: float, series: str) -> tuple[float, ...]:
    one = nearest_single(wanted, series=series)
    if abs(one.error_percent) <= NEAR_ENOUGH:
        return one.values
    try:
        two = best_pair(wanted, series=series)
    except RfstageError:
        return one.values
    return two.values if abs(two.error_percent) < abs(one.error_percent) else one.values
