"""Pairs of devices: against one device, against what the books say of push-pull, and against ngspice."""

from __future__ import annotations

import json
import math
import shutil
import subprocess
from dataclasses import replace

import numpy as np
import pytest
import stress

from rfstage.device import Device, JunctionCapacitance, ReverseConduction
from rfstage.errors import ConvergenceError, ImpossibleError, InputError, OutOfRangeError
from rfstage.files.records import json_text, settle_record
from rfstage.files.spice import spice_text
from rfstage.files.stage import load_stage
from rfstage.files.stagetext import stage_text
from rfstage.ladder import Branch, Ladder
from rfstage.load import SeriesLoad
from rfstage.report.page import Look
from rfstage.report.settled import settled_page
from rfstage.stage import Drive, Stage, Supply
from rfstage.steady import settle, settle_many
from rfstage.steady.balance import evaluate, jacobian, newton
from rfstage.steady.modes import each
from rfstage.steady.pair import Pairs, both, half_between
from rfstage.steady.solve import DIRECT, FAILED, cold_start, solve
from rfstage.sweep import sweep

# Driven into the knee from 28 V at 7.1 MHz: each device has 2.5 nF, the first capacitor of the pi to 50 ohm
FET = Device(
    family="fet",
    transfer_factor=2.0,
    exponent=1.0,
    threshold=3.0,
    threshold_softness=0.02,
    knee_voltage=0.2,
    knee_resistance=0.1,
    output_capacitance=2.5e-9,
    reverse_conduction=ReverseConduction(conductance=2.0, threshold=0.7, softness=0.05),
    pair="push-pull",
)
PUSH_PULL = Stage(
    carrier=7.1e6,
    device=FET,
    drive=Drive(bias=2.6, amplitude=2.8),
    supply=Supply(voltage=28.0, choke=2e-6, choke_resistance=0.05, choke_q=100.0),
    branches=(
        Branch("Cblock", "series", "capacitor", 100e-9, q=1000.0),
        Branch("L1", "series", "coil", 686e-9, q=150.0, q_frequency=7.1e6, self_capacitance=2e-12),
        Branch("C2", "shunt", "capacitor", 991e-12, q=1000.0, lead_inductance=3e-9),
    ),
    load=SeriesLoad(50 + 0j, 7.1e6),
)
# 20 W from 13.8 V in class C, both on one collector
PARALLEL = Stage(
    carrier=7.1e6,
    device=Device(
        family="bipolar",
        transfer_factor=9.166,
        exponent=1.0,
        threshold=0.7,
        threshold_softness=0.01,
        knee_voltage=0.184,
        knee_resistance=0.08,
        output_capacitance=90e-12,
        junction_capacitance=JunctionCapacitance(at_zero=200e-12, potential=0.7, grading=0.4),
        reverse_conduction=ReverseConduction(conductance=4.6, threshold=0.7, softness=0.03),
        pair="parallel",
    ),
    drive=Drive(bias=0.2, amplitude=1.0),
    supply=Supply(voltage=13.8, choke=0.8e-6, choke_resistance=0.02, choke_q=100.0),
    branches=(
        Branch("Cblock", "series", "capacitor", 166e-9, q=1000.0),
        Branch("C1", "shunt", "capacitor", 17.3e-9, q=1000.0),
        Branch("L1", "series", "coil", 95.6e-9, q=150.0, q_frequency=7.1e6),
        Branch("C2", "shunt", "capacitor", 7.07e-9, q=1000.0),
    ),
    load=SeriesLoad(25 + 0j, 7.1e6),
)
BOTH = pytest.mark.parametrize("stage", [PUSH_PULL, PARALLEL], ids=["push-pull", "parallel"])


def unlike(stage: Stage, imbalance: float) -> Stage:
    return replace(stage, device=replace(stage.device, imbalance=imbalance))


def paired(stages: list[Stage], pair: str, imbalance: float) -> list[Stage]:
    return [replace(s, device=replace(s.device, pair=pair, imbalance=imbalance)) for s in stages]


def second_harmonic(stage: Stage) -> float:
    """Return its voltage in the load against the carrier's."""
    state = settle(stage, orders=48)
    return math.sqrt(state.harmonics[0].load_power / state.output_power)


# --- equations


@BOTH
def test_jacobian_is_the_derivative_of_the_balance(stage):
    charged = replace(stage.device, junction_capacitance=PARALLEL.device.junction_capacitance, imbalance=0.4)
    circuit = Pairs.of([replace(stage, device=charged)] * 2, 12).coupled(12)
    random = np.random.default_rng(1)
    x = cold_start(circuit)
    noise = random.standard_normal((2, *x.shape))
    x = x + 0.05 * circuit.supply * (noise[0] + 1j * noise[1] * (np.arange(13) > 0))
    exact = jacobian(circuit, evaluate(circuit, x))
    assert exact.shape == (2, 52, 52)
    step = 1e-6 * stage.supply.voltage
    for column in range(52):
        mode, entry = divmod(column, 26)
        if entry == 1:  # of a mean's imaginary part, which stays 0
            continue
        shifted = np.zeros_like(x)
        shifted[:, mode, entry // 2] = step * (1j if entry % 2 else 1)
        difference = evaluate(circuit, x + shifted).residual - evaluate(circuit, x - shifted).residual
        difference = difference.view(np.float64).reshape(2, 52) / (2 * step)
        assert np.abs(exact[:, :, column] - difference).max() < 1e-6 * np.abs(exact).max()


@BOTH
def test_the_solution_satisfies_the_equations_of_both_devices(stage):
    """In the devices' own terms: each sees its own current through Zs and the other's through Zm."""
    system = Pairs.of([unlike(stage, 0.3)], 24)
    circuit = system.circuit(24)
    cycle = system.cycle(circuit, solve(circuit))
    frequencies = stage.carrier * np.arange(1.0, 25)
    feed, r = Ladder(stage.feed), stage.supply.choke_resistance
    if stage.device.pair == "push-pull":
        one = feed.impedance(frequencies, np.full(24, np.inf + 0j))
        half = Ladder(stage.branches).impedance(frequencies, stage.load) / 2
        even, odd, dc = one, 1 / (1 / one + 1 / half), (r, 0.0)
    else:
        cout = Branch("C", "shunt", "capacitor", stage.device.output_capacitance)
        even = 2 * Ladder((cout, *stage.ladder.branches)).impedance(frequencies, stage.load)
        odd, dc = np.zeros(24), (r, r)
    own = np.append(dc[0], (odd + even) / 2)
    mutual = np.append(dc[1], (even - odd) / 2)
    deviation = cycle.node[0].copy()
    deviation[:, 0] -= stage.supply.voltage
    drawn = (cycle.device + cycle.charging)[0]
    for a, b in ((0, 1), (1, 0)):
        left = deviation[a] + own * drawn[a] + mutual * drawn[b]
        assert np.abs(left).max() < 1e-9 * stage.supply.voltage


@BOTH
def test_a_balanced_pair_as_one_device_is_what_both_devices_solved_together_are(stage):
    system = Pairs.of([stage], 32)
    one = system.circuit(32)
    short = system.cycle(one, solve(one))
    circuit = system.coupled(32)
    found = solve(circuit)
    full = system.cycle(circuit, found)
    assert found.methods == (DIRECT,)
    assert not one.paired
    assert circuit.paired
    assert np.abs(short.node - full.node).max() < 1e-9 * stage.supply.voltage
    assert np.abs(short.device - full.device).max() < 1e-9 * np.abs(full.device).max()


def test_a_vanishing_imbalance_goes_over_into_balance():
    for stage in (PUSH_PULL, PARALLEL):
        near, at = settle(unlike(stage, 1e-12), orders=32), settle(stage, orders=32)
        assert np.abs(near.device_voltage - at.device_voltage).max() < 1e-9 * stage.supply.voltage
        assert near.branch_losses == pytest.approx(at.branch_losses, rel=1e-8)
        assert near.peak_voltage == pytest.approx(at.peak_voltage, rel=1e-9)


# --- against one device


def test_a_balanced_parallel_pair_is_one_device_of_twice_the_current():
    d = PARALLEL.device
    diode, junction = d.reverse_conduction, d.junction_capacitance
    one = replace(
        d,
        pair=None,
        transfer_factor=2 * d.transfer_factor,
        knee_resistance=d.knee_resistance / 2,
        output_capacitance=2 * d.output_capacitance,
        junction_capacitance=replace(junction, at_zero=2 * junction.at_zero),
        reverse_conduction=replace(diode, conductance=2 * diode.conductance),
    )
    pair, single = settle(PARALLEL), settle(replace(PARALLEL, device=one))
    assert pair.orders_solved == single.orders_solved
    for name in ("dc_current", "dc_power", "output_power", "dissipation", "peak_voltage", "choke_loss"):
        assert getattr(pair, name) == pytest.approx(getattr(single, name), rel=1e-9)
    assert 2 * pair.peak_current == pytest.approx(single.peak_current, rel=1e-9)
    np.testing.assert_allclose(pair.device_voltage, single.device_voltage, atol=1e-9 * 13.8)
    np.testing.assert_allclose(2 * pair.device_current, single.device_current, atol=1e-9 * single.peak_current)
    for a, b in zip(pair.branches, single.branches, strict=True):
        assert a.name == b.name
        np.testing.assert_allclose(
            (a.loss, a.peak_voltage, a.rms_current), (b.loss, b.peak_voltage, b.rms_current), rtol=1e-8
        )
    assert [h.level for h in pair.harmonics[:9]] == pytest.approx([h.level for h in single.harmonics[:9]], abs=1e-6)


def test_push_pull_is_a_single_device_on_the_halved_network_once_both_modes_see_that():
    circuit = Pairs.of([PUSH_PULL], 32).coupled(32)
    for array in (circuit.impedance, circuit.scale):
        array[:, 0, 1:] = array[:, 1, 1:]
    single = settle(half_between(PUSH_PULL), orders=32)
    voltage = each(solve(circuit).unknowns)[0]
    voltage[:, 0] += 28
    half_a_cycle = (-1) ** np.arange(33)
    np.testing.assert_allclose(voltage[0], single.device_voltage, atol=1e-9 * 28)
    np.testing.assert_allclose(voltage[1], single.device_voltage * half_a_cycle, atol=1e-9 * 28)


# --- what is known of push-pull


def test_balanced_push_pull_gives_the_load_no_even_harmonics():
    # SOURCE: common knowledge of push-pull stages: even harmonics are in phase at both outputs and cancel between them
    state = settle(PUSH_PULL)
    for h in state.harmonics:
        if h.order % 2 == 0:
            assert h.level is None
            assert h.load_power < 1e-20 * state.output_power
    assert state.harmonics[1].level < 0
    assert state.harmonics[1].level > -80
    assert state.change_from_half_the_orders.settled


def test_ideal_class_b_push_pull_has_the_book_s_figures():
    # SOURCE: H. L. Krauss, C. W. Bostian, F. H. Raab, Solid State Radio Engineering (1980), class B push-pull: of half
    # sines with peak I each, direct current 2I/π in all, fundamental I/2 each, no other odd order, efficiency π/4 times
    # the swing over the supply
    ideal = replace(FET, threshold_softness=0.0, knee_voltage=1e-3, knee_resistance=0.0, reverse_conduction=None)
    lossless = tuple(replace(b, q=None) for b in PUSH_PULL.branches)
    stage = replace(
        PUSH_PULL, device=ideal, branches=lossless, drive=Drive(3.0, 1.9), supply=Supply(voltage=28.0, choke=2e-6)
    )
    state = settle(stage, orders=128)
    peak = 2.0 * 1.9
    assert state.minimum_voltage > 0.3
    assert state.dc_current == pytest.approx(2 * peak / math.pi, rel=1e-5)
    assert state.conduction_angle_deg == pytest.approx(180.0)
    resistance = complex(half_between(stage).ladder.impedance(7.1e6, half_between(stage).load)).real
    assert state.output_power == pytest.approx(2 * (peak / 2) ** 2 / 2 * resistance, rel=1e-5)
    swing = peak / 2 * resistance
    assert state.efficiency == pytest.approx(math.pi / 4 * swing / 28, rel=1e-5)
    assert all(h.level is None or h.level < -90 for h in state.harmonics)


def test_even_harmonics_grow_in_proportion_to_a_small_imbalance():
    # SOURCE: common practice, no source: to the first order even voltages follow the difference of the devices
    small, twice, more = (second_harmonic(unlike(PUSH_PULL, d)) for d in (0.005, 0.01, 0.04))
    assert twice == pytest.approx(2 * small, rel=1e-3)
    assert more == pytest.approx(8 * small, rel=2e-2)
    assert 20 * math.log10(more) > -80


@BOTH
def test_the_stronger_device_may_be_either(stage, monkeypatch):
    here = settle(unlike(stage, 0.3), orders=48)
    monkeypatch.setattr("rfstage.steady.pair.both", lambda device: both(device)[::-1])
    there = settle(unlike(stage, 0.3), orders=48)
    for name in ("dc_current", "output_power", "dissipation", "peak_voltage", "minimum_voltage", "peak_current"):
        assert getattr(there, name) == pytest.approx(getattr(here, name), rel=1e-9)
    assert there.branch_losses == pytest.approx(here.branch_losses, rel=1e-8)
    for a, b in zip(here.devices, reversed(there.devices), strict=True):
        assert (a.dc_current, a.dissipation) == pytest.approx((b.dc_current, b.dissipation), rel=1e-9)
    for a, b in zip(here.branches, there.branches, strict=True):
        assert (a.peak_voltage, a.rms_current) == pytest.approx((b.peak_voltage, b.rms_current), rel=1e-6)
    for a, b in zip(here.harmonics[:6], there.harmonics[:6], strict=True):
        assert a.level == pytest.approx(b.level, abs=1e-6)


# --- totals, shares, energy


@BOTH
@pytest.mark.parametrize("imbalance", [0.0, 0.2, 1.5])
def test_both_devices_make_the_totals_and_all_power_is_found_again(stage, imbalance):
    state = settle(unlike(stage, imbalance))
    first, second = state.devices
    assert first.dc_current + second.dc_current == pytest.approx(state.dc_current, rel=1e-12)
    assert first.dissipation + second.dissipation == pytest.approx(state.dissipation, rel=1e-12)
    assert max(first.peak_voltage, second.peak_voltage) == state.peak_voltage
    assert max(first.peak_current, second.peak_current) == state.peak_current
    assert first.peak_current == state.waveform.current.max()
    assert first.dc_current == pytest.approx(state.device_current[0].real)
    assert (first.dc_current > second.dc_current) == (imbalance > 0)
    assert abs(state.balance_error) < 1e-9
    assert state.dc_power == pytest.approx(stage.supply.voltage * state.dc_current)
    rf = sum(h.load_power for h in state.harmonics) + state.output_power
    spent = state.dissipation + state.charge_power + rf + sum(b.loss for b in state.branches)
    assert spent == pytest.approx(state.dc_power, rel=1e-9)


def test_powers_and_stresses_between_the_outputs_agree_with_chain_terms():
    """Outside the halved walk: the whole ladder between both outputs, driven by the difference of their voltages."""
    stage = unlike(PUSH_PULL, 0.3)
    system = Pairs.of([stage], 64)
    circuit = system.circuit(64)
    solution = solve(circuit)
    cycle = system.cycle(circuit, solution)
    [state] = system.states(cycle, solution, None)
    frequencies = stage.carrier * np.arange(1.0, 65)
    a, b, c, d = Ladder(stage.branches).chain(frequencies)
    z = stage.load.impedance(frequencies)
    between = cycle.node[0, 0] - cycle.node[0, 1]
    at_load = between[1:] / (a + b / z)
    powers = np.abs(at_load) ** 2 / 2 * (1 / z).real
    assert state.output_power == pytest.approx(powers[0], rel=1e-8)
    assert [h.load_power for h in state.harmonics[:9]] == pytest.approx(powers[1:10].tolist(), rel=1e-6)
    stress_of = {branch.name: branch for branch in state.branches}
    orders = np.exp(1j * np.outer(np.arange(1, 65), 2 * math.pi / 512 * np.arange(512)))
    assert stress_of["C2"].peak_voltage == pytest.approx(np.abs((at_load @ orders).real).max(), rel=1e-8)
    through = at_load * (c + d / z)  # into the first part, which is in series
    assert stress_of["Cblock"].rms_current == pytest.approx(math.sqrt((np.abs(through) ** 2).sum() / 2), rel=1e-8)
    held = (through * stage.branches[0].impedance(frequencies)) @ orders + between[0].real
    assert stress_of["Cblock"].peak_voltage == pytest.approx(np.abs(held.real).max(), rel=1e-8)
    assert abs(between[0].real) > 0.01  # the two direct currents differ, and so do the drops of the chokes
    chokes = cycle.node[0, :, 1:] / stage.feed[1].impedance(frequencies)
    rf = (np.abs(chokes) ** 2 * stage.feed[1].impedance(frequencies).real).sum() / 2
    dc = 0.05 * sum(one.dc_current**2 for one in state.devices)
    assert state.choke_loss == pytest.approx(rf + dc, rel=1e-8)
    rms = np.sqrt((np.abs(chokes) ** 2).sum(axis=1) / 2 + cycle.device[0, :, 0].real ** 2)
    assert stress_of["Lchoke"].rms_current == pytest.approx(rms.max(), rel=1e-8)


@pytest.mark.parametrize("pair", ["push-pull", "parallel"])
@pytest.mark.parametrize("imbalance", [0.0, 0.1, 1.2])
def test_pairs_of_every_sort_settle(pair, imbalance):
    states = settle_many(paired(stress.stages(40), pair, imbalance), orders=32)
    assert max(state.residual for state in states) < 1e-11
    assert max(abs(state.balance_error) for state in states) < 1e-9


@pytest.mark.parametrize("pair", ["push-pull", "parallel"])
def test_pairs_of_an_extreme_sort_settle_by_the_ways_of_single_devices(pair):
    states = settle_many(paired(stress.stages(25, stress.EXTREME), pair, 0.2), orders=24)
    assert max(abs(state.balance_error) for state in states) < 1e-9
    assert {state.method for state in states} > {DIRECT}


@pytest.mark.parametrize("imbalance", [0.0, 0.2])
@BOTH
def test_a_resonance_above_the_orders_is_not_overlooked(stage, imbalance):
    c1 = Branch("C1", "shunt", "capacitor", 1.2e-9, q=1000.0, lead_inductance=4e-9)
    if stage is PARALLEL:
        c1 = replace(c1, value=17.3e-9, lead_inductance=1.5e-9)
    block, *_, coil, c2 = unlike(stage, imbalance).branches
    device = replace(stage.device, imbalance=imbalance, output_capacitance=60e-12 if stage is PARALLEL else 150e-12)
    made = replace(stage, device=device, branches=(block, c1, coil, c2))
    state, few, fine = settle(made), settle(made, orders=32), settle(made, orders=256)
    assert state.orders_solved > 32
    assert state.peak_voltage == pytest.approx(fine.peak_voltage, rel=5e-3)
    first = fine.branches[0]  # the output capacitance, which resonates with the lead
    assert abs(few.branches[0].rms_current / first.rms_current - 1) > 0.05
    assert state.branches[0].rms_current == pytest.approx(first.rms_current, rel=0.02)


@BOTH
def test_a_pair_s_narrow_pulse_is_refused(stage):
    drive = Drive(stage.device.threshold + 0.5 - 1e6, 1e6)
    for one in (stage, unlike(stage, 0.2)):
        with pytest.raises(ConvergenceError, match="the current pulse is too narrow"):
            settle(replace(one, drive=drive), orders=32)


def test_a_mixed_batch_gives_each_stage_what_it_gets_alone():
    some = [
        PUSH_PULL,
        replace(PARALLEL, device=replace(PARALLEL.device, pair=None)),
        unlike(PARALLEL, 0.2),
        unlike(PUSH_PULL, 0.1),
        PARALLEL,
        replace(unlike(PUSH_PULL, 0.1), drive=Drive(3.0, 1.5)),
        replace(PUSH_PULL, device=replace(FET, threshold_softness=0.0)),
    ]
    for stage, state in zip(some, settle_many(some, orders=20), strict=True):
        alone = settle(stage, orders=20)
        assert state.stage is stage
        assert np.abs(state.device_voltage - alone.device_voltage).max() < 1e-9 * stage.supply.voltage
        assert state.output_power == pytest.approx(alone.output_power, rel=1e-9)
        assert len(state.devices) == (0 if stage.device.pair is None else 2)


def test_like_devices_need_no_capacitor_between_them_and_unlike_ones_do():
    through = replace(PUSH_PULL, branches=PUSH_PULL.branches[1:])
    state = settle(through)
    assert state.output_power == pytest.approx(settle(PUSH_PULL).output_power, rel=0.03)
    assert abs(state.balance_error) < 1e-9
    no_drop = replace(unlike(through, 0.1), supply=replace(through.supply, choke_resistance=0.0))
    assert settle(no_drop).has_output
    with pytest.raises(ImpossibleError, match="unlike devices"):
        settle(unlike(through, 0.1))
    with pytest.raises(ImpossibleError, match="blocking capacitor"):
        settle(replace(PARALLEL, branches=PARALLEL.branches[1:]))


@BOTH
def test_a_known_solution_as_the_start_changes_nothing_but_the_work(stage):
    known = settle(stage, orders=32)
    cold, warm = (settle_many([unlike(stage, 0.01)], orders=32, start=s)[0] for s in (None, known))
    assert np.abs(cold.device_voltage - warm.device_voltage).max() < 1e-9 * stage.supply.voltage


@BOTH
def test_no_drive_gives_no_output_and_no_nonsense(stage):
    for imbalance in (0.0, 0.2):
        state = settle(replace(unlike(stage, imbalance), drive=Drive(-5.0, 0.0)))
        assert not state.has_output
        assert state.dc_current == state.output_power == state.dissipation == state.choke_loss == 0
        assert [d.peak_voltage for d in state.devices] == [stage.supply.voltage] * 2
        assert all(h.level is None and h.load_power == 0 for h in state.harmonics)


@BOTH
def test_an_unfinished_solution_is_never_returned(stage, monkeypatch):
    def newton_that_fails(part, start, **options):
        out = newton(part, start, **options)
        out.converged[:] = False
        return out

    monkeypatch.setattr("rfstage.steady.solve.newton", newton_that_fails)
    for imbalance in (0.0, 0.1):
        with pytest.raises(ConvergenceError, match="residual of"):
            settle(unlike(stage, imbalance), orders=10)


def test_every_way_and_every_start_leads_to_the_same_solution():
    circuit = Pairs.of([unlike(PUSH_PULL, 0.3)], 24).circuit(24)
    known = solve(circuit)
    random = np.random.default_rng(7)
    for _ in range(3):
        parts = random.standard_normal((2, *known.unknowns.shape)) * 0.5 / np.arange(1, 26)
        again = solve(circuit, circuit.supply * (parts[0] + 1j * parts[1] * (np.arange(25) > 0)))
        assert FAILED not in again.methods
        assert np.abs(again.unknowns - known.unknowns).max() < 1e-9 * 28


def test_a_pair_is_swept_as_a_single_device_is():
    swept = sweep(unlike(PUSH_PULL, 0.05), "C2", list(np.linspace(0.7e-9, 1.3e-9, 9)))
    assert all(len(point.devices) == 2 for point in swept.points)
    assert max(abs(point.balance_error) for point in swept.points) < 1e-9
    alone = settle(swept.points[6].stage, orders=swept.points[6].orders_solved)
    assert swept.points[6].dc_current == pytest.approx(alone.dc_current, rel=1e-9)


# --- an independent route: a transient simulator

SIMULATED = replace(
    unlike(PUSH_PULL, 0.1),
    supply=Supply(voltage=28.0, choke=2e-6, choke_resistance=0.45),
    branches=(
        Branch("Cblock", "series", "capacitor", 100e-9, series_resistance=0.02),
        Branch("L1", "series", "coil", 686e-9, series_resistance=0.2),
        Branch("C2", "shunt", "capacitor", 991e-12, series_resistance=0.02),
    ),
)
PERIODS, MEASURED = 1500, 10


def deck(steps: int) -> str:
    """The simulated stage, each device and each part written out by hand."""
    lines = ["* push-pull pair", "Vsupply vdd 0 28"]
    for name, factor, phase in (("a", 2.0 * 1.05, -90), ("b", 2.0 * 0.95, 90)):
        below = f"(-v({name}) - 0.7)"
        lines += [
            f"Rch{name} vdd ch{name} 0.45",
            f"Lch{name} ch{name} {name} 2u",
            f"Cout{name} {name} 0 2.5n ic=28",
            f"Vdrive{name} control{name} 0 SIN(2.6 2.8 7.1meg 0 0 {phase})",
            f"Babove{name} above{name} 0 V = max(v(control{name}) - 3, 0)"
            f" + 0.02*ln(1 + exp(-abs(v(control{name}) - 3)/0.02))",
            f"Bdevice{name} {name} 0 I = {factor}*v(above{name})*tanh(v({name})/(0.2 + 0.1*{factor}*v(above{name})))",
            f"Breverse{name} 0 {name} I = 2*(max({below}, 0) + 0.05*ln(1 + exp(-abs({below})/0.05)))",
        ]
    step, end = 1 / 7.1e6 / steps, PERIODS / 7.1e6
    lines += [
        "Cblock a n1 100n",
        "Rblock n1 n2 0.02",
        "L1 n2 n3 686n",
        "R1 n3 out 0.2",
        "C2 out n4 991p",
        "R2 n4 b 0.02",
        "Rload out b 50",
        "Eload load 0 out b 1",
        f".tran {step:.12g} {end:.12g} {(PERIODS - MEASURED) / 7.1e6:.12g} {step:.12g} uic",
        ".options reltol=1e-6 abstol=1e-9 vntol=1e-7 itl4=100 method=trap",
        ".control",
        "run",
        "set wr_singlescale",
        "set numdgt=15",
        "linearize v(load) i(vsupply)",
        "wrdata out.txt v(load) i(vsupply)",
        "quit",
        ".endc",
        ".end",
    ]
    return "\n".join(lines) + "\n"


def simulated(steps, folder):
    """Return direct current [A] and load phasors of orders 1 to 7 [V] over the last ten periods."""
    (folder / "out.txt").unlink(missing_ok=True)
    (folder / "deck.cir").write_text(deck(steps), encoding="ascii")
    subprocess.run(["ngspice", "-b", "deck.cir"], cwd=folder, capture_output=True, check=True, timeout=280)
    table = np.loadtxt(folder / "out.txt")[: MEASURED * steps]
    time, load, supply = table[:, 0] - table[0, 0], table[:, 1], -table[:, 2]
    orders = np.arange(1, 8)[:, np.newaxis]
    return supply.mean(), 2 * (load * np.exp(-2j * np.pi * orders * 7.1e6 * time)).mean(axis=1)


@pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice, a general-purpose simulator, is not here")
def test_ngspice_finds_the_same_steady_state_of_an_unlike_push_pull_pair(tmp_path):
    # SOURCE: transient runs of ngspice at two step sizes, extrapolated (the trapezoidal rule errs by the step squared)
    coarse, fine = (simulated(steps, tmp_path) for steps in (300, 600))
    current = fine[0] + (fine[0] - coarse[0]) / 3
    phasors = np.abs(fine[1]) + (np.abs(fine[1]) - np.abs(coarse[1])) / 3
    state = settle(SIMULATED, orders=128)
    powers = phasors**2 / 2 / 50
    levels = 10 * np.log10(powers / powers[0])
    assert current == pytest.approx(state.dc_current, rel=3e-4)
    assert 10 * math.log10(powers[0] / state.output_power) == pytest.approx(0, abs=0.003)
    counted = [h for h in state.harmonics[:6] if h.level > -80]
    assert {2, 3} <= {h.order for h in counted}
    for h in counted:
        assert levels[h.order - 1] == pytest.approx(h.level, abs=0.03), h.order


# --- files and page


def test_a_pair_is_written_and_read_and_a_single_device_has_no_such_keys(tmp_path):
    stage = unlike(PUSH_PULL, 0.05)
    text = stage_text(stage, tmp_path)
    assert 'pair = "push-pull"\nimbalance = 0.05\n' in text
    (tmp_path / "pair.toml").write_text(text, encoding="utf-8")
    assert load_stage(tmp_path / "pair.toml").device == stage.device
    single = stage_text(replace(stage, device=replace(FET, pair=None)), tmp_path)
    assert "pair" not in single
    assert "imbalance" not in single


@pytest.mark.parametrize(
    ("new", "said"),
    [
        ('pair = "pushpull"', "did you mean 'push-pull'?"),
        ('pair = "push-pull"\nimbalance = 2', "imbalance: got 2; allowed 0 to below 2"),
        ('pair = "push-pull"\nimbalance = -0.1', "imbalance: got -0.1; allowed 0 to 2"),
        ("imbalance = 0.1", "imbalance: only a pair has one"),
    ],
)
def test_a_wrong_pair_is_one_clear_line(tmp_path, new, said):
    text = stage_text(PUSH_PULL, tmp_path).replace('pair = "push-pull"\nimbalance = 0.0', new)
    (tmp_path / "pair.toml").write_text(text, encoding="utf-8")
    with pytest.raises(InputError) as caught:
        load_stage(tmp_path / "pair.toml")
    [problem] = caught.value.problems
    assert said in problem


@pytest.mark.parametrize(
    "change",
    [{"pair": "twins"}, {"imbalance": 2.0}, {"imbalance": -0.1}, {"pair": None, "imbalance": 0.1}],
    ids=["name", "too much", "negative", "of one"],
)
def test_a_device_refuses_what_makes_no_pair(change):
    with pytest.raises(OutOfRangeError, match="must be"):
        replace(FET, **change)


def test_record_and_page_show_each_device():
    state = settle(unlike(PUSH_PULL, 0.2), orders=32)
    record = json.loads(json_text(settle_record(state, ())))
    assert [d["dc_current_a"] for d in record["devices"]] == [d.dc_current for d in state.devices]
    assert set(record["devices"][0]) == {"dc_current_a", "dissipation_w", "peak_voltage_v", "peak_current_a"}
    text = "\n".join(line.plain for line in settled_page(state, Look(width=100), ()))
    assert "push-pull pair, FET" in text
    for name in ("first", "second"):
        assert any(line.split()[:1] == [name] for line in text.splitlines())
    assert "stand between the two outputs" in text
    single = settle(replace(PARALLEL, device=replace(PARALLEL.device, pair=None)), orders=32)
    assert settle_record(single, ())["devices"] == []
    assert not any(line.plain.split()[:1] == ["second"] for line in settled_page(single, Look(width=100), ()))


def test_the_page_of_a_parallel_pair_shows_both_output_capacitances_as_one():
    text = "\n".join(line.plain for line in settled_page(settle(PARALLEL, orders=32), Look(width=100), ()))
    assert "180 pF" in text


def test_a_spice_deck_of_a_pair_is_refused():
    with pytest.raises(ImpossibleError, match="has a pair"):
        spice_text(PUSH_PULL)
