r"""Limits on harmonics as data: what a rule asks of each, its source and its conditions.

A rule gives the suppression below the carrier's mean power [dB] from the carrier's frequency and that
power at the line. Standard library only.

====================== ========================================================== ====================
rule                   asks                                                       source
====================== ========================================================== ====================
us-amateur             < 30 MHz: 43 dB                                            47 CFR 97.307(d)
\                       30-225 MHz, above 25 W: 60 dB                              47 CFR 97.307(e)
\                       30-225 MHz, to 25 W: 25 uW and 40 dB, not below 10 uW      47 CFR 97.307(e)
\                       above 225 MHz: no figure, as far as practicable            47 CFR 97.307(c)
us-amateur-before-2003 < 30 MHz: 50 mW and 40 dB; 30 dB where below 5 W           47 CFR 97.307(d)
43+10log               43 + 10 log10(P/W) dB, which is 50.1 uW at any power       e.g. 47 CFR 80.211
itu-amateur            43 + 10 log10(P/W), at most 50 dB < 30 MHz, 70 dB above    RR App. 3, from memory
60dB, 25uW             an amount below the carrier, or a power                    yours
====================== ========================================================== ====================
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import NamedTuple

from rfstage.errors import InputError
from rfstage.fields import nearest
from rfstage.quantity import QuantityError, parse_real

HF_TOP = 30e6  # Hz: below it paragraph (d) applies, from it on paragraph (e)
VHF_TOP = 225e6  # Hz: up to it paragraph (e) gives figures


class Limit(NamedTuple):
    """A rule: its name, where it is published, its conditions, and the function behind `suppression`."""

    name: str
    source: str
    conditions: str
    rule: Callable[[float, float], float | None]

    def suppression(self, carrier: float, power: float) -> float | None:
        """Return the dB below the carrier's mean power that each harmonic needs.

        ``carrier`` in Hz, ``power`` the mean power at the line in W. None where the rule gives no
        figure, or asks for none at so low a power; `silence` tells which.
        """
        needed = self.rule(carrier, power)
        return needed if needed is not None and needed > 0 else None

    def silence(self, carrier: float, power: float) -> str:
        """Return why the rule gives no suppression for this carrier [Hz] and power [W], or nothing if it does."""
        needed = self.rule(carrier, power)
        if needed is None:
            return "gives no figure here: reduce spurious emission as far as practicable"
        return "" if needed > 0 else "asks for no reduction at so low a power"


def _below(power: float, amount: float) -> float:
    """Return how many dB ``amount`` lies below ``power``, both in W."""
    return 10 * math.log10(power / amount)


def _us_vhf(carrier: float, power: float) -> float | None:
    if carrier > VHF_TOP:
        return None
    if power > 25:
        return 60.0
    return min(max(_below(power, 25e-6), 40.0), _below(power, 10e-6))


def _us_amateur(carrier: float, power: float) -> float | None:
    return 43.0 if carrier < HF_TOP else _us_vhf(carrier, power)


def _us_amateur_before_2003(carrier: float, power: float) -> float | None:
    if carrier >= HF_TOP:
        return _us_vhf(carrier, power)
    return 30.0 if power < 5 else max(40.0, _below(power, 50e-3))


def _43_plus(_carrier: float, power: float) -> float:
    return 43 + 10 * math.log10(power)


def _itu_amateur(carrier: float, power: float) -> float:
    return min(_43_plus(carrier, power), 50.0 if carrier < HF_TOP else 70.0)


LIMITS = {
    limit.name: limit
    for limit in (
        Limit(
            "us-amateur",
            "47 CFR 97.307(c)-(e)",
            "station installed after 1 January 2003; above 225 MHz no figure, only as far as practicable",
            _us_amateur,
        ),
        Limit(
            "us-amateur-before-2003",
            "47 CFR 97.307(c)-(e)",
            "station installed on or before 1 January 2003",
            _us_amateur_before_2003,
        ),
        Limit(
            "43+10log",
            "47 CFR 80.211(a)(3), 95.779 and others",
            "43 + 10 log10 of the mean power in watts, the same 50.1 uW at any power",
            _43_plus,
        ),
        Limit(
            "itu-amateur",
            "ITU Radio Regulations Appendix 3, from memory",
            "43 + 10 log10 of the peak envelope power, at most 50 dB below 30 MHz and 70 dB above",
            _itu_amateur,
        ),
    )
}


def _amount(text: str, unit: str, amount: float) -> Limit:
    source = "an amount given with the job"
    if unit == "dB":
        return Limit(text, source, f"every harmonic {text} below the carrier", lambda _carrier, _power: amount)
    return Limit(text, source, f"every harmonic {text} or less", lambda _carrier, power: _below(power, amount))


def limit_named(text: str) -> Limit:
    """Return the limit of a rule's name, or of an amount such as ``60dB`` or ``25uW``.

    Raises
    ------
    InputError
        If the text is neither.

    Examples
    --------
    >>> limit_named("us-amateur").suppression(7.1e6, 100.0)
    43.0
    >>> round(limit_named("25uW").suppression(50e6, 25.0), 2)
    60.0
    """
    if text in LIMITS:
        return LIMITS[text]
    for unit, low in (("dB", 0.0), ("W", 0.0)):
        try:
            amount = parse_real(text, unit)
        except QuantityError:
            continue
        if not text.strip()[-1:].isalpha():
            break
        if amount <= low:
            raise InputError(f"limit.rule: got {text!r}; an amount is above 0 {unit}")
        return _amount(text, unit, amount)
    raise InputError(
        f"limit.rule: got {text!r}; allowed {' | '.join(LIMITS)}, or an amount with its unit "
        f"(60dB, 25uW){nearest(text, LIMITS)}"
    )
