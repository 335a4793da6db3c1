"""Verification as a whole: the story in the examples, JSON, pages, exit status, bad input, what loads when."""

from __future__ import annotations

import json
import math
import shutil
import subprocess
import sys
from dataclasses import replace

import numpy as np
import pytest
from conftest import PROJECT

import rfstage
from rfstage.errors import ImpossibleError, InputError
from rfstage.files.captures import read_measurement
from rfstage.files.stagetext import stage_text
from rfstage.ladder import Ladder
from rfstage.limits import limit_named
from rfstage.load import SeriesLoad
from rfstage.verify.capture import Capture, Channel
from rfstage.verify.levels import LevelList, Reading, Setup
from rfstage.verify.scattering import two_port
from rfstage.verify.verdict import FAIL, GUARDED, PASS, SIMPLE, UNDECIDED
from rfstage.verify.verification import Asked, verify

STAGE = PROJECT / "examples" / "beacon-as-built.toml"
LEVELS = ("verify", "examples/beacon-as-built.toml", "examples/beacon-levels.csv")
SAMPLED = ("--sampler", "examples/beacon-sampler.csv", "--attenuation", "20dB")
WAVE = ("verify", "examples/beacon-as-built.toml", "examples/beacon-wave.csv", "--probe", "10")
TANK = ("verify", "examples/beacon-as-built.toml", "examples/beacon-tank.s2p")


@pytest.fixture
def bench(run, tmp_path):
    shutil.copytree(PROJECT / "examples", tmp_path / "examples")
    return run


@pytest.fixture(scope="module")
def state():
    return rfstage.settle(rfstage.load_stage(STAGE))


def record(done):
    assert done.stderr == ""
    return json.loads(done.stdout)


def no_nan(value):
    if isinstance(value, dict):
        return all(no_nan(v) for v in value.values())
    if isinstance(value, list):
        return all(no_nan(v) for v in value)
    return not (isinstance(value, float) and not math.isfinite(value))


# The story: the beacon's second harmonic is found too strong and its output too low; the analyser tells why. The files
# were made from the stage with C1 at 9.6 nF: 7.11 W, second harmonic 41.1 dB down, 933 mA dc (steady state of it)


def test_the_story_begins_with_levels_that_miss_the_limit(bench):
    got = record(done := bench(*LEVELS, *SAMPLED, "--limit", "us-amateur", "--json"))
    assert done.returncode == 1
    assert got["verdict"] == FAIL
    second = got["orders"][0]
    assert second["verdict"] == FAIL
    assert second["measured_dbc"] == pytest.approx(-41.1, abs=0.5)  # readings of ±0.15 dB, to a tenth
    assert second["margin_db"] == pytest.approx(second["limit_dbc"] - second["measured_dbc"])
    assert got["carrier_power_w"] == pytest.approx(7.11, rel=0.08)
    assert [o["verdict"] for o in got["orders"][1:]] == [PASS] * 3
    assert all(o["measured_dbc"] is None for o in got["orders"][1:])
    assert [o["frequency_hz"] for o in got["other_readings"]] == [9.735e6]
    assert got["not_measured"] == [6, 7, 8, 9, 10]


def test_the_story_goes_on_with_a_capture_of_volts_and_collector_current(bench):
    got = record(bench(*WAVE, "--limit", "us-amateur", "--json"))
    assert got["verdict"] == UNDECIDED
    assert got["carrier_power_w"] == pytest.approx(7.11, rel=0.01)
    assert got["orders"][0]["measured_dbc"] is None  # eight bits do not tell a level 41 dB down
    assert got["orders"][0]["floor_dbc"] < -35
    pulse = got["current_pulse"]
    assert abs(pulse["conduction_angle_deg"] - 120) < 3 * pulse["conduction_angle_standard_error_deg"]
    assert pulse["dc_current_a"] == pytest.approx(0.933, rel=0.02)
    better = record(bench(*WAVE, "--limit", "us-amateur", "--instrument-distortion", "60dB", "--json"))
    assert better["orders"][0]["measured_dbc"] == pytest.approx(-41.1, abs=1.5)


def test_the_story_ends_with_the_part_that_is_off_and_the_trimmer(bench):
    got = record(done := bench(*TANK, "--json"))
    assert done.returncode == 0  # no limit and no tolerance is asked
    assert got["verdict"] is None
    parts = {b["name"]: b for b in got["branches"]}
    assert parts["C1"]["estimated"] == pytest.approx(9.6e-9, abs=3 * parts["C1"]["standard_error"])
    assert [name for name, part in parts.items() if part["beyond_tolerance"]] == ["C1"]
    assert got["setting"]["name"] == "C1"
    assert got["setting"]["wanted"] == pytest.approx(8.8e-9, rel=0.01)
    assert "C1 is off: +9" in bench(*TANK).stdout


@pytest.mark.parametrize("width", [80, 120])
@pytest.mark.parametrize(
    "words",
    [(*LEVELS, *SAMPLED, "--limit", "us-amateur"), (*WAVE, "--limit", "40dB"), TANK],
    ids=["list", "wave", "tank"],
)
def test_pages_fit_their_width_in_ascii_too(bench, words, width):
    for plain in ((), ("--plain",)):
        done = bench(*words, *plain, width=width)
        assert done.stderr == ""
        assert max(map(len, done.stdout.splitlines())) <= width
        assert done.stdout.isascii() or not plain


def test_the_page_says_verdict_rule_and_settings(bench):
    text = " ".join(bench(*LEVELS, *SAMPLED, "--limit", "us-amateur", "--decision", "simple").stdout.split())
    for said in ("FAIL", "simple acceptance", "43.0 dB below the carrier", "attenuation 20 dB", "thermal meter",
                 "a peak detector", "9.7350 MHz", "Not measured: orders 6–10", "common practice"):  # fmt: skip
        assert said in text


def test_json_has_every_key_others_rely_on(bench):
    got = record(bench(*WAVE, "examples/beacon-tank.s2p", "--limit", "us-amateur", "--json"))
    assert (got["format"], got["version"]) == ("rfstage.verify", 1)
    assert set(got) >= {"verdict", "carrier_hz", "orders", "branches"}
    assert set(got["orders"][0]) >= {"order", "frequency_hz", "measured_dbc", "uncertainty_db", "floor_dbc",
                                     "predicted_dbc", "limit_dbc", "margin_db", "verdict"}  # fmt: skip
    assert set(got["branches"][0]) >= {"name", "nominal", "estimated", "standard_error", "q_estimated"}
    assert [f["name"] for f in got["files"]] == ["examples/beacon-wave.csv"] * 2 + ["examples/beacon-tank.s2p"]
    assert got["settings"]["probe"] == 10
    assert no_nan(got)
    assert record(bench(*LEVELS, *SAMPLED, "--json"))["branches"] is None


def test_the_stage_s_own_limit_is_taken(bench, tmp_path):
    stage = replace(rfstage.load_stage(STAGE), limit_rule="us-amateur")
    (tmp_path / "own.toml").write_text(stage_text(stage, tmp_path), encoding="utf-8")
    got = record(bench("verify", "own.toml", "examples/beacon-levels.csv", *SAMPLED, "--json"))
    assert got["limit"] == "us-amateur"
    assert got["verdict"] == FAIL
    assert record(bench("verify", "own.toml", *LEVELS[2:], *SAMPLED, "--limit", "30dB", "--json"))["verdict"] == PASS


def test_a_stated_tolerance_is_a_check_too(bench, tmp_path):
    text = STAGE.read_text(encoding="utf-8").replace('value = "8.8 nF"', 'value = "8.8 nF"\ntolerance = "5 %"')
    (tmp_path / "own.toml").write_text(text, encoding="utf-8")
    done = bench("verify", "own.toml", "examples/beacon-tank.s2p", "--json")
    assert done.returncode == 1
    got = json.loads(done.stdout)
    assert got["verdict"] == FAIL
    assert [b["verdict"] for b in got["branches"]] == [None, None, FAIL, None, None]


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("verify",), "verify wants STAGE.toml, MEASUREMENT..."),
        (("verify", "examples/beacon-as-built.toml"), "verify wants MEASUREMENT..."),
        (("verify", "examples/beacon-as-built.toml", "none.csv"), "none.csv: is not there"),
        (("verify", "examples/lantern.toml", "examples/beacon-levels.csv"), "is a job file"),
        ((*LEVELS, "--limit", "sixty"), "--limit: got 'sixty'"),
        ((*LEVELS, "--limit", "-10dB"), "--limit: got '-10dB'; an amount is above 0 dB"),
        ((*LEVELS, "--decision", "fair"), "--decision: got 'fair'; allowed simple | guarded"),
        ((*LEVELS, "--attenuation", "40W"), "--attenuation: read '40W', which is a power; wanted a ratio in decibels"),
        ((*LEVELS, "--attenuation", "-40dB"), "--attenuation: got -40 dB; allowed 0 dB to 200 dB"),
        ((*LEVELS, "--probe", "0"), "--probe: got 0; allowed above 0"),
        ((*LEVELS, "--probe", "1,5"), "--probe: read '1,5', which has a comma"),
        ((*LEVELS, "--sampler", "none.csv"), "none.csv: is not there"),
        ((*LEVELS, "--sampler", "examples/beacon-levels.csv"), "is no response of a sampler"),
        ((*LEVELS, "--samplr", "x"), "'--samplr' is no option of rfstage verify (did you mean '--sampler'?)"),
        ((*WAVE, "--probe", "1"), "--probe is given twice"),
        ((*WAVE, "--sample-rate", "1MHz"), "strongest line lies at"),
        ((*TANK, "examples/beacon-tank.s2p"), "a second network-analyser file; give one at a time"),
        (("verify", "examples/beacon-as-built.toml", "examples/README.md"), "has no line of numbers"),
        (("verify", "examples/beacon-as-built.toml", "examples"), "examples: can't be read"),
    ],
    ids=lambda value: " ".join(value[1:])[-40:] if isinstance(value, tuple) else "",
)
def test_bad_input_is_one_line_and_status_2(bench, words, said):
    done = bench(*words)
    assert done.returncode == 2
    assert done.stdout == ""
    assert said in done.stderr
    assert len(done.stderr.splitlines()) == 1
    assert "Traceback" not in done.stderr


def test_a_measurement_named_like_an_option_stands_behind_two_dashes(bench, tmp_path):
    shutil.copy(PROJECT / "examples" / "beacon-levels.csv", tmp_path / "-l.csv")
    got = record(bench("verify", "--json", *SAMPLED, "--", "examples/beacon-as-built.toml", "-l.csv"))
    assert got["files"][0]["name"] == "-l.csv"


def test_help_and_bad_options_come_before_numpy():
    code = (
        "import sys; from rfstage.cli import main\n"
        "try: main(sys.argv[1:])\nexcept SystemExit: pass\n"
        "assert 'numpy' not in sys.modules and 'rich' not in sys.modules"
    )
    for words in (("verify", "--help"), ("verify", "a", "b", "--frob"), ("verify", "a", "b", "--probe", "x")):
        subprocess.run([sys.executable, "-c", code, *words], check=True, capture_output=True, cwd=PROJECT)


def test_a_level_list_loads_neither_scipy_nor_scikit_rf():
    code = (
        "import sys; from rfstage.cli import main\n"
        f"main(['verify', r'{STAGE}', r'{PROJECT / 'examples' / 'beacon-levels.csv'}'])\n"
        "assert not {'scipy', 'skrf'} & set(sys.modules)"
    )
    subprocess.run([sys.executable, "-c", code], check=True, capture_output=True, cwd=PROJECT)


def listed(*pairs, unit="dBc"):
    return LevelList("list.csv", unit, tuple(Reading(*pair) for pair in pairs))


FULL = [(7.1e6 * n, -70.0) for n in range(2, 11)]


def test_the_verdict_takes_the_worst_of_all_orders(state):
    asked = Asked(limit_named("43dB"), GUARDED, Setup())
    assert verify(state, [listed(*FULL)], asked).verdict == PASS
    assert verify(state, [listed((14.2e6, -43.5), *FULL[1:])], asked).verdict == UNDECIDED
    assert verify(state, [listed((14.2e6, -43.5), *FULL[1:])], asked._replace(decision=SIMPLE)).verdict == PASS
    assert verify(state, [listed((14.2e6, -43.5), (21.3e6, -40.0), *FULL[2:])], asked).verdict == FAIL


def test_an_order_near_its_limit_that_was_not_measured_leaves_it_undecided(state):
    asked = Asked(limit_named("43dB"), GUARDED, Setup())
    found = verify(state, [listed(*FULL[1:])], asked)
    assert (found.verdict, found.near) == (UNDECIDED, (2,))
    # order 3 is predicted 19 dB below the limit: that it is missing is said, and no more
    found = verify(state, [listed(FULL[0], *FULL[2:])], asked)
    assert (found.verdict, found.missing, found.near) == (PASS, (3,), ())


def test_a_strong_reading_that_is_no_harmonic_leaves_it_undecided(state):
    asked = Asked(limit_named("43dB"), GUARDED, Setup())
    assert verify(state, [listed(*FULL, (9e6, -60.0))], asked).verdict == PASS
    assert verify(state, [listed(*FULL, (9e6, -30.0))], asked).verdict == UNDECIDED


def test_the_limit_is_taken_for_the_power_measured(state):
    asked = Asked(limit_named("43+10log"), GUARDED, Setup())
    found = verify(state, [listed((7.1e6, 50.0), (14.2e6, -20.0), unit="dBm")], asked)
    assert found.power == pytest.approx(100.0)
    assert found.needed == pytest.approx(63.0)  # 43 + 10 log10(100)
    predicted = verify(state, [listed(*FULL)], asked)
    assert not predicted.power_measured
    assert predicted.needed == pytest.approx(43 + 10 * math.log10(state.output_power))


def test_without_a_limit_there_is_no_verdict(state):
    found = verify(state, [listed(*FULL)], Asked(None, GUARDED, Setup()))
    assert found.verdict is None
    assert all(v.verdict is None and v.limit is None for v in found.orders)
    assert found.orders[0].predicted == state.harmonics[0].level


def test_a_reactive_load_is_pointed_at(state):
    stage = replace(state.stage, load=SeriesLoad(complex(45, 12), 7.1e6))
    found = verify(rfstage.settle(stage), [listed(*FULL)], Asked(limit_named("43dB"), GUARDED, Setup()))
    assert any("reactive load flatters" in remark for remark in found.remarks)


def test_a_limit_without_levels_is_not_judged(state):
    tank = read_measurement(PROJECT / "examples" / "beacon-tank.s2p")
    found = verify(state, [tank], Asked(limit_named("43dB"), GUARDED, Setup()))
    assert found.verdict is None
    assert any("the limit is not judged" in remark for remark in found.remarks)


def test_a_clipped_capture_can_not_pass(state):
    t = np.arange(4000) * 1e-9
    volts = np.round(100 * np.cos(2 * np.pi * 7.1013e6 * t))
    asked = Asked(limit_named("20dB"), GUARDED, Setup())
    assert verify(state, [Capture("w", 1e-9, (Channel("CH1", "V", volts),))], asked).verdict == PASS
    flat = np.clip(volts, -95, 95)
    assert verify(state, [Capture("w", 1e-9, (Channel("CH1", "V", flat),))], asked).verdict == UNDECIDED


def test_a_clipped_capture_can_not_fail_a_stage_either(state):
    volts = np.clip(np.round(100 * np.cos(2 * np.pi * 7.1013e6 * 1e-9 * np.arange(4000))), -60, 60)
    found = verify(
        state, [Capture("w", 1e-9, (Channel("CH1", "V", volts),))], Asked(limit_named("43dB"), SIMPLE, Setup())
    )
    assert found.orders[1].measured.level > -43
    assert {v.verdict for v in found.orders} == {UNDECIDED}
    assert found.verdict == UNDECIDED


def test_a_carrier_far_off_the_predicted_power_is_pointed_at_and_no_limit_is_had_by_it(state):
    # 30 dB of attenuation not told: the limit of 43 + 10 log P would be 30 dB easier
    readings = LevelList("list", "dBm", (Reading(7.1e6, 8.8), Reading(14.2e6, -21.2), Reading(21.3e6, -60.0)))
    asked = Asked(limit_named("43+10log"), GUARDED, Setup())
    found = verify(state, [readings], asked)
    assert found.verdict == UNDECIDED
    assert any("30 dB below the predicted" in remark for remark in found.remarks)
    told = verify(state, [readings], asked._replace(setup=Setup(attenuation=30.0)))
    assert told.verdict == FAIL
    assert not told.remarks


def test_a_lossy_part_is_named(bench, tmp_path):
    stage = rfstage.load_stage(STAGE)
    parts = tuple(replace(b, q=40.0) if b.name == "C2" else b for b in stage.branches)
    frequencies = np.linspace(2e6, 20e6, 91)
    found = two_port(Ladder((stage.feed[-1], *parts)), frequencies, 50.0)
    rows = [
        f"{f} " + " ".join(f"{s.real} {s.imag}" for s in m.T.flatten()) for f, m in zip(frequencies, found, strict=True)
    ]
    (tmp_path / "lossy.s2p").write_text("# Hz S RI R 50\n" + "\n".join(rows) + "\n")
    page = bench("verify", "examples/beacon-as-built.toml", "lossy.s2p").stdout
    assert "C2 loses more than its file says: Q 40 where 1000 is given" in page
    assert "No part that the data tell is off" not in page


def test_channels_are_told_by_unit_and_by_the_shunt(state):
    t = np.arange(4000) * 1e-9
    volts = 27 * np.cos(2 * np.pi * 7.1e6 * t)
    pulse = np.maximum(np.cos(2 * np.pi * 7.1e6 * t) - 0.5, 0) * 2 * 4.6
    both = (Channel("CH1", "V", volts), Channel("CH2", "V", 0.1 * pulse))
    with pytest.raises(InputError, match="both channels are in volts"):
        verify(state, [Capture("w", 1e-9, both)], Asked(None, GUARDED, Setup()))
    shunted = verify(state, [Capture("w", 1e-9, both)], Asked(None, GUARDED, Setup(), shunt=0.1))
    plain = verify(state, [Capture("w", 1e-9, (both[0], Channel("CH2", "A", pulse)))], Asked(None, GUARDED, Setup()))
    assert shunted.pulse.peak == pytest.approx(4.6, rel=0.01)
    assert shunted.pulse.peak == pytest.approx(plain.pulse.peak)
    assert shunted.pulse.conduction_angle_deg == pytest.approx(120, abs=0.5)


def test_a_current_alone_gives_its_pulse_and_no_levels(state):
    x = 2 * np.pi * 7.1e6 * np.arange(4000) * 1e-9
    one = Capture("i", 1e-9, (Channel("CH1", "A", np.maximum(np.cos(x) - 0.5, 0)),))
    found = verify(state, [one], Asked(None, GUARDED, Setup()))
    assert (found.orders, found.meters, found.verdict) == ((), None, None)
    assert found.pulse.conduction_angle_deg == pytest.approx(120, abs=0.5)
    with pytest.raises(InputError, match="a second current; give one at a time"):
        verify(state, [one, one], Asked(None, GUARDED, Setup()))


def test_device_in_place_counts_its_capacitance(state):
    tank = read_measurement(PROJECT / "examples" / "beacon-tank.s2p")
    found = verify(state, [tank], Asked(None, GUARDED, Setup(), device_in=True))
    assert found.tank.parts[0].name == "Cout"
    bare = replace(state.stage, device=replace(state.stage.device, output_capacitance=0.0))
    with pytest.raises(InputError, match=r"--device in: the stage file gives no device\.output_capacitance"):
        verify(rfstage.settle(bare), [tank], Asked(None, GUARDED, Setup(), device_in=True))


def test_a_push_pull_tank_has_no_port(state):
    stage = replace(state.stage, device=replace(state.stage.device, pair="push-pull"))
    tank = read_measurement(PROJECT / "examples" / "beacon-tank.s2p")
    with pytest.raises(ImpossibleError, match="no port to ground"):
        verify(rfstage.settle(stage), [tank], Asked(None, GUARDED, Setup()))
    assert verify(rfstage.settle(stage), [listed(*FULL)], Asked(None, GUARDED, Setup())).orders


def test_a_stage_without_output_has_nothing_to_verify(bench, tmp_path):
    text = STAGE.read_text(encoding="utf-8").replace('amplitude = "1 V"', 'amplitude = "1 mV"')
    (tmp_path / "off.toml").write_text(text, encoding="utf-8")
    done = bench("verify", "off.toml", "examples/beacon-levels.csv")
    assert done.returncode == 2
    assert "has no output in steady state" in done.stderr


def test_same_input_same_bytes(bench):
    assert bench(*WAVE, "--json").stdout == bench(*WAVE, "--json").stdout
