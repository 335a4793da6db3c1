r"""Capacitors to buy for a wanted value: preferred values, alone, in parallel, or with a trimmer.

::

    one part          ──┤├──             the nearest preferred value
    a parallel pair   ─┬─┤├─┬─           the nearest sum of two
                       └─┤├─┘
    fixed + trimmer   ─┬─┤├─┬─           the trimmer reaches the wanted value and so many percent around it
                       └─┤├─┘ ╱

What they must stand is in `rfstage.parts.stress`, what their leads make of them in `rfstage.parts.leads`.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

from rfstage.errors import ImpossibleError, OutOfRangeError
from rfstage.parts.preferred import nearest_preferred, neighbours, preferred_range
from rfstage.parts.ranges import need
from rfstage.quantity import show

SMALLEST = 1e-12  # F: below it a part is less than the strays around it (common practice, no source)
SMALLEST_SHARE = 0.01  # of the wanted value: less is lost in the other part's tolerance (common practice, no source)
ROUNDING = 1e-9  # of the wanted value: what sums of decimals may miss an end of a range by


class TrimmerRange(NamedTuple):
    """The least and the most that a trimmer can be set to [F]."""

    least: float
    most: float


# ceramic, film and air trimmers, then compression mica (common practice, no source)
TRIMMERS = (
    *(TrimmerRange(1e-12, 3e-12), TrimmerRange(2e-12, 6e-12), TrimmerRange(2e-12, 10e-12), TrimmerRange(3e-12, 15e-12)),
    *(TrimmerRange(4e-12, 20e-12), TrimmerRange(5e-12, 30e-12), TrimmerRange(8e-12, 60e-12)),
    *(TrimmerRange(10e-12, 100e-12), TrimmerRange(20e-12, 150e-12), TrimmerRange(25e-12, 280e-12)),
    *(TrimmerRange(50e-12, 400e-12), TrimmerRange(150e-12, 700e-12), TrimmerRange(300e-12, 1.2e-9)),
    TrimmerRange(500e-12, 2e-9),
)


class Fitted(NamedTuple):
    """Preferred values [F] side by side, their sum [F], and its error against the wanted value [%]."""

    values: tuple[float, ...]
    total: float
    error_percent: float


class FixedAndTrimmer(NamedTuple):
    """Fixed parts [F], none to two, beside a trimmer.

    ``setting`` [F] of the trimmer makes the wanted value; ``lowest`` and ``highest`` [F] are the settings at the ends
    of the asked range, all three within ``trimmer``; ``reach`` [F] is what the two can be set to together.
    """

    fixed: tuple[float, ...]
    trimmer: TrimmerRange
    setting: float
    lowest: float
    highest: float
    reach: tuple[float, float]


def nearest_single(wanted: float, *, series: str = "E12") -> Fitted:
    """Return the one preferred value nearest a wanted capacitance [F].

    Raises
    ------
    InputError
        If there is no such series.
    OutOfRangeError
        If the capacitance is not above 0.

    Examples
    --------
    >>> found = nearest_single(545.7e-12)
    >>> found.values, round(found.error_percent, 2)
    ((5.6e-10,), 2.62)
    """
    need("wanted", wanted, "F", above=0)
    return _fitted((nearest_preferred(wanted, series=series),), wanted)


def best_pair(wanted: float, *, series: str = "E12") -> Fitted:
    """Return the two preferred values whose sum is nearest a wanted capacitance [F], the larger first.

    Of pairs that are as near, the one that shares the current most evenly. The larger is at most the wanted value, the
    smaller at least 1 pF and 1 % of it.

    Raises
    ------
    InputError
        If there is no such series.
    ImpossibleError
        If the capacitance is below that of two of the smallest parts.
    OutOfRangeError
        If it is not above 0.

    Examples
    --------
    >>> found = best_pair(545.7e-12)
    >>> found.values, round(found.error_percent, 2)
    ((3.3e-10, 2.2e-10), 0.79)
    """
    need("wanted", wanted, "F", above=0)
    if wanted < 2 * SMALLEST:
        raise ImpossibleError(
            f"a parallel pair for {show(wanted, 'F')} is not sensible: two of {show(SMALLEST, 'F')} are the least "
            f"(one part of {show(nearest_preferred(wanted, series=series), 'F')} is nearest)"
        )
    least = max(SMALLEST, SMALLEST_SHARE * wanted)
    pairs = [
        (larger, smaller)
        for larger in preferred_range(max(0.4 * wanted, least), wanted, series=series)
        for smaller in neighbours(max(wanted - larger, least), series=series)
        if least <= smaller <= larger
    ]
    # parts in 1e12 are rounding: such pairs are as near as each other
    return _fitted(min(pairs, key=lambda pair: (round(abs(sum(pair) / wanted - 1), 12), pair)), wanted)


def _fitted(values: tuple[float, ...], wanted: float) -> Fitted:
    total = sum(values)
    return Fitted(values, total, 100 * (total / wanted - 1))


def fixed_and_trimmer(
    wanted: float,
    *,
    percent: float = 10.0,
    series: str = "E12",
    trimmers: Sequence[tuple[float, float]] = TRIMMERS,
) -> FixedAndTrimmer:
    """Return the trimmer that can be set around a wanted capacitance, with fixed parts beside it where needed.

    The trimmer of least range that does it with at most one fixed part, set near its middle; with two fixed parts only
    where nothing else reaches.

    Parameters
    ----------
    wanted : float
        Capacitance [F].
    percent : float
        What it must reach on either side [%], above 0 and below 100; the parts' own tolerances belong in it.
    series : str
        E series of the fixed parts.
    trimmers : sequence of (least, most)
        The trimmers there are [F]; by default ranges that are sold, common practice without a source.

    Raises
    ------
    InputError
        If there is no such series.
    ImpossibleError
        If no trimmer reaches it, with the one that comes nearest.
    OutOfRangeError
        If a value is out of range, or a trimmer's ends are not above 0 and rising.

    Examples
    --------
    >>> found = fixed_and_trimmer(545.7e-12, percent=5)
    >>> found.fixed, found.trimmer, round(1e12 * found.setting, 1)
    ((4.7e-10,), TrimmerRange(least=2e-11, most=1.5e-10), 75.7)
    """
    need("wanted", wanted, "F", above=0)
    need("percent", percent, "%", above=0)
    if not percent < 100:
        raise OutOfRangeError("percent", f"{percent:g} %", "below 100 %")
    if not trimmers:
        raise OutOfRangeError("trimmers", "none", "one or more")
    for least, most in trimmers:
        need("a trimmer's least", least, "F", above=0)
        need("a trimmer's most", most, "F", above=least)
    low, high = wanted * (1 - percent / 100), wanted * (1 + percent / 100)
    slack = ROUNDING * wanted
    for beside in (_one_beside, _two_beside):
        found = [
            (most - least, fixed, TrimmerRange(least, most))
            for least, most in trimmers
            for fixed in beside(least, most, wanted, series)
            if sum(fixed) + least <= low + slack and sum(fixed) + most >= high - slack
        ]
        if found:
            break
    else:
        raise ImpossibleError(_out_of_reach(wanted, percent, series, trimmers))
    _, fixed, trimmer = min(found, key=lambda its: its[0])  # of equal ones the first, set nearest its middle
    total = sum(fixed)
    return FixedAndTrimmer(
        fixed,
        trimmer,
        setting=wanted - total,
        lowest=low - total,
        highest=high - total,
        reach=(total + trimmer.least, total + trimmer.most),
    )


def _one_beside(least: float, most: float, wanted: float, series: str) -> list[tuple[float, ...]]:
    """Return what to try beside a trimmer [F]: nothing, then one part, those first that set it nearest its middle."""
    low, high = max(SMALLEST, wanted - most), wanted - least
    fixed = preferred_range(low, high, series=series) if low <= high else ()
    return [(), *((value,) for value in sorted(fixed, key=lambda value: abs(value + (least + most) / 2 - wanted)))]


def _two_beside(least: float, most: float, wanted: float, series: str) -> list[tuple[float, ...]]:
    """Return the two parts that set a trimmer [F] nearest its middle, if there are."""
    middle = wanted - (least + most) / 2
    return [best_pair(middle, series=series).values] if middle >= 2 * SMALLEST else []


def _out_of_reach(wanted: float, percent: float, series: str, trimmers: Sequence[tuple[float, float]]) -> str:
    """Return what to say where no trimmer does it: the combination that comes nearest."""
    combinations = [
        (fixed, least, most)
        for least, most in trimmers
        for beside in (_one_beside, _two_beside)
        for fixed in beside(least, most, wanted, series)
    ]

    def reach(its: tuple[tuple[float, ...], float, float]) -> float:
        fixed, least, most = its
        return 100 * min(wanted - sum(fixed) - least, sum(fixed) + most - wanted) / wanted

    nearest = max(combinations, key=reach)
    fixed, least, most = nearest
    total, got = sum(fixed), reach(nearest)
    words = " + ".join(
        (*(show(value, "F") for value in fixed), f"a trimmer of {show(least, 'F')} to {show(most, 'F')}")
    )
    what = f"reaches ±{got:.3g} %" if got > 0 else f"spans {show(total + least, 'F')} to {show(total + most, 'F')}"
    return f"no trimmer here reaches {show(wanted, 'F')} ± {percent:g} %; nearest: {words}, which {what}"
