"""Heat: published worked examples, pulses against an integration, and refusals."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from rfstage.errors import ImpossibleError, OutOfRangeError
from rfstage.parts.heatpulses import pulsed_temperatures
from rfstage.parts.heatsink import (
    JUNCTION_LIMITS,
    ThermalPath,
    derated,
    largest_dissipation,
    rating_use,
    resistance_from_rating,
    sink_for,
    temperatures,
)

PATH = ThermalPath(junction_to_case=0.5, case_to_sink=0.6, sink_to_ambient=1.5)
watts, resistances = st.floats(0.1, 1000), st.floats(0.05, 5)


# --- published ------------------------------------------------------------------------------------------


def test_largest_dissipation_of_a_published_example():
    # SOURCE: R. Boylestad & L. Nashelsky, Electronic Devices and Circuit Theory, 10th ed., example 12.18: 61.54 W
    assert largest_dissipation(PATH, junction_limit=200.0, ambient=40.0) == pytest.approx(61.54, abs=0.005)


def test_derating_of_a_published_example():
    # SOURCE: Boylestad & Nashelsky, 10th ed., example 12.17: 80 W at 25 C, 0.5 W/C: 30 W at 125 C
    assert derated(80.0, at=25.0, per_kelvin=0.5, temperature=125.0) == 30.0


def test_derating_of_a_second_published_example():
    # SOURCE: A. Malvino & D. Bates, Electronic Principles, 7th ed., example 12-14, p. 414: 625 mW at 25 C, 5 mW/C:
    # 500 mW at 50 C
    assert derated(0.625, at=25.0, per_kelvin=0.005, temperature=50.0) == pytest.approx(0.5)


def test_thermal_resistance_of_a_published_rating():
    # SOURCE: A. Sedra & K. Smith, Microelectronic Circuits, 5th ed., example 14.4, p. 1251: 2 W at 25 C, junction to
    # 150 C: 62.5 C/W; 1.6 W at 50 C; junction at 87.5 C with 1 W at 25 C
    resistance = resistance_from_rating(2.0, at=25.0, junction_limit=150.0)
    assert resistance == 62.5
    path = ThermalPath(junction_to_case=resistance)
    assert largest_dissipation(path, junction_limit=150.0, ambient=50.0) == pytest.approx(1.6)
    assert derated(2.0, at=25.0, per_kelvin=1 / resistance, temperature=50.0) == pytest.approx(1.6)
    assert temperatures(1.0, path, ambient=25.0).junction == 87.5


def test_junction_limits_are_those_of_the_published_examples():
    # SOURCE: Boylestad & Nashelsky example 12.18 (200), Sedra & Smith example 14.4 (150)
    assert JUNCTION_LIMITS == {"metal can": 200.0, "plastic": 150.0}


# --- steady ---------------------------------------------------------------------------------------------


def test_temperatures_fall_along_the_path_by_each_resistance():
    # SOURCE: arithmetic: 20 W through 1.5, 0.6 and 0.5 K/W over 30 C
    found = temperatures(20.0, PATH, ambient=30.0)
    assert found == pytest.approx((82.0, 72.0, 60.0))


@given(dissipation=watts, inner=resistances, washer=resistances, room=st.floats(20, 180), ambient=st.floats(-40, 80))
def test_the_sink_found_brings_the_junction_just_to_its_limit(dissipation, inner, washer, room, ambient):
    limit = ambient + room
    if (limit - ambient) / dissipation <= inner + washer:
        with pytest.raises(ImpossibleError, match="with an endless one"):
            sink_for(dissipation, junction_limit=limit, ambient=ambient, junction_to_case=inner, case_to_sink=washer)
        return
    sink = sink_for(dissipation, junction_limit=limit, ambient=ambient, junction_to_case=inner, case_to_sink=washer)
    path = ThermalPath(junction_to_case=inner, case_to_sink=washer, sink_to_ambient=sink)
    assert temperatures(dissipation, path, ambient=ambient).junction == pytest.approx(limit, abs=1e-9 * room + 1e-9)
    assert largest_dissipation(path, junction_limit=limit, ambient=ambient) == pytest.approx(dissipation, rel=1e-9)


def test_a_sink_that_cannot_be_says_what_could():
    with pytest.raises(ImpossibleError, match=r"200 W within 150 °C at 40 °C .*: 1 K/W .* allow less than 110 W"):
        sink_for(200.0, junction_limit=150.0, ambient=40.0, junction_to_case=0.8, case_to_sink=0.2)


def test_derating_ends_at_nothing_and_begins_at_its_temperature():
    assert derated(80.0, at=25.0, per_kelvin=0.5, temperature=200.0) == 0.0
    assert derated(80.0, at=25.0, per_kelvin=0.5, temperature=-20.0) == 80.0


# --- pulses ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("width", "period", "tau"), [(1e-3, 10e-3, 10e-3), (0.3, 0.7, 0.2), (5e-5, 1e-3, 0.1)])
def test_pulses_agree_with_an_integration_to_the_repeating_state(width, period, tau):
    # an independent route: the periodic solution of τ dT/dt + T = P R in a linear system of small implicit steps
    steps = 40_000
    times = (np.arange(steps) + 0.5) * period / steps
    drive = np.where(times < width, 100.0 * 0.8, 0.0)
    ratio = period / steps / tau
    factor = (1 - ratio / 2) / (1 + ratio / 2)
    rise, start = [], 0.0
    for _ in range(2):  # once from cold to learn what a cycle leaves, once from where it repeats
        at, rise = start, []
        for power in drive:
            at = factor * at + ratio / (1 + ratio / 2) * power
            rise.append(at)
        start = rise[-1] / (1 - factor**steps) if start == 0.0 else start
    path = ThermalPath(junction_to_case=0.8, sink_to_ambient=1.2)
    found = pulsed_temperatures(100.0, path, ambient=25.0, width=width, period=period, time_constant=tau)
    # the step that holds the pulse's end is a step of the integration wide
    tolerance = 80.0 * (2 * ratio) + 1e-6
    assert found.hottest - found.case == pytest.approx(max(rise), abs=tolerance)
    assert found.coolest - found.case == pytest.approx(min(rise), abs=tolerance)
    assert found.mean - found.case == pytest.approx(np.mean(rise), abs=tolerance)


@given(
    power=watts,
    inner=resistances,
    outer=resistances,
    duty=st.floats(0.001, 1.0),
    period=st.floats(1e-4, 10),
    tau=st.floats(1e-4, 100),
)
def test_pulses_swing_about_the_mean_between_average_and_peak(power, inner, outer, duty, period, tau):
    path = ThermalPath(junction_to_case=inner, sink_to_ambient=outer)
    found = pulsed_temperatures(power, path, ambient=20.0, width=duty * period, period=period, time_constant=tau)
    slack = 1e-9 * power * inner
    average = temperatures(power * duty, path, ambient=20.0)
    assert found.mean == pytest.approx(average.junction)
    assert found.case == pytest.approx(average.case)
    assert found.coolest - slack <= found.mean <= found.hottest + slack
    assert found.case - slack <= found.coolest
    assert found.hottest <= found.case + power * inner + slack


def test_a_very_slow_junction_stays_at_the_average_and_a_very_quick_one_reaches_the_peak():
    slow = pulsed_temperatures(50.0, PATH, ambient=20.0, width=1e-6, period=4e-6, time_constant=10.0)
    assert slow.hottest == pytest.approx(slow.mean, abs=1e-5)
    quick = pulsed_temperatures(50.0, PATH, ambient=20.0, width=10.0, period=40.0, time_constant=1e-6)
    assert quick.hottest == pytest.approx(quick.case + 25.0)
    assert quick.coolest == pytest.approx(quick.case)


def test_without_a_time_constant_pulses_are_their_average():
    found = pulsed_temperatures(50.0, PATH, ambient=20.0, width=1.0, period=4.0)
    assert found.hottest == found.mean == found.coolest == temperatures(12.5, PATH, ambient=20.0).junction


def test_a_pulse_as_long_as_its_period_is_steady():
    found = pulsed_temperatures(50.0, PATH, ambient=20.0, width=2.0, period=2.0, time_constant=0.5)
    assert found.hottest == pytest.approx(temperatures(50.0, PATH, ambient=20.0).junction)


# --- ratings --------------------------------------------------------------------------------------------


def test_an_anode_beyond_its_rating_is_said_so_and_a_duty_cycle_relieves_it():
    # SOURCE: arithmetic: 300 W on a 250 W anode, half the time
    hot = rating_use(300.0, rating=250.0)
    assert (hot.exceeded, hot.left, hot.share) == (True, -50.0, 1.2)
    half = rating_use(300.0, rating=250.0, duty=0.5)
    assert (half.exceeded, half.dissipation, half.left) == (False, 150.0, 100.0)


def test_exactly_at_the_rating_is_within_it():
    assert not rating_use(250.0, rating=250.0).exceeded


# --- bad input ------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("make", "said"),
    [
        (lambda: ThermalPath(junction_to_case=-1.0), "junction_to_case must be at least 0 K/W; got -1 K/W"),
        (lambda: ThermalPath(junction_to_case=0.0), "the whole thermal resistance must be above 0 K/W"),
        (lambda: temperatures(math.nan, PATH, ambient=20.0), "dissipation must be at least 0 W; got nan W"),
        (lambda: temperatures(1.0, PATH, ambient=-300.0), "ambient must be at least -273.15 °C; got -300 °C"),
        (lambda: derated(0.0, at=25.0, per_kelvin=1.0, temperature=50.0), "rating must be above 0 W"),
        (lambda: derated(1.0, at=25.0, per_kelvin=-1.0, temperature=50.0), "per_kelvin must be above 0 W/K"),
        (lambda: pulsed_temperatures(1.0, PATH, ambient=20.0, width=2.0, period=1.0), "period must be at least 2 s"),
        (
            lambda: pulsed_temperatures(1.0, PATH, ambient=20.0, width=1.0, period=2.0, time_constant=0.0),
            "time_constant must be above 0 s",
        ),
        (lambda: rating_use(1.0, rating=2.0, duty=1.5), "duty must be above 0, at most 1; got 1.5"),
    ],
)
def test_bad_input_is_one_clear_line(make, said):
    with pytest.raises(OutOfRangeError) as caught:
        make()
    assert said in str(caught.value)
    assert "\n" not in str(caught.value)


def test_surroundings_as_hot_as_the_limit_leave_nothing():
    with pytest.raises(ImpossibleError, match=r"at 150 °C around it nothing .* limit of 150 °C"):
        largest_dissipation(PATH, junction_limit=150.0, ambient=150.0)
