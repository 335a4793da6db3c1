"""Bench arithmetic: published circuits, and each estimator against the circuit's own equations."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from rfstage.errors import OutOfRangeError
from rfstage.ladder import Branch
from rfstage.retuning.arithmetic import coil_from_resonances, coupling_from_peaks, q_shared, resonance_from_half_power


def test_two_published_resonances_give_the_coil_and_its_capacitance():
    # SOURCE: US amateur Extra question pool 2024-2028 (NCVEC), E5A02 and E5A10: 50 uH resonates with 40 pF at 3.56 MHz
    # and with 10 pF at 7.12 MHz; printed to three figures, so the coil is known to 1 % and the difference to 2 %
    found = coil_from_resonances(7.12e6, 3.56e6, added=30e-12)
    assert float(found.inductance) == pytest.approx(50e-6, rel=0.01)
    assert float(found.stray_capacitance) == pytest.approx(10e-12, rel=0.02)


def test_a_published_self_resonance_comes_back_as_the_coil_that_has_it():
    # SOURCE: Roddy & Coolen, Electronic Communications, Ex. 1.5.1, p. 19: 1 uH with 7 pF resonates at 60.2 MHz; the
    # second resonance is recomputed for 20 pF more
    second = 1 / (2 * math.pi * math.sqrt(1e-6 * 27e-12))
    found = coil_from_resonances(60.2e6, second, added=20e-12)
    assert float(found.inductance) == pytest.approx(1e-6, rel=2e-3)
    assert float(found.stray_capacitance) == pytest.approx(7e-12, rel=2e-3)


@given(st.floats(1e-9, 1e-3), st.floats(1e-13, 1e-9), st.floats(0.1, 30))
def test_coil_and_stray_come_back_from_resonances_found_on_the_ladder(inductance, stray, ratio):
    """An independent route: the frequencies where the branches of the ladder together have no susceptance."""
    added = ratio * stray

    def resonance(capacitance: float) -> float:
        coil = Branch("L1", "shunt", "coil", inductance)
        across = Branch("C1", "shunt", "capacitor", stray + capacitance)
        low, high = 1e-3, 2.0
        scale = 1 / (2 * math.pi * math.sqrt(inductance * (stray + capacitance)))
        for _ in range(200):
            middle = (low + high) / 2
            f = middle * scale
            susceptance = complex(coil.admittance(f) + across.admittance(f)).imag
            low, high = (middle, high) if susceptance < 0 else (low, middle)
        return high * scale

    found = coil_from_resonances(resonance(0.0), resonance(added), added=added)
    # the stray is a difference of squares of frequencies: at a tenth added it loses two digits of sixteen
    assert float(found.inductance) == pytest.approx(inductance, rel=1e-9)
    assert float(found.stray_capacitance) == pytest.approx(stray, rel=1e-9)


@pytest.mark.parametrize(
    ("centre", "q", "bandwidth"),
    [
        # SOURCE: US amateur Extra question pool 2024-2028 (NCVEC), E5A11 and E5A12; printed to three figures
        (7.1e6, 150.0, 47.3e3),
        (3.7e6, 118.0, 31.4e3),
    ],
)
def test_published_bandwidths_give_their_q(centre, q, bandwidth):
    low = math.sqrt(centre**2 + bandwidth**2 / 4) - bandwidth / 2
    found = resonance_from_half_power(low, low + bandwidth)
    assert float(found.q) == pytest.approx(q, rel=0.05 / 31.4)
    assert float(found.centre) == pytest.approx(centre, rel=1e-12)


@given(st.floats(0.6, 500), st.floats(1e5, 1e8))
def test_q_comes_back_from_half_power_points_found_on_a_series_circuit(q, centre):
    """An independent route: |I|² falls to a half where the reactance equals the resistance, found by halving."""

    def power(f: float) -> float:
        return 1 / (1 + (q * (f / centre - centre / f)) ** 2)

    ends = []
    for inner, outer in ((centre, centre * 1e-3), (centre, centre * 1e3)):
        near, far = inner, outer
        for _ in range(200):
            middle = math.sqrt(near * far)
            near, far = (middle, far) if power(middle) > 0.5 else (near, middle)
        ends.append(near)
    found = resonance_from_half_power(*ends)
    # the points are found to 1e-15 of a frequency, and their distance is 1/Q of it
    assert float(found.q) == pytest.approx(q, rel=1e-11)
    assert float(found.centre) == pytest.approx(centre, rel=1e-11)


def test_a_published_loaded_q_is_shared_between_coil_and_load():
    # SOURCE: Misra, Radio-Frequency and Microwave Communication Circuits, Ex. 5.2, p. 163: Q 100, Qe 100, QL 50
    found = q_shared(50.0, 100.0)
    assert float(found.external_q) == 100.0
    assert float(found.efficiency) == 0.5


@given(st.floats(1, 100), st.floats(1.1, 50))
def test_the_shared_q_is_that_of_two_resistances_across_one_tank(loaded, ratio):
    """An independent route: a parallel tank of 1 ohm reactance with the coil's and the load's resistance across it."""
    unloaded = ratio * loaded
    load = 1 / (1 / loaded - 1 / unloaded)
    found = q_shared(loaded, unloaded)
    assert float(found.external_q) == pytest.approx(load, rel=1e-12)
    assert float(found.efficiency) == pytest.approx((1 / load) / (1 / load + 1 / unloaded), rel=1e-12)


def second_current(f, *, k, q):
    """Current in the second of two like circuits [per volt in the first], from their two mesh equations."""
    own = 1 / q + 1j * (f - 1 / f)
    mutual = 1j * f * k
    return np.abs(mutual / (own * own - mutual * mutual))


def peaks(k, q):
    f = np.linspace(0.6, 1.8, 2_400_001)
    i = second_current(f, k=k, q=q)
    top = np.flatnonzero((i[1:-1] > i[:-2]) & (i[1:-1] >= i[2:])) + 1
    return f[top]


@pytest.mark.parametrize("k", [0.01, 0.056, 0.2, 0.5])
def test_coupling_without_losses_comes_back_exactly_from_the_poles_of_two_meshes(k):
    """An independent route: the poles of the two mesh equations as eigenvalues."""
    inductance = np.array([[1, k], [k, 1]])
    low, high = 1 / np.sqrt(np.sort(np.linalg.eigvalsh(inductance))[::-1])
    found = coupling_from_peaks(low, high)
    assert float(found.coupling) == pytest.approx(k, rel=1e-12)
    assert float(found.centre) == pytest.approx(1.0, rel=1e-12)


@pytest.mark.parametrize(("k", "q"), [(0.02, 100), (0.05, 100), (0.05, 50), (0.1, 30), (0.2, 10), (0.2, 50)])
def test_coupling_with_losses_comes_back_within_a_hundredth(k, q):
    found = peaks(k, q)
    assert found.size == 2
    # the range that is promised: k·Q from 2, k to 0.2, one per cent
    assert float(coupling_from_peaks(*found, q=q).coupling) == pytest.approx(k, rel=0.01)


def test_leaving_the_losses_out_makes_the_coupling_too_small():
    low, high = peaks(0.05, 50)
    assert float(coupling_from_peaks(low, high).coupling) < 0.047


def test_arrays_broadcast():
    found = coil_from_resonances(np.array([7.2e6, 7.3e6]), 3.5e6, added=np.array([[30e-12], [60e-12]]))
    assert found.inductance.shape == found.stray_capacitance.shape == (2, 2)
    assert found.inductance[0, 0] == 2 * found.inductance[1, 0]


@pytest.mark.parametrize(
    ("call", "match"),
    [
        (lambda: coil_from_resonances(3.5e6, 7e6, added=1e-11), "below the resonance alone"),
        (lambda: coil_from_resonances(7e6, 7e6, added=1e-11), "below the resonance alone"),
        (lambda: coil_from_resonances(7e6, 3.5e6, added=0.0), "added must be finite and above 0 F"),
        (lambda: coil_from_resonances(math.nan, 3.5e6, added=1e-11), "alone must be finite"),
        (lambda: resonance_from_half_power(7e6, 7e6), "above the low frequency"),
        (lambda: resonance_from_half_power(-7e6, 7e6), "low must be finite and above 0 Hz"),
        (lambda: q_shared(100.0, 50.0), "below the unloaded Q"),
        (lambda: coupling_from_peaks(7e6, 6e6), "above the low frequency"),
        (lambda: coupling_from_peaks(6e6, 7e6, q=-1), "q must be above 0"),
        (lambda: coupling_from_peaks(6e6, 7e6, q=0.9), "coupling must be below 1"),
    ],
)
def test_what_makes_no_sense_is_refused(call, match):
    with pytest.raises(OutOfRangeError, match=match):
        call()
