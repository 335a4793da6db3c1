"""The terminal program: exit status, streams, JSON keys, bad input, what is loaded when."""

from __future__ import annotations

import importlib
import json
import math
import os
import shutil
import subprocess
import sys

import pytest
from conftest import PROJECT

from rfstage.cli import COMMANDS, _in_ascii_units, main, overview
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
        (("design", "nothing.toml"), "rfstage: nothing.toml: is not there"),
        (("settle", "nothing.toml"), "rfstage: nothing.toml: is not there"),
        (("design", ""), "an empty name is no file"),
        (("design", *GOOD, "--save", ""), "--save: got an empty name"),
        (("design", *GOOD, "--save", "."), ".: is a folder"),
        (("design", *GOOD, "--load", "antenna.s2p"), "--load: antenna.s2p: a load file ends in .s1p and is a one-port"),
        (("design", *GOOD, "--load", "."), "--load: .: a load file ends in .s1p and is a one-port"),
        (("match", "50", "antenna.s2p", "--carrier", "7MHz"), "LOAD: antenna.s2p: a load file ends in .s1p"),
        (("design", *GOOD, "--coil-q", "lossles"), "--coil-q: got 'lossles'; wanted 1 to 10 million, or lossless"),
        (("design", *GOOD, "--limit", "us-amater"), "rfstage: --limit: got 'us-amater'"),
        (("design", *GOOD, "--minimum-voltage", "20V"), "rfstage: --minimum-voltage: got 20 V"),
        (("match", "50", "50", "--carrier", "7MHz", "--power", ""), "--power: read an empty text"),
        (("design", *GOOD, "--carrier", "8MHz"), "--carrier is given twice"),
        (("design", *GOOD, "--carrier=8MHz"), "--carrier is given twice"),
        (("design", *GOOD, "--json=1"), "--json takes no value"),
        (("design", *GOOD, "--save"), "--save: wants a value"),
        (("sweep", "--of", "C1"), "sweep wants STAGE.toml, --from X, --to Y"),
        (("match", "50"), "match wants LOAD"),
        (("pulse", "120", "7"), "'7' is one word too many"),
        (("design", *GOOD, "--load", "nothing.s1p"), "is not there"),
        (("design", *GOOD, "--minimum-voltage", "20V"), "below the supply of 13.8 V"),
        (("design", *GOOD, "--loaded-q", "1"), "must be above 2."),
        (("design", *GOOD, "--loaded-q", "9", "--input-q", "3"), "give one of them"),
        (("design", *GOOD, "--network", "l", "--loaded-q", "5"), "ask for network pi"),
        (("design", *GOOD, "--touchstone", "no/such/folder/x.s2p"), "is not there"),
        (("design", *GOOD, "--save", "same", "--touchstone", "same"), "same file name"),
        (("design", *GOOD, "--output-capacitance", "100nF", "--loaded-q", "10"), "device.output_capacitance"),
        (("design", *GOOD[:2], "--power", "", *GOOD[4:]), "empty"),
        (("design", *GOOD[:2], "--power", "nan", *GOOD[4:]), "not a finite number"),
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
    assert done.stderr.count("\n") == 1
    assert done.stderr.startswith("rfstage: ")
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


PLACES = {"PYTHONPATH": str(PROJECT), "PATH": os.environ["PATH"], "PYTHONIOENCODING": "utf-8"}
RFSTAGE = f"{sys.executable} -W error -m rfstage"
EVERY_COMMAND = (
    f"design {' '.join(GOOD)}",
    f"design {' '.join(GOOD)} --json",
    "match 1000 50 --carrier 3.5MHz",
    "settle examples/beacon-as-built.toml",
    "sweep examples/beacon-as-built.toml --of C1 --from 8nF --to 9nF --points 2",
    "pulse 120",
    "--help",
    "pulse --help",
)


def shell(line):
    return subprocess.run(line, shell=True, capture_output=True, text=True, env=PLACES, cwd=PROJECT, check=False)


@pytest.mark.parametrize("words", EVERY_COMMAND)
def test_a_reader_that_goes_away_is_no_error(words):
    reader = f"{sys.executable} -c 'import os; os.close(0)'"
    done = shell(f"{{ {RFSTAGE} {words}; echo $? >&2; }} | {reader}")
    assert done.stderr == "0\n"
    assert done.stdout == ""


def test_the_first_line_is_enough_for_a_reader():
    done = shell(f"{RFSTAGE} {EVERY_COMMAND[0]} | head -1")
    assert done.stderr == ""
    assert done.stdout.count("\n") == 1


@pytest.mark.skipif(not os.path.exists("/dev/full"), reason="no device that is always full")
@pytest.mark.parametrize("words", EVERY_COMMAND)
def test_an_output_that_takes_nothing_is_one_clear_line(words):
    done = shell(f"{RFSTAGE} {words} > /dev/full")
    assert done.returncode == 2
    assert done.stderr == "rfstage: the output can't be written (No space left on device)\n"


@pytest.mark.parametrize("words", EVERY_COMMAND)
def test_a_closed_output_is_one_clear_line(words):
    done = shell(f"{RFSTAGE} {words} >&-")
    assert done.returncode == 2
    assert done.stderr == "rfstage: the output can't be written (it is closed)\n"


def test_with_nowhere_to_complain_the_exit_status_is_left():
    assert shell(f"{RFSTAGE} nothing 2>&-").returncode == 2
    assert shell(f"{RFSTAGE} nothing >&- 2>&-").returncode == 2


def test_an_unknown_option_hides_no_other_problem(run):
    done = run("design", "--carier", "7MHz", "--power", "10 V", "--coil-q=lossles", "--json=1", "--frob", "--save")
    assert [line.split(":", 1)[1].strip() for line in done.stderr.splitlines()] == [
        "'--carier' is no option of rfstage design (did you mean '--carrier'?)",
        "--json takes no value",
        "'--frob' is no option of rfstage design",
        "--save: wants a value",
        "--power: read '10 V', which is a voltage; wanted a power, such as 10 W",
        "--coil-q: got 'lossles'; wanted 1 to 10 million, or lossless",
    ]


def test_a_value_may_stand_behind_an_equals_sign_and_words_behind_two_dashes(run):
    got = record(run("pulse", "--orders=2", "--json", "--", "120"))
    assert len(got["coefficients"]) == 3


def test_the_page_ends_with_the_files_written_and_json_does_not(run, tmp_path):
    done = run("design", *GOOD, "--save", "a.toml", "--touchstone", "grün.s2p")
    assert done.stdout.splitlines()[-1] == "Wrote grün.s2p, a.toml"
    again = run("design", *GOOD, "--save", "b.toml", "--json")
    assert "Wrote" not in again.stdout
    swept = run(
        "sweep", "a.toml", "--of", "supply.voltage", "--from", "12", "--to", "14", "--points", "2", "--csv", "a.csv"
    )
    assert swept.stdout.splitlines()[-1] == "Wrote a.csv"
    assert run("settle", "a.toml", "--spice", "a.cir").stdout.splitlines()[-1] == "Wrote a.cir"
    assert {p.name for p in tmp_path.iterdir()} == {"a.toml", "grün.s2p", "b.toml", "a.csv", "a.cir"}


def test_a_name_that_the_output_can_not_show_is_shown_escaped(run):
    narrow = {"PYTHONIOENCODING": "ascii"}
    done = run("design", *GOOD, "--save", "grün.toml", env=narrow)
    assert done.stdout.splitlines()[-1] == r"Wrote gr\xfcn.toml"
    assert record(run("design", *GOOD, "--save", "ü.toml", "--json", env=narrow))["files"] == ["ü.toml"]


def test_control_characters_are_shown_escaped(run):
    done = run("design", "a\n\x1b[31m.toml")
    assert done.stderr == "rfstage: a\\n\\x1b[31m.toml: is not there\n"


@pytest.mark.parametrize("command", ["settle", "sweep", "design"])
def test_what_a_run_reads_is_never_replaced(run, tmp_path, examples, command):
    for name in ("beacon-as-built.toml", "gallery.toml", "gallery-antenna.s1p"):
        shutil.copy(examples / name, tmp_path)
    before = {p.name: p.read_bytes() for p in tmp_path.iterdir()}
    stage, antenna = "beacon-as-built.toml", "gallery-antenna.s1p"
    words = {
        "settle": [(stage, "stage file", "settle", stage, "--spice")],
        "sweep": [(stage, "stage file", "sweep", stage, "--of", "C1", "--from", "8nF", "--to", "9nF", "--csv")],
        "design": [
            ("gallery.toml", "job file", "design", "gallery.toml", "--save"),
            (antenna, "load file", "design", "gallery.toml", "--touchstone"),
        ],
    }
    for name, kind, *line in words[command]:
        done = run(*line, name, "--overwrite")
        assert done.returncode == 2
        assert done.stderr == f"rfstage: {name}: is the {kind} itself; give another name\n"
    assert {p.name: p.read_bytes() for p in tmp_path.iterdir()} == before


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("C1", "7nF", "7nF"), ["--to: got 7 nF, the same as --from"]),
        (
            ("C1", "7", "11"),
            [
                "--from: got 7 F where C1 is 8.8 nF (did you mean 7 nF?)",
                "--to: got 11 F where C1 is 8.8 nF (did you mean 11 nF?)",
            ],
        ),
        (("carrier", "7.0", "7.2MHz"), ["--from: got 7 Hz where carrier is 7.1 MHz (did you mean 7 MHz?)"]),
        (("C1", "0", "9nF"), ["--from: got 0 F; allowed above 0 F"]),
    ],
)
def test_the_ends_of_a_sweep_are_looked_at(run, examples, words, said):
    path, first, last = words
    done = run("sweep", str(examples / "beacon-as-built.toml"), "--of", path, "--from", first, "--to", last)
    assert done.returncode == 2
    assert done.stderr.splitlines() == [f"rfstage: {line}" for line in said]


@pytest.mark.parametrize("path", ["C1.lead_inductance", "L1.self_capacitance", "device.knee_resistance"])
def test_a_sweep_may_begin_at_zero_where_nothing_is_a_value(run, examples, path):
    last = {"C1": "3nH", "L1": "1pF", "device": "50mohm"}[path.split(".")[0]]
    words = ("--of", path, "--from", "0", "--to", last, "--points", "2", "--json")
    got = record(run("sweep", str(examples / "beacon-as-built.toml"), *words))
    assert len(got["points"]) == 2


def abouts():
    return {name: importlib.import_module(f"rfstage.cli.{name}").ABOUT for name in COMMANDS}


def worked_lines():
    texts = [about.replace("\\\n", " ") for about in abouts().values()]
    return [" ".join(line.split()) for text in texts for line in text.splitlines() if line.startswith("  rfstage ")]


def test_descriptions_and_worked_lines_fit_eighty_columns():
    for about in (*abouts().values(), overview()):
        assert max(map(len, about.splitlines())) <= 78


@pytest.mark.parametrize("line", worked_lines())
def test_every_worked_line_of_the_help_runs_from_the_project(line):
    done = shell(line.replace("rfstage", RFSTAGE, 1))
    assert done.stderr == ""
    assert done.returncode == 0


def test_every_command_has_a_worked_line():
    assert {line.split()[1] for line in worked_lines()} == set(COMMANDS)


def test_every_command_takes_the_options_that_hold_everywhere(capsys):
    for command in COMMANDS:
        with pytest.raises(SystemExit):
            main([command, "--help"])
        shown = capsys.readouterr().out
        assert all(option in shown for option in ("--json", "--plain", "--overwrite"))


def test_pulse_can_end_at_the_mean(run):
    got = record(run("pulse", "180", "--orders", "0", "--json", "--overwrite"))
    # SOURCE: exact, half a cosine: mean 1/pi, fundamental over mean pi/2
    assert got["coefficients"] == pytest.approx([1 / math.pi])
    assert got["fundamental_to_dc"] == pytest.approx(math.pi / 2)


@pytest.mark.parametrize(
    ("message", "printed"),
    [
        (
            "−47.2 V, 46.9 mΩ, 3.30 µH, 120.0 °, 12.0 − j3.20 Ω",
            "-47.2 V, 46.9 mohm, 3.30 uH, 120.0 deg, 12.0 - j3.20 ohm",
        ),
        ("from 1.79 (360°) to below 2 (0°)", "from 1.79 (360 deg) to below 2 (0 deg)"),
        ("at most 1.25e+03 ohm, or 4e+05", "at most 1250 ohm, or 400000"),
        ("got 1e+12; read '1.25e+03 x'", "got 1e+12; read '1.25e+03 x'"),
        ("µ-Antenne 50°N Ω.s1p: is not there", "µ-Antenne 50°N Ω.s1p: is not there"),
    ],
)
def test_messages_have_one_spelling_of_figures_and_keep_the_names_of_files(message, printed):
    assert _in_ascii_units(message) == printed


@pytest.mark.parametrize("command", ["", *COMMANDS])
def test_nothing_heavy_is_loaded_by_the_front_rooms(command):
    module = f"rfstage.cli.{command}".rstrip(".")
    script = f"import sys; import {module}; print(*sys.modules)"
    done = subprocess.run([sys.executable, "-S", "-c", script], capture_output=True, text=True, env=PLACES, check=True)
    assert not set(done.stdout.split()) & {"numpy", "rich", "pathlib", "shutil", "dataclasses", "tomllib", "json"}
