"""What can hurt someone or burn: each caution's number against hand arithmetic, and what it says to do."""

from __future__ import annotations

import json
import math
import re
from dataclasses import replace

import pytest
from conftest import PROJECT

from rfstage import Job, design, load_job, load_stage
from rfstage.cautions import FAILED_BLOCKING, RESONANCE
from rfstage.constants import SAFE_VOLTAGE
from rfstage.designs.choke import choke_resonance, safety_choke
from rfstage.designs.design import with_settled
from rfstage.designs.safety import (
    BLEED_TIME,
    Station,
    blocking_cautions,
    choke_cautions,
    exposed_when_settled,
    most_exposed,
    resonance_cautions,
    safety_cautions,
    settled_safety,
)
from rfstage.errors import InputError
from rfstage.quantity import show
from rfstage.steady import settle

BEACON = PROJECT / "examples" / "beacon-as-built.toml"
JOB = Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8, network="pi")
TOWER = load_job(PROJECT / "examples" / "tower.toml")


@pytest.fixture(scope="module")
def state():
    return settle(load_stage(BEACON))


@pytest.fixture(scope="module")
def tower():
    return design(TOWER, textbook=True)


def texts(job, topic):
    return [c.text for c in design(job, textbook=True).cautions if c.topic == topic]


def text(job, topic):
    (found,) = texts(job, topic)
    return found


# --- stored energy, bleeder -----------------------------------------------------------------------------


def test_a_reservoir_gets_its_joules_and_a_bleeder_to_fit():
    said = text(replace(TOWER, reservoir=50e-6), "stored energy")
    # C V²/2 = 50 uF (2 kV)²/2; R C ln(2000/60) within 30 s: 171 kohm, the E12 value below; V²/R, twice that rated
    assert "the reservoir of 50.0 µF holds 100 J at 2.00 kV" in said
    assert BLEED_TIME / (50e-6 * math.log(2000 / 60)) == pytest.approx(171.1e3, rel=1e-3)
    assert "fit a bleeder of 150 kΩ rated 100 W or more, several in series" in said
    assert f"burns {show(2000**2 / 150e3, 'W')}" in said
    assert f"reaches 60.0 V after {show(150e3 * 50e-6 * math.log(2000 / 60), 's')}" in said


def test_a_bleeder_that_is_there_gets_its_time_and_watts():
    said = text(replace(TOWER, reservoir=50e-6, bleeder=100e3), "stored energy")
    # 100 kohm x 50 uF x ln(2000/60) = 17.53 s; 40 W, twice that to stand
    assert "Its bleeder of 100 kΩ must be rated 100 W or more" in said
    assert "it burns 40.0 W and reaches 60.0 V after 17.5 s." in said
    slow = text(replace(TOWER, reservoir=50e-6, bleeder=470e3), "stored energy")
    assert "after 82.4 s, which is long: 150 kΩ does it in 26.3 s" in slow


def test_a_bleeder_beyond_what_is_sold_is_several_resistors():
    said = text(replace(TOWER, reservoir=1e-3, bleeder=5e3), "stored energy")
    # twice 2 kV squared over 5 kohm
    assert "Its bleeder of 5.00 kΩ must be made of resistors that stand 1.60 kW together; it burns 800 W" in said


@pytest.mark.parametrize(("supply", "bled"), [(SAFE_VOLTAGE, False), (SAFE_VOLTAGE + 1, True)])
def test_a_bleeder_is_asked_above_the_safe_voltage_alone(supply, bled):
    said = text(replace(JOB, supply=supply, reservoir=10e-3), "stored energy")
    assert ("fit a bleeder" in said) is bled
    assert ("fuse the lead" in said) is not bled
    assert show(10e-3 * supply**2 / 2, "J") in said


def test_above_the_safe_voltage_the_page_asks_for_the_reservoir():
    assert "give supply.reservoir (--reservoir)" in text(TOWER, "stored energy")
    assert texts(JOB, "stored energy") == []


def test_a_choke_that_holds_little_is_not_spoken_of_and_a_large_one_is(tower):
    def said(henries):
        stage = replace(tower.stage, supply=replace(tower.stage.supply, choke=henries))
        exposed = most_exposed([("C1", 1.0, 1.0)])
        found = safety_cautions(stage, dc_current=2.0, exposed=exposed, power=1.0)
        return next(c.text for c in found if c.topic == "stored energy")

    assert "choke" not in said(130e-6)
    assert "the choke holds 20.0 mJ at 2.00 A" in said(10e-3)  # 10 mH (2 A)²/2


# --- RF in the open, safety choke -----------------------------------------------------------------------


def test_the_parts_that_carry_most_are_named(tower):
    parts = [p for p in tower.tank.parts if p.branch.name != "Cout"]
    volts = max(parts, key=lambda p: p.peak_voltage)
    amperes = max((p for p in parts if p.branch.name != "Lchoke"), key=lambda p: p.rms_current)
    said = text(TOWER, "RF burns")
    assert said.startswith(
        f"{show(volts.peak_voltage, 'V')} peak RF stands on {volts.branch.name}, "
        f"{show(amperes.rms_current, 'A')} rms flow in {amperes.branch.name};"
    )


def test_a_settled_stage_leaves_out_dc_and_what_is_in_the_device(state):
    found = exposed_when_settled(state)
    by_name = {b.name: b for b in state.branches}
    assert found.volts == by_name[found.volts_of].peak_voltage
    assert found.amperes == by_name[found.amperes_of].rms_current
    assert found.volts_of not in ("Cblock", "Cout")
    assert found.amperes_of not in ("Lchoke", "Cout")


def test_the_choke_across_the_output_has_its_least_inductance(tower):
    least = safety_choke(tower.stage).least_inductance
    said = text(TOWER, FAILED_BLOCKING)
    assert said.startswith("if the blocking capacitor fails, 2.00 kV reaches the antenna: put an RF choke of ")
    assert f"{show(least, 'H')} or more across the output" in said
    assert texts(JOB, FAILED_BLOCKING) == []


def test_a_push_pull_load_is_choked_at_both_ends(state):
    high = replace(state.stage.supply, voltage=100.0)
    pair = replace(state.stage, supply=high, device=replace(state.stage.device, pair="push-pull"))
    found = safety_cautions(pair, dc_current=1.0, exposed=exposed_when_settled(state), power=10.0)
    said = next(c.text for c in found if c.topic == FAILED_BLOCKING)
    assert "choke each to ground" in said


def test_several_carriers_get_one_choke_the_largest(run):
    done = run("design", f"{PROJECT}/examples/tower-bands.toml", "--plain", width=80)
    said = re.findall(r"! blocking capacitor.*?instead\.", done.stdout, re.DOTALL)
    assert len(said) == 1
    lowest = design(replace(TOWER, carrier=1.85e6, input_q=None, loaded_q=12.0), textbook=True)
    asked = float(re.search(r"choke of (\d+) uH", said[0])[1])
    # the variable capacitors of that job give another Q than 12, which moves the impedance's sense of it little
    assert asked == pytest.approx(1e6 * safety_choke(lowest.stage).least_inductance, rel=0.05)


# --- choke, resonance, blocking capacitor ---------------------------------------------------------------


def test_a_choke_beyond_its_current_or_near_its_resonance_is_said_so(state):
    assert choke_cautions(state, Station()) == []
    (said,) = choke_cautions(state, Station(choke_max_current=0.5))
    assert said.text.startswith("the choke carries ")
    assert said.text.endswith("beyond its rating of 500 mA.")
    (said,) = choke_cautions(state, Station(choke_self_capacitance=200e-12))
    # 1/(2 pi sqrt(1.8 uH x 200 pF)) = 8.39 MHz, above the 7.1 MHz of the carrier by less than twice
    assert "200 pF at 8.39 MHz: at the carrier it is a coil still, barely; fewer turns" in said.text
    assert choke_cautions(state, Station(choke_self_capacitance=5e-12, choke_max_current=5.0)) == []


def test_a_job_s_choke_is_checked_in_steady_state_alone():
    job = replace(JOB, choke_max_current=0.3)
    assert texts(job, "choke") == []
    (said,) = [c.text for c in design(job).cautions if c.topic == "choke"]
    assert "beyond its rating of 300 mA" in said


def test_a_choke_resonance_says_what_damps_it(state):
    found = choke_resonance(state)
    (said,) = resonance_cautions(state)
    d = found.damping
    # characteristic impedance of the choke at its resonance; ten times less across the bypass, ten times more above
    assert d.resistance == pytest.approx(2 * math.pi * found.frequency * 1.8e-6)
    for figure in (
        show(d.resistance, "ohm"),
        f"{show(d.bypass, 'F')} or more",
        f"{show(d.second_choke, 'H')} or more",
        show(d.carrier_loss, "W"),
        show(found.frequency, "Hz"),
    ):
        assert figure in said.text
    assert said.topic == RESONANCE


def test_a_textbook_design_says_damp_it_and_a_settled_one_with_what():
    book = design(load_job(PROJECT / "examples" / "gallery.toml"), textbook=True)
    (said,) = [c.text for c in book.cautions if c.topic == RESONANCE]
    assert said.endswith("may oscillate: damp it.")
    settled = with_settled(book)
    (said,) = [c.text for c in settled.cautions if c.topic == RESONANCE]
    assert show(choke_resonance(settled.settled).damping.resistance, "ohm") in said
    assert "second choke" in said
    # it stands where the other stood
    assert [c.topic for c in settled.cautions if c.topic in (RESONANCE, "RF burns")] == [RESONANCE, "RF burns"]


def test_a_blocking_capacitor_with_long_leads_or_too_small_is_said_so(tower):
    assert blocking_cautions(tower.stage, 3574.0) == []
    leads = tuple(replace(b, lead_inductance=5e-9) if b.name == "Cblock" else b for b in tower.stage.branches)
    short = replace(tower.stage, carrier=100e6, branches=leads)
    (said,) = blocking_cautions(short, 20.0)
    # 2 pi 100 MHz 5 nH = 3.142 ohm less 1/(2 pi 100 MHz 1.46 nF) = 1.09 ohm: 2.05 of the 2 ohm allowed
    assert said.text == (
        "Cblock should be a short, a tenth of the 20.0 Ω it works into: its leads of 5.00 nH leave 2.05 Ω, more than "
        "2.00 Ω: shorter leads, or parts in parallel."
    )
    small = text(replace(JOB, blocking=3e-9), "blocking reactance")
    # 1/(2 pi 7.1 MHz 3 nF) = 7.47 ohm less 0.22 of the leads
    assert "it leaves 7.25 Ω" in small
    assert small.endswith("a larger capacitor.")
    assert texts(JOB, "blocking reactance") == []


# --- exposure -------------------------------------------------------------------------------------------


def exposure(carrier, power, gain):
    job = replace(JOB, carrier=carrier, power=power, supply=50.0, antenna_gain=gain)
    return text(job, "exposure")


def test_the_distance_is_the_far_field_estimate_of_the_table():
    # SOURCE: 47 CFR 1.1310, Table 1 at 30 to 300 MHz: 0.2 and 1 mW/cm², that is 2 and 10 W/m²; 1.6 for the ground
    general, occupational = (1.6 * math.sqrt(100 * 10 / (4 * math.pi * s)) for s in (2.0, 10.0))
    said = exposure(144e6, 100.0, 10.0)
    assert f"with 100 W into an antenna of 10 dBi all the time keep people {show(general, 'm')} away" in said
    assert f"occupational limit is met at {show(occupational, 'm')}" in said
    assert "47 CFR 1.1310" in said
    assert "An estimate in the main direction, no evaluation. Local rules decide." in said


def test_inside_the_near_field_the_distance_is_withheld_with_the_reason():
    said = exposure(7.1e6, 10.0, 2.15)
    # SOURCE: lambda/2 pi = c/(2 pi f) = 6.72 m at 7.1 MHz
    assert said.startswith("no distance is given by the general limit of 47 CFR 1.1310, Table 1 for 10.0 W")
    assert "lies inside λ/2π = 6.72 m" in said
    assert said.endswith("Local rules decide.")


def test_one_limit_may_be_met_outside_the_near_field_and_the_other_inside():
    said = exposure(50e6, 20.0, 2.15)
    # 1.6 sqrt(20 x 1.641/(4 pi S)): 1.83 m for 2 W/m², 0.82 m for 10 W/m², lambda/2 pi = 0.954 m
    assert "keep people 1.83 m away" in said
    assert "that of the occupational limit lies inside λ/2π = 954 mm" in said


def test_where_the_table_has_no_figure_that_is_the_reason():
    assert "has no figure at 200 kHz: it covers 300 kHz to 100 GHz" in exposure(200e3, 10.0, 0.0)


def test_without_an_antenna_nothing_is_said_of_its_distance(state):
    assert texts(JOB, "exposure") == []
    assert "exposure" not in [c.topic for c in settled_safety(state)]
    assert [c.topic for c in settled_safety(state, Station(antenna_gain=-3.0))].count("exposure") == 1


# --- keys, options, pages -------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("values", "said"),
    [
        ({"bleeder": 1e3}, "supply.bleeder: is of no use without supply.reservoir"),
        ({"reservoir": 0.0}, "supply.reservoir: got 0 F; allowed above 0 F"),
        ({"reservoir": 1e-3, "bleeder": -1.0}, "supply.bleeder: got -1 ohm"),
        ({"antenna_gain": 90.0}, "load.antenna_gain: got 90 dBi; allowed -50 dBi to 60 dBi"),
        ({"choke_max_current": 0.0}, "supply.choke_max_current: got 0 A"),
        ({"choke_self_capacitance": 1.0}, "supply.choke_self_capacitance: got 1 F; allowed above 0 F, to 1 uF"),
    ],
)
def test_a_value_that_can_t_be_is_one_line(values, said):
    with pytest.raises(InputError) as caught:
        replace(JOB, **values)
    assert len(caught.value.problems) == 1
    assert caught.value.problems[0].startswith(said)


def test_the_keys_stand_in_a_job_file(tmp_path):
    file = tmp_path / "job.toml"
    file.write_text(
        '[stage]\ncarrier = "7.1 MHz"\npower = "10 W"\nconduction_angle = 120\nsupply = "13.8 V"\n'
        '[supply]\nreservoir = "10 mF"\nbleeder = "1k"\nchoke_self_capacitance = "3 pF"\nchoke_max_current = "2 A"\n'
        '[load]\nantenna_gain = "2.15 dBi"\n',
        encoding="utf-8",
    )
    job = load_job(file)
    assert (job.reservoir, job.bleeder, job.choke_self_capacitance) == (10e-3, 1e3, 3e-12)
    assert (job.choke_max_current, job.antenna_gain) == (2.0, 2.15)


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("--bleeder", "1k"), "--bleeder: is of no use without supply.reservoir (--reservoir)"),
        (("--reservoir", "10V"), "--reservoir: read '10V', which is a voltage"),
        (("--antenna-gain", "3dBd"), "--antenna-gain: read '3dBd', whose 'dBd' is no unit known here"),
    ],
)
@pytest.mark.parametrize("command", [("settle", str(BEACON)), ("design", str(PROJECT / "examples" / "tower.toml"))])
def test_bad_options_are_one_line_each(run, command, words, said):
    done = run(*command, *words)
    assert (done.returncode, done.stdout) == (2, "")
    assert done.stderr.startswith(f"rfstage: {said}")
    assert done.stderr.count("\n") == 1


ALL = ("--reservoir", "50uF", "--antenna-gain", "10dBi", "--choke-self-capacitance", "200pF", "--choke-max-current")


@pytest.mark.parametrize(
    "command", [("settle", str(BEACON)), ("design", str(PROJECT / "examples" / "tower.toml"))], ids=["settle", "design"]
)
def test_page_and_json_have_them_all(run, command):
    done = run(*command, *ALL, "0.1A", "--plain", width=80)
    assert done.stderr == ""
    assert done.stdout.isascii()
    assert max(map(len, done.stdout.splitlines())) <= 80
    cautions = json.loads(run(*command, *ALL, "0.1A", "--json").stdout)["cautions"]
    topics = [caution["topic"] for caution in cautions]
    assert {"choke", "stored energy", "exposure", "RF burns", "rules"} <= set(topics)
    for topic in topics:
        assert f"! {topic}: " in done.stdout
