"""The air solenoid: the sheet, the corrections, windings found for inductances, taps."""

from __future__ import annotations

import math

import mpmath
import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st
from scipy.integrate import quad
from scipy.special import ellipe, ellipk

from rfstage.errors import ImpossibleError, OutOfRangeError
from rfstage.parts.sheet import nagaoka, sheet_inductance, strip_correction, turns_correction
from rfstage.parts.solenoid import (
    inductance,
    length_for,
    longest,
    mutual_inductance,
    turns_for,
)

MU_0 = 4e-7 * math.pi

# SOURCE: Nagaoka's coefficient as tabulated by Rosa and Grover, Bulletin of the Bureau of Standards 8 no. 1 (1912), and
# Grover, Inductance Calculations (1946) ch. 16; recomputed from the elliptic integrals. d/l, K to six places.
PUBLISHED = [
    (0.05, 0.979092),
    (0.1, 0.958807),
    (0.2, 0.920093),
    (0.3, 0.883803),
    (0.4, 0.849853),
    (0.5, 0.818136),
    (0.6, 0.788525),
    (0.7, 0.760885),
    (0.8, 0.735079),
    (0.9, 0.710969),
    (1.0, 0.688423),
    (1.2, 0.647527),
    (1.4, 0.611488),
    (1.5, 0.595046),
    (1.6, 0.579543),
    (1.8, 0.551057),
    (2.0, 0.525510),
    (2.5, 0.471865),
    (3.0, 0.429199),
    (3.5, 0.394402),
    (4.0, 0.365432),
    (4.5, 0.340899),
    (5.0, 0.319825),
    (6.0, 0.285410),
    (7.0, 0.258406),
    (8.0, 0.236582),
    (9.0, 0.218532),
    (10.0, 0.203324),
    (20.0, 0.123615),
    (50.0, 0.061098),
    (100.0, 0.034960),
]


@pytest.mark.parametrize(("ratio", "coefficient"), PUBLISHED)
def test_the_sheet_has_nagaokas_published_coefficient(ratio, coefficient):
    assert nagaoka(ratio) == pytest.approx(coefficient, abs=1e-6)


def integrated(diameter, length):
    """Nagaoka's coefficient by Neumann's integral over the sheet; that along its two lengths is done by hand."""
    a = diameter / 2

    def along(theta):
        r = 2 * a * math.sin(theta / 2)
        return math.cos(theta) * (length * math.asinh(length / r) - math.hypot(length, r) + r)

    # twice half of the circle, the logarithm at its start kept in a short first piece
    whole = sum(
        quad(along, low, high, epsabs=0, epsrel=1e-13, limit=200)[0] for low, high in ((0, 0.1), (0.1, math.pi))
    )
    return MU_0 / (4 * math.pi) / length**2 * 2 * math.pi * a**2 * 4 * whole / (MU_0 * math.pi * a**2 / length)


@pytest.mark.parametrize("ratio", [0.05, 0.3, 1.0, 2.7, 10.0, 40.0])
def test_the_sheet_agrees_with_direct_integration(ratio):
    assert nagaoka(ratio) == pytest.approx(integrated(ratio, 1.0), rel=1e-9)


@pytest.mark.parametrize("ratio", [1e-12, 1e-6, 1e-3, 0.5, 3.0, 100.0, 1e4, 1e8])
def test_the_sheet_keeps_its_digits_from_needle_to_ring(ratio):
    with mpmath.workdps(50):
        u = mpmath.mpf(ratio)
        m, kc2 = u**2 / (1 + u**2), 1 / (1 + u**2)
        whole, second = mpmath.ellipk(m), mpmath.ellipe(m)
        # SOURCE: Lorenz's form with 50 digits, so that what cancels in it does no harm
        expected = 4 / (3 * mpmath.pi * mpmath.sqrt(kc2)) * (kc2 / m * (whole - second) + second - mpmath.sqrt(m))
        assert float(abs(nagaoka(ratio) / expected - 1)) < 2e-15


@pytest.mark.parametrize("ratio", [0.01, 0.3, 0.99, 1.01, 4.0, 100.0])
def test_the_sheet_agrees_with_lundins_handbook_formula(ratio):
    # SOURCE: R. Lundin, Proc. IEEE 73 (1985) 1428 (from memory), good to 3e-6
    def f1(x):
        return (1 + 0.383901 * x + 0.017108 * x**2) / (1 + 0.258952 * x)

    def f2(x):
        return 0.093842 * x + 0.002029 * x**2 - 0.000801 * x**3

    u = ratio
    if u <= 1:
        expected = f1(u**2) - 4 * u / (3 * math.pi)
    else:
        expected = 2 / (math.pi * u) * ((math.log(4 * u) - 0.5) * f1(1 / u**2) + f2(1 / u**2))
    assert nagaoka(u) == pytest.approx(expected, rel=3e-6)


@pytest.mark.parametrize(
    ("ratio", "percent"),
    [(0.1, -0.47), (0.3, -0.58), (0.5, -0.50), (1.0, -0.10), (1.5, 0.06), (2.0, -0.12), (3.0, -1.13)],
)
def test_wheelers_formula_is_off_by_what_is_known_of_it(ratio, percent):
    # SOURCE: H. A. Wheeler, Proc. IRE 16 (1928) 1398 (from memory): a²N²/(9a + 10b) in µH and inches, 1 % for
    # b > 0.8 a; its error recomputed to a hundredth of a percent
    length = 1.0
    a = ratio * length / 2
    wheeler = a**2 / (9 * a + 10 * length) * 1e-6
    exact = sheet_inductance(1, ratio * 25.4e-3, 25.4e-3)
    assert 100 * (wheeler / exact - 1) == pytest.approx(percent, abs=0.006)


# SOURCE: exact sum over pairs of collinear segments, recomputed to six places; the four-place table recalled of Rosa
# and Grover agrees but for N = 20
CORRECTION = [
    *((1, 0.0), (2, 0.113706), (3, 0.166261), (4, 0.197276), (5, 0.217995), (6, 0.232927), (7, 0.244259)),
    *((8, 0.253184), (9, 0.260416), (10, 0.266408), (12, 0.275789), (15, 0.285729), (20, 0.296369), (25, 0.303184)),
    *((30, 0.307953), (40, 0.314236), (50, 0.318220), (60, 0.320990), (80, 0.324612), (100, 0.326893)),
    *((200, 0.331808), (500, 0.335144), (1000, 0.336395)),
]


@pytest.mark.parametrize(("turns", "correction"), CORRECTION)
def test_correction_for_turns_has_its_tabulated_value(turns, correction):
    assert turns_correction(turns) == pytest.approx(correction, abs=1e-6)


@pytest.mark.parametrize("turns", [2, 3, 7, 8, 9, 10, 31, 200])
def test_correction_for_turns_is_the_sum_over_pairs(turns):
    # SOURCE: Rosa's definition, with the mean distance of collinear segments n apart in closed form, in 40 digits
    with mpmath.workdps(40):
        total = mpmath.mpf(0)
        for n in range(1, turns):
            ends = (n + 1) ** 2 * mpmath.log(n + 1) - 2 * n**2 * mpmath.log(n)
            ends += (n - 1) ** 2 * mpmath.log(n - 1) if n > 1 else 0
            total -= mpmath.mpf(2) / turns * (turns - n) * (ends / 2 - mpmath.mpf(3) / 2 - mpmath.log(n))
        assert turns_correction(turns) == pytest.approx(float(total), abs=1e-13)


@pytest.mark.parametrize("turns", [1.0001, 1.37, 2.5, 4.9, 8.999999, 9.000001, 9.5, 20.25, 333.3])
def test_correction_for_fractions_of_a_turn_is_barnes_function(turns):
    with mpmath.workdps(40):
        n = mpmath.mpf(turns)
        expected = 2 / n * mpmath.log(mpmath.barnesg(n + 1)) - n * mpmath.log(n) + mpmath.mpf(3) / 2 * (n - 1)
        assert turns_correction(turns) == pytest.approx(float(expected), abs=1e-12)


@pytest.mark.parametrize("turns", [1.0, 2.0, 3.0, 10.0, 44.4])
def test_correction_for_turns_agrees_with_grovers_series_as_extended(turns):
    # SOURCE: F. W. Grover's series of 1929 as extended by D. W. Knight (2010), claimed to 1.3e-8; its last
    # coefficient recomputed. Its last two terms are fitted to whole numbers: at 1.5 turns it is 2.5e-6 off
    n = turns
    series = math.log(2 * math.pi) - 1.5 - math.log(n) / (6 * n) - 0.33084236 / n - 1 / (120 * n**3)
    series += 1 / (504 * n**5) - 0.0011925 / n**7 + 0.000507 / n**9
    assert turns_correction(turns) == pytest.approx(series, abs=1.5e-8)


@pytest.mark.parametrize(
    ("ratio", "correction"),
    [
        # SOURCE: 5/4 − ln(2p/d), Rosa 1906 and Grover (from memory), recomputed to four places
        *((1.0, 0.5569), (0.9, 0.4515), (0.8, 0.3337), (0.7, 0.2002), (0.6, 0.0460), (0.5, -0.1363), (0.4, -0.3594)),
        *((0.3, -0.6471), (0.2, -1.0526), (0.1, -1.7457), (0.05, -2.4389), (0.01, -4.0483)),
    ],
)
def test_correction_for_round_wire_has_its_tabulated_value(ratio, correction):
    assert strip_correction(ratio) == pytest.approx(correction, abs=5.1e-5)


# SOURCE: benchmarks recomputed from the exact parts. turns, diameter, length, wire [mm]; sheet and coil [µH]
BENCHMARKS = [
    (10, 50.0, 50.0, 2.0, 3.39723, 3.42646),
    (10, 100.0, 50.0, 3.0, 10.37315, 10.17684),
    (20, 25.4, 50.8, 1.024, 4.10194, 4.11956),
]


@pytest.mark.parametrize("row", BENCHMARKS, ids=lambda row: f"{row[0]}x{row[1]:g}mm")
def test_benchmark_coils_have_their_inductance(row):
    turns, diameter, length, wire, sheet, coil = row
    assert sheet_inductance(turns, diameter * 1e-3, length * 1e-3) * 1e6 == pytest.approx(sheet, abs=6e-6)
    assert inductance(turns, diameter * 1e-3, length * 1e-3, wire * 1e-3) * 1e6 == pytest.approx(coil, abs=6e-6)


def rings(turns, diameter, pitch, wire):
    """Matrix of inductances of coaxial rings of round wire, by Maxwell's elliptic integrals."""
    a, r = diameter / 2, wire / 2
    places = pitch * np.arange(turns)
    apart = places[:, None] - places[None, :]
    own = MU_0 * a * (math.log(8 * a / r) - 1.75)
    k2 = 4 * a**2 / (4 * a**2 + np.where(apart == 0, 1.0, apart) ** 2)
    k = np.sqrt(k2)
    mutual = MU_0 * a * ((2 / k - k) * ellipk(k2) - 2 / k * ellipe(k2))
    return np.where(apart == 0, own, mutual)


@pytest.mark.parametrize("row", [*BENCHMARKS, (3, 40.0, 12.0, 1.5, 0, 0), (30, 20.0, 45.0, 1.0, 0, 0)], ids=str)
def test_a_coil_is_worth_its_rings_one_by_one(row):
    turns, diameter, length, wire = row[0], *(x * 1e-3 for x in row[1:4])
    # the corrections take rings for straight wires: what they neglect goes with the square of pitch over diameter
    slack = 0.15 * (length / turns / diameter) ** 2
    whole = rings(turns, diameter, length / turns, wire).sum()
    assert inductance(turns, diameter, length, wire) == pytest.approx(whole, rel=slack)


def test_a_tap_couples_as_its_rings_do():
    matrix = rings(10, 50e-3, 5e-3, 2e-3)
    low, high, mutual, coupling = mutual_inductance(10, 50e-3, 50e-3, 2e-3, tap=3)
    assert low == pytest.approx(matrix[:3, :3].sum(), rel=2e-3)
    assert high == pytest.approx(matrix[3:, 3:].sum(), rel=2e-3)
    # a difference of three inductances: what each of them lacks counts some five times
    assert mutual == pytest.approx(matrix[:3, 3:].sum(), rel=1e-2)
    assert coupling == pytest.approx(mutual / math.sqrt(low * high))


def test_a_long_coil_has_the_textbook_inductance():
    # SOURCE: exact limit, µ0 N² A/l less the ends, which are 4/(3π) of D/l
    assert sheet_inductance(1000, 1e-2, 10.0) == pytest.approx(
        MU_0 * 1000**2 * math.pi * 5e-3**2 / 10 * (1 - 4 / (3 * math.pi) * 1e-3), rel=1e-6
    )


@pytest.mark.parametrize("pitch", [2e-3, 4e-3, 8e-3])
def test_one_turn_is_a_ring_whatever_its_pitch(pitch):
    # SOURCE: exact for thin wire: µ0 a (ln(8a/r) − 7/4) with the current evenly over the section
    ring = MU_0 * 50e-3 * (math.log(8 * 50e-3 / 1e-3) - 1.75)
    assert inductance(1, 100e-3, pitch, 2e-3) == pytest.approx(ring, rel=0.5 * (pitch / 100e-3) ** 2)


def test_arrays_broadcast():
    got = inductance([[5], [10]], [40e-3, 50e-3, 60e-3], 50e-3, 2e-3)
    assert got.shape == (2, 3)
    assert got[1, 1] == inductance(10, 50e-3, 50e-3, 2e-3)
    turns = turns_for(got, [40e-3, 50e-3, 60e-3], 2e-3, length=50e-3)
    np.testing.assert_allclose(turns, [[5] * 3, [10] * 3], rtol=1e-12)
    lengths = length_for(got, [[5], [10]], [40e-3, 50e-3, 60e-3], 2e-3)
    np.testing.assert_allclose(lengths, np.full((2, 3), 50e-3), rtol=1e-10)


@st.composite
def windings(draw, least_turns=1.0):
    turns = draw(st.floats(least_turns, 300))
    diameter = draw(st.floats(2e-3, 1.0))
    wire = diameter * draw(st.floats(1e-3, 0.5))
    pitch = draw(st.floats(0, 1)) * (0.9 * diameter - wire) + wire
    return turns, diameter, turns * pitch, wire


@given(winding=windings())
def test_inductance_to_winding_and_back(winding):
    turns, diameter, length, wire = winding
    wanted = inductance(turns, diameter, length, wire)
    assert np.isfinite(wanted)
    assert wanted > 0
    by_pitch = turns_for(wanted, diameter, wire, pitch=length / turns)
    assert by_pitch == pytest.approx(turns, rel=1e-9)


@given(winding=windings())
def test_turns_on_a_given_length_give_the_inductance_again(winding):
    turns, diameter, length, wire = winding
    wanted = inductance(turns, diameter, length, wire)
    found = turns_for(wanted, diameter, wire, length=length)
    assert inductance(found, diameter, length, wire) == pytest.approx(wanted, rel=1e-9)


@given(winding=windings(least_turns=1.5))
def test_a_length_for_an_inductance_gives_it_again(winding):
    turns, diameter, length, wire = winding
    assume(length <= longest(turns, diameter, wire))
    wanted = inductance(turns, diameter, length, wire)
    found = length_for(wanted, turns, diameter, wire)
    assert turns * wire * (1 - 1e-9) <= found <= longest(turns, diameter, wire) * (1 + 1e-9)
    # near the far end the inductance hardly moves with the length, so it is the inductance that must come back
    assert inductance(turns, diameter, max(found, turns * wire), wire) == pytest.approx(wanted, rel=1e-9)


@given(winding=windings(), more=st.floats(1.001, 3))
def test_more_turns_at_one_pitch_are_more_inductance(winding, more):
    turns, diameter, length, wire = winding
    assert inductance(turns * more, diameter, length * more, wire) > inductance(turns, diameter, length, wire)


@given(winding=windings(least_turns=2.0), share=st.floats(0, 1), more=st.floats(1.001, 1.5))
def test_spread_turns_are_less_inductance_as_far_as_the_longest(winding, share, more):
    turns, diameter, _, wire = winding
    far = longest(turns, diameter, wire)
    short = turns * wire + share * (far / more - turns * wire)
    assume(turns * wire <= short <= far / more)
    assert inductance(turns, diameter, short * more, wire) < inductance(turns, diameter, short, wire) * (1 + 1e-12)


@given(winding=windings(least_turns=2.0), share=st.floats(0, 1))
def test_a_tap_parts_a_coil_into_halves_that_add_up(winding, share):
    turns, diameter, length, wire = winding
    tap = 1 + share * (turns - 2)
    low, high, mutual, coupling = mutual_inductance(turns, diameter, length, wire, tap=tap)
    assert low + high + 2 * mutual == pytest.approx(inductance(turns, diameter, length, wire), rel=1e-12)
    assert coupling < 1
    assert mutual == pytest.approx(mutual_inductance(turns, diameter, length, wire, tap=turns - tap)[2], rel=1e-6)


# ---- what is refused


def test_wire_thicker_than_the_pitch_is_refused():
    with pytest.raises(OutOfRangeError, match=r"wire_diameter must be at most the pitch, 1\.500 mm .*; got 2\.000 mm"):
        inductance([5, 10], 50e-3, 15e-3, 2e-3)


@pytest.mark.parametrize(
    "call", [lambda: inductance([40, 5], 50e-3, 0.3, 2e-3), lambda: turns_for(3e-6, 50e-3, 2e-3, pitch=60e-3)]
)
def test_a_pitch_beyond_the_diameter_is_refused(call):
    with pytest.raises(OutOfRangeError, match=r"pitch must be at most the diameter, 50\.00 mm; got 60\.00 mm"):
        call()


def test_turns_never_have_to_be_drawn_out_beyond_a_pitch_of_the_diameter():
    with pytest.raises(ImpossibleError, match=r"with 4 turns spread as far as may be"):
        turns_for(34e-9, 50e-3, 2e-3, length=200e-3)


@pytest.mark.parametrize(("turns", "tap"), [(2, 1), (6, 3), (20, 1)])
@pytest.mark.parametrize("pitch", [0.1, 0.3, 0.5, 1.0])
def test_steep_coils_still_couple_and_stay_near_their_rings(turns, tap, pitch):
    matrix = rings(turns, 1.0, pitch, 0.02)
    _, _, mutual, coupling = mutual_inductance(turns, 1.0, turns * pitch, 0.02, tap=tap)
    apart = matrix[:tap, tap:].sum() / math.sqrt(matrix[:tap, :tap].sum() * matrix[tap:, tap:].sum())
    assert mutual > 0
    assert coupling == pytest.approx(apart, abs=0.01 * pitch)  # straight-wire corrections again
    assert inductance(turns, 1.0, turns * pitch, 0.02) == pytest.approx(matrix.sum(), rel=min(0.15 * pitch**2, 0.04))


def test_wire_as_thick_as_the_coil_is_refused():
    with pytest.raises(OutOfRangeError, match=r"diameter must be above the wire's, 2\.000 mm; got 2\.000 mm"):
        inductance(1, 2e-3, 10e-3, 2e-3)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ((0.99, 50e-3, 50e-3, 2e-3), "turns must be at least 1"),
        ((math.nan, 50e-3, 50e-3, 2e-3), "turns must be at least 1"),
        ((1e6, 50e-3, 5e3, 2e-3), "turns must be at least 1 , at most 100000|turns must be at least 1, at most 100000"),
        ((10, 0, 50e-3, 2e-3), "diameter must be above 0 m"),
        ((10, 50e-3, math.inf, 2e-3), "length must be above 0 m"),
        ((10, 50e-3, -50e-3, 2e-3), "length must be above 0 m"),
        ((10, 50e-3, 50e-3, 0), "wire_diameter must be above 0 m"),
    ],
    ids=str,
)
def test_numbers_that_make_no_coil_are_refused(arguments, message):
    with pytest.raises(OutOfRangeError, match=message):
        inductance(*arguments)


def test_more_than_fits_the_length_is_refused_with_the_most_that_fits():
    most = inductance(20, 50e-3, 40e-3, 2e-3)
    with pytest.raises(
        ImpossibleError, match=r"34\.0 µH can't be had so; the nearest is 15\.21 µH with 20 turns close"
    ):
        turns_for(34e-6, 50e-3, 2e-3, length=40e-3)
    assert most == pytest.approx(15.21e-6, rel=1e-3)


def test_less_than_one_turn_is_refused_with_what_one_turn_gives():
    with pytest.raises(ImpossibleError, match=r"34\.0 nH can't be had so; the nearest is 111\.6 nH with 1 turn"):
        turns_for([34e-9, 1e-6], 50e-3, 2e-3, pitch=4e-3)
    assert inductance(1, 50e-3, 4e-3, 2e-3) == pytest.approx(111.6e-9, rel=1e-3)


def test_what_squeezing_can_not_reach_is_refused_with_the_close_wound_coil():
    with pytest.raises(
        ImpossibleError, match=r"34\.0 µH can't be had of 10 turns; the nearest is 5\.563 µH, close-wound"
    ):
        length_for(34e-6, 10, 50e-3, 2e-3)


def test_what_spreading_can_not_reach_is_refused_with_the_longest_coil():
    with pytest.raises(ImpossibleError, match=r"34\.0 nH can't be had of 10 turns; the nearest is 1\.226 µH, spread"):
        length_for(34e-9, 10, 50e-3, 2e-3)


@pytest.mark.parametrize("both", [{}, {"length": 50e-3, "pitch": 5e-3}])
def test_turns_want_a_length_or_a_pitch_and_not_both(both):
    with pytest.raises(OutOfRangeError, match="length, pitch must be one of the two"):
        turns_for(3e-6, 50e-3, 2e-3, **both)


def test_a_length_below_the_wire_is_refused():
    with pytest.raises(OutOfRangeError, match=r"length must be at least the wire's diameter, 2\.000 mm; got 1\.000 mm"):
        turns_for(3e-6, 50e-3, 2e-3, length=1e-3)


def test_a_pitch_below_the_wire_is_refused():
    with pytest.raises(OutOfRangeError, match=r"wire_diameter must be at most the pitch, 1\.000 mm"):
        turns_for(3e-6, 50e-3, 2e-3, pitch=1e-3)


@pytest.mark.parametrize("tap", [0.5, 9.5, 11.0])
def test_a_tap_outside_the_coil_is_refused(tap):
    with pytest.raises(OutOfRangeError, match="tap must be"):
        mutual_inductance(10, 50e-3, 50e-3, 2e-3, tap=tap)


def test_one_turn_can_not_be_spread():
    assert longest(1, 50e-3, 2e-3) == pytest.approx(2e-3, rel=1e-3)
