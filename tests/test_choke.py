"""Chokes: self-resonance, current, the resonance with what is behind it and its damping, and one across the output."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from rfstage import load_stage
from rfstage.designs.choke import check_choke, choke_resonance, safety_choke
from rfstage.device import Device
from rfstage.errors import OutOfRangeError
from rfstage.ladder import Branch, Ladder
from rfstage.load import SeriesLoad
from rfstage.matching.quality import strongest_resonance_below
from rfstage.stage import CHOKE, Drive, Stage, Supply
from rfstage.steady import settle


@pytest.fixture(scope="module")
def beacon():
    from conftest import PROJECT

    return load_stage(PROJECT / "examples" / "beacon-as-built.toml")


@pytest.fixture(scope="module")
def state(beacon):
    return settle(beacon)


def highest_below(branches, load, carrier):
    """Highest |V_load/I_device| below half the carrier, in dB against the carrier, by a plain fine scan."""
    ladder = Ladder(branches)
    level = np.abs(ladder.transimpedance(np.geomspace(carrier / 1000, carrier / 2, 20_001), load))
    return 20 * math.log10(level.max() / abs(complex(ladder.transimpedance(carrier, load))))


# --- the choke itself -----------------------------------------------------------------------------------


def test_self_resonance_and_apparent_inductance_of_a_published_coil(state):
    # SOURCE: D. Roddy & J. Coolen, Electronic Communications, example 1.5.1, p. 19: 1 uH, 7 pF: 60.2 MHz, 1.21 uH at
    # 25 MHz; recomputed 60.155 MHz and 1.2088 uH without its series resistance
    stage = replace(state.stage, carrier=25e6, supply=replace(state.stage.supply, choke=1e-6))
    found = check_choke(replace(state, stage=stage), self_capacitance=7e-12)
    assert found.self_resonance == pytest.approx(60.155e6, rel=1e-5)
    assert found.apparent_inductance == pytest.approx(1.2088e-6, rel=1e-4)
    assert found.problems == ()


@pytest.mark.parametrize(
    ("farads", "apparent", "said"), [(200e-12, True, "a coil still, barely"), (600e-12, False, "no coil any more")]
)
def test_a_choke_near_its_own_resonance_is_said_so(state, farads, apparent, said):
    found = check_choke(state, self_capacitance=farads)
    assert (found.apparent_inductance is not None) is apparent
    assert len(found.problems) == 1
    assert said in found.problems[0]


def test_without_a_self_capacitance_nothing_is_said_of_resonance(state):
    found = check_choke(state)
    assert (found.self_resonance, found.apparent_inductance, found.problems) == (None, None, ())


def test_current_drop_and_loss_are_those_of_the_settled_stage(beacon):
    lossy = settle(replace(beacon, supply=replace(beacon.supply, choke_resistance=0.3)))
    found = check_choke(lossy, current_rating=5.0)
    assert found.dc_current == lossy.dc_current
    assert found.dc_drop == pytest.approx(0.3 * lossy.dc_current)
    # an independent route: what the electrode lacks of the supply on average
    assert found.dc_drop == pytest.approx(beacon.supply.voltage - lossy.device_voltage[0].real, rel=1e-6)
    assert found.dc_loss == pytest.approx(0.3 * lossy.dc_current**2)
    assert found.rms_current > found.dc_current
    assert found.stored_energy == pytest.approx(1.8e-6 * lossy.dc_current**2 / 2)
    assert found.problems == ()


def test_a_choke_beyond_its_current_is_said_so(state):
    assert check_choke(state, current_rating=0.5).problems == ("the choke carries 822 mA, beyond its rating of 500 mA",)


@pytest.mark.parametrize(
    ("changed", "said"),
    [
        ({"self_capacitance": -1e-12}, "self_capacitance must be at least 0 F"),
        ({"self_capacitance": math.nan}, "self_capacitance must be at least 0 F"),
        ({"current_rating": 0.0}, "current_rating must be above 0 A"),
    ],
)
def test_bad_input_is_one_clear_line(state, changed, said):
    with pytest.raises(OutOfRangeError) as caught:
        check_choke(state, **changed)
    assert said in str(caught.value)


def test_each_choke_of_a_push_pull_pair_carries_its_own_device(beacon):
    pair = settle(replace(beacon, device=replace(beacon.device, pair="push-pull", imbalance=0.1)))
    assert check_choke(pair).dc_current == max(share.dc_current for share in pair.devices)
    shared = settle(replace(beacon, device=replace(beacon.device, pair="parallel")))
    assert check_choke(shared).dc_current == shared.dc_current


# --- its resonance --------------------------------------------------------------------------------------


def test_the_resonance_is_the_chokes_with_the_capacitors_behind_it(beacon, state):
    found = choke_resonance(state)
    assert found is not None
    assert (found.frequency, found.level) == strongest_resonance_below(beacon.ladder.branches, beacon.load, 7.1e6)
    # SOURCE: far below the carrier the coil is a short: 120 pF + 82 nF in series with 8.8 nF + 3.6 nF; within 5 % for
    # the load of 50 ohm across them
    behind = 0.12e-9 + 1 / (1 / 82e-9 + 1 / 12.4e-9)
    assert found.frequency == pytest.approx(1 / (2 * math.pi * math.sqrt(1.8e-6 * behind)), rel=0.05)
    assert 0.95 < found.choke_share <= 1


def test_the_damper_takes_the_resonance_below_the_carrier(beacon, state):
    found = choke_resonance(state)
    assert found.level > 0
    damping = found.damping
    assert damping is not None
    # SOURCE: the characteristic impedance of choke and resonance; a tenth of it for the bypass capacitor and ten times
    # it for the second choke are common practice, no source
    assert damping.resistance == pytest.approx(2 * math.pi * found.frequency * 1.8e-6)
    assert 1 / (2 * math.pi * found.frequency * damping.bypass) == pytest.approx(damping.resistance / 10)
    assert 2 * math.pi * found.frequency * damping.second_choke == pytest.approx(10 * damping.resistance)
    # an independent route: choke, damper and bypass capacitor as they would be fitted, scanned
    fitted = [
        replace(b, series_resistance=damping.resistance) if b.name == CHOKE else b for b in beacon.ladder.branches
    ]
    assert highest_below(beacon.ladder.branches, beacon.load, 7.1e6) == pytest.approx(found.level, abs=1e-3)
    assert highest_below(fitted, beacon.load, 7.1e6) == pytest.approx(damping.level, abs=1e-3)
    assert damping.level < 0


def test_damper_bypass_and_second_choke_as_fitted_damp_as_the_damper_alone(state):
    # an independent route: the supply's end of the choke as a ladder of its own, the supply a short behind the second
    # choke; its impedance at the resonance stands in for the damper
    found = choke_resonance(state)
    omega = 2 * math.pi * found.frequency
    branch = found.damping.resistance + 1 / (1j * omega * found.damping.bypass)
    cold_end = 1 / (1 / branch + 1 / (1j * omega * found.damping.second_choke))
    # two reactances of a tenth each, at right angles: within 2 % of the resistance, 2 tenths of reactance
    assert cold_end.real == pytest.approx(found.damping.resistance, rel=0.025)
    assert abs(cold_end.imag) < 0.11 * found.damping.resistance


def test_the_damper_costs_little_of_the_carrier_and_much_less_than_across_the_choke(beacon, state):
    damping = choke_resonance(state).damping
    # an independent route: the loss of a branch of choke and damper, walked with the whole ladder at the carrier
    fitted = [
        replace(b, q=None, series_resistance=damping.resistance) if b.name == CHOKE else b
        for b in beacon.ladder.branches
    ]
    walk = Ladder(fitted).walk(beacon.carrier, beacon.load)
    place = [b.name for b in fitted].index(CHOKE)
    volts = abs(complex(state.device_voltage[1]))
    loss = float(walk.branches[place].loss) * (volts / abs(complex(walk.impedance))) ** 2
    # the choke's own Q of 100 adds 0.8 ohm to 12.8, in quadrature with 80: 0.3 %
    assert damping.carrier_loss == pytest.approx(loss, rel=5e-3)
    assert damping.carrier_loss < 0.02 * state.output_power
    assert damping.loss_across == pytest.approx(volts**2 / 2 / damping.resistance)
    assert damping.loss_across > 30 * damping.carrier_loss


def test_a_resonance_below_the_carrier_needs_no_damper():
    # invented values, about those of a tube stage of 400 W into 50 ohm
    tube = Device(
        family="tube",
        transfer_factor=1e-3,
        exponent=1.5,
        threshold=-40.0,
        threshold_softness=1.0,
        knee_voltage=50.0,
        knee_resistance=100.0,
    )
    parts = (
        Branch("Cblock", "series", "capacitor", 1e-9),
        Branch("C1", "shunt", "capacitor", 150e-12),
        Branch("L1", "series", "coil", 15e-6, q=250, q_frequency=3.65e6),
        Branch("C2", "shunt", "capacitor", 1.2e-9),
    )
    stage = Stage(
        carrier=3.65e6,
        device=tube,
        drive=Drive(bias=-60.0, amplitude=80.0),
        branches=parts,
        supply=Supply(voltage=2000.0, choke=130e-6, choke_q=100),
        load=SeriesLoad(50 + 0j, 3.65e6),
    )
    found = choke_resonance(settle(stage))
    assert found is not None
    assert found.level < 0
    assert found.damping is None


def test_a_resonance_that_is_not_the_chokes_is_not_damped_there(beacon):
    # SOURCE: arithmetic: 10 uH and 10 nF resonate at 503 kHz, Q 6 with 5 ohm; a choke of 1 mH has a hundredth of it
    branches = (
        Branch("Cblock", "series", "capacitor", 1e-6),
        Branch("C1", "shunt", "capacitor", 10e-9),
        Branch("L1", "series", "coil", 10e-6),
    )
    stage = replace(
        beacon,
        branches=branches,
        part_data={},
        supply=replace(beacon.supply, choke=1e-3),
        load=SeriesLoad(5 + 0j, beacon.carrier),
    )
    found = choke_resonance(settle(stage))
    assert found is not None
    assert found.frequency == pytest.approx(503e3, rel=0.03)
    assert found.level > 0
    assert found.choke_share < 0.05
    assert found.damping is None


def test_a_push_pull_pair_is_seen_by_its_half(beacon):
    pair = settle(replace(beacon, device=replace(beacon.device, pair="push-pull")))
    found = choke_resonance(pair)
    assert found is not None
    # SOURCE: each half sees its choke with twice the capacitors: about √2 lower than the single stage
    single = choke_resonance(settle(beacon))
    assert found.frequency == pytest.approx(single.frequency / math.sqrt(2), rel=0.05)


# --- across the output ----------------------------------------------------------------------------------


@given(
    c1=st.floats(1e-9, 2e-8),
    coil=st.floats(5e-8, 1e-6),
    c2=st.floats(5e-10, 1e-8),
    resistance=st.floats(5, 500),
    reactance=st.floats(-100, 100),
)
def test_the_least_safety_choke_moves_the_impedance_by_one_percent(beacon, c1, coil, c2, resistance, reactance):
    values = {"C1": c1, "L1": coil, "C2": c2}
    branches = tuple(replace(b, value=values.get(b.name, b.value)) for b in beacon.branches)
    stage = replace(beacon, branches=branches, load=SeriesLoad(complex(resistance, reactance), beacon.carrier))
    found = safety_choke(stage)

    def moved(inductance):
        branches = (*stage.ladder.branches, Branch("Lsafety", "shunt", "coil", inductance))
        before = stage.ladder.impedance(stage.carrier, stage.load)
        return abs(Ladder(branches).impedance(stage.carrier, stage.load) - before) / abs(before)

    if found.least_inductance is None:
        assert moved(1e-12) < 0.01
        return
    # the chain terms, and the difference of near impedances, keep about ten digits
    assert moved(found.least_inductance) == pytest.approx(0.01, rel=1e-6)
    assert moved(2 * found.least_inductance) < 0.01


def test_a_safety_choke_is_advised_where_the_supply_is_dangerous_and_one_failure_away(beacon):
    lethal = replace(beacon, supply=replace(beacon.supply, voltage=2000.0))
    found = safety_choke(lethal)
    assert found.advisable
    assert found.reason == "a failed blocking capacitor would put 2.00 kV on the output"
    low = safety_choke(beacon)
    assert not low.advisable
    assert "no more than 13.8 V" in low.reason
    assert low.least_inductance == found.least_inductance


def test_a_safety_choke_is_not_advised_where_a_coil_leads_to_ground(beacon):
    lethal = replace(beacon, supply=replace(beacon.supply, voltage=2000.0))
    grounded = replace(
        lethal, branches=(*lethal.branches, Branch("L2", "shunt", "coil", 20e-6, q=100, q_frequency=7e6))
    )
    found = safety_choke(grounded)
    assert not found.advisable
    assert found.reason == "the supply doesn't reach the output when one capacitor fails"


def test_a_choke_across_a_push_pull_load_is_not_advised(beacon):
    lethal = replace(beacon, supply=replace(beacon.supply, voltage=2000.0))
    found = safety_choke(replace(lethal, device=replace(lethal.device, pair="push-pull")))
    assert (found.advisable, found.least_inductance) == (False, None)
    assert "choke each to ground" in found.reason
