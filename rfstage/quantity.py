"""Text ⇄ SI numbers: ``7.1 MHz``, ``4k7``, ``0R47``, ``50+j10``.

A number is read by gluing its digits to one decimal exponent (``7.1`` and ``M`` become the literal
``7.1e6``), so that it is correctly rounded and ``parse(exact_text(x)) == x``. A bare number is SI,
degrees for an angle. The letter-for-point notation (``4k7``, ``2u2``, ``0R47``) is that of IEC 60062.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence

from rfstage.errors import RfstageError

_PREFIXES = {
    "f": -15,
    "p": -12,
    "n": -9,
    "u": -6,
    "µ": -6,
    "μ": -6,
    "m": -3,
    "": 0,
    "k": 3,
    "K": 3,
    "M": 6,
    "G": 9,
    "T": 12,
}
_LETTER = {-15: "f", -12: "p", -9: "n", -6: "u", -3: "m", 0: "", 3: "k", 6: "M", 9: "G", 12: "T"}

# unit -> (what it measures, other accepted spellings, takes prefixes, an example)
_UNITS: dict[str, tuple[str, tuple[str, ...], bool, str]] = {
    "Hz": ("a frequency", ("hz", "HZ"), True, "7.1 MHz"),
    "V": ("a voltage", ("volt", "volts"), True, "13.8 V"),
    "A": ("a current", ("amp", "amps"), True, "2.5 A"),
    "W": ("a power", ("watt", "watts"), True, "10 W"),
    "ohm": ("a resistance or impedance", ("ohms", "Ohm", "Ohms", "\u03a9", "\u2126", "R"), True, "50 ohm"),
    "F": ("a capacitance", (), True, "150 pF"),
    "H": ("an inductance", (), True, "1.2 uH"),
    "S": ("a conductance", (), True, "20 mS"),
    "m": ("a length", (), True, "50 mm"),
    "deg": ("an angle", ("°", "degree", "degrees"), False, "120 deg"),
    "dB": ("a ratio in decibels", ("db",), False, "43 dB"),
    "dBi": ("an antenna gain", ("dB", "db"), False, "2.15 dBi"),
    "degC": ("a temperature", ("°C",), False, "40 degC"),
    "K/W": ("a thermal resistance", ("°C/W", "degC/W", "C/W"), False, "1.2 K/W"),
    "s": ("a time", (), True, "30 s"),
    "J": ("an energy", (), True, "10 J"),
    "%": ("a percentage", ("percent",), False, "5 %"),
    "": ("a plain number", (), False, "10"),
}

# read in capitals or not: no prefix and no other unit could be meant. F is left out (f is femto), S (s is a
# second) and m (M is mega)
_ANY_CASE = ("Hz", "V", "A", "W", "ohm", "H", "deg", "dB", "dBi", "degC", "K/W")

# patterns are compiled when a quantity is first read: a refused file or option never gets that far
_NUMBER = r"(?P<digits>\d+(?:\.\d*)?|\.\d+)(?:[eE](?P<exponent>[+-]?\d+))?"
_TAIL = r"(?P<tail>[^\d\s+\-.,][^\d]*)?"
_PLAIN = rf"(?P<sign>[+-]?){_NUMBER}\s*{_TAIL}"
_LETTER_POINT = rf"(?P<sign>[+-]?)(?P<whole>\d*)(?P<letter>[pnuµμmRkKMG])(?P<part>\d+)\s*{_TAIL}"
_LAST_SIGN = r"(?<![eE])[+-](?!.*(?<![eE])[+-])"


class QuantityError(RfstageError, ValueError):
    """A text is not the quantity wanted; the message says what was read and what is wanted."""


def _wanted(unit: str) -> str:
    what, _, _, example = _UNITS[unit]
    return f"wanted {what}, such as {example}"


def _names(unit: str) -> tuple[str, ...]:
    return (unit, *_UNITS[unit][1])


def _without_unit(text: str, unit: str) -> str | None:
    """Return what stands before the unit at the end of a text, or None if it does not end in the unit."""
    for name in sorted(_names(unit), key=len, reverse=True):
        end = text[-len(name) :] if name else ""
        if name and (end == name or (unit in _ANY_CASE and name.isascii() and end.lower() == name.lower())):
            return text[: -len(name)].rstrip()
    return None


def _tail_exponent(tail: str, unit: str) -> int | None:
    """Return the decimal exponent of prefix plus unit, or None if the tail is neither."""
    before = _without_unit(tail, unit)
    if before == "":
        return 0
    if not _UNITS[unit][2]:
        return None
    return _PREFIXES.get(tail, None if before is None else _PREFIXES.get(before))


def _read_tail(tail: str | None, unit: str, text: str) -> int:
    tail = (tail or "").strip()
    if not tail:
        return 0
    exponent = _tail_exponent(tail, unit)
    if exponent is not None:
        return exponent
    if unit == "degC" and tail in ("C", "c", "K"):
        raise QuantityError(f"read {text!r}, whose {tail!r} could be another unit; write degrees Celsius as 40 degC")
    for other, (what, _, _, _) in _UNITS.items():
        if other and other != unit and _tail_exponent(tail, other) is not None and tail not in _PREFIXES:
            raise QuantityError(f"read {text!r}, which is {what}; {_wanted(unit)}")
    raise QuantityError(f"read {text!r}, whose {tail!r} is no unit known here; {_wanted(unit)}")


def _glue(sign: str, digits: str, exponent: int, text: str) -> float:
    value = float(f"{sign}{digits}e{exponent}") if abs(exponent) < 9999 else math.inf
    if math.isinf(value):
        raise QuantityError(f"read {text!r}, which is beyond the range of numbers")
    if value == 0 and digits.strip("0."):
        raise QuantityError(f"read {text!r}, which is too small to be told from zero")
    return value


def parse_real(text: str, unit: str) -> float:
    """Read one real quantity.

    Parameters
    ----------
    text : str
        For example ``"7.1 MHz"``, ``"100p"``, ``"4k7"``; a bare number is SI (degrees for an angle).
    unit : str
        ``"Hz"``, ``"V"``, ``"A"``, ``"W"``, ``"ohm"``, ``"F"``, ``"H"``, ``"S"``, ``"m"``, ``"deg"``,
        ``"dB"``, ``"dBi"``, ``"degC"``, ``"K/W"``, ``"s"``, ``"J"``, ``"%"`` or ``""``.

    Returns
    -------
    float
        The value in that unit, correctly rounded.

    Raises
    ------
    QuantityError
        For a decimal comma, another unit, NaN, infinity, an empty text or anything else.

    Examples
    --------
    >>> parse_real("7.1MHz", "Hz"), parse_real("4k7", "ohm"), parse_real("100p", "F")
    (7100000.0, 4700.0, 1e-10)
    """
    stripped = text.strip()
    if not stripped:
        raise QuantityError(f"read an empty text; {_wanted(unit)}")
    if "," in stripped:
        raise QuantityError(
            f"read {text!r}, which has a comma: write the decimal point as in "
            f"{stripped.replace(',', '.')!r}, and no thousands marks"
        )
    plain = re.fullmatch(_PLAIN, stripped, re.ASCII)
    if plain:
        exponent = int(plain["exponent"] or 0) + _read_tail(plain["tail"], unit, text)
        return _glue(plain["sign"], plain["digits"], exponent, text)
    letter = re.fullmatch(_LETTER_POINT, stripped, re.ASCII)
    if letter and _UNITS[unit][2] and (letter["letter"] != "R" or unit == "ohm"):
        prefix = 0 if letter["letter"] == "R" else _PREFIXES[letter["letter"]]
        tail = (letter["tail"] or "").strip()
        if not tail or _without_unit(tail, unit) == "":
            return _glue(letter["sign"], f"{letter['whole'] or '0'}.{letter['part']}", prefix, text)
    if stripped.lstrip("+-").lower() in ("nan", "inf", "infinity"):
        raise QuantityError(f"read {text!r}, which is not a finite number; {_wanted(unit)}")
    raise QuantityError(f"read {text!r}, which is not a number with a unit; {_wanted(unit)}")


def parse_complex(text: str, unit: str = "ohm") -> complex:
    """Read a complex quantity: ``"50+j10"``, ``"-j10"``, ``"20.5-3.2j ohm"``, or a real one.

    Raises
    ------
    QuantityError
        As `parse_real`.

    Examples
    --------
    >>> parse_complex("20.5-j3.2"), parse_complex("50 ohm")
    ((20.5-3.2j), (50+0j))
    """
    stripped = text.strip()
    if "j" not in stripped.lower():
        return complex(parse_real(text, unit))
    before = _without_unit(stripped, unit)
    stripped = stripped if before is None else before
    split = re.search(_LAST_SIGN, stripped)
    real, imaginary = (stripped[: split.start()], stripped[split.start() :]) if split else ("", stripped)
    sign = "-" if imaginary.startswith("-") else ""
    size = imaginary.lstrip("+-").strip()
    if size.lower().startswith("j") != size.lower().endswith("j"):
        try:
            return complex(parse_real(real, unit) if real.strip() else 0.0, parse_real(sign + size.strip("jJ"), unit))
        except QuantityError as error:
            raise QuantityError(f"read {text!r}: {error}") from None
    raise QuantityError(f"read {text!r}, which is not an impedance; wanted R, R+jX or R-jX, such as 50+j10")


def _decimal(value: float, digits: int | None) -> tuple[str, str, int]:
    """Return sign, digit string and exponent of the first digit, shortest exact or rounded."""
    scientific = f"{abs(value):.{digits - 1}e}" if digits else repr(abs(value))
    mantissa, _, exponent = scientific.partition("e")
    whole, _, part = mantissa.partition(".")
    figures = (whole + part).lstrip("0")
    lead = int(exponent or 0) + len(whole) - 1 - (len(whole + part) - len((whole + part).lstrip("0")))
    return ("-" if math.copysign(1.0, value) < 0 else ""), (figures if digits else figures.rstrip("0") or "0"), lead


def _place_point(figures: str, lead: int) -> str:
    """Write the digits with their decimal point, the first digit standing at 10**lead."""
    if lead < 0:
        return "0." + "0" * (-lead - 1) + figures
    whole = figures[: lead + 1].ljust(lead + 1, "0")
    part = figures[lead + 1 :]
    return f"{whole}.{part}" if part else whole


def _engineering(value: float, unit: str, digits: int | None) -> str:
    if value == 0:
        number, letter = "0", ""
    else:
        sign, figures, lead = _decimal(value, digits)
        step = 3 * (lead // 3) if _UNITS[unit][2] else 0
        if step not in _LETTER or (step == 0 and not -6 <= lead <= 15):
            return f"{value!r} {unit}".strip() if digits is None else f"{value:.{digits - 1}e} {unit}".strip()
        number, letter = sign + _place_point(figures, lead - step), _LETTER[step]
    return f"{number} {letter}{unit}".strip()


def exact_text(value: float, unit: str) -> str:
    """Write a quantity so that reading it gives the same number again, in ASCII.

    Examples
    --------
    >>> exact_text(7.1e6, "Hz"), exact_text(1.39725e-10, "F"), exact_text(50.0, "ohm")
    ('7.1 MHz', '139.725 pF', '50 ohm')
    """
    return _engineering(value, unit, None)


def exact_complex(value: complex) -> str:
    """Write a complex number so that `parse_complex` gives it back: ``20.5-j3.2``.

    Examples
    --------
    >>> exact_complex(20.5 - 3.2j), exact_complex(50 + 0j)
    ('20.5-j3.2', '50')
    """
    if value.imag == 0:
        return _plain(value.real)
    sign = "-" if value.imag < 0 else "+"
    return f"{_plain(value.real)}{sign}j{_plain(abs(value.imag))}"


def _plain(value: float) -> str:
    text = repr(value)
    return text.removesuffix(".0")


def show(value: float, unit: str, digits: int = 3) -> str:
    """Write a quantity for a reader, rounded to ``digits`` significant figures.

    Examples
    --------
    >>> show(3.3333e-9, "F"), show(0.0469, "ohm"), show(999.6, "Hz", 3), show(-47.21, "V", 3)
    ('3.33 nF', '46.9 mΩ', '1.00 kHz', '−47.2 V')
    """
    text = _engineering(value, unit, digits)
    return text.replace("-", "−").replace("ohm", "Ω").replace(" u", " µ").replace("deg", "°")


def show_complex(value: complex, digits: int = 3) -> str:
    """Write an impedance for a reader, both parts to the same place.

    Examples
    --------
    >>> show_complex(20.5 - 3.2j), show_complex(50 + 0j)
    ('20.5 − j3.2 Ω', '50.0 Ω')
    """
    if abs(value.imag) < 0.5 * 10 ** (1 - digits) * abs(value.real):
        return show(value.real, "ohm", digits)
    places = max(0, digits - 1 - math.floor(math.log10(max(abs(value.real), abs(value.imag)))))
    places = min(places, 12)
    sign = "−" if value.imag < 0 else "+"
    return f"{value.real:.{places}f} {sign} j{abs(value.imag):.{places}f} Ω".replace("-", "−")


def show_orders(orders: Sequence[int]) -> str:
    """Write rising harmonic orders for a reader, runs drawn together.

    Examples
    --------
    >>> show_orders([2, 4, 5, 6, 9])
    '2, 4–6, 9'
    """
    runs: list[list[int]] = []
    for n in orders:
        if runs and n == runs[-1][-1] + 1:
            runs[-1].append(n)
        else:
            runs.append([n])
    return ", ".join(str(run[0]) if len(run) == 1 else f"{run[0]}–{run[-1]}" for run in runs)
