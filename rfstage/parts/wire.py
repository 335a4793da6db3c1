r"""Copper wire and tube: resistivity, skin depth, exact resistance and internal inductance of a straight round wire.

::

    symbol  name            unit
    ------  --------------  -----
    ρ       resistivity     ohm·m   1.7241e-8 at 20 °C, rising by 0.393 % of that a kelvin (IEC 60028)
    δ       skin_depth      m       √(ρ/(π f μ0))
    r       radius          m       half of ``diameter``
    z       (1 + j) r/δ     -       I0, I1: modified Bessel functions

    internal impedance of a round wire, a metre:   j ω μ0/(2π) · I0(z)/(z I1(z))

The quotient of Bessel functions is a continued fraction up to |z| = 25, and the quotient of their asymptotic series
beyond it; both agree with 30-digit arithmetic to 1e-13. A tube whose wall is at least three skin depths is, for radio
frequency, the solid wire of its outer diameter within 1 %: the fields left over at the inner wall have fallen by e³.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from rfstage.errors import OutOfRangeError
from rfstage.parts.arrays import checked
from rfstage.quantity import show

MU_0 = 4e-7 * math.pi  # H/m; the measured constant differs by 1e-10 of it
COPPER_RESISTIVITY = 1.7241e-8  # ohm·m at 20 °C: annealed copper, IEC 60028
COPPER_COEFFICIENT = 3.93e-3  # 1/K, of the resistivity at 20 °C: IEC 60028
COLDEST, HOTTEST = -100.0, 200.0  # °C, over which that coefficient is used (common practice, no source)
WALL_IN_SKIN_DEPTHS = 3.0
_SWITCH = 25.0  # |z| where the continued fraction hands over to the asymptotic series
_FRACTIONS, _TERMS = 60, 24


def resistivity(temperature: ArrayLike = 20.0) -> Any:
    """Return the resistivity of annealed copper [ohm·m] at a temperature [°C], −100 to 200.

    References
    ----------
    IEC 60028: 1.7241e-8 ohm·m at 20 °C, temperature coefficient 0.00393 a kelvin.

    Examples
    --------
    >>> float(resistivity()), round(float(resistivity(70)) * 1e8, 4)
    (1.7241e-08, 2.0629)
    """
    t = checked("temperature", temperature, "degC", least=COLDEST, most=HOTTEST)
    return COPPER_RESISTIVITY * (1 + COPPER_COEFFICIENT * (t - 20))


def skin_depth(frequency: ArrayLike, *, temperature: ArrayLike = 20.0) -> Any:
    """Return the skin depth in copper [m] at a frequency [Hz] and a temperature [°C].

    Examples
    --------
    >>> round(float(skin_depth(7e6)) * 1e6, 2)
    24.98
    """
    f = checked("frequency", frequency, "Hz", above=0)
    return np.sqrt(resistivity(temperature) / (math.pi * f * MU_0))


def _bessel_quotient(z: Any) -> Any:
    """Return z·I0(z)/I1(z) for complex z in the right half plane."""
    near = np.where(abs(z) <= _SWITCH, z, _SWITCH)
    square = near**2
    fraction = np.full_like(near, 2.0 * _FRACTIONS + 2)
    for n in range(_FRACTIONS, 0, -1):  # 2 + z²/(4 + z²/(6 + …))
        fraction = 2 * n + square / fraction
    far = np.where(abs(z) > _SWITCH, z, _SWITCH)
    sums = []
    for order in (0, 1):
        term = total = np.ones_like(far)
        for k in range(1, _TERMS):
            term = -term * (4 * order**2 - (2 * k - 1) ** 2) / (8 * k * far)
            total = total + term
        sums.append(total)
    return np.where(abs(z) <= _SWITCH, fraction, far * sums[0] / sums[1])


def internal_impedance(diameter: ArrayLike, frequency: ArrayLike, *, temperature: ArrayLike = 20.0) -> Any:
    """Return the internal impedance of a straight round copper wire, a metre of it, exact for a wire by itself.

    Parameters
    ----------
    diameter : array_like, shape (...)
        Of the bare wire, above 0 [m].
    frequency : array_like, shape (...)
        Above 0 [Hz].
    temperature : array_like, shape (...)
        Of the copper [°C].

    Returns
    -------
    complex or ndarray of complex, shape (...)
        ohm/m: the resistance, and ω times the internal inductance.

    Raises
    ------
    OutOfRangeError
        If a number is not in its range.

    References
    ----------
    The solution of the field equations in a round conductor, as in any text on skin effect.

    Examples
    --------
    At 1 Hz the wire's resistance to direct current, and μ0/(8π) = 50 nH a metre.

    >>> z = internal_impedance(2e-3, 1.0)
    >>> round(float(z.real) * 1e3, 4), round(float(z.imag) / (2 * math.pi) * 1e9, 3)
    (5.488, 50.0)
    """
    d = checked("diameter", diameter, "m", above=0)
    f = checked("frequency", frequency, "Hz", above=0)
    z = (1 + 1j) * (d / 2) / skin_depth(f, temperature=temperature)
    # jωμ0 = z²ρ/r², so that the direct current's ρ/(πr²) stands in front
    return resistivity(temperature) / (2 * math.pi * (d / 2) ** 2) * _bessel_quotient(z)


def ac_resistance(
    diameter: ArrayLike, frequency: ArrayLike, *, temperature: ArrayLike = 20.0, wall: float | None = None
) -> Any:
    """Return the resistance of a straight round copper wire or tube [ohm/m] at a frequency [Hz].

    Parameters
    ----------
    diameter, frequency, temperature : array_like
        As `internal_impedance`; of a tube the outer diameter.
    wall : float or None
        Wall of a tube [m]; None for a solid wire.

    Raises
    ------
    OutOfRangeError
        If a number is not in its range, or the wall is under three skin depths: then the tube is not, within 1 %, the
        solid wire of its outer diameter.

    Examples
    --------
    >>> round(float(ac_resistance(2e-3, 7.1e6)), 4), round(float(ac_resistance(6e-3, 7.1e6, wall=1e-3)), 4)
    (0.112, 0.037)
    """
    if wall is not None:
        checked("wall", wall, "m", above=0)
        depth = float(np.max(skin_depth(frequency, temperature=temperature)))
        if wall < WALL_IN_SKIN_DEPTHS * depth:
            raise OutOfRangeError(
                "wall",
                show(wall, "m"),
                f"at least {WALL_IN_SKIN_DEPTHS:g} skin depths, {show(WALL_IN_SKIN_DEPTHS * depth, 'm')} here",
                "take a thicker wall, or a higher carrier",
            )
    return internal_impedance(diameter, frequency, temperature=temperature).real


def dc_resistance(diameter: ArrayLike, *, temperature: ArrayLike = 20.0, wall: float | None = None) -> Any:
    """Return the resistance of a round copper wire or tube [ohm/m] to direct current; arguments as `ac_resistance`.

    Examples
    --------
    >>> round(float(dc_resistance(1.628e-3)) * 1e3, 3)
    8.283
    """
    d = checked("diameter", diameter, "m", above=0)
    bore = np.zeros_like(d) if wall is None else np.maximum(d - 2 * checked("wall", wall, "m", above=0), 0)
    return resistivity(temperature) * 4 / (math.pi * (d**2 - bore**2))
