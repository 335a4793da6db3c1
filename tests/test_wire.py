"""Wire: gauges, copper, skin depth, the exact resistance of a round wire, tubes."""

from __future__ import annotations

import math

import mpmath
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.special import ive

from rfstage.errors import OutOfRangeError
from rfstage.parts.gauge import gauge_diameter, gauge_name, largest_gauge, wire_diameter
from rfstage.parts.wire import (
    COPPER_RESISTIVITY,
    MU_0,
    ac_resistance,
    dc_resistance,
    internal_impedance,
    resistivity,
    skin_depth,
)
from rfstage.quantity import QuantityError

FOOT = 0.3048

# SOURCE: ASTM B258-02 as restated in a reference article, recomputed: mils and mm to four figures, ohm for 1000 ft of
# copper of 1.7241e-8 ohm m at 20 °C, to four figures.
GAUGES = [
    (10, 101.9, 2.588, 0.9988),
    (12, 80.81, 2.053, 1.588),
    (14, 64.08, 1.628, 2.525),
    (16, 50.82, 1.291, 4.016),
    (18, 40.30, 1.024, 6.385),
    (20, 31.96, 0.8118, 10.15),
    (22, 25.35, 0.6438, 16.14),
    (24, 20.10, 0.5106, 25.67),
    (26, 15.94, 0.4049, 40.81),
    (28, 12.64, 0.3211, 64.90),
    (30, 10.03, 0.2546, 103.2),
    (36, 5.00, 0.1270, 414.8),
    (40, 3.145, 0.0799, 1049.0),
]
HALF_A_DIGIT = 6e-4  # of figures printed to four places, the first of them small


@pytest.mark.parametrize("row", GAUGES, ids=lambda row: f"AWG{row[0]}")
def test_gauge_has_its_printed_diameter(row):
    gauge, mils, millimetres, _ = row
    assert gauge_diameter(gauge) / 25.4e-6 == pytest.approx(mils, rel=HALF_A_DIGIT)
    assert gauge_diameter(gauge) * 1e3 == pytest.approx(millimetres, rel=HALF_A_DIGIT)


@pytest.mark.parametrize("row", GAUGES, ids=lambda row: f"AWG{row[0]}")
def test_gauge_has_its_printed_resistance(row):
    assert dc_resistance(gauge_diameter(row[0])) * 1000 * FOOT == pytest.approx(row[3], rel=HALF_A_DIGIT)


def test_the_two_gauges_that_define_the_rest_are_exact():
    # SOURCE: ASTM B258: no. 36 is 0.0050 in, no. 0000 is 0.4600 in; the ratio of neighbours is 1.1229322
    assert gauge_diameter(36) == pytest.approx(0.0050 * 25.4e-3, rel=1e-14)
    assert gauge_diameter(-3) == pytest.approx(0.4600 * 25.4e-3, rel=1e-14)
    assert gauge_diameter(13) / gauge_diameter(14) == pytest.approx(1.1229322, abs=5e-8)


@pytest.mark.parametrize("text", ["AWG 14", "AWG14", "awg 14", "14 AWG", "14awg", "#14", " # 14 "])
def test_gauge_is_read_in_every_spelling(text):
    assert wire_diameter(text) == gauge_diameter(14)


@pytest.mark.parametrize(
    ("text", "gauge"), [("AWG 4/0", -3), ("AWG 0000", -3), ("2/0 AWG", -1), ("AWG 1/0", 0), ("AWG 0", 0), ("#000", -2)]
)
def test_thick_gauges_are_read_in_both_spellings(text, gauge):
    assert wire_diameter(text) == gauge_diameter(gauge)


def test_a_diameter_is_a_diameter():
    assert wire_diameter("2mm") == 2e-3


@pytest.mark.parametrize("text", ["AWG", "AWG 14.5", "AWG x", "#", "AWG 3/4", "fourteen", "14 MHz", ""])
def test_what_is_no_wire_is_refused(text):
    with pytest.raises(QuantityError, match="wanted"):
        wire_diameter(text)


@pytest.mark.parametrize("text", ["AWG 51", "AWG 5/0", "AWG 00000"])
def test_a_gauge_that_is_not_made_is_refused(text):
    with pytest.raises(OutOfRangeError, match=r"gauge must be AWG 4/0 to AWG 50; got AWG"):
        wire_diameter(text)


@pytest.mark.parametrize("gauge", range(-3, 51))
def test_the_thickest_gauge_within_its_own_diameter_is_itself(gauge):
    assert largest_gauge(gauge_diameter(gauge)) == gauge
    assert largest_gauge(gauge_diameter(gauge) * 0.999) in (gauge + 1, None)
    assert wire_diameter(gauge_name(gauge)) == gauge_diameter(gauge)


def test_wire_thicker_than_the_thickest_gauge_has_that_gauge_within_it():
    assert largest_gauge(50e-3) == -3


def test_copper_is_that_of_the_standard():
    # SOURCE: IEC 60028 (from memory, recomputed 0.15328/8.89e6): 58.0 MS/m at 20 °C, 0.00393 a kelvin
    assert resistivity() == pytest.approx(1 / 58.0e6, rel=3e-6)
    assert resistivity(120.0) / resistivity() == pytest.approx(1.393, rel=1e-12)
    assert resistivity(-80.0) / resistivity() == pytest.approx(0.607, rel=1e-12)


@pytest.mark.parametrize(
    ("frequency", "depth"),
    [
        # SOURCE: sqrt(rho/(pi f mu0)) recomputed for 58.0 MS/m; the rule 66/sqrt(f) mm was read
        (50.0, 9.346e-3),
        (60.0, 8.532e-3),
        (1e6, 66.09e-6),
        (3.5e6, 35.32e-6),
        (7e6, 24.98e-6),
        (14e6, 17.66e-6),
        (30e6, 12.07e-6),
        (144e6, 5.507e-6),
    ],
)
def test_skin_depth_has_its_printed_value(frequency, depth):
    assert skin_depth(frequency) == pytest.approx(depth, rel=5e-4)  # half of the last digit printed


def test_surface_resistance_of_copper_at_5_ghz():
    # SOURCE: D. K. Misra, Radio-Frequency and Microwave Communication Circuits, Ex. 5.5, p. 175: 0.018427 ohm for
    # 5.813e7 S/m; carried over from there to the copper here by the square root of the resistivities
    surface = resistivity() / skin_depth(5e9) * math.sqrt(1 / 5.813e7 / COPPER_RESISTIVITY)
    assert surface == pytest.approx(0.018427, rel=3e-5)


def exact_quotient(ratio):
    """Resistance over that of direct current, and internal inductance over μ0/8π, of a wire of radius ratio·δ."""
    with mpmath.workdps(30):
        z = mpmath.mpc(ratio, ratio)
        whole = z * mpmath.besseli(0, z) / (2 * mpmath.besseli(1, z))
        return float(whole.real), float(whole.imag * 4 / mpmath.mpf(ratio) ** 2)


@pytest.mark.parametrize("ratio", [1e-4, 0.03, 0.5, 1.0, 2.0, 5.0, 12.0, 17.67, 17.69, 40.0, 300.0, 1e4])
def test_round_wire_is_exact_against_30_digit_bessel_functions(ratio):
    frequency = 7.1e6
    diameter = 2 * ratio * skin_depth(frequency)
    z = internal_impedance(diameter, frequency)
    resistance, inductance = exact_quotient(ratio)
    assert z.real / dc_resistance(diameter) == pytest.approx(resistance, rel=1e-13)
    assert z.imag / (2 * math.pi * frequency) / (MU_0 / (8 * math.pi)) == pytest.approx(inductance, rel=1e-12)


def test_round_wire_agrees_with_scaled_bessel_functions_over_an_array():
    frequency = np.geomspace(1.0, 1e9, 200)
    z = (1 + 1j) * 1e-3 / skin_depth(frequency)
    expected = 0.5 * z * ive(0, z) / ive(1, z) * dc_resistance(2e-3)
    np.testing.assert_allclose(internal_impedance(2e-3, frequency), expected, rtol=1e-12)


@pytest.mark.parametrize("ratio", [0.05, 0.2, 0.5])
def test_resistance_rises_at_first_with_the_fourth_power(ratio):
    # SOURCE: standard expansion of the Bessel quotient (read): 1 + (r/delta)^4/48; the next term is (r/delta)^8/2880
    got = ac_resistance(2 * ratio * skin_depth(1e6), 1e6) / dc_resistance(2 * ratio * skin_depth(1e6))
    assert got - 1 == pytest.approx(ratio**4 / 48, rel=max(0.02 * (ratio / 0.5) ** 4, 1e-9 / ratio**4))


@pytest.mark.parametrize("ratio", [30.0, 1000.0])
def test_resistance_rises_in_the_end_as_radius_over_twice_the_depth(ratio):
    # SOURCE: standard asymptote (read) r/(2 delta), with its next terms 1/4 + 3 delta/(32 r)
    got = ac_resistance(2 * ratio * skin_depth(1e6), 1e6) / dc_resistance(2 * ratio * skin_depth(1e6))
    assert got == pytest.approx(ratio / 2 + 0.25 + 3 / (32 * ratio), rel=1e-5)


def exact_tube(outer, wall, frequency):
    """Resistance of a tube [ohm/m] by Bessel functions of both kinds: no field in the bore."""
    with mpmath.workdps(30):
        k = (1 + 1j) / mpmath.mpf(float(skin_depth(frequency)))
        b, a = k * outer / 2, k * (outer / 2 - wall)
        i0, k0 = mpmath.besseli(0, b), mpmath.besselk(0, b)
        i1, k1 = mpmath.besseli(1, b), mpmath.besselk(1, b)
        bore_i, bore_k = mpmath.besseli(1, a), mpmath.besselk(1, a)
        z = k * COPPER_RESISTIVITY / (mpmath.pi * outer) * (i0 * bore_k + k0 * bore_i) / (i1 * bore_k - k1 * bore_i)
        return float(z.real)


@pytest.mark.parametrize("depths", [3.0, 4.0, 10.0])
@pytest.mark.parametrize("outer", [3e-3, 6e-3, 12e-3])
def test_a_tube_of_three_skin_depths_is_a_solid_wire_within_one_percent(outer, depths):
    wall = depths * float(skin_depth(7.1e6)) * (1 + 1e-9)
    assert ac_resistance(outer, 7.1e6, wall=wall) == pytest.approx(exact_tube(outer, wall, 7.1e6), rel=0.01)


def test_a_tube_with_a_thinner_wall_is_refused_with_the_wall_it_needs():
    with pytest.raises(OutOfRangeError, match=r"wall must be at least 3 skin depths, 74\.4 µm here; got 50\.0 µm"):
        ac_resistance(6e-3, 7.1e6, wall=50e-6)


def test_a_tube_carries_direct_current_in_its_wall_only():
    # SOURCE: geometry: the section of a ring, 6 mm outside, 4 mm inside
    assert dc_resistance(6e-3, wall=1e-3) == pytest.approx(COPPER_RESISTIVITY / (math.pi * (3e-3**2 - 2e-3**2)))


@pytest.mark.parametrize("bad", [0.0, -1e-3, math.nan, math.inf])
def test_a_diameter_that_is_none_is_refused(bad):
    with pytest.raises(OutOfRangeError, match="diameter must be above 0 m"):
        internal_impedance([1e-3, bad], 7e6)


@pytest.mark.parametrize("bad", [-300.0, 1085.0, math.nan])
def test_copper_beyond_its_linear_range_is_refused(bad):
    with pytest.raises(OutOfRangeError, match="temperature must be at least -100 degC, at most 200 degC"):
        resistivity(bad)


@given(
    diameter=st.floats(1e-5, 0.1),
    frequency=st.floats(1.0, 1e10),
    factor=st.floats(1.001, 100),
    temperature=st.floats(-100, 200),
)
def test_resistance_never_falls_with_frequency_nor_below_that_of_direct_current(
    diameter, frequency, factor, temperature
):
    low, high = ac_resistance(diameter, np.array([frequency, frequency * factor]), temperature=temperature)
    assert dc_resistance(diameter, temperature=temperature) * (1 - 1e-12) <= low <= high * (1 + 1e-12)
