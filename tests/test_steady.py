"""The steady state against closed forms, time integration, energy, and itself from other starts."""

import math
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
import stress
from scipy.integrate import solve_ivp

from rfstage.device import Device, JunctionCapacitance, ReverseConduction
from rfstage.devicelaw import current
from rfstage.errors import ConvergenceError, ImpossibleError, OutOfRangeError
from rfstage.files.records import settled_record
from rfstage.files.stage import load_stage
from rfstage.ladder import Branch
from rfstage.load import SeriesLoad
from rfstage.pulse import pulse_coefficients
from rfstage.stage import Drive, Stage, Supply
from rfstage.steady import settle, settle_many
from rfstage.steady.balance import evaluate, jacobian, newton
from rfstage.steady.circuit import Circuit
from rfstage.steady.network import networks
from rfstage.steady.single import Singles
from rfstage.steady.solve import FAILED, cold_start, solve

# A textbook class C stage: 10 W from 13.8 V at 120 degrees and 7.1 MHz, 7.5 ohm at the collector, pi of input-side Q 3
DESIGNED = Stage(
    carrier=7.1e6,
    device=Device(
        family="bipolar",
        transfer_factor=9.166,
        exponent=1.0,
        threshold=0.7,
        threshold_softness=0.01,
        knee_voltage=0.184,
        knee_resistance=0.04,
        output_capacitance=90e-12,
        reverse_conduction=ReverseConduction(conductance=4.6, threshold=0.7, softness=0.03),
    ),
    drive=Drive(bias=0.2, amplitude=1.0),
    supply=Supply(voltage=13.8, choke=1.588e-6, choke_q=100.0),
    branches=(
        Branch("Cblock", "series", "capacitor", 83e-9, q=1000.0),
        Branch("C1", "shunt", "capacitor", 8.667e-9, q=1000.0),
        Branch("L1", "series", "coil", 191.3e-9, q=150.0, q_frequency=7.1e6),
        Branch("C2", "shunt", "capacitor", 3.538e-9, q=1000.0),
    ),
    load=SeriesLoad(50 + 0j, 7.1e6),
)
BEACON = load_stage(str(Path(__file__).parent.parent / "examples" / "beacon-as-built.toml"))
HARD = replace(DESIGNED, device=replace(DESIGNED.device, threshold_softness=0.0))
ORDINARY = stress.stages(150)
EXTREME = stress.stages(60, stress.EXTREME)
TRIODE = next(s for s in ORDINARY if s.device.amplification_factor and s.device.threshold_softness > 0)
VARACTOR = next(s for s in ORDINARY if s.device.junction_capacitance)


def driven(stage: Stage, factor: float) -> Stage:
    return replace(stage, drive=replace(stage.drive, amplitude=factor * stage.drive.amplitude))


def circuit_of(stages: list[Stage], orders: int) -> Circuit:
    return Circuit.of(stages, [ladder for ladder, _ in networks(stages, orders)], orders)


# --- equations


def test_jacobian_is_the_derivative_of_the_balance():
    soft = [s for s in (*ORDINARY[:60], TRIODE, VARACTOR) if s.device.threshold_softness > 0]
    circuit = circuit_of(soft, 12)
    random = np.random.default_rng(1)
    x = cold_start(circuit)
    noise = random.standard_normal((2, *x.shape))
    x = x + 0.05 * circuit.supply * (noise[0] + 1j * noise[1] * (np.arange(13) > 0))
    exact = jacobian(circuit, evaluate(circuit, x))
    step = 1e-6 * circuit.supply[:, 0]
    for column in range(26):
        if column == 1:  # of the mean's imaginary part, which stays 0
            continue
        shifted = np.zeros_like(x)
        shifted[:, column // 2] = step * (1j if column % 2 else 1)
        difference = evaluate(circuit, x + shifted).residual - evaluate(circuit, x - shifted).residual
        difference = difference.view(np.float64) / (2 * step[:, np.newaxis])
        error = np.abs(exact[:, :, column] - difference).max(axis=1) / np.abs(exact).max(axis=(1, 2))
        assert error.max() < 1e-6


def test_every_way_and_every_start_leads_to_the_same_solution():
    chosen = ORDINARY[:30]
    circuit = circuit_of(chosen, 24)
    known = solve(circuit)
    random = np.random.default_rng(7)
    for _ in range(3):
        parts = random.standard_normal((2, *known.unknowns.shape)) * 0.5 / np.arange(1, 26)
        start = circuit.supply * (parts[0] + 1j * parts[1] * (np.arange(25) > 0))
        again = solve(circuit, start)
        assert FAILED not in again.methods
        assert (np.abs(again.unknowns - known.unknowns).max(axis=1) / circuit.supply[:, 0]).max() < 1e-9


@pytest.mark.parametrize("hide", ["direct", "direct and softened knee"])
def test_fallbacks_lead_to_the_same_solution(monkeypatch, hide):
    """With Newton on the real stage refused at first, and then on softened knees as well."""
    circuit = circuit_of(ORDINARY[:6], 16)
    known = solve(circuit)
    real_knee = circuit.law.knee_voltage
    refused = {"count": 0}

    def newton_that_refuses(part, start, **options):
        out = newton(part, start, **options)
        rows = part.supply.shape[0]
        cold = bool((start[:, 2 : part.orders + 1] == 0).all())
        softer = (
            part.law.knee_voltage.max() > 15 * real_knee.max()
            if rows > 1
            else not np.isin(part.law.knee_voltage, real_knee).all()
        )
        full_drive = np.isin(part.amplitude, circuit.amplitude).all()
        if (cold and full_drive and not softer) or (softer and "knee" in hide):
            refused["count"] += 1
            out.converged[:] = False
        return out

    monkeypatch.setattr("rfstage.steady.solve.newton", newton_that_refuses)
    again = solve(circuit)
    assert refused["count"]
    assert set(again.methods) == {"drive steps" if "knee" in hide else "softened knee"}
    assert (np.abs(again.unknowns - known.unknowns).max(axis=1) / circuit.supply[:, 0]).max() < 1e-9


def test_a_batch_gives_each_stage_what_it_gets_alone():
    together = settle_many(ORDINARY[:25], orders=20)
    for stage, state in zip(ORDINARY[:25], together, strict=True):
        alone = settle(stage, orders=20)
        assert np.abs(state.device_voltage - alone.device_voltage).max() < 1e-9 * stage.supply.voltage


@pytest.mark.parametrize("kind", ["one part", "load", "supply", "a part with and without loss", "carrier"])
def test_a_sweep_gives_each_point_what_it_gets_alone(kind):
    c1 = DESIGNED.branches[1]

    def point(x):
        if kind == "one part":
            return with_second(replace(c1, value=x * c1.value))
        if kind == "load":
            return replace(DESIGNED, load=SeriesLoad(50 * x + 20j * (x - 1), DESIGNED.carrier))
        if kind == "supply":
            return replace(DESIGNED, supply=replace(DESIGNED.supply, voltage=13.8 * x))
        if kind == "carrier":
            return replace(DESIGNED, carrier=7.1e6 * x)
        return with_second(replace(c1, q=None if x > 1 else 500.0))

    def with_second(branch):
        return replace(DESIGNED, branches=(DESIGNED.branches[0], branch, *DESIGNED.branches[2:]))

    sweep = [point(x) for x in np.linspace(0.9, 1.1, 5)]
    for stage, state in zip(sweep, settle_many(sweep, orders=24), strict=True):
        alone = settle(stage, orders=24)
        assert state.stage is stage
        assert np.abs(state.device_voltage - alone.device_voltage).max() < 1e-9 * stage.supply.voltage
        assert state.output_power == pytest.approx(alone.output_power, rel=1e-9)
        assert state.branch_losses == pytest.approx(alone.branch_losses, rel=1e-8)


def test_a_known_solution_as_the_start_changes_nothing_but_the_work():
    before = settle(DESIGNED, orders=32)
    moved = driven(DESIGNED, 1.02)
    cold, warm = settle_many([moved], orders=32)[0], settle_many([moved], orders=32, start=before)[0]
    assert np.abs(cold.device_voltage - warm.device_voltage).max() < 1e-9 * 13.8
    assert settle(moved, start=before).output_power == pytest.approx(settle(moved).output_power, rel=1e-9)


# --- ideal limit


def current_source(softness: float) -> Stage:
    """A stage whose voltage stays forty knees away, so that the device is a current source."""
    device = replace(
        DESIGNED.device, threshold_softness=softness, knee_voltage=0.01, knee_resistance=0.0, reverse_conduction=None
    )
    return driven(replace(DESIGNED, device=device), 0.5 + 0.5 * 0.9)


def pulse_of(stage: Stage) -> tuple[float, float]:
    """Return half angle [rad] and peak current [A] of an ideal device under this drive."""
    above = stage.drive.bias + stage.drive.amplitude - stage.device.threshold
    half = math.acos((stage.device.threshold - stage.drive.bias) / stage.drive.amplitude)
    return half, stage.device.transfer_factor * above


def test_hard_current_source_approaches_the_closed_form_with_the_square_of_the_samples():
    stage = current_source(0.0)
    half, peak = pulse_of(stage)
    ideal = pulse_coefficients(half, highest_order=10)
    errors = []
    for orders in (32, 64, 128):  # 1024, 2048 and 4096 samples
        state = settle(stage, orders=orders)
        errors.append(np.abs(state.device_current[:11] / peak - ideal).max())
        voltage = -stage.ladder.impedance(stage.carrier * np.arange(1.0, 11), stage.load) * ideal[1:] * peak
        assert np.abs(state.device_voltage[1:11] - voltage).max() < 20 * errors[-1] * abs(voltage[0])
    # SOURCE: the trapezoidal rule across a corner, error proportional to the step squared
    assert errors[0] < 2e-5
    assert errors[2] < 1e-6
    assert errors[2] < errors[0] / 8


def test_soft_corner_makes_the_sampling_exact():
    stage = current_source(0.0)
    _, peak = pulse_of(stage)
    softness = 0.02 * peak / stage.device.transfer_factor
    stage = current_source(softness)
    state = settle(stage, orders=128)  # 1024 samples
    phase = 2 * math.pi / 65536 * np.arange(65536)
    above = stage.drive.bias + stage.drive.amplitude * np.cos(phase) - stage.device.threshold
    wave = stage.device.transfer_factor * softness * np.logaddexp(0, above / softness)
    exact = 2 * np.fft.rfft(wave, norm="forward")[:11].real
    exact[0] /= 2
    assert np.abs(state.device_current[:11] - exact).max() < 1e-10 * peak


# --- an independent route: the circuit integrated in time


def test_settled_state_comes_back_to_itself_when_the_circuit_is_integrated_over_a_cycle():
    carrier, supply, load = 7e6, 13.8, 50.0
    choke, choke_r, c1, blocking, coil, coil_r, c2 = 1.5e-6, 0.05, 3.1e-9, 40e-9, 0.42e-6, 0.15, 1.1e-9
    device = Device(
        family="fet",
        transfer_factor=1.6,
        exponent=1.5,
        threshold=3.0,
        threshold_softness=0.1,
        knee_voltage=0.5,
        knee_resistance=0.3,
        output_capacitance=400e-12,
        reverse_conduction=ReverseConduction(conductance=2.0, threshold=0.7, softness=0.1),
    )
    stage = Stage(
        carrier=carrier,
        device=device,
        drive=Drive(2.2, 2.6),
        supply=Supply(voltage=supply, choke=choke, choke_resistance=choke_r),
        branches=(
            Branch("C1", "shunt", "capacitor", c1),
            Branch("Cblock", "series", "capacitor", blocking),
            Branch("L1", "series", "coil", coil, series_resistance=coil_r),
            Branch("C2", "shunt", "capacitor", c2),
        ),
        load=SeriesLoad(complex(load), carrier),
    )
    state = settle(stage, orders=96)
    assert state.minimum_voltage < 0.1 * supply  # the knee takes part
    w = 2 * math.pi * carrier
    k = w * np.arange(1, 97)
    node = state.device_voltage[1:]
    at_load = 1 / (1 / load + 1j * k * c2)
    through = node / (1 / (1j * k * blocking) + coil_r + 1j * k * coil + at_load)
    start = [
        state.dc_current - float((node / (choke_r + 1j * k * choke)).real.sum()),
        float(state.device_voltage.real.sum()),
        float(state.device_voltage[0].real + (through / (1j * k * blocking)).real.sum()),
        float(through.real.sum()),
        float((through * at_load).real.sum()),
    ]

    def slopes(t, x):
        feed, volts, held, i, out = x
        drawn = float(current(device, control=2.2 + 2.6 * math.cos(w * t), voltage=volts)[0])
        return [
            (supply - choke_r * feed - volts) / choke,
            (feed - drawn - i) / (c1 + 400e-12),
            i / blocking,
            (volts - held - coil_r * i - out) / coil,
            (i - out / load) / c2,
        ]

    cycle = solve_ivp(
        slopes,
        (0, 1 / carrier),
        start,
        method="DOP853",
        rtol=1e-9,
        atol=1e-11,
        t_eval=np.arange(768)[::48] / 768 / carrier,
    )
    last = solve_ivp(slopes, (0, 1 / carrier), start, method="DOP853", rtol=1e-9, atol=1e-11).y[:, -1]
    # 96 orders leave 1e-6 of the voltage out; the integration is good to 1e-8
    np.testing.assert_allclose(last, start, atol=2e-5 * supply)
    np.testing.assert_allclose(
        cycle.y[1], state.waveform.voltage[:: state.waveform.voltage.size // 16], atol=2e-5 * supply
    )


# --- energy


def test_power_is_found_again_to_the_last_digits():
    for stage in (*ORDINARY[:60], TRIODE, VARACTOR):
        assert abs(settle(stage, orders=16).balance_error) < 1e-9


@pytest.mark.parametrize(
    "stage", [DESIGNED, TRIODE, VARACTOR, ORDINARY[3]], ids=["designed", "triode", "junction capacitance", "random"]
)
def test_powers_agree_with_an_account_by_chain_terms_and_waveform(stage):
    """Outside the walk: RF power at the device from the waveforms, load power from the chain terms."""
    state = settle(stage)
    assert state.device_voltage.shape == (state.orders_solved + 1,)
    frequencies = stage.carrier * np.arange(1.0, state.orders_solved + 1)
    a, b, _, _ = stage.ladder.chain(frequencies)
    z = stage.load.impedance(frequencies)
    at_load = state.device_voltage[1:] / (a + b / z)
    powers = np.abs(at_load) ** 2 / 2 * (1 / z).real
    assert state.output_power == pytest.approx(powers[0], rel=1e-8)
    wave = state.waveform
    assert state.dissipation == pytest.approx((wave.voltage * wave.current).mean(), rel=1e-12)
    rf = state.dc_power - stage.supply.choke_resistance * state.dc_current**2 - state.dissipation - state.charge_power
    rf_losses = sum(branch.loss for branch in state.branches) - stage.supply.choke_resistance * state.dc_current**2
    assert rf == pytest.approx(powers.sum() + rf_losses, abs=1e-8 * state.dc_power)
    assert state.dc_current == pytest.approx(wave.current.mean(), rel=1e-9)


def test_branch_losses_hold_every_part_but_choke_and_output_capacitance():
    state = settle(DESIGNED)
    assert list(state.branch_losses) == [branch.name for branch in DESIGNED.branches]
    assert all(loss >= 0 for loss in state.branch_losses.values())
    assert [branch.name for branch in state.branches] == [b.name for b in DESIGNED.ladder.branches]


def test_choke_resistance_counts_at_dc_and_a_blocking_capacitor_holds_the_supply():
    stage = replace(DESIGNED, supply=replace(DESIGNED.supply, choke_resistance=0.2, choke_q=math.inf))
    state = settle(stage)
    assert state.choke_loss == pytest.approx(0.2 * state.dc_current**2, rel=1e-9)
    assert state.device_voltage[0].real == pytest.approx(13.8 - 0.2 * state.dc_current, rel=1e-9)
    stress_of = {branch.name: branch for branch in state.branches}
    assert stress_of["Lchoke"].rms_current > state.dc_current
    assert stress_of["Cblock"].peak_voltage > state.device_voltage[0].real
    assert stress_of["C1"].peak_voltage < state.peak_voltage  # behind the blocking capacitor: no dc


# --- stages of every sort


def test_every_ordinary_stage_settles():
    for orders, some in ((32, ORDINARY), (64, ORDINARY[:40])):
        states = settle_many(some, orders=orders)
        assert max(state.residual for state in states) < 1e-11
        assert max(abs(state.balance_error) for state in states) < 1e-9


def test_every_extreme_stage_settles():
    states = settle_many(EXTREME, orders=32)
    assert {state.method for state in states} >= {"direct", "softened knee"}
    assert max(abs(state.balance_error) for state in states) < 1e-9


def test_chosen_orders_are_enough():
    """Against 256 orders; the rule is meant to be conservative by ten."""
    for stage in ORDINARY[:12]:
        state, fine = settle(stage), settle(stage, orders=256)
        if state.orders_solved == 256:
            continue
        assert state.change_from_half_the_orders.settled
        assert state.dc_current == pytest.approx(fine.dc_current, rel=5e-4)
        assert abs(10 * math.log10(state.output_power / fine.output_power)) < 0.005
        for one, other in zip(state.harmonics[:6], fine.harmonics[:6], strict=True):
            if other.level is not None and other.level > -80:
                assert abs(one.level - other.level) < 0.05


def test_a_resonance_above_the_orders_is_not_overlooked():
    """Of the output capacitance with a lead, at order 37.6: no figure moves between 16 and 32 orders."""
    state, few, fine = settle(BEACON), settle(BEACON, orders=32), settle(BEACON, orders=256)
    assert few.change_from_half_the_orders.settled
    assert state.change_from_half_the_orders.settled
    assert few.peak_voltage < 0.95 * fine.peak_voltage
    assert state.peak_voltage == pytest.approx(fine.peak_voltage, rel=5e-3)
    assert state.minimum_voltage == pytest.approx(fine.minimum_voltage, abs=5e-3 * 13.8)
    for one, other in zip(state.branches, fine.branches, strict=True):
        assert one.rms_current == pytest.approx(other.rms_current, rel=0.03)


def test_a_stage_without_strays_still_takes_32_orders():
    assert settle(DESIGNED).orders_solved == 32
    assert np.median([settle(stage).orders_solved for stage in ORDINARY[:60]]) == 32


def test_peak_voltages_of_chosen_orders_hold_against_256():
    random = np.random.default_rng(5)
    drawn = stress.stages(200)
    stages = [with_strays(stage, random) if k % 2 else stage for k, stage in enumerate(drawn)]
    chosen = np.array([settle(stage).peak_voltage for stage in stages])
    fine = np.array([state.peak_voltage for state in settle_many(stages, orders=256)])
    error = np.abs(chosen / fine - 1)
    assert np.percentile(error, 99) < 2e-3
    assert error.max() < 0.01


def with_strays(stage: Stage, random: np.random.Generator) -> Stage:
    """Return it with leads and windings whose own resonances lie anywhere from order 3 to 80."""
    omega, branches = 2 * math.pi * stage.carrier, []
    for branch in stage.branches:
        stray = 1 / (branch.value * (random.uniform(3, 80) * omega) ** 2)
        name = "self_capacitance" if branch.kind == "coil" else "lead_inductance"
        branches.append(branch if branch.name == "Cblock" else replace(branch, **{name: stray}))
    return replace(stage, branches=tuple(branches))


def test_a_lead_and_a_junction_resonate_as_a_lead_and_a_capacitance_do():
    """The ladder alone shows nothing then; with the junction's mean capacitance across it, it does."""
    grading = 0.01  # as good as constant
    junction = JunctionCapacitance(at_zero=120e-12 * (1 + 13.8 / 0.8) ** grading, potential=0.8, grading=grading)
    stage = replace(BEACON, device=replace(BEACON.device, output_capacitance=1e-12, junction_capacitance=junction))
    found = []
    for one in (BEACON, stage):
        system = Singles.of([one], 256)
        circuit = system.circuit(32)
        found.append(system.voltage_beyond(system.cycle(circuit, solve(circuit))))
    assert found[0] > 0.1 * 13.8
    assert found[1] == pytest.approx(found[0], rel=0.5)
    assert settle(stage).orders_solved > 32


def test_reported_changes_are_those_from_half_the_orders_even_where_256_do_not_settle():
    stage = ORDINARY[76]
    state, half = settle(stage), settle(stage, orders=128)
    change = state.change_from_half_the_orders
    assert state.orders_solved == 256
    assert not change.settled
    assert change.dc_current == pytest.approx(abs(1 - half.dc_current / state.dc_current), rel=1e-6)
    assert change.output_power_db == pytest.approx(
        abs(10 * math.log10(state.output_power / half.output_power)), rel=1e-6
    )
    moves = [abs(a.level - b.level) for a, b in zip(state.harmonics[:9], half.harmonics[:9], strict=True)]
    assert change.harmonics_db == pytest.approx(max(moves), abs=change.output_power_db * 1.01)
    assert change.peak_voltage == pytest.approx(abs(1 - half.peak_voltage / state.peak_voltage), rel=1e-6)
    assert settled_record(state)["change_from_half_the_orders"] == change._asdict()


@pytest.mark.parametrize(("listed", "orders"), [(2, 32), (16, 32), (17, 64), (60, 128), (130, 512)])
def test_listed_harmonics_choose_their_orders(listed, orders):
    state = settle(DESIGNED, listed=listed)
    assert state.orders_solved == orders
    assert state.harmonics[-1].order >= listed
    assert state.change_from_half_the_orders.settled


def test_listed_harmonics_need_orders_that_hold_them():
    assert settle(DESIGNED, orders=120, listed=60).harmonics[-1].order == 60
    with pytest.raises(OutOfRangeError, match="orders must be at least 120 for harmonics to the order 60"):
        settle(DESIGNED, orders=119, listed=60)
    with pytest.raises(OutOfRangeError, match="listed must be from 1 to 512"):
        settle(DESIGNED, listed=513)


def test_hard_corner_takes_four_times_the_samples():
    assert settle(HARD, orders=16).waveform.phase_deg.size == 512
    assert settle(DESIGNED, orders=16).waveform.phase_deg.size == 128


def test_designed_stage_gives_what_was_asked_within_a_few_percent():
    state = settle(DESIGNED)
    # its trough dips by 0.08 of the swing, which costs about 4 % of the power
    assert state.output_power == pytest.approx(10.0, rel=0.06)
    assert state.conduction_angle_deg == pytest.approx(120.0, abs=1e-9)
    assert [h.order for h in state.harmonics][:9] == list(range(2, 11))
    assert all(h.frequency == pytest.approx(h.order * 7.1e6) for h in state.harmonics)


def test_conduction_angle_with_a_mu_counts_the_effective_drive():
    state = settle(TRIODE)
    device, drive = TRIODE.device, TRIODE.drive
    phase = np.linspace(0, 2 * math.pi, 200_000, endpoint=False)
    orders = np.arange(state.device_voltage.size)
    volts = sum((state.device_voltage[k] * np.exp(1j * k * phase)).real for k in orders)
    effective = drive.bias + drive.amplitude * np.cos(phase) + volts / device.amplification_factor
    share = np.count_nonzero(effective > device.threshold) / phase.size
    assert state.conduction_angle_deg == pytest.approx(360 * share, abs=4 * 360 / phase.size)


# --- monotone and limiting behaviour


def test_dc_current_and_output_rise_with_the_drive():
    states = settle_many([driven(DESIGNED, x) for x in np.linspace(0.5, 1.3, 17)], orders=32)
    assert np.all(np.diff([s.dc_current for s in states]) >= 0)
    assert np.all(np.diff([s.output_power for s in states]) >= 0)


def test_output_of_a_saturated_stage_rises_with_the_supply():
    loud = driven(DESIGNED, 1.5)
    states = settle_many(
        [replace(loud, supply=replace(loud.supply, voltage=v)) for v in np.linspace(4, 16, 13)], orders=32
    )
    assert np.all(np.diff([s.output_power for s in states]) > 0)


def test_impedance_and_current_scale_together():
    """Twice the impedance everywhere and half the current: the same voltages, half the power."""
    d, s = DESIGNED.device, DESIGNED.supply
    parts = tuple(replace(b, value=b.value * 2 if b.kind == "coil" else b.value / 2) for b in DESIGNED.branches)
    high = replace(
        DESIGNED,
        branches=parts,
        load=SeriesLoad(100 + 0j, DESIGNED.carrier),
        supply=replace(s, choke=2 * s.choke, choke_resistance=2 * s.choke_resistance),
        device=replace(
            d,
            transfer_factor=d.transfer_factor / 2,
            knee_resistance=2 * d.knee_resistance,
            output_capacitance=d.output_capacitance / 2,
            reverse_conduction=replace(d.reverse_conduction, conductance=d.reverse_conduction.conductance / 2),
        ),
    )
    here, there = settle(DESIGNED, orders=32), settle(high, orders=32)
    np.testing.assert_allclose(there.device_voltage, here.device_voltage, atol=1e-9 * 13.8)
    assert there.output_power == pytest.approx(here.output_power / 2, rel=1e-9)


@pytest.mark.parametrize(
    "stage",
    [driven(HARD, 0.45), driven(DESIGNED, 0.05), driven(HARD, 0.0)],
    ids=["hard corner", "far foot of a soft one", "no drive"],
)
def test_drive_below_the_threshold_gives_no_output_and_no_nonsense(stage):
    state = settle(stage)
    assert not state.has_output
    assert state.dc_current == state.output_power == state.dissipation == state.choke_loss == 0
    assert state.efficiency is None
    assert all(h.level is None and h.load_power == 0 for h in state.harmonics)
    assert state.minimum_voltage == state.peak_voltage == 13.8
    assert state.conduction_angle_deg == 0
    assert state.balance_error == 0
    assert all(np.isfinite(wave).all() for wave in (state.waveform.voltage, state.waveform.current))


def test_bias_without_drive_draws_current_and_gives_nothing():
    idle = replace(DESIGNED, drive=Drive(DESIGNED.device.threshold + 0.1, 0.0))
    state = settle(idle)
    assert state.dc_current == pytest.approx(0.1 * DESIGNED.device.transfer_factor, rel=0.02)
    assert state.efficiency == 0
    assert state.conduction_angle_deg == 360
    assert {h.level for h in state.harmonics} == {None}


# --- refusals


def narrow(stage: Stage, degrees: float) -> Stage:
    """Return the stage with a pulse of this conduction angle, of 0.5 V above the threshold."""
    amplitude = 0.5 / (1 - math.cos(math.radians(degrees) / 2))
    return replace(stage, drive=Drive(stage.device.threshold + 0.5 - amplitude, amplitude))


@pytest.mark.parametrize("stage", [DESIGNED, HARD], ids=["soft", "hard"])
def test_a_pulse_between_the_samples_is_refused(stage):
    samples = 2048 if stage is DESIGNED else 8192
    with pytest.raises(
        ConvergenceError, match=r"^the current pulse is too narrow: its conduction angle is 0\.01°, and "
    ):
        settle(narrow(stage, 0.01))
    least = 6 * 360 / samples
    with pytest.raises(ConvergenceError, match=rf"256 orders resolve no less than {least:.3g}°$"):
        settle(narrow(stage, 0.8 * least))
    assert settle(narrow(stage, 1.2 * least)).has_output


def test_a_narrow_pulse_gets_more_orders_first():
    stage = narrow(DESIGNED, 6.0)
    for settled_at in (lambda: settle(stage, orders=32), lambda: settle_many([stage], orders=32)):
        with pytest.raises(
            ConvergenceError, match=r"conduction angle is 6°, and 32 orders resolve no less than 8\.44°"
        ):
            settled_at()
    with pytest.raises(ConvergenceError, match="the current pulse of stage 2 is too narrow"):
        settle_many([DESIGNED, stage, DESIGNED], orders=32)
    assert settle(stage).orders_solved >= 64


def test_the_round_pulse_of_a_threshold_not_reached_is_no_narrow_one():
    state, fine = settle(driven(DESIGNED, 0.45), orders=32), settle(driven(DESIGNED, 0.45), orders=256)
    assert state.conduction_angle_deg == 0
    assert state.dc_current > 0
    assert state.dc_current == pytest.approx(fine.dc_current, rel=1e-6)


def test_ladder_that_conducts_direct_current_is_refused():
    with pytest.raises(ImpossibleError, match="blocking capacitor"):
        settle(replace(DESIGNED, branches=DESIGNED.branches[1:]))


def test_load_with_a_capacitor_in_series_blocks_by_itself():
    stage = replace(DESIGNED, branches=DESIGNED.branches[1:], load=SeriesLoad(50 - 5j, DESIGNED.carrier))
    assert settle(stage).has_output


@pytest.mark.parametrize(
    "change",
    [
        {"carrier": 0.0},
        {"supply": replace(DESIGNED.supply, voltage=-13.8)},
        {"supply": replace(DESIGNED.supply, choke=0.0)},
        {"supply": replace(DESIGNED.supply, choke_resistance=-1.0)},
        {"drive": Drive(0.0, -1.0)},
        {"drive": Drive(math.nan, 1.0)},
    ],
    ids=["carrier", "supply", "choke", "choke resistance", "amplitude", "bias"],
)
def test_values_that_make_no_stage_are_refused(change):
    with pytest.raises(OutOfRangeError, match=r"must be"):
        settle(replace(DESIGNED, **change))


@pytest.mark.parametrize("orders", [9, 1025])
def test_order_numbers_out_of_range_are_refused(orders):
    with pytest.raises(OutOfRangeError, match="orders must be from 10 to 1024"):
        settle(DESIGNED, orders=orders)


def test_lossless_trap_tuned_to_a_harmonic_is_refused_with_its_order():
    w = 2 * math.pi * (2 * 7.1e6)
    coil = 3 * 1e-8  # one of the values for which 1 − ω²LC is zero to the last digit
    trap = Branch("L9", "series", "coil", coil, self_capacitance=1 / (w * w * coil))
    with pytest.raises(ImpossibleError, match="order 2"):
        settle(replace(DESIGNED, branches=(*DESIGNED.branches, trap)))


def test_unfinished_solution_is_never_returned(monkeypatch):
    def newton_that_fails(part, start, **options):
        out = newton(part, start, **options)
        out.converged[:] = False
        return out

    monkeypatch.setattr("rfstage.steady.solve.newton", newton_that_fails)
    with pytest.raises(ConvergenceError, match="steady state was not reached: a residual of"):
        settle(DESIGNED)
    with pytest.raises(ConvergenceError, match="of stage 2 was not reached: a residual of"):
        settle_many([driven(HARD, 0.0), DESIGNED], orders=32)


def test_orders_that_fail_on_the_way_do_not_stop_the_wanted_ones(monkeypatch):
    def newton_that_fails_when_coarse(part, start, **options):
        out = newton(part, start, **options)
        out.converged[:] &= part.orders > 16
        return out

    known = settle(DESIGNED, orders=32)
    monkeypatch.setattr("rfstage.steady.solve.newton", newton_that_fails_when_coarse)
    state = settle(DESIGNED, orders=32)
    assert state.change_from_half_the_orders is None
    assert np.abs(state.device_voltage - known.device_voltage).max() < 1e-9 * 13.8
