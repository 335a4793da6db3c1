"""Limits on harmonics: every branch and boundary of the published rules."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from rfstage.errors import InputError
from rfstage.limits import LIMITS, limit_named


def suppression(rule: str, carrier: float, power: float) -> float | None:
    return limit_named(rule).suppression(carrier, power)


def watts_allowed(rule: str, carrier: float, power: float) -> float:
    needed = suppression(rule, carrier, power)
    assert needed is not None
    return power * 10 ** (-needed / 10)


# SOURCE: 47 CFR 97.307(d), (e), read in a reprint; the figures per power are recomputed from it.
# power [W], new rule below 30 MHz: largest spurious [W], old rule [dB], 30-225 MHz: [dB] and largest [W]
DERIVED = [
    (0.05, 2.506e-6, 30.0, 36.99, 10e-6),
    (0.1, 5.012e-6, 30.0, 40.00, 10e-6),
    (0.25, 12.53e-6, 30.0, 40.00, 25e-6),
    (1.0, 50.1e-6, 30.0, 46.02, 25e-6),
    (5.0, 250.6e-6, 40.0, 53.01, 25e-6),
    (25.0, 1.253e-3, 40.0, 60.00, 25e-6),
    (50.0, 2.506e-3, 40.0, 60.00, 50e-6),
    (100.0, 5.012e-3, 40.0, 60.00, 100e-6),
    (1500.0, 75.2e-3, 44.77, 60.00, 1.5e-3),
]


@pytest.mark.parametrize("row", DERIVED, ids=lambda row: f"{row[0]:g}W")
def test_new_rule_below_30_mhz_allows_the_derived_power(row):
    assert watts_allowed("us-amateur", 14e6, row[0]) == pytest.approx(row[1], rel=1e-3)  # printed to 3 or 4


@pytest.mark.parametrize("row", DERIVED, ids=lambda row: f"{row[0]:g}W")
def test_new_rule_below_30_mhz_asks_43_db_at_any_power(row):
    assert suppression("us-amateur", 14e6, row[0]) == 43.0


@pytest.mark.parametrize("row", DERIVED, ids=lambda row: f"{row[0]:g}W")
def test_old_rule_below_30_mhz_asks_the_derived_suppression(row):
    assert suppression("us-amateur-before-2003", 14e6, row[0]) == pytest.approx(row[2], abs=0.005)


@pytest.mark.parametrize("rule", ["us-amateur", "us-amateur-before-2003"])
@pytest.mark.parametrize("row", DERIVED, ids=lambda row: f"{row[0]:g}W")
def test_rule_from_30_to_225_mhz_asks_the_derived_suppression(row, rule):
    assert suppression(rule, 50e6, row[0]) == pytest.approx(row[3], abs=0.005)


@pytest.mark.parametrize("row", DERIVED, ids=lambda row: f"{row[0]:g}W")
def test_rule_from_30_to_225_mhz_allows_the_derived_power(row):
    assert watts_allowed("us-amateur", 144e6, row[0]) == pytest.approx(row[4], rel=1e-3)


@pytest.mark.parametrize(
    ("power", "formula"),
    [
        # SOURCE: the piecewise form of 47 CFR 97.307(e), recomputed: 50 + 10 log P below 0.1 W, 40 dB to
        # 0.25 W, 46 + 10 log P to 25 W (exactly 10 log(P/25 uW)), 60 dB above.
        (0.02, lambda p: 50 + 10 * math.log10(p)),
        (0.0999, lambda p: 50 + 10 * math.log10(p)),
        (0.15, lambda _: 40.0),
        (0.2499, lambda _: 40.0),
        (0.3, lambda p: 10 * math.log10(p / 25e-6)),
        (24.9, lambda p: 10 * math.log10(p / 25e-6)),
        (25.0001, lambda _: 60.0),
    ],
)
def test_each_piece_of_the_rule_from_30_to_225_mhz_has_its_formula(power, formula):
    assert suppression("us-amateur", 100e6, power) == pytest.approx(formula(power), abs=1e-9)


# SOURCE: 47 CFR 97.307(d), (e), boundary words: "below 30 MHz", "between 30 and 225 MHz", "25 W or less",
# "less than 5 W".
def test_exactly_30_mhz_belongs_to_the_rule_above():
    assert suppression("us-amateur", 30e6, 100.0) == 60.0


def test_just_below_30_mhz_belongs_to_the_rule_below():
    assert suppression("us-amateur", math.nextafter(30e6, 0), 100.0) == 43.0


def test_exactly_225_mhz_still_has_a_figure():
    assert suppression("us-amateur", 225e6, 100.0) == 60.0


@pytest.mark.parametrize("rule", ["us-amateur", "us-amateur-before-2003"])
def test_above_225_mhz_there_is_no_figure(rule):
    assert suppression(rule, math.nextafter(225e6, math.inf), 100.0) is None


def test_exactly_25_watts_gives_the_same_by_both_branches():
    assert suppression("us-amateur", 50e6, 25.0) == pytest.approx(60.0, abs=1e-12)


def test_exactly_5_watts_is_not_less_than_5_watts():
    assert suppression("us-amateur-before-2003", 14e6, 5.0) == 40.0


def test_just_below_5_watts_the_old_rule_asks_30_db():
    assert suppression("us-amateur-before-2003", 14e6, math.nextafter(5.0, 0)) == 30.0


@pytest.mark.parametrize(("power", "binds"), [(499.0, False), (500.0, False), (501.0, True), (1500.0, True)])
def test_50_milliwatts_bind_the_old_rule_above_500_watts_only(power, binds):
    needed = suppression("us-amateur-before-2003", 14e6, power)
    assert needed is not None
    assert (needed > 40.0 + 1e-9) is binds


def test_exactly_30_mhz_leaves_the_old_rule_for_the_one_above():
    assert suppression("us-amateur-before-2003", 30e6, 1500.0) == 60.0


@pytest.mark.parametrize("power", [0.5, 25.0, 158.0, 1500.0])
def test_43_plus_10_log_is_50_microwatts_at_any_power(power):
    # SOURCE: 43 + 10 log P is -13 dBm = 50.1 uW for each emission (recomputed); 47 CFR 80.211(a)(3), 95.779.
    assert watts_allowed("43+10log", 7e6, power) == pytest.approx(50.12e-6, rel=1e-4)


def test_43_plus_10_log_at_158_watts_is_65_db():
    # SOURCE: 47 CFR 73.44(b): 65 dB below 158 W, consistent with 43 + 10 log 158 = 64.99.
    assert suppression("43+10log", 1e6, 158.0) == pytest.approx(64.99, abs=0.005)


@pytest.mark.parametrize(
    ("carrier", "power", "expected"),
    [
        # SOURCE: ITU Radio Regulations Appendix 3 Table I, SM.329 category A (from memory): 43 + 10 log(PEP)
        # or 50 dB, whichever is less stringent, below 30 MHz; 70 dB above.
        (7e6, 1.0, 43.0),
        (7e6, 5.0, 49.99),
        (7e6, 100.0, 50.0),
        (29.999e6, 1500.0, 50.0),
        (30e6, 100.0, 63.0),
        (144e6, 500.0, 69.99),
        (144e6, 1500.0, 70.0),
    ],
)
def test_itu_rule_takes_the_less_stringent_of_its_two_figures(carrier, power, expected):
    assert suppression("itu-amateur", carrier, power) == pytest.approx(expected, abs=0.005)


def test_itu_rule_says_that_it_is_from_memory():
    assert "from memory" in LIMITS["itu-amateur"].source


@pytest.mark.parametrize("name", sorted(LIMITS))
def test_every_rule_names_its_source_and_conditions(name):
    assert LIMITS[name].name == name
    assert LIMITS[name].source
    assert LIMITS[name].conditions


def test_both_us_rules_say_when_the_station_was_installed():
    assert "after 1 January 2003" in LIMITS["us-amateur"].conditions
    assert "before 1 January 2003" in LIMITS["us-amateur-before-2003"].conditions


def test_us_rule_says_what_holds_where_it_has_no_figure():
    assert "as far as practicable" in LIMITS["us-amateur"].conditions


# SOURCE: arithmetic, 10 log10 of the ratio of two powers.
@pytest.mark.parametrize(
    ("text", "power", "expected"),
    [("60dB", 100.0, 60.0), ("60 dB", 0.1, 60.0), ("25uW", 25.0, 60.0), ("25 µW", 25.0, 60.0), ("1mW", 1.0, 30.0)],
)
def test_amount_may_be_given_in_decibels_or_watts(text, power, expected):
    assert suppression(text, 7e6, power) == pytest.approx(expected, abs=1e-12)


def test_amount_in_watts_above_the_carrier_asks_for_nothing():
    assert suppression("10W", 7e6, 5.0) is None


@pytest.mark.parametrize("text", ["0dB", "-60dB", "0W", "-1mW"])
def test_amount_of_nothing_is_refused(text):
    with pytest.raises(InputError, match=r"limit\.rule: got .* is above 0"):
        limit_named(text)


@pytest.mark.parametrize("text", ["60", "60 furlongs", "", "dB", "nan dB", "infdB", "60,5dB"])
def test_what_is_neither_rule_nor_amount_is_refused_with_what_is_allowed(text):
    with pytest.raises(InputError, match=r"limit\.rule: got .*; allowed us-amateur \| .*60dB, 25uW"):
        limit_named(text)


def test_misspelt_rule_gets_the_nearest_one():
    with pytest.raises(InputError, match=r"did you mean 'us-amateur'\?"):
        limit_named("us-amatuer")


@settings(deadline=None)
@given(rule=st.sampled_from(sorted(LIMITS)), carrier=st.floats(1e4, 1e10), power=st.floats(1e-9, 1e7))
def test_any_rule_asks_for_a_finite_suppression_above_0_db_or_for_none(rule, carrier, power):
    needed = suppression(rule, carrier, power)
    assert needed is None or (math.isfinite(needed) and needed > 0)


@settings(deadline=None)
@given(
    rule=st.sampled_from(sorted(LIMITS)),
    carrier=st.floats(1e5, 2e8),
    power=st.floats(1e-3, 1e6),
    more=st.floats(1.0, 100.0),
)
def test_more_power_never_asks_for_less_suppression(rule, carrier, power, more):
    less_power, more_power = suppression(rule, carrier, power), suppression(rule, carrier, power * more)
    assert (less_power or 0) <= (more_power or 0) + 1e-9
