"""Text to numbers and back: every form that is read, every reading that is refused, and what is shown."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from rfstage.errors import RfstageError
from rfstage.quantity import (
    QuantityError,
    exact_complex,
    exact_text,
    parse_complex,
    parse_real,
    show,
    show_complex,
)

UNITS = ["Hz", "V", "A", "W", "ohm", "F", "H", "S", "m", "deg", "dB", "dBi", "degC", "K/W", "s", "J", "%", ""]


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        ("7.1MHz", "Hz", 7.1e6),
        ("7.1 MHz", "Hz", 7.1e6),
        ("7.1M", "Hz", 7.1e6),
        ("7100000", "Hz", 7.1e6),
        ("7100 kHz", "Hz", 7.1e6),
        ("7.1e3 kHz", "Hz", 7.1e6),
        ("5G", "Hz", 5e9),
        ("1.296 GHz", "Hz", 1.296e9),
        ("1e-05V", "V", 1e-5),
        ("1.39725e-10 F", "F", 1.39725e-10),
        ("100p", "F", 1e-10),
        ("100 pF", "F", 1e-10),
        (".5 nF", "F", 0.5e-9),
        ("5. nF", "F", 5e-9),
        ("1m", "A", 1e-3),
        ("50 mA", "A", 0.05),
        ("-40 V", "V", -40.0),
        ("+0.7V", "V", 0.7),
        ("  10 W ", "W", 10.0),
        ("120deg", "deg", 120.0),
        ("120°", "deg", 120.0),
        ("120", "deg", 120.0),
        ("43 dB", "dB", 43.0),
        ("2.15 dBi", "dBi", 2.15),
        ("-3dB", "dBi", -3.0),
        ("40degC", "degC", 40.0),
        ("-12.5 °C", "degC", -12.5),
        ("0.3K/W", "K/W", 0.3),
        ("1.2 °C/W", "K/W", 1.2),
        ("1.2 C/W", "K/W", 1.2),
        ("250 ms", "s", 0.25),
        ("3 kJ", "J", 3000.0),
        ("5 %", "%", 5.0),
        ("20 mS", "S", 0.02),
        ("12", "", 12.0),
    ],
)
def test_quantity_is_read_and_correctly_rounded(text, unit, value):
    assert parse_real(text, unit) == value


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        # SOURCE: IEC 60062, the letter in place of the decimal point.
        ("4k7", "ohm", 4700.0),
        ("0R47", "ohm", 0.47),
        ("R47", "ohm", 0.47),
        ("4R7", "ohm", 4.7),
        ("2M2", "ohm", 2.2e6),
        ("2u2", "F", 2.2e-6),
        ("2µ2", "F", 2.2e-6),
        ("3n3", "F", 3.3e-9),
        ("6p8", "F", 6.8e-12),
        ("2u2H", "H", 2.2e-6),
        ("-4k7", "ohm", -4700.0),
    ],
)
def test_letter_may_stand_for_the_decimal_point(text, unit, value):
    assert parse_real(text, unit) == value


@pytest.mark.parametrize("micro", ["u", "\u00b5", "\u03bc"], ids=["u", "micro-sign", "greek-mu"])
def test_all_three_micros_are_read(micro):
    assert parse_real(f"4.7{micro}H", "H") == 4.7e-6


@pytest.mark.parametrize("omega", ["\u03a9", "\u2126"], ids=["greek-omega", "ohm-sign"])
@pytest.mark.parametrize(("prefix", "value"), [("", 47.0), ("k", 47e3), ("m", 47e-3)])
def test_both_omegas_are_read(omega, prefix, value):
    assert parse_real(f"47 {prefix}{omega}", "ohm") == value


@pytest.mark.parametrize(("text", "value"), [("47k", 47e3), ("47K", 47e3), ("47 kohm", 47e3), ("47 Ohms", 47.0)])
def test_kilo_and_ohm_are_read_in_their_usual_spellings(text, value):
    assert parse_real(text, "ohm") == value


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        ("60db", "dB", 60.0),
        ("60DB", "dB", 60.0),
        ("25uw", "W", 25e-6),
        ("10w", "W", 10.0),
        ("13.8v", "V", 13.8),
        ("250ma", "A", 0.25),
        ("7.1Mhz", "Hz", 7.1e6),
        ("7.1MHZ", "Hz", 7.1e6),
        ("1.2uh", "H", 1.2e-6),
        ("4k7OHM", "ohm", 4700.0),
        ("120 Deg", "deg", 120.0),
    ],
)
def test_capitals_of_a_unit_do_not_matter_where_nothing_else_could_be_meant(text, unit, value):
    assert parse_real(text, unit) == value


def test_a_complex_impedance_takes_its_unit_in_capitals_too():
    assert parse_complex("50+j10 OHM") == 50 + 10j


def test_femto_and_farad_stay_apart_and_so_do_siemens_and_second():
    assert (parse_real("5f", "F"), parse_real("5F", "F")) == (5e-15, 5.0)
    for text, unit in (("5s", "S"), ("5 MM", "m"), ("5pf", "F")):
        with pytest.raises(QuantityError):
            parse_real(text, unit)


def test_milli_and_mega_are_told_apart_by_their_case():
    assert (parse_real("5mW", "W"), parse_real("5MW", "W")) == (5e-3, 5e6)


def test_m_alone_is_the_metre_where_a_length_is_wanted_and_milli_elsewhere():
    assert (parse_real("2 m", "m"), parse_real("50 mm", "m"), parse_real("2 m", "A")) == (2.0, 0.05, 2e-3)


@pytest.mark.parametrize(
    ("text", "unit"), [("2R2", "F"), ("4k7", "deg"), ("4k7", ""), ("1k2k3", "ohm"), ("4k7V", "ohm")]
)
def test_letter_for_point_is_refused_where_it_has_no_sense(text, unit):
    with pytest.raises(QuantityError, match=r"read .*wanted"):
        parse_real(text, unit)


@pytest.mark.parametrize("text", ["7,1MHz", "7,1", "1,000 Hz"])
def test_decimal_comma_is_refused_showing_the_point(text):
    with pytest.raises(QuantityError, match=rf"read '{text}', which has a comma: .*{text.replace(',', '.')}"):
        parse_real(text, "Hz")


@pytest.mark.parametrize(
    ("text", "unit", "read", "wanted"),
    [
        ("7.1 V", "Hz", "a voltage", "a frequency, such as 7.1 MHz"),
        ("50 ohm", "V", "a resistance or impedance", "a voltage, such as 13.8 V"),
        ("10 uH", "F", "an inductance", "a capacitance, such as 150 pF"),
        ("100 pF", "H", "a capacitance", "an inductance, such as 1.2 uH"),
        ("3 dB", "W", "a ratio in decibels", "a power, such as 10 W"),
        ("120 deg", "A", "an angle", "a current, such as 2.5 A"),
        ("40 deg", "degC", "an angle", "a temperature, such as 40 degC"),
        ("104 F", "degC", "a capacitance", "a temperature, such as 40 degC"),
        ("40 degC", "deg", "a temperature", "an angle, such as 120 deg"),
        ("2 dBi", "dB", "an antenna gain", "a ratio in decibels, such as 43 dB"),
    ],
)
def test_wrong_unit_says_what_was_read_and_what_is_wanted(text, unit, read, wanted):
    with pytest.raises(QuantityError) as error:
        parse_real(text, unit)
    assert str(error.value) == f"read {text!r}, which is {read}; wanted {wanted}"


@pytest.mark.parametrize("text", ["7.1 furlongs", "10 parsec", "5 x", "12 MHz MHz"])
def test_unknown_unit_is_named(text):
    with pytest.raises(QuantityError, match=r"is no unit known here; wanted a frequency"):
        parse_real(text, "Hz")


@pytest.mark.parametrize("text", ["nan", "NaN", "inf", "-inf", "Infinity", "+nan"])
def test_what_is_not_finite_is_refused_by_that_name(text):
    with pytest.raises(
        QuantityError, match=rf"read '.{{0,1}}{text.lstrip('+-')}', which is not a finite number; wanted"
    ):
        parse_real(text, "V")


@pytest.mark.parametrize("text", ["40 C", "40c", "313 K"])
def test_a_temperature_with_a_unit_of_two_meanings_is_refused_with_the_one_to_write(text):
    with pytest.raises(QuantityError, match=r"could be another unit; write degrees Celsius as 40 degC"):
        parse_real(text, "degC")


@pytest.mark.parametrize(("text", "unit"), [("40 kdegC", "degC"), ("1.2 W/K", "K/W"), ("3 mK/W", "K/W")])
def test_a_unit_without_prefixes_takes_none_and_none_upside_down(text, unit):
    with pytest.raises(QuantityError, match="is no unit known here"):
        parse_real(text, unit)


@pytest.mark.parametrize("text", ["", "   ", "\t\n"])
def test_empty_text_is_refused_saying_so(text):
    with pytest.raises(QuantityError, match="read an empty text; wanted a power, such as 10 W"):
        parse_real(text, "W")


@pytest.mark.parametrize("text", ["1e999", "1e308 kV", "-1e400"])
def test_number_beyond_the_range_is_refused_saying_so(text):
    with pytest.raises(QuantityError, match="which is beyond the range of numbers"):
        parse_real(text, "V")


def test_number_too_small_to_be_told_from_zero_is_refused():
    with pytest.raises(QuantityError, match="too small to be told from zero"):
        parse_real("1e-400", "V")


@pytest.mark.parametrize("text", ["0", "0.000 pF", "0e5"])
def test_zero_is_a_number(text):
    assert parse_real(text, "F") == 0.0


@pytest.mark.parametrize("text", ["abc", "V", "--5", "5 5", "1.2.3", "0x10", "1_000", "٣ V", "5e", "e5", "."])
def test_what_is_no_number_is_refused_with_an_example(text):
    with pytest.raises(QuantityError, match=r"read .*wanted a voltage, such as 13\.8 V"):
        parse_real(text, "V")


def test_a_reading_error_is_one_the_program_catches():
    with pytest.raises(RfstageError):
        parse_real("x", "V")


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("50+j10", 50 + 10j),
        ("20.5-j3.2", 20.5 - 3.2j),
        ("45.3+j0", 45.3 + 0j),
        ("50", 50 + 0j),
        ("50 ohm", 50 + 0j),
        ("-j10", -10j),
        ("j10", 10j),
        ("+j10", 10j),
        ("20.5-3.2j ohm", 20.5 - 3.2j),
        ("20.5 - j3.2 Ω", 20.5 - 3.2j),
        ("1e3-j2e-1", 1000 - 0.2j),
        ("1e-3+j4k7", 1e-3 + 4700j),
        ("1k5+j2k", 1500 + 2000j),
        ("-5+J10", -5 + 10j),
        ("50 Ω", 50 + 0j),
    ],
)
def test_complex_impedance_is_read(text, value):
    assert parse_complex(text) == value


@pytest.mark.parametrize(
    "text", ["50+jx", "50j10j", "j10j", "50+j10 V", "", "50+j", "jj", "50+j1,5", "nan+j5", "5+jinf"]
)
def test_what_is_no_complex_impedance_is_refused_naming_it(text):
    with pytest.raises(QuantityError, match="read"):
        parse_complex(text)


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (7.1e6, "Hz", "7.1 MHz"),
        (1.39725e-10, "F", "139.725 pF"),
        (50.0, "ohm", "50 ohm"),
        (0.0, "V", "0 V"),
        (-40.0, "V", "-40 V"),
        (120.0, "deg", "120 deg"),
        (0.0001, "W", "100 uW"),
    ],
)
def test_exact_text_is_short_and_in_steps_of_a_thousand(value, unit, text):
    assert exact_text(value, unit) == text


finite = st.floats(allow_nan=False, allow_infinity=False)


@pytest.mark.parametrize("unit", UNITS)
@given(value=finite)
def test_exact_text_reads_back_as_the_same_number(unit, value):
    assert parse_real(exact_text(value, unit), unit) == value


@given(value=st.complex_numbers(allow_nan=False, allow_infinity=False))
def test_exact_complex_reads_back_as_the_same_number(value):
    assert parse_complex(exact_complex(value)) == value


@given(text=st.text(max_size=12), unit=st.sampled_from(UNITS))
def test_any_text_is_a_finite_number_or_is_refused(text, unit):
    try:
        value = parse_real(text, unit)
    except QuantityError:
        return
    assert math.isfinite(value)


@given(text=st.text(alphabet="0123456789.+-jJeE kRΩohm", max_size=14))
def test_any_text_is_a_finite_complex_number_or_is_refused(text):
    try:
        value = parse_complex(text)
    except QuantityError:
        return
    assert math.isfinite(abs(value))


@pytest.mark.parametrize(
    ("value", "unit", "digits", "shown"),
    [
        (3.3333e-9, "F", 3, "3.33 nF"),
        (0.0469, "ohm", 3, "46.9 mΩ"),
        (999.6, "Hz", 3, "1.00 kHz"),
        (999.4, "Hz", 3, "999 Hz"),
        (999.96, "Hz", 4, "1.000 kHz"),
        (-47.21, "V", 3, "−47.2 V"),
        (4.7e-6, "H", 3, "4.70 µH"),
        (120.0, "deg", 4, "120.0 °"),
        (0.0, "W", 3, "0 W"),
        (1e6, "W", 2, "1.0 MW"),
    ],
)
def test_shown_quantity_is_rounded_to_its_digits_and_steps_up_where_it_rounds_up(value, unit, digits, shown):
    assert show(value, unit, digits) == shown


@given(value=st.floats(1e-14, 1e13), digits=st.integers(3, 8))
def test_shown_quantity_is_within_half_a_unit_of_its_last_digit(value, digits):
    back = parse_real(show(value, "V", digits).replace("−", "-"), "V")
    assert abs(back / value - 1) <= 0.5000001 * 10.0 ** (1 - digits)


@pytest.mark.parametrize(
    ("value", "shown"),
    [
        (20.5 - 3.2j, "20.5 − j3.2 Ω"),
        (50 + 0j, "50.0 Ω"),
        (-1 + 100j, "−1 + j100 Ω"),
        (0.0123 + 4.56j, "0.01 + j4.56 Ω"),
    ],
)
def test_shown_impedance_has_both_parts_to_the_same_place(value, shown):
    assert show_complex(value) == shown
