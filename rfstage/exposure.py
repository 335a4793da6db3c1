r"""Exposure of people to radio waves: the reference levels of 47 CFR 1.1310 as data, and a distance by estimate.

::

    antenna ))))   S = K P G/(4π r²)      K = 1 without the ground, (1 + |ρ|)² with a reflection from it
                   r = √(K P G/(4π S))    only outside λ/2π, where a wave is one

Maximum permissible exposure, f in MHz, E and H as rms, S as the plane wave's:

=============  ============ ============  ===========  =====================  =========
who            MHz          E [V/m]       H [A/m]      S [mW/cm²]             averaged
=============  ============ ============  ===========  =====================  =========
general        0.3–1.34     614           1.63         100 (from memory)      30 min
\              1.34–30      824/f         2.19/f       180/f²                 30 min
\              30–300       27.5          0.073        0.2                    30 min
\              300–1500     -             -            f/1500                 30 min
\              1500–100000  -             -            1.0                    30 min
occupational   0.3–3        614           1.63         100 (from memory)      6 min
\              3–30         1842/f        4.89/f       900/f²                 6 min
\              30–300       61.4          0.163        1.0                    6 min
\              300–1500     -             -            f/300                  6 min
\              1500–100000  -             -            5                      6 min
=============  ============ ============  ===========  =====================  =========

An estimate, never an evaluation: near large antennas, buildings and wires fields are stronger than this, and the rule
in force where you are decides.
"""

from __future__ import annotations

import math
from typing import NamedTuple

from rfstage.errors import InputError, OutOfRangeError
from rfstage.fields import nearest
from rfstage.parts.ranges import need
from rfstage.quantity import show

SOURCE = "47 CFR 1.1310, Table 1"
SPEED_OF_LIGHT = 299_792_458.0  # m/s, exact by the definition of the metre (SI, 1983)
LOWEST, HIGHEST = 0.3e6, 100e9  # Hz: what the table covers
# Field strength over that without the ground: none; a ground as it is on average; a perfect mirror (from memory)
REFLECTIONS = {"none": 1.0, "typical ground": 1.6, "perfect ground": 2.0}
_MILLIWATT_PER_SQUARE_CENTIMETRE = 10.0  # W/m²


class _Band(NamedTuple):
    """One row of the table: its top [Hz], then E [V/m], H [A/m] and S [mW/cm²] with the power of f/MHz each goes by."""

    top: float
    electric: tuple[float, int] | None
    magnetic: tuple[float, int] | None
    power_density: tuple[float, int]


_TABLES: dict[str, tuple[float, tuple[_Band, ...]]] = {
    "general": (
        30 * 60.0,
        (
            _Band(1.34e6, (614.0, 0), (1.63, 0), (100.0, 0)),
            _Band(30e6, (824.0, -1), (2.19, -1), (180.0, -2)),
            _Band(300e6, (27.5, 0), (0.073, 0), (0.2, 0)),
            _Band(1.5e9, None, None, (1 / 1500, 1)),
            _Band(100e9, None, None, (1.0, 0)),
        ),
    ),
    "occupational": (
        6 * 60.0,
        (
            _Band(3e6, (614.0, 0), (1.63, 0), (100.0, 0)),
            _Band(30e6, (1842.0, -1), (4.89, -1), (900.0, -2)),
            _Band(300e6, (61.4, 0), (0.163, 0), (1.0, 0)),
            _Band(1.5e9, None, None, (1 / 300, 1)),
            _Band(100e9, None, None, (5.0, 0)),
        ),
    ),
}
POPULATIONS = tuple(_TABLES)


class ExposureLimit(NamedTuple):
    """What is permitted at one frequency.

    Electric field [V/m rms], magnetic field [A/m rms], both None above 300 MHz, power density [W/m²], and the time
    over which the squares of the fields, or the density, are averaged [s].
    """

    population: str
    frequency: float
    electric_field: float | None
    magnetic_field: float | None
    power_density: float
    averaging_time: float


class ExposureDistance(NamedTuple):
    """A distance by the far-field estimate [m], or None with the reason in words.

    ``reflection`` is one of `REFLECTIONS`; ``near_field`` [m] is λ/2π; ``limit`` is None where the table has none.
    """

    population: str
    reflection: str
    distance: float | None
    reason: str
    near_field: float
    limit: ExposureLimit | None


def exposure_limit(frequency: float, *, population: str = "general") -> ExposureLimit:
    """Return the maximum permissible exposure at a frequency.

    Parameters
    ----------
    frequency : float
        From 300 kHz to 100 GHz [Hz]; at a common end of two rows the lower row's figures hold.
    population : str
        ``"general"`` or ``"occupational"``.

    Raises
    ------
    InputError
        If there is no such population.
    OutOfRangeError
        If the table has no figure for the frequency.

    References
    ----------
    47 CFR 1.1310, Table 1; the 100 mW/cm² of its lowest rows are from memory.

    Examples
    --------
    >>> limit = exposure_limit(14.2e6)
    >>> round(limit.electric_field, 1), round(limit.power_density, 2), limit.averaging_time
    (58.0, 8.93, 1800.0)
    """
    if population not in _TABLES:
        raise InputError(
            f"population: got {population!r}; allowed {', '.join(POPULATIONS)}{nearest(population, POPULATIONS)}"
        )
    if not LOWEST <= frequency <= HIGHEST:
        raise OutOfRangeError("frequency", f"{frequency:g} Hz", f"from 300 kHz to 100 GHz, what {SOURCE} covers")
    averaging_time, bands = _TABLES[population]
    band = next(band for band in bands if frequency <= band.top)

    def figure(law: tuple[float, int]) -> float:
        return law[0] * (frequency / 1e6) ** law[1]

    return ExposureLimit(
        population=population,
        frequency=frequency,
        electric_field=None if band.electric is None else figure(band.electric),
        magnetic_field=None if band.magnetic is None else figure(band.magnetic),
        power_density=_MILLIWATT_PER_SQUARE_CENTIMETRE * figure(band.power_density),
        averaging_time=averaging_time,
    )


def power_density(power: float, *, gain_dbi: float, distance: float, reflection: str = "none") -> float:
    """Return the far-field power density [W/m²] of an antenna at a distance, in its main direction.

    Parameters
    ----------
    power : float
        Mean power into the antenna [W].
    gain_dbi : float
        Gain over an isotropic radiator [dB].
    distance : float
        [m].
    reflection : str
        One of `REFLECTIONS`.

    Raises
    ------
    InputError
        If there is no such reflection.
    OutOfRangeError
        If power or distance is not above 0, or the gain not finite.

    Examples
    --------
    >>> round(power_density(100.0, gain_dbi=0.0, distance=1.0), 4)
    7.9577
    """
    need("distance", distance, "m", above=0)
    return _at_one_metre(power, gain_dbi, reflection) / distance**2


def exposure_distance(
    power: float,
    *,
    frequency: float,
    gain_dbi: float,
    population: str = "general",
    reflection: str = "none",
    duty: float = 1.0,
) -> ExposureDistance:
    """Return the distance at which the far-field estimate falls to what is permitted.

    Parameters
    ----------
    power : float
        Into the antenna while transmitting [W].
    frequency : float
        [Hz].
    gain_dbi : float
        Gain over an isotropic radiator [dB].
    population : str
        ``"general"`` or ``"occupational"``.
    reflection : str
        One of `REFLECTIONS`.
    duty : float
        Mean over transmitted power within the averaging time [-], above 0, to 1.

    Returns
    -------
    ExposureDistance
        With None and the reason where the estimate would lie inside λ/2π, or the table has no figure.

    Raises
    ------
    InputError
        If there is no such population or reflection.
    OutOfRangeError
        If a value is out of range.

    Examples
    --------
    >>> round(exposure_distance(100.0, frequency=144e6, gain_dbi=10.0).distance, 2)
    6.31
    >>> exposure_distance(10.0, frequency=7.1e6, gain_dbi=2.15).reason
    'the estimate of 191 mm lies inside λ/2π = 6.72 m, where there is no far field: measure, or keep beyond that'
    """
    need("frequency", frequency, "Hz", above=0)
    need("duty", duty, "", above=0, most=1)
    strength = _at_one_metre(power * duty, gain_dbi, reflection)
    near_field = SPEED_OF_LIGHT / (2 * math.pi * frequency)
    try:
        limit = exposure_limit(frequency, population=population)
    except OutOfRangeError:
        reason = f"{SOURCE} has no figure at {show(frequency, 'Hz')}: it covers 300 kHz to 100 GHz"
        return ExposureDistance(population, reflection, None, reason, near_field, None)
    distance = math.sqrt(strength / limit.power_density)
    if distance < near_field:
        reason = (
            f"the estimate of {show(distance, 'm')} lies inside λ/2π = {show(near_field, 'm')}, where there is no far "
            "field: measure, or keep beyond that"
        )
        return ExposureDistance(population, reflection, None, reason, near_field, limit)
    reason = "far-field estimate in the main direction, not an evaluation"
    return ExposureDistance(population, reflection, distance, reason, near_field, limit)


def exposure_distances(
    power: float, *, frequency: float, gain_dbi: float, duty: float = 1.0
) -> tuple[ExposureDistance, ...]:
    """Return the distances for both populations, each without the ground and with it; arguments as `exposure_distance`.

    Raises
    ------
    OutOfRangeError
        If a value is out of range.

    Examples
    --------
    >>> found = exposure_distances(100.0, frequency=144e6, gain_dbi=10.0)
    >>> [(d.population, d.reflection, round(d.distance, 1)) for d in found[:2]]
    [('general', 'none', 6.3), ('general', 'typical ground', 10.1)]
    """
    return tuple(
        exposure_distance(
            power, frequency=frequency, gain_dbi=gain_dbi, population=population, reflection=reflection, duty=duty
        )
        for population in POPULATIONS
        for reflection in REFLECTIONS
    )


def _at_one_metre(power: float, gain_dbi: float, reflection: str) -> float:
    """Return the far-field power density carried back to a metre [W/m²]."""
    need("power", power, "W", above=0)
    need("gain_dbi", gain_dbi, "dB", least=-100, most=100)
    if reflection not in REFLECTIONS:
        raise InputError(
            f"reflection: got {reflection!r}; allowed {', '.join(REFLECTIONS)}{nearest(reflection, REFLECTIONS)}"
        )
    return REFLECTIONS[reflection] ** 2 * power * 10 ** (gain_dbi / 10) / (4 * math.pi)
