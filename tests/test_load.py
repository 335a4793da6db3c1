"""The load over frequency: continued from one figure, or interpolated in a measured table."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from rfstage.errors import InputError, OutOfRangeError
from rfstage.load import MeasuredLoad, SeriesLoad


def test_positive_reactance_continues_as_a_coil():
    load = SeriesLoad(30 + 40j, carrier=7e6)
    expected = 30 + 2j * math.pi * np.array([3.5e6, 7e6, 28e6]) * (40 / (2 * math.pi * 7e6))
    np.testing.assert_allclose(load.impedance([3.5e6, 7e6, 28e6]), expected, rtol=1e-15)


def test_negative_reactance_continues_as_a_capacitor():
    load = SeriesLoad(30 - 40j, carrier=7e6)
    farad = 1 / (2 * math.pi * 7e6 * 40)
    expected = 30 + 1 / (2j * math.pi * np.array([3.5e6, 7e6, 28e6]) * farad)
    np.testing.assert_allclose(load.impedance([3.5e6, 7e6, 28e6]), expected, rtol=1e-15)


def test_resistance_is_the_same_at_every_frequency():
    np.testing.assert_array_equal(SeriesLoad(50 + 0j, carrier=7e6).impedance([1e3, 7e6, 1e9]), [50, 50, 50])


@pytest.mark.parametrize("shape", [(), (3,), (2, 4)])
def test_impedance_has_the_shape_of_the_frequencies(shape):
    f = np.full(shape, 7e6)
    assert SeriesLoad(30 + 40j, carrier=7e6).impedance(f).shape == shape
    assert table().impedance(f).shape == shape


@pytest.mark.parametrize("impedance", [0j, -5 + 3j, complex(math.nan, 0), complex(5, math.inf), 30j])
def test_load_without_a_finite_resistance_above_0_is_refused(impedance):
    with pytest.raises(OutOfRangeError, match="load impedance must be finite, its resistance above 0 ohm"):
        SeriesLoad(impedance, carrier=7e6)


@given(
    impedance=st.builds(complex, st.floats(0.1, 1e4), st.floats(-1e4, 1e4)),
    frequencies=st.lists(st.floats(1e3, 1e10), min_size=2, max_size=5, unique=True),
)
def test_reactance_of_a_continued_load_never_falls_with_frequency(impedance, frequencies):
    # Foster's theorem: the reactance of a lossless one-port only rises
    rising = np.sort(frequencies)
    reactance = SeriesLoad(impedance, carrier=7e6).impedance(rising).imag
    assert np.all(np.diff(reactance) >= 0)


def table(points: int = 11) -> MeasuredLoad:
    f = np.linspace(5e6, 15e6, points)
    return MeasuredLoad(f, (20 + 3 * f / 1e6) + 1j * (f / 1e6 - 9) * 12, "aerial.s1p")


def test_measured_load_is_itself_at_its_own_points():
    load = table()
    np.testing.assert_allclose(load.impedance(load.frequencies), load.impedances, rtol=1e-13)


def test_measured_load_halfway_has_the_mean_reflection_against_50_ohm():
    load = table()
    middle = (load.frequencies[3] + load.frequencies[4]) / 2
    ends = (load.impedances[3:5] - 50) / (load.impedances[3:5] + 50)
    got = complex(load.impedance(middle))
    assert (got - 50) / (got + 50) == pytest.approx(complex(ends.mean()), rel=1e-12)


def test_interpolation_agrees_with_that_of_scikit_rf():
    import skrf

    load = table()
    wanted = np.linspace(5.3e6, 14.1e6, 17)
    s = ((load.impedances - 50) / (load.impedances + 50)).reshape(-1, 1, 1)
    network = skrf.Network(frequency=skrf.Frequency.from_f(load.frequencies, unit="Hz"), s=s, z0=50)
    other = network.interpolate(skrf.Frequency.from_f(wanted, unit="Hz"), kind="linear", coords="cart").s[:, 0, 0]
    np.testing.assert_allclose(load.impedance(wanted), 50 * (1 + other) / (1 - other), rtol=1e-12)


@given(frequency=st.floats(1e5, 1e9))
def test_measured_passive_load_is_passive_everywhere(frequency):
    assert complex(table().impedance(frequency)).real > 0


def test_measured_load_continues_beyond_its_ends_by_the_rule_of_a_single_figure():
    load = table()
    below, above = complex(load.impedances[0]), complex(load.impedances[-1])
    assert load.impedance(1e6) == SeriesLoad(below, carrier=5e6).impedance(1e6)
    assert load.impedance(60e6) == SeriesLoad(above, carrier=15e6).impedance(60e6)


def test_measured_load_is_continuous_at_both_ends():
    load = table()
    for end in (5e6, 15e6):
        inside, outside = load.impedance([end * (1 - 1e-9), end * (1 + 1e-9)])
        assert inside == pytest.approx(outside, rel=1e-6)


@pytest.mark.parametrize(("frequency", "reached"), [(5e6, True), (15e6, True), (4.99e6, False), (15.01e6, False)])
def test_table_reaches_from_its_first_to_its_last_frequency(frequency, reached):
    assert table().reaches(frequency) is reached


def test_table_of_one_point_holds_there_and_continues_both_ways():
    load = MeasuredLoad(np.array([7e6]), np.array([30 + 40j]), "one.s1p")
    np.testing.assert_allclose(load.impedance([3.5e6, 7e6, 14e6]), [30 + 20j, 30 + 40j, 30 + 80j], rtol=1e-13)


@pytest.mark.parametrize(
    ("frequencies", "impedances", "said"),
    [
        ([], [], "empty"),
        ([5e6, math.nan], [50, 50], "not finite"),
        ([5e6, 6e6], [50, math.inf], "not finite"),
        ([0.0, 6e6], [50, 50], "above 0 and rise"),
        ([6e6, 5e6], [50, 50], "above 0 and rise"),
        ([5e6, 5e6], [50, 50], "above 0 and rise"),
        ([5e6, 6e6], [50, -3], "-3 ohm resistance at 6e+06 Hz"),
        ([5e6, 6e6], [0, 50], "0 ohm resistance at 5e+06 Hz"),
    ],
)
def test_table_that_can_not_be_a_load_is_refused_naming_the_file(frequencies, impedances, said):
    with pytest.raises(InputError) as error:
        MeasuredLoad(np.array(frequencies, dtype=float), np.array(impedances, dtype=complex), "aerial.s1p")
    assert str(error.value).startswith("aerial.s1p: ")
    assert said in str(error.value)
