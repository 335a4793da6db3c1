"""Harmonics at the load and at the device, against scikit-rf and a waveform made another way."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_circuits import load_volts, seen_impedance

from rfstage.harmonics import Harmonic, decibels, harmonics, load_powers, terminations, trough_dip
from rfstage.ladder import Branch, Ladder
from rfstage.limits import limit_named
from rfstage.load import SeriesLoad
from rfstage.matching.l import l_network
from rfstage.matching.pi import pi_network
from rfstage.pulse import pulse_coefficients

CARRIER = 3.5e6
LINE = SeriesLoad(50 + 0j, CARRIER)
REACTIVE = SeriesLoad(35 + 25j, CARRIER)
PI = pi_network(1000 + 0j, 50 + 0j, carrier=CARRIER, input_q=12)
LOSSY = tuple(replace(b, q=150.0 if b.kind == "coil" else 900.0, q_frequency=CARRIER) for b in PI)


def found(
    *, branches=PI, load=LINE, full_angle_deg=120.0, highest_order=10, peak_current=0.5, power=10.0, limit=None
) -> tuple[Harmonic, ...]:
    coefficients = pulse_coefficients(math.radians(full_angle_deg / 2), highest_order=highest_order)
    return harmonics(
        Ladder(branches),
        load=load,
        line=LINE,
        carrier=CARRIER,
        coefficients=coefficients,
        peak_current=peak_current,
        highest_order=highest_order,
        output_power=power,
        limit=limit_named(limit) if limit else None,
    )


def powers_by_scikit_rf(branches, load: SeriesLoad, full_angle_deg: float, peak_current: float) -> np.ndarray:
    f = CARRIER * np.arange(1, 11)
    x = np.linspace(0, math.pi, 200_001)
    theta = math.radians(full_angle_deg / 2)
    pulse = np.maximum((np.cos(x) - math.cos(theta)) / (1 - math.cos(theta)), 0)
    currents = np.array([2 / math.pi * np.trapezoid(pulse * np.cos(n * x), x) for n in range(1, 11)])
    z = load.impedance(f)
    return (np.abs(load_volts(branches, z, f)) * currents * peak_current) ** 2 / 2 * (1 / z).real


@pytest.mark.parametrize("load", [LINE, REACTIVE], ids=["resistive", "reactive"])
@pytest.mark.parametrize("branches", [PI, LOSSY], ids=["lossless", "lossy"])
def test_power_in_the_load_agrees_with_scikit_rf_and_a_pulse_integrated_in_time(branches, load):
    expected = powers_by_scikit_rf(branches, load, 120.0, 0.5)
    got = [h.load_power for h in found(branches=branches, load=load)]
    np.testing.assert_allclose(got, expected[1:], rtol=1e-6)  # the trapezoid's rounding of small orders


@pytest.mark.parametrize("load", [LINE, REACTIVE], ids=["resistive", "reactive"])
def test_levels_are_powers_against_that_of_the_carrier(load):
    expected = powers_by_scikit_rf(LOSSY, load, 120.0, 0.5)
    got = [h.level for h in found(branches=LOSSY, load=load)]
    np.testing.assert_allclose(got, 10 * np.log10(expected[1:] / expected[0]), rtol=0, atol=1e-5)


def test_line_level_is_that_into_the_resistive_line_whatever_the_load():
    into_line = [h.level for h in found(load=LINE)]
    assert [h.line_level for h in found(load=REACTIVE)] == into_line


def test_emission_is_the_tabled_transfer_of_the_pi_plus_the_pulse():
    # SOURCE: harmonic transfer of the ideal pi 1000/50/12 from a current source, recomputed: -38.21, -50.20,
    # -58.14, -64.15 dB; plus 20 log10(alpha_n/alpha_1) of the 60 deg row of the coefficient table.
    transfer = np.array([-38.21, -50.20, -58.14, -64.15])
    pulse = 20 * np.log10(np.array([0.275664, 0.137832, 0.027566, 0.027566]) / 0.391002)
    got = [h.level for h in found(highest_order=5)]
    np.testing.assert_allclose(got, transfer + pulse, rtol=0, atol=0.0052)


def test_device_currents_are_the_signed_coefficients_times_the_peak():
    # SOURCE: 60 deg row of the reduced-cosine table: 0.275664, 0.137832, 0.027566, -0.027566.
    got = [h.device_current for h in found(highest_order=5, peak_current=2.0)]
    np.testing.assert_allclose(got, 2.0 * np.array([0.275664, 0.137832, 0.027566, -0.027566]), rtol=0, atol=1.1e-6)


def test_orders_and_frequencies_run_from_the_second_to_the_highest():
    listed = found(highest_order=7)
    assert [h.order for h in listed] == [2, 3, 4, 5, 6, 7]
    assert [h.frequency for h in listed] == [CARRIER * n for n in range(2, 8)]


def test_odd_orders_of_half_a_cycle_are_absent():
    # SOURCE: exact, the half-wave rectified cosine has no odd harmonic above the first.
    listed = found(full_angle_deg=180.0, limit="us-amateur")
    for h in listed:
        values = (h.level, h.line_level, h.margin)
        assert values == (None, None, None) if h.order % 2 else None not in values


def test_absent_order_has_no_power_and_keeps_its_limit():
    third = found(full_angle_deg=180.0, limit="us-amateur")[1]
    assert (third.device_current, third.load_power, third.limit) == (0.0, 0.0, -43.0)


def test_full_cycle_has_no_harmonics_at_all():
    assert {h.level for h in found(full_angle_deg=360.0)} == {None}


def test_margin_is_limit_minus_level_in_the_line():
    for h in found(load=REACTIVE, limit="us-amateur"):
        assert h.limit == -43.0
        assert h.margin == pytest.approx(-43.0 - h.line_level, abs=1e-12)


def test_limit_depends_on_the_power_at_the_line():
    # SOURCE: 43 + 10 log10(P/W), 47 CFR 80.211(a)(3): 63 dB at 100 W.
    assert found(limit="43+10log", power=100.0)[0].limit == pytest.approx(-63.0, abs=1e-12)


def test_without_a_limit_there_is_neither_limit_nor_margin():
    assert {(h.limit, h.margin) for h in found()} == {(None, None)}


def test_rule_without_a_figure_gives_no_margin():
    # SOURCE: 47 CFR 97.307(c): above 225 MHz no figure. The pi is made for a carrier there.
    branches = pi_network(200 + 0j, 50 + 0j, carrier=432e6, loaded_q=8)
    coefficients = pulse_coefficients(1.0, highest_order=3)
    listed = harmonics(
        Ladder(branches),
        load=LINE,
        line=LINE,
        carrier=432e6,
        coefficients=coefficients,
        peak_current=1.0,
        highest_order=3,
        output_power=10.0,
        limit=limit_named("us-amateur"),
    )
    assert {(h.limit, h.margin) for h in listed} == {(None, None)}


@settings(deadline=None, max_examples=50)
@given(factor=st.floats(1e-3, 1e3))
def test_levels_do_not_depend_on_the_peak_current(factor):
    plain, scaled = found(peak_current=0.5), found(peak_current=0.5 * factor)
    np.testing.assert_allclose([h.level for h in scaled], [h.level for h in plain], rtol=0, atol=1e-9)


def test_stray_lead_of_5_nanohenries_decides_the_orders_it_moves_by_more_than_3_db():
    # SOURCE: common practice, no source, for 5 nH of lead and 3 dB of movement.
    f = CARRIER * np.arange(1, 41)
    led = [replace(b, lead_inductance=5e-9) if b.kind == "capacitor" else b for b in PI]
    level = [20 * np.log10(np.abs(v / v[0])) for v in (load_volts(PI, 50, f), load_volts(led, 50, f))]
    expected = np.abs(level[1] - level[0])[1:] > 3
    assert 0 < expected.sum() < expected.size  # the example reaches both sides
    assert [h.strays_decide for h in found(highest_order=40)] == expected.tolist()


def test_output_capacitance_of_the_device_gets_no_stray_lead():
    device = Branch("Cout", "shunt", "capacitor", 545e-12, origin="device")
    listed = found(branches=(device, *l_network(1000 + 0j, 50 + 0j, carrier=CARRIER)[1:]), highest_order=30)
    assert not any(h.strays_decide for h in listed)


def test_load_power_of_one_ampere_is_half_the_real_part_at_a_matched_carrier():
    # all of a lossless network's input power, 1000 ohm x 1 A^2 / 2, arrives
    got = load_powers(Ladder(PI), LINE, np.array([CARRIER]), np.array([1.0]))
    np.testing.assert_allclose(got, [500.0], rtol=1e-12)


def test_level_of_no_power_is_minus_infinity():
    np.testing.assert_array_equal(decibels(np.array([2.0, 0.2, 0.0])), [0.0, -10.0, -math.inf])


def test_terminations_are_impedances_at_the_harmonics_against_the_load_resistance():
    got = terminations(Ladder(LOSSY), REACTIVE, CARRIER, 1000.0, range(2, 6))
    f = CARRIER * np.arange(2, 6)
    expected = np.abs(seen_impedance(LOSSY, REACTIVE.impedance(f), f)) / 1000
    assert [n for n, _ in got] == [2, 3, 4, 5]
    np.testing.assert_allclose([ratio for _, ratio in got], expected, rtol=1e-11)


def dip_by_waveform(branches, load: SeriesLoad, theta: float, orders: int, resistance: float) -> float:
    """The dip from a sampled pulse, its transform, scikit-rf impedances and the transform back."""
    count = 1 << 14
    x = 2 * math.pi * np.arange(count) / count
    pulse = np.maximum((np.cos(x) - math.cos(theta)) / (1 - math.cos(theta)), 0)
    spectrum = np.fft.rfft(pulse)
    f = CARRIER * np.arange(1, orders + 1)
    volts = np.zeros_like(spectrum)
    volts[1 : orders + 1] = spectrum[1 : orders + 1] * seen_impedance(branches, load.impedance(f), f)
    swing = 2 / count * spectrum[1].real * resistance
    lowest = -np.fft.irfft(volts).max()
    return float((-swing - lowest) / swing)


SERIES_FIRST = l_network(12.5 + 0j, 50 + 0j, carrier=CARRIER)


@pytest.mark.parametrize(
    ("branches", "resistance"), [(PI, 1000.0), (LOSSY, 1000.0), (SERIES_FIRST, 12.5)], ids=["pi", "lossy", "coil-first"]
)
@pytest.mark.parametrize("theta", [0.5, math.pi / 3, math.pi / 2])
def test_trough_dip_is_that_of_a_waveform_made_in_time(branches, resistance, theta):
    a = pulse_coefficients(theta, highest_order=24)
    got = trough_dip(
        Ladder(branches), LINE, carrier=CARRIER, coefficients=a, peak_current=1.0, swing=float(a[1]) * resistance
    )
    # phases half a degree apart miss the deepest point by up to (24 pi/720)^2/2 of the highest order's share
    expected = dip_by_waveform(branches, LINE, theta, 24, resistance)
    assert got == pytest.approx(expected, abs=2e-3 * max(1.0, expected))


def test_trough_dip_of_a_class_a_stage_is_nothing():
    a = pulse_coefficients(math.pi, highest_order=24)
    got = trough_dip(Ladder(PI), LINE, carrier=CARRIER, coefficients=a, peak_current=1.0, swing=500.0)
    assert got == pytest.approx(0.0, abs=1e-12)


def test_coil_first_network_dips_far_more_than_a_pi():
    a = pulse_coefficients(math.pi / 3, highest_order=24)
    dips = [
        trough_dip(
            Ladder(branches), LINE, carrier=CARRIER, coefficients=a, peak_current=1.0, swing=float(a[1]) * resistance
        )
        for branches, resistance in ((PI, 1000.0), (SERIES_FIRST, 12.5))
    ]
    assert dips[0] < 0.1 < 1 < dips[1]
