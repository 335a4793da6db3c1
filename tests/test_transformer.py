"""A wide-band transformer before the network, and what a filter behind it shows at the harmonics: by node equations."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from itertools import pairwise

import pytest
from reference_circuits import solve_nodes

from rfstage import design
from rfstage.errors import InputError
from rfstage.job import Job

JOB = Job(carrier=7.1e6, power=100.0, conduction_angle=120.0, supply=13.8, network="pi", transformer=3.0)
WORDS = ("--carrier", "7.1MHz", "--power", "100W", "--angle", "120deg", "--supply", "13.8V", "--network", "pi")
OMEGA = 2 * math.pi * JOB.carrier


def transformer_of(made):
    (part,) = [p for p in made.tank.parts if p.branch.kind == "transformer"]
    return part


def seen(made):
    """What the device sees, and each branch's reading for one ampere."""
    branches = [p.branch for p in made.tank.parts]
    volts, readings = solve_nodes(branches, made.settings.load_impedance, made.job.carrier)
    return complex(volts[0]), readings


def test_ratio_and_inductances_are_those_asked():
    job = replace(JOB, transformer_magnetizing=1e-6, transformer_leakage=2e-9)
    branch = transformer_of(design(job, textbook=True)).branch
    assert (branch.place, branch.value, branch.second, branch.lead_inductance) == ("through", 1 / 3.0, 1e-6, 2e-9)
    assert (branch.second_q, branch.q_frequency) == (20.0, job.carrier)


@pytest.mark.parametrize("textbook", [True, False])
def test_defaults_are_ten_times_the_load_resistance_and_a_hundredth_of_that(textbook):
    made = design(JOB, textbook)
    branch = transformer_of(made).branch
    assert OMEGA * branch.second == pytest.approx(10 * made.point.load_resistance, rel=1e-9)
    assert branch.lead_inductance == pytest.approx(branch.second / 100, rel=1e-12)
    assert made.assumed["tank.transformer_magnetizing"] == branch.second
    assert made.assumed["tank.transformer_leakage"] == branch.lead_inductance


def test_leakage_follows_a_magnetizing_inductance_that_was_given():
    made = design(replace(JOB, transformer_magnetizing=3e-7), textbook=True)
    assert transformer_of(made).branch.lead_inductance == pytest.approx(3e-9, rel=1e-12)
    assert "tank.transformer_magnetizing" not in made.assumed


def test_it_stands_between_blocking_capacitor_and_network():
    names = [p.branch.name for p in design(JOB, textbook=True).tank.parts]
    assert names.index("Cblock") + 1 == names.index(transformer_of(design(JOB, textbook=True)).branch.name)
    assert names[-3:] == ["C1", "L1", "C2"]


@pytest.mark.parametrize(
    "network", ["l", "l-high-pass", "pi", "pi-l", "t", "tapped-coil", "link", "capacitive-divider"]
)
@pytest.mark.parametrize("ratio", [0.5, 2.0, 4.0])
def test_the_device_sees_its_resistance_and_its_power_arrives(network, ratio):
    job = replace(JOB, network=network, transformer=ratio, supply=50.0, output_capacitance=200e-12)
    made = design(job, textbook=True)
    z, readings = seen(made)
    wanted = made.point.load_resistance
    assert abs(z - wanted) <= 1e-9 * wanted
    # power balance: what the parts do not lose is the asked power at the load
    lost = sum(r.loss for r in readings)
    current = made.point.fundamental_current
    assert (z.real / 2 - lost) * current**2 == pytest.approx(job.power, rel=1e-7)


def test_its_loss_volts_and_amperes_are_those_of_the_node_equations():
    made = design(JOB, textbook=True)
    part = transformer_of(made)
    place = [p.branch.name for p in made.tank.parts].index(part.branch.name)
    reading, current = seen(made)[1][place], made.point.fundamental_current
    assert part.loss == pytest.approx(reading.loss * current**2, rel=1e-7)
    assert part.peak_voltage == pytest.approx(abs(reading.across) * current, rel=1e-7)
    assert part.far_voltage == pytest.approx(abs(reading.far_voltage) * current, rel=1e-7)
    assert part.far_current == pytest.approx(abs(reading.far_current) * current / math.sqrt(2), rel=1e-7)


def test_efficiency_falls_as_the_core_takes_more():
    """At a Q of 20 the core's loss is a twentieth of the reactive power in the magnetizing inductance."""
    share = (100.0, 30.0, 10.0, 5.0, 3.0)
    plain = replace(JOB, transformer_leakage=0.0, blocking=1e-4)  # 0.2 milliohm of reactance
    resistance = design(plain, textbook=True).point.load_resistance
    made = [design(replace(plain, transformer_magnetizing=s * resistance / OMEGA), textbook=True) for s in share]
    efficiency = [m.tank.efficiency for m in made]
    assert all(after < before for before, after in pairwise(efficiency))
    lost = [transformer_of(m).loss / m.point.device_rf_power for m in made]
    # V²/2 over the core's parallel resistance Q·X·(1 + 1/Q²), against V²/2R; R itself falls a little with the loss
    now = [m.point.load_resistance / resistance for m in made]
    assert lost == pytest.approx([n / (20 * s * (1 + 1 / 400)) for n, s in zip(now, share, strict=True)], rel=1e-4)


def test_a_transformer_brings_the_network_out_of_the_low_resistances():
    without, made = design(replace(JOB, transformer=None), textbook=True), design(JOB, textbook=True)
    assert without.ways_out
    assert made.ways_out == ()
    assert float(made.tank.parts[-3].branch.value) < float(without.tank.parts[-3].branch.value) / 2


@pytest.mark.parametrize(
    ("values", "said"),
    [
        ({"transformer": 0.0}, "tank.transformer: got 0; allowed 0.01 to 100"),
        ({"transformer": -3.0}, "tank.transformer: got -3"),
        ({"transformer": 101.0}, "tank.transformer: got 101"),
        ({"transformer": math.nan}, "tank.transformer: got nan"),
        ({"transformer_magnetizing": 0.0}, "tank.transformer_magnetizing: got 0 H; allowed above 0 H"),
        ({"transformer_leakage": -1e-9}, "tank.transformer_leakage: got -1 nH"),
        (
            {"transformer": None, "transformer_leakage": 1e-9},
            "transformer_leakage: is of no use without tank.transformer",
        ),
        ({"transformer": None, "transformer_magnetizing": 1e-6}, "is of no use without tank.transformer"),
    ],
)
def test_numbers_that_make_no_transformer_are_one_line(values, said):
    with pytest.raises(InputError) as caught:
        replace(JOB, **values)
    (line,) = caught.value.problems
    assert said in line


@pytest.mark.parametrize(
    "words",
    [
        ("--transformer", "three"),
        ("--transformer", "1:3"),
        ("--transformer", "3", "--transformer-magnetizing", "1ohm"),
        ("--transformer", "3", "--transformer-magnetizing", "0.5nH"),  # its core alone takes more than there is
        ("--transformer-leakage", "1nH"),
    ],
)
def test_a_transformer_that_can_not_be_is_one_line_and_status_2(run, words):
    done = run("design", *WORDS, "--textbook", *words)
    assert (done.returncode, done.stdout) == (2, "")
    assert len(done.stderr.splitlines()) == 1


def test_the_record_has_the_transformer_with_its_own_keys(run):
    done = run("design", *WORDS, "--textbook", "--json", "--transformer", "3", "--transformer-leakage", "2nH")
    got = json.loads(done.stdout)
    (branch,) = [b for b in got["tank"]["branches"] if b["kind"] == "transformer"]
    assert (branch["place"], branch["value"], branch["unit"]) == ("through", None, None)
    assert branch["ratio"] == pytest.approx(1 / 3, rel=1e-15)
    assert (branch["leakage_h"], branch["core_q"]) == (2e-9, 20.0)
    assert branch["magnetizing_h"] == got["assumed"]["tank.transformer_magnetizing"]
    assert branch["secondary_peak_voltage_v"] == pytest.approx(3 * branch["peak_voltage_v"], rel=0.02)  # leakage


# what the filter shows the tank at the harmonics

FILTERS = [
    {"filter": "auto", "limit": "us-amateur"},
    {"filter": "5", "filter_kind": "elliptic", "limit": "us-amateur"},
    {"filter": "6", "filter_kind": "butterworth", "limit": "us-amateur"},
    {"filter": "auto", "filter_kind": "chebyshev-trap", "limit": "60dB", "trap": 2},
    {"filter": "auto", "limit": "us-amateur", "load": 35 + 12j, "transformer": None, "supply": 50.0},
    {"filter": "7", "filter_kind": "chebyshev", "limit": "us-amateur", "load": 60 - 20j},
]


@pytest.mark.parametrize("values", FILTERS, ids=lambda v: "-".join(map(str, v.values())))
def test_impedance_of_the_filter_at_the_harmonics_is_that_of_the_node_equations(values):
    """A load given at the carrier goes on as a resistance with a coil or a capacitor in series."""
    made = design(replace(JOB, **values), textbook=True)
    assert made.filter is not None
    load = complex(made.job.load or 50)
    shown = made.filter_terminations
    assert [n for n, _ in shown] == list(range(2, 11))
    for n, z in shown:
        at_n = complex(load.real, load.imag * n if load.imag > 0 else load.imag / n)
        wanted = complex(solve_nodes(made.filter.parts, at_n, n * made.job.carrier)[0][0])
        assert abs(z - wanted) <= 1e-10 * abs(wanted)


def test_without_a_filter_there_is_nothing_to_show():
    assert design(JOB, textbook=True).filter_terminations == ()
