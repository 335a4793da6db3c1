"""The current pulse against printed figures, 50-digit arithmetic and quadrature."""

from __future__ import annotations

import math

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from rfstage.errors import OutOfRangeError
from rfstage.pulse import angle_from_ratio, operating_class, pulse_coefficients

# SOURCE: reduced-cosine coefficients a0..a5 and a1/a0 by HALF angle in degrees; recomputed from the closed
# form with 30 digits and printed to six places. The three-place rows of handbooks are tested further down.
LINEAR_TABLE = """
 30 0.110598 0.215223 0.197991  0.171466  0.138594  0.102879 1.94599
 35 0.128813 0.248207 0.221421  0.181378  0.134007  0.085903 1.92688
 40 0.146923 0.279904 0.240895  0.184536  0.121457  0.062543 1.90510
 45 0.164915 0.310164 0.256156  0.181130  0.102462  0.036226 1.88076
 50 0.182769 0.338848 0.267051  0.171657  0.078997  0.010485 1.85397
 55 0.200469 0.365831 0.273534  0.156893  0.053281 -0.011550 1.82487
 60 0.217996 0.391002 0.275664  0.137832  0.027566 -0.027566 1.79362
 65 0.235329 0.414269 0.273604  0.115630  0.003920 -0.036335 1.76038
 70 0.252448 0.435554 0.267611  0.091528 -0.015957 -0.037786 1.72532
 75 0.269330 0.454800 0.258027  0.066782 -0.030864 -0.032912 1.68863
 80 0.285952 0.471966 0.245272  0.042591 -0.040179 -0.023500 1.65051
 85 0.302288 0.487033 0.229824  0.020031 -0.043870 -0.011775 1.61116
 90 0.318310 0.500000 0.212207  0        -0.042441  0        1.57080
100 0.349291 0.519738 0.172693 -0.029988 -0.028290  0.016546 1.48798
110 0.378628 0.531597 0.131207 -0.044875 -0.007823  0.018526 1.40401
120 0.405999 0.536333 0.091888 -0.045944  0.009189  0.009189 1.32102
130 0.431020 0.535041 0.058068 -0.037326  0.017177 -0.002280 1.24134
140 0.453226 0.529157 0.031912 -0.024446  0.016090 -0.008285 1.16753
150 0.472042 0.520446 0.014215 -0.012311  0.009951 -0.007386 1.10254
160 0.486753 0.511005 0.004377 -0.004113  0.003763 -0.003343 1.04982
170 0.496456 0.503262 0.000560 -0.000551  0.000540 -0.000525 1.01371
180 0.500000 0.500000 0         0         0         0        1.00000
"""
LINEAR_ROWS = [[float(word) for word in line.split()] for line in LINEAR_TABLE.strip().splitlines()]

# SOURCE: power-law coefficients a0..a3 and a1/a0 by HALF angle in degrees and exponent; recomputed by
# quadrature, printed to five figures.
POWER_LAW_ROWS = [
    (60, 1.5, 0.19171, 0.35056, 0.26448, 0.15650, 1.8285),
    (70, 1.5, 0.22162, 0.39273, 0.26672, 0.12472, 1.7721),
    (90, 1.5, 0.27821, 0.45766, 0.23846, 0.050851, 1.6450),
    (180, 1.5, 0.42441, 0.50930, 0.072757, -0.0080841, 1.2000),
    (60, 2.0, 0.17301, 0.32065, 0.25317, 0.16540, 1.8534),
    (70, 2.0, 0.19976, 0.36063, 0.26143, 0.14366, 1.8053),
    (90, 2.0, 0.25000, 0.42441, 0.25000, 0.084883, 1.6977),
    (180, 2.0, 0.37500, 0.50000, 0.12500, 0.0, 1.3333),
]


def coefficients_of(half_angle_deg: float, highest_order: int, exponent: float = 1.0) -> np.ndarray:
    return pulse_coefficients(math.radians(half_angle_deg), highest_order=highest_order, exponent=exponent)


@pytest.mark.parametrize("row", LINEAR_ROWS, ids=lambda row: f"{row[0]:.0f}deg")
def test_linear_pulse_agrees_with_the_table_of_reduced_cosine_coefficients(row):
    got = coefficients_of(row[0], 5)
    # half a unit of the sixth place; a5 at 65 deg and a3 at 85 deg were rounded twice (at the seventh first)
    np.testing.assert_allclose(got, row[1:7], rtol=0, atol=0.56e-6)


@pytest.mark.parametrize("row", LINEAR_ROWS, ids=lambda row: f"{row[0]:.0f}deg")
def test_ratio_of_fundamental_to_dc_agrees_with_the_table(row):
    got = coefficients_of(row[0], 1)
    assert got[1] / got[0] == pytest.approx(row[7], abs=0.51e-5)  # half a unit of the fifth place


@pytest.mark.parametrize(
    ("half_angle_deg", "printed"),
    [
        # SOURCE: M. Kazimierczuk, RF Power Amplifiers, Table 2.1 (from memory); magnitudes to three places.
        (60, (0.218, 0.391, 0.276)),
        (70, (0.253, 0.436, 0.267)),
        (80, (0.286, 0.472, 0.245)),
        (90, (0.319, 0.500, 0.212)),
        (120, (0.406, 0.536, 0.092)),
    ],
)
def test_linear_pulse_agrees_with_three_place_handbook_figures(half_angle_deg, printed):
    # a unit of the last place: two of these tables' entries are rounded up
    np.testing.assert_allclose(np.abs(coefficients_of(half_angle_deg, 2)), printed, rtol=0, atol=1e-3)


@pytest.mark.parametrize("row", POWER_LAW_ROWS, ids=lambda row: f"{row[0]}deg-p{row[1]}")
def test_power_law_pulse_agrees_with_the_table(row):
    got = coefficients_of(row[0], 3, exponent=row[1])
    for value, printed in zip(got, row[2:6], strict=True):
        half_unit = 0.51 * 10.0 ** (math.floor(math.log10(abs(printed))) - 4) if printed else 1e-12
        assert value == pytest.approx(printed, abs=half_unit)


@pytest.mark.parametrize("row", POWER_LAW_ROWS, ids=lambda row: f"{row[0]}deg-p{row[1]}")
def test_power_law_ratio_of_fundamental_to_dc_agrees_with_the_table(row):
    got = coefficients_of(row[0], 1, exponent=row[1])
    assert got[1] / got[0] == pytest.approx(row[6], abs=0.51e-4)


@pytest.mark.parametrize(
    ("half_angle_deg", "exponent", "exact"),
    [
        # SOURCE: exact integrals of cos^(2p)(x/2) over a full cycle and of cos^p(x) over half a cycle.
        (180, 2.0, (3 / 8, 1 / 2, 1 / 8)),
        (90, 2.0, (1 / 4, 4 / (3 * math.pi), 1 / 4)),
        (180, 1.5, (4 / (3 * math.pi), 8 / (5 * math.pi))),
        (90, 1.0, (1 / math.pi, 1 / 2, 2 / (3 * math.pi))),
        (180, 1.0, (1 / 2, 1 / 2, 0)),
    ],
)
def test_pulse_equals_the_exact_values_where_they_are_known(half_angle_deg, exponent, exact):
    got = coefficients_of(half_angle_deg, len(exact) - 1, exponent)
    np.testing.assert_allclose(got, exact, rtol=1e-14, atol=1e-16)


@pytest.mark.parametrize(
    ("order", "exponent", "full_angle_deg", "tolerance_deg"),
    [
        # SOURCE: bounded minimisation of the closed form, recomputed; half a unit of the last place.
        (1, 1.0, 245.13, 0.006),
        (2, 1.0, 120.00, 0.006),
        (3, 1.0, 79.72, 0.006),
        (4, 1.0, 59.72, 0.006),
        (5, 1.0, 47.75, 0.006),
        (6, 1.0, 39.78, 0.006),
        (1, 1.5, 283.06, 0.006),
        (2, 1.5, 133.47, 0.006),
        (3, 1.5, 88.33, 0.006),
        (4, 1.5, 66.1, 0.06),
        (5, 1.5, 52.8, 0.06),
        (2, 2.0, 146.35, 0.006),
        (3, 2.0, 96.38, 0.006),
        (4, 2.0, 72.0, 0.06),
        (5, 2.0, 57.5, 0.06),
        # SOURCE: texts on frequency multipliers, 120 deg for the doubler (read) and the 120/n rule (from
        # memory), which is exact for n = 2 only.
        (2, 1.0, 120.0, 0.3),
        (3, 1.0, 80.0, 0.3),
        (4, 1.0, 60.0, 0.3),
        (5, 1.0, 48.0, 0.3),
        (6, 1.0, 40.0, 0.3),
    ],
)
def test_angle_of_the_strongest_harmonic_is_the_published_one(order, exponent, full_angle_deg, tolerance_deg):
    from scipy.optimize import minimize_scalar

    found = minimize_scalar(
        lambda full: -abs(coefficients_of(full / 2, order, exponent)[order]),
        bounds=(full_angle_deg - 15, full_angle_deg + 15),
        method="bounded",
        options={"xatol": 1e-6},
    )
    assert found.x == pytest.approx(full_angle_deg, abs=tolerance_deg)


@pytest.mark.parametrize(
    ("order", "half_angle_deg", "height"),
    [
        # SOURCE: the same minimisation, recomputed to six places.
        (1, 122.566, 0.536525),
        (2, 60.000, 0.275664),
        (3, 39.862, 0.184539),
        (4, 29.861, 0.138597),
        (5, 23.876, 0.110949),
        (6, 19.891, 0.092489),
    ],
)
def test_strongest_harmonic_has_the_published_height(order, half_angle_deg, height):
    assert coefficients_of(half_angle_deg, order)[order] == pytest.approx(height, abs=0.51e-6)


def test_output_capability_is_an_eighth_for_classes_a_and_b_and_greatest_near_245_degrees():
    # SOURCE: cp = a1/4; 0.125 for A and B, 0.13413 at a half angle of 122.57 deg (recomputed).
    capability = [coefficients_of(half, 1)[1] / 4 for half in (90, 180, 122.57)]
    np.testing.assert_allclose(capability, [0.125, 0.125, 0.13413], rtol=0, atol=0.51e-5)


@pytest.mark.parametrize("full_angle_deg", [40.0, 90.0, 120.0, 179.0, 180.0, 245.0, 300.0, 359.0])
def test_greatest_efficiency_equals_the_formula_of_ludwig_and_bretchko(full_angle_deg):
    # SOURCE: R. Ludwig & P. Bretchko, RF Circuit Design: Theory and Practice, Example 8-11; T the full angle.
    T = math.radians(full_angle_deg)
    expected = -0.5 * (T - math.sin(T)) / (T * math.cos(T / 2) - 2 * math.sin(T / 2))
    a = coefficients_of(full_angle_deg / 2, 1)
    assert a[1] / (2 * a[0]) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize(("full_angle_deg", "percent"), [(180.0, 78.5398), (360.0, 50.0)])
def test_greatest_efficiency_of_classes_b_and_a_is_the_printed_one(full_angle_deg, percent):
    # SOURCE: R. Ludwig & P. Bretchko, RF Circuit Design, Example 8-11 / Fig. 8-31.
    a = coefficients_of(full_angle_deg / 2, 1)
    assert 100 * a[1] / (2 * a[0]) == pytest.approx(percent, abs=0.51e-4)


# --- against 50-digit arithmetic -------------------------------------------------------------------------

FULL_ANGLES_DEG = (
    0.001,
    0.01,
    0.1,
    1.0,
    5.0,
    20.0,
    25.7142857,
    57.29,
    57.3,
    90.0,
    114.59,
    114.6,
    120.0,
    179.9999,
    180.0,
    180.0001,
    245.0,
    300.0,
    355.0,
    359.9,
    359.999,
    359.999999,
    360.0,
)


def exact_linear(theta: float, order: int) -> mpmath.mpf:
    """The printed closed form, in digits enough to bear its cancellations."""
    t = mpmath.mpf(theta)
    sine, cosine = mpmath.sin(t), mpmath.cos(t)
    if order == 0:
        return (sine - t * cosine) / (mpmath.pi * (1 - cosine))
    if order == 1:
        return (t - sine * cosine) / (mpmath.pi * (1 - cosine))
    n = order
    return (
        2 * (mpmath.sin(n * t) * cosine - n * mpmath.cos(n * t) * sine) / (mpmath.pi * n * (n * n - 1) * (1 - cosine))
    )


def exact_by_quadrature(theta: float, orders: list[int], exponent: float) -> list[mpmath.mpf]:
    """Integrate the product form: the difference of cosines turns negative by rounding at 360 degrees."""
    t, p = mpmath.mpf(theta), mpmath.mpf(exponent)
    scale = mpmath.sin(t / 2) ** 2
    # near 360 degrees the float angle falls short of pi: the factor is turned by the exact supplement
    supplement = mpmath.pi - t

    def integrand(order: int, fraction: mpmath.mpf) -> mpmath.mpf:
        delta = t * fraction
        first = mpmath.sin(supplement + delta / 2) if t > 1.5 else mpmath.sin(t - delta / 2)
        return (first * mpmath.sin(delta / 2) / scale) ** p * mpmath.cos(order * (t - delta)) * t

    integrals = [mpmath.quad(lambda u, n=n: integrand(n, u), [0, 1]) for n in orders]
    return [(1 if n == 0 else 2) / mpmath.pi * value for n, value in zip(orders, integrals, strict=True)]


@pytest.mark.parametrize("full_angle_deg", FULL_ANGLES_DEG)
def test_linear_pulse_is_within_1e_13_of_the_fundamental_to_order_25(full_angle_deg):
    half_angle = min(math.radians(full_angle_deg / 2), math.pi)
    got = pulse_coefficients(half_angle, highest_order=25)
    with mpmath.workdps(80):
        fundamental = exact_linear(half_angle, 1)
        misses = [mpmath.mpf(float(got[n])) - exact_linear(half_angle, n) for n in range(26)]
        worst = max(abs(miss / fundamental) for miss in misses)
    assert worst <= 1e-13


def test_closed_form_of_this_test_is_the_integral_it_stands_for():
    with mpmath.workdps(50):
        for theta in (1e-4, 0.9, math.pi / 2, 3.1):
            integrals = exact_by_quadrature(theta, [0, 1, 2, 7], 1.0)
            for n, integral in zip((0, 1, 2, 7), integrals, strict=True):
                miss = abs(integral - exact_linear(theta, n)) / exact_linear(theta, 1)
                assert miss <= mpmath.mpf(10) ** -35


def test_linear_pulse_keeps_its_own_digits_close_to_a_full_cycle():
    half_angle = math.pi - 1e-8
    got = pulse_coefficients(half_angle, highest_order=6)
    with mpmath.workdps(80):
        for n in range(2, 7):
            exact = exact_linear(half_angle, n)
            assert abs(mpmath.mpf(float(got[n])) / exact - 1) <= 1e-12


@pytest.mark.parametrize("exponent", [1.01, 1.5, 2.0, 2.7, 3.0])
@pytest.mark.parametrize("full_angle_deg", [0.001, 1.0, 60.0, 133.47, 180.0, 283.0, 359.99, 360.0])
def test_power_law_pulse_is_within_1e_12_of_the_fundamental_to_order_25(full_angle_deg, exponent):
    half_angle = min(math.radians(full_angle_deg / 2), math.pi)
    got = pulse_coefficients(half_angle, highest_order=25, exponent=exponent)
    orders = [0, 1, 2, 3, 10, 25]
    with mpmath.workdps(50):
        exact = exact_by_quadrature(half_angle, orders, exponent)
        worst = max(abs((mpmath.mpf(float(got[n])) - value) / exact[1]) for n, value in zip(orders, exact, strict=True))
    assert worst <= 1e-12


# --- a second route --------------------------------------------------------------------------------------


@settings(max_examples=60, deadline=None)
@given(half_angle=st.floats(0.05, math.pi), order=st.integers(0, 12), exponent=st.sampled_from([1.0, 1.5, 2.0, 3.0]))
def test_pulse_agrees_with_scipy_quadrature(half_angle, order, exponent):
    from scipy.integrate import quad

    def pulse(x: float) -> float:
        return (
            math.cos(order * x)
            * max((math.cos(x) - math.cos(half_angle)) / (1 - math.cos(half_angle)), 0.0) ** exponent
        )

    value, _ = quad(pulse, 0, half_angle, epsabs=1e-13, epsrel=1e-12, limit=200)
    expected = value * (1 if order == 0 else 2) / math.pi
    got = pulse_coefficients(half_angle, highest_order=order, exponent=exponent)[order]
    assert got == pytest.approx(expected, abs=2e-11)  # the naive integrand's own rounding at small angles


@settings(max_examples=60, deadline=None)
@given(half_angle=st.floats(1e-5, math.pi))
def test_linear_and_power_law_routes_meet_as_the_exponent_reaches_one(half_angle):
    linear = pulse_coefficients(half_angle, highest_order=8)
    close = pulse_coefficients(half_angle, highest_order=8, exponent=1 + 1e-12)
    np.testing.assert_allclose(close, linear, rtol=0, atol=2e-11 * linear[1])  # the exponent differs by 1e-12


def test_series_of_the_coefficients_rebuilds_the_pulse():
    half_angle, x = 1.1, np.linspace(0, 1.0, 11)
    a = pulse_coefficients(half_angle, highest_order=2000)
    rebuilt = np.cos(np.outer(x, np.arange(a.size))) @ a
    wanted = (np.cos(x) - math.cos(half_angle)) / (1 - math.cos(half_angle))
    np.testing.assert_allclose(rebuilt, wanted, rtol=0, atol=1e-5)  # what 2000 terms of a corner leave over


def fifteen_degree_method(ordinates: np.ndarray) -> np.ndarray:
    """dc, first, second and third peak from ordinates at 0, 15 ... 75 degrees from the crest."""
    # SOURCE: E. L. Chaffee, Rev. Sci. Instrum. 7 (1936) 384 (from memory); weights of the trapezoid rule.
    weights = np.array(
        [
            [0.5, 1, 1, 1, 1, 1],
            [1, 1.9319, 1.7321, 1.4142, 1, 0.5176],
            [1, 1.7321, 1, 0, -1, -1.7321],
            [1, 1.4142, 0, -1.4142, -2, -1.4142],
        ]
    )
    return weights @ ordinates / 12


# SOURCE: the 15-degree method and the exact pulse, dc / I1 / I2 / I3, recomputed to five places.
FIFTEEN_DEGREE_ROWS = [
    (60, (0.21484, 0.38783, 0.27884, 0.14434), (0.21800, 0.39100, 0.27566, 0.13783)),
    (70, (0.25330, 0.43633, 0.26655, 0.08967), (0.25245, 0.43555, 0.26761, 0.09153)),
    (80, (0.28668, 0.47206, 0.24375, 0.04228), (0.28595, 0.47197, 0.24527, 0.04259)),
    (90, (0.31649, 0.50000, 0.21590, 0.0), (0.31831, 0.50000, 0.21221, 0.0)),
]


@pytest.mark.parametrize(("half_angle_deg", "by_method", "exact"), FIFTEEN_DEGREE_ROWS)
def test_pulse_agrees_with_the_exact_column_beside_the_method(half_angle_deg, by_method, exact):
    np.testing.assert_allclose(coefficients_of(half_angle_deg, 3), exact, rtol=0, atol=0.51e-5)
    assert by_method != exact  # the two columns are not one figure twice


@pytest.mark.parametrize(("half_angle_deg", "by_method", "exact"), FIFTEEN_DEGREE_ROWS)
def test_fifteen_degree_method_comes_within_its_stated_accuracy(half_angle_deg, by_method, exact):
    theta, x = math.radians(half_angle_deg), np.radians(np.arange(0, 90, 15))
    ordinates = np.maximum((np.cos(x) - math.cos(theta)) / (1 - math.cos(theta)), 0.0)
    method = fifteen_degree_method(ordinates)
    np.testing.assert_allclose(method, by_method, rtol=0, atol=2e-5)  # weights printed to four places
    got = coefficients_of(half_angle_deg, 3)
    np.testing.assert_allclose(method[:2], got[:2], rtol=0.015)  # 1 to 1.5 % on dc and fundamental
    np.testing.assert_allclose(method[3], got[3], rtol=0.05, atol=1e-5)  # 5 % on the third
    assert len(exact) == len(method)


# --- shapes, class, inverse, refusals --------------------------------------------------------------------


@pytest.mark.parametrize("exponent", [1.0, 1.5])
@pytest.mark.parametrize("shape", [(), (3,), (2, 3), (0,), (2, 1, 4)])
def test_coefficients_of_an_array_stand_in_one_further_axis(shape, exponent):
    angles = np.linspace(0.2, 3.0, max(1, math.prod(shape)))[: math.prod(shape)].reshape(shape)
    assert pulse_coefficients(angles, highest_order=4, exponent=exponent).shape == (*shape, 5)


@pytest.mark.parametrize("exponent", [1.0, 1.5])
def test_an_array_of_angles_gives_the_same_bits_as_one_angle_at_a_time(exponent):
    angles = np.array([[1e-5, 0.7, 0.999999], [1.0, 2.0, math.pi]])
    together = pulse_coefficients(angles, highest_order=12, exponent=exponent)
    for index in np.ndindex(angles.shape):
        alone = pulse_coefficients(float(angles[index]), highest_order=12, exponent=exponent)
        np.testing.assert_allclose(together[index], alone, rtol=1e-15, atol=1e-17)


def test_order_zero_alone_is_the_mean():
    np.testing.assert_allclose(coefficients_of(90, 0), [1 / math.pi], rtol=1e-15)


@pytest.mark.parametrize(
    ("angle_deg", "letter"),
    # SOURCE: M. Albulet, RF Power Amplifiers, ch. 2: B at 180 deg, AB between 180 and 360 deg, A at 360 deg.
    [(360.0, "A"), (359.999, "AB"), (180.001, "AB"), (180.0, "B"), (179.999, "C"), (1.0, "C")],
)
def test_class_follows_from_the_full_angle(angle_deg, letter):
    assert operating_class(angle_deg) == letter


@settings(max_examples=100, deadline=None)
@given(half_angle=st.floats(0.05, 3.0), exponent=st.sampled_from([1.0, 1.0, 1.5, 2.0]))
def test_angle_is_found_again_from_the_ratio_of_fundamental_to_dc(half_angle, exponent):
    a = pulse_coefficients(half_angle, highest_order=1, exponent=exponent)
    found = float(angle_from_ratio(a[1] / a[0], exponent=exponent))
    # the ratio leaves 2 as half_angle^2 and reaches its least as (pi - half_angle)^3: both ends lose digits
    loss = 1 / half_angle**2 + 1 / (math.pi - half_angle) ** 3
    assert found == pytest.approx(half_angle, rel=1e-14 * (1 + 20 * loss))


@pytest.mark.parametrize(("full_angle_deg", "ratio"), [(180.0, math.pi / 2), (360.0, 1.0)])
def test_angle_of_the_exact_ratios_is_exact(full_angle_deg, ratio):
    # SOURCE: a1/a0 = pi/2 of half a cosine and 1 of a whole one, exact.
    found = math.degrees(2 * float(angle_from_ratio(ratio)))
    # at a full cycle the ratio is flat to third order, so that 1e-16 of it is 1e-5 of the angle
    assert found == pytest.approx(full_angle_deg, rel=1e-13 if full_angle_deg < 360 else 2e-5)


def test_inverse_takes_arrays():
    halves = np.array([[0.3, 1.0], [2.0, 2.9]])
    a = pulse_coefficients(halves, highest_order=1)
    np.testing.assert_allclose(angle_from_ratio(a[..., 1] / a[..., 0]), halves, rtol=1e-10)


@pytest.mark.parametrize("ratio", [2.0, 2.5, 0.999, -1.0, math.nan])
def test_ratio_that_belongs_to_no_angle_is_refused(ratio):
    with pytest.raises(OutOfRangeError, match=r"fundamental_to_dc must be from 1 .* to below 2"):
        angle_from_ratio(ratio)


def test_least_ratio_of_the_refusal_belongs_to_the_exponent():
    # SOURCE: exact, a1/a0 = 4/3 of the square law at 360 deg.
    with pytest.raises(OutOfRangeError, match=r"from 1\.33333"):
        angle_from_ratio(1.2, exponent=2.0)


@pytest.mark.parametrize("half_angle", [0.0, -0.1, 3.1416, 60.0, math.nan, math.inf, [1.0, 90.0]])
def test_half_angle_outside_half_a_cycle_is_refused_with_a_hint_at_degrees(half_angle):
    with pytest.raises(OutOfRangeError, match=r"half_angle must be in \(0, pi\] rad; got .*degrees\?"):
        pulse_coefficients(half_angle, highest_order=1)


def test_negative_order_is_refused():
    with pytest.raises(OutOfRangeError, match="highest_order must be 0 or more; got -1"):
        pulse_coefficients(1.0, highest_order=-1)


@pytest.mark.parametrize("exponent", [0.99, 3.01, math.nan, -1.0])
def test_exponent_outside_one_to_three_is_refused(exponent):
    with pytest.raises(OutOfRangeError, match="exponent must be from 1 to 3; got"):
        pulse_coefficients(1.0, highest_order=1, exponent=exponent)
