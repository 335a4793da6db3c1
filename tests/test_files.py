"""Job files, stage files, load files, Touchstone exports, and the way files are written."""

from __future__ import annotations

import dataclasses
import math
import os
from pathlib import Path

import numpy as np
import pytest
import skrf
from hypothesis import given, settings
from hypothesis import strategies as st

from rfstage import Job, Ladder, RfstageError, design, load_job, load_stage
from rfstage.errors import FileError, InputError
from rfstage.files.stagetext import stage_text
from rfstage.files.touchstone import grid, read_load, touchstone_text
from rfstage.files.write import check_targets, write_files
from rfstage.harmonics import decibels, load_powers
from rfstage.jobfields import JOB_FIELDS
from rfstage.load import MeasuredLoad

JOB = Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8, output_capacitance=60e-12)


def written(tmp_path, text, name="job.toml"):
    path = tmp_path / name
    path.write_text(text, encoding="utf-8")
    return path


def test_a_job_file_gives_the_job(tmp_path):
    path = written(
        tmp_path,
        """
        [stage]
        carrier = "7.1 MHz"
        power = 10
        conduction_angle = "120 deg"
        supply = "13V8"
        [tank]
        coil_q = "lossless"
        [load]
        impedance = "45-j5 ohm"
    """.replace("13V8", "13.8 V"),
    )
    job = load_job(path)
    assert (job.carrier, job.power, job.supply, job.load, job.coil_q) == (7.1e6, 10, 13.8, 45 - 5j, math.inf)


def test_every_error_of_a_job_file_comes_with_its_key_in_one_go(tmp_path):
    path = written(
        tmp_path,
        """
        [stage]
        carier = "7.1 MHz"
        power = "-3 W"
        conduction_angle = true
        supply = "13,8 V"
        minimum_voltage = "2 A"
        [tank]
        network = "star"
        coil_q = 0.2
        [limits]
        rule = "x"
    """,
    )
    with pytest.raises(InputError) as caught:
        load_job(path)
    text = str(caught.value)
    for key in (
        "stage.carier: no such key (did you mean 'carrier'?)",
        "stage.power: got -3 W; allowed above 0 W",
        "stage.conduction_angle: got true; wanted above 0 deg",
        "stage.supply: read '13,8 V'",
        "stage.minimum_voltage: read '2 A'",
        "tank.network: got 'star'",
        "tank.coil_q: got 0.2",
        "limits: no such table (did you mean 'limit'?)",
        "stage.carrier: missing",
    ):
        assert key in text
    assert len(caught.value.problems) == 9
    assert all(str(path) in line for line in caught.value.problems)


def test_an_unquoted_quantity_is_named_with_its_line(tmp_path):
    path = written(tmp_path, "[stage]\ncarrier = 7.1MHz\n")
    with pytest.raises(InputError, match=r'line 2.*needs quotes: carrier = "7.1MHz"'):
        load_job(path)


def test_a_job_that_is_not_text_is_refused(tmp_path):
    path = tmp_path / "job.toml"
    path.write_bytes(b"\xff\xfe\x00")
    with pytest.raises(FileError, match="not a text file"):
        load_job(path)
    with pytest.raises(FileError, match="can't be read"):
        load_job(tmp_path)


def test_a_missing_file_is_named_in_the_same_words_everywhere(tmp_path):
    for read, name in ((load_job, "a.toml"), (load_stage, "b.toml"), (read_load, "c.s1p")):
        path = tmp_path / name
        with pytest.raises(FileError) as caught:
            read(path)
        assert str(caught.value) == f"{path}: is not there"
    job = written(tmp_path, GOOD_JOB + '[load]\nfile = "c.s1p"\n')
    with pytest.raises(InputError) as wrong:
        load_job(job)
    assert str(wrong.value) == f"{job}: load.file: {tmp_path / 'c.s1p'}: is not there"
    stage = written(tmp_path, CONTRACT_STAGE.split("[load]")[0] + '[load]\nfile = "c.s1p"\n', "stage.toml")
    with pytest.raises(InputError) as wrong:
        load_stage(stage)
    assert str(wrong.value) == f"{stage}: load.file: {tmp_path / 'c.s1p'}: is not there"


GOOD_JOB = '[stage]\ncarrier = "7.1 MHz"\npower = 10\nconduction_angle = 120\nsupply = 13.8\n'


@pytest.mark.parametrize(
    ("more", "said"),
    [
        ('[load]\nfile = "a.s2p"\n', "a load file ends in .s1p and is a one-port"),
        ('[load]\nfile = "."\n', "a load file ends in .s1p and is a one-port"),
        ('[limit]\nrule = "us-amater"\n', "limit.rule: got 'us-amater'"),
        ("[stage.more]\n", "stage.more: no such key"),
        ("[load]\nimpedance = 1979-05-27\n", "load.impedance: got a date or time (1979-05-27)"),
        ("[load]\nimpedance = [50, 10]\n", "load.impedance: got a list"),
        ('[tank]\nnetwork = { kind = "pi" }\n', "tank.network: got a table"),
        ('[tank]\nnetwork = "Pi"\n', "(did you mean 'pi'?)"),
        ('[tank]\n"a\\u001b[31m" = 1\n', r"tank.a\x1b[31m: no such key"),
    ],
)
def test_every_problem_of_a_job_file_names_the_file(tmp_path, more, said):
    path = written(tmp_path, GOOD_JOB + more)
    with pytest.raises(InputError) as caught:
        load_job(path)
    assert len(caught.value.problems) == 1
    assert str(caught.value).startswith(f"{path}: ")
    assert said in str(caught.value)
    assert str(caught.value).isprintable()


def test_known_keys_at_the_top_of_a_job_are_sent_to_their_table(tmp_path):
    path = written(tmp_path, 'carrier = "7 MHz"\nsupply = "13.8 V"\npower = 10\nload = 50\nlimit = "us-amateur"\n')
    with pytest.raises(InputError) as caught:
        load_job(path)
    assert [line.removeprefix(f"{path}: ") for line in caught.value.problems[:5]] == [
        "carrier: belongs under [stage]",
        "supply: belongs under [stage]",
        "power: belongs under [stage]",
        "load: belongs under [load] as impedance",
        "limit: belongs under [limit] as rule",
    ]
    assert len(caught.value.problems) == 6
    assert "stage.conduction_angle: missing" in caught.value.problems[5]


def test_a_stage_file_is_no_job_and_a_job_no_stage(tmp_path):
    stage, job = written(tmp_path, CONTRACT_STAGE, "stage.toml"), written(tmp_path, GOOD_JOB)
    with pytest.raises(InputError) as caught:
        load_job(stage)
    assert str(caught.value) == f"{stage}: is a stage file; use 'rfstage settle {stage}'"
    with pytest.raises(InputError) as caught:
        load_stage(job)
    assert str(caught.value) == f"{job}: is a job file; use 'rfstage design {job}'"


def test_a_byte_order_mark_is_no_part_of_a_file(tmp_path):
    assert load_job(written(tmp_path, "\ufeff" + GOOD_JOB)).carrier == 7.1e6
    assert load_stage(written(tmp_path, "\ufeff" + CONTRACT_STAGE)).carrier == 7.1e6


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("[stage]\npower = 10\npower = 20\n", "line 3: power is given twice"),
        ("[stage]\npower = 10\n[tank]\n[stage]\nsupply = 5\n", "line 4: [stage] is given twice"),
        ("[stage]\npower == 10\n", "line 2: invalid value"),
        (f"[stage]\npower = {'1' * 6000}\n", "holds a number too long to be read"),
    ],
)
def test_what_is_no_toml_is_named_with_its_line(tmp_path, text, said):
    path = written(tmp_path, text)
    with pytest.raises(InputError) as caught:
        load_job(path)
    assert str(caught.value) == f"{path}: {said}"


def test_every_job_key_is_an_attribute_of_the_job():
    special = {"variable"}  # a table of ranges, read by itself
    assert {field.name for field in JOB_FIELDS} == set(Job.__dataclass_fields__) - special


def figures(part):
    """Return every number of a record by name, those of the records inside it among them."""
    found = {}
    for field in dataclasses.fields(part):
        value = getattr(part, field.name)
        if dataclasses.is_dataclass(value):
            found |= {f"{field.name}.{key}": inner for key, inner in figures(value).items()}
        elif isinstance(value, int | float):
            found[field.name] = value
    return found


@pytest.mark.parametrize("name", ["lantern", "gallery", "tower"])
def test_a_saved_stage_reads_back_with_the_same_harmonics(name, examples, tmp_path):
    made = design(load_job(examples / f"{name}.toml"))
    path = written(tmp_path, stage_text(made.stage, tmp_path), "stage.toml")
    stage = load_stage(path)
    frequencies = made.job.carrier * np.arange(1, 11)
    currents = made.coefficients[1:11] * made.point.peak_current
    levels = decibels(load_powers(stage.ladder, stage.load, frequencies, currents))
    assert levels[1:] == pytest.approx([h.level for h in made.harmonics], abs=1e-9)
    for part in ("device", "drive", "supply", "asked"):
        assert figures(getattr(stage, part)) == pytest.approx(figures(getattr(made.stage, part)), rel=1e-11)
    assert stage_text(stage, tmp_path) == path.read_text(encoding="utf-8")


CONTRACT_STAGE = """
format = "rfstage.stage"
version = 1
carrier = "7.1 MHz"
[device]
family = "fet"
transfer_factor = 2.0
exponent = 1.0
threshold = "3 V"
threshold_softness = "40 mV"
knee_voltage = "70 mV"
knee_resistance = "0.1 ohm"
amplification_factor = 20
output_capacitance = "150 pF"
junction_capacitance = { at_zero = "465 pF", potential = "0.8 V", grading = 0.5 }
reverse_conduction = { conductance = 1.95, threshold = "0.7 V", softness = "30 mV" }
max_voltage = "100 V"
[drive]
bias = "1 V"
amplitude = "4 V"
[supply]
voltage = "13.8 V"
choke = "0.75 uH"
choke_resistance = "20 mohm"
choke_q = 100
[[branch]]
name = "C1"
place = "shunt"
kind = "capacitor"
value = "1.2 nF"
q = 800
lead_inductance = "3 nH"
trim = ["0.9 nF", "1.5 nF"]
tolerance = "5 %"
[[branch]]
name = "L1"
place = "series"
kind = "coil"
value = "1.2 uH"
series_resistance = "0.2 ohm"
self_capacitance = "2 pF"
winding = { turns = 12, diameter = "25 mm", length = "30 mm", wire = "1.5 mm" }
[load]
resistance = "50 ohm"
inductance = "0.1 uH"
"""


def test_a_hand_written_stage_file_is_read_key_by_key(tmp_path):
    stage = load_stage(written(tmp_path, CONTRACT_STAGE))
    assert stage.carrier == 7.1e6
    assert stage.device.amplification_factor == 20
    assert stage.device.junction_capacitance is not None
    assert stage.device.junction_capacitance.at_zero == 465e-12
    assert stage.device.reverse_conduction is not None
    assert stage.device.reverse_conduction.conductance == 1.95
    assert stage.supply.choke_q == 100
    assert stage.branches[0].lead_inductance == 3e-9
    assert stage.branches[1].series_resistance == 0.2
    assert stage.part_data["C1"].trim == (0.9e-9, 1.5e-9)
    assert stage.part_data["C1"].tolerance == 5
    assert dict(stage.part_data["L1"].winding or ())["turns"] == 12
    assert complex(stage.load.impedance(14.2e6)) == pytest.approx(50 + 2j * math.pi * 14.2e6 * 0.1e-6)
    again = load_stage(written(tmp_path, stage_text(stage, tmp_path), "again.toml"))
    assert again.branches == stage.branches
    assert again.part_data == stage.part_data


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("q = 800", 'q = 800\nseries_resistance = "1 ohm"', "give one of them"),
        ('name = "L1"', 'name = "C1"', "is taken"),
        ('value = "1.2 nF"', 'value = "1.2 nH"', "wanted a capacitance"),
        ('value = "1.2 nF"', 'value = "0 F"', "above 0 F"),
        ('knee_voltage = "70 mV"', 'knee_voltage = "0 V"', "knee_voltage: got 0 V; allowed above 0 V"),
        ("transfer_factor = 2.0", "transfer_factor = 0", "transfer_factor: got 0; allowed above 0"),
        ("exponent = 1.0", "exponent = 3.5", "exponent: got 3.5; allowed 1 to 3"),
        ('place = "shunt"', 'place = "shant"', "did you mean 'shunt'?"),
        ('trim = ["0.9 nF", "1.5 nF"]', 'trim = ["1.9 nF", "1.5 nF"]', "least must be below"),
        ('carrier = "7.1 MHz"', "", "carrier: missing"),
        ('inductance = "0.1 uH"', 'inductance = "0.1 uH"\nimpedance = 50', "wanted one of"),
        ("version = 1", "version = 7", "version: got 7; allowed 1"),
        (
            'value = "1.2 nF"',
            'value = "1.6 nF"',
            "branch[1].value: got 1.6 nF; allowed by its own trim 900 pF to 1.5 nF",
        ),
        ('value = "1.2 nF"', "value = true", "branch[1].value: got true; wanted a number above 0 F"),
        ('trim = ["0.9 nF", "1.5 nF"]', "trim = { low = 1 }", "trim: got a table; wanted the least and the most"),
        ("winding = { turns = 12", "winding = { turns = [12]", "winding.turns: got a list"),
        ("q = 800", 'q = "lossles"', "q: got 'lossles'; wanted 1 to 10 million, or lossless"),
        ('inductance = "0.1 uH"', 'inductance = "0.1 uH"\n[limit]\nrule = "none"', "limit.rule: got 'none'"),
    ],
)
def test_a_wrong_stage_file_says_which_key(tmp_path, old, new, said):
    assert old in CONTRACT_STAGE
    with pytest.raises(RfstageError) as caught:
        load_stage(written(tmp_path, CONTRACT_STAGE.replace(old, new, 1)))
    assert said in str(caught.value)


@pytest.mark.parametrize(
    "name", ["C 1", "C1.q", "a\\u001b[31m", "a\\nR1 1 0 1", "Ω1", "thirteen-long", "load", "Device", "*"]
)
def test_a_name_that_a_page_or_a_deck_can_not_carry_is_refused(tmp_path, name):
    with pytest.raises(InputError) as caught:
        load_stage(written(tmp_path, CONTRACT_STAGE.replace('name = "L1"', f'name = "{name}"')))
    (line,) = caught.value.problems
    assert "branch[2].name: got '" in line
    assert line.endswith("; allowed letters, digits, _ and -, at most 12, and not load, carrier, drive, supply, device")
    assert line.isprintable()


@pytest.mark.parametrize("name", ["c1", "COUT", "Lchoke"])
def test_a_name_is_taken_whatever_its_capitals(tmp_path, name):
    with pytest.raises(InputError, match="is taken"):
        load_stage(written(tmp_path, CONTRACT_STAGE.replace('name = "L1"', f'name = "{name}"')))


def test_a_stage_is_written_in_numbers_that_a_person_can_edit(tmp_path):
    stage = load_stage(written(tmp_path, CONTRACT_STAGE))
    drifted = dataclasses.replace(
        stage, drive=dataclasses.replace(stage.drive, bias=0.19999999999999973, amplitude=4 / 3), carrier=7.1e6 / 3
    )
    text = stage_text(drifted, tmp_path)
    assert 'bias = "200 mV"' in text
    assert 'amplitude = "1.33333333333 V"' in text
    assert stage_text(load_stage(written(tmp_path, text)), tmp_path) == text


def test_the_name_of_a_load_file_is_written_as_toml_whatever_is_in_it(tmp_path):
    path = written(tmp_path, ONE_PORT, 'the "loft", grün.s1p')
    stage = load_stage(written(tmp_path, CONTRACT_STAGE))
    measured = dataclasses.replace(stage, load=read_load(path))
    again = load_stage(written(tmp_path, stage_text(measured, tmp_path), "stage.toml"))
    assert isinstance(again.load, MeasuredLoad)
    assert Path(again.load.name) == path


def test_the_touchstone_export_reads_back_as_the_ladder(tmp_path):
    made = design(JOB)
    path = written(tmp_path, touchstone_text(made), "stage_7.1MHz.s2p")
    network = skrf.Network()
    network.read_touchstone(str(path))
    carrier = JOB.carrier
    assert set(carrier * np.arange(1, 11)) <= set(network.f)
    ladder = Ladder([p.branch for p in made.tank.parts if p.branch.origin != "device"])
    # close port 2 with the load, by scikit-rf's own impedance matrix
    load = made.settings.load.impedance(network.f)
    z = network.z
    seen = z[:, 0, 0] - z[:, 0, 1] * z[:, 1, 0] / (z[:, 1, 1] + load)
    transfer = z[:, 1, 0] * load / (z[:, 1, 1] + load)
    want_seen, want_transfer = ladder.transfer(network.f, load)
    # identities of the same numbers: 1e-12 of the largest term that is subtracted
    assert np.all(np.abs(seen - want_seen) <= 1e-12 * np.abs(z[:, 0, 0]).max())
    assert np.all(np.abs(transfer - want_transfer) <= 1e-12 * np.abs(z).max())


def test_the_touchstone_export_says_what_it_leaves_out():
    text = touchstone_text(design(JOB))
    comments = [line for line in text.splitlines() if line.startswith("! rfstage:")]
    assert any("output capacitance is left out" in line for line in comments)
    assert any("Cout" in line and "left out" in line for line in comments)
    assert any("7.1 MHz" in line and "10 W" in line for line in comments)
    assert text.isascii()


@given(carrier=st.floats(1e3, 3e10), top=st.integers(2, 40))
def test_every_harmonic_lies_exactly_on_the_export_grid(carrier, top):
    frequencies = grid(carrier, top)
    assert np.all(np.diff(frequencies) > 0)
    assert set(carrier * np.arange(1, max(10, top) + 1)) <= set(frequencies)


ONE_PORT = "! a load\n# MHz S RI R 50\n6 0.1 0.2\n7.1 0.0 -0.1\n9 0.3 0.1\n"


@pytest.mark.parametrize(
    "text",
    [
        ONE_PORT,
        "# RI S MHz R 50\n6 0.1 0.2\n7.1 0.0 -0.1\n9 0.3 0.1\n",
        "  # mhz s ri r 50 ! note\n\n 6 0.1 0.2 ! here\n 7.1 0 -0.1\n9 0.3 0.1\n",
        "# Hz S RI R 50\n6e6 0.1 0.2\n7.1e6 0.0 -0.1\n9e6 0.3 0.1\n",
    ],
)
def test_a_one_port_is_read_in_its_legal_forms(tmp_path, text):
    load = read_load(written(tmp_path, text, "a.s1p"))
    reflection = -0.1j
    assert complex(load.impedance(7.1e6)) == pytest.approx(50 * (1 + reflection) / (1 - reflection), rel=1e-12)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "no option line"),
        ("hello\n", "line 1: 'hello' is not a number"),
        ("6 0.1 0.2\n", "no option line"),
        ("# MHz S RI R 50\n", "holds 0 numbers"),
        (
            "# MHz S RI R 50\n6 0.1\n",
            "line 2 has 2 columns; a one-port has 3, a frequency and two numbers, so a row is cut",
        ),
        ("# MHz S RI R 50\n6 1 0 0 0 0 0 1 0\n", "line 2 has 9 columns; a one-port has 3"),
        ("# MHz S RI R 50\n6 0.1 0.1\n7 0.1 0 0.2 0 0.1 0\n", "line 3 has 7 columns; a one-port has 3"),
        ("# MHz S RI R 0\n6 0.1 0.1\n", "reference resistance"),
        ("# MHz H RI R 50\n6 0.1 0.1\n", "line 1: 'h' is not known"),
        ("# MHz S RI R 50\n6 nan 0.1\n", "line 2: 'nan' is not a finite number"),
        ("# MHz S RI R 50\n6 0,1 0.1\n", "decimal point"),
        ("# MHz S RI R 50\n7 0.1 0.1\n6 0.1 0.1\n", "must be above 0 and rise"),
        ("# MHz S RI R 50\n6 1.2 0.1\n", "a passive load has more than 0"),
    ],
)
def test_a_bad_one_port_is_one_clear_line(tmp_path, text, said):
    path = written(tmp_path, text, "bad.s1p")
    with pytest.raises(RfstageError) as caught:
        read_load(path)
    assert said in str(caught.value)
    assert "bad.s1p" in str(caught.value)


@given(
    data=st.one_of(
        st.binary(max_size=80),
        st.text(alphabet="0123456789.,-+eE#! \nMHzSRIabn[]\t", max_size=80).map(
            lambda words: ("# MHz S RI R 50\n" + words).encode()
        ),
    )
)
@settings(deadline=None, max_examples=200)
def test_any_bytes_give_a_load_or_a_clear_error(tmp_path_factory, data):
    path = tmp_path_factory.mktemp("fuzz") / "x.s1p"
    path.write_bytes(data)
    try:
        load = read_load(path)
    except RfstageError as error:
        said = str(error)
    else:
        said = load.name
        assert isinstance(load, MeasuredLoad)
        assert np.all(np.isfinite(load.impedances))
    assert "x.s1p" in said


def test_a_pickle_named_as_a_load_is_never_unpickled(tmp_path):
    import pickle

    class Trap:
        def __reduce__(self):
            return (open, (str(tmp_path / "sprung"), "w"))

    path = tmp_path / "trap.s1p"
    path.write_bytes(pickle.dumps(Trap()))
    with pytest.raises(FileError):
        read_load(path)
    assert not (tmp_path / "sprung").exists()


def test_a_load_that_does_not_reach_the_carrier_says_its_reach(tmp_path):
    load = read_load(written(tmp_path, ONE_PORT, "a.s1p"))
    with pytest.raises(InputError, match=r"from 6 MHz to 9 MHz.*14 MHz"):
        design(Job(carrier=14e6, power=10.0, conduction_angle=120.0, supply=13.8, load=load))


def test_a_measured_load_names_the_harmonics_it_was_continued_at(examples):
    made = design(load_job(examples / "gallery.toml"))
    assert made.continued == (5, 6, 7, 8, 9, 10)
    assert any("orders 5–10;" in caution.text for caution in made.cautions if caution.topic == "load file")


def test_nothing_is_written_when_one_of_several_files_can_not_be(tmp_path):
    (tmp_path / "old").write_text("kept", encoding="utf-8")
    with pytest.raises(FileError, match="exists"):
        write_files([(tmp_path / "new", "a"), (tmp_path / "old", "b")], overwrite=False)
    assert sorted(p.name for p in tmp_path.iterdir()) == ["old"]
    assert (tmp_path / "old").read_text(encoding="utf-8") == "kept"


def test_an_existing_file_is_replaced_whole(tmp_path):
    (tmp_path / "old").write_text("long ago", encoding="utf-8")
    write_files([(tmp_path / "old", "new")], overwrite=True)
    assert [(p.name, p.read_text(encoding="utf-8")) for p in tmp_path.iterdir()] == [("old", "new")]


def test_a_link_is_followed_and_stays_a_link(tmp_path):
    (tmp_path / "kept").mkdir()
    (tmp_path / "kept" / "real").write_text("old", encoding="utf-8")
    (tmp_path / "link").symlink_to("kept/real")
    with pytest.raises(FileError, match="exists"):
        write_files([(tmp_path / "link", "new")], overwrite=False)
    write_files([(tmp_path / "link", "new")], overwrite=True)
    assert (tmp_path / "link").is_symlink()
    assert (tmp_path / "kept" / "real").read_text(encoding="utf-8") == "new"


def test_a_link_to_nothing_yet_is_written_through(tmp_path):
    (tmp_path / "link").symlink_to("real")
    write_files([(tmp_path / "link", "new")], overwrite=False)
    assert (tmp_path / "link").is_symlink()
    assert (tmp_path / "real").read_text(encoding="utf-8") == "new"
    (tmp_path / "lost").symlink_to("gone/real")
    with pytest.raises(FileError, match="gone is not there"):
        write_files([(tmp_path / "lost", "new")], overwrite=True)
    (tmp_path / "ring").symlink_to("ring")
    with pytest.raises(FileError, match="ring: can't be reached"):
        write_files([(tmp_path / "ring", "new")], overwrite=True)


@pytest.mark.parametrize("linked", [False, True])
@pytest.mark.parametrize("overwrite", [False, True])
def test_what_is_no_ordinary_file_is_never_replaced(tmp_path, overwrite, linked):
    os.mkfifo(tmp_path / "pipe")
    name = tmp_path / "pipe"
    if linked:
        name = tmp_path / "link"
        name.symlink_to("pipe")
    with pytest.raises(FileError) as caught:
        write_files([(name, "new")], overwrite=overwrite)
    assert str(caught.value) == f"{name}: is not an ordinary file; give a file name"
    assert (tmp_path / "pipe").is_fifo()


@pytest.mark.parametrize(
    ("name", "said"),
    [
        ("", "an empty name: is no file name; give one"),
        (".", ".: is a folder; give a file name"),
        ("new/", "new/: is the name of a folder; give a file name"),
        ("no/such", "no/such: the folder no is not there (make it first)"),
        ("file/inside", "file/inside: the folder file is not there (make it first)"),
        ("a" * 300, f"{'a' * 300}: can't be reached (File name too long)"),
        ("no\n/\x1b", r"no\n/\x1b: the folder no\n is not there (make it first)"),
    ],
)
def test_a_name_that_can_not_be_written_is_one_clear_line(tmp_path, monkeypatch, name, said):
    monkeypatch.chdir(tmp_path)
    Path("file").write_text("kept", encoding="utf-8")
    with pytest.raises(FileError) as caught:
        write_files([(name, "new")], overwrite=True)
    assert str(caught.value) == said
    assert [p.name for p in tmp_path.iterdir()] == ["file"]


def test_a_folder_that_lets_nobody_in_is_one_clear_line(tmp_path, monkeypatch):
    if os.geteuid() == 0:  # who may enter any folder: have it refused as it would be for others
        real = os.stat

        def refused(path, *rest, **options):
            if str(path).endswith("inside"):
                raise PermissionError(13, "Permission denied", str(path))
            return real(path, *rest, **options)

        monkeypatch.setattr(os, "stat", refused)
    locked = tmp_path / "locked"
    locked.mkdir(mode=0o000)
    try:
        with pytest.raises(FileError) as caught:
            check_targets([locked / "inside"], overwrite=True)
    finally:
        monkeypatch.undo()
        locked.chmod(0o700)
    assert str(caught.value) == f"{locked / 'inside'}: can't be reached (Permission denied)"


def test_what_the_run_reads_is_never_written(tmp_path):
    job = written(tmp_path, GOOD_JOB)
    (tmp_path / "link").symlink_to("job.toml")
    for name in (job, tmp_path / "link", tmp_path / "." / "job.toml"):
        with pytest.raises(FileError) as caught:
            write_files([(name, "new")], overwrite=True, inputs={"job file": str(job), "load file": None})
        assert str(caught.value) == f"{name}: is the job file itself; give another name"
    assert job.read_text(encoding="utf-8") == GOOD_JOB


def test_two_names_of_one_file_are_one_name_twice(tmp_path):
    (tmp_path / "link").symlink_to("real")
    with pytest.raises(FileError, match="same file name"):
        write_files([(tmp_path / "link", "a"), (tmp_path / "real", "b")], overwrite=True)
    assert not (tmp_path / "real").exists()
