"""Sweeps: paths, turning points, circles of the load, modulation, and what class A and B do with the drive."""

from __future__ import annotations

import json
import math
from dataclasses import replace

import numpy as np
import pytest

from rfstage import Job, design, load_job, load_stage
from rfstage.device import JunctionCapacitance
from rfstage.errors import InputError, OutOfRangeError
from rfstage.files.sweeprecord import sweep_record, sweep_table
from rfstage.stagevalues import fitted_value, paths, with_value
from rfstage.steady import settle
from rfstage.sweep import mismatched, modulation, sweep


@pytest.fixture(scope="module")
def tower():
    from conftest import PROJECT

    return design(load_job(PROJECT / "examples" / "tower.toml")).stage


@pytest.fixture(scope="module")
def tuning(tower):
    centre = fitted_value(tower, "C1")
    return sweep(tower, "C1", np.linspace(0.9 * centre, 1.12 * centre, 45))


def test_each_point_is_the_stage_settled_by_itself(tower, tuning):
    for k in (0, 17, 44):
        alone = settle(with_value(tower, "C1", tuning.values[k]), orders=tuning.points[k].orders_solved)
        assert tuning.points[k].dc_current == pytest.approx(alone.dc_current, rel=1e-9)
        assert tuning.points[k].output_power == pytest.approx(alone.output_power, rel=1e-8)


def test_dip_efficiency_and_output_turn_at_different_places(tower, tuning):
    assert tuning.dip is not None
    assert tuning.efficiency_peak is not None
    assert tuning.output_peak is not None
    # common practice, no source: the dip lies on the high-capacitance side of the greatest output
    assert tuning.output_peak.value < tuning.efficiency_peak.value < tuning.dip.value
    fine = sweep(tower, "C1", np.linspace(0.9995, 1.0005, 21) * tuning.dip.value)
    assert fine.dip is not None
    # the parabola of the coarse sweep (step 0.5 %) places the dip to a tenth of its step
    assert tuning.dip.value == pytest.approx(fine.dip.value, rel=5e-4)
    assert min(p.dc_current for p in fine.points) >= fine.dip.figure * (1 - 1e-9)


def test_a_turning_point_at_the_edge_is_none(tower):
    centre = fitted_value(tower, "C1")
    found = sweep(tower, "C1", np.linspace(1.05 * centre, 1.1 * centre, 6))
    assert found.dip is None
    assert found.output_peak is None


def test_sweeping_back_gives_the_same_curve(tower):
    values = np.linspace(20, 110, 9)
    there, back = sweep(tower, "drive.amplitude", values), sweep(tower, "drive.amplitude", values[::-1])
    for a, b in zip(there.points, back.points[::-1], strict=True):
        assert a.dc_current == pytest.approx(b.dc_current, rel=1e-9, abs=1e-12)


def test_more_drive_gives_a_wider_angle_and_more_current(tower):
    points = sweep(tower, "drive.amplitude", np.linspace(40, 110, 8)).points
    assert np.all(np.diff([p.conduction_angle_deg for p in points]) > 0)
    assert np.all(np.diff([p.dc_current for p in points]) > 0)


def test_drive_below_the_threshold_is_a_clean_no_output(tower):
    found = sweep(tower, "drive.amplitude", [0.0, 5.0, 80.0])
    assert found.points[0].output_power == 0
    assert found.points[0].efficiency is None
    assert found.dip is None
    record = json.loads(json.dumps(sweep_record(found), allow_nan=False))
    assert record["points"][0]["efficiency"] is None
    assert sweep_table(found).splitlines()[1].split(",")[3] == ""


@pytest.mark.parametrize(("angle", "stays"), [(360.0, True), (180.0, False)])
def test_the_supply_power_of_class_a_stays_and_that_of_class_b_falls_with_the_signal(angle, stays):
    # SOURCE: textbook law of the classes: a class-A device draws its bias current whatever the signal,
    # a class-B device in proportion to it (common practice, no source)
    job = Job(network="pi", carrier=7.1e6, power=10.0, conduction_angle=angle, supply=28.0, family="fet")
    stage = design(job).stage
    full = stage.drive.amplitude
    half, whole = sweep(stage, "drive.amplitude", [full / 2, full]).points
    ratio = half.dc_power / whole.dc_power
    assert ratio == pytest.approx(1.0 if stays else 0.5, abs=0.03)
    # by the same arithmetic the heat rises from 1/2 to 7/8 of the supply power in A, from 0.21 to 0.30 in B
    assert half.dissipation > whole.dissipation
    # a quarter of the power at half the voltage; 6 % for the knee, which the full drive touches and half does not
    assert half.output_power / whole.output_power == pytest.approx(0.25, rel=0.06)


def test_the_modulator_sees_supply_voltage_over_current(tower):
    found = sweep(
        replace(tower, drive=replace(tower.drive, amplitude=1.4 * tower.drive.amplitude)),
        "supply.voltage",
        np.linspace(40, 3960, 49),
    )
    said = modulation(found)
    assert said is not None
    now = settle(found.stage)
    assert said.modulator_load == pytest.approx(2000 / now.dc_current, rel=1e-9)
    # SOURCE: audio power of full modulation is half the dc power, m²/2 (common practice, no source)
    assert said.audio_power == pytest.approx(said.depth**2 * now.dc_power / 2, rel=1e-9)
    assert said.depth == pytest.approx(0.98)
    # SOURCE: the peak at the device about doubles again at the crest: 4 times the supply (common practice, no source)
    assert 3.0 < said.peak_voltage / 2000 < 4.2


def test_overdriven_the_output_voltage_follows_the_supply_more_closely(tower):
    def straightness(times):
        stage = replace(tower, drive=replace(tower.drive, amplitude=times * tower.drive.amplitude))
        said = modulation(sweep(stage, "supply.voltage", np.linspace(400, 3600, 17)))
        assert said is not None
        return said.nonlinearity

    assert straightness(2.5) < straightness(1.0)


def test_a_circle_of_standing_wave_ratio_one_is_the_line(tower):
    circles = sweep(tower, "load", [1.0, 2.0, 5.0]).circles
    nominal = settle(tower)
    assert circles[0].dissipation == pytest.approx(nominal.dissipation, rel=1e-6)
    assert circles[0].least_output == circles[0].greatest_output
    assert circles[0].dissipation < circles[1].dissipation < circles[2].dissipation
    assert circles[2].least_output < circles[1].least_output < circles[0].least_output


def test_a_mismatched_load_has_the_ratio_asked(tower):
    z = complex(mismatched(tower, 3.0, 77.0).load.impedance(tower.carrier))
    reflection = abs((z - 50) / (z + 50))
    assert (1 + reflection) / (1 - reflection) == pytest.approx(3.0, rel=1e-12)
    assert math.degrees(np.angle((z - 50) / (z + 50))) == pytest.approx(77.0)


def test_a_path_that_is_not_there_is_answered_with_the_nearest(tower):
    with pytest.raises(InputError, match=r"did you mean 'drive.amplitude'\?"):
        sweep(tower, "drive.amplitud", [1, 2])
    with pytest.raises(InputError, match="'C9' is nothing in this stage"):
        sweep(tower, "C9", [1, 2])


@pytest.mark.parametrize("values", [[1.0], [1.0, 1.0], [1.0, 3.0, 2.0]])
def test_values_must_rise_or_fall(tower, values):
    with pytest.raises(OutOfRangeError):
        sweep(tower, "C1", values)


def test_every_path_can_be_set_and_read(tower, examples):
    junction = JunctionCapacitance(at_zero=1e-10, potential=0.8, grading=0.4)
    device = replace(load_stage(examples / "beacon-as-built.toml").device, junction_capacitance=junction)
    beacon = replace(load_stage(examples / "beacon-as-built.toml"), device=device)
    for stage in (tower, beacon):
        known = paths(stage)
        for path in known:
            if path != "load":
                value = fitted_value(stage, path)
                assert value is not None
                other = 1.01 * value or 1e-12
                assert fitted_value(with_value(stage, path, other), path) == pytest.approx(other)
    assert {
        "device.reverse_conduction.conductance",
        "device.junction_capacitance.grading",
        "L1.self_capacitance",
        "C2.lead_inductance",
        "load.reactance",
        "supply.choke_q",
    } <= set(known)


def test_a_junction_can_be_swept(examples):
    beacon = load_stage(examples / "beacon-as-built.toml")
    points = sweep(beacon, "device.reverse_conduction.conductance", [1.0, 4.0]).points
    assert points[0].output_power != points[1].output_power


def test_progress_is_reported_to_the_end(tower):
    seen = []
    sweep(tower, "C1", np.linspace(1.3e-10, 1.4e-10, 30), progress=lambda done, of: seen.append((done, of)))
    assert seen[-1] == (30, 30)
    assert len(seen) >= 2


def test_the_command_line_writes_csv_and_json(run, tmp_path, tower):
    from rfstage.files.stagetext import stage_text

    (tmp_path / "stage.toml").write_text(stage_text(tower, tmp_path), encoding="utf-8")
    words = ("sweep", "stage.toml", "--of", "C1", "--from", "120pF", "--to", "150pF", "--points", "7")
    done = run(*words, "--csv", "out.csv", "--json")
    assert done.stderr == ""
    got = json.loads(done.stdout)
    assert got["format"] == "rfstage.sweep"
    assert got["unit"] == "F"
    assert got["values"] == pytest.approx(list(np.linspace(120e-12, 150e-12, 7)))
    assert set(got) >= {"path", "points", "dip", "efficiency_peak", "output_peak"}
    table = (tmp_path / "out.csv").read_text(encoding="utf-8").splitlines()
    assert table[0].startswith("C1_F,dc_current_a,output_power_w,efficiency")
    assert len(table) == 8
    assert float(table[1].split(",")[1]) == got["points"][0]["dc_current_a"]
    assert run(*words, "--csv", "out.csv").returncode == 2
    page = run(*words, width=80).stdout
    assert "Turning points" in page
    assert max(map(len, page.splitlines())) <= 80


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("--of", "C7", "--from", "1", "--to", "2"), "did you mean"),
        (("--of", "C1", "--from", "1V", "--to", "2V"), "wanted a capacitance"),
        (("--of", "C1", "--from", "-1pF", "--to", "2pF"), "above 0 F"),
        (("--of", "load", "--from", "0.5", "--to", "2"), "allowed 1 to 100"),
        (("--of", "C1", "--from", "1pF", "--to", "2pF", "--points", "1"), "allowed 2 to"),
        (("--of", "C1", "--from", "1pF"), "--to"),
    ],
)
def test_bad_sweeps_are_one_clear_line(run, tmp_path, tower, words, said):
    from rfstage.files.stagetext import stage_text

    (tmp_path / "stage.toml").write_text(stage_text(tower, tmp_path), encoding="utf-8")
    done = run("sweep", "stage.toml", *words)
    assert done.returncode == 2
    assert done.stdout == ""
    assert said in done.stderr
    assert "Traceback" not in done.stderr


@pytest.mark.parametrize("name", ["lantern", "gallery", "tower"])
def test_each_example_has_a_tuning_curve_with_its_three_points_apart(examples, name):
    stage = design(load_job(examples / f"{name}.toml")).stage
    centre = fitted_value(stage, "C1")
    found = sweep(stage, "C1", np.linspace(0.8 * centre, 1.25 * centre, 31))
    assert found.dip is not None
    assert found.efficiency_peak is not None
    assert found.output_peak is not None
    assert found.dip.figure < settle(with_value(stage, "C1", 0.8 * centre)).dc_current
    # common practice, no source: output, efficiency and dip follow one another as the capacitor is closed
    assert found.output_peak.value <= found.efficiency_peak.value < found.dip.value
