"""Load resistances and input capacitors too small to build: said where they are, and every way out tried."""

from __future__ import annotations

import math
import re
from dataclasses import replace

import pytest
from reference_circuits import seen_impedance

from rfstage import design
from rfstage.cautions import LOW_RESISTANCE
from rfstage.designs.loads import tank_of
from rfstage.designs.lowresistance import DEEPEST_DIP, with_network
from rfstage.designs.ranking import keys_of
from rfstage.job import Job
from rfstage.quantity import parse_real

LOW = Job(carrier=7.1e6, power=100.0, conduction_angle=120.0, supply=13.8, network="pi")  # 0.74 ohm
SHORT = Job(carrier=144e6, power=20.0, conduction_angle=120.0, supply=28.0, network="pi")  # 15 ohm, but 265 pF
SPOILED = replace(LOW, power=200.0)  # 0.36 ohm; with half the power the trough still dips deep
JOBS = {
    "low": LOW,
    "short": SHORT,
    "l": replace(LOW, network="l"),
    "pi-l": replace(LOW, network="pi-l", middle_resistance=150.0),
    "input q": replace(LOW, input_q=3.0),
    "transformed": replace(LOW, transformer=2.0),
    "tapped": replace(LOW, network="tapped-coil", tap=0.3),
    "reactive": replace(LOW, load=20 - 30j, minimum_voltage=2.0),
    "auto": replace(LOW, network=None, coupling=0.3),
    "spoiled": SPOILED,
}


@pytest.fixture(scope="module", params=JOBS.values(), ids=JOBS)
def made(request):
    return design(request.param, textbook=True)


def told(made):
    return next((c.text for c in made.cautions if c.topic == "low resistance"), "")


def changed(job, words):
    """The job that a way's words stand for."""
    if found := re.fullmatch(r"a transformer 1:(\d+)", words):
        return replace(job, transformer=float(found[1]))
    if found := re.fullmatch(r"a supply of (.*)", words):
        supply = float(parse_real(found[1], "V"))
        lowest = job.minimum_voltage
        return replace(job, supply=supply, minimum_voltage=None if lowest is None else lowest * supply / job.supply)
    assert words == "two devices, half the power each"
    return replace(job, power=job.power / 2)


def begins_at(made):
    """Parallel resistance of what stands behind choke, blocking capacitor and transformer, by a cascade."""
    own = tank_of(made)
    z = complex(seen_impedance(own, made.settings.load_impedance, made.job.carrier)[0])
    return 1 / (1 / z).real


def test_figures_of_a_way_are_those_of_the_design_it_names(made):
    assert len(made.ways_out) >= 2
    for way in made.ways_out:
        assert way.candidate is not None
        network = way.candidate.network
        assert network in {made.tank.network, "pi"}
        tried = design(with_network(changed(made.job, way.words), network), textbook=True)
        assert way.load_resistance == pytest.approx(tried.point.load_resistance, rel=1e-9)
        assert way.candidate.trough_dip == pytest.approx(tried.tank.trough_dip, rel=1e-9)
        assert way.candidate.efficiency == pytest.approx(tried.tank.efficiency, rel=1e-9)
        assert way.still_low == bool(tried.ways_out) == bool(told(tried))
        if tried.job.transformer is None:
            assert way.network_resistance == way.load_resistance
        else:
            assert way.network_resistance == pytest.approx(begins_at(tried), rel=1e-6)
        assert f"dip {tried.tank.trough_dip:.2f}" in way.summary
        assert f"tank efficiency {100 * tried.tank.efficiency:.1f} %" in way.summary
        assert ("still low" in way.summary) == way.still_low


def test_numbers_of_the_job_stay_in_its_ways():
    """A middle resistance that was asked is the middle resistance of the ways with that network, too."""
    made = design(JOBS["pi-l"], textbook=True)
    way = next(w for w in made.ways_out if w.candidate and w.candidate.network == "pi-l")
    assert way.candidate.fitted.settings.request.middle_resistance == 150.0


def test_ways_are_ranked_deep_dips_last_and_what_suffices_first(made):
    """Best first, refused ones last: as the ranking of networks has it, within what suffices and what does not."""
    keys = keys_of([way.candidate for way in made.ways_out if way.candidate])
    order = [(way.spoils, way.still_low, key) for way, key in zip(made.ways_out, keys, strict=False)]
    assert order == sorted(order)
    tried = [way.candidate is not None for way in made.ways_out]
    assert tried == sorted(tried, reverse=True)


def test_the_caution_names_the_best_ways_and_none_that_dips_too_deep(made):
    text = told(made)
    assert text.count("Ways out, best first: ") == 1
    named = text.split("best first: ")[1].rstrip(".").split("; ")
    assert named == [p for way in made.ways_out[:4] if not way.spoils for p in way.summary.split("; ")]
    for dip in re.findall(r"dip (\d+\.\d\d)", text):
        assert float(dip) <= DEEPEST_DIP + 0.005
    for way in made.ways_out:
        if way.candidate.trough_dip > DEEPEST_DIP:
            assert way.summary not in text


def test_a_way_that_dips_too_deep_is_tried_and_not_named():
    made = design(SPOILED, textbook=True)
    deep = [way for way in made.ways_out if way.spoils]
    assert deep
    assert all(way.candidate.trough_dip > DEEPEST_DIP for way in deep)
    assert not any(way.words in told(made) for way in deep)


def test_two_causes_are_told_apart():
    assert "a load resistance of 742 mΩ is hard to build" in told(design(LOW, textbook=True))
    made = design(SHORT, textbook=True)
    c1 = float(tank_of(made)[0].value)
    omega = 2 * math.pi * SHORT.carrier
    assert made.point.load_resistance > LOW_RESISTANCE
    assert 1 / (omega * c1) < 10 * omega * 5e-9
    assert "the input capacitor of 265 pF has under ten times the reactance of its own leads" in told(made)


@pytest.mark.parametrize(
    "job",
    [
        replace(LOW, supply=50.0),
        replace(LOW, transformer=4.0),
        replace(SHORT, network="t"),
        replace(LOW, carrier=1.85e6, power=400.0, supply=2000.0, family="tube"),
    ],
)
def test_nothing_is_said_where_the_resistance_is_fine(job):
    made = design(job, textbook=True)
    assert made.ways_out == ()
    assert told(made) == ""


@pytest.mark.parametrize("resistance", [3.99, 4.01])
def test_four_ohms_are_the_border(resistance):
    job = replace(LOW, carrier=1.85e6, supply=13.8)
    at = design(job, textbook=True).point.load_resistance
    made = design(replace(job, power=job.power * at / resistance), textbook=True)
    assert made.point.load_resistance == pytest.approx(resistance, rel=2e-3)
    assert bool(made.ways_out) == (resistance < 4) == bool(told(made))


@pytest.mark.parametrize("ratio", [2.0, 3.0, 4.0])
def test_a_transformer_shows_the_network_the_square_of_its_ratio_times_the_resistance(ratio):
    """With next to no leakage and a core and choke that take next to nothing, exactly; with the defaults, nearly."""
    ideal = replace(
        LOW,
        transformer=ratio,
        transformer_leakage=0.0,
        transformer_magnetizing=1e-4,
        choke=1e-4,
        choke_q=math.inf,
        capacitor_q=math.inf,
        blocking=1e-4,
    )
    made = design(ideal, textbook=True)
    assert begins_at(made) == pytest.approx(
        ratio**2 * made.point.load_resistance, rel=2e-5
    )  # the core's loss, X/R of 6000 at Q 20
    way = next(w for w in design(LOW, textbook=True).ways_out if w.words == f"a transformer 1:{ratio:g}")
    # blocking capacitor and leakage, a tenth of the resistance each way, raise the parallel resistance by 1 % at most
    assert way.network_resistance == pytest.approx(ratio**2 * way.load_resistance, rel=0.02)


def test_a_way_that_is_refused_says_why_and_comes_last():
    """An input-side Q that makes a pi from a few ohms makes none from sixteen times that, above the load."""
    job = replace(LOW, power=20.5, input_q=0.1)
    made = design(job, textbook=True)
    refused = [way for way in made.ways_out if way.candidate is None]
    assert refused
    assert made.ways_out[-len(refused) :] == tuple(refused)
    for way in refused:
        assert way.spoils
        assert f"{way.words} (refused: " in way.summary
        assert way.words not in told(made)
