"""Traps, coupled pairs and transformers: node equations, scikit-rf, the steady state, files and pages."""

from __future__ import annotations

import io
import json
import math
from dataclasses import replace

import numpy as np
import pytest
import skrf
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_circuits import Reading, cascade, load_volts, seen_impedance, solve_nodes

import rfstage.ladder as ladder_module
from rfstage import Job, design
from rfstage.designs.judging import supply_reaches_load
from rfstage.device import Device, ReverseConduction
from rfstage.errors import ImpossibleError, InputError, OutOfRangeError
from rfstage.files.records import json_text, tank_record
from rfstage.files.stage import load_stage
from rfstage.files.stagetext import rounded, stage_text
from rfstage.files.touchstone import touchstone_text
from rfstage.harmonics import harmonics
from rfstage.kinds import KEYS, stands
from rfstage.ladder import SAMPLED, Branch, Ladder
from rfstage.load import SeriesLoad
from rfstage.matching.tank import PartStress, describe
from rfstage.report.circuit import circuit
from rfstage.report.page import Look
from rfstage.report.settled import settled_page
from rfstage.stage import Drive, PartData, Stage, Supply
from rfstage.stagevalues import fitted_value, paths, unit_of, with_value
from rfstage.steady import settle, settle_many
from rfstage.steady.pair import half_between
from rfstage.sweep import sweep

CARRIER = 7e6
HARMONICS = CARRIER * np.arange(1, 17)


def trap(place: str, henry: float, farad: float, **more: float) -> Branch:
    return Branch("F", place, "trap", henry, second=farad, q_frequency=CARRIER, **more)


def pair(near: float, far: float, coupling: float, tap: str = "", **more: float) -> Branch:
    return Branch("M", "through", "coupled", near, second=far, coupling=coupling, tap=tap, q_frequency=CARRIER, **more)


def transformer(ratio: float, magnetizing: float, leakage: float, **more: float) -> Branch:
    return Branch(
        "T",
        "through",
        "transformer",
        ratio,
        second=magnetizing,
        lead_inductance=leakage,
        q_frequency=CARRIER,
        **more,
    )


C1, C2 = Branch("C1", "shunt", "capacitor", 470e-12, q=900.0), Branch("C2", "series", "capacitor", 220e-12, q=700.0)
LADDERS = {
    "series trap": (C1, trap("series", 380e-9, 130e-12, q=140.0, second_q=800.0), C1),
    "shunt trap": (
        Branch("L", "series", "coil", 1.1e-6, q=150.0, q_frequency=CARRIER),
        trap("shunt", 210e-9, 560e-12, second_q=800.0, series_resistance=0.3, lead_inductance=4e-9),
        C2,
    ),
    "lossless trap": (C1, trap("series", 380e-9, 130e-12), C2),
    "link": (C1, pair(1.3e-6, 0.4e-6, 0.27, q=180.0, second_q=120.0), C2),
    "lossless link": (C1, pair(1.3e-6, 0.4e-6, 0.27), C2),
    "load at the tap": (C1, pair(2.1e-6, 0.5e-6, 0.35, "load", q=180.0, second_q=120.0), C1),
    "device at the tap": (C1, pair(2.1e-6, 0.5e-6, 0.35, "device", q=180.0, second_q=120.0), C2),
    "step-up transformer": (C2, transformer(0.32, 3e-6, 40e-9, second_q=30.0, series_resistance=0.02), C1),
    "step-down transformer": (transformer(3.0, 20e-6, 90e-9), trap("shunt", 210e-9, 560e-12), C1),
    "all together": (
        C2,
        transformer(0.5, 4e-6, 30e-9, second_q=40.0),
        C1,
        pair(1.3e-6, 0.4e-6, 0.27, q=180.0, second_q=120.0),
        trap("series", 380e-9, 130e-12, q=140.0),
        pair(0.9e-6, 0.5e-6, 0.6, "load", q=90.0),
        trap("shunt", 90e-9, 120e-12, second_q=500.0),
    ),
}
EVERY = pytest.mark.parametrize("name", LADDERS)

# --- the ladder --------------------------------------------------------------------------------------------


@EVERY
@pytest.mark.parametrize("load", [50 + 0j, 22 - 35j, 130 + 60j])
def test_impedance_and_transfer_agree_with_a_scikit_rf_cascade_at_every_harmonic(name, load):
    z, h = Ladder(LADDERS[name]).transfer(HARMONICS, load)
    np.testing.assert_allclose(z, seen_impedance(LADDERS[name], load, HARMONICS), rtol=1e-10)
    np.testing.assert_allclose(h, load_volts(LADDERS[name], load, HARMONICS), rtol=1e-10)


def close(got: complex, wanted: complex) -> bool:
    return abs(got - wanted) <= 1e-10 * abs(wanted)


def agrees(branches: list[Branch], load: complex, frequency: float) -> None:
    """Hold the walk against the node equations: impedance, transfer, and every branch's figures."""
    walk = Ladder(branches).walk(frequency, load)
    volts, readings = solve_nodes(branches, load, frequency)
    assert close(walk.impedance, volts[0])
    assert close(walk.transimpedance, volts[-1])
    lost = 0.0
    for branch, state, reading in zip(branches, walk.branches, readings, strict=True):
        assert close(state.current, reading.current)
        voltage = state.current * state.drop(branch, frequency)
        # a series trap's voltage is the small difference of two nodes' in the node equations
        assert abs(voltage - reading.across) <= 1e-10 * max(abs(reading.across), 1e-3 * abs(volts).max())
        assert abs(state.loss - reading.loss) <= 1e-10 * volts[0].real / 2
        lost += state.loss
        if branch.place == "through":
            far_voltage, far_current = branch.ports(frequency).outwards(voltage, state.current)
            assert close(far_voltage, reading.far_voltage)
            assert close(far_current, reading.far_current)
    delivered = abs(walk.transimpedance) ** 2 / 2 * (1 / load).real
    assert walk.impedance.real / 2 == pytest.approx(delivered + lost, rel=1e-10)


@EVERY
@pytest.mark.parametrize("order", [1, 2, 5])
def test_currents_voltages_and_losses_agree_with_the_node_equations(name, order):
    agrees(LADDERS[name], 22 - 35j, order * CARRIER)


places = st.sampled_from(["series", "shunt"])
some_q = st.one_of(st.none(), st.floats(10, 500))
traps = st.builds(
    lambda place, henry, farad, q, other: trap(place, henry, farad, q=q, second_q=other),
    places,
    st.floats(3e-8, 3e-6),
    st.floats(1e-11, 1e-9),
    st.floats(10, 500),
    some_q,
)
strayed = st.builds(
    lambda henry, farad, r, lead: trap("shunt", henry, farad, series_resistance=r, lead_inductance=lead),
    st.floats(3e-8, 3e-6),
    st.floats(1e-11, 1e-9),
    st.floats(0.05, 5),
    st.floats(0, 2e-8),
)
pairs = st.builds(
    lambda near, far, k, tap, q, other: pair(near, far, k, tap, q=q, second_q=other),
    st.floats(1e-7, 5e-6),
    st.floats(1e-7, 5e-6),
    st.floats(0.05, 0.95),
    st.sampled_from(["", "load", "device"]),
    some_q,
    some_q,
)
transformers = st.builds(
    lambda ratio, henry, leak, r, q: transformer(ratio, henry, leak, series_resistance=r, second_q=q),
    st.floats(0.2, 5),
    st.floats(1e-6, 5e-5),
    st.floats(0, 2e-7),
    st.one_of(st.none(), st.floats(0.001, 1)),
    some_q,
)
plain = st.one_of(
    st.builds(
        lambda p, v, q: Branch("L", p, "coil", v, q=q, q_frequency=CARRIER), places, st.floats(1e-7, 5e-6), some_q
    ),
    st.builds(lambda p, v, q: Branch("C", p, "capacitor", v, q=q), places, st.floats(2e-11, 5e-9), some_q),
)
new = st.one_of(traps, strayed, pairs, transformers)
ladders = st.lists(st.one_of(new, plain), min_size=1, max_size=6)
loads = st.builds(complex, st.floats(5, 200), st.floats(-100, 100))
frequencies = st.floats(2e6, 6e7)


@settings(deadline=None, max_examples=250)
@given(branches=ladders, load=loads, frequency=frequencies)
def test_random_ladder_agrees_with_the_node_equations(branches, load, frequency):
    agrees(branches, load, frequency)


@settings(deadline=None, max_examples=100)
@given(branches=ladders, load=loads, frequency=frequencies)
def test_random_passive_ladder_has_no_negative_resistance_and_no_negative_loss(branches, load, frequency):
    walk = Ladder(branches).walk(frequency, load)
    assert walk.impedance.real > 0
    # of windings without loss nothing is left but the digits of the walk
    assert all(state.loss >= -1e-13 * walk.impedance.real for state in walk.branches)


@settings(deadline=None, max_examples=100)
@given(branches=ladders, frequency=frequencies)
def test_random_ladder_is_reciprocal(branches, frequency):
    a, b, c, d = (complex(x) for x in Ladder(branches).chain(frequency))
    assert abs(a * d - b * c - 1) < 1e-12 * max(10.0, abs(a * d), abs(b * c))


def scaled(branch: Branch, impedance: float, frequency: float) -> Branch:
    """Return the branch for impedances and frequencies so many times as high."""
    henry, farad = impedance / frequency, 1 / (impedance * frequency)
    unit = {key.attribute: key.unit for key in KEYS[branch.kind]}
    by = {"H": henry, "F": farad, "ohm": impedance, "": 1.0}
    resistance = branch.series_resistance
    return replace(
        branch,
        value=branch.value * by[unit["value"]],
        second=branch.second * by[unit.get("second", "")],
        lead_inductance=branch.lead_inductance * henry,
        series_resistance=None if resistance is None else resistance * impedance,
        q_frequency=None if branch.q_frequency is None else branch.q_frequency * frequency,
    )


@settings(deadline=None, max_examples=60)
@given(branches=ladders, load=loads, frequency=frequencies, factor=st.floats(0.1, 10), times=st.floats(0.1, 10))
def test_scaling_impedance_and_frequency_scales_what_the_device_sees(branches, load, frequency, factor, times):
    once = complex(Ladder(branches).impedance(frequency, load))
    grown = Ladder([scaled(branch, factor, times) for branch in branches])
    assert complex(grown.impedance(frequency * times, load * factor)) == pytest.approx(once * factor, rel=1e-9)


@settings(deadline=None, max_examples=100)
@given(branch=new, load=loads, frequency=frequencies)
def test_stored_energy_of_each_kind_is_that_of_its_elements_currents(branch, load, frequency):
    branches = [C1, branch]
    state = Ladder(branches).walk(frequency, load).branches[-1]
    reading = solve_nodes(branches, load, frequency)[1][-1]
    seen = None if state.seen is None else complex(state.seen)
    got = branch.stored_energy(frequency, complex(state.current), seen)
    # what a pair with a coupling near 1 holds is a difference of terms up to 1/(1 - k²) times as large
    assert got == pytest.approx(reading.energy, rel=1e-9)


def test_tightly_coupled_tapped_coil_is_a_transformer_by_the_roots_of_its_inductances():
    # SOURCE: the ideal autotransformer: turns go as the roots of inductances wound on one core
    tapped = pair(9e-3, 4e-3, 1 - 1e-9, "load")
    turns = (math.sqrt(9e-3) + math.sqrt(4e-3)) / math.sqrt(4e-3)
    assert complex(Ladder([tapped]).impedance(CARRIER, 50)) == pytest.approx(50 * turns**2, rel=1e-3)


def test_transformer_without_leakage_and_with_an_endless_core_turns_by_the_square_of_its_ratio():
    assert complex(Ladder([transformer(3.0, 1.0, 0.0)]).impedance(CARRIER, 50)) == pytest.approx(450, rel=1e-4)


@EVERY
@pytest.mark.parametrize("elements", [10**9, 500])
def test_samples_give_what_each_gives_alone(name, elements, monkeypatch):
    monkeypatch.setattr(ladder_module, "BLOCK_ELEMENTS", elements)
    random = np.random.default_rng(3)

    def spread(branch: Branch) -> Branch:
        numbers = {n: getattr(branch, n) for n in SAMPLED if getattr(branch, n)}
        return replace(branch, **{n: v * (1 + 0.05 * random.uniform(-1, 1, 60)) for n, v in numbers.items()})

    branches = [spread(branch) for branch in LADDERS[name]]
    together = Ladder(branches).walk(HARMONICS, 22 - 35j)
    for k in (0, 31, 59):
        own = [
            replace(b, **{n: float(a[k]) for n in SAMPLED if isinstance(a := getattr(b, n), np.ndarray)})
            for b in branches
        ]
        alone = Ladder(own).walk(HARMONICS, 22 - 35j)
        np.testing.assert_allclose(together.impedance[k], alone.impedance, rtol=1e-12)
        np.testing.assert_allclose(together.transimpedance[k], alone.transimpedance, rtol=1e-12)
        for whole, single in zip(together.branches, alone.branches, strict=True):
            np.testing.assert_allclose(whole.current[k], single.current, rtol=1e-12)
            np.testing.assert_allclose(whole.loss[k], single.loss, rtol=1e-9, atol=1e-12)
            if single.seen is not None:
                np.testing.assert_allclose(whole.seen[k], single.seen, rtol=1e-12)


# --- the steady state --------------------------------------------------------------------------------------

DEVICE = Device(
    family="fet",
    transfer_factor=2.0,
    exponent=1.0,
    threshold=3.0,
    threshold_softness=0.02,
    knee_voltage=0.2,
    knee_resistance=0.1,
    output_capacitance=200e-12,
    reverse_conduction=ReverseConduction(conductance=2.0, threshold=0.7, softness=0.05),
)
BLOCKING = Branch("Cblock", "series", "capacitor", 47e-9, q=1000.0)


def stage(*branches: Branch, load: complex = 50 + 0j, **more: object) -> Stage:
    """A 28 V stage of 7 MHz with these branches, each by a name of its own."""
    named = tuple(replace(b, name=b.name if b.name == "Cblock" else f"X{k}") for k, b in enumerate(branches))
    device = replace(DEVICE, **more)
    return Stage(
        carrier=CARRIER,
        device=device,
        drive=Drive(bias=2.6, amplitude=2.2),
        supply=Supply(voltage=28.0, choke=3e-6, choke_resistance=0.05),
        branches=named,
        load=SeriesLoad(load, CARRIER),
    )


STAGES = {
    "link": stage(
        BLOCKING,
        Branch("C1", "shunt", "capacitor", 1.4e-9, q=1000.0),
        pair(330e-9, 600e-9, 0.32, q=150.0, second_q=120.0),
        Branch("C2", "series", "capacitor", 860e-12, q=1000.0),
    ),
    "tapped": stage(BLOCKING, C1, pair(500e-9, 900e-9, 0.4, "load", q=150.0, second_q=150.0)),
    "transformer and filter": stage(
        BLOCKING,
        transformer(0.5, 3e-6, 15e-9, second_q=25.0, series_resistance=0.02),
        C1,
        trap("series", 590e-9, 150e-12, q=150.0, second_q=900.0),
        trap("shunt", 60e-9, 210e-12, q=120.0),
    ),
    "trap first": stage(
        trap("shunt", 120e-9, 470e-12, q=150.0, second_q=900.0),
        trap("series", 200e-9, 130e-12, q=150.0),
        BLOCKING,
        C1,
    ),
}
SETTLED = pytest.mark.parametrize("name", STAGES)


@SETTLED
def test_settled_stresses_and_losses_are_those_of_the_node_equations(name):
    of = STAGES[name]
    state = settle(of, orders=24)
    assert abs(state.balance_error) < 1e-9
    branches = of.ladder.branches
    currents = -state.device_current[1:]
    table: list[list[Reading]] = []
    for order in range(1, 25):
        load = complex(of.load.impedance(order * CARRIER))
        table.append(solve_nodes(branches, load, order * CARRIER)[1])
    fed = len(of.feed)
    block = next(k for k, b in enumerate(branches) if b.name == "Cblock")
    for k in range(fed, len(branches)):
        got = state.branches[k]
        i = np.array([row[k].current for row in table]) * currents
        v = np.array([row[k].across for row in table]) * currents
        loss = sum(row[k].loss * abs(c) ** 2 for row, c in zip(table, currents, strict=True))
        assert got.loss == pytest.approx(loss, rel=1e-9, abs=1e-12)
        assert got.rms_current == pytest.approx(math.sqrt((abs(i) ** 2).sum() / 2), rel=1e-9)
        held = of.supply.voltage - of.supply.choke_resistance * state.dc_current
        dc = held if k <= block and (k == block or branches[k].place == "shunt") else 0.0
        wave = np.fft.irfft(np.concatenate(([dc], v / 2)), 256, norm="forward")
        assert got.peak_voltage == pytest.approx(np.abs(wave).max(), rel=1e-6)


def test_behind_a_through_branch_there_is_no_direct_current():
    wanted = STAGES["link"]
    with pytest.raises(ImpossibleError, match="put a blocking capacitor in series before the first coil to ground"):
        settle(replace(wanted, branches=wanted.branches[1:]))
    # the capacitor behind the link blocks nothing: the first winding is what conducts
    with pytest.raises(ImpossibleError, match="blocking capacitor"):
        settle(replace(wanted, branches=(*wanted.branches[2:], BLOCKING)))
    with pytest.raises(ImpossibleError, match="blocking capacitor"):
        settle(replace(STAGES["trap first"], branches=(STAGES["trap first"].branches[1], C1)))


@pytest.mark.parametrize("path", ["X2.coupling", "X2", "X2.secondary", "X2.secondary_q", "X2.q", "X3"])
def test_a_sweep_over_a_pair_gives_each_point_what_it_gets_alone(path):
    of = STAGES["link"]
    now = fitted_value(of, path)
    assert now is not None
    several = [with_value(of, path, now * factor) for factor in (0.9, 1.0, 1.05)]
    for alone, together in zip(several, settle_many(several, orders=16), strict=True):
        single = settle(alone, orders=16)
        assert together.output_power == pytest.approx(single.output_power, rel=1e-9)
        assert together.branch_losses == pytest.approx(single.branch_losses, rel=1e-8)
        for one, other in zip(together.branches, single.branches, strict=True):
            assert one[1:] == pytest.approx(other[1:], rel=1e-8, abs=1e-12)


def test_stages_with_the_tap_at_different_ends_are_not_taken_for_one_build():
    first = STAGES["tapped"]
    other = replace(first, branches=(*first.branches[:2], replace(first.branches[2], tap="device")))
    for alone, together in zip((first, other), settle_many([first, other], orders=16), strict=True):
        assert together.output_power == pytest.approx(settle(alone, orders=16).output_power, rel=1e-9)


@SETTLED
def test_each_device_of_a_push_pull_pair_sees_half_of_what_stands_between(name):
    of = stage(*STAGES[name].branches, pair="push-pull")
    between = Ladder(of.branches).impedance(HARMONICS, of.load)
    half = half_between(of)
    got = Ladder(half.branches).impedance(HARMONICS, half.load)
    np.testing.assert_allclose(got, between / 2, rtol=1e-12)


@pytest.mark.parametrize("imbalance", [0.0, 0.3])
@pytest.mark.parametrize("kind", ["push-pull", "parallel"])
@SETTLED
def test_the_power_of_a_pair_is_found_again_in_load_devices_and_branches(name, kind, imbalance):
    of = stage(*STAGES[name].branches, pair=kind, imbalance=imbalance)
    state = settle(of, orders=16)
    assert abs(state.balance_error) < 1e-9
    assert state.output_power > 0
    assert state.branch_losses["X1"] > 0


# --- harmonics, the failed blocking capacitor --------------------------------------------------------------


def test_a_lead_moves_the_trap_across_the_load_as_it_moves_a_capacitor():
    low_pass = (
        Branch("L1", "series", "coil", 1e-6),
        trap("shunt", 20e-9, 1 / ((2 * math.pi * 3 * CARRIER) ** 2 * 20e-9)),
    )
    found = harmonics(
        Ladder(low_pass),
        load=SeriesLoad(50 + 0j, CARRIER),
        line=SeriesLoad(50 + 0j, CARRIER),
        carrier=CARRIER,
        coefficients=np.array([0.3, 0.4, 0.3, 0.2, 0.1, 0.05]),
        peak_current=1.0,
        highest_order=4,
        output_power=1.0,
        limit=None,
    )
    assert [h.order for h in found if h.strays_decide] == [3, 4]  # 5 nH in 20 nH


@pytest.mark.parametrize(
    ("branches", "reaches"),
    [
        ([BLOCKING, pair(1e-6, 1e-6, 0.3)], False),
        ([BLOCKING, transformer(2.0, 1e-5, 0.0)], False),
        ([BLOCKING, trap("series", 1e-7, 1e-10), trap("shunt", 1e-7, 1e-10)], True),
        ([BLOCKING, Branch("R", "shunt", "resistor", 1e3)], True),
    ],
    ids=["a winding", "a transformer", "traps", "a resistor"],
)
def test_what_keeps_the_supply_from_the_load_when_the_blocking_capacitor_fails(branches, reaches):
    assert supply_reaches_load(branches) is reaches


# --- paths -------------------------------------------------------------------------------------------------

EACH = stage(
    BLOCKING,
    trap("shunt", 120e-9, 33e-12, second_q=900.0, series_resistance=0.2, lead_inductance=3e-9),
    trap("series", 120e-9, 33e-12, q=150.0, second_q=800.0),
    pair(3.1e-6, 0.4e-6, 0.3, q=150.0, second_q=120.0),
    pair(3.1e-6, 0.4e-6, 0.3, "load", q=150.0),
    pair(3.1e-6, 0.4e-6, 0.3, "device"),
    transformer(3.0, 20e-6, 90e-9, second_q=25.0, series_resistance=0.05),
    transformer(1 / 3, 20e-6, 0.0),
)


def test_every_number_of_each_kind_has_a_path_and_its_name_alone_is_the_first():
    known = {path: unit for path, unit in paths(EACH).items() if path.startswith("X")}
    assert {p: u for p, u in known.items() if p.startswith("X1")} == {
        "X1": "H",
        "X1.inductance": "H",
        "X1.capacitance": "F",
        "X1.capacitor_q": "",
        "X1.series_resistance": "ohm",
        "X1.lead_inductance": "H",
    }
    assert {p for p in known if p.startswith("X2")} == {
        "X2",
        "X2.inductance",
        "X2.capacitance",
        "X2.capacitor_q",
        "X2.q",
    }
    assert {p for p in known if p.startswith("X4")} == {"X4", "X4.primary", "X4.secondary", "X4.coupling", "X4.q"}
    assert {p: u for p, u in known.items() if p.startswith("X6")} == {
        "X6": "",
        "X6.ratio": "",
        "X6.magnetizing": "H",
        "X6.leakage": "H",
        "X6.core_q": "",
        "X6.series_resistance": "ohm",
    }
    for path in known:
        value = fitted_value(EACH, path)
        assert value is not None
        other = 1.01 * value or 1e-9
        changed = with_value(EACH, path, other)
        assert fitted_value(changed, path) == other
        alone = path if "." in path else f"{path}.{KEYS[next(b.kind for b in EACH.branches if b.name == path)][0].name}"
        assert fitted_value(changed, alone) == other


def test_a_coupling_of_one_is_refused_in_a_sweep():
    with pytest.raises(OutOfRangeError, match=r"X3\.coupling must be above 0 and below 1; got 1\.1"):
        sweep(EACH, "X3.coupling", [0.2, 1.1])
    with pytest.raises(InputError, match=r"did you mean 'X3\.coupling'"):
        unit_of(EACH, "X3.couplin")


# --- stage files -------------------------------------------------------------------------------------------


def test_each_kind_reads_back_as_it_was_written(tmp_path):
    of = replace(EACH, part_data={"X3": PartData(None, 5.0, (("turns", 12.0),))})
    path = tmp_path / "stage.toml"
    text = stage_text(of, tmp_path)
    path.write_text(text, encoding="utf-8")
    again = load_stage(path)
    assert again.branches == tuple(replace(b, q_frequency=CARRIER) for b in rounded(of).branches)
    assert again.part_data["X3"] == of.part_data["X3"]
    assert stage_text(again, tmp_path) == text
    for line in ('capacitance = "33 pF"', "coupling = 0.3", 'tap = "load"', "core_q = 25.0", "ratio = 3.0"):
        assert line in text


@settings(deadline=None, max_examples=60)
@given(branches=st.lists(st.one_of(new, plain), min_size=1, max_size=5))
def test_random_branches_read_back_as_they_were_written(tmp_path_factory, branches):
    folder = tmp_path_factory.mktemp("kinds")
    of = rounded(stage(*(replace(b, q_frequency=CARRIER) for b in branches)))
    (folder / "stage.toml").write_text(stage_text(of, folder), encoding="utf-8")
    assert load_stage(folder / "stage.toml").branches == of.branches


HEAD = """
carrier = "7 MHz"
[device]
family = "fet"
transfer_factor = 2.0
threshold = "3 V"
knee_voltage = "0.2 V"
[drive]
bias = "2.6 V"
amplitude = "2 V"
[supply]
voltage = "28 V"
choke = "3 uH"
[load]
impedance = "50 ohm"
[[branch]]
name = "X1"
"""
TRAP = 'place = "series"\nkind = "trap"\ninductance = "120 nH"\ncapacitance = "33 pF"\n'
LINK = 'place = "through"\nkind = "coupled"\nprimary = "3.1 uH"\nsecondary = "0.4 uH"\ncoupling = 0.3\n'
TURNS = 'place = "through"\nkind = "transformer"\nratio = 3\nmagnetizing = "20 uH"\n'


def read(folder, branch):
    (folder / "stage.toml").write_text(HEAD + branch, encoding="utf-8")
    return load_stage(folder / "stage.toml").branches[0]


def test_a_lossless_q_of_any_part_is_none(tmp_path):
    found = read(tmp_path, LINK + 'q = "lossless"\nsecondary_q = "lossless"\n')
    assert (found.q, found.second_q) == (None, None)
    assert read(tmp_path, TURNS + 'leakage = "0 H"\n').lead_inductance == 0.0


@pytest.mark.parametrize(
    ("branch", "said"),
    [
        (TRAP.replace("series", "through"), "place: got 'through' for kind trap; allowed series | shunt"),
        (LINK.replace("through", "shunt"), "place: got 'shunt' for kind coupled; allowed through"),
        (TURNS.replace("through", "series"), "place: got 'series' for kind transformer; allowed through"),
        (TRAP.replace("trap", "traps"), "kind: got 'traps'; allowed capacitor | coil | resistor | trap"),
        (LINK.replace("0.3", "1"), "coupling: got 1; allowed above 0 and below 1"),
        (LINK.replace("0.3", "0"), "coupling: got 0; allowed above 0 and below 1"),
        (LINK.replace("0.3", "-0.2"), "coupling: got -0.2; allowed above 0 and below 1"),
        (LINK.replace("0.3", '"nan"'), "coupling: read 'nan'"),
        (LINK.replace("0.3", "true"), "coupling: got true; wanted a number above 0 and below 1"),
        (LINK.replace("coupling = 0.3\n", ""), "coupling: missing"),
        (LINK.replace("0.4 uH", "0.4 uF"), "secondary: read '0.4 uF', which is a capacitance"),
        (LINK.replace("0.4 uH", "0 H"), "secondary: got 0 H; allowed above 0 H"),
        (LINK + 'tap = "top"\n', "tap: got 'top'; allowed load | device"),
        (LINK + 'series_resistance = "1 ohm"\n', "series_resistance: got '1 ohm', but kind coupled has no such key"),
        (LINK + "secondary_q = 0.5\n", "secondary_q: got 0.5; allowed 1 to 10 million, or lossless"),
        (
            LINK + "core_q = 30\n",
            "core_q: got 30, but kind coupled has no such key; allowed primary, secondary, coupling",
        ),
        (TRAP.replace("33 pF", "33 nH"), "capacitance: read '33 nH'"),
        (TRAP.replace('inductance = "120 nH"\n', ""), "inductance: missing"),
        (TRAP + 'value = "1 nF"\n', "value: got '1 nF', but kind trap in series has no such key"),
        (TRAP + 'tap = "load"\n', "tap: got 'load', but kind trap in series has no such key"),
        (TRAP + 'trim = ["1 nF", "2 nF"]\n', "trim: got a list, but kind trap in series has no such key"),
        (TRAP + 'lead_inductance = "3 nH"\n', "lead_inductance: got '3 nH', but kind trap in series has no such key"),
        (
            TRAP.replace("series", "shunt") + 'q = 100\nseries_resistance = "1 ohm"\n',
            "q: got both a Q and a series resistance; give one of them",
        ),
        (TURNS + 'leakage = "-1 nH"\n', "leakage: got -1 nH; allowed 0 H or more"),
        (TURNS.replace("ratio = 3", 'ratio = "3 : 1"'), "ratio: read '3 : 1'"),
        (TURNS.replace("ratio = 3", "ratio = 0"), "ratio: got 0; allowed above 0"),
        (TURNS + "q = 100\n", "q: got 100, but kind transformer has no such key; allowed ratio, magnetizing, leakage"),
        (TURNS + 'leakge = "1 nH"\n', "leakge: no such key (did you mean 'leakage'?)"),
        (
            'place = "series"\nkind = "coil"\nvalue = "1 uH"\nlead_inductance = "3 nH"\n',
            "lead_inductance: got '3 nH', but kind coil has no such key; allowed value, q, series_resistance, self_cap",
        ),
        (
            'place = "through"\nkind = "coil"\nvalue = "1 uH"\n',
            "place: got 'through' for kind coil; allowed series | shunt",
        ),
        (
            'place = "shunt"\nkind = "capacitor"\nvalue = "1 nF"\ncoupling = 0.3\n',
            "coupling: got 0.3, but kind capacitor has no such key",
        ),
    ],
)
def test_a_wrong_branch_is_one_clear_line(tmp_path, branch, said):
    with pytest.raises(InputError) as caught:
        read(tmp_path, branch)
    (line,) = caught.value.problems
    assert line.startswith(f"{tmp_path / 'stage.toml'}: branch[1].{said}")


def test_every_kind_stands_where_the_table_says():
    assert {(kind, place) for kind in KEYS for place in ("series", "shunt", "through") if stands(kind, place)} == {
        *((kind, place) for kind in ("capacitor", "coil", "resistor", "trap") for place in ("series", "shunt")),
        ("coupled", "through"),
        ("transformer", "through"),
    }


# --- results and pages -------------------------------------------------------------------------------------


def described_tank(current: float | None = 1.0):
    feed, tank = EACH.ladder.branches[:3], EACH.ladder.branches[3:]
    return describe("x", feed, tank, load=EACH.load, carrier=CARRIER, current=current, terminations=(), trough_dip=None)


def test_each_kind_s_record_has_its_own_keys_with_their_units():
    records = json.loads(json_text(tank_record(described_tank())))["branches"]
    by_name = {record["name"]: record for record in records}
    assert by_name["Cblock"]["value"] == 47e-9
    assert "coupling" not in by_name["Cblock"]
    assert "secondary_peak_voltage_v" not in by_name["X1"]
    for name in ("X1", "X3", "X6"):
        assert by_name[name]["value"] is None
        assert by_name[name]["unit"] is None
    for name, keys in {
        "X1": {"inductance_h": 120e-9, "capacitance_f": 33e-12, "capacitor_q": 900.0, "lead_inductance_h": 3e-9},
        "X3": {"primary_h": 3.1e-6, "secondary_h": 0.4e-6, "coupling": 0.3, "secondary_q": 120.0, "tap": None},
        "X4": {"secondary_q": None, "tap": "load"},
        "X6": {
            "ratio": 3.0,
            "magnetizing_h": 20e-6,
            "leakage_h": 90e-9,
            "core_q": 25.0,
            "lead_inductance_h": 0.0,
            "series_resistance_ohm": 0.05,
        },
    }.items():
        assert {key: by_name[name][key] for key in keys} == keys
    readings = solve_nodes(EACH.ladder.branches, 50 + 0j, CARRIER)[1]
    for record, reading in zip(records, readings, strict=True):
        assert record["peak_voltage_v"] == pytest.approx(abs(reading.across), rel=1e-9)
        assert record["rms_current_a"] == pytest.approx(abs(reading.current) / math.sqrt(2), rel=1e-9)
        if record["place"] == "through":
            assert record["secondary_peak_voltage_v"] == pytest.approx(abs(reading.far_voltage), rel=1e-9)
            assert record["secondary_rms_current_a"] == pytest.approx(abs(reading.far_current) / math.sqrt(2), rel=1e-9)
    bare = tank_record(described_tank(None))["branches"][-1]
    assert bare["secondary_peak_voltage_v"] is None


def test_the_touchstone_export_holds_them_and_says_what_they_are():
    made = design(Job(carrier=CARRIER, power=10.0, conduction_angle=120.0, supply=13.8, network="pi"), textbook=True)
    text = touchstone_text(replace(made, stage=EACH))
    for words in (
        "X1 shunt trap 120.000 nH, 33.0000 pF, resonant at ",
        "series resistance 200.000 mohm, capacitor Q 900",
        "X3 through coupled 3.10000 uH : 400.000 nH, k 0.300000, Q 150, secondary Q 120",
        "X4 through coupled 3.10000 uH above the tap, 400.000 nH below",
        "X6 through transformer 3 : 1, magnetizing 20.0000 uH, leakage 90.0000 nH",
        "X7 through transformer 1 : 3, magnetizing 20.0000 uH, no leakage, lossless, core lossless",
    ):
        assert words in text
    assert text.isascii()
    stream = io.StringIO(text)
    stream.name = "x.s2p"
    network = skrf.Network()
    network.read_touchstone(stream)
    wanted = cascade([b for b in EACH.ladder.branches if b.origin == "part"], network.f)
    assert np.abs(network.s - wanted.s).max() < 1e-10


def drawn(look: Look, parts: tuple[PartStress, ...]) -> str:
    return "\n".join(line.plain for line in circuit(look, parts, start="drain", end="load 50 ohm"))


@pytest.mark.parametrize("current", [None, 1.0])
@pytest.mark.parametrize("plain_text", [False, True])
def test_each_kind_is_drawn_with_all_its_numbers_within_80_columns(plain_text, current):
    text = drawn(Look(80, plain_text), described_tank(current).parts)
    assert max(map(len, text.splitlines())) <= 80
    assert "…" not in text
    joined = " ".join(line[19:].strip() if line[:3] == "   " else line for line in text.splitlines())
    mu = "u" if plain_text else "µ"
    for words in (
        "120 nH, 33.0 pF, resonant at 79.0 MHz, capacitor Q 900",  # 3 nH of lead in series with it
        "120 nH, 33.0 pF, resonant at 80.0 MHz, capacitor Q 800",
        f"3.10 {mu}H : 400 nH, k 0.300, secondary Q 120",
        f"3.10 {mu}H above the tap, 400 nH below, k 0.300, tap at 26.4 %",
        "3 : 1",
        "1 : 3",
        f"magnetizing 20.0 {mu}H, leakage 90.0 nH, core Q 25",
        "no leakage",
    ):
        assert words in joined or words in text
    if plain_text:
        assert text.isascii()
    assert ("V peak" in text) is (current is not None)


def test_the_drawings_are_as_they_should_be():
    # REGRESSION: our own drawings, looked at by eye
    wanted = {
        False: "├◠◠─┤├─╧ │ ├─┐ ξ ╪ ├─┘ └──◠◠──╧    ┆┆ ┌──◠◠──╧ ξ┄┄┐ ├──◠◠──╧ │ ├──◠◠──╧ ξ┄┄┘ │ └──◠◠──╧    ══ ┌──◠◠──╧",
        True: "+uu-||-= | +-. 3 = +-' `--uu--=    :: .--uu--= 3.., +--uu--= | +--uu--= 3..' | `--uu--=    ~~ .--uu--=",
    }
    for plain_text, pieces in wanted.items():
        lines = drawn(Look(80, plain_text), described_tank(None).parts).splitlines()
        left = [line[4:21].rstrip() for line in lines[4:21]]
        assert " ".join(left) == pieces


def test_a_page_of_a_steady_state_draws_them_too():
    state = settle(STAGES["transformer and filter"], orders=16)
    text = "\n".join(line.plain for line in settled_page(state, Look(80), ()))
    assert "1 : 2" in text
    assert "magnetizing 3.00 µH, leakage 15.0 nH, core Q 25" in text
    assert max(map(len, text.splitlines())) <= 80
