"""Bleeders: the discharge by integration, the way back, and refusals."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from rfstage.errors import ImpossibleError, InputError, OutOfRangeError
from rfstage.parts.bleeder import POWER_RATINGS, bleeder, bleeder_for
from rfstage.parts.preferred import preferred_range

capacitances, voltages, times = st.floats(1e-7, 1e-2), st.floats(61, 20e3), st.floats(0.1, 600)


def test_a_reservoir_by_hand():
    # SOURCE: arithmetic: 50 uF at 2 kV hold 100 J; 100 kohm carry 20 mA and burn 40 W; e-folding 5 s, to 60 V
    # 5 s × ln(2000/60) = 17.53 s; twice 40 W is 80 W, and 100 W is sold (margin: common practice, no source)
    found = bleeder(100e3, capacitance=50e-6, voltage=2000.0)
    assert found.stored_energy == pytest.approx(100.0)
    assert found.current == pytest.approx(0.02)
    assert found.loss == pytest.approx(40.0)
    assert found.time_constant == pytest.approx(5.0)
    assert found.discharge_time == pytest.approx(17.53, abs=0.005)
    assert (found.power_to_stand, found.power_rating) == (pytest.approx(80.0), 100.0)


@given(resistance=st.floats(100, 1e7), capacitance=capacitances, voltage=voltages)
def test_after_the_discharge_time_the_capacitor_is_at_the_safe_voltage(resistance, capacitance, voltage):
    found = bleeder(resistance, capacitance=capacitance, voltage=voltage)
    assert voltage * math.exp(-found.discharge_time / (resistance * capacitance)) == pytest.approx(60.0)


@given(time=times, capacitance=capacitances, voltage=voltages)
def test_the_bleeder_for_a_time_takes_that_time(time, capacitance, voltage):
    exact = bleeder_for(time, capacitance=capacitance, voltage=voltage)
    assert exact.discharge_time == pytest.approx(time)
    rounded = bleeder_for(time, capacitance=capacitance, voltage=voltage, series="E12")
    assert rounded.discharge_time <= time * (1 + 1e-9)
    assert rounded.resistance in preferred_range(exact.resistance / 1.3, exact.resistance, series="E12")


@given(resistance=st.floats(1e4, 1e6), voltage=voltages)
def test_energy_burnt_in_the_discharge_is_the_energy_stored_above_the_safe_voltage(resistance, voltage):
    # an independent route: the integral of v²/R, summed
    found = bleeder(resistance, capacitance=10e-6, voltage=voltage)
    steps = 2000
    step = found.discharge_time / steps
    burnt = sum(
        (voltage * math.exp(-(k + 0.5) * step / found.time_constant)) ** 2 / resistance * step for k in range(steps)
    )
    left = 10e-6 * 60.0**2 / 2
    assert burnt == pytest.approx(found.stored_energy - left, rel=1e-4, abs=1e-9)  # midpoint rule of 2000 steps


def test_a_safe_supply_takes_no_time_and_asks_for_no_bleeder():
    assert bleeder(10e3, capacitance=1e-3, voltage=13.8).discharge_time == 0.0
    with pytest.raises(ImpossibleError, match=r"13\.8 V needs no bleeder to come down to 60\.0 V"):
        bleeder_for(10.0, capacitance=1e-3, voltage=13.8)


def test_margin_and_safe_voltage_can_be_set():
    # SOURCE: arithmetic: 100 V into 1 kohm is 10 W, three times 30 W; 1 ms × ln(100/25)
    found = bleeder(1e3, capacitance=1e-6, voltage=100.0, safe_voltage=25.0, margin=3.0)
    assert found.power_to_stand == pytest.approx(30.0)
    assert found.discharge_time == pytest.approx(1e-3 * math.log(4))


def test_beyond_the_ratings_there_is_none():
    assert bleeder(1e3, capacitance=1e-5, voltage=2000.0).power_rating is None
    assert list(POWER_RATINGS) == sorted(set(POWER_RATINGS))


@pytest.mark.parametrize(
    ("changed", "said"),
    [
        ({"capacitance": 0.0}, "capacitance must be above 0 F"),
        ({"voltage": -100.0}, "voltage must be above 0 V; got -100 V"),
        ({"safe_voltage": 0.0}, "safe_voltage must be above 0 V"),
        ({"margin": 0.9}, "margin must be at least 1; got 0.9"),
        ({"voltage": math.inf}, "voltage must be above 0 V"),
    ],
)
def test_bad_input_is_one_clear_line(changed, said):
    given_values = {"capacitance": 1e-5, "voltage": 1000.0, **changed}
    for make in (lambda: bleeder(1e5, **given_values), lambda: bleeder_for(10.0, **given_values)):
        with pytest.raises(OutOfRangeError) as caught:
            make()
        assert said in str(caught.value)


def test_a_resistance_or_time_that_is_none_is_refused():
    with pytest.raises(OutOfRangeError, match="resistance must be above 0 ohm"):
        bleeder(0.0, capacitance=1e-5, voltage=1000.0)
    with pytest.raises(OutOfRangeError, match="time must be above 0 s"):
        bleeder_for(-1.0, capacitance=1e-5, voltage=1000.0)
    with pytest.raises(InputError, match="series: got 'E7'"):
        bleeder_for(1.0, capacitance=1e-5, voltage=1000.0, series="E7")
