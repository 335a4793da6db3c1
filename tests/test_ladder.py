"""The ladder against a scikit-rf cascade, node equations and the laws every passive ladder keeps."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
import skrf
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_circuits import cascade, element_impedance, load_volts, node_solution, seen_impedance

import rfstage.ladder as ladder_module
from rfstage.errors import OutOfRangeError
from rfstage.ladder import Branch, Ladder
from rfstage.load import SeriesLoad

CARRIER = 7e6
HARMONICS = CARRIER * np.arange(1, 17)


def coil(name: str, place: str, value: float, **more: float) -> Branch:
    if "q" in more:
        more = {"q_frequency": CARRIER, **more}
    return Branch(name, place, "coil", value, **more)


def capacitor(name: str, place: str, value: float, **more: float) -> Branch:
    return Branch(name, place, "capacitor", value, **more)


def pi_l(**losses: dict[str, float]) -> tuple[Branch, ...]:
    """A pi-L of unlike parts, each loss by name of the kind."""
    of_coil, of_capacitor = losses.get("coil", {}), losses.get("capacitor", {})
    return (
        capacitor("C1", "shunt", 150e-12, **of_capacitor),
        coil("L1", "series", 4.1e-6, **of_coil),
        capacitor("C2", "shunt", 560e-12, **of_capacitor),
        coil("L2", "series", 2.5e-6, **of_coil),
    )


LADDERS = {
    "lossless": pi_l(),
    "constant Q": pi_l(coil={"q": 150.0}, capacitor={"q": 900.0}),
    "constant resistance": pi_l(coil={"series_resistance": 1.3}, capacitor={"series_resistance": 0.07}),
    "lead inductance": pi_l(capacitor={"lead_inductance": 6e-9, "q": 900.0}),
    "self-capacitance": pi_l(coil={"self_capacitance": 3e-12, "q": 150.0}),
    "all strays": pi_l(
        coil={"self_capacitance": 3e-12, "series_resistance": 0.8},
        capacitor={"lead_inductance": 6e-9, "series_resistance": 0.05},
    ),
    "with feed and resistor": (
        capacitor("Cout", "shunt", 90e-12),
        coil("Lchoke", "shunt", 120e-6, q=100.0),
        capacitor("Cblock", "series", 4e-9, q=1000.0),
        *pi_l(coil={"q": 150.0}),
        Branch("R", "series", "resistor", 3.3, lead_inductance=10e-9),
        Branch("Rp", "shunt", "resistor", 2200.0),
    ),
}


@pytest.mark.parametrize("name", LADDERS)
@pytest.mark.parametrize("load", [50 + 0j, 22 - 35j, 130 + 60j])
def test_impedance_agrees_with_a_scikit_rf_cascade_at_every_harmonic(name, load):
    got = Ladder(LADDERS[name]).impedance(HARMONICS, load)
    np.testing.assert_allclose(got, seen_impedance(LADDERS[name], load, HARMONICS), rtol=1e-12)


@pytest.mark.parametrize("name", LADDERS)
@pytest.mark.parametrize("load", [50 + 0j, 22 - 35j, 130 + 60j])
def test_transimpedance_agrees_with_a_scikit_rf_cascade_at_every_harmonic(name, load):
    got = Ladder(LADDERS[name]).transimpedance(HARMONICS, load)
    np.testing.assert_allclose(got, load_volts(LADDERS[name], load, HARMONICS), rtol=1e-12)


@pytest.mark.parametrize("name", LADDERS)
def test_chain_terms_are_those_of_the_cascade(name):
    got = np.stack(Ladder(LADDERS[name]).chain(HARMONICS), axis=-1)
    expected = cascade(LADDERS[name], HARMONICS).a.reshape(-1, 4)
    # a term may be small where its neighbours are large: against the whole matrix at 50 ohm
    size = np.abs(expected) @ np.array([1, 1 / 50, 50, 1])
    miss = np.abs(got - expected) @ np.array([1, 1 / 50, 50, 1]) / size
    assert miss.max() < 1e-12


def test_lossless_ladder_agrees_with_the_media_elements_of_scikit_rf():
    from skrf.media import DefinedGammaZ0

    grid = skrf.Frequency.from_f(HARMONICS, unit="Hz")
    media = DefinedGammaZ0(frequency=grid, z0=50)
    c1, l1, c2, l2 = (float(branch.value) for branch in LADDERS["lossless"])
    network = media.shunt_capacitor(c1) ** media.inductor(l1) ** media.shunt_capacitor(c2) ** media.inductor(l2)
    s = (network ** media.load(0.0)).s[:, 0, 0]
    np.testing.assert_allclose(Ladder(LADDERS["lossless"]).impedance(HARMONICS, 50), 50 * (1 + s) / (1 - s), rtol=1e-12)


part = st.one_of(
    st.builds(
        lambda place, value, q: coil("L", place, value, q=q),
        st.sampled_from(["series", "shunt"]),
        st.floats(1e-8, 1e-4),
        st.floats(5, 500),
    ),
    st.builds(
        lambda place, value, q, lead: capacitor("C", place, value, q=q, lead_inductance=lead),
        st.sampled_from(["series", "shunt"]),
        st.floats(1e-11, 1e-7),
        st.floats(20, 5000),
        st.sampled_from([0.0, 5e-9]),
    ),
    st.builds(
        lambda place, value, r, c: coil("L", place, value, series_resistance=r, self_capacitance=c),
        st.sampled_from(["series", "shunt"]),
        st.floats(1e-8, 1e-5),
        st.floats(0.05, 5),
        st.sampled_from([0.0, 2e-12]),
    ),
    st.builds(
        lambda place, value: Branch("R", place, "resistor", value),
        st.sampled_from(["series", "shunt"]),
        st.floats(1, 1e4),
    ),
)
ladders = st.lists(part, min_size=1, max_size=7)
loads = st.builds(complex, st.floats(2, 500), st.floats(-300, 300))
frequencies = st.floats(1e6, 1e8)


@settings(deadline=None, max_examples=150)
@given(branches=ladders, load=loads, frequency=frequencies)
def test_random_ladder_agrees_with_a_scikit_rf_cascade(branches, load, frequency):
    got = complex(Ladder(branches).impedance(frequency, load))
    # the cascade works with reflections against 50 ohm: what it loses far from 50 ohm, on the way too, is its own
    elements = np.abs([element_impedance(branch, frequency)[0] for branch in branches])
    spread = max(1.0, *(elements / 50), *(50 / elements), abs(got) / 50, 50 / abs(got))
    assert got == pytest.approx(seen_impedance(branches, load, frequency)[0], rel=1e-13 * max(10.0, spread**2))


@settings(deadline=None, max_examples=100)
@given(branches=ladders, load=loads, frequency=frequencies)
def test_random_ladder_conserves_energy(branches, load, frequency):
    walk = Ladder(branches).walk(frequency, load)
    delivered = abs(walk.transimpedance) ** 2 / 2 * (1 / load).real
    lost = sum(state.loss for state in walk.branches)
    assert walk.impedance.real / 2 == pytest.approx(delivered + lost, rel=1e-9)


@settings(deadline=None, max_examples=100)
@given(branches=ladders, load=loads, frequency=frequencies)
def test_random_passive_ladder_has_no_negative_resistance_and_no_negative_loss(branches, load, frequency):
    walk = Ladder(branches).walk(frequency, load)
    assert walk.impedance.real > 0
    assert all(state.loss >= 0 for state in walk.branches)
    assert abs((walk.impedance - 50) / (walk.impedance + 50)) <= 1


@settings(deadline=None, max_examples=100)
@given(branches=ladders, frequency=frequencies)
def test_random_ladder_is_reciprocal(branches, frequency):
    a, b, c, d = (complex(x) for x in Ladder(branches).chain(frequency))
    assert abs(a * d - b * c - 1) < 1e-12 * max(10.0, abs(a * d), abs(b * c))


@settings(deadline=None, max_examples=60)
@given(branches=ladders, load=loads, frequency=frequencies)
def test_transfer_is_the_same_in_both_directions(branches, load, frequency):
    # reciprocity: with the load as a branch of its own, V at the far end for a current at the near end
    closed = [*branches, Branch("G", "shunt", "resistor", load.real)]
    forward = complex(Ladder(closed).transimpedance(frequency, 1e16))
    backward = complex(Ladder(list(reversed(closed))).transimpedance(frequency, 1e16))
    assert forward == pytest.approx(backward, rel=1e-9)


@settings(deadline=None, max_examples=60)
@given(branches=ladders, load=loads, frequency=frequencies, factor=st.floats(0.05, 20))
def test_scaling_every_impedance_scales_what_the_device_sees(branches, load, frequency, factor):
    def scaled(branch: Branch) -> Branch:
        value = branch.value / factor if branch.kind == "capacitor" else branch.value * factor
        resistance = None if branch.series_resistance is None else branch.series_resistance * factor
        return replace(
            branch,
            value=value,
            series_resistance=resistance,
            lead_inductance=branch.lead_inductance * factor,
            self_capacitance=branch.self_capacitance / factor,
        )

    plain = complex(Ladder(branches).impedance(frequency, load))
    grown = complex(Ladder([scaled(branch) for branch in branches]).impedance(frequency, load * factor))
    assert grown == pytest.approx(plain * factor, rel=1e-9)


@settings(deadline=None, max_examples=60)
@given(branches=ladders, load=loads, frequency=frequencies, factor=st.floats(0.05, 20))
def test_scaling_the_frequency_and_every_reactive_part_changes_nothing(branches, load, frequency, factor):
    def scaled(branch: Branch) -> Branch:
        value = branch.value if branch.kind == "resistor" else branch.value / factor
        at = None if branch.q_frequency is None else branch.q_frequency * factor
        return replace(
            branch,
            value=value,
            q_frequency=at,
            lead_inductance=branch.lead_inductance / factor,
            self_capacitance=branch.self_capacitance / factor,
        )

    plain = complex(Ladder(branches).impedance(frequency, load))
    moved = complex(Ladder([scaled(branch) for branch in branches]).impedance(frequency * factor, load))
    assert moved == pytest.approx(plain, rel=1e-9)


@pytest.mark.parametrize("name", LADDERS)
def test_impedance_follows_from_the_chain_terms(name):
    ladder = Ladder(LADDERS[name])
    a, b, c, d = ladder.chain(HARMONICS)
    np.testing.assert_allclose(
        ladder.impedance(HARMONICS, 22 - 35j), (a * (22 - 35j) + b) / (c * (22 - 35j) + d), rtol=1e-11
    )


@pytest.mark.parametrize("name", LADDERS)
def test_chain_of_an_array_of_frequencies_has_its_shape_in_every_term(name):
    assert {np.shape(term) for term in Ladder(LADDERS[name]).chain(HARMONICS.reshape(4, 4))} == {(4, 4)}


def test_chain_of_no_branches_is_the_identity():
    assert Ladder([]).chain(7e6) == (1, 0, 0, 1)


@pytest.mark.parametrize("name", LADDERS)
def test_current_of_every_branch_agrees_with_the_node_equations(name):
    walk = Ladder(LADDERS[name]).walk(3 * CARRIER, 22 - 35j)
    _, _, through = node_solution(LADDERS[name], 22 - 35j, 3 * CARRIER)
    np.testing.assert_allclose([state.current for state in walk.branches], through, rtol=1e-11)


@pytest.mark.parametrize("name", LADDERS)
def test_loss_of_every_branch_is_half_its_resistance_times_current_squared(name):
    walk = Ladder(LADDERS[name]).walk(CARRIER, 22 - 35j)
    _, _, through = node_solution(LADDERS[name], 22 - 35j, CARRIER)
    for branch, state, current in zip(LADDERS[name], walk.branches, through, strict=True):
        resistance = element_impedance(branch, CARRIER)[0].real
        assert state.loss == pytest.approx(abs(current) ** 2 * resistance / 2, rel=1e-10, abs=1e-12)


def test_walk_states_the_load_impedance_it_used():
    load = SeriesLoad(50 + 20j, CARRIER)
    walk = Ladder(LADDERS["lossless"]).walk(HARMONICS, load)
    np.testing.assert_array_equal(walk.load_impedance, load.impedance(HARMONICS))


def test_transfer_gives_the_same_as_its_two_halves():
    ladder = Ladder(LADDERS["constant Q"])
    z, h = ladder.transfer(HARMONICS, 50)
    np.testing.assert_array_equal(z, ladder.impedance(HARMONICS, 50))
    np.testing.assert_array_equal(h, ladder.transimpedance(HARMONICS, 50))


# --- losses and strays of one branch ---------------------------------------------------------------------


@pytest.mark.parametrize("n", [1, 2, 9])
def test_resistance_of_a_coil_with_a_q_rises_as_the_root_of_frequency(n):
    z = coil("L", "series", 2e-6, q=120.0).impedance(n * CARRIER)
    assert z.real == pytest.approx(2 * math.pi * CARRIER * 2e-6 / 120 * math.sqrt(n), rel=1e-14)


@pytest.mark.parametrize("n", [1, 2, 9])
def test_capacitor_has_the_same_q_at_every_frequency(n):
    z = capacitor("C", "shunt", 100e-12, q=800.0).impedance(n * CARRIER)
    assert -z.imag / z.real == pytest.approx(800.0, rel=1e-14)


@pytest.mark.parametrize("n", [1, 2, 9])
def test_constant_series_resistance_is_the_same_at_every_frequency(n):
    z = coil("L", "series", 2e-6, series_resistance=0.7).impedance(n * CARRIER)
    assert z.real == pytest.approx(0.7, rel=1e-14)


def test_capacitor_with_lead_inductance_is_a_coil_above_its_resonance():
    branch = capacitor("C", "shunt", 1e-9, lead_inductance=5e-9)
    resonance = 1 / (2 * math.pi * math.sqrt(5e-18))
    assert branch.impedance(0.99 * resonance).imag < 0 < branch.impedance(1.01 * resonance).imag


@pytest.mark.parametrize("n", [1.0, 3.0, 10.0])
@pytest.mark.parametrize("name", ["constant Q", "lead inductance", "constant resistance"])
def test_admittance_is_one_over_the_impedance(name, n):
    for branch in LADDERS[name]:
        assert branch.admittance(n * CARRIER) * branch.impedance(n * CARRIER) == pytest.approx(1, rel=1e-14)


def test_coil_with_a_q_and_no_frequency_for_it_is_refused():
    with pytest.raises(OutOfRangeError, match="L9: q_frequency must be given where a coil has a Q; got None"):
        Branch("L9", "series", "coil", 1e-6, q=100.0).impedance(7e6)


@pytest.mark.parametrize("branch", [coil("L", "series", 0.0), Branch("R", "series", "resistor", 0.0)])
def test_series_part_of_nothing_is_no_part(branch):
    assert Ladder([branch]).impedance(CARRIER, 37 + 5j) == 37 + 5j


def test_shunt_capacitor_of_nothing_is_no_part():
    assert Ladder([capacitor("C", "shunt", 0.0)]).impedance(CARRIER, 40 + 0j) == pytest.approx(40, rel=1e-15)


def test_energy_of_a_resonant_coil_and_capacitor_is_equal():
    w0 = 1 / math.sqrt(2e-6 * 470e-12)
    f0 = w0 / (2 * math.pi)
    volts = 10.0
    in_coil = coil("L", "shunt", 2e-6).stored_energy(f0, volts / (1j * w0 * 2e-6))
    in_capacitor = capacitor("C", "shunt", 470e-12).stored_energy(f0, volts * 1j * w0 * 470e-12)
    assert in_coil == pytest.approx(in_capacitor, rel=1e-12)
    assert in_capacitor == pytest.approx(470e-12 * volts**2 / 4, rel=1e-12)


@pytest.mark.parametrize("name", ["all strays", "lead inductance", "self-capacitance"])
def test_stored_energy_with_strays_obeys_the_balance_of_reactive_power(name):
    # SOURCE: Poynting: Im(Z)/2 at 1 A is 2 omega (magnetic minus electric energy); dX/domega gives their sum in
    # a lossless one-port (Foster): W = (dX/domega) |I|^2/4.
    for branch in LADDERS[name]:
        bare = replace(branch, q=None, series_resistance=None)
        step = CARRIER * 1e-5
        slope = (bare.impedance(CARRIER + step).imag - bare.impedance(CARRIER - step).imag) / (4 * math.pi * step)
        assert bare.stored_energy(CARRIER, 0.7 + 0.2j) == pytest.approx(slope * abs(0.7 + 0.2j) ** 2 / 4, rel=1e-8)


# --- published tuned circuits ----------------------------------------------------------------------------


def test_misra_parallel_circuit_has_the_published_qs():
    # SOURCE: D. K. Misra, 2nd ed. (2004), Ex. 5.2, p. 163: 10 uH, 10 pF, Rp = RL = 100 kohm: Q 100, QL 50.
    frequency = 1 / (2 * math.pi * math.sqrt(10e-6 * 10e-12))
    x = 2 * math.pi * frequency * 10e-6
    tank = [coil("L", "shunt", 10e-6), capacitor("C", "shunt", 10e-12), Branch("Rp", "shunt", "resistor", 100e3)]
    unloaded = complex(Ladder(tank[:2]).impedance(frequency, 100e3)).real / x
    loaded = complex(Ladder(tank).impedance(frequency, 100e3)).real / x
    assert unloaded == pytest.approx(100, rel=1e-3)
    assert loaded == pytest.approx(50, rel=1e-3)


def roddy_coil() -> Branch:
    # SOURCE: D. Roddy & J. Coolen, Electronic Communications, Ex. 1.5.1, p. 19: 1 uH, 7 pF, 5 ohm.
    return coil("L", "series", 1e-6, series_resistance=5.0, self_capacitance=7e-12)


def test_roddy_coil_has_the_published_resonance():
    # SOURCE: same example: 60.2 MHz. Above it the coil is a capacitor.
    assert roddy_coil().impedance(60.0e6).imag > 0 > roddy_coil().impedance(60.4e6).imag


def test_roddy_coil_has_the_published_effective_inductance_and_q():
    # SOURCE: same example: at 25 MHz Q 31.4 of the winding, 1.21 uH effective, Q 26.
    z = roddy_coil().impedance(25e6)
    assert z.imag / (2 * math.pi * 25e6) == pytest.approx(1.21e-6, abs=0.0051e-6)
    assert z.imag / z.real == pytest.approx(26, abs=0.5)
    assert 2 * math.pi * 25e6 * 1e-6 / 5 == pytest.approx(31.4, abs=0.051)


@pytest.mark.parametrize(
    ("henry", "farad", "hertz"),
    [
        # SOURCE: US amateur Extra question pool 2024-2028 (NCVEC), E5A02 and E5A10.
        (50e-6, 40e-12, 3.56e6),
        (50e-6, 10e-12, 7.12e6),
        # SOURCE: A. Malvino & D. Bates, Electronic Principles, 7th ed., Ex. 12-11, p. 405.
        (2e-6, 470e-12, 5.19e6),
    ],
)
def test_published_resonant_circuits_have_their_peak_at_the_published_frequency(henry, farad, hertz):
    around = np.linspace(0.99 * hertz, 1.01 * hertz, 4001)
    level = np.abs(Ladder([coil("L", "shunt", henry), capacitor("C", "shunt", farad)]).impedance(around, 1e6))
    assert around[np.argmax(level)] == pytest.approx(hertz, abs=0.0051e6)


@pytest.mark.parametrize(
    ("arms", "decibels"),
    [
        # SOURCE: D. Roddy & J. Coolen, Ex. 1.2.2 and 1.2.3: 6 dB pads of 50 ohm (T shunt 66.93, pi series 37.35
        # recomputed); Ex. 1.2.4 and D. K. Misra Ex. 6.5: 75/50 ohm minimum-loss pad, 5.72 dB recomputed.
        ((("series", 16.61), ("shunt", 66.93), ("series", 16.61)), 6.0),
        ((("shunt", 150.5), ("series", 37.35), ("shunt", 150.5)), 6.0),
        ((("series", 43.3), ("shunt", 86.6)), 5.72),
    ],
)
def test_published_pads_lose_the_published_decibels(arms, decibels):
    source = 75.0 if len(arms) == 2 else 50.0
    pad = Ladder([Branch("R", place, "resistor", value) for place, value in arms])
    a, b, c, d = (complex(x) for x in pad.chain(1e6))
    gain = 4 * source * 50 / abs(a * 50 + b + c * 50 * source + d * source) ** 2
    assert -10 * math.log10(gain) == pytest.approx(decibels, abs=0.0051)
    assert complex(pad.impedance(1e6, 50)).real == pytest.approx(source, rel=1e-3)


@pytest.mark.parametrize(
    ("values", "kinds"),
    # SOURCE: D. K. Misra, Ex. 9.6, p. 361: Butterworth n = 3, 10 MHz, 50 ohm.
    [((795.8e-9, 636.6e-12, 795.8e-9), "LCL"), ((318.3e-12, 1.5915e-6, 318.3e-12), "CLC")],
)
def test_published_butterworth_filter_is_3_db_down_at_its_corner(values, kinds):
    parts = [
        coil("L", "series", v) if kind == "L" else capacitor("C", "shunt", v)
        for v, kind in zip(values, kinds, strict=True)
    ]
    a, b, c, d = (complex(x) for x in Ladder(parts).chain(10e6))
    gain = 4 * 50 * 50 / abs(a * 50 + b + c * 50 * 50 + d * 50) ** 2
    assert 10 * math.log10(gain) == pytest.approx(-3.0103, abs=1e-3)


# --- samples and blocks ----------------------------------------------------------------------------------


def sampled_pi_l(samples: int) -> tuple[Branch, ...]:
    rng = np.random.default_rng(7)
    spread = 1 + 0.05 * rng.standard_normal((6, samples))
    c1, l1, c2, l2 = LADDERS["constant Q"]
    return (
        replace(c1, value=150e-12 * spread[0], q=900 * spread[4]),
        replace(l1, value=4.1e-6 * spread[1]),
        replace(c2, value=560e-12 * spread[2], lead_inductance=4e-9 * spread[5]),
        replace(l2, value=2.5e-6 * spread[3], self_capacitance=2e-12 * spread[4]),
    )


def one_sample(branches: tuple[Branch, ...], index: int) -> list[Branch]:
    names = ("value", "q", "series_resistance", "lead_inductance", "self_capacitance")
    return [
        replace(b, **{n: float(a[index]) for n in names if isinstance(a := getattr(b, n), np.ndarray)})
        for b in branches
    ]


@pytest.mark.parametrize("samples", [3, 40, 2000])
def test_samples_give_what_each_gives_alone(samples):
    branches = sampled_pi_l(samples)
    together = Ladder(branches).walk(HARMONICS, 50)
    for index in range(0, samples, max(1, samples // 5)):
        alone = Ladder(one_sample(branches, index)).walk(HARMONICS, 50)
        np.testing.assert_allclose(together.impedance[index], alone.impedance, rtol=1e-14)
        np.testing.assert_allclose(together.transimpedance[index], alone.transimpedance, rtol=1e-14)
        for whole, single in zip(together.branches, alone.branches, strict=True):
            np.testing.assert_allclose(whole.current[index], single.current, rtol=1e-14)
            np.testing.assert_allclose(whole.loss[index], single.loss, rtol=1e-13, atol=1e-18)


@pytest.mark.parametrize("frequency", [CARRIER, HARMONICS, HARMONICS.reshape(2, 8)], ids=["one", "row", "table"])
def test_result_has_the_sample_axes_first_and_the_frequency_axes_last(frequency):
    shape = np.shape(frequency)
    walk = Ladder(sampled_pi_l(5)).walk(frequency, 50)
    arrays = (walk.impedance, walk.transimpedance, *(state.loss for state in walk.branches))
    assert {np.shape(a)[:1] for a in arrays if np.ndim(a)} >= {(5,)}
    assert np.shape(walk.impedance) == (5, *shape)


def test_sample_axes_of_the_parts_broadcast_against_each_other():
    c1, l1, c2, l2 = LADDERS["constant Q"]
    rows, columns = np.linspace(100e-12, 200e-12, 4).reshape(4, 1), np.linspace(400e-12, 600e-12, 3)
    z = Ladder([replace(c1, value=rows), l1, replace(c2, value=columns), l2]).impedance(HARMONICS, 50)
    alone = Ladder([replace(c1, value=float(rows[2, 0])), l1, replace(c2, value=float(columns[1])), l2])
    assert z.shape == (4, 3, 16)
    np.testing.assert_allclose(z[2, 1], alone.impedance(HARMONICS, 50), rtol=1e-14)


@pytest.mark.parametrize("method", ["impedance", "transimpedance", "walk"])
@pytest.mark.parametrize("shape", [(1000,), (20, 50)])
def test_blocks_give_the_same_bits_as_one_pass(method, shape, monkeypatch):
    branches = tuple(
        replace(
            b,
            **{
                n: a.reshape(shape)
                for n in ("value", "q", "lead_inductance", "self_capacitance")
                if isinstance(a := getattr(b, n), np.ndarray)
            },
        )
        for b in sampled_pi_l(1000)
    )
    results = []
    for elements in (10**9, 100 * HARMONICS.size + 5):
        monkeypatch.setattr(ladder_module, "BLOCK_ELEMENTS", elements)
        got = getattr(Ladder(branches), method)(HARMONICS, 50)
        if method == "walk":
            states = [np.broadcast_to(a, got.impedance.shape) for state in got.branches for a in state]
            got = [got.impedance, got.transimpedance, *states]
        results.append(np.asarray(got))
    np.testing.assert_array_equal(results[0], results[1])


def test_load_with_a_value_for_every_sample_is_taken_apart_with_its_samples(monkeypatch):
    branches = sampled_pi_l(30)
    load = (np.linspace(20, 80, 30).reshape(30, 1) + 5j) * np.ones(HARMONICS.size)
    whole = Ladder(branches).impedance(HARMONICS, load)
    monkeypatch.setattr(ladder_module, "BLOCK_ELEMENTS", 64)
    np.testing.assert_array_equal(Ladder(branches).impedance(HARMONICS, load), whole)
    np.testing.assert_allclose(whole[7], Ladder(one_sample(branches, 7)).impedance(HARMONICS, load[7]), rtol=1e-14)


def test_one_frequency_as_a_number_and_as_an_array_give_the_same():
    ladder = Ladder(LADDERS["all strays"])
    assert ladder.impedance(CARRIER, 22 - 35j) == pytest.approx(
        complex(ladder.impedance(np.array([CARRIER]), 22 - 35j)[0]), rel=1e-15
    )


def test_load_may_be_a_load_over_frequency():
    load = SeriesLoad(30 - 40j, CARRIER)
    ladder = Ladder(LADDERS["constant Q"])
    np.testing.assert_array_equal(
        ladder.impedance(HARMONICS, load), ladder.impedance(HARMONICS, load.impedance(HARMONICS))
    )


def test_evaluation_leaves_its_inputs_as_they_were():
    branches = sampled_pi_l(50)
    before = [np.copy(branch.value) for branch in branches]
    Ladder(branches).walk(HARMONICS, 50)
    for branch, value in zip(branches, before, strict=True):
        np.testing.assert_array_equal(branch.value, value)


def test_more_samples_than_a_block_with_a_plain_frequency_and_load():
    many = Branch("C1", "shunt", "capacitor", np.full(9000, 1e-9))
    one = complex(Ladder([replace(many, value=1e-9)]).impedance(7.1e6, 50.0))
    z = Ladder([many]).impedance(7.1e6, 50.0)
    assert z.shape == (9000,)
    assert np.all(np.abs(z - one) <= 1e-14 * abs(one))
