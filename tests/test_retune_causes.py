"""Readings to causes: what they imply, seeded faults found, groups, the next reading; and the tune-up's figures."""

from __future__ import annotations

import math
from collections import Counter
from dataclasses import replace

import faults
import numpy as np
import pytest
from conftest import PROJECT

from rfstage import design, load_job, load_stage, pulse_coefficients
from rfstage.errors import InputError, OutOfRangeError
from rfstage.load import MeasuredLoad
from rfstage.retuning.causes import EXPLAINED, causes, next_words
from rfstage.retuning.explaining import TABLE_ERROR, explain, refined
from rfstage.retuning.explored import BETWEEN, FINE, LOGS, MIDDLE, Column, Explored, dip_of, suspects
from rfstage.retuning.procedure import procedure
from rfstage.retuning.reading import Reading, check_readings, implied
from rfstage.stage import PartData
from rfstage.stagevalues import fitted_value, with_value
from rfstage.steady import settle
from rfstage.sweep import sweep

EXACT = 2e-3  # what readings without noise are taken to be good to: several times the error of 32 orders


@pytest.fixture(scope="module")
def boathouse():
    return load_stage(PROJECT / "examples" / "boathouse.toml")


@pytest.fixture(scope="module")
def explored(boathouse):
    return Explored(boathouse)


def read(stage, *, suspect=None, factor=1.0, digits=None, **settings):
    """What the meters read on a stage with one thing off, at settings that are off too if they are the suspect."""
    for part, value in settings.items():
        stage = with_value(stage, part, value)
    if suspect is not None:
        stage = with_value(stage, suspect, fitted_value(stage, suspect) * factor)
    state = settle(stage)
    shown = (lambda x: float(f"{x:.{digits}g}")) if digits else float
    return Reading(
        dc_current=shown(state.dc_current),
        output_power=shown(state.output_power),
        supply=24.0,
        settings=tuple(settings.items()),
    )


SUSPECTS = [("L1", 1.09), ("C1", 1.2), ("C2", 1.15), ("load.resistance", 1.3), ("drive.amplitude", 0.85)]


@pytest.mark.parametrize(("suspect", "factor"), SUSPECTS)
def test_an_exact_fault_is_first_with_its_value_at_three_settings(boathouse, explored, suspect, factor):
    readings = [read(boathouse, suspect=suspect, factor=factor, C1=c) for c in (13.5e-9, 15e-9, 17e-9)]
    best = causes(boathouse, readings, meter_error=EXACT, explored=explored).causes[0]
    assert best.part == suspect
    # 32 orders are good to a part in a thousand of a reading, and a reading moves about as fast as the suspect
    assert best.estimated / best.nominal == pytest.approx(factor, rel=1e-3)
    assert best.misfit < 1


@pytest.mark.parametrize(("suspect", "factor"), SUSPECTS)
def test_the_best_cause_explains_the_readings_when_it_is_settled(boathouse, explored, suspect, factor):
    """An independent route: the stage with the estimated value, settled, reads what was read."""
    readings = [read(boathouse, suspect=suspect, factor=factor, digits=4, C2=c) for c in (5.6e-9, 6.2e-9, 7e-9)]
    best = causes(boathouse, readings, meter_error=EXACT, explored=explored).causes[0]
    for reading in readings:
        again = read(
            boathouse, suspect=best.part, factor=best.estimated / best.nominal, C2=dict(reading.settings)["C2"]
        )
        assert again.dc_current == pytest.approx(reading.dc_current, rel=3 * EXACT)
        assert again.output_power == pytest.approx(reading.output_power, rel=3 * EXACT)


def test_a_sound_stage_needs_no_cause(boathouse, explored):
    found = causes(boathouse, [read(boathouse)], explored=explored)
    assert found.as_built_misfit < 0.1
    assert all(c.misfit < 0.1 for c in found.leading)
    assert {c.part for c in found.leading} == set(suspects(boathouse, found.readings))


def test_readings_of_two_faults_are_said_to_be_explained_by_none(boathouse, explored):
    twice = with_value(with_value(boathouse, "L1", 0.8 * 422e-9), "load.resistance", 130.0)
    readings = [read(twice, C1=c) for c in (13.5e-9, 15e-9, 17e-9)]
    found = causes(boathouse, readings, explored=explored)
    assert not found.explained
    assert found.causes[0].misfit > EXPLAINED
    assert found.next_reading is None


def test_what_is_off_by_less_comes_first_of_what_explains_as_well(boathouse, explored):
    found = causes(boathouse, [read(boathouse, suspect="L1", factor=1.09, digits=3)], explored=explored)
    for one, other in zip(found.causes, found.causes[1:], strict=False):
        assert one.cost <= other.cost
        assert one.group <= other.group
    assert found.causes[0].group == 1


def test_the_next_reading_tells_the_leading_group_apart(boathouse, explored):
    first = read(boathouse, suspect="L1", factor=1.09, digits=3)
    found = causes(boathouse, [first], explored=explored)
    assert {c.part for c in found.leading} == {"L1", "drive.amplitude"}
    then = found.next_reading
    assert then is not None
    assert then.apart > 10
    settings = dict(then.setting.settings)
    for part, current, power in then.expected:
        cause = next(c for c in found.causes if c.part == part)
        shown = read(boathouse, suspect=part, factor=cause.estimated / cause.nominal, **settings)
        # what it says a cause would show is what that cause shows: 32 orders against those chosen
        assert (shown.dc_current, shown.output_power) == pytest.approx((current, power), rel=2e-3)
    second = read(boathouse, suspect="L1", factor=1.09, digits=3, **settings)
    assert [c.part for c in causes(boathouse, [first, second], explored=explored).leading] == ["L1"]
    words = next_words(found)
    assert words is not None
    assert words.startswith("set C2 to 5.40 nF, then read dc current and output")


def test_the_next_reading_puts_back_what_was_turned(boathouse, explored):
    off = read(boathouse, suspect="L1", factor=1.09, C1=14.5e-9)
    found = causes(boathouse, [off], meter_error=0.03, explored=explored)
    words = next_words(found)
    assert words is not None
    turned = [part for part, _ in found.next_reading.setting.settings]
    assert ("put C1 back to 15.0 nF" in words) == ("C1" not in turned)
    assert turned == ["C2"]


def test_a_dip_without_a_dial_is_a_reading_too(boathouse, explored):
    off = with_value(boathouse, "L1", 1.05 * 422e-9)
    along = sweep(off, "C1", np.linspace(11e-9, 16e-9, 41).tolist())
    assert along.dip is not None
    at = settle(with_value(off, "C1", along.dip.value))
    blind = Reading(dc_current=at.dc_current, output_power=at.output_power, supply=24.0, dip="C1")
    placed = replace(blind, settings=(("C1", along.dip.value),))
    as_set = read(off)
    for dip in (blind, placed):
        found = causes(boathouse, [as_set, dip], meter_error=EXACT, explored=explored)
        assert found.causes[0].part == "L1"
        assert found.causes[0].estimated == pytest.approx(1.05 * 422e-9, rel=3e-3)


def test_a_dial_that_is_off_shows_at_the_dip(boathouse, explored):
    """The dip is where C1 really is 8 % more than its dial says."""
    place = dip_of(boathouse, "C1") / 1.08
    dip = Reading(supply=24.0, dip="C1", settings=(("C1", place),))
    found = causes(boathouse, [dip, read(boathouse, suspect="C1", factor=1.08)], explored=explored)
    assert found.causes[0].part == "C1"
    # the place of the dip is known to the step of a coarse sweep here, 2.5 %
    assert found.causes[0].estimated / found.causes[0].nominal == pytest.approx(1.08, abs=0.02)


def test_the_dip_of_a_column_is_the_dip_of_a_sweep(boathouse, explored):
    """An independent route: a fine sweep of the stage with the suspect moved."""
    k = MIDDLE + 4
    column = explored.column(Reading(dip="C1", supply=24.0), "L1")
    off = with_value(boathouse, "L1", 422e-9 * math.exp(LOGS[k]))
    place = math.exp(column.logs[2, k])
    fine = sweep(off, "C1", (place * np.linspace(0.97, 1.03, 61)).tolist())
    assert fine.dip is not None
    # the dip is flat: a thousandth in place is a millionth in current
    assert fine.dip.value == pytest.approx(place, rel=2e-3)
    assert fine.dip.figure == pytest.approx(math.exp(column.logs[0, k]), rel=1e-3)


def test_between_its_points_a_column_is_what_is_settled_there(explored):
    """Within what is said of its error, which is largest at the corner where the voltage reaches the knee."""
    column = explored.column(Reading(supply=24.0), "L1")
    some = slice(MIDDLE * BETWEEN - 110, MIDDLE * BETWEEN + 120, 21)
    settled = explored.settled_at(Reading(supply=24.0), "L1", FINE[some])
    for row in (0, 1):
        assert np.abs(column.along(row)[some] - settled[row]).max() < TABLE_ERROR


@pytest.mark.parametrize("factor", [1.08, 0.93])
def test_a_part_off_either_way_is_told_with_both_values_and_the_next_reading_tells_which(factor):
    # a sharp tank off tune one way or the other lowers the output alike, and a tube's anode current says nothing of it
    tower = design(load_job(PROJECT / "examples" / "tower.toml")).stage
    now = fitted_value(tower, "C1")
    tower = replace(tower, part_data={**tower.part_data, "C1": PartData(trim=(0.8 * now, 1.25 * now))})
    off = with_value(tower, "L1", factor * fitted_value(tower, "L1"))

    def meters(stage, reading):
        state = settle(stage)
        return replace(reading, dc_current=state.dc_current, output_power=state.output_power)

    first = meters(off, Reading())
    found = causes(tower, [first])
    values = sorted(c.estimated / c.nominal for c in found.leading if c.part == "L1")
    assert len(values) == 2
    assert values[0] < 1 < values[1]
    assert min(abs(v / factor - 1) for v in values) < 5e-3
    assert next_words(found).count("if it is L1 at ") == 2
    setting = found.next_reading.setting
    second = meters(with_value(off, *setting.settings[0]), setting)
    again = causes(tower, [first, second]).leading
    assert [c.part for c in again] == ["L1"]
    assert again[0].estimated / again[0].nominal == pytest.approx(factor, rel=5e-3)


def test_a_refined_fit_has_less_misfit_than_its_column_gave(boathouse, explored):
    readings = [read(boathouse, suspect="L1", factor=0.985, C1=c) for c in (14.5e-9, 15.5e-9)]
    rough = explain(explored, "L1", readings, EXACT)[0]
    fine = refined(rough, explored, readings, EXACT)
    assert fine.misfit < rough.misfit
    # 32 orders against those chosen, a part in a thousand
    assert math.exp(fine.log) == pytest.approx(0.985, rel=5e-4)
    assert fine.misfit * EXACT < 1e-3


def test_a_column_says_nothing_beyond_a_gap():
    row = np.where((LOGS > -0.3) & (LOGS < 0.5), LOGS**2, math.nan)
    found = Column(np.array([row, row, row])).along(0)
    known = FINE[np.isfinite(found)]
    assert -0.3 < known.min() < -0.2
    assert 0.4 < known.max() < 0.5
    # a parabola is met exactly by cubics
    assert np.nanmax(np.abs(found - FINE**2)) < 1e-12
    assert np.isnan(Column(np.full((3, LOGS.size), math.nan)).along(1)).all()


def test_what_was_read_is_no_suspect(boathouse):
    def named(**meters):
        return suspects(boathouse, [Reading(dc_current=1.0, **meters)])

    assert named() == ("C1", "L1", "C2", "load.resistance", "drive.amplitude", "supply.voltage")
    assert named(supply=24.0, drive=2.7) == ("C1", "L1", "C2", "load.resistance")
    measured = MeasuredLoad(np.array([1e6, 9e6]), np.array([50 + 0j, 50]), "jetty.s1p")
    assert "load.resistance" not in suspects(replace(boathouse, load=measured), [Reading(dc_current=1.0)])


def test_efficiency_angle_and_resistance_come_back_from_a_textbook_stage(boathouse):
    """An independent route: readings made by the textbook's own relations."""
    half = math.radians(70)
    a = pulse_coefficients(half, highest_order=1)
    drive = 0.9 / math.cos(half)  # threshold 3 V, bias 2.1 V
    peak = 4.0 * drive * (1 - math.cos(half))
    dc, fundamental = peak * float(a[0]), peak * float(a[1])
    walk = boathouse.ladder.walk(3.6e6, 50.0)
    in_load = abs(complex(walk.transimpedance)) ** 2 / 50 * fundamental**2 / 2
    for said in (
        Reading(dc_current=dc, output_power=in_load),
        Reading(dc_current=dc, output_power=in_load, drive=drive),
    ):
        found = implied(boathouse, said)
        assert found.conduction_angle_deg == pytest.approx(140.0, rel=1e-9)
        assert found.load_resistance == pytest.approx(complex(walk.impedance).real, rel=1e-9)
        assert found.efficiency == pytest.approx(in_load / (24 * dc), rel=1e-12)


def test_between_a_push_pull_pair_half_of_the_current_sees_the_resistance(boathouse):
    one = implied(boathouse, Reading(dc_current=1.5, output_power=20.0))
    pair = replace(boathouse, device=replace(boathouse.device, pair="push-pull", output_capacitance=0.0))
    two = implied(pair, Reading(dc_current=3.0, output_power=20.0))
    assert two.conduction_angle_deg == pytest.approx(one.conduction_angle_deg)
    assert two.load_resistance == pytest.approx(one.load_resistance, rel=0.01)  # but for the choke and capacitance


def test_a_reading_without_current_or_with_a_mu_implies_no_angle(boathouse):
    assert implied(boathouse, Reading(output_power=20.0)) == (None, None, None)
    tube = replace(boathouse, device=replace(boathouse.device, amplification_factor=20.0))
    found = implied(tube, Reading(dc_current=1.5, output_power=20.0))
    assert found.efficiency == pytest.approx(20 / 36)
    assert found.conduction_angle_deg is None


@pytest.mark.parametrize(
    ("reading", "match"),
    [
        (Reading(dc_current=1.0, output_power=25.0), r"output_power of 25 W is more than the dc power of 24 W"),
        (Reading(dc_current=1.0, output_power=13.0, supply=12.0), r"more than the dc power of 12 W \(1 A from 12 V\)"),
        (Reading(dc_current=-1.0), "dc_current: got -1 A; allowed above 0 A"),
        (Reading(output_power=math.nan), "output_power: got nan W"),
        (Reading(supply=24.0), "nothing is read; give dc_current or output_power"),
        (Reading(dc_current=1.0, settings=(("C9", 1e-9),)), r"'C9' is no coil or capacitor.*did you mean 'C2'"),
        (Reading(dc_current=1.0, settings=(("C1", 20e-9),)), r"C1: got 20 nF; its trim goes from 13\.5 nF to 17 nF"),
        (Reading(dc_current=1.0, settings=(("L1", 0.0),)), "L1: got 0 H; allowed above 0 H"),
        (Reading(dc_current=1.0, dip="load"), "'load' is no coil or capacitor"),
    ],
)
def test_readings_that_cannot_be_are_refused(boathouse, reading, match):
    with pytest.raises(InputError, match=match):
        check_readings(boathouse, [reading])


def test_all_that_is_wrong_with_readings_comes_at_once(boathouse):
    with pytest.raises(InputError) as caught:
        check_readings(boathouse, [Reading(dc_current=1.0, output_power=99.0), Reading(supply=24.0), Reading(dip="Q")])
    assert [line[:11] for line in caught.value.problems] == ["--reading 1", "--reading 2", "--reading 3", "--reading 3"]


def test_no_reading_and_no_meter_are_refused(boathouse):
    with pytest.raises(InputError, match="no reading is given"):
        causes(boathouse, [])
    with pytest.raises(OutOfRangeError, match=r"meter_error must be from 0\.001 to 0\.5"):
        causes(boathouse, [Reading(dc_current=1.0)], meter_error=0.0)


def test_a_stage_without_a_dip_refuses_to_be_turned_to_it(boathouse):
    weak = replace(boathouse, drive=replace(boathouse.drive, amplitude=1.6))
    with pytest.raises(InputError, match="no dip of the dc current along C1; read it at known settings"):
        causes(weak, [Reading(dc_current=0.3, dip="C1")])


# The statistical sets of tests/bench/causes_set.py, smaller: one stage and fewer faults, the same goals.


@pytest.fixture(scope="module")
def built(boathouse):
    wide = {**boathouse.part_data, "C1": PartData(trim=(7e-9, 30e-9))}  # where all settings of the sets can be set
    return [(replace(boathouse, part_data=wide), "C1")]


def test_exact_readings_and_the_dip_name_the_fault(built, explored):
    first = dips = 0
    for fault in faults.faults(20, (1.0,), built=built):
        dip = fault.read_dip()
        if dip is None:
            continue
        dips += 1
        readings = [fault.read(None, None), dip]
        found = causes(fault.stage, readings, meter_error=EXACT, explored=explored)
        first += found.causes[0].part == fault.suspect
    assert dips >= 10
    assert first >= 0.9 * dips


def test_three_noisy_settings_name_the_fault(built, explored):
    random = np.random.default_rng(7)
    tally: Counter = Counter()
    for fault in faults.faults(25, faults.SETTINGS, seed=8, built=built):
        now = fitted_value(fault.stage, fault.trimmer)
        readings = [fault.read(now * setting, random) for setting in faults.SETTINGS]
        found = causes(fault.stage, readings, explored=explored)
        tally["first"] += found.causes[0].part == fault.suspect
        tally["leading"] += fault.suspect in [c.part for c in found.leading]
    assert tally["first"] >= 0.85 * 25
    assert tally["leading"] >= 0.95 * 25


def test_one_noisy_setting_keeps_the_fault_in_the_group_and_the_next_reading_finds_it(built, explored):
    random = np.random.default_rng(9)
    tally: Counter = Counter()
    for fault in faults.faults(25, (1.0,), seed=10, built=built):
        reading = fault.read(None, random)
        found = causes(fault.stage, [reading], explored=explored)
        tally["leading"] += fault.suspect in [c.part for c in found.leading]
        then = found.next_reading
        if then is not None:
            tally["next"] += 1
            setting = dict(then.setting.settings).get(fault.trimmer)
            more = fault.read(setting, random, supply=then.setting.supply)
            again = causes(fault.stage, [reading, more], explored=explored)
            tally["then first"] += again.causes[0].part == fault.suspect
    assert tally["leading"] >= 0.95 * 25
    assert tally["next"] >= 8
    assert tally["then first"] >= 0.9 * tally["next"]


def test_the_tune_up_shows_the_dip_and_the_peak_of_a_fine_sweep(boathouse):
    """An independent route: the same figures from sweeps four times as fine."""
    steps = procedure(boathouse)
    assert (steps.tuning, steps.loading, steps.adjustable) == ("C1", "C2", True)
    fine = sweep(boathouse, "C1", np.linspace(13.5e-9, 17e-9, 109).tolist())
    assert fine.dip is not None
    assert fine.output_peak is not None
    assert steps.dip is not None
    assert steps.output_peak is not None
    # the parabola through three of 27 points places a turning point to a tenth of their step, 0.1 %
    assert steps.dip.value == pytest.approx(fine.dip.value, rel=3e-3)
    assert steps.dip.dc_current == pytest.approx(fine.dip.figure, rel=1e-3)
    assert steps.output_peak.output_power == pytest.approx(fine.output_peak.figure, rel=1e-3)
    assert steps.below is not None
    assert steps.above is not None
    assert min(steps.below.dc_current, steps.above.dc_current) > steps.dip.dc_current
    assert steps.start_supply == 12.0
    assert steps.first_dip is not None
    assert steps.first_dip.dc_current < steps.dip.dc_current


def test_the_tune_up_says_what_the_loading_does(boathouse):
    steps = procedure(boathouse)
    assert [loading.value for loading in steps.loadings] == pytest.approx([5.58e-9, 6.2e-9, 6.82e-9])
    assert steps.loadings[0].tuned is None  # no dip is left within C1's trim
    assert steps.loadings[2].tuned is not None
    assert steps.loadings[2].tuned.dc_current < steps.loadings[1].tuned.dc_current


def test_a_stage_without_trimmers_is_tuned_by_changing_its_first_capacitor(boathouse):
    steps = procedure(replace(boathouse, part_data={}))
    assert (steps.tuning, steps.loading, steps.adjustable) == ("C1", None, False)
    assert steps.loadings == ()


def test_cautions_come_with_the_tune_up(boathouse):
    topics = [c.topic for c in procedure(boathouse).cautions]
    assert topics.index("load") < topics.index("rules")
    assert "RF burns" in topics
