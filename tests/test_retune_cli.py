"""``rfstage retune`` as a person runs it: the story of the boathouse, pages, JSON, and every kind of bad input."""

from __future__ import annotations

import json
import re
import shlex
import subprocess
import sys

import pytest
from conftest import PROJECT
from hypothesis import given, settings
from hypothesis import strategies as st

from rfstage.cli import main
from rfstage.cli.retune import _pair, _split
from rfstage.cli.words import Parser
from rfstage.errors import InputError

STORY = (PROJECT / "examples" / "boathouse-retune.md").read_text(encoding="utf-8")
COMMANDS = [line for block in re.findall(r"```sh\n(.*?)```", STORY, re.S) for line in block.splitlines()]
BOATHOUSE = str(PROJECT / "examples" / "boathouse.toml")
READ = "supply=24V dc_current=1.40A output_power=19.2W"


@pytest.fixture
def story(monkeypatch, capsys):
    monkeypatch.chdir(PROJECT)
    monkeypatch.setenv("COLUMNS", "80")

    def told(number: int, *more: str) -> str:
        words = shlex.split(COMMANDS[number])
        assert words[:2] == ["rfstage", "retune"]
        assert main([*words[1:], *more]) == 0
        out, err = capsys.readouterr()
        assert err == ""
        return out

    return told


@pytest.fixture
def record(capsys):
    def told(*words: str):
        assert main(["retune", BOATHOUSE, *words, "--json"]) == 0
        out, err = capsys.readouterr()
        assert err == ""
        return json.loads(out)

    return told


# The story: what its text says is what its commands give


def test_the_story_has_its_commands():
    assert len(COMMANDS) == 6


@pytest.mark.parametrize("number", range(6))
def test_every_page_of_the_story_is_whole_and_fits_80_columns(story, number):
    for more in ((), ("--plain",)):
        page = story(number, *more)
        assert max(len(line) for line in page.splitlines()) <= 80
    assert page.isascii()


def test_another_channel_takes_one_trimmer(story):
    page = story(0)
    assert re.search(r"1  C2 +6\.20 nF +6\.558 nF +trimmer: raise by 5\.8 %", page)
    assert re.search(r"3  L1 +422 nH +440\.\d nH +squeeze the turns to 12\.7 mm", page)
    assert re.search(r"\n +1 .* 32\.4 W .* ok\n", page)
    assert "C2 from 6.20 to 6.56 nF, and the stage gives 32.4 W" in STORY


def test_a_far_channel_takes_a_tap(story):
    page = story(1)
    assert re.search(r"1  L1 +422 nH +19\d\.\d nH +tap at 3\.4\d turns", page)
    assert "Nothing that is fitted" not in page


def test_one_reading_leaves_two_causes_and_names_the_next(story):
    page = " ".join(story(2).split())
    assert "do not tell apart: L1, drive.amplitude" in page
    assert "Set C2 to 5.40 nF" in page
    assert "1.89 A and 27.8 W if it is L1" in page


def test_the_next_reading_names_the_coil(story):
    page = story(3)
    assert re.search(r"\n +1 L1 +422 nH +460 nH +\+(?:8\.9|9\.0) % +0\.\d lower by 8\.\d %\n", page)
    assert re.search(r"\n +2 C2 ", page)
    assert "L1 is 460 nH" in STORY


def test_the_tune_up_begins_with_cautions_and_a_lowered_supply(story):
    page = story(4)
    assert page.index("Cautions") < page.index("1. Dummy load") < page.index("The wrong way")
    assert "supply lowered to 12 V" in page
    assert re.search(r"5 % below the dip: dc current \+0\.6\d %, output \+5 %", page)


def test_the_dip_meter_finds_the_coil(story):
    page = story(5)
    assert "421.2 nH" in page
    assert "The nearest coil of the stage is L1, 422 nH" in page


# JSON


def test_json_of_a_new_carrier_has_the_keys_others_rely_on(record):
    found = record("--carrier", "3.52MHz")
    assert (found["format"], found["version"], found["carrier_hz"]) == ("rfstage.retune", 1, 3.52e6)
    assert found["causes"] == []
    assert found["next_reading"] is None
    first = found["changes"][0]
    assert {"part", "unit", "now", "wanted", "within_reach", "settled"} <= set(first)
    assert (first["part"], first["unit"], first["within_reach"]) == ("C2", "F", True)
    assert first["now"] == 6.2e-9
    assert "format" not in first["settled"]
    assert first["settled"]["output_power_w"] == pytest.approx(32.4, abs=0.05)
    numbers = [change["option"] for change in found["changes"]]
    assert numbers == sorted(numbers)


def test_json_of_readings_has_the_keys_others_rely_on(record):
    found = record("--reading", READ)
    assert found["carrier_hz"] == 3.6e6
    assert found["changes"] == []
    assert set(found["causes"][0]) == {"part", "unit", "nominal", "estimated", "misfit", "group"}
    assert found["causes"][0]["part"] == "L1"
    assert found["causes"][0]["nominal"] == 422e-9
    assert found["next_reading"].startswith("set C2 to 5.40 nF")
    assert found["readings"][0]["efficiency"] == pytest.approx(19.2 / 33.6)


def test_json_of_a_tune_up_and_of_the_bench(record):
    steps = record()["procedure"]
    assert (steps["tuning"], steps["loading"]) == ("C1", "C2")
    assert steps["dip"]["dc_current_a"] < steps["above_dip"]["dc_current_a"]
    bench = record("--half-power", "3.4MHz 3.8MHz", "--half-power-unloaded", "3.588MHz 3.612MHz")["bench"]
    assert bench["loaded"]["q"] == pytest.approx((3.4 * 3.8) ** 0.5 / 0.4)
    assert bench["efficiency"] == pytest.approx(1 - bench["loaded"]["q"] / bench["unloaded"]["q"])
    assert bench["coupling"] is None


def test_carrier_and_readings_go_together(record):
    found = record("--carrier", "3.52MHz", "--reading", READ)
    assert found["changes"]
    assert found["causes"]


def test_the_same_command_gives_the_same_bytes_in_another_process(run, capsys):
    words = ("retune", BOATHOUSE, "--reading", READ, "--json")
    assert main(list(words)) == 0
    assert run(*words).stdout == capsys.readouterr().out


# Bad input: exit status 2, one clear line each, nothing on stdout


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["--reading", "dc_curent=1.4A"], "no coil or capacitor of this stage (did you mean 'dc_current'?)"),
        (["--reading", "C7=5nF dc_current=1.4A"], "'C7' is no meter and no coil or capacitor of this stage"),
        (["--reading", ""], "wanted name=value"),
        (["--reading", "1.4A"], "wanted name=value"),
        (["--reading", "dc_current=1,4A"], "has a comma"),
        (["--reading", "dc_current=1.4W"], "which is a power; wanted a current"),
        (["--reading", "dc_current=1.4A output_power=40W"], "output_power of 40 W is more than the dc power of 33.6 W"),
        (["--reading", "dc_current=-1.4A"], "dc_current: got -1.4 A; allowed above 0 A"),
        (["--reading", "dc_current=1.4A dc_current=1.5A"], "dc_current is given twice"),
        (["--reading", "C1=20nF dc_current=1.4A"], "C1: got 20 nF; its trim goes from 13.5 nF to 17 nF"),
        (["--reading", "C1=15uH dc_current=1.4A"], "C1: read '15uH', which is an inductance"),
        (["--reading", "C1=15nF"], "nothing is read"),
        (["--reading", "dip= dc_current=1A"], "dip: names no part; wanted one of Cblock, C1, L1, C2"),
        (["--reading", "dip=C9 dc_current=1A"], "'C9' is no coil or capacitor"),
        (["--reading"], "--reading: wants a value"),
        (["--carrier", "3.6"], "--carrier: got 3.6 Hz; allowed 1 kHz to 30 GHz (did you mean 3.6 MHz?)"),
        (["--carrier", "1kHz"], "brings this stage to 1.000 kHz; what can be set reaches 2.815 MHz"),
        (["--carier", "3.6MHz"], "did you mean '--carrier'?"),
        (["--carrier", "3.5MHz", "--carrier", "3.6MHz"], "--carrier is given twice"),
        (["--meter-error", "0"], "--meter-error: got 0 %; allowed 0.1 % to 50 %"),
        (["--added", "1nF"], "--resonances and --added go together"),
        (["--resonances", "7MHz"], "--resonances: got '7MHz'; wanted two frequencies"),
        (["--resonances", "7,1MHz 3MHz", "--added", "1nF"], "has a comma"),
        (["--resonances", "7MHz 7MHz", "--added", "1nF"], "--resonances: with_added must be below the resonance alone"),
        (["--peaks", "7MHz 7MHz"], "--peaks: high must be above the low frequency"),
        (["--half-power", "3.5MHz 3.6MHz", "--half-power-unloaded", "3.4MHz 3.7MHz"], "the load can only lower it"),
    ],
)  # fmt: skip
def test_what_is_wrong_is_said_in_a_line(capsys, words, said):
    assert main(["retune", BOATHOUSE, *words]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert said in err
    assert all(line.startswith("rfstage: ") for line in err.splitlines())


def test_all_problems_of_all_readings_come_at_once(capsys):
    main(["retune", BOATHOUSE, "--reading", "dc_current=x", "--reading", "output_power=-3W", "--added", "1nF"])
    said = capsys.readouterr().err.splitlines()
    assert [line[9:20] for line in said] == ["--reading 1", "--reading 2", "--resonance"]


def test_a_stage_that_is_not_driven_says_so(run, tmp_path):
    text = (PROJECT / "examples" / "boathouse.toml").read_text(encoding="utf-8")
    (tmp_path / "idle.toml").write_text(text.replace('amplitude = "2.75 V"', 'amplitude = "0.5 V"'), encoding="utf-8")
    for more in ([], ["--carrier", "3.5MHz"]):
        assert "The drive stays below the threshold" in run("retune", "idle.toml", *more).stdout


def test_many_settings_of_a_reading_fit_the_page(run):
    reading = "C1=14nF C2=7nF L1=400nH drive=2.75V supply=24V dc_current=1.2A output_power=20W"
    page = run("retune", BOATHOUSE, "--reading", reading, width=80).stdout
    assert max(len(line) for line in page.splitlines()) <= 80
    assert "1: C1 14.0 nF, C2 7.00 nF, L1 400 nH, drive 2.75 V" in page


def test_a_stage_file_is_wanted(run):
    assert "retune wants STAGE.toml" in run("retune").stderr
    assert run("retune", "nowhere.toml").returncode == 2


@given(st.text(max_size=40))
@settings(max_examples=200)
def test_no_text_of_a_reading_is_read_in_silence_or_ends_in_a_traceback(text):
    problems: list[str] = []
    found = _split("--reading 1", text, problems)
    assert problems or found


@given(st.text(max_size=30))
@settings(max_examples=200)
def test_no_two_frequencies_are_read_from_what_has_no_two(text):
    problems: list[str] = []
    low, high = _pair("peaks", text, problems)
    assert problems or (len(text.split()) >= 2 and low > 0 and high > 0)


def test_a_value_may_stand_apart_from_its_name_and_its_unit():
    problems: list[str] = []
    found = _split("--reading 1", " dc_current = 1.9 A   output_power=14W C1=480 pF", problems)
    assert problems == []
    assert found == {"dc_current": 1.9, "output_power": 14.0, "C1": "480 pF"}
    assert _pair("peaks", "6.9 MHz 7.3MHz", problems) == (6.9e6, 7.3e6)
    assert problems == []


def test_a_repeatable_option_collects_and_any_other_is_given_once():
    made = Parser("retune", "about")
    group = made.add_argument_group("retune")
    made.repeatable(group, "--reading", "READING", "what was read")
    group.add_argument("--of")
    assert made.read([]).reading == ()
    assert made.read(["--reading", "a=1", "--of", "x", "--reading=b=2"]).reading == ("a=1", "b=2")
    with pytest.raises(InputError, match="--of is given twice"):
        made.read(["--of", "x", "--of", "y"])
    with pytest.raises(InputError, match="--reading: wants a value"):
        made.read(["--reading"])


def test_help_and_a_wrong_reading_answer_before_numpy_is_loaded():
    for words in (["--help"], [BOATHOUSE, "--reading", "dc_current=x"]):
        code = (
            "import sys; from rfstage.cli.retune import run\n"
            f"try: run({words!r})\n"
            "except (SystemExit, Exception) as error: print(type(error).__name__, 'numpy' in sys.modules)"
        )
        done = subprocess.run(
            [sys.executable, "-c", code], capture_output=True, text=True, check=True, env={"PYTHONPATH": str(PROJECT)}
        )
        assert done.stdout.splitlines()[-1] in ("SystemExit False", "InputError False")
