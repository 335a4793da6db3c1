"""Capacitors to buy: values near a wanted one, what each must stand, and what leads do."""

from __future__ import annotations

import itertools
import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from rfstage.errors import ImpossibleError, InputError, OutOfRangeError, RfstageError
from rfstage.ladder import Branch
from rfstage.parts.capacitor import SMALLEST, SMALLEST_SHARE, TRIMMERS, best_pair, fixed_and_trimmer, nearest_single
from rfstage.parts.leads import apparent_capacitance, check_short, nominal_capacitance, self_resonance
from rfstage.parts.preferred import SERIES, preferred_range
from rfstage.parts.stress import VOLTAGE_RATINGS, Burden, Margins, stresses, voltage_rating

wanted_values = st.floats(2e-12, 1e-7)
series_names = st.sampled_from(SERIES)
BURDEN = Burden(carrier=7.1e6, rms_current=3.0, rf_peak_voltage=95.0)


# --- values ----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("wanted", "series", "value", "percent"),
    [
        # SOURCE: the pi of 1000 and 50 ohm, input-side Q 12, at 3.5 MHz: 545.67 and 2273.6 pF (recomputed);
        # nearest of E12 and E24 by hand
        (545.67e-12, "E12", 560e-12, 2.626),
        (2273.6e-12, "E12", 2200e-12, -3.237),
        (2273.6e-12, "E24", 2200e-12, -3.237),
        (2310e-12, "E24", 2400e-12, 3.896),
    ],
)
def test_one_part_is_the_nearest_preferred_value(wanted, series, value, percent):
    found = nearest_single(wanted, series=series)
    assert found.values == (value,)
    assert found.total == value
    assert found.error_percent == pytest.approx(percent, abs=5e-4)


def test_a_pair_by_hand():
    # SOURCE: arithmetic: 2273.6 pF of E12: 1.8 nF + 470 pF = 2.27 nF, 0.16 % low; no other pair is within that
    found = best_pair(2273.6e-12)
    assert found.values == (1800e-12, 470e-12)
    assert found.error_percent == pytest.approx(100 * (2270 / 2273.6 - 1))


def test_of_equally_near_pairs_the_most_even_one_is_taken():
    # SOURCE: arithmetic: 1 nF is 820 + 180 pF and nothing else of E12; 3 nF is 2.7 + 0.3 (no E12), 1.8 + 1.2,
    # 1.5 + 1.5: the last shares the current evenly
    assert best_pair(3e-9).values == (1.5e-9, 1.5e-9)


@given(wanted=wanted_values, series=st.sampled_from(["E6", "E12", "E24"]))
def test_no_pair_of_the_series_is_nearer(wanted, series):
    found = best_pair(wanted, series=series)
    larger, smaller = found.values
    least = max(SMALLEST, SMALLEST_SHARE * wanted)
    assert least <= smaller <= larger <= wanted
    every = preferred_range(least, wanted, series=series)
    nearest = min(abs(a + b - wanted) for a, b in itertools.combinations_with_replacement(every, 2))
    assert abs(found.total - wanted) <= nearest + 2e-12 * wanted


@given(wanted=wanted_values, series=series_names)
def test_errors_are_those_of_the_totals(wanted, series):
    for found in (nearest_single(wanted, series=series), best_pair(wanted, series=series)):
        assert found.total == sum(found.values)
        assert found.total == pytest.approx(wanted * (1 + found.error_percent / 100), rel=1e-12)


@given(wanted=st.floats(10e-12, 3e-9), percent=st.floats(0.5, 20), series=series_names)
def test_fixed_part_and_trimmer_reach_the_whole_asked_range(wanted, percent, series):
    try:
        found = fixed_and_trimmer(wanted, percent=percent, series=series)
    except ImpossibleError:
        # only where the span asked is more than half of what the widest trimmer for this value gives
        assert 2 * percent / 100 * wanted > 0.5 * max(most - least for least, most in TRIMMERS if least < wanted / 2)
        return
    low, high = wanted * (1 - percent / 100), wanted * (1 + percent / 100)
    assert found.trimmer in TRIMMERS
    slack = 1e-9 * wanted  # of sums of decimals
    assert found.reach[0] - slack <= low <= high <= found.reach[1] + slack
    assert sum(found.fixed) + found.setting == pytest.approx(wanted, rel=1e-12)
    assert found.trimmer.least - slack <= found.lowest < found.setting < found.highest <= found.trimmer.most + slack
    assert not found.fixed or set(found.fixed) <= set(preferred_range(SMALLEST, wanted, series=series))


def test_a_trimmer_alone_needs_no_fixed_part():
    found = fixed_and_trimmer(50e-12, percent=10, trimmers=[(10e-12, 100e-12)])
    assert found.fixed == ()
    assert found.setting == 50e-12


def test_the_least_trimmer_that_does_it_is_taken():
    # SOURCE: arithmetic: 200 pF ± 5 % is 190 to 210 pF, a span of 20 pF. 5 to 30 pF spans 25 and asks a fixed part of
    # 180 to 185 pF: 180 pF of E12. 4 to 20 pF spans too little.
    found = fixed_and_trimmer(200e-12, percent=5)
    assert (found.fixed, found.trimmer) == ((180e-12,), (5e-12, 30e-12))
    assert found.setting == pytest.approx(20e-12)
    assert found.lowest == pytest.approx(10e-12)
    assert found.highest == pytest.approx(30e-12)


def test_a_trimmer_that_cannot_reach_is_refused_with_the_nearest():
    # SOURCE: arithmetic: 8.8 nF ± 15 % spans 2.64 nF, the widest trimmer 1.5 nF, or ± 8.52 % where its middle of
    # 1.25 nF stands beside 7.55 nF; of E12 6.8 nF + 680 pF = 7.48 nF is nearest, 8.20 % above 8.8 nF down to its end:
    # (7.48 + 2 − 8.8)/8.8 = 7.73 %
    with pytest.raises(
        ImpossibleError,
        match=r"no trimmer here reaches 8\.80 nF ± 15 %; nearest: 6\.80 nF \+ 680 pF \+ a trimmer of 500 pF to "
        r"2\.00 nF, which reaches ±7\.73 %$",
    ):
        fixed_and_trimmer(8.8e-9, percent=15)


def test_two_fixed_parts_are_taken_where_one_leaves_the_trimmer_short():
    # SOURCE: arithmetic: 8.8 nF ± 5 % asks 7.24 to 7.86 nF beside 500 pF to 2 nF: E24 has 7.5 nF, E12 nothing
    assert fixed_and_trimmer(8.8e-9, percent=5, series="E24").fixed == (7.5e-9,)
    assert fixed_and_trimmer(8.8e-9, percent=5, series="E12").fixed == (6.8e-9, 680e-12)


def test_a_value_below_every_trimmer_is_refused_with_the_nearest():
    with pytest.raises(
        ImpossibleError, match=r"reaches 500 fF ± 5 %; nearest: a trimmer of 1\.00 pF to 3\.00 pF, which spans"
    ):
        fixed_and_trimmer(0.5e-12, percent=5)


def test_a_pair_below_two_picofarads_is_refused_with_the_nearest():
    with pytest.raises(ImpossibleError, match=r"pair for 1\.30 pF .* \(one part of 1\.20 pF is nearest\)"):
        best_pair(1.3e-12)


@pytest.mark.parametrize("choose", [nearest_single, best_pair, fixed_and_trimmer])
@pytest.mark.parametrize("bad", [0.0, -1e-9, math.nan, math.inf])
def test_a_capacitance_that_is_none_is_refused(choose, bad):
    with pytest.raises(OutOfRangeError, match="wanted must be above 0 F"):
        choose(bad)


@pytest.mark.parametrize("choose", [nearest_single, best_pair, fixed_and_trimmer])
def test_an_unknown_series_is_refused(choose):
    with pytest.raises(InputError, match="series: got 'E13'"):
        choose(1e-9, series="E13")


@pytest.mark.parametrize("percent", [0.0, -5.0, 100.0, 250.0, math.nan])
def test_a_trimming_range_that_is_none_is_refused(percent):
    with pytest.raises(OutOfRangeError, match="percent must be"):
        fixed_and_trimmer(1e-9, percent=percent)


@pytest.mark.parametrize("trimmers", [[], [(10e-12, 5e-12)], [(0.0, 5e-12)], [(5e-12, 5e-12)]])
def test_trimmers_without_a_range_are_refused(trimmers):
    with pytest.raises(OutOfRangeError, match="trimmer"):
        fixed_and_trimmer(1e-9, trimmers=trimmers)


# --- stress ----------------------------------------------------------------------------------------------


@given(values=st.lists(st.floats(1e-12, 1e-8), min_size=1, max_size=4), q=st.floats(50, 5000))
def test_parallel_parts_share_current_and_loss_of_the_whole(values, q):
    found = stresses(values, BURDEN, q=q)
    assert sum(part.rms_current for part in found) == pytest.approx(BURDEN.rms_current, rel=1e-12)
    whole = stresses([sum(values)], BURDEN, q=q)[0]
    assert sum(part.loss for part in found) == pytest.approx(whole.loss, rel=1e-12)
    assert {part.peak_voltage for part in found} == {95.0}


def test_sharing_is_that_of_the_ladder():
    # an independent route: the currents of the parts' impedances under one voltage, and their losses
    values = (390e-12, 150e-12)
    branches = [Branch("C", "shunt", "capacitor", value, q=800.0) for value in values]
    volts = math.sqrt(2) * BURDEN.rms_current / abs(sum(1 / b.impedance(BURDEN.carrier) for b in branches))
    for part, branch in zip(stresses(values, BURDEN, q=800.0), branches, strict=True):
        current = volts / abs(branch.impedance(BURDEN.carrier)) / math.sqrt(2)
        assert part.rms_current == pytest.approx(current, rel=1e-9)
        assert part.loss == pytest.approx(current**2 * branch.impedance(BURDEN.carrier).real, rel=1e-9)


def test_direct_voltage_adds_to_the_peak_and_margins_to_both():
    # SOURCE: arithmetic; twice the voltage and 1.5 times the current are common practice, no source
    burden = Burden(carrier=3.65e6, rms_current=4.0, rf_peak_voltage=30.0, dc_voltage=2000.0)
    part = stresses([1e-9], burden)[0]
    assert (part.peak_voltage, part.voltage_to_stand, part.voltage_rating) == (2030.0, 4060.0, 5000.0)
    assert (part.rms_current, part.current_to_stand, part.loss) == (4.0, 6.0, None)
    tight = stresses([1e-9], burden, margins=Margins(voltage=1.0, current=1.0))[0]
    assert (tight.voltage_rating, tight.current_to_stand) == (2500.0, 4.0)


def test_a_trimmer_at_its_highest_setting_carries_more_than_its_share_of_the_wanted_value():
    # SOURCE: arithmetic: 180 pF fixed and a trimmer at 30 pF, where 3 A hold for 200 pF
    fixed, trimmer = stresses([180e-12, 30e-12], BURDEN, holds_for=200e-12)
    assert fixed.rms_current == pytest.approx(2.7)
    assert trimmer.rms_current == pytest.approx(0.45)


def test_voltage_ratings_rise_and_each_covers_itself():
    assert list(VOLTAGE_RATINGS) == sorted(set(VOLTAGE_RATINGS))
    assert all(voltage_rating(rating) == rating for rating in VOLTAGE_RATINGS)
    assert voltage_rating(math.nextafter(630.0, math.inf)) == 1000.0
    assert voltage_rating(30001.0) is None


@pytest.mark.parametrize(
    ("make", "said"),
    [
        (lambda: stresses([], BURDEN), "one capacitor or more"),
        (lambda: stresses([1e-9, 0.0], BURDEN), "a capacitor must be above 0 F; got 0 F"),
        (lambda: stresses([1e-9], BURDEN, q=0.0), "q must be above 0"),
        (lambda: stresses([1e-9], BURDEN, holds_for=-1e-9), "holds_for must be above 0 F"),
        (lambda: Margins(voltage=0.5), "voltage margin must be at least 1; got 0.5"),
        (lambda: Margins(current=math.nan), "current margin must be at least 1"),
        (lambda: Burden(carrier=0.0, rms_current=1.0, rf_peak_voltage=1.0), "carrier must be above 0 Hz"),
        (lambda: Burden(carrier=1e6, rms_current=-1.0, rf_peak_voltage=1.0), "rms_current must be at least 0 A"),
        (lambda: voltage_rating(math.nan), "voltage must be at least 0 V"),
    ],
)
def test_bad_stress_is_one_clear_line(make, said):
    with pytest.raises(OutOfRangeError) as caught:
        make()
    assert said in str(caught.value)
    assert "\n" not in str(caught.value)


# --- leads -----------------------------------------------------------------------------------------------


def test_self_resonance_of_a_published_circuit():
    # SOURCE: A. Malvino & D. Bates, Electronic Principles, 7th ed., example 12-11, p. 405: 2 uH and 470 pF, 5.19 MHz
    assert self_resonance(470e-12, lead_inductance=2e-6) == pytest.approx(5.19e6, abs=0.005e6)
    # SOURCE: NCVEC US amateur Extra question pool 2024-2028, E5A02 and others: 50 uH and 40 pF, 3.56 MHz
    assert self_resonance(40e-12, lead_inductance=50e-6) == pytest.approx(3.56e6, abs=0.005e6)


@given(value=st.floats(1e-12, 1e-8), lead=st.floats(1e-10, 1e-8), share=st.floats(0.01, 0.99))
def test_apparent_capacitance_is_that_of_the_branch_with_its_leads(value, lead, share):
    frequency = share * self_resonance(value, lead_inductance=lead)
    reactance = Branch("C", "shunt", "capacitor", value, lead_inductance=lead).impedance(frequency).imag
    apparent = apparent_capacitance(value, frequency=frequency, lead_inductance=lead)
    # the reactance is a difference that nears 0 at self-resonance, where its last digits go
    assert apparent == pytest.approx(-1 / (2 * math.pi * frequency * reactance), rel=1e-12 / (1 - share))


@given(wanted=st.floats(1e-12, 1e-6), lead=st.floats(1e-10, 1e-8), frequency=st.floats(1e5, 1e9))
def test_nominal_capacitance_with_its_leads_is_the_wanted_one(wanted, lead, frequency):
    nominal = nominal_capacitance(wanted, frequency=frequency, lead_inductance=lead)
    assert 0 < nominal < wanted
    reach = frequency / self_resonance(nominal, lead_inductance=lead)
    if reach < 0.999:  # nearer to self-resonance a float has too few digits for the way back
        got = apparent_capacitance(nominal, frequency=frequency, lead_inductance=lead)
        assert got == pytest.approx(wanted, rel=1e-11)


def test_beyond_self_resonance_there_is_no_capacitance():
    with pytest.raises(OutOfRangeError, match=r"below the self-resonance of 24\.0 MHz; got 50\.0 MHz \(above it"):
        apparent_capacitance(8.8e-9, frequency=50e6)


def test_a_blocking_capacitor_above_self_resonance_may_still_be_a_short():
    found = check_short(82e-9, frequency=14e6, allowed_reactance=0.7)
    assert found.self_resonance < 14e6
    assert found.reactance > 0
    assert found.problem == ""


def test_a_blocking_capacitor_that_is_too_small_is_told_so():
    found = check_short(1e-9, frequency=7e6, allowed_reactance=5.0)
    assert found.reactance < 0
    assert found.problem == "it leaves 22.5 Ω, more than 5.00 Ω: a larger capacitor"


@pytest.mark.parametrize("bad", [0.0, -1.0, math.nan])
def test_leads_and_frequencies_that_are_none_are_refused(bad):
    for make in (
        lambda: self_resonance(1e-9, lead_inductance=bad),
        lambda: apparent_capacitance(1e-9, frequency=bad),
        lambda: nominal_capacitance(1e-9, frequency=bad),
        lambda: check_short(1e-9, frequency=1e6, allowed_reactance=bad),
    ):
        with pytest.raises(RfstageError, match="must be above 0"):
            make()
