"""Design to the settled power: reached within 0.1 %, or stopped with a reason and a way out that was tried."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest

from rfstage import Job, RfstageError, design
from rfstage.designs import correction
from rfstage.designs.design import with_settled
from rfstage.errors import ConvergenceError, ImpossibleError
from rfstage.steady import settle

JOB = Job(network="pi", carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8)


def random_pi_jobs(count, seed=20):
    """Pi jobs as builders ask them: 1.8-150 MHz, 0.5-1500 W, any family, load resistance 3 ohm and up."""
    rng = np.random.default_rng(seed)
    while count:
        family = str(rng.choice(["bipolar", "fet", "tube"]))
        supply = float(np.exp(rng.uniform(*np.log((500, 4000) if family == "tube" else (12, 100)))))
        resistance = float(np.exp(rng.uniform(*np.log((800, 6000) if family == "tube" else (4, 200)))))
        power = (0.9 * supply) ** 2 / (2 * resistance)
        carrier = float(np.exp(rng.uniform(*np.log((1.8e6, 30e6 if family == "tube" else 150e6)))))
        if not 0.5 <= power <= 1500:
            continue
        count -= 1
        yield Job(
            network="pi",
            carrier=carrier,
            power=power,
            conduction_angle=float(rng.uniform(90, 180)),
            supply=supply,
            family=family,
            loaded_q=float(rng.uniform(12, 18)) if family == "tube" else None,
        )


def test_the_settled_power_is_the_asked_one():
    made = design(JOB)
    assert made.designed_to == "settled"
    assert made.settled is not None
    assert made.settled.output_power == pytest.approx(10.0, rel=1e-3)
    assert settle(made.stage).output_power == pytest.approx(10.0, rel=1e-3)
    assert made.point.load_resistance < made.book_resistance


def test_the_textbook_design_is_kept_when_asked_and_its_steady_state_stands_beside_it():
    book = with_settled(design(JOB, textbook=True))
    assert book.designed_to == "textbook"
    assert book.point.output_power == pytest.approx(10.0, rel=1e-9)
    assert book.settled is not None
    # the trough dip of 0.08 costs some 5 % of the power: common practice, no source
    assert 0.90 < book.settled.output_power / 10 < 0.98


def test_nearly_all_pi_jobs_are_reached_in_a_few_solves(monkeypatch):
    """Goal: at least 95 % reached, at most 8 solves in 95 % of them."""
    solves = []
    for name in ("settle", "settle_many"):
        real = getattr(correction, name)

        def counted(*args, real=real, **kwargs):
            solves[-1] += 1
            return real(*args, **kwargs)

        monkeypatch.setattr(correction, name, counted)
    reached = []
    jobs = list(random_pi_jobs(40))
    for job in jobs:
        solves.append(0)
        try:
            made = design(job)
        except RfstageError:
            solves.pop()
            continue
        assert made.settled is not None
        # design() settles once more only where line and load differ, which these jobs don't
        assert made.settled.output_power == pytest.approx(job.power, rel=1e-3)
        reached.append(job)
    assert len(reached) >= 0.95 * len(jobs)
    assert np.quantile(solves, 0.95) <= 8


def test_a_coil_first_network_stops_and_names_what_does_it():
    with pytest.raises(ImpossibleError, match=r"network l gives .* where 10.0 W is asked") as caught:
        design(replace(JOB, network="l"))
    named = re.search(r"; (network pi) does it", str(caught.value))
    assert named
    assert design(replace(JOB, network="pi")).settled is not None


def test_a_peak_beyond_the_rating_is_no_design():
    # the book's peak of 26.5 V is within 27.5 V; a network that lets the voltage ring is not
    with pytest.raises(ImpossibleError, match="--textbook"):
        design(replace(JOB, network="l", output_capacitance=900e-12, max_voltage=27.5))


def test_line_levels_are_the_worse_of_textbook_and_settled():
    book = design(JOB, textbook=True)
    both = with_settled(book)
    assert both.settled is not None
    for h in both.harmonics:
        first = book.harmonics[h.order - 2].line_level
        assert h.line_level == max(x for x in (first, h.settled_level) if x is not None)


def test_an_order_that_only_the_real_stage_has_is_judged_by_it():
    made = design(replace(JOB, conduction_angle=180.0, limit="60dB"))
    third = made.harmonics[1]
    assert third.level is None
    assert third.settled_level is not None
    assert third.line_level == third.settled_level
    assert third.margin == pytest.approx(-60 - third.settled_level)


def test_a_reactive_load_is_judged_in_a_resistive_line():
    made = design(replace(JOB, load=30 - 25j))
    in_line = settle(replace(made.stage, load=made.settings.line))
    for h in made.harmonics[:3]:
        wanted = in_line.harmonics[h.order - 2].level
        assert wanted is not None
        assert h.line_level is not None
        assert h.line_level >= wanted - 1e-6


def test_a_textbook_design_without_a_steady_state_says_so(monkeypatch):
    def fails(*_args, **_kwargs):
        raise ConvergenceError("not reached")

    monkeypatch.setattr("rfstage.steady.settle", fails)
    made = with_settled(design(JOB, textbook=True))
    assert made.settled is None
    assert made.cautions[0].topic == "steady state"


TRIODE = Job(
    network="pi",
    carrier=3.6e6,
    power=300.0,
    conduction_angle=140.0,
    supply=1500.0,
    family="tube",
    threshold=-20.0,
    amplification_factor=40.0,
    amplitude=90.0,
)


def test_a_triode_s_drive_makes_up_for_its_anode_swing():
    made = design(TRIODE)
    point = made.point
    # SOURCE: control voltage of a triode, v_g + v_a/mu against the cut-off (common practice, no source)
    effective = 90 - point.swing / 40
    assert made.drive.bias == pytest.approx(-20 - point.electrode_voltage_dc / 40 - effective * np.cos(np.radians(70)))
    assert made.settled is not None
    assert made.settled.conduction_angle_deg == pytest.approx(
        140.0, abs=0.5
    )  # the settled swing is not quite the book's


def test_a_triode_whose_swing_over_mu_exceeds_the_drive_is_refused():
    with pytest.raises(ImpossibleError, match="the swing over the amplification factor, 33 V, is more than that"):
        design(replace(TRIODE, amplitude=20.0))


def test_an_amplification_factor_belongs_to_a_tube():
    with pytest.raises(RfstageError, match="it belongs to tube"):
        replace(TRIODE, family="fet")


def test_a_drive_that_contradicts_the_transfer_factor_is_refused_with_the_right_one():
    with pytest.raises(ImpossibleError, match=r"drive.amplitude: .* a drive of 206.2 V peak; got 90 V"):
        design(replace(TRIODE, transfer_factor=0.01))
