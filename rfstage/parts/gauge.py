"""Wire by its name: a diameter with its unit, or an American gauge as ASTM B258 defines it. Standard library only.

From gauge 36 (0.0050 in) to 0000 (0.4600 in) the diameters stand in geometric progression; 00, 000 and 0000 are
written 2/0, 3/0 and 4/0 too, and count as −1, −2 and −3.
"""

from __future__ import annotations

import math
import re

from rfstage.errors import OutOfRangeError
from rfstage.quantity import QuantityError, parse_real

INCH = 25.4e-3  # m, exact
THICKEST, THINNEST = -3, 50  # gauges: 4/0, and about where a coil can't be wound by hand
_GAUGE = re.compile(r"(?:AWG|#)\s*(?P<first>\d+(?:/0)?)|(?P<last>\d+(?:/0)?)\s*AWG", re.IGNORECASE)


def gauge_diameter(gauge: int) -> float:
    """Return the diameter of a bare wire of an American gauge [m].

    Parameters
    ----------
    gauge : int
        −3 (written 4/0) to 50.

    Raises
    ------
    OutOfRangeError
        If the gauge is beyond those.

    References
    ----------
    ASTM B258: 0.005 in · 92^((36 − n)/39). Tables print it to four figures.

    Examples
    --------
    >>> round(gauge_diameter(14) * 1e3, 3), round(gauge_diameter(-3) * 1e3, 3)
    (1.628, 11.684)
    """
    if not THICKEST <= gauge <= THINNEST:
        raise OutOfRangeError("gauge", gauge_name(gauge), "AWG 4/0 to AWG 50", "or give the diameter, such as 2mm")
    return float(0.005 * INCH * 92 ** ((36 - gauge) / 39))


def gauge_name(gauge: int) -> str:
    """Return how a gauge is written.

    Examples
    --------
    >>> gauge_name(14), gauge_name(0), gauge_name(-3)
    ('AWG 14', 'AWG 0', 'AWG 4/0')
    """
    return f"AWG {gauge}" if gauge >= 0 else f"AWG {1 - gauge}/0"


def largest_gauge(diameter: float) -> int | None:
    """Return the thickest gauge that is not thicker than a diameter [m], or None where the finest is thicker.

    Examples
    --------
    >>> largest_gauge(1.0e-3), largest_gauge(1e-6)
    (19, None)
    """
    if diameter < gauge_diameter(THINNEST):
        return None
    exact = 36 - 39 * math.log(diameter / (0.005 * INCH), 92)
    gauge = max(THICKEST, math.ceil(exact - 1e-9))
    return min(gauge, THINNEST)


def wire_diameter(text: str) -> float:
    """Read the diameter of a wire [m] from ``2mm``, ``AWG 14``, ``14 AWG``, ``#14`` or ``AWG 4/0``.

    Raises
    ------
    QuantityError
        If the text is neither a length nor a gauge.
    OutOfRangeError
        If there is no such gauge.

    Examples
    --------
    >>> wire_diameter("2mm"), round(wire_diameter("AWG 18") * 1e3, 3), round(wire_diameter("2/0 AWG") * 1e3, 2)
    (0.002, 1.024, 9.27)
    """
    found = _GAUGE.fullmatch(text.strip())
    if found is None:
        if "awg" in text.lower() or text.strip().startswith("#"):
            raise QuantityError(f"read {text!r}, which is no gauge; wanted AWG and a number, such as AWG 14 or AWG 4/0")
        return parse_real(text, "m")
    number = found["first"] or found["last"]
    if "/" in number:
        return gauge_diameter(1 - int(number.partition("/")[0]))
    zeros = len(number) if number.strip("0") == "" else 1  # 00 is 2/0
    return gauge_diameter(1 - zeros if zeros > 1 else int(number))
