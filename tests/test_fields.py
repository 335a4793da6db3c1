"""What a value may be, in words: ranges, what was got, the nearest known word."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from rfstage.fields import Field, allowed, nearest, plain, read, shown
from rfstage.jobfields import JOB_FIELDS
from rfstage.quantity import QuantityError

FIELDS = {field.name: field for field in JOB_FIELDS}


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("coil_q", "1 to 10 million, or lossless"),
        ("harmonics", "2 to 100"),
        ("power", "above 0 W, to 10 MW"),
        ("transfer_factor", "above 0, to 1 million"),
        ("load", "R+jX with a resistance above 0 ohm, to 10 Mohm"),
        ("network", "l | l-high-pass | pi | pi-l | t | tapped-coil | link | capacitive-divider | auto"),
    ],
)
def test_a_range_reads_as_a_person_would_say_it(name, words):
    assert allowed(FIELDS[name]) == words


def test_no_range_is_told_in_powers_of_ten():
    for field in JOB_FIELDS:
        assert "e+" not in allowed(field)


@pytest.mark.parametrize(
    ("name", "raw", "said"),
    [
        ("coil_q", "lossles", "got 'lossles'; wanted 1 to 10 million, or lossless"),
        ("coil_q", "7,5", "read '7,5', which has a comma"),
        ("coil_q", 2e7, "got 20000000; allowed 1 to 10 million, or lossless"),
        ("harmonics", "ten", "got 'ten'; wanted a whole number, 2 to 100"),
        ("harmonics", 2.5, "got 2.5; wanted a whole number, 2 to 100"),
        ("harmonics", "1250", "got 1250; allowed 2 to 100"),
        ("exponent", "2 V", "got '2 V'; wanted 1 to 3"),
        ("power", True, "got true; wanted above 0 W, to 10 MW"),
        ("power", {}, "got a table; wanted"),
        ("power", [10], "got a list; wanted"),
        ("power", 10**400, "got a number beyond the range"),
        ("network", 3, "got 3; wanted l | l-high-pass | pi"),
        ("network", "PI", "(did you mean 'pi'?)"),
        ("limit", "", "got ''; wanted a text"),
    ],
)
def test_a_wrong_value_is_told_in_plain_words(name, raw, said):
    with pytest.raises(QuantityError) as caught:
        read(FIELDS[name], raw)
    assert str(caught.value).startswith(said) or said in str(caught.value)


def test_lossless_is_read_whatever_blanks_stand_around_it():
    assert read(FIELDS["coil_q"], " lossless ") == math.inf


@pytest.mark.parametrize(
    ("word", "known", "found"),
    [
        ("c1", ["L1", "C1", "C1.q"], "C1"),
        ("C7", ["C1", "drive.bias"], "C1"),
        ("PI", ["l", "pi"], "pi"),
        ("FET", ["bipolar", "fet", "tube"], "fet"),
        ("--Carrier", ["--carrier", "--power"], "--carrier"),
        ("--carier", ["--carrier", "--power"], "--carrier"),
        ("amplitude", ["drive.bias", "drive.amplitude"], "drive.amplitude"),
        ("desing", ["design", "settle"], "design"),
        ("--frob", ["--json", "--plain", "--overwrite", "--spice", "--touchstone"], None),
        ("--xyzzy", ["--json", "--plain"], None),
        ("", ["a", "b"], None),
    ],
)
def test_the_nearest_word_is_named_and_no_silly_one(word, known, found):
    assert nearest(word, known) == (f" (did you mean {found!r}?)" if found else "")


def test_what_a_file_gave_is_shown_in_the_words_of_toml():
    assert [shown(raw) for raw in (True, False, {}, [], "a", 3, 2.5)] == [
        "true",
        "false",
        "a table",
        "a list",
        "'a'",
        "3",
        "2.5",
    ]
    assert len(shown("x" * 1000)) < 80


@given(text=st.text(max_size=20))
def test_no_control_character_passes_into_a_message(text):
    assert plain(text).isprintable()
    assert shown(text).isprintable()
    with pytest.raises(QuantityError) as caught:
        read(Field("x", "x", "choice", choices=("no such text is made up here",)), text)
    assert str(caught.value).isprintable()
