"""Level lists: correction, matching, what is no harmonic; what power meters read; the decision rules."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from rfstage.errors import InputError, OutOfRangeError
from rfstage.verify.levels import (
    Level,
    LevelList,
    Reading,
    Response,
    Setup,
    decibels,
    measured_levels,
    meter_readings,
    told,
)
from rfstage.verify.verdict import FAIL, GUARDED, PASS, SIMPLE, UNDECIDED, decide, margin_of, overall

CARRIER = 7.1e6


def measured(*pairs, unit="dBm", setup=None):
    readings = tuple(Reading(*pair) for pair in pairs)
    return measured_levels(LevelList("a.csv", unit, readings), carrier=CARRIER, setup=setup or Setup())


def test_readings_are_matched_to_harmonics_of_the_carrier_in_the_list():
    found = measured((7.1005e6, 3.0), (14.2012e6, -45.0), (21.30e6, -50.0), (9.0e6, -60.0), (16.0e6, -70.0))
    assert found.carrier == 7.1005e6
    assert [(level.order, level.level) for level in found.levels] == [(2, -48.0), (3, -53.0)]
    assert [(o.frequency, o.level) for o in found.others] == [(9.0e6, -63.0), (16.0e6, -73.0)]


def test_attenuation_and_sampler_bring_levels_back_to_the_line():
    sampler = Response(np.array([5e6, 10e6, 20e6, 30e6]), np.array([-41.0, -40.0, -38.0, -37.0]), "s.csv")
    found = measured((7.1e6, -10.0), (14.2e6, -60.0), (35.5e6, -70.0), setup=Setup(attenuation=20.0, sampler=sampler))
    at = [np.interp(f, sampler.frequencies, sampler.decibels) for f in (7.1e6, 14.2e6)]
    # exact: in the line -10 + 20 - S21 dBm, in watts; and the difference of the two responses
    assert found.power == pytest.approx(1e-3 * 10 ** ((10 - at[0]) / 10))
    assert found.levels[0].level == pytest.approx(-50 - (at[1] - at[0]))
    assert found.uncorrected == (5,)


def test_attenuation_alone_leaves_the_levels():
    plain, padded = (measured((7.1e6, 3.0), (14.2e6, -45.0), setup=Setup(attenuation=a)) for a in (0.0, 40.0))
    assert plain.levels == padded.levels
    assert padded.power == pytest.approx(1e4 * plain.power)


def test_a_list_in_dbc_may_leave_the_carrier_out_and_gives_no_power():
    found = measured((14.2e6, -45.0), unit="dBc")
    assert found.levels[0].level == -45.0
    assert found.power is None
    assert measured((7.1e6, 0.0), (14.2e6, -45.0), unit="dBc").levels[0].level == -45.0


def test_a_list_in_dbm_wants_its_carrier():
    with pytest.raises(InputError, match=r"a\.csv: no reading lies at the stage's carrier, 7\.1 MHz"):
        measured((14.2e6, -45.0))


def test_one_order_given_twice_is_refused():
    with pytest.raises(InputError, match=r"order 2 is given 2 times \(14\.2 MHz, 14\.201 MHz\)"):
        measured((7.1e6, 0.0), (14.2e6, -45.0), (14.201e6, -44.0))


def test_a_trace_is_no_list():
    with pytest.raises(InputError, match="201 readings; wanted 200 or fewer"):
        measured(*((7e6 + 1e4 * k, -50.0) for k in range(201)))


def test_what_was_not_seen_is_a_bound_and_no_level():
    found = measured((7.1e6, 0.0), (14.2e6, -70.0, True)).levels[0]
    assert (found.level, found.low, found.uncertainty) == (None, None, None)
    assert found.high == found.floor == -69.0  # and the uncertainty of 1 dB on top


def test_distortion_of_the_analyser_widens_and_hides():
    setup = Setup(uncertainty=0.0, distortion=60.0)
    strong, weak = measured((7.1e6, 0.0), (14.2e6, -45.0), (21.3e6, -58.0), setup=setup).levels
    # exact: 1/1000 of the carrier beside 5.62/1000 of it
    assert strong.high == pytest.approx(-45 + decibels(1 + 1e-3 / 10 ** (-45 / 20)))
    assert strong.low == pytest.approx(-45 + decibels(1 - 1e-3 / 10 ** (-45 / 20)))
    assert weak.level is None
    assert weak.high == pytest.approx(decibels(10 ** (-58 / 20) + 1e-3))


@given(st.floats(1e-6, 0.5), st.floats(1e-7, 0.1), st.floats(0, 3))
def test_a_level_lies_within_its_own_ends_and_above_its_floor(ratio, own, uncertainty):
    found = told(2, 14.2e6, ratio, own=own, setup=Setup(uncertainty=uncertainty))
    if found.level is None:
        assert ratio < 2 * own
        assert found.high >= decibels(ratio)
    else:
        assert found.low <= found.level <= found.high
        assert found.level >= found.floor
        assert found.uncertainty == pytest.approx(max(found.high - found.level, found.level - found.low))


@pytest.mark.parametrize(
    ("frequencies", "values", "said"),
    [
        ([], [], "is empty"),
        ([2e6, 1e6], [-40, -40], "must be above 0 and rise"),
        ([1e6, 2e6], [40, 40], r"passes 40 dB at 1 MHz; wanted its transmission, below 0 dB"),
    ],
)
def test_a_response_that_is_none_is_refused(frequencies, values, said):
    with pytest.raises(InputError, match=said):
        Response(np.array(frequencies, dtype=float), np.array(values, dtype=float), "s.csv")


def test_a_sampler_that_does_not_reach_the_carrier_is_refused():
    with pytest.raises(
        InputError, match=r"lies beyond the response of the sampler \(s\.csv: 10\.00 MHz to 30\.00 MHz\)"
    ):
        measured((7.1e6, 0.0), setup=Setup(sampler=Response(np.array([1e7, 3e7]), np.array([-40.0, -40.0]), "s.csv")))


@pytest.mark.parametrize("levels", [[-20.0], [-30.0, -25.0], [-40.0, -50.0, -45.0]], ids=str)
def test_meters_by_two_routes(levels):
    """Waves with every phase of the harmonics: their power, and the extremes of their crest."""
    x = 2 * np.pi * np.arange(720) / 720
    rng = np.random.default_rng(1)
    ratios = 10 ** (np.array(levels) / 20)
    phases = np.concatenate((rng.uniform(0, 2 * np.pi, (400, len(levels))), np.zeros((1, len(levels)))))
    waves = np.cos(x) + sum(r * np.cos((n + 2) * x + phases[:, n, np.newaxis]) for n, r in enumerate(ratios))
    found = meter_readings(levels)
    assert 10 * math.log10(2 * np.mean(waves[0] ** 2)) == pytest.approx(found.thermal, abs=1e-9)
    crests = decibels(1) + 20 * np.log10(waves.max(axis=1))
    assert crests.max() == pytest.approx(found.peak_most, abs=1e-9)  # all in phase
    assert crests.min() >= found.peak_least - 1e-9


def test_harmonics_as_large_as_the_carrier_have_no_crest():
    with pytest.raises(OutOfRangeError, match="below 1 times it"):
        meter_readings([-3.0, -6.0])


def level(value, uncertainty=1.0):
    return Level(2, 14.2e6, value, value - uncertainty, value + uncertainty, None, uncertainty)


BELOW = Level(2, 14.2e6, None, None, -42.0, -42.0, None)


@pytest.mark.parametrize(
    ("one", "simple", "guarded"),
    [
        (level(-44.5), PASS, PASS),
        (level(-44.0), PASS, PASS),
        (level(-43.5), PASS, UNDECIDED),
        (level(-43.0), PASS, UNDECIDED),
        (level(-42.5), FAIL, UNDECIDED),
        (level(-41.5), FAIL, FAIL),
        (BELOW, UNDECIDED, UNDECIDED),
        (BELOW._replace(high=-43.5), PASS, PASS),
    ],
)
def test_decision_rules(one, simple, guarded):
    assert decide(one, -43.0, decision=SIMPLE) == simple
    assert decide(one, -43.0, decision=GUARDED) == guarded
    assert decide(one, None, decision=GUARDED) is None


def test_margins_are_of_the_level_or_of_what_it_is_below():
    assert margin_of(level(-45.0), -43.0) == 2.0
    assert margin_of(BELOW, -43.0) == -1.0
    assert margin_of(BELOW, None) is None


@pytest.mark.parametrize(
    ("some", "said"),
    [
        ([PASS, None, PASS], PASS),
        ([PASS, UNDECIDED], UNDECIDED),
        ([UNDECIDED, FAIL, PASS], FAIL),
        ([None], None),
        ([], None),
    ],
)
def test_the_worst_verdict_is_that_of_all(some, said):
    assert overall(some) == said
