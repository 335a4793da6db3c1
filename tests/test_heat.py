"""Heat of a stage: heat sink, junction, derating, duty cycle, the anode; on the page, in JSON, from bad input."""

from __future__ import annotations

import json
from dataclasses import replace

import pytest
from conftest import PROJECT

from rfstage import Job, design, load_job, load_stage
from rfstage.cli import _in_ascii_units
from rfstage.constants import AMBIENT, CASE_TO_SINK, JUNCTION_LIMIT
from rfstage.designs import heat as room
from rfstage.designs.conditions import Condition, Conditions, conditions
from rfstage.designs.design import with_heat
from rfstage.designs.heat import cooling_of, heat_of
from rfstage.errors import InputError
from rfstage.files.stagetext import stage_text
from rfstage.report.heat import heat_lines
from rfstage.report.page import Look

BEACON = "examples/beacon-as-built.toml"
JOB = Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8, network="pi")


@pytest.fixture(scope="module")
def beacon():
    return load_stage(PROJECT / BEACON)


@pytest.fixture(scope="module")
def tower():
    return design(load_job(PROJECT / "examples" / "tower.toml"))


@pytest.fixture(scope="module")
def lantern():
    return design(JOB).stage


def at(name, watts, *, stage_watts=None, note="as built"):
    return Condition(name, watts if stage_watts is None else stage_watts, watts, 1.0, 30.0, note)


@pytest.fixture
def heated(monkeypatch, beacon):
    """Heat of a stage whose conditions are given: watts normal, detuned, mismatched, undriven."""

    def run(watts, values, *, rating=None, both=1.0):
        names = ("normal", "detuned", "mismatched", "undriven")
        found = Conditions(*(at(n, w, stage_watts=w * both) for n, w in zip(names, watts, strict=True)))
        monkeypatch.setattr(room, "conditions", lambda *_, **__: found)
        return heat_of(replace(beacon, device=replace(beacon.device, max_dissipation=rating)), values)

    return run


def words(heat, width=80, *, plain=False):
    lines = [line.plain for line in heat_lines(heat, Look(width, plain))]
    assert max(map(len, lines)) <= width
    return " ".join(" ".join(lines).split())


# --- the arithmetic -------------------------------------------------------------------------------------


def test_the_heat_sink_of_a_published_example(heated):
    # SOURCE: Boylestad & Nashelsky, 10th ed., example 12.18, read backwards: 61.54 W, TJ 200, TA 40, 0.5 + 0.6 + 1.5
    values = {"junction_limit": 200.0, "ambient": 40.0, "junction_to_case": 0.5, "case_to_sink": 0.6}
    found = heated((30.0, 40.0, 61.54, 0.0), values)
    assert found.worst.condition.name == "mismatched"
    assert found.sink == pytest.approx(1.5, abs=5e-4)  # the watts are rounded to four figures
    assert found.worst.junction == pytest.approx(200.0, abs=1e-9)
    # the same sink in normal condition: 40 + 30 W x 2.6 K/W
    assert found.conditions[0].junction == pytest.approx(40 + 30 * (160 / 61.54), rel=1e-12)
    assert found.conditions[0].sink_needed == pytest.approx(160 / 30 - 1.1, rel=1e-12)
    assert found.most == pytest.approx(61.54, rel=1e-12)
    assert found.per_kelvin == pytest.approx(61.54 / 160, rel=1e-12)


def test_a_heat_sink_that_is_there_gives_the_junction(heated):
    # SOURCE: the same example forwards: what 1.5 K/W allows is 61.54 W
    values = {"junction_limit": 200.0, "junction_to_case": 0.5, "case_to_sink": 0.6, "sink_to_ambient": 1.5}
    found = heated((20.0, 30.0, 50.0, 0.0), values)
    assert found.most == pytest.approx(61.54, abs=0.005)
    assert [row.junction for row in found.conditions] == pytest.approx([92.0, 118.0, 170.0, 40.0])
    assert [row.case for row in found.conditions] == pytest.approx([82.0, 103.0, 145.0, 40.0])
    assert "EXCEEDED" not in words(found)
    hot = heated((20.0, 30.0, 70.0, 0.0), values)
    assert "EXCEEDED junction 222 °C mismatched" in words(hot)  # 40 + 70 x 2.6


def test_the_rating_is_derated_to_the_temperature_of_the_case(heated):
    # SOURCE: Boylestad & Nashelsky, 10th ed., example 12.17: 80 W at 25, 0.5 W/K, which ends at 185: 30 W at 125
    values = {"junction_limit": 185.0, "junction_to_case": 1.0, "case_to_sink": 0.0, "sink_to_ambient": 85 / 40}
    found = heated((10.0, 10.0, 40.0, 0.0), values, rating=80.0)
    assert found.worst.case == pytest.approx(125.0)
    assert found.derated_rating == pytest.approx(30.0)
    # the rating stands for 2 K/W, the larger of the two: (185 - 40)/40 - 2
    assert found.sink_for_rating == pytest.approx(1.625)
    assert "falls to 30.0 W at the 125 °C of the case mismatched; 40.0 W are asked: 1.62 K/W or less" in words(found)


def test_a_rating_without_a_thermal_resistance_says_what_it_stands_for(heated):
    # SOURCE: Sedra & Smith, 5th ed., example 14.4, p. 1251: 2 W at 25, 150: 62.5 K/W
    found = heated((1.0, 1.0, 1.5, 0.0), {}, rating=2.0)
    assert found.missing.endswith("a rating of 2.00 W at a 25 °C case stands for 62.5 K/W")
    assert "give heat.junction_to_case" in found.missing
    assert (found.sink, found.most, found.derated_rating) == (None, None, None)
    assert "missing" in words(found)


def test_the_mean_of_a_duty_cycle_holds_what_the_bias_burns_in_the_pauses(heated):
    found = heated((10.0, 20.0, 40.0, 4.0), {"duty": 25.0, "junction_to_case": 1.0})
    assert [row.mean for row in found.conditions] == pytest.approx([5.5, 8.0, 13.0, 4.0])
    assert found.sink == pytest.approx(110 / 13.0 - 1.3)
    assert "on the air 25 % of the time" in words(found)


def test_without_a_signal_class_a_may_be_the_worst(heated):
    found = heated((10.0, 11.0, 12.0, 20.0), {"junction_to_case": 1.0})
    assert found.worst.condition.name == "undriven"
    assert found.sink == pytest.approx(110 / 20 - 1.3)


def test_both_devices_of_a_pair_warm_the_one_heat_sink(heated):
    found = heated((10.0, 12.0, 20.0, 0.0), {"junction_to_case": 1.0}, both=1.9)
    # energy: the sink carries 38 W, washer and case of the hotter device 20 W
    assert found.sink == pytest.approx((110 - 20 * 1.3) / 38)
    assert found.worst.junction == pytest.approx(150.0)
    assert found.conditions[0].junction == pytest.approx(40 + 19 * found.sink + 10 * 1.3)
    assert found.most == pytest.approx(20.0)
    assert "the sink takes both" in words(found)


def test_where_no_heat_sink_does_it_the_page_says_so_and_what_would(heated):
    found = heated((50.0, 60.0, 100.0, 0.0), {"junction_to_case": 1.0})
    assert found.sink is None
    said = words(found)
    assert "EXCEEDED mismatched: no heat sink keeps 100 W within 150 °C" in said
    assert "allow less than 84.6 W" in said  # 110 K over 1.3 K/W
    assert "trip on reflected power" in said
    assert "impossible" in said


def test_a_stage_that_stays_cold_needs_no_particular_heat_sink(heated):
    found = heated((0.0, 0.0, 0.0, 0.0), {"junction_to_case": 1.0}, rating=5.0)
    assert found.sink is None
    assert "any heat sink does" in words(found)


def test_a_condition_that_did_not_settle_is_unknown_and_left_out_of_the_worst(monkeypatch, beacon):
    lost = Condition("mismatched", None, None, None, None, "no steady state was found (too narrow)")
    found = Conditions(at("normal", 3.0), at("detuned", 5.0), lost, at("undriven", 0.0))
    monkeypatch.setattr(room, "conditions", lambda *_, **__: found)
    heat = heat_of(beacon, {"junction_to_case": 2.0})
    assert heat.worst.condition.name == "detuned"
    assert heat.conditions[2][1:7] == (None, None, None, "", None, None)
    said = words(heat)
    assert "mismatched unknown" in said
    assert "no steady state was found (too narrow)" in said


def test_in_a_duty_cycle_an_unknown_rest_leaves_the_mean_unknown(monkeypatch, beacon):
    lost = Condition("undriven", None, None, None, None, "no steady state was found (x)")
    found = Conditions(at("normal", 3.0), at("detuned", 5.0), at("mismatched", 9.0), lost)
    monkeypatch.setattr(room, "conditions", lambda *_, **__: found)
    assert heat_of(beacon, {"duty": 50.0}).worst is None
    assert heat_of(beacon, {}).worst.condition.name == "mismatched"


def test_what_is_assumed_is_named():
    cooling, assumed = cooling_of({"ambient": 30.0, "duty": 40.0}, "fet")
    assert (cooling.ambient, cooling.duty) == (30.0, 0.4)
    assert assumed == {"heat.junction_limit": JUNCTION_LIMIT, "heat.case_to_sink": CASE_TO_SINK}
    assert cooling_of({}, "tube")[1] == {"heat.duty": 100.0}
    assert AMBIENT < JUNCTION_LIMIT


# --- of stages ------------------------------------------------------------------------------------------


def test_the_heat_of_a_stage_is_that_of_its_conditions(lantern):
    heat, found = heat_of(lantern, {"junction_to_case": 4.0}), conditions(lantern)
    assert [row.condition for row in heat.conditions] == list(found)
    assert heat.worst.condition == found.hottest
    watts = found.hottest.dissipation
    assert heat.sink == pytest.approx((150 - 40) / watts - 4.3)
    normal = heat.conditions[0]
    assert normal.junction == pytest.approx(40 + found.normal.dissipation * (heat.sink + 4.3))


def test_progress_is_reported(lantern):
    seen = []
    heat_of(lantern, {}, progress=lambda done, of: seen.append((done, of)))
    assert seen[-1][0] == seen[-1][1] > 0


def test_a_tube_s_anode_is_held_against_its_rating_in_every_condition(tower):
    made = with_heat(tower)
    heat = made.heat
    assert made.assumed["heat.duty"] == 100.0
    assert heat.conditions[0].condition.dissipation == tower.settled.dissipation
    for row in heat.conditions:
        assert row.use.share == pytest.approx(row.condition.dissipation / 250.0)
        assert (row.junction, row.sink_needed) == (None, None)
    said = words(heat)
    assert f"the stage asks {heat.worst.mean:.0f} W mismatched" in said
    assert "EXCEEDED rating: anode dissipation 250 W" in said
    rare = with_heat(replace(tower, job=replace(tower.job, duty=50.0))).heat
    assert rare.worst.mean == pytest.approx(heat.worst.mean / 2)
    assert "within rating: anode dissipation 250 W" in words(rare)


def test_a_tube_without_a_rating_says_what_is_missing(tower):
    bare = replace(tower.stage, device=replace(tower.stage.device, max_dissipation=None))
    said = words(with_heat(tower, stage=bare, state=replace(tower.settled, stage=bare)).heat)
    assert "To judge the anode this is missing: the rating of the anode: give device.max_dissipation" in said


def test_a_design_has_no_heat_unless_it_is_asked():
    assert design(JOB, textbook=True).heat is None


# --- keys and options -----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("values", "said"),
    [
        ({"ambient": 150.0}, "heat.ambient: got 150 degC; allowed below the junction limit of 150 degC"),
        ({"junction_limit": 40.0}, "heat.junction_limit: got 40 degC; allowed above the ambient of 40 degC"),
        ({"junction_to_case": 0.0}, "heat.junction_to_case: got 0 K/W; allowed above 0 K/W"),
        ({"case_to_sink": -1.0}, "heat.case_to_sink: got -1 K/W; allowed 0 K/W"),
        ({"duty": 0.0}, "heat.duty: got 0 %; allowed above 0 %, to 100 %"),
        ({"duty": 101.0}, "heat.duty: got 101 %"),
        ({"ambient": -300.0}, "heat.ambient: got -300 degC; allowed -90 degC to 200 degC"),
        ({"family": "tube", "case_to_sink": 0.1}, "heat.case_to_sink: is of no use for a tube"),
    ],
)
def test_a_value_of_the_job_that_can_t_be_is_one_line(values, said):
    with pytest.raises(InputError) as caught:
        replace(JOB, **values)
    assert len(caught.value.problems) == 1
    assert caught.value.problems[0].startswith(said)


def test_an_ambient_below_zero_is_one():
    assert replace(JOB, ambient=-25.0).ambient == -25.0


def test_a_job_file_has_a_table_of_heat(tmp_path):
    file = tmp_path / "job.toml"
    text = (PROJECT / "examples" / "lantern.toml").read_text(encoding="utf-8")
    heat = '[heat]\nambient = "35 degC"\njunction_to_case = "1.5 K/W"\nduty = "30 %"\n'
    file.write_text(text + heat, encoding="utf-8")
    job = load_job(file)
    assert (job.ambient, job.junction_to_case, job.duty, job.junction_limit) == (35.0, 1.5, 30.0, None)
    file.write_text(text + '[heat]\nambient = "35 C"\njunction_limit = "150 K"\nambiant = 3\n', encoding="utf-8")
    with pytest.raises(InputError) as caught:
        load_job(file)
    assert [p.split(": ", 2)[1] for p in caught.value.problems] == [
        "heat.ambient",
        "heat.junction_limit",
        "heat.ambiant",
    ]
    assert "40 degC" in caught.value.problems[0]
    assert "(did you mean 'ambient'?)" in caught.value.problems[2]


GOOD = ("--carrier", "7.1MHz", "--power", "10W", "--angle", "120", "--supply", "13.8V", "--network", "pi")


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("design", *GOOD, "--ambient", "30degC"), "--ambient: is of no use without --heat"),
        (("design", *GOOD, "--heat", "--ambient", "30 C"), "--ambient: read '30 C', whose 'C' could be another unit"),
        (("design", *GOOD, "--heat", "--junction-to-case", "2W"), "--junction-to-case: read '2W', which is a power"),
        (("settle", f"{PROJECT}/{BEACON}", "--duty", "20%"), "--duty: is of no use without --heat"),
        (("settle", f"{PROJECT}/{BEACON}", "--heat", "--ambient", "160degC"), "--ambient: got 160 degC; allowed below"),
        (("design", f"{PROJECT}/examples/tower-bands.toml", "--heat"), "--heat: for one stage only"),
    ],
)
def test_bad_options_are_one_line_each(run, words, said):
    done = run(*words)
    assert (done.returncode, done.stdout) == (2, "")
    assert done.stderr.startswith(f"rfstage: {said}")
    assert done.stderr.count("\n") == 1


def test_design_with_heat_in_json_and_on_a_plain_page(run):
    asked = ("design", *GOOD, "--heat", "--junction-to-case", "3K/W", "--max-dissipation", "30W", "--duty", "50%")
    got = json.loads(run(*asked, "--json").stdout)
    heat = got["heat"]
    assert [c["name"] for c in heat["conditions"]] == ["normal", "detuned", "mismatched", "undriven"]
    assert got["assumed"]["heat.ambient"] == heat["ambient_c"] == 40.0
    assert "heat.duty" not in got["assumed"]
    worst = next(c for c in heat["conditions"] if c["name"] == heat["worst"])
    assert worst["mean_device_dissipation_w"] == pytest.approx(0.5 * worst["device_dissipation_w"])
    assert heat["sink_k_per_w"] == pytest.approx(110 / worst["mean_device_dissipation_w"] - 3.3)
    assert worst["junction_c"] == pytest.approx(150.0)
    assert worst["rating_share"] == pytest.approx(worst["mean_device_dissipation_w"] / 30)
    done = run(*asked, "--plain", width=80)
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout.isascii()
    assert max(map(len, done.stdout.splitlines())) <= 80
    assert "\nHeat ---" in done.stdout
    assert "150 degC" in done.stdout


def test_settle_with_heat(run, lantern, tmp_path):
    (tmp_path / "a.toml").write_text(stage_text(lantern, tmp_path), encoding="utf-8")
    asked = ("settle", "a.toml", "--heat", "--junction-to-case", "4", "--sink-to-ambient", "12K/W")
    heat = json.loads(run(*asked, "--json").stdout)["heat"]
    for row in heat["conditions"]:
        assert row["junction_c"] == pytest.approx(40 + row["dissipation_w"] * 16.3)
    page = run(*asked, width=80).stdout
    assert "EXCEEDED  junction" in page
    assert max(map(len, page.splitlines())) <= 80


def test_degrees_celsius_are_ascii_in_messages():
    assert _in_ascii_units("at 160 °C around it; −5 °C; 20.0 °") == "at 160 degC around it; -5 degC; 20.0 deg"


def test_without_heat_there_is_none(run):
    assert json.loads(run("design", *GOOD, "--json").stdout)["heat"] is None
    assert json.loads(run("settle", f"{PROJECT}/{BEACON}", "--json").stdout)["heat"] is None


def test_without_heat_its_rooms_are_not_loaded():
    from test_cli import loaded_after

    loaded = loaded_after("design", *GOOD)
    assert not loaded & {
        "rfstage.designs.heat",
        "rfstage.designs.conditions",
        "rfstage.sweep",
        "rfstage.parts.heatsink",
        "rfstage.parts.bleeder",
        "rfstage.exposure",
        "rfstage.report.heat",
    }
