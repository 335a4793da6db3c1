"""A new carrier: values that meet the wanted impedance, reach and work, and what is nearest where nothing reaches."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from conftest import PROJECT
from reference_circuits import loaded_q_by_energy, seen_impedance

from rfstage import load_stage
from rfstage.errors import ImpossibleError, InputError, OutOfRangeError
from rfstage.ladder import Branch
from rfstage.load import MeasuredLoad
from rfstage.parts.solenoid import inductance
from rfstage.retuning.carrier import WORK, retuned
from rfstage.retuning.fitting import fit_pair, fit_single, seen_by_device, tuning_parts
from rfstage.retuning.windings import ON_CORE, rewound, spread_range, wound_inductance
from rfstage.stage import PartData
from rfstage.stagevalues import fitted_value, with_value
from rfstage.steady import settle

AIR = (("turns", 6.0), ("diameter", 16e-3), ("length", 13.8e-3), ("wire", 1.2e-3))


@pytest.fixture(scope="module")
def boathouse():
    return load_stage(PROJECT / "examples" / "boathouse.toml")


@pytest.fixture(scope="module")
def near(boathouse):
    return retuned(boathouse, 3.52e6)


def named(found):
    return {tuple((c.part, c.way) for c in option.changes): option for option in found.options}


def test_pairs_show_the_device_what_it_sees_now_by_an_independent_cascade(boathouse, near):
    """An independent route: the retuned ladder as scattering matrices."""
    pairs = [option for option in near.options if len(option.changes) == 2]
    assert len(pairs) == 3
    for option in pairs:
        stage = option.stage
        seen = seen_impedance((*stage.feed, *stage.branches), 50.0, 3.52e6)[0]
        # the pairs are met to 1e-9; the branches keep their losses where the file gave them
        assert seen == pytest.approx(near.wanted, rel=1e-8)
    there = seen_impedance((*boathouse.feed, *boathouse.branches), 50.0, 3.6e6)[0]
    assert there == pytest.approx(near.wanted, rel=1e-10)


def test_each_option_is_its_stage_settled_by_itself(near):
    for option in near.options[:3]:
        stage = with_value(near.stage, "carrier", 3.52e6)
        for change in option.changes:
            stage = with_value(stage, change.part, change.wanted)
        assert settle(stage).output_power == pytest.approx(option.state.output_power, rel=1e-9)
        assert complex(stage.ladder.impedance(3.52e6, 50)) == pytest.approx(option.impedance, rel=1e-12)


def test_the_loaded_q_is_that_of_the_energies(near):
    """An independent route: node voltages; choke and blocking capacitor are left out."""
    for option in near.options[:3]:
        stage = option.stage
        branches = (*stage.feed, *stage.branches)
        counted = [b.name not in ("Lchoke", "Cblock") for b in branches]
        assert option.loaded_q == pytest.approx(loaded_q_by_energy(branches, counted, 50.0, 3.52e6), rel=1e-9)


def test_one_part_alone_is_at_the_least_mismatch(near):
    """An independent route: the derivative of the mismatch changes sign at the value."""
    seen = seen_by_device(with_value(near.stage, "carrier", 3.52e6), near.wanted)
    for option in near.options:
        if len(option.changes) == 1 and option.changes[0].part != "C1":
            name, value = option.changes[0].part, option.changes[0].wanted
            below, at, above = (float(seen.mismatch({name: value * f})) for f in (0.999, 1.0, 1.001))
            assert at < min(below, above)
            everywhere = seen.mismatch({name: value * np.geomspace(0.1, 10, 4001)})
            assert at <= everywhere.min() * (1 + 1e-6)


def test_options_that_serve_come_first_and_then_the_least_work(near):
    keys = [(not option.serves, option.work) for option in near.options]
    assert keys == sorted(keys)
    assert [c.way for c in near.options[0].changes] == ["trim"]
    assert WORK["trim"] * 2 < WORK["spread"] < WORK["tap"] < WORK["new"]


def test_the_output_of_what_serves_is_the_stages_own(near):
    for option in near.options:
        if option.serves:
            assert abs(10 * math.log10(option.state.output_power / near.before.output_power)) < 1
    assert near.untouched is not None
    assert near.untouched.output_power < 0.85 * near.before.output_power


def test_each_option_is_held_against_the_stages_own_limit(boathouse):
    found = retuned(replace(boathouse, limit_rule="us-amateur"), 3.52e6)
    for option in found.options:
        highest = max(h.level for h in option.state.harmonics if h.level is not None)
        # SOURCE: 47 CFR 97.307(d): 43 dB below 30 MHz
        assert option.limit_margin == pytest.approx(-43 - highest)
    assert all(option.limit_margin is None for option in retuned(boathouse, 3.52e6).options)


def test_the_same_carrier_asks_for_no_change(boathouse):
    found = retuned(boathouse, boathouse.carrier)
    assert found.options[0].changes == ()
    assert found.options[0].serves
    assert found.nearest is None


def test_a_squeezed_coil_has_the_wanted_inductance_by_its_geometry(near):
    change = named(near)[(("L1", "spread"),)].changes[0]
    assert change.length is not None
    ratio = float(inductance(6, 16e-3, change.length, 1.2e-3) / inductance(6, 16e-3, 13.8e-3, 1.2e-3))
    assert ratio == pytest.approx(change.wanted / change.now, rel=1e-9)
    assert change.length < 13.8e-3


def test_a_tap_is_named_where_the_coil_must_become_much_smaller(boathouse):
    found = retuned(boathouse, 5.4e6)
    change = named(found)[(("L1", "tap"),)].changes[0]
    assert change.turns is not None
    pitch = 13.8e-3 / 6
    ratio = float(inductance(change.turns, 16e-3, change.turns * pitch, 1.2e-3) / inductance(6, 16e-3, 13.8e-3, 1.2e-3))
    assert ratio == pytest.approx(change.wanted / change.now, rel=1e-9)
    assert found.options[0].within_reach


def test_a_carrier_that_nothing_fitted_reaches_says_what_is_nearest(boathouse):
    found = retuned(boathouse, 1.85e6)
    assert not any(option.serves and option.within_reach for option in found.options)
    assert found.nearest is not None
    assert 2.5e6 < found.nearest < 3.52e6
    # what is nearest is reached, and a little further is not
    again = retuned(boathouse, found.nearest * 1.01)
    assert any(option.within_reach and option.mismatch < 0.25 for option in again.options)
    assert any(change.way == "new" for option in found.options for change in option.changes if option.serves)


def test_without_trimmers_and_windings_nothing_is_within_reach(boathouse):
    found = retuned(replace(boathouse, part_data={}), 3.5e6)
    assert {change.way for option in found.options for change in option.changes} == {"new"}
    assert found.nearest is None


def test_within_reach_means_within_the_trim(near, boathouse):
    for option in near.options:
        for change in option.changes:
            trim = boathouse.part_data[change.part].trim
            if trim is not None:
                assert (change.way == "trim") == (trim[0] <= change.wanted <= trim[1])


def test_a_blocking_capacitor_is_no_tuning_part(boathouse):
    assert tuning_parts(seen_by_device(boathouse)) == ("C1", "L1", "C2")


def test_a_free_pair_has_the_solution_nearest_the_present_values_first(boathouse):
    seen = seen_by_device(boathouse)
    first = fit_pair(seen, ("C1", "C2"))[0]
    assert first.values == pytest.approx((seen.value("C1"), seen.value("C2")), rel=1e-6)
    assert first.mismatch < 1e-8


def test_a_single_fit_within_reach_stops_at_the_end(boathouse):
    seen = replace(seen_by_device(boathouse), frequency=3.3e6)
    free, held = fit_single(seen, "C1"), fit_single(seen, "C1", (13.5e-9, 17e-9))
    assert free.values[0] > 17e-9
    assert held.values[0] == pytest.approx(17e-9, rel=1e-12)
    assert held.mismatch > free.mismatch


def test_a_push_pull_pair_sees_its_tank_between_both_outputs(boathouse):
    """An independent route: half of what stands between, beside one device's own capacitance and choke."""
    pair = replace(boathouse, device=replace(boathouse.device, pair="push-pull"))
    seen = complex(seen_by_device(pair).wanted)
    half = [
        replace(b, value=float(b.value) * (2 if b.kind == "capacitor" else 0.5)) for b in boathouse.branches
    ]  # of half the impedance each
    one = seen_impedance((*boathouse.feed, *half), 25.0, 3.6e6)[0]
    assert seen == pytest.approx(2 * one, rel=1e-9)


def test_a_parallel_pair_sees_two_output_capacitances(boathouse):
    pair = replace(boathouse, device=replace(boathouse.device, pair="parallel"))
    doubled = replace(boathouse, device=replace(boathouse.device, output_capacitance=500e-12))
    assert seen_by_device(pair).wanted == pytest.approx(complex(doubled.ladder.impedance(3.6e6, 50)), rel=1e-12)


def test_the_spread_of_an_air_coil_ends_where_the_turns_touch():
    low, high = spread_range(AIR, 422e-9) or (0, 0)
    present = float(inductance(6, 16e-3, 13.8e-3, 1.2e-3))
    assert high == pytest.approx(422e-9 * float(inductance(6, 16e-3, 1.02 * 6 * 1.2e-3, 1.2e-3)) / present, rel=1e-9)
    assert low == pytest.approx(422e-9 * float(inductance(6, 16e-3, 1.5 * 13.8e-3, 1.2e-3)) / present, rel=1e-9)
    assert wound_inductance(AIR) == pytest.approx(present)


def test_a_toroid_goes_with_the_square_of_its_turns():
    wound = (("core", "T-68-2"), ("turns", 20.0))
    assert spread_range(wound, 2e-6) == pytest.approx((2e-6 * (1 - ON_CORE), 2e-6 * (1 + ON_CORE)))
    assert rewound(wound, now=2e-6, wanted=2.1e-6).way == "spread"
    found = rewound(wound, now=2e-6, wanted=4.5e-6)
    assert (found.way, found.turns) == ("new", 30.0)


def test_a_coil_without_its_winding_is_new():
    assert rewound(None, now=1e-6, wanted=1.01e-6) == ("new", None, None)
    assert spread_range((("turns", 5.0),), 1e-6) is None


def test_a_winding_that_cannot_be_wound_is_refused_by_name(boathouse):
    wound = (*AIR[:2], ("length", 5e-3), AIR[3])  # six turns of 1.2 mm wire do not stand on 5 mm
    stage = replace(boathouse, part_data={**boathouse.part_data, "L1": PartData(winding=wound)})
    with pytest.raises(InputError, match="L1: its winding can't be wound"):
        retuned(stage, 3.5e6)


def test_a_carrier_that_no_values_reach_is_impossible_and_says_what_is_nearest(boathouse):
    with pytest.raises(ImpossibleError, match=r"brings this stage to 1\.000 kHz; what can be set reaches 2\.\d+ MHz"):
        retuned(boathouse, 1e3)


def test_a_stage_that_nothing_tunes_is_impossible(boathouse):
    stage = replace(boathouse, branches=(Branch("Cblock", "series", "capacitor", 1e-6),), part_data={})
    with pytest.raises(ImpossibleError, match="no coil or capacitor of this stage tunes it"):
        retuned(stage, 3.5e6)


@pytest.mark.parametrize("carrier", [0.0, -1.0, math.nan, math.inf])
def test_a_carrier_that_is_none_is_refused(boathouse, carrier):
    with pytest.raises(OutOfRangeError, match="carrier must be finite and above 0 Hz"):
        retuned(boathouse, carrier)


def test_a_measured_load_must_reach_the_new_carrier(boathouse):
    load = MeasuredLoad(np.array([3.5e6, 3.7e6]), np.array([48 + 2j, 52 - 2j]), "jetty.s1p")
    stage = replace(boathouse, load=load)
    assert retuned(stage, 3.55e6).options[0].serves
    with pytest.raises(OutOfRangeError, match=r"within jetty\.s1p, 3\.5 MHz to 3\.7 MHz"):
        retuned(stage, 3.4e6)


def test_the_value_that_was_is_kept_in_the_change(near, boathouse):
    for option in near.options:
        for change in option.changes:
            assert change.now == fitted_value(boathouse, change.part)
