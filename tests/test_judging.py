"""What a settled stage is held against: ratings, its limit in a resistive line, cautions; and stand-ins that fit."""

from __future__ import annotations

import json
from dataclasses import replace

import pytest

from rfstage import Job, design, load_job
from rfstage.cautions import about_dip, about_tank_loss
from rfstage.designs.judging import judged, ratings_of, settled_cautions, supply_reaches_load, worst
from rfstage.files.stagetext import stage_text
from rfstage.ladder import Branch
from rfstage.limits import limit_named
from rfstage.steady import settle

JOB = Job(network="pi", carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=28.0)


@pytest.fixture(scope="module")
def tower():
    from conftest import PROJECT

    return design(load_job(PROJECT / "examples" / "tower.toml"))


def test_settle_judges_the_limit_that_the_stage_names_as_design_does(tower):
    least = worst(judged(settle(tower.stage)))
    assert least is not None
    assert tower.worst is not None
    assert least.order == tower.worst.order == 2
    # the design takes the worse of textbook and settled, the stage has its settled level alone
    assert least.margin == pytest.approx(-43 - (tower.settled.harmonics[0].level), abs=1e-6)
    assert least.margin >= tower.worst.margin


def test_a_stage_without_a_rule_is_not_judged(tower):
    assert judged(settle(replace(tower.stage, limit_rule=None))) == ()


def test_a_missed_limit_sets_the_exit_status_of_settle(run, tmp_path, tower):
    (tmp_path / "a.toml").write_text(stage_text(tower.stage, tmp_path), encoding="utf-8")
    done = run("settle", "a.toml", width=80)
    assert done.returncode == 1
    assert done.stderr == ""
    assert "MISSES: needs" in done.stdout
    assert "2.00 kV dc can kill" in done.stdout
    assert max(map(len, done.stdout.splitlines())) <= 80
    record = json.loads(run("settle", "a.toml", "--json").stdout)
    assert record["verdicts"][0]["margin_db"] < 0
    relaxed = replace(tower.stage, limit_rule="20dB")
    (tmp_path / "b.toml").write_text(stage_text(relaxed, tmp_path), encoding="utf-8")
    assert run("settle", "b.toml").returncode == 0


def test_ratings_are_held_against_the_settled_stage(tower):
    device = replace(tower.stage.device, max_voltage=3000.0, max_current=2.0, max_dissipation=100.0)
    found = {r.name: r for r in ratings_of(settle(replace(tower.stage, device=device)))}
    assert found["max_voltage"].exceeded
    assert not found["max_current"].exceeded
    assert found["max_dissipation"].exceeded


def test_a_peak_beyond_the_rating_is_said_first(tower):
    stage = replace(tower.stage, device=replace(tower.stage.device, max_voltage=3000.0))
    first = settled_cautions(settle(stage))[0]
    assert first.topic == "peak voltage"
    assert "not those of a living device" in first.text


def part(place, kind):
    return Branch("X", place, kind, 1e-9)


@pytest.mark.parametrize(
    ("branches", "reaches"),
    [
        ([part("series", "capacitor"), part("shunt", "capacitor"), part("series", "coil")], True),
        ([part("series", "capacitor"), part("shunt", "coil"), part("series", "capacitor")], False),
        ([part("series", "capacitor"), part("series", "capacitor"), part("shunt", "coil")], False),
        ([part("series", "capacitor"), part("series", "coil"), part("shunt", "coil")], False),
    ],
    ids=["pi", "coil to ground", "blocked twice", "coil at the load"],
)
def test_whether_a_failed_blocking_capacitor_puts_the_supply_on_the_load(branches, reaches):
    assert supply_reaches_load(branches) is reaches


@pytest.mark.parametrize("family", ["fet", "tube", "bipolar"])
def test_a_transfer_factor_without_a_threshold_still_gives_the_pulse_asked(family):
    job = replace(JOB, family=family, transfer_factor=0.5)
    made = design(job)
    assert made.drive.amplitude == pytest.approx(made.point.peak_current / 0.5 / (1 - 0.5), rel=1e-12)
    assert made.settled is not None
    assert made.settled.output_power == pytest.approx(10.0, rel=1e-3)


def test_a_given_bias_without_a_threshold_stands_in_the_stage():
    made = design(replace(JOB, family="fet", bias=2.0))
    assert made.stage.drive.bias == 2.0
    effective = made.stage.drive.amplitude
    assert made.stage.device.threshold == pytest.approx(2.0 + effective * 0.5)
    assert made.settled is not None
    assert made.settled.conduction_angle_deg == pytest.approx(120.0)


def test_half_a_cycle_takes_the_bias_that_is_the_threshold():
    made = design(replace(JOB, conduction_angle=180.0, bias=0.7))
    assert made.drive.bias == 0.7
    assert made.stage.drive.bias == 0.7


@pytest.mark.parametrize("power", [1e-3, 1e-2])
def test_the_default_loaded_q_works_at_very_high_resistances(power):
    made = design(replace(JOB, power=power), textbook=True)
    assert made.tank.loaded_q >= 10
    assert made.assumed["tank.loaded_q"] == made.tank.loaded_q


def test_everything_that_stands_in_for_the_device_is_listed_as_assumed():
    made = design(JOB, textbook=True)
    stand_ins = {"transfer_factor", "threshold_softness", "knee_voltage", "knee_resistance", "reverse_conduction"}
    assert {f"device.{name}" for name in stand_ins} <= set(made.assumed)


def test_a_dip_s_caution_knows_the_network_and_the_correction():
    assert about_dip(0.02, network="pi", corrected=False) == []
    for network in ("pi", "pi-l", "tapped-coil", "link"):
        assert "a higher Q shorts them" in about_dip(0.05, network=network, corrected=False)[0].text
    assert "makes up for it" in about_dip(0.05, network="pi", corrected=True)[0].text
    assert "do not hold; network pi" in about_dip(0.5, network="l", corrected=False)[0].text


def test_a_tank_that_keeps_the_power_is_named():
    assert about_tank_loss(0.9, 10.0) == []
    assert "keeps 40 %" in about_tank_loss(0.6, 40.0)[0].text


@pytest.mark.parametrize(
    ("rule", "carrier", "power", "said"),
    [
        ("us-amateur", 7e6, 10.0, ""),
        ("us-amateur", 432e6, 10.0, "as far as practicable"),
        ("us-amateur", 50e6, 5e-6, "no reduction"),
        ("43+10log", 7e6, 20e-6, "no reduction"),
        ("25uW", 7e6, 20e-6, "no reduction"),
    ],
)
def test_a_rule_that_gives_no_figure_says_why(rule, carrier, power, said):
    limit = limit_named(rule)
    assert said in limit.silence(carrier, power)
    assert (limit.suppression(carrier, power) is None) is bool(said)
