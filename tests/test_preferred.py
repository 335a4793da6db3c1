"""Preferred values: the standard's list, its rule, and what lies near a value."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from rfstage.errors import InputError, OutOfRangeError
from rfstage.parts.preferred import SERIES, nearest_preferred, neighbours, preferred_range, series_values

series_names = st.sampled_from(SERIES)
sizes = st.floats(1e-13, 1e9)

E12 = "1.0 1.2 1.5 1.8 2.2 2.7 3.3 3.9 4.7 5.6 6.8 8.2"
ADDED_IN_E24 = "1.1 1.3 1.6 2.0 2.4 3.0 3.6 4.3 5.1 6.2 7.5 9.1"
E48 = (
    "1.00 1.05 1.10 1.15 1.21 1.27 1.33 1.40 1.47 1.54 1.62 1.69 1.78 1.87 1.96 2.05 2.15 2.26 2.37 2.49 2.61 2.74 "
    "2.87 3.01 3.16 3.32 3.48 3.65 3.83 4.02 4.22 4.42 4.64 4.87 5.11 5.36 5.62 5.90 6.19 6.49 6.81 7.15 7.50 7.87 "
    "8.25 8.66 9.09 9.53"
)


def numbers(text: str) -> tuple[float, ...]:
    return tuple(float(word) for word in text.split())


@pytest.mark.parametrize(
    ("series", "expected"),
    [
        # SOURCE: IEC 60063, from memory
        ("E12", numbers(E12)),
        ("E24", tuple(sorted(numbers(E12) + numbers(ADDED_IN_E24)))),
        # SOURCE: recomputed, 10^(k/48) to two decimals
        ("E48", numbers(E48)),
    ],
)
def test_series_are_those_of_the_standard(series, expected):
    assert series_values(series) == expected


def test_e6_is_every_second_value_of_e12():
    assert series_values("E6") == series_values("E12")[::2]


@pytest.mark.parametrize("series", ["E48", "E96"])
def test_three_digit_series_follow_their_rule_without_exception(series):
    count = int(series[1:])
    assert series_values(series) == tuple(round(10 ** (k / count), 2) for k in range(count))


def test_e192_follows_its_rule_with_one_exception():
    # SOURCE: the exception 9.20 for 9.19 is in IEC 60063, from memory
    rule = [round(10 ** (k / 192), 2) for k in range(192)]
    departures = [(ours, theirs) for ours, theirs in zip(series_values("E192"), rule, strict=True) if ours != theirs]
    assert departures == [(9.2, 9.19)]


def test_e24_departs_from_its_rule_where_the_standard_does():
    # SOURCE: recomputed: 2.7 3.0 3.3 3.6 3.9 4.3 4.7 8.2 differ from 10^(k/24) to one decimal
    rule = [round(10 ** (k / 24), 1) for k in range(24)]
    departures = [ours for ours, theirs in zip(series_values("E24"), rule, strict=True) if ours != theirs]
    assert departures == [2.7, 3.0, 3.3, 3.6, 3.9, 4.3, 4.7, 8.2]


@pytest.mark.parametrize(("finer", "coarser"), [("E192", "E96"), ("E96", "E48"), ("E24", "E12"), ("E12", "E6")])
def test_coarser_series_are_contained_in_finer_ones(finer, coarser):
    assert set(series_values(coarser)) <= set(series_values(finer))


@pytest.mark.parametrize(
    ("value", "series", "expected"),
    [
        # SOURCE: arithmetic on the lists above
        (5e-9, "E12", 4.7e-9),
        (5e-9, "E24", 5.1e-9),
        (9.6e-12, "E12", 10e-12),
        (8.9e-12, "E6", 10e-12),
        (8.3e-12, "E6", 6.8e-12),
        (9195.0, "E192", 9200.0),
        (2.5, "E24", 2.4),
    ],
)
def test_nearest_value_is_the_one_of_least_error(value, series, expected):
    assert nearest_preferred(value, series=series) == expected


def test_values_are_the_floats_that_their_decimals_are():
    assert preferred_range(1e-12, 9.99e-12, series="E24")[16] == 4.7e-12
    assert preferred_range(1e-12, 1e-9, series="E6") == (
        *(1e-12, 1.5e-12, 2.2e-12, 3.3e-12, 4.7e-12, 6.8e-12),
        *(1e-11, 1.5e-11, 2.2e-11, 3.3e-11, 4.7e-11, 6.8e-11),
        *(1e-10, 1.5e-10, 2.2e-10, 3.3e-10, 4.7e-10, 6.8e-10, 1e-9),
    )


def test_range_without_a_preferred_value_is_empty():
    assert preferred_range(1.01, 1.19, series="E12") == ()


@given(value=sizes, series=series_names)
def test_neighbours_enclose_a_value_within_one_step(value, series):
    below, above = neighbours(value, series=series)
    assert below <= value <= above
    ratios = [b / a for a, b in zip(series_values(series), (*series_values(series)[1:], 10.0), strict=True)]
    assert above / below <= max(ratios) * (1 + 1e-12)
    assert (below == above) == (value in preferred_range(below, above, series=series))


@given(value=sizes, series=series_names)
def test_nearest_value_of_a_preferred_value_is_itself(value, series):
    once = nearest_preferred(value, series=series)
    assert nearest_preferred(once, series=series) == once


@given(value=sizes, series=series_names)
def test_no_other_value_of_the_series_is_nearer(value, series):
    chosen = nearest_preferred(value, series=series)
    every = preferred_range(value / 10, value * 10, series=series)
    assert abs(chosen - value) == min(abs(other - value) for other in every)


@given(low=sizes, series=series_names)
def test_a_decade_holds_as_many_values_as_the_series_has(low, series):
    start = neighbours(low, series=series).above
    inside = preferred_range(start, start * 9.9999999, series=series)
    assert len(inside) == int(series[1:])
    assert list(inside) == sorted(set(inside))


def test_unknown_series_is_answered_with_those_there_are():
    with pytest.raises(InputError, match=r"series: got 'E25'; allowed E6, E12, E24, E48, E96, E192 \(did you mean"):
        series_values("E25")


@pytest.mark.parametrize("bad", [0.0, -1e-9, math.nan, math.inf])
def test_values_that_are_none_are_refused(bad):
    with pytest.raises(OutOfRangeError, match=r"value must be at least 1e-300"):
        nearest_preferred(bad, series="E12")


def test_a_range_upside_down_is_refused():
    with pytest.raises(OutOfRangeError, match="high must be at least 2"):
        preferred_range(2.0, 1.0, series="E12")
