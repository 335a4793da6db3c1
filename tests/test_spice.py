"""SPICE decks: nine stages of varied kind, run in ngspice, against the steady state; losses as constant resistances."""

from __future__ import annotations

import math
import shutil
import subprocess
from dataclasses import replace

import numpy as np
import pytest
from reference_circuits import solve_nodes

from rfstage import Job, design
from rfstage.device import JunctionCapacitance
from rfstage.files.spice import Run, default_run, spice_text
from rfstage.ladder import Branch
from rfstage.load import SeriesLoad
from rfstage.steady import settle

ngspice = pytest.mark.skipif(
    shutil.which("ngspice") is None, reason="ngspice, a general-purpose simulator, is not here"
)


def with_constant_losses(stage):
    """Return the stage with every Q turned into the resistance it stands for at the carrier."""
    omega = 2 * math.pi * stage.carrier
    branches = []
    for b in stage.branches:
        if b.q is not None:
            reactance = omega * b.value if b.kind == "coil" else 1 / (omega * b.value)
            b = replace(b, q=None, q_frequency=None, series_resistance=reactance / b.q)
        branches.append(b)
    resistance = omega * stage.supply.choke / 200
    supply = replace(stage.supply, choke_q=None, choke_resistance=resistance)
    return replace(stage, branches=tuple(branches), supply=supply)


def through(name, kind, value, second, **more):
    return Branch(name, "through", kind, value, second=second, **more)


def tuned(small):
    """A tapped, a linked and a filtered stage around one device; what has no constant resistance is lossless."""
    blocking = next(b for b in small.branches if b.name == "Cblock")
    resistive = {"series_resistance": 0.05}
    tapped = (
        blocking,
        Branch("C1", "shunt", "capacitor", 6e-9, **resistive),
        through("L1", "coupled", 562e-9, 337e-9, coupling=0.35, tap="device"),
        Branch("C2", "shunt", "capacitor", 1.38e-9, **resistive),
    )
    linked = (
        blocking,
        Branch("C1", "shunt", "capacitor", 24.1e-9, **resistive),
        through("L1", "coupled", 20.8e-9, 0.9e-6, coupling=0.3),
        Branch("C2", "series", "capacitor", 560e-12, **resistive),
    )
    filtered = (
        *small.branches,
        Branch("L2", "series", "coil", 635e-9, series_resistance=0.4),
        Branch("C3", "shunt", "capacitor", 76e-12, **resistive),
        Branch("F1", "series", "trap", 150e-9, second=780e-12),
        Branch("F2", "shunt", "trap", 260e-9, second=202e-12, series_resistance=0.2, lead_inductance=5e-9),
        through("T1", "transformer", 1.2, 8e-6, lead_inductance=60e-9, series_resistance=0.1),
    )
    return {
        "tapped": replace(small, branches=tapped),
        "linked": replace(small, branches=linked),
        "filter with traps": replace(small, branches=filtered),
    }


def stages():
    """Nine stages of varied family, network, law and load."""
    small = design(
        Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8, network="pi"), textbook=True
    ).stage
    fet = design(
        Job(
            carrier=14.2e6,
            power=60.0,
            conduction_angle=140.0,
            supply=50.0,
            family="fet",
            network="pi",
            loaded_q=9.0,
            load=40 + 15j,
        ),
        textbook=True,
    ).stage
    fet = replace(
        fet,
        device=replace(
            fet.device,
            exponent=2.0,
            transfer_factor=fet.device.transfer_factor / 3,
            junction_capacitance=JunctionCapacitance(at_zero=600e-12, potential=0.8, grading=0.4),
        ),
    )
    tube = design(
        Job(
            carrier=3.6e6,
            power=300.0,
            conduction_angle=150.0,
            supply=1500.0,
            family="tube",
            network="pi",
            exponent=1.5,
            output_capacitance=12e-12,
        ),
        textbook=True,
    ).stage
    triode = replace(
        tube,
        device=replace(tube.device, amplification_factor=60.0),
        drive=replace(tube.drive, bias=tube.drive.bias - 1500 / 60, amplitude=tube.drive.amplitude + 22),
    )
    coil_first = design(
        Job(carrier=10.1e6, power=5.0, conduction_angle=110.0, supply=12.0, network="l", output_capacitance=900e-12),
        textbook=True,
    ).stage
    stray = design(
        Job(
            carrier=28e6,
            power=25.0,
            conduction_angle=180.0,
            supply=28.0,
            load=70 - 30j,
            network="pi",
            output_capacitance=60e-12,
        ),
        textbook=True,
    ).stage
    stray = replace(
        stray,
        branches=tuple(
            replace(b, lead_inductance=3e-9)
            if b.kind == "capacitor" and b.place == "shunt"
            else replace(b, self_capacitance=1.5e-12)
            if b.kind == "coil"
            else b
            for b in stray.branches
        ),
    )
    overdriven = replace(small, drive=replace(small.drive, amplitude=1.6 * small.drive.amplitude))
    return {
        "bipolar pi": small,
        "square-law FET with a junction": fet,
        "triode": triode,
        "coil first": coil_first,
        "strays": stray,
        "overdriven": overdriven,
        **tuned(small),
    }


STAGES = {name: with_constant_losses(stage) for name, stage in stages().items()}


def simulated(stage, steps, folder):
    """Return direct current [A] and load phasors of orders 1 to 7 [V] over the last ten periods."""
    run = Run(default_run(stage).periods, steps)
    wanted = "v(load) i(vsupply)"
    control = "\n".join(
        (
            ".control",
            "run",
            "set wr_singlescale",
            "set numdgt=15",
            f"linearize {wanted}",
            f"wrdata out.txt {wanted}",
            "quit",
            ".endc",
            ".end",
            "",
        )
    )
    (folder / "out.txt").unlink(missing_ok=True)
    (folder / "deck.cir").write_text(spice_text(stage, run).replace(".end\n", control), encoding="ascii")
    subprocess.run(["ngspice", "-b", "deck.cir"], cwd=folder, capture_output=True, check=True, timeout=280)
    table = np.loadtxt(folder / "out.txt")[: run.measured * steps]
    time, load, supply = table[:, 0] - table[0, 0], table[:, 1], -table[:, 2]
    orders = np.arange(1, 8)[:, np.newaxis]
    phasors = 2 * (load * np.exp(-2j * np.pi * orders * stage.carrier * time)).mean(axis=1)
    return supply.mean(), phasors


@ngspice
@pytest.mark.parametrize("name", STAGES)
def test_ngspice_finds_the_same_steady_state(name, tmp_path):
    # SOURCE: transient runs of ngspice at two step sizes, extrapolated (the trapezoidal rule is of second order)
    stage = STAGES[name]
    # leads of a few nanohenry ring within a twentieth of the period: their levels want finer steps
    coarse, fine = (simulated(stage, steps, tmp_path) for steps in ((800, 1600) if name == "strays" else (300, 600)))
    current = fine[0] + (fine[0] - coarse[0]) / 3
    phasors = np.abs(fine[1]) + (np.abs(fine[1]) - np.abs(coarse[1])) / 3
    state = settle(stage, orders=128)
    powers = phasors**2 / 2 * (1 / stage.load.impedance(stage.carrier * np.arange(1, 8))).real
    levels = 10 * np.log10(powers / powers[0])
    assert current == pytest.approx(state.dc_current, rel=3e-4)
    assert 10 * math.log10(powers[0] / state.output_power) == pytest.approx(0, abs=0.003)
    for h in state.harmonics[:6]:
        if h.level is not None and h.level > -80:
            assert levels[h.order - 1] == pytest.approx(h.level, abs=0.03), h.order


LINK = {"q": 150.0, "second_q": 90.0, "coupling": 0.3, "q_frequency": 7.1e6}
LOSSY = {
    "trap in series": Branch("X", "series", "trap", 300e-9, second=1e-9, q=150.0, second_q=400.0, q_frequency=7.1e6),
    "trap to ground": Branch(
        "X", "shunt", "trap", 300e-9, second=1e-9, second_q=400.0, series_resistance=0.3, lead_inductance=9e-9
    ),
    "trap to ground of Q": Branch("X", "shunt", "trap", 300e-9, second=1e-9, q=60.0, q_frequency=7.1e6),
    "pair": through("X", "coupled", 1.1e-6, 0.4e-6, **LINK),
    "load at the tap": through("X", "coupled", 1.1e-6, 0.4e-6, tap="load", **LINK),
    "device at the tap": through("X", "coupled", 1.1e-6, 0.4e-6, tap="device", **LINK),
    "transformer": through(
        "X", "transformer", 0.4, 3e-6, second_q=20.0, q_frequency=7.1e6, lead_inductance=70e-9, series_resistance=0.2
    ),
    "bare transformer": through("X", "transformer", 2.5, 3e-6, second_q=20.0, q_frequency=7.1e6),
}


@ngspice
@pytest.mark.parametrize("name", LOSSY)
def test_each_kind_s_elements_are_the_branch_at_the_carrier(name, tmp_path):
    # SOURCE: small-signal runs of ngspice with the deck's own lines, for one ampere into them, and node equations
    before, after = Branch("A", "shunt", "capacitor", 330e-12), Branch("B", "series", "capacitor", 680e-12)
    stage = replace(STAGES["bipolar pi"], branches=(before, LOSSY[name], after), load=SeriesLoad(33 + 20j, 7.1e6))
    lines = spice_text(stage).splitlines()
    network = lines[
        lines.index("* branches from device to load") : lines.index(
            "* start-up with the device off; the last periods are measured"
        )
    ]
    # a faint resistance at every node, for the direct current that ngspice looks for first
    control = [".options rshunt=1e12", f".ac lin 1 {stage.carrier:.12g} {stage.carrier:.12g}", ".control", "run"]
    control += ["set wr_singlescale", "set numdgt=15", "wrdata out.txt v(out) v(load)", "quit", ".endc", ".end", ""]
    (tmp_path / "deck.cir").write_text("\n".join(["* one ampere", "Iin 0 out AC 1", *network, *control]))
    subprocess.run(["ngspice", "-b", "deck.cir"], cwd=tmp_path, capture_output=True, check=True, timeout=60)
    row = np.atleast_1d(np.loadtxt(tmp_path / "out.txt"))
    volts, _ = solve_nodes(stage.branches, 33 + 20j, stage.carrier)
    assert complex(row[1], row[2]) == pytest.approx(complex(volts[0]), rel=1e-6)
    assert complex(row[3], row[4]) == pytest.approx(complex(volts[-1]), rel=1e-6)


def test_what_stands_behind_a_winding_or_the_blocking_capacitor_starts_without_charge():
    trap = Branch("F1", "shunt", "trap", 90e-9, second=560e-12)
    link = through("L1", "coupled", 75e-9, 0.9e-6, coupling=0.3)
    tail = Branch("C2", "series", "capacitor", 560e-12)
    blocking = STAGES["bipolar pi"].branches[0]
    text = spice_text(replace(STAGES["bipolar pi"], branches=(trap, blocking, link, trap, tail)))
    first, block, second, last = (
        next(line for line in text.splitlines() if line.startswith(f"C{k} ")) for k in (1, 2, 4, 5)
    )
    assert first.endswith("ic=13.8")
    assert block.endswith("ic=13.8")
    assert "ic=" not in second
    assert "ic=" not in last
    assert last.split()[2] == "load"


def test_the_deck_says_what_it_holds_and_ends():
    text = spice_text(STAGES["strays"])
    assert text.startswith("* rfstage: 28 MHz stage, bipolar")
    assert text.rstrip().endswith(".end")
    assert text.isascii()
    for words in ("constant resistances at the carrier", ".tran", ".four", "Bdevice", "uic"):
        assert words in text


def test_a_choke_s_rf_loss_does_not_stand_in_the_way_of_direct_current():
    stage = design(Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8), textbook=True).stage
    lines = spice_text(stage).splitlines()
    assert "Rchokerf vdd out" in "\n".join(lines)
    across = float(next(line for line in lines if line.startswith("Rchokerf")).split()[-1])
    assert across == pytest.approx(2 * math.pi * 7.1e6 * stage.supply.choke * (100 + 0.01))


def test_a_stage_without_a_series_part_still_reaches_its_load():
    stage = replace(
        STAGES["bipolar pi"], branches=(Branch("C1", "shunt", "capacitor", 1e-9),), load=SeriesLoad(50 + 0j, 7.1e6)
    )
    assert "Vthrough out load 0" in spice_text(stage)


def test_design_and_settle_write_decks(run, tmp_path):
    words = (
        "design",
        "--carrier",
        "7.1MHz",
        "--power",
        "10W",
        "--angle",
        "120",
        "--supply",
        "13.8",
        "--spice",
        "a.cir",
    )
    done = run(*words, "--save", "a.toml", "--json")
    assert done.returncode == 0
    assert run("settle", "a.toml", "--spice", "b.cir").returncode == 0
    decks = [(tmp_path / name).read_text(encoding="ascii").split() for name in ("a.cir", "b.cir")]
    assert len(decks[0]) == len(decks[1])
    for first, second in zip(*decks, strict=True):
        try:
            assert float(first) == pytest.approx(float(second), rel=1e-10)  # the stage file keeps 12 digits
        except ValueError:
            assert first == second or "v(" in first  # expressions hold numbers of as many digits
    again = run(*words)
    assert again.returncode == 2
    assert "a.cir: exists" in again.stderr
