"""pi-L, T, tapped coil, link, capacitive divider: outside figures, exactness with losses, refusals that help."""

from __future__ import annotations

import cmath
import math
import re
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference_circuits import load_volts, loaded_q_by_energy, seen_impedance, solve_nodes

from rfstage import Job, design
from rfstage.errors import ImpossibleError, InputError
from rfstage.files.touchstone import read_load
from rfstage.ladder import Branch, Ladder
from rfstage.matching import divider, t, tapped
from rfstage.matching.networks import solve_network
from rfstage.matching.pil import pi_l_network
from rfstage.matching.quality import bandwidth, loaded_q
from rfstage.matching.tank import stresses, tank_efficiency
from rfstage.matching.task import Request

NEW = ("pi-l", "t", "tapped-coil", "link", "capacitive-divider")
WITH_Q = ("pi", *NEW)
LOSSLESS = math.inf
JOB = {"carrier": 7.1e6, "power": 10.0, "conduction_angle": 120.0, "supply": 50.0}


def solved(
    network: str,
    wanted: complex,
    load: complex,
    carrier: float = 7e6,
    feed: tuple[Branch, ...] = (),
    *,
    coil_q: float = 150.0,
    capacitor_q: float = 1000.0,
    **asked: object,
) -> tuple[Branch, ...]:
    request = Request(network, coil_q, capacitor_q, **asked)  # type: ignore[arg-type]
    return solve_network(request, feed=feed, wanted=complex(wanted), load=complex(load), carrier=carrier)


def reactance(value: float, carrier: float) -> float:
    return 2 * math.pi * carrier * float(value)


def named(error: pytest.ExceptionInfo[Exception], pattern: str) -> float:
    found = re.search(pattern, str(error.value))
    assert found, str(error.value)
    return float(found[1])


# --- outside figures -------------------------------------------------------------------------------------

# SOURCE: pi-L from R1 by Ri to 50 ohm, Q1 = 12, recomputed table: XC1, XL1, combined XC2, XL2; load current at
# 2, 3 and 4 times the carrier against the carrier's for equal device currents [dB]
PI_L = [
    pytest.param(1500.0, (125.000, 178.878, 39.853, 111.803), (-48.04, -63.82, -74.35), id="1500"),
    pytest.param(3000.0, (250.000, 324.295, 50.759, 111.803), (-47.86, -63.77, -74.35), id="3000"),
]


@pytest.mark.parametrize(("r1", "reactances", "transfer"), PI_L)
def test_pi_l_has_the_tabled_reactances_and_harmonics(r1, reactances, transfer):
    f = 3.5e6
    parts = pi_l_network(r1 + 0j, 50 + 0j, carrier=f, middle_resistance=300.0, input_q=12.0)
    found = [1 / reactance(b.value, f) if b.kind == "capacitor" else reactance(b.value, f) for b in parts]
    assert [b.name for b in parts] == ["C1", "L1", "C2", "L2"]
    assert found == pytest.approx(reactances, abs=0.0006)  # three printed decimals
    volts = load_volts(parts, 50.0, f * np.arange(1, 5))
    decibels = 20 * np.log10(np.abs(volts[1:] / volts[0]))
    assert decibels == pytest.approx(transfer, abs=0.006)  # two printed decimals


def test_second_coil_of_a_pi_l_is_that_of_the_published_l():
    # SOURCE: D. K. Misra, Radio-Frequency and Microwave Communication Circuits, 2nd ed. (2004), Ex. 6.7, p. 212:
    # from 173.2 to 50 ohm Xs 78.49, Q 1.5698.
    made = pi_l_network(600 + 0j, 50 + 0j, carrier=400e6, middle_resistance=173.205, loaded_q=9.0)
    assert reactance(made[3].value, 400e6) == pytest.approx(78.49, abs=0.006)


def test_t_between_equal_resistances_is_two_published_ls_back_to_back():
    # SOURCE: D. K. Misra, 2nd ed. (2004), Ex. 6.6, p. 210: 600 to 50 ohm, Q 3.3166, Xs 165.831, Xp 180.907; two of
    # them share their shunt arm.
    parts = t.t_network(50 + 0j, 50 + 0j, carrier=400e6, loaded_q=2 * math.sqrt(11))
    first, shunt, last = (reactance(b.value, 400e6) for b in parts)
    assert (first, last) == pytest.approx((165.831, 165.831), abs=0.0006)
    assert 1 / shunt == pytest.approx(180.907 / 2, abs=0.0006)
    assert 2 * float(f"{math.sqrt(11):.5g}") == pytest.approx(2 * 3.3166, abs=1e-4)


def test_t_is_the_dual_of_the_tabled_pi():
    # SOURCE: the row 1000/50/12 of the recomputed pi table: XC1 83.333, XL 100, XC2 20 ohm, Q 12 + 2.5; turned
    # into its dual by 1000 * 50 ohm squared.
    parts = t.t_network(50 + 0j, 1000 + 0j, carrier=7e6, loaded_q=14.5)
    first, shunt, last = (reactance(b.value, 7e6) for b in parts)
    assert first == pytest.approx(50e3 / 83.3333, rel=1e-6)
    assert 1 / shunt == pytest.approx(50e3 / 100, rel=1e-6)
    assert last == pytest.approx(50e3 / 20, rel=1e-6)


def test_loaded_q_of_a_parallel_tank_is_the_published_one():
    # SOURCE: D. K. Misra, 2nd ed. (2004), Ex. 5.2, p. 163: 10 uH, 10 pF, 100 kohm of its own and 100 kohm of load:
    # Q 100, loaded 50.
    f = 1 / (2 * math.pi * math.sqrt(10e-6 * 10e-12))
    tank = (
        Branch("C1", "shunt", "capacitor", 10e-12),
        Branch("L1", "shunt", "coil", 10e-6, q=100.0, q_frequency=f),
    )
    assert loaded_q((), tank, 100e3 + 0j, f) == pytest.approx(50.0, rel=2e-4)  # series form of the coil's loss


def test_bandwidth_of_a_parallel_tank_is_the_published_one():
    # SOURCE: A. Malvino & D. Bates, Electronic Principles, 7th ed., Ex. 12-12, p. 410: 2 uH, 470 pF, coil Q 100,
    # 1 kohm: 5.19 MHz, XL 65.2 ohm, Q 13.3, bandwidth 390 kHz.
    from rfstage.load import SeriesLoad

    f = 1 / (2 * math.pi * math.sqrt(2e-6 * 470e-12))
    assert f == pytest.approx(5.19e6, abs=0.005e6)
    tank = (
        Branch("C1", "shunt", "capacitor", 470e-12),
        Branch("L1", "shunt", "coil", 2e-6, q=100.0, q_frequency=f),
    )
    assert loaded_q((), tank, 1000 + 0j, f) == pytest.approx(13.3, abs=0.05)
    assert bandwidth(tank, SeriesLoad(1000 + 0j, f), f) == pytest.approx(390e3, rel=5e-3)  # three printed figures


@pytest.mark.parametrize(("high", "low"), [(2000.0, 50.0), (50.0, 12.5), (600.0, 50.0)])
@pytest.mark.parametrize("device_high", [True, False])
def test_tap_of_a_tightly_coupled_coil_stands_at_the_root_of_the_ratio(high, low, device_high):
    # SOURCE: the ideal autotransformer of every handbook; common practice, no source. At a coupling of 0.9999 the
    # leakage is a few thousandths of the coil.
    wanted, load = (high, low) if device_high else (low, high)
    parts = tapped.tapped_coil(wanted + 0j, load + 0j, carrier=7e6, coupling=0.9999, tank_q=10.0)
    coil = next(b for b in parts if b.kind == "coupled")
    assert coil.tap == ("load" if device_high else "device")
    assert tapped.tap_share(coil) == pytest.approx(math.sqrt(low / high), rel=0.01)


@pytest.mark.parametrize("coupling", [0.1, 0.35, 0.8])
def test_link_at_its_least_q_has_critical_coupling(coupling):
    # SOURCE: k = 1/sqrt(Q1 Q2), F. E. Terman, Radio Engineers' Handbook (from memory).
    parts = solved(
        "link", 1000, 50, coil_q=LOSSLESS, capacitor_q=LOSSLESS, coupling=coupling, loaded_q=2.0001 / coupling
    )
    pair = parts[1]
    tank_q = 1000 * reactance(parts[0].value, 7e6)
    assert tank_q * reactance(float(pair.second), 7e6) / 50 == pytest.approx(1 / coupling**2, rel=1e-3)
    assert tank_q == pytest.approx(1 / coupling, rel=0.02)  # both Qs alike; 0.0001 above the least moves them 1 %


@pytest.mark.parametrize("joint", ["load", "device"])
def test_divider_of_high_q_is_the_handbook_s_ratio_of_capacitors(joint):
    # SOURCE: R_top/R_joint = (1 + C2/C1)^2 where the joint takes little current; common practice, no source.
    ends = (5000.0, 50.0) if joint == "load" else (50.0, 5000.0)
    parts = divider.divider(complex(ends[0]), complex(ends[1]), carrier=7e6, loaded_q=500.0)
    values = {b.place: float(b.value) for b in parts if b.kind == "capacitor"}
    assert (1 + values["shunt"] / values["series"]) ** 2 == pytest.approx(100.0, rel=0.01)


# --- exact with losses -----------------------------------------------------------------------------------


def standing_wave(ratio: float, degrees: float, resistance: float = 50.0) -> complex:
    reflection = cmath.rect((ratio - 1) / (ratio + 1), math.radians(degrees))
    return resistance * (1 + reflection) / (1 - reflection)


def feed_for(resistance: float, carrier: float, *, capacitive: float, choke: bool, ratio: float) -> tuple[Branch, ...]:
    """Output capacitance of so many times the conductance, choke with blocking capacitor, and a transformer."""
    omega = 2 * math.pi * carrier
    found = []
    if capacitive:
        found.append(Branch("Cout", "shunt", "capacitor", capacitive / (omega * resistance), origin="device"))
    if choke:
        found.append(Branch("Lchoke", "shunt", "coil", 10 * resistance / omega, q=100.0, q_frequency=carrier))
        found.append(Branch("Cblock", "series", "capacitor", 10 / (omega * min(resistance, 50.0)), q=1000.0))
    if ratio != 1:
        core = 10 * resistance / omega
        wound = Branch("T1", "through", "transformer", 1 / ratio, second=core, lead_inductance=0.01 * core)
        found.append(replace(wound, second_q=20.0, q_frequency=carrier))
    return tuple(found)


tasks = st.fixed_dictionaries(
    {
        "network": st.sampled_from(WITH_Q),
        "wanted": st.builds(complex, st.floats(0.7, 3.4).map(lambda x: 10.0**x), st.just(0.0)),
        "load": st.builds(standing_wave, st.floats(1.0, 3.0), st.floats(0.0, 360.0)),
        "carrier": st.floats(6.0, 8.5).map(lambda x: 10.0**x),
        "coil_q": st.floats(80.0, 500.0),
        "capacitor_q": st.floats(300.0, 3000.0),
        "loaded_q": st.one_of(st.none(), st.floats(6.0, 20.0)),
        "capacitive": st.sampled_from([0.0, 0.05, 0.5, 1.5]),
        "choke": st.booleans(),
        "ratio": st.sampled_from([1.0, 1.0, 0.5, 2.0, 3.0]),
        "reactive": st.floats(-0.8, 0.8),
    }
)


def attempted(task: dict[str, object]) -> tuple[tuple[Branch, ...], tuple[Branch, ...], complex] | None:
    """Feed, parts and wanted impedance of a task, or None where it was refused."""
    wanted = complex(task["wanted"].real, 0)  # type: ignore[union-attr]
    feed = feed_for(
        wanted.real, task["carrier"], capacitive=task["capacitive"], choke=task["choke"], ratio=task["ratio"]
    )
    wanted = wanted * (1 + 1j * task["reactive"])
    names = ("network", "load", "carrier", "coil_q", "capacitor_q", "loaded_q")
    try:
        parts = solved(wanted=wanted, feed=feed, **{name: task[name] for name in names})
    except ImpossibleError:
        return None
    return feed, parts, wanted


@settings(max_examples=120)
@given(task=tasks)
def test_any_network_shows_the_wanted_impedance_to_node_equations_and_to_scikit_rf(task):
    found = attempted(task)
    if found is None:
        return
    feed, parts, wanted = found
    branches, load, f = (*feed, *parts), task["load"], task["carrier"]
    own = complex(Ladder(branches).impedance(f, load))
    assert abs(own / wanted - 1) < 1e-9
    volts, readings = solve_nodes(branches, load, f)
    assert abs(volts[0] / wanted - 1) < 1e-9
    assert abs(volts[0] / own - 1) < 1e-10
    assert abs(seen_impedance(branches, load, f)[0] / own - 1) < 1e-9  # S-parameters of 50 ohm lose a digit here
    # the load's voltage and every part's loss too: what efficiency and stresses are made of
    passed = complex(Ladder(branches).transimpedance(f, load))
    assert abs(volts[-1] / passed - 1) < 1e-9
    for reading, stress in zip(readings, stresses(branches, load, f, 1.0), strict=True):
        assert stress.loss == pytest.approx(reading.loss, rel=1e-8, abs=1e-10 * volts[0].real)
        assert stress.rms_current == pytest.approx(abs(reading.current) / math.sqrt(2), rel=1e-8)


@settings(max_examples=120)
@given(task=tasks)
def test_any_network_has_the_loaded_q_asked_by_the_energy_in_its_parts(task):
    found = attempted(task)
    if found is None or task["loaded_q"] is None:
        return
    feed, parts, _ = found
    counted = [b.origin == "device" for b in feed] + [True] * len(parts)
    by_energy = loaded_q_by_energy((*feed, *parts), counted, task["load"], task["carrier"])
    assert by_energy == pytest.approx(task["loaded_q"], rel=1e-9)


@settings(max_examples=60)
@given(task=tasks)
def test_any_network_gives_out_no_more_than_it_takes(task):
    found = attempted(task)
    if found is None:
        return
    feed, parts, wanted = found
    branches, load, f = (*feed, *parts), task["load"], task["carrier"]
    efficiency = tank_efficiency(branches, load, f)
    assert 0 < efficiency < 1
    lost = sum(part.loss or 0.0 for part in stresses(branches, load, f, 1.0))
    assert efficiency == pytest.approx(1 - 2 * lost / wanted.real, rel=1e-8)
    sweep = f * np.geomspace(0.1, 12.0, 40)
    assert np.all(Ladder(branches).impedance(sweep, 50.0).real > 0)
    assert all((part.loss or 0.0) >= 0 for part in stresses(branches, load, f, 1.0))


def scaled(b: Branch, *, coil: float, capacitor: float) -> Branch:
    if b.kind == "coupled":
        return replace(b, value=float(b.value) * coil, second=float(b.second) * coil)
    return replace(b, value=float(b.value) * (coil if b.kind == "coil" else capacitor))


def numbers(parts: tuple[Branch, ...]) -> list[float]:
    return [float(x) for b in parts for x in (b.value, b.second)]


UNLIKE = pytest.mark.parametrize(("wanted", "load"), [(1200.0, 50 + 12j), (9.0, 60 - 20j)], ids=["down", "up"])


@pytest.mark.parametrize("network", NEW)
@UNLIKE
def test_ten_times_the_carrier_is_a_tenth_of_every_part(network, wanted, load):
    low = solved(network, wanted, load, 3e6)
    high = solved(network, wanted, load, 30e6)
    expected = [scaled(b, coil=0.1, capacitor=0.1) for b in low]
    assert numbers(high) == pytest.approx(numbers(tuple(expected)), rel=1e-8)


@pytest.mark.parametrize("network", NEW)
@UNLIKE
def test_four_times_the_impedances_are_four_times_the_coils_and_a_quarter_of_the_capacitors(network, wanted, load):
    one = solved(network, wanted, load, 7e6)
    other = solved(network, 4 * wanted, 4 * load, 7e6)
    expected = [scaled(b, coil=4.0, capacitor=0.25) for b in one]
    assert numbers(other) == pytest.approx(numbers(tuple(expected)), rel=1e-8)


def turned_round(parts: tuple[Branch, ...]) -> tuple[Branch, ...]:
    found = []
    for b in reversed(parts):
        if b.kind == "coupled" and not b.tap:
            found.append(replace(b, value=b.second, second=b.value))
        elif b.kind == "coupled":
            found.append(replace(b, tap="device" if b.tap == "load" else "load"))
        else:
            found.append(b)
    return tuple(found)


@pytest.mark.parametrize("network", NEW)
@UNLIKE
def test_lossless_network_turned_round_matches_the_conjugates(network, wanted, load):
    parts = solved(network, wanted, load, coil_q=LOSSLESS, capacitor_q=LOSSLESS)
    volts, _ = solve_nodes(turned_round(parts), complex(wanted).conjugate(), 7e6)
    assert abs(volts[0] / complex(load).conjugate() - 1) < 1e-9


@pytest.mark.parametrize("network", NEW)
@UNLIKE
def test_network_is_reciprocal(network, wanted, load):
    # SOURCE: reciprocity: voltage at one end for a current into the other is the same either way; open ends
    parts = solved(network, wanted, load)
    away = 1e9
    forwards, _ = solve_nodes((*parts, Branch("R", "shunt", "resistor", 50.0)), away, 8e6)
    backwards, _ = solve_nodes((Branch("R", "shunt", "resistor", 50.0), *turned_round(parts)), away, 8e6)
    assert abs(forwards[-1] / backwards[-1] - 1) < 1e-5  # 1 Gohm is no open end


@pytest.mark.parametrize("network", NEW)
def test_network_begins_where_a_filter_or_a_feed_leaves_off_its_names(network):
    parts = solved(network, 900, 50)
    assert len({b.name for b in parts}) == len(parts)


@pytest.mark.parametrize("network", ["l", "l-high-pass", *WITH_Q])
def test_measured_load_is_matched_by_every_network(network, examples):
    load = read_load(examples / "gallery-antenna.s1p")
    made = design(
        Job(**{**JOB, "carrier": 14.2e6}, network=network, load=load, output_capacitance=30e-12), textbook=True
    )
    branches = tuple(part.branch for part in made.tank.parts)
    at = complex(load.impedance(14.2e6))
    assert at.imag != 0
    volts, _ = solve_nodes(branches, at, 14.2e6)
    assert abs(volts[0] / made.point.load_resistance - 1) < 1e-9
    power = abs(volts[-1] * made.point.fundamental_current) ** 2 / 2 * (1 / at).real
    assert power == pytest.approx(10.0, rel=1e-9)


@pytest.mark.parametrize("network", ["pi", "pi-l", "link", "tapped-coil"])
def test_input_side_q_asked_is_that_of_all_capacitance_across_the_device(network):
    made = design(Job(**JOB, network=network, input_q=9.0, output_capacitance=20e-12), textbook=True)
    branches = {part.branch.name: part.branch for part in made.tank.parts}
    across = float(branches["Cout"].value) + float(branches["C1"].value)
    assert reactance(across, 7.1e6) * made.point.load_resistance == pytest.approx(9.0, rel=1e-9)
    assert made.tank.input_q == pytest.approx(9.0, rel=1e-9)


@pytest.mark.parametrize("tap", [0.3, 0.45, 0.7])
def test_tap_asked_is_the_tap_of_the_coil(tap):
    made = solved("tapped-coil", 900, 50, tap=tap, coupling=0.5)
    coil = made[1]
    assert tapped.tap_share(coil) == pytest.approx(tap, rel=1e-12)
    volts, _ = solve_nodes(made, 50.0, 7e6)
    assert abs(volts[0] / 900 - 1) < 1e-9


@pytest.mark.parametrize("network", ["link", "tapped-coil"])
def test_coupling_asked_is_that_of_the_pair(network):
    pair = next(b for b in solved(network, 900, 50, coupling=0.27) if b.kind == "coupled")
    assert pair.coupling == 0.27


def test_tapped_coil_has_the_asked_q_as_one_coil_whatever_its_tap():
    # SOURCE: by definition, the whole coil alone: reactance over resistance from end to end
    coil = solved("tapped-coil", 900, 50, coil_q=150.0)[1]
    ports = coil.ports(7e6)
    whole = complex(ports.own if coil.tap == "load" else ports.far)
    assert whole.imag / whole.real == pytest.approx(150.0, rel=0.02)  # set before the parts move over their losses


def test_middle_resistance_asked_stands_between_the_sections():
    parts = solved("pi-l", 1500, 50, coil_q=LOSSLESS, capacitor_q=LOSSLESS, middle_resistance=300.0, loaded_q=15.0)
    beyond = solve_nodes(parts[3:], 50.0, 7e6)[0][0]
    assert 1 / (1 / beyond).real == pytest.approx(300.0, rel=1e-9)


def test_untuned_link_has_no_capacitor_in_its_link():
    assert [b.kind for b in solved("link", 1000, 50, link="untuned", loaded_q=25.0)] == ["capacitor", "coupled"]
    assert [b.kind for b in solved("link", 1000, 50, link="tuned")] == ["capacitor", "coupled", "capacitor"]


# --- refusals --------------------------------------------------------------------------------------------


@pytest.mark.parametrize("network", ["link", "tapped-coil"])
@pytest.mark.parametrize("coupling", [0.0, -0.2, 1.0, 1.5])
def test_coupling_outside_nothing_to_one_is_refused(network, coupling):
    with pytest.raises(InputError, match=r"tank\.coupling: got .*; allowed above 0, to 0\.9999"):
        Job(**JOB, network=network, coupling=coupling)


@pytest.mark.parametrize("tap", [0.0, -0.1, 1.0, 2.0])
def test_tap_outside_the_coil_is_refused(tap):
    with pytest.raises(InputError, match=r"tank\.tap: got .*; allowed above 0, to 0\.9999"):
        Job(**JOB, network="tapped-coil", tap=tap)


@pytest.mark.parametrize(("wanted", "load"), [(900.0, 50.0), (50.0, 900.0), (4000.0, 20.0)])
@pytest.mark.parametrize("coupling", [0.2, 0.6])
def test_tap_too_low_is_refused_with_the_least_that_works(wanted, load, coupling):
    lossless = {"coil_q": LOSSLESS, "capacitor_q": LOSSLESS, "coupling": coupling}
    with pytest.raises(ImpossibleError, match=r"tank\.tap: got 0\.02 of the turns") as error:
        solved("tapped-coil", wanted, load, tap=0.02, **lossless)
    least = named(error, r"must be above ([\d.]+), and below 1")
    with pytest.raises(ImpossibleError):
        solved("tapped-coil", wanted, load, tap=0.99 * least, **lossless)
    parts = solved("tapped-coil", wanted, load, tap=1.01 * least, **lossless)
    assert abs(solve_nodes(parts, load, 7e6)[0][0] / wanted - 1) < 1e-9


@pytest.mark.parametrize("network", ["pi-l", "t", "link", "capacitive-divider"])
@pytest.mark.parametrize(("wanted", "load"), [(1200.0, 50.0), (9.0, 60.0)], ids=["down", "up"])
def test_loaded_q_too_low_is_refused_with_the_least_that_works(network, wanted, load):
    lossless = {"coil_q": LOSSLESS, "capacitor_q": LOSSLESS}
    with pytest.raises(ImpossibleError, match=r"tank\.loaded_q: 0\.5 is too low") as error:
        solved(network, wanted, load, loaded_q=0.5, **lossless)
    least = named(error, r"must be above ([\d.]+)")
    with pytest.raises(ImpossibleError):
        solved(network, wanted, load, loaded_q=0.99 * least, **lossless)
    parts = solved(network, wanted, load, loaded_q=1.01 * least, **lossless)
    counted = [True] * len(parts)
    assert loaded_q_by_energy(parts, counted, load, 7e6) == pytest.approx(1.01 * least, rel=1e-9)


@pytest.mark.parametrize("network", ["pi-l", "t", "link", "capacitive-divider"])
@UNLIKE
def test_least_loaded_q_into_a_reactive_load_is_near_the_one_said(network, wanted, load):
    # the energy that the load's reactance stores for the network is none of the tank's, so that the Q said, of the
    # closed form, is a bound from below; up to a tenth above it the network closes
    lossless = {"coil_q": LOSSLESS, "capacitor_q": LOSSLESS}
    with pytest.raises(ImpossibleError, match=r"tank\.loaded_q: 0\.5 is too low") as error:
        solved(network, wanted, load, loaded_q=0.5, **lossless)
    least = named(error, r"must be above ([\d.]+)")
    with pytest.raises(ImpossibleError):
        solved(network, wanted, load, loaded_q=0.99 * least, **lossless)
    parts = solved(network, wanted, load, loaded_q=1.1 * least, **lossless)
    assert abs(solve_nodes(parts, complex(load), 7e6)[0][0] / wanted - 1) < 1e-9


def test_output_capacitance_raises_the_least_q_of_a_tapped_coil():
    feed = feed_for(900.0, 7e6, capacitive=8.0, choke=False, ratio=1.0)
    with pytest.raises(ImpossibleError, match=r"tank\.loaded_q: 6 is too low for network tapped-coil") as error:
        solved("tapped-coil", 900, 50, feed=feed, loaded_q=6.0, coil_q=LOSSLESS, capacitor_q=LOSSLESS)
    least = named(error, r"must be above ([\d.]+)")
    parts = solved("tapped-coil", 900, 50, feed=feed, loaded_q=1.01 * least, coil_q=LOSSLESS, capacitor_q=LOSSLESS)
    assert abs(solve_nodes((*feed, *parts), 50.0, 7e6)[0][0] / 900 - 1) < 1e-9


@pytest.mark.parametrize("load", [50 + 0j, 40 + 25j, 60 - 10j])
@pytest.mark.parametrize("coupling", [0.15, 0.5])
def test_untuned_link_too_loose_is_refused_with_the_least_q_that_works(load, coupling):
    lossless = {"coil_q": LOSSLESS, "capacitor_q": LOSSLESS, "coupling": coupling, "link": "untuned"}
    with pytest.raises(ImpossibleError, match="too l") as error:
        solved("link", 1000, load, loaded_q=2.0, **lossless)
    least = named(error, r"above ([\d.]+)")
    parts = solved("link", 1000, load, input_q=1.01 * least, **lossless)
    assert abs(solve_nodes(parts, load, 7e6)[0][0] / 1000 - 1) < 1e-9
    with pytest.raises(ImpossibleError, match=r"tank\.coupling: .* is too loose for an untuned link") as error:
        solved("link", 1000, load, input_q=0.99 * least, **lossless)
    assert named(error, r"tank Q above ([\d.]+)") == pytest.approx(least, rel=1e-3)


@pytest.mark.parametrize("middle", [10.0, 50.0])
def test_middle_resistance_not_above_the_load_s_is_refused(middle):
    with pytest.raises(ImpossibleError, match=r"tank\.middle_resistance: got .* must be above 50 ohm"):
        solved("pi-l", 1000, 50, middle_resistance=middle)


def test_middle_resistance_below_what_the_load_s_inductance_leaves_is_refused_with_one_that_works():
    load = 30 + 60j
    with pytest.raises(ImpossibleError, match="whose own inductance is more") as error:
        solved("pi-l", 1000, load, middle_resistance=40.0)
    least = named(error, r"above ([\d.]+) ohm leaves room")
    parts = solved("pi-l", 1000, load, middle_resistance=1.01 * least, coil_q=LOSSLESS, capacitor_q=LOSSLESS)
    assert abs(solve_nodes(parts, load, 7e6)[0][0] / 1000 - 1) < 1e-9


@pytest.mark.parametrize(
    ("network", "wanted", "load"),
    [("t", 1000, 50), ("capacitive-divider", 1000, 50), ("tapped-coil", 20, 50), ("capacitive-divider", 20, 50)],
)
def test_input_side_q_is_refused_where_no_capacitor_stands_across_the_device(network, wanted, load):
    with pytest.raises(ImpossibleError, match=rf"tank\.input_q: got 8 for network {network}, .* ask for a loaded Q"):
        solved(network, wanted, load, input_q=8.0)


OWN = {
    "middle_resistance": (300.0, ("pi-l",)),
    "coupling": (0.3, ("tapped-coil", "link")),
    "tap": (0.4, ("tapped-coil",)),
    "link": ("untuned", ("link",)),
}


@pytest.mark.parametrize("key", OWN)
@pytest.mark.parametrize("network", ["l", "l-high-pass", *WITH_Q])
def test_key_of_another_network_is_refused_naming_its_owner(key, network):
    value, owners = OWN[key]
    if network in owners:
        assert getattr(Job(**JOB, network=network, **{key: value}), key) == value
        return
    words = rf"tank\.{key}: is of no use for network {network}; it belongs to {' and '.join(owners)}"
    with pytest.raises(InputError, match=words):
        Job(**JOB, network=network, **{key: value})


def test_tap_and_q_together_are_refused():
    with pytest.raises(InputError, match=r"tank\.tap: got both a tap and a Q"):
        Job(**JOB, network="tapped-coil", tap=0.4, loaded_q=12.0)


def test_ends_too_near_for_a_tap_say_so_and_pi_joins_them():
    with pytest.raises(ImpossibleError, match=r"too near each other for a tap between them; network pi joins them"):
        solved("tapped-coil", 50, 50.2, coupling=0.4)
    assert abs(solve_nodes(solved("pi", 50, 50.2), 50.2, 7e6)[0][0] / 50 - 1) < 1e-9


def test_load_more_capacitive_than_a_tuned_link_is_refused_with_what_leaves_room():
    load = 20 - 90j
    with pytest.raises(ImpossibleError, match=r"more capacitive than the link .* a looser tank\.coupling") as error:
        solved("link", 1000, load, coupling=0.6, loaded_q=12.0)
    assert "tank.link untuned" in str(error.value)
    for ways_out in ({"coupling": 0.06, "loaded_q": 40.0}, {"coupling": 0.15, "loaded_q": 13.4}):
        parts = solved("link", 1000, load, **ways_out)
        assert abs(solve_nodes(parts, load, 7e6)[0][0] / 1000 - 1) < 1e-9
    parts = solved("link", 1000, load, coupling=0.6, link="untuned", loaded_q=30.0)
    assert abs(solve_nodes(parts, load, 7e6)[0][0] / 1000 - 1) < 1e-9
