"""The terminal program: exit status, streams, JSON keys, bad input, what is loaded when."""

from __future__ import annotations

import json
import math
import subprocess
import sys

import pytest

from rfstage.cli import COMMANDS, main
from rfstage.jobfields import JOB_FIELDS

GOOD = ("--carrier", "7.1MHz", "--power", "10W", "--angle", "120deg", "--supply", "13.8V")


def record(done):
    assert done.stderr == ""
    return json.loads(done.stdout)


def no_nan(value):
    if isinstance(value, dict):
        return all(no_nan(v) for v in value.values())
    if isinstance(value, list):
        return all(no_nan(v) for v in value)
    return not (isinstance(value, float) and not math.isfinite(value))


def test_design_json_has_every_key_others_rely_on(run):
    got = record(run("design", *GOOD, "--limit", "us-amateur", "--max-voltage", "30", "--json"))
    assert got["format"] == "rfstage.design"
    assert got["version"] == 1
    assert set(got) >= {
        "designed_to",
        "stage",
        "assumed",
        "pulse",
        "operating_point",
        "drive",
        "ratings",
        "tank",
        "harmonics",
        "settled",
        "cautions",
        "files",
    }
    assert set(got["stage"]) >= {
        "carrier_hz",
        "output_power_w",
        "conduction_angle_deg",
        "operating_class",
        "supply_v",
        "minimum_voltage_v",
        "family",
        "load_ohm",
    }
    assert set(got["operating_point"]) >= {
        "load_resistance_ohm",
        "swing_v",
        "peak_current_a",
        "dc_current_a",
        "fundamental_current_a",
        "dc_power_w",
        "device_rf_power_w",
        "dissipation_w",
        "device_efficiency",
        "overall_efficiency",
        "peak_voltage_v",
        "output_power_w",
    }
    assert set(got["drive"]) >= {"bias_v", "amplitude_v", "unbiased_amplitude_v", "drive_power_w"}
    assert set(got["tank"]) >= {
        "network",
        "branches",
        "impedance_ohm",
        "loaded_q",
        "input_q",
        "bandwidth_hz",
        "efficiency",
        "harmonic_termination",
        "trough_dip",
    }
    assert set(got["tank"]["branches"][0]) >= {
        "name",
        "place",
        "kind",
        "value",
        "unit",
        "q",
        "series_resistance_ohm",
        "lead_inductance_h",
        "self_capacitance_f",
        "origin",
        "peak_voltage_v",
        "rms_current_a",
        "loss_w",
    }
    assert set(got["harmonics"][0]) >= {
        "order",
        "frequency_hz",
        "device_current_a",
        "load_power_w",
        "level_dbc",
        "line_level_dbc",
        "limit_dbc",
        "margin_db",
        "strays_decide",
    }
    assert [h["order"] for h in got["harmonics"]] == list(range(2, 11))
    assert len(got["pulse"]["coefficients"]) >= 11
    assert set(got["ratings"][0]) == {"name", "limit", "value", "exceeded"}
    assert no_nan(got)


def test_the_margin_is_the_limit_less_the_line_level(run):
    got = record(run("design", *GOOD, "--limit", "us-amateur", "--json"))
    for h in got["harmonics"]:
        assert h["limit_dbc"] == -43
        assert h["margin_db"] == pytest.approx(h["limit_dbc"] - h["line_level_dbc"], abs=1e-12)


def test_pulse_json(run):
    got = record(run("pulse", "120", "--orders", "3", "--json"))
    # SOURCE: reduced-cosine table, half angle 60 deg (computed to six places by mpmath quadrature)
    assert got["coefficients"] == pytest.approx([0.217996, 0.391002, 0.275664, 0.137832], abs=5e-7)
    assert got["operating_class"] == "C"
    assert got["fundamental_to_dc"] == pytest.approx(1.79362, abs=5e-6)
    assert got["maximum_efficiency"] == pytest.approx(0.89681, abs=5e-6)


def test_match_json_gives_the_exact_pi_of_the_table(run):
    got = record(
        run(
            "match",
            "1000",
            "50",
            "--carrier",
            "3.5MHz",
            "--network",
            "pi",
            "--input-q",
            "12",
            "--coil-q",
            "lossless",
            "--capacitor-q",
            "lossless",
            "--json",
        )
    )
    values = [branch["value"] for branch in got["tank"]["branches"]]
    # SOURCE: pi relations by virtual resistance, row 1000/50/Q 12 at 3.5 MHz (X 83.333, 100, 20 ohm)
    omega = 2 * math.pi * 3.5e6
    assert values == pytest.approx([1 / (omega * 83.3333333333), 100 / omega, 1 / (omega * 20)], rel=1e-10)
    # SOURCE: harmonic transfer of that pi from a current generator, printed to 0.01 dB
    assert [level for _, level in got["harmonic_transfer_db"][:4]] == pytest.approx(
        [-38.21, -50.20, -58.14, -64.15], abs=0.006
    )
    assert all(branch["peak_voltage_v"] is None for branch in got["tank"]["branches"])


@pytest.mark.parametrize("wanted", ["-10W", "-0.5"])
def test_a_negative_value_reaches_its_option_and_is_refused_there(run, wanted):
    done = run("design", *GOOD[:2], "--power", wanted, *GOOD[4:])
    assert done.returncode == 2
    assert done.stdout == ""
    assert "--power: got" in done.stderr
    assert "above 0 W" in done.stderr


def test_a_reactive_value_that_begins_with_a_minus_reaches_the_program(run):
    assert "resistance above 0 ohm" in run("design", *GOOD, "--load", "-j10").stderr
    assert "resistance above 0 ohm" in run("match", "50", "-5+j10", "--carrier", "7MHz").stderr
    assert "resistance above 0 ohm" in run("match", "-j10", "50", "--carrier", "7MHz").stderr
    done = run("design", *GOOD, "--threshold", "0.6V", "--bias", "-0.05V", "--json")
    assert record(done)["drive"]["bias_v"] == -0.05


def test_every_problem_of_the_options_comes_at_once(run):
    done = run("design", "--carrier", "7,1MHz", "--power", "10 V", "--angle", "400deg", "--load", "banana")
    lines = done.stderr.splitlines()
    assert done.returncode == 2
    assert len(lines) == 5
    assert all(line.startswith("rfstage: ") for line in lines)
    assert "comma" in lines[0]
    assert "voltage" in lines[1]
    assert "360 deg" in lines[2]
    assert "supply: missing" in lines[4]


@pytest.mark.parametrize(
    ("words", "hint"),
    [
        (("desing",), "'design'"),
        (("design", "--carier", "7MHz"), "'--carrier'"),
        (("design", "--limit", "us-amater", *GOOD), "'us-amateur'"),
        (("design", "--network", "pie", *GOOD), "'pi'"),
        (("pulse", "120", "--exponant", "2"), "'--exponent'"),
    ],
)
def test_a_misspelt_word_gets_the_nearest_one(run, words, hint):
    done = run(*words)
    assert done.returncode == 2
    assert hint in done.stderr
    assert "Traceback" not in done.stderr


def test_options_are_not_abbreviated(run):
    done = run("design", "--pow", "3")
    assert done.returncode == 2
    assert "'--pow' is no option" in done.stderr


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("design", "nothing.toml"), "can't be read"),
        (("design", *GOOD, "--load", "nothing.s1p"), "is not there"),
        (("design", *GOOD, "--minimum-voltage", "20V"), "below the supply of 13.8 V"),
        (("design", *GOOD, "--loaded-q", "1"), "must be above 2."),
        (("design", *GOOD, "--loaded-q", "9", "--input-q", "3"), "give one of them"),
        (("design", *GOOD, "--network", "l", "--loaded-q", "5"), "ask for network pi"),
        (("design", *GOOD, "--touchstone", "no/such/folder/x.s2p"), "is not there"),
        (("design", *GOOD, "--save", "same", "--touchstone", "same"), "same file name"),
        (("design", *GOOD, "--output-capacitance", "100nF", "--loaded-q", "10"), "device.output_capacitance"),
        (("design", *GOOD, "--power", ""), "empty"),
        (("design", *GOOD, "--power", "nan"), "not a finite number"),
        (("design", *GOOD, "--coil-q", "0"), "1 to"),
        (("match", "50", "50"), "--carrier: missing"),
        (("pulse",), "ANGLE"),
        (("pulse", "0"), "above 0 deg"),
        (("pulse", "120", "--orders", "2.5"), "whole number"),
    ],
)
def test_an_impossible_request_is_one_clear_line_and_writes_nothing(run, tmp_path, words, said):
    done = run(*words)
    assert done.returncode == 2
    assert done.stdout == ""
    assert said.lower() in done.stderr.lower()
    assert "Traceback" not in done.stderr
    assert list(tmp_path.iterdir()) == []


def test_a_missed_limit_is_exit_status_one_and_the_result_stands(run):
    done = run("design", *GOOD, "--limit", "us-amateur", "--plain")
    assert done.returncode == 1
    assert "MISSES: needs" in done.stdout
    assert done.stderr == ""
    assert run("design", *GOOD, "--limit", "20dB").returncode == 0


def test_files_are_replaced_only_when_asked(run, tmp_path):
    words = ("design", *GOOD, "--touchstone", "a.s2p", "--save", "a.toml", "--json")
    assert record(run(*words))["files"] == ["a.s2p", "a.toml"]
    before = (tmp_path / "a.s2p").read_bytes(), (tmp_path / "a.toml").read_bytes()
    again = run(*words)
    assert again.returncode == 2
    assert again.stderr.count("exists") == 2
    assert run(*words, "--overwrite").returncode == 0
    assert ((tmp_path / "a.s2p").read_bytes(), (tmp_path / "a.toml").read_bytes()) == before
    assert sorted(p.name for p in tmp_path.iterdir()) == ["a.s2p", "a.toml"]


def test_the_same_input_gives_the_same_bytes(run):
    assert run("design", *GOOD, "--json").stdout == run("design", *GOOD, "--json").stdout


def loaded_after(*words: str, before: str = "") -> set[str]:
    script = (
        f"import sys\n{before}\nfrom rfstage.cli import main\n"
        f"status = main({list(words)!r})\nprint(*sys.modules, file=sys.stderr)"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    return set(done.stderr.split())


def test_a_plain_design_loads_numpy_and_rich_and_nothing_heavier():
    loaded = loaded_after("design", *GOOD)
    assert {"numpy", "rich"} <= loaded
    assert not loaded & {"skrf", "scipy", "scipy.optimize", "scipy.signal", "pandas", "matplotlib"}


@pytest.mark.parametrize(
    "words",
    [
        ("--help",),
        ("--version",),
        ("design", "--carier", "7"),
        ("design", "--carrier", "7,1MHz"),
        ("design", "x.toml"),
        ("nothing",),
    ],
    ids=" ".join,
)
def test_help_and_refusals_answer_before_numpy_is_loaded(words):
    assert not loaded_after(*words) & {"numpy", "rich", "skrf"}


@pytest.mark.parametrize("command", COMMANDS)
def test_every_command_has_help(command, capsys):
    with pytest.raises(SystemExit) as stop:
        main([command, "--help"])
    assert stop.value.code == 0
    shown = capsys.readouterr().out
    assert f"rfstage {command}" in shown
    assert "--json" in shown


def test_every_job_key_with_an_option_has_help():
    assert all(field.help for field in JOB_FIELDS if field.option)


def test_version_names_what_it_stands_on(capsys):
    assert main(["--version"]) == 0
    assert [line.split()[0] for line in capsys.readouterr().out.splitlines()] == [
        "rfstage",
        "numpy",
        "scipy",
        "scikit-rf",
        "rich",
    ]


def test_a_reader_that_goes_away_is_no_error():
    done = subprocess.run(
        f"{sys.executable} -m rfstage design {' '.join(GOOD)} | head -1",
        shell=True,
        capture_output=True,
        text=True,
        check=True,
    )
    assert done.stderr == ""
    assert done.stdout.count("\n") == 1
