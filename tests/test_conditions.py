"""Heat in normal, detuned, mismatched and undriven condition: each against a steady state of its own."""

from __future__ import annotations

from dataclasses import replace

import pytest

from rfstage import load_stage
from rfstage.designs.conditions import conditions, tuning_part
from rfstage.errors import OutOfRangeError
from rfstage.ladder import Branch
from rfstage.stage import Drive, PartData
from rfstage.stagevalues import with_value
from rfstage.steady import settle
from rfstage.sweep import mismatched


@pytest.fixture(scope="module")
def beacon():
    from conftest import PROJECT

    return load_stage(PROJECT / "examples" / "beacon-as-built.toml")


@pytest.fixture(scope="module")
def found(beacon):
    return conditions(beacon)


@pytest.fixture(scope="module")
def class_a(beacon):
    return replace(beacon, drive=Drive(bias=0.9, amplitude=0.15))


@pytest.fixture(scope="module")
def found_in_class_a(class_a):
    return conditions(class_a, ratios=(1.0, 3.0))


def test_normal_is_the_stage_as_it_settles(beacon, found):
    state = settle(beacon)
    assert found.normal.dissipation == state.dissipation
    assert found.normal.dc_current == state.dc_current
    assert found.normal.peak_voltage == state.peak_voltage


def test_a_known_steady_state_is_taken_as_it_is(class_a, found_in_class_a):
    state = settle(class_a)
    again = conditions(class_a, state=state, ratios=(1.0, 1.2))
    assert again.normal == found_in_class_a.normal
    assert again.undriven == found_in_class_a.undriven


def test_detuned_is_the_hotter_of_ten_percent_either_way(beacon, found):
    low, high = (settle(with_value(beacon, "C1", factor * 8.8e-9)) for factor in (0.9, 1.1))
    hotter = max(low, high, key=lambda state: state.dissipation)
    # the start of an iteration moves its end by its tolerance
    assert found.detuned.dissipation == pytest.approx(hotter.dissipation, rel=1e-7)
    assert found.detuned.dc_current == pytest.approx(hotter.dc_current, rel=1e-7)
    assert found.detuned.peak_voltage == pytest.approx(max(low.peak_voltage, high.peak_voltage), rel=1e-7)
    assert found.detuned.note == f"C1 10 % {'high' if hotter is high else 'low'}"
    assert found.detuned.dissipation > found.normal.dissipation


def test_mismatched_is_hottest_where_it_says(beacon, found):
    words = found.mismatched.note
    assert words.startswith("hottest at a standing-wave ratio of 3, reflection at ")
    phase = float(words.rpartition(" ")[2].rstrip("°"))
    there = settle(mismatched(beacon, 3.0, phase))
    # one order number serves a whole sweep, another the stage by itself
    assert found.mismatched.dissipation == pytest.approx(there.dissipation, rel=1e-3)
    assert found.mismatched.dc_current == pytest.approx(there.dc_current, rel=1e-3)


@pytest.mark.parametrize(("ratio", "phase"), [(3.0, 0.0), (3.0, 95.0), (2.4, 170.0), (2.4, -65.0), (1.3, 40.0)])
def test_no_other_load_within_the_circles_is_hotter_or_goes_higher(beacon, found, ratio, phase):
    other = settle(mismatched(beacon, ratio, phase))
    assert other.dissipation <= found.mismatched.dissipation * (1 + 1e-3)
    # phases of a circle are 10 degrees apart, so that a peak between two of them is missed by little
    assert other.peak_voltage <= found.mismatched.peak_voltage * 1.005


def test_undriven_below_threshold_there_is_no_heat(found, beacon):
    assert found.undriven.dissipation == 0
    assert found.undriven.dc_current == 0
    assert found.undriven.peak_voltage == pytest.approx(beacon.supply.voltage)
    assert found.undriven.note == "draws no current at its bias of 200 mV"


def test_undriven_in_class_a_all_the_supply_power_is_heat(found_in_class_a, class_a):
    # SOURCE: energy: no RF leaves, and this choke has no resistance
    undriven = found_in_class_a.undriven
    assert undriven.dc_current > 0
    assert undriven.dissipation == pytest.approx(class_a.supply.voltage * undriven.dc_current, rel=1e-9)
    assert undriven.note == "rests at 1.84 A at its bias of 900 mV"
    # common practice, no source: class A is hottest without a signal
    assert undriven.dissipation > found_in_class_a.normal.dissipation


def test_the_hottest_condition_is_named(found, found_in_class_a):
    assert found.hottest is found.mismatched
    assert found_in_class_a.hottest is max(found_in_class_a, key=lambda condition: condition.dissipation)


def test_a_single_device_has_all_the_heat(found):
    assert all(condition.device_dissipation == condition.dissipation for condition in found)


def test_the_hotter_device_of_an_unlike_pair_has_more_than_half(class_a):
    pair = replace(class_a, device=replace(class_a.device, pair="parallel", imbalance=0.2))
    unlike = conditions(pair, ratios=(1.0, 1.5))
    for condition in unlike:
        assert 0.5 * condition.dissipation < condition.device_dissipation < condition.dissipation


def test_a_condition_that_does_not_settle_says_so_in_words(beacon):
    # a pulse of 0.16 degrees: narrower than the most orders resolve
    thin = replace(beacon, device=replace(beacon.device, threshold_softness=1e-6), drive=Drive(0.2, 0.5 * (1 + 1e-6)))
    found = conditions(thin, ratios=(1.0, 2.0))
    for condition, where in (
        (found.normal, "as built"),
        (found.detuned, "C1 10 % low"),
        (found.mismatched, "standing-wave ratios to 2"),
    ):
        assert condition[1:5] == (None, None, None, None)
        assert condition.note.startswith(f"{where}: no steady state was found (the current pulse ")
        assert "too narrow" in condition.note
        assert "\n" not in condition.note
    assert found.undriven.dissipation == 0
    assert found.hottest is found.undriven


def test_figures_that_still_moved_with_the_orders_are_said_so(beacon):
    # a hard corner and a pulse of half a degree: resolved, with hardly more samples than it takes
    thin = replace(beacon, device=replace(beacon.device, threshold_softness=0.0), drive=Drive(0.2, 0.5 * (1 + 1e-5)))
    found = conditions(thin, ratios=(1.0, 1.1))
    assert found.normal.dissipation > 0
    assert found.normal.note == "as built; the figures still moved at 256 orders"


def test_ratios_that_are_none_are_refused(beacon):
    with pytest.raises(OutOfRangeError, match="standing-wave ratio must be from 1 to 100"):
        conditions(beacon, ratios=(0.5, 2.0))
    with pytest.raises(OutOfRangeError, match="two or more, rising or falling"):
        conditions(beacon, ratios=(2.0,))


# --- which part tunes -----------------------------------------------------------------------------------


def test_the_first_part_with_a_setting_range_tunes(beacon):
    assert tuning_part(beacon).name == "C1"
    coil = replace(beacon, part_data={"C2": PartData(trim=(3e-9, 4e-9)), "L1": PartData(trim=(150e-9, 250e-9))})
    assert tuning_part(coil).name == "L1"


def test_without_ranges_the_first_shunt_capacitor_tunes(beacon):
    assert tuning_part(replace(beacon, part_data={})).name == "C1"


def test_without_a_shunt_capacitor_the_first_coil_tunes(beacon):
    left = tuple(b for b in beacon.branches if b.place == "series")
    assert tuning_part(replace(beacon, part_data={}, branches=left)).name == "L1"


def test_a_stage_without_a_tuned_part_says_so(beacon):
    block = beacon.branches[0]
    bare = replace(beacon, part_data={}, branches=(block, Branch("R1", "series", "resistor", 5.0)))
    assert tuning_part(bare) is None
    found = conditions(bare, ratios=(1.0, 1.2))
    assert found.detuned.dissipation is None
    assert found.detuned.note == "nothing to detune: the stage has no tuned part"
