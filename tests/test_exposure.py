"""Exposure: every row of the table, the distance's round trip, and where it is withheld."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from rfstage.errors import InputError, OutOfRangeError
from rfstage.exposure import (
    POPULATIONS,
    REFLECTIONS,
    SOURCE,
    exposure_distance,
    exposure_distances,
    exposure_limit,
    power_density,
)

populations, reflections = st.sampled_from(POPULATIONS), st.sampled_from(sorted(REFLECTIONS))
FREE_SPACE = 376.730  # ohm, the impedance of free space

# SOURCE: 47 CFR 1.1310, Table 1 (editions 1997-2009 and a reprint, read); f in MHz; the 100 mW/cm² of the two lowest
# rows and the 3 MHz of the occupational one are from memory.
# population, MHz, E [V/m], H [A/m], S [mW/cm²], minutes
ROWS = [
    ("general", 0.3, 614.0, 1.63, 100.0, 30),
    ("general", 1.0, 614.0, 1.63, 100.0, 30),
    ("general", 2.0, 824 / 2, 2.19 / 2, 180 / 4, 30),
    ("general", 10.0, 82.4, 0.219, 1.8, 30),
    ("general", 50.0, 27.5, 0.073, 0.2, 30),
    ("general", 450.0, None, None, 0.3, 30),
    ("general", 10_000.0, None, None, 1.0, 30),
    ("occupational", 1.0, 614.0, 1.63, 100.0, 6),
    ("occupational", 10.0, 184.2, 0.489, 9.0, 6),
    ("occupational", 144.0, 61.4, 0.163, 1.0, 6),
    ("occupational", 450.0, None, None, 1.5, 6),
    ("occupational", 100_000.0, None, None, 5.0, 6),
]


@pytest.mark.parametrize("row", ROWS, ids=lambda row: f"{row[0]}-{row[1]:g}MHz")
def test_limits_are_those_of_the_table(row):
    population, megahertz, electric, magnetic, density, minutes = row
    limit = exposure_limit(megahertz * 1e6, population=population)
    assert limit.electric_field == (None if electric is None else pytest.approx(electric))
    assert limit.magnetic_field == (None if magnetic is None else pytest.approx(magnetic))
    assert limit.power_density == pytest.approx(10 * density)  # 1 mW/cm² = 10 W/m²
    assert limit.averaging_time == 60 * minutes


@pytest.mark.parametrize("population", POPULATIONS)
@pytest.mark.parametrize("megahertz", [1.0, 2.5, 10.0, 25.0, 100.0])
def test_density_of_a_row_is_that_of_its_electric_field_as_a_plane_wave(population, megahertz):
    # SOURCE: S = E²/377 ohm; the table's figures have two or three digits
    limit = exposure_limit(megahertz * 1e6, population=population)
    assert limit.power_density == pytest.approx(limit.electric_field**2 / FREE_SPACE, rel=0.02)


@pytest.mark.parametrize(
    ("population", "edge"),
    [(p, e) for p in POPULATIONS for e in ([1.34e6, 30e6] if p == "general" else [3e6, 30e6])],
)
def test_rows_meet_at_their_common_ends(population, edge):
    # SOURCE: the table's own figures, rounded to two or three digits
    below = exposure_limit(edge, population=population)
    above = exposure_limit(math.nextafter(edge, math.inf), population=population)
    assert below.electric_field == pytest.approx(above.electric_field, rel=0.005)
    assert below.magnetic_field == pytest.approx(above.magnetic_field, rel=0.006)


@given(frequency=st.floats(0.3e6, 100e9))
def test_the_public_is_never_allowed_more_than_workers(frequency):
    public, workers = exposure_limit(frequency), exposure_limit(frequency, population="occupational")
    assert public.power_density <= workers.power_density * (1 + 1e-12)


@pytest.mark.parametrize("frequency", [0.0, 136e3, 299e3, 101e9, math.nan])
def test_frequencies_outside_the_table_are_refused(frequency):
    with pytest.raises(OutOfRangeError, match="frequency must be from 300 kHz to 100 GHz"):
        exposure_limit(frequency)


def test_an_unknown_population_is_answered_with_those_there_are():
    with pytest.raises(InputError, match=r"population: got 'genral'; allowed general, occupational .*'general'"):
        exposure_limit(7e6, population="genral")


# --- distance -------------------------------------------------------------------------------------------


def test_density_of_an_isotropic_radiator_is_its_power_over_the_sphere():
    # SOURCE: arithmetic: 100 W over 4π (10 m)²
    assert power_density(100.0, gain_dbi=0.0, distance=10.0) == pytest.approx(100 / (400 * math.pi))


def test_distance_by_hand():
    # SOURCE: arithmetic: 100 W, 10 dB, 144 MHz, public 2 W/m²: √(1000/(4π 2)) = 6.308 m; workers 10 W/m²: 2.821 m;
    # a perfect ground doubles the field and with it the distance
    def metres(**changed):
        return exposure_distance(100.0, frequency=144e6, gain_dbi=10.0, **changed).distance

    assert metres() == pytest.approx(6.308, abs=5e-4)
    assert metres(population="occupational") == pytest.approx(2.821, abs=5e-4)
    assert metres(reflection="perfect ground") == pytest.approx(12.616, abs=1e-3)
    assert metres(reflection="typical ground") == pytest.approx(1.6 * 6.308, abs=1e-3)
    assert metres(duty=0.25) == pytest.approx(3.154, abs=5e-4)


@given(
    power=st.floats(0.1, 1e5),
    frequency=st.floats(0.3e6, 100e9),
    gain=st.floats(-10, 50),
    duty=st.floats(0.01, 1),
    population=populations,
    reflection=reflections,
)
def test_at_the_distance_the_density_is_the_limit_and_the_near_field_is_never_answered(
    power, frequency, gain, duty, population, reflection
):
    found = exposure_distance(
        power, frequency=frequency, gain_dbi=gain, duty=duty, population=population, reflection=reflection
    )
    assert found.near_field == pytest.approx(299_792_458 / frequency / (2 * math.pi))
    at_the_edge = power_density(power * duty, gain_dbi=gain, distance=found.near_field, reflection=reflection)
    if found.distance is None:
        assert "inside λ/2π" in found.reason
        assert at_the_edge < found.limit.power_density * (1 + 1e-9)
        return
    assert found.distance >= found.near_field
    density = power_density(power * duty, gain_dbi=gain, distance=found.distance, reflection=reflection)
    assert density == pytest.approx(found.limit.power_density)
    assert "estimate" in found.reason


def test_inside_the_near_field_no_distance_is_given_but_a_reason():
    found = exposure_distance(10.0, frequency=7.1e6, gain_dbi=2.15)
    assert found.distance is None
    assert found.reason.startswith("the estimate of 191 mm lies inside λ/2π = 6.72 m")
    assert found.limit == exposure_limit(7.1e6)


def test_where_the_table_has_no_figure_no_distance_is_given_but_a_reason():
    found = exposure_distance(100.0, frequency=136e3, gain_dbi=0.0)
    assert (found.distance, found.limit) == (None, None)
    assert found.reason == f"{SOURCE} has no figure at 136 kHz: it covers 300 kHz to 100 GHz"


def test_all_distances_are_given_for_both_populations_with_and_without_ground():
    found = exposure_distances(400.0, frequency=50e6, gain_dbi=8.0)
    assert [(d.population, d.reflection) for d in found] == [(p, r) for p in POPULATIONS for r in REFLECTIONS]
    assert found[0] == exposure_distance(400.0, frequency=50e6, gain_dbi=8.0)
    assert "none" in REFLECTIONS


@pytest.mark.parametrize(
    ("changed", "said"),
    [
        ({"power": 0.0}, "power must be above 0 W"),
        ({"power": math.nan}, "power must be above 0 W"),
        ({"frequency": -1.0}, "frequency must be above 0 Hz"),
        ({"gain_dbi": math.inf}, "gain_dbi must be at least -100 dB, at most 100 dB"),
        ({"duty": 0.0}, "duty must be above 0, at most 1"),
        ({"duty": 2.0}, "duty must be above 0, at most 1; got 2"),
    ],
)
def test_bad_input_is_one_clear_line(changed, said):
    values = {"power": 100.0, "frequency": 14e6, "gain_dbi": 2.15, **changed}
    with pytest.raises(OutOfRangeError) as caught:
        exposure_distance(values.pop("power"), **values)
    assert said in str(caught.value)


def test_an_unknown_reflection_is_answered_with_those_there_are():
    with pytest.raises(InputError, match="reflection: got 'sea'; allowed none, typical ground, perfect ground"):
        exposure_distance(100.0, frequency=14e6, gain_dbi=2.15, reflection="sea")
    with pytest.raises(OutOfRangeError, match="distance must be above 0 m"):
        power_density(100.0, gain_dbi=0.0, distance=0.0)
