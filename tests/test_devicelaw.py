"""The device's law: exact slopes, limits, and nothing that overflows."""

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from rfstage.device import Device, JunctionCapacitance, ReverseConduction
from rfstage.devicelaw import DrivenLaw, Law, current, junction_charge, soft
from rfstage.errors import OutOfRangeError

FET = Device(
    family="fet",
    transfer_factor=2.0,
    exponent=1.0,
    threshold=3.0,
    threshold_softness=0.04,
    knee_voltage=0.07,
    knee_resistance=0.1,
)
DIODE = replace(FET, reverse_conduction=ReverseConduction(conductance=1.95, threshold=0.7, softness=0.03))
SQUARE = replace(FET, family="bipolar", exponent=2.0, threshold=0.7, threshold_softness=0.01)
TRIODE = Device(
    family="tube",
    transfer_factor=2e-3,
    exponent=1.5,
    threshold=0.0,
    threshold_softness=2.0,
    knee_voltage=20.0,
    knee_resistance=150.0,
    amplification_factor=20.0,
)
ODD = replace(FET, exponent=2.3)
JUNCTION = JunctionCapacitance(at_zero=465e-12, potential=0.8, grading=0.45)


@pytest.mark.parametrize(
    ("device", "scale"),
    [(FET, 10.0), (DIODE, 10.0), (SQUARE, 10.0), (TRIODE, 2000.0), (ODD, 10.0)],
    ids=["fet", "body diode", "bipolar", "triode", "exponent 2.3"],
)
def test_slope_of_the_current_is_its_derivative(device, scale):
    volts = np.linspace(-0.2, 1.3, 83) * scale
    control = device.threshold + np.linspace(-0.3, 1.0, 7)[:, np.newaxis] * scale / 3
    step = 1e-6 * scale
    _, slope = current(device, control=control, voltage=volts)
    above, _ = current(device, control=control, voltage=volts + step)
    below, _ = current(device, control=control, voltage=volts - step)
    difference = (above - below) / (2 * step)
    # central differences: 1e-12 of truncation, 1e-10 of rounding against the largest slope
    np.testing.assert_allclose(slope, difference, rtol=2e-6, atol=1e-8 * np.abs(slope).max())


def test_charge_s_slope_is_its_derivative_on_both_sides_of_the_continuation():
    law = Law.of([replace(FET, junction_capacitance=JUNCTION)])
    volts = np.linspace(-3.0, 30.0, 400)[np.newaxis, :]
    _, slope = junction_charge(law, volts)
    difference = (junction_charge(law, volts + 1e-5)[0] - junction_charge(law, volts - 1e-5)[0]) / 2e-5
    np.testing.assert_allclose(slope, difference, rtol=1e-6)


def test_capacitance_has_no_step_or_kink_at_half_the_potential():
    law = Law.of([replace(FET, junction_capacitance=JUNCTION)])
    near = -0.4 + np.array([[-2e-6, -1e-6, 1e-6, 2e-6]])
    c = junction_charge(law, near)[1][0]
    assert (c[1] - c[0]) == pytest.approx(c[3] - c[2], rel=1e-3)
    assert c[1] == pytest.approx(c[2], rel=1e-5)


def test_capacitance_follows_the_junction_formula():
    law = Law.of([replace(FET, junction_capacitance=JUNCTION)])
    # SOURCE: the definition, C = C0 (1 + v/φ)^−m
    assert junction_charge(law, np.array([[12.0]]))[1][0, 0] == pytest.approx(
        465e-12 * (1 + 12 / 0.8) ** -0.45, rel=1e-13
    )
    assert junction_charge(law, np.array([[0.0]]))[0][0, 0] == 0.0


@pytest.mark.parametrize(("ratio", "share"), [(1.0, math.tanh(1.0)), (3.0, math.tanh(3.0))])
def test_knee_takes_the_current_down_by_a_hyperbolic_tangent(ratio, share):
    control = 7.0  # 4 V above the threshold, a hundred softnesses
    knee = 0.07 + 0.1 * 8.0
    assert float(current(FET, control=control, voltage=ratio * knee)[0]) == pytest.approx(8.0 * share, rel=1e-12)


def test_hard_corner_is_the_limit_of_the_soft_one():
    x = np.array([-1.0, -1e-12, 0.0, 1e-12, 1.0])
    value, slope = soft(x, 0.0)
    np.testing.assert_allclose(value, np.maximum(x, 0), rtol=0, atol=1e-199)  # that of the stand-in for zero width
    np.testing.assert_array_equal(slope, [0.0, 0.0, 0.5, 1.0, 1.0])
    np.testing.assert_allclose(soft(x, 1e-15)[0], value, atol=1e-15)


def test_current_below_a_hard_threshold_is_exactly_zero():
    hard = replace(FET, threshold_softness=0.0)
    assert float(current(hard, control=2.999999, voltage=12.0)[0]) == 0.0


@given(st.floats(-1e5, 1e5), st.floats(-1e5, 1e5))
def test_nothing_overflows_at_absurd_voltages(control, voltage):
    with np.errstate(over="raise", invalid="raise", divide="raise"):
        for device in (FET, DIODE, SQUARE, TRIODE, ODD, replace(FET, threshold_softness=0.0)):
            amperes, siemens = current(device, control=control, voltage=voltage)
            assert np.isfinite(amperes)
            assert np.isfinite(siemens)


@given(st.floats(-5, 15), st.lists(st.floats(-20, 60), min_size=2, max_size=9))
def test_current_never_falls_as_the_output_voltage_rises(control, volts):
    for device in (FET, DIODE, SQUARE):
        amperes, _ = current(device, control=control, voltage=np.sort(volts))
        assert np.all(np.diff(amperes) >= 0)


def test_current_never_falls_as_the_drive_rises():
    amperes, _ = current(TRIODE, control=np.linspace(-200, 50, 300), voltage=700.0)
    assert np.all(np.diff(amperes) >= 0)
    assert amperes[-1] > amperes[0]


def test_one_way_device_blocks_and_a_fet_conducts_backwards():
    assert abs(float(current(replace(FET, family="bipolar"), control=5.0, voltage=-5.0)[0])) < 1e-40  # exp(−10·5/0.47)
    assert float(current(FET, control=5.0, voltage=-5.0)[0]) == pytest.approx(-4.0 * math.tanh(5 / 0.47), rel=1e-12)


def test_batch_of_unlike_devices_gives_each_its_own_current():
    devices = [FET, DIODE, SQUARE, TRIODE, ODD]
    control, volts = np.full((5, 3), 4.0), np.array([[-2.0, 0.3, 40.0]] * 5)
    together, slopes = DrivenLaw.at(Law.of(devices), control).current(volts)
    for row, device in enumerate(devices):
        alone, slope = current(device, control=control[row], voltage=volts[row])
        np.testing.assert_allclose(together[row], alone, rtol=1e-14)
        np.testing.assert_allclose(slopes[row], slope, rtol=1e-14)


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("transfer_factor", 0.0),
        ("transfer_factor", math.nan),
        ("exponent", 0.9),
        ("exponent", 3.1),
        ("knee_voltage", 0.0),
        ("knee_resistance", -1.0),
        ("threshold_softness", -1e-3),
        ("output_capacitance", -1e-12),
        ("threshold", math.inf),
        ("amplification_factor", 0.0),
    ],
)
def test_device_refuses_what_no_device_has(name, value):
    with pytest.raises(OutOfRangeError, match=name):
        replace(FET, **{name: value})


@pytest.mark.parametrize(
    ("make", "name"),
    [
        (lambda: JunctionCapacitance(at_zero=1e-12, potential=0.0, grading=0.5), "potential"),
        (lambda: JunctionCapacitance(at_zero=1e-12, potential=0.8, grading=1.0), "grading"),
        (lambda: ReverseConduction(conductance=-1.0, threshold=0.7, softness=0.03), "conductance"),
        (lambda: replace(FET, family="valve"), "family"),
    ],
)
def test_parts_of_a_device_refuse_values_out_of_range(make, name):
    with pytest.raises(OutOfRangeError, match=name):
        make()
