"""Readers of measurements: what instruments write is read, what is malformed is named by its line."""

from __future__ import annotations

import io
import os
import pickle

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from rfstage.errors import FileError, RfstageError
from rfstage.files.captures import read_measurement
from rfstage.files.columns import read_head
from rfstage.files.decimals import decimal_rows
from rfstage.files.levellists import read_sampler
from rfstage.verify.capture import Capture
from rfstage.verify.levels import LevelList, Reading
from rfstage.verify.tankfit import AnalyserData


def read(tmp_path, text, name="a.csv", **options):
    path = tmp_path / name
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return read_measurement(path, **options)


LEVELS = "frequency (MHz),level (dBm)\n7.1,-1.2\n14.2,-43.1\n"


@pytest.mark.parametrize(
    "text",
    [
        LEVELS,
        "# taken by hand\nfrequency [MHz];level [dBm]\r\n7.1;-1.2\r\n14.2;-43.1\r\n",
        "frequency\tlevel\nMHz\tdBm\n7.1\t-1.2\n14.2\t-43.1",
        "frequency_Hz level_dBm\n7.1e6 -1.2\n1.42e7 -43.1\n",
        'instrument,bench\n"frequency (MHz)","level (dBm)"\n"7.1","-1.2"\n\n"14.2","-43.1"\n',
        "frequency (Hz),level (dBm)\n7.1 MHz,-1.2 dBm\n14200 kHz,-43.1\n",
        "\ufefffrequency (MHz),level (dBm)\n7.1,-1.2,\n14.2,-43.1,\n",
    ],
    ids=["plain", "semicolons", "tabs", "spaces", "quotes", "units", "mark"],
)
def test_level_lists_as_people_write_them(tmp_path, text):
    found = read(tmp_path, text)
    assert isinstance(found, LevelList)
    assert found.unit == "dBm"
    assert found.readings == (Reading(7.1e6, -1.2), Reading(pytest.approx(14.2e6), -43.1))


def test_a_level_may_be_a_bound(tmp_path):
    assert read(tmp_path, LEVELS + "21.3,<-80\n").readings[2] == Reading(21.3e6, -80.0, True)


N = 200
T = np.arange(N) * 4e-9
V = np.round(np.cos(2 * np.pi * 7.1e6 * T), 4)


def rows(*columns, form="%.9e"):
    return "".join(",".join(form % value for value in row) + "\n" for row in zip(*columns, strict=True))


@pytest.mark.parametrize(
    ("head", "columns", "scale"),
    [
        ("time (s),CH1 (V)\n", (T, V), 1),
        ("Time,Channel A\n(us),(mV)\n\n", (T * 1e6, V * 1e3), 1),
        ("Model,x\nRecord Length,200\nSample Interval,4e-09,s\nVertical Units,V\nTIME,CH1\n", (T, V), 1),
        ("x-axis,1\nsecond,Volt\n", (T, V), 1),
        ("t_s,v_V\n", (T, V), 1),
        ("CH1 (V)\n", (V,), None),
        ("Sample rate,250,MHz\nCH1 (V)\n", (V,), 1),
    ],
    ids=["plain", "units beneath", "instrument", "words", "underscores", "no time", "rate in the head"],
)
def test_waveforms_as_instruments_write_them(tmp_path, head, columns, scale):
    found = read(tmp_path, head + rows(*columns), sample_rate=None if scale else 250e6)
    assert isinstance(found, Capture)
    assert found.interval == pytest.approx(4e-9, rel=1e-9)
    np.testing.assert_allclose(found.channels[0].samples, V, atol=1e-12)
    assert found.channels[0].unit == "V"


def test_two_channels_and_line_ends_of_either_kind(tmp_path):
    text = "time (s),CH1 (V),CH2 (mA)\n" + rows(T, V, 1e3 * V)
    for one in (text, text.replace("\n", "\r\n"), text.replace(",", ";"), text.replace(",", ", "), text.rstrip("\n")):
        found = read(tmp_path, one)
        assert [c.unit for c in found.channels] == ["V", "A"]
        np.testing.assert_allclose(found.channels[1].samples, V, atol=1e-12)


def test_a_record_over_many_blocks_is_that_of_numpy(tmp_path, monkeypatch):
    monkeypatch.setattr("rfstage.files.waveforms.BLOCK", 3000)
    t, v = np.arange(5000) * 4e-10, np.round(np.random.default_rng(1).normal(size=5000), 5)
    found = read(tmp_path, "time (s),CH1 (V)\n" + rows(t, v, form="%.9g"))
    plain = np.loadtxt(tmp_path / "a.csv", delimiter=",", skiprows=1)
    assert np.array_equal(found.channels[0].samples, plain[:, 1])
    assert found.interval == pytest.approx(4e-10, rel=1e-9)


BAD = [
    ("", "a.csv: is empty"),
    ("\n \n", "a.csv: is empty"),
    (b"\xff\xfea\0b\0", "is a text in UTF-16"),
    (b"a,b\n\0\0\0", "is no text"),
    ("frequency (MHz),level (dBm)\n", "has no line of numbers within its first 2 lines"),
    ("7.1,-1\n14.2,-40\n", "line 1: no line above says what the 2 columns are"),
    ("frequency,level (dBm)\n7.1,-1\n", r"line 1: column 'frequency' has no unit"),
    ("frequency (MHz),level\n7.1,-1\n", r"line 1: column 'level' has no unit"),
    ("frequency (MHz),level (W)\n7.1,-1\n", r"line 1: column 'level \(W\)' is in 'W'"),
    ("frequency (MHz),level (dB)\n7.1,-1\n", "line 1: levels in dB; wanted dBm, or dBc"),
    ("frequency (MHz),time (s)\n7.1,-1\n", "neither a level list"),
    (LEVELS + "21.3\n", "line 4: has 1 columns; wanted 2"),
    (LEVELS + "21.3,-4x\n", "line 4: '-4x' is not in dBm"),
    (LEVELS + "21.3,abc\n", "line 4: 'abc' is not a number"),
    (LEVELS + "21.3,nan\n", "line 4: 'nan' is not a finite number"),
    (LEVELS + "-21.3,-50\n", "line 4: the frequency '-21.3' is not above 0"),
    (LEVELS + "<21.3,-50\n", "line 4: '<' stands before the frequency"),
    (LEVELS + "21.3 dBm,-50\n", "line 4: '21.3 dBm' is not in MHz"),
    (LEVELS + "21.3,-50 dBc\n", "line 4: '-50 dBc' is not in dBm"),
    (LEVELS + "21.3,1e300\n", "line 4: got '1e300'; allowed -400 to 400 decibels"),
    ("frequency (MHz),level (dBm)\n7.1,below 3\n14.2,-43.1\n", "line 2: 'below 3' is not a number"),
    ("frequency (MHz);level (dBm)\n7,1;-1,2\n", "line 2: has decimal commas; write decimal points"),
    ("frequency (MHz),level (dBm)\n7,1,-1,2\n", r"line 2: .*a decimal comma would do that"),
    (LEVELS + "21,3,-50\n", r"line 4: has 3 columns; wanted 2, .*a decimal comma"),
    ("time (s),a (V),b (V),c (V)\n1,2,3,4\n2,3,4,5\n", "line 1: has 3 channels; wanted one or two"),
    ("CH1 (V)\n1\n2\n", "has no column of time; give --sample-rate"),
    ("time (s),CH1 (V)\n0,1\n", "holds 1 samples"),
    ("time (s),CH1 (V)\n0,1\n1e-9,2\n2e-9\n3e-9,1\n", "line 4: has 1 columns where 2 are wanted: the row is cut"),
    ("time (s),CH1 (V)\n0,1\n1e-9,2\n2e-9,3,4\n", "line 4: has 3 columns where 2 are wanted"),
    ("time (s),CH1 (V)\n0,1\n1e-9,inf\n", "line 3: 'inf' in column 'CH1' is not a finite number"),
    ("time (s),CH1 (V)\n0,1\n1e-9,1e999\n", "line 3: '1e999' in column 'CH1' is not a finite number"),
    ("time (s),CH1 (V)\n0,1\n1e-9,2\n2e-9,2 V\n", "line 4: '2 V' is not a number"),
    ("time (s);CH1 (V)\n0;1\n1e-9;2\n2e-9;2,5\n", "line 4: '2,5' is not a number; write a decimal point"),
    ("time (s),CH1 (V)\n0,1\n1e-9,2\n3e-9,3\n4e-9,1\n", r"line 4: the time is uneven: a step of 2e-09 s"),
    ("time (s),CH1 (V)\n0,1\n1e-9,2\n2e-9,3\n1e-9,1\n", "line 5: the time goes back, by 1e-09 s"),
    ("time (s),CH1 (V)\n0,1\n1e-9,2\n2e-9,3\n2e-9,1\n", "line 5: the time stands still: export it with more digits"),
]


@pytest.mark.parametrize(("text", "said"), BAD, ids=[str(k) for k in range(len(BAD))])
def test_what_is_malformed_is_named_by_its_line(tmp_path, text, said):
    with pytest.raises(FileError, match=said) as caught:
        read(tmp_path, text)
    assert str(tmp_path / "a.csv") in str(caught.value)
    assert len(str(caught.value).splitlines()) == 1


def test_a_step_that_drifts_is_uneven(tmp_path):
    t = np.cumsum(1e-9 * (1 + 1e-3 * np.arange(800)))
    with pytest.raises(FileError, match="the time is uneven"):
        read(tmp_path, "time (s),CH1 (V)\n" + rows(t, np.cos(t * 4e7)))


def test_time_printed_in_few_digits_is_still_even(tmp_path):
    text = "time (s),CH1 (V)\n" + "".join(f"{1e-3 + t:.9f},{v}\n" for t, v in zip(T, V, strict=True))
    assert read(tmp_path, text).interval == pytest.approx(4e-9, rel=0.01)
    coarse = "time (s),CH1 (V)\n" + "".join(f"{1e-3 + t:.8f},{v}\n" for t, v in zip(T, V, strict=True))
    with pytest.raises(FileError, match="the time"):
        read(tmp_path, coarse)
    assert read(tmp_path, coarse, sample_rate=250e6).interval == 4e-9


def test_many_wrong_lines_are_told_together_and_not_without_end(tmp_path):
    with pytest.raises(FileError) as caught:
        read(tmp_path, LEVELS + "x,1\n" * 12)
    told = str(caught.value).splitlines()
    assert len(told) == 6
    assert told[0].endswith("line 4: 'x' is not a number")
    assert "7 more" in told[-1]


def test_a_file_that_is_not_there_says_so(tmp_path):
    for name in ("a.csv", "a.npy", "a.s1p"):
        with pytest.raises(FileError, match="is not there"):
            read_measurement(tmp_path / name)
    with pytest.raises(FileError, match="can't be read"):
        read_measurement(tmp_path)


@pytest.mark.parametrize(
    ("array", "rate", "units"),
    [
        (np.stack([T, V], axis=1), None, ["V"]),
        (np.stack([T, V, V], axis=1), None, ["V", "A"]),
        (V, 250e6, ["V"]),
        (V.astype(np.float32), 250e6, ["V"]),
        ((1000 * V).astype(np.int16), 250e6, [""]),
        (np.stack([V, V], axis=1), 250e6, ["V", "A"]),
        (np.asfortranarray(np.stack([T, V], axis=1)), None, ["V"]),
        (np.array(list(zip(1e9 * T, V, strict=True)), dtype=[("time (ns)", "f8"), ("CH1 (V)", "f4")]), None, ["V"]),
    ],
    ids=["two", "three", "one", "single", "counts", "two at a rate", "by columns", "named"],
)
def test_arrays_are_read_where_they_lie(tmp_path, array, rate, units):
    np.save(tmp_path / "a.npy", array)
    found = read_measurement(tmp_path / "a.npy", sample_rate=rate)
    assert [c.unit for c in found.channels] == units
    assert found.interval == pytest.approx(4e-9, rel=1e-9)
    np.testing.assert_allclose(np.asarray(found.channels[0].samples) / (1000 if units == [""] else 1), V, atol=1e-3)


@pytest.mark.parametrize(
    ("array", "rate", "said"),
    [
        (V, None, "has no column of time; give --sample-rate"),
        (np.zeros((2, 50)), None, r"has the shape \(2, 50\) \(turn it round\?\); wanted"),
        (np.zeros((2, 3, 4)), None, r"has the shape \(2, 3, 4\)"),
        (
            np.stack([T, np.where(T > 5.01e-7, np.nan, V)], axis=1),
            None,
            "sample 127 of channel voltage is not a finite",
        ),
        (np.stack([np.where(T > 5.01e-7, np.nan, T), V], axis=1), None, "sample 127: the time is not a finite number"),
        (np.stack([T[::-1], V], axis=1), None, "sample 2: the time goes back"),
        (np.stack([T**2, V], axis=1), None, "the time is uneven"),
        (np.zeros((1, 2)), None, "holds 1 samples"),
        (V.astype(complex), 250e6, "holds complex128 numbers; wanted real ones"),
        (np.array(["a", "b"]), 250e6, "holds <U1 numbers"),
        (np.array([(1.0, 2.0)] * 9, dtype=[("a", "f8"), ("b", "f8")]), None, "column 'a' has no unit"),
        (np.array([{"a": 1}], dtype=object), 250e6, "is not a .npy file of plain numbers"),
    ],
    ids=[
        "no time",
        "turned",
        "deep",
        "nan",
        "time nan",
        "back",
        "uneven",
        "one",
        "complex",
        "text",
        "unnamed",
        "objects",
    ],
)
def test_arrays_that_are_no_waveform_are_refused(tmp_path, array, rate, said):
    np.save(tmp_path / "a.npy", array, allow_pickle=True)
    with pytest.raises(FileError, match=said):
        read_measurement(tmp_path / "a.npy", sample_rate=rate)


class Bomb:
    """Writes a file when it is unpickled."""

    def __init__(self, path):
        self.path = str(path)

    def __reduce__(self):
        return (os.mkdir, (self.path,))


@pytest.mark.parametrize(("old", "new"), [(b"(64", b"(6["), (b"'<f8'", b"'<f8"), (b"False", b"F\x00lse"), (b"}", b"(")])
def test_a_broken_head_of_an_array_is_a_message(tmp_path, old, new):
    held = io.BytesIO()
    np.save(held, np.zeros((64, 2)))
    raw = held.getvalue()
    broken = raw.replace(old, new)[: len(raw)].ljust(len(raw), b" ")
    assert broken != raw
    with pytest.raises(FileError, match=r"a\.npy: is not a \.npy file of plain numbers that can be read"):
        read(tmp_path, broken, "a.npy")


@pytest.mark.parametrize("name", ["a.npy", "a.csv", "a.s1p", "a.s2p", "a.txt"])
@pytest.mark.parametrize("wrapped", [False, True], ids=["pickle", "array of objects"])
def test_nothing_is_unpickled(tmp_path, name, wrapped):
    bomb, mark = tmp_path / name, tmp_path / "gone off"
    if wrapped:
        held = io.BytesIO()
        np.save(held, np.array([Bomb(mark)], dtype=object), allow_pickle=True)
        bomb.write_bytes(held.getvalue())
    else:
        bomb.write_bytes(pickle.dumps(Bomb(mark)))
    with pytest.raises(RfstageError):
        read_measurement(bomb, sample_rate=1e9)
    with pytest.raises(RfstageError):
        read_sampler(bomb)
    assert not mark.exists()


def test_analyser_files_of_one_and_two_ports(tmp_path):
    one = read(tmp_path, "# MHz S RI R 75\n7 0.5 0.1\n8 0.4 0.2\n", "a.s1p")
    assert isinstance(one, AnalyserData)
    assert (one.ports, one.resistance) == (1, 75.0)
    np.testing.assert_allclose(one.s[:, 0, 0], [0.5 + 0.1j, 0.4 + 0.2j])
    two = read(tmp_path, "# MHz S RI R 50\n7 1 0 2 0 3 0 4 0\n", "a.S2P")
    np.testing.assert_allclose(two.s[0].real, [[1, 3], [2, 4]])


@pytest.mark.parametrize(
    ("text", "name", "said"),
    [
        ("", "a.s1p", "has no option line"),
        ("7 0.5 0.1\n", "a.s1p", "has no option line"),
        ("# MHz S RI R 50\n7 0.5\n", "a.s1p", "line 2 has 2 columns"),
        ("# MHz S RI R 50\n7 0,5 0.1\n", "a.s1p", "line 2: '0,5' is not a number; write a decimal point"),
        ("# MHz S RI R 50\n7 nan 0.1\n", "a.s2p", "line 2: 'nan' is not a finite number"),
        ("# MHz S RI R 50\n7 1 0 2 0 3 0\n", "a.s2p", "holds 7 numbers"),
    ],
)
def test_malformed_analyser_files(tmp_path, text, name, said):
    with pytest.raises(FileError, match=said):
        read(tmp_path, text, name)


def test_samplers_from_a_table_and_from_two_ports(tmp_path):
    (tmp_path / "s.csv").write_text("frequency (MHz),response (dB)\n1,-40\n30,-38\n")
    found = read_sampler(tmp_path / "s.csv")
    assert found.at(15.5e6) == pytest.approx(-39.0)
    assert found.at(0.9e6) is None
    (tmp_path / "s.s2p").write_text("# MHz S DB R 50\n1 -30 0 -40 0 -80 0 -30 0\n30 -30 0 -38 0 -80 0 -30 0\n")
    assert read_sampler(tmp_path / "s.s2p").at(15.5e6) == pytest.approx(-39.0)
    (tmp_path / "bad.csv").write_text(LEVELS)
    with pytest.raises(FileError, match="is no response of a sampler"):
        read_sampler(tmp_path / "bad.csv")


numbers_as_written = st.one_of(
    st.floats(allow_nan=False, allow_infinity=False).map(repr),
    st.floats(-1e6, 1e6).map(lambda x: f"{x:.6g}"),
    st.floats(-1e3, 1e3).map(lambda x: f"{x:+.9e}"),
    st.integers(-(10**17), 10**17).map(str),
    st.sampled_from(["", "1.", ".5", "-", "1e", "1e5.0", "nan", "0x1", "1_0", " 2", "1e-3e", "--1", "+", "1E+05"]),
)


@given(st.lists(st.tuples(numbers_as_written, numbers_as_written), min_size=1, max_size=30))
def test_many_decimals_at_once_are_what_python_reads_or_none_at_all(some):
    found = decimal_rows("".join(f"{a},{b}\n" for a, b in some).encode(), ",", 2)
    if found is not None:
        assert found.tolist() == [[float(a), float(b)] for a, b in some]
    elif all(len(x) < 12 and x.lstrip("-").replace(".", "", 1).isdigit() for row in some for x in row):
        raise AssertionError("plain decimals were not read")


PIECES = [b"7.1", b"-3", b"1,5", b"nan", b"time (s)", b"level (dBm)", b",", b";", b"\n", b"\t", b" ", b"CH1 (V)"]
PIECES += [b"frequency (MHz)", b"1e400", b"<", b"\r\n", b"#", b"\xff", b'"']
ODD = st.one_of(
    st.binary(max_size=300),
    st.text(max_size=200).map(str.encode),
    st.lists(st.sampled_from(PIECES)).map(b"".join),
)


def refusal(call):
    """Return what a call says in refusing, or nothing if it does not; any other error is a failure."""
    try:
        call()
    except RfstageError as error:
        return str(error)
    return None


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(ODD, st.sampled_from(["a.csv", "a.npy", "a.s1p", "a.s2p", "a"]), st.sampled_from([None, 1e9]))
def test_no_bytes_make_a_reader_fail_in_another_way(tmp_path, raw, name, rate):
    path = tmp_path / name
    path.write_bytes(raw)
    for reader in (lambda: read_measurement(path, sample_rate=rate), lambda: read_sampler(path)):
        said = refusal(reader)
        assert said is None or (said and all(str(path) in line for line in said.splitlines()))
    path.unlink()


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    st.integers(0, 5),
    st.integers(0, 400),
    st.sampled_from([b"", b"x", b",", b"\n", b"nan", b"\0", b"9"]),
    st.booleans(),
)
def test_good_files_with_a_cut_or_a_slip_are_read_or_named(tmp_path, kind, at, slip, cut):
    """The start of a good file, with something put in or all the rest taken away."""
    wave = "time (s),CH1 (V)\n" + rows(T[:40], V[:40], form="%.5g")
    touchstone = "# MHz S RI R 50\n" + "".join(f"{f} 0.1 0.2 0.3 0.4 0.3 0.4 0.1 0.2\n" for f in range(1, 30))
    held = io.BytesIO()
    np.save(held, np.stack([T, V], axis=1))
    good, name = [
        (LEVELS.encode(), "a.csv"),
        (wave.encode(), "a.csv"),
        (touchstone.encode(), "a.s2p"),
        (held.getvalue(), "a.npy"),
        (wave.replace(",", ";").encode(), "b.csv"),
        (wave.replace(",", "\t").encode(), "b.txt"),
    ][kind]
    path = tmp_path / name
    path.write_bytes(good[:at] + slip + (b"" if cut else good[at:]))
    said = refusal(lambda: read_measurement(path))
    assert said is None or (said and all(str(path) in line for line in said.splitlines()))
    path.unlink()


def test_heads_tell_where_the_numbers_begin(tmp_path):
    (tmp_path / "a.csv").write_text("one\ntwo\ntime (s),CH1 (V)\n0,1\n1,2\n")
    head = read_head(tmp_path / "a.csv")
    assert (head.line, head.offset, head.split) == (4, 25, ",")
    assert [c.quantity for c in head.columns] == ["time", "V"]
