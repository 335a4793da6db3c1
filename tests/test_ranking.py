"""All networks ranked for a job, and the filter that meets its limit: order, reasons, refusals, and the limit met."""

from __future__ import annotations

import json
import math
import re

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from reference_circuits import load_volts, solve_nodes
from test_design import broken_invariants

from rfstage import Job, design
from rfstage.designs.ranking import Candidate, Extreme, Ranking, keys_of
from rfstage.errors import ImpossibleError, InputError, RfstageError
from rfstage.files.records import design_record
from rfstage.filters.candidates import KINDS
from rfstage.filters.choose import Filter
from rfstage.pulse import pulse_coefficients
from rfstage.tankfields import NETWORKS

BASE = {"carrier": 7.1e6, "power": 10.0, "conduction_angle": 120.0, "supply": 13.8}
LIMITED = {**BASE, "limit": "us-amateur"}
MARGIN = 3.0  # dB, the default


def book(**job: object):
    return design(Job(**job), textbook=True)  # type: ignore[arg-type]


def candidate(name: str, **values: object) -> Candidate:
    """A candidate that has been fitted, with its margin and what it misses told alike."""
    margin = values.get("margin")
    missed = 0.0 if margin is None else max(0.0, MARGIN - margin)  # type: ignore[operator]
    return Candidate(name, None, object(), efficiency=0.9, parts=3)._replace(missed=missed, **values)  # type: ignore


def extremes(number: int, beyond: int = 0) -> tuple[Extreme, ...]:
    return tuple(Extreme(f"C{k}", f"C{k} of 1 pF: strays decide", k < beyond) for k in range(number))


# --- the order -------------------------------------------------------------------------------------------

# of each criterion a better and a worse candidate, the better one worse in everything that comes after it
PAIRS = {
    "beyond building": (
        {"margin": -9.0, "extremes": extremes(5), "efficiency": 0.5, "parts": 12, "trough_dip": 0.9},
        {"margin": 9.0, "extremes": extremes(1, 1), "efficiency": 0.99, "parts": 2},
    ),
    "limit and margin kept": (
        {"margin": 3.1, "trough_dip": 0.9, "extremes": extremes(5), "efficiency": 0.5, "parts": 12},
        {"margin": 2.9, "trough_dip": 0.0, "efficiency": 0.99, "parts": 2},
    ),
    "trough dip": (
        {"trough_dip": 0.09, "extremes": extremes(5), "efficiency": 0.5, "parts": 12},
        {"trough_dip": 0.11, "efficiency": 0.99, "parts": 2},
    ),
    "deep trough dip": (
        {"trough_dip": 0.15, "extremes": extremes(5), "efficiency": 0.5, "parts": 12},
        {"trough_dip": 0.25, "efficiency": 0.99, "parts": 2},
    ),
    "what is missing": (
        {"margin": -1.0, "efficiency": 0.5, "extremes": extremes(4), "parts": 12, "trough_dip": 0.05},
        {"margin": -9.0, "efficiency": 0.99, "parts": 2},
    ),
    "losses": (
        {"efficiency": 0.93, "extremes": extremes(4), "parts": 12, "trough_dip": 0.05},
        {"efficiency": 0.88, "parts": 2},
    ),
    "extreme values": (
        {"extremes": extremes(1), "parts": 12, "trough_dip": 0.05},
        {"extremes": extremes(2), "parts": 2},
    ),
    "parts": ({"parts": 3, "trough_dip": 0.05}, {"parts": 4}),
    "less of a dip": ({"trough_dip": 0.01}, {"trough_dip": 0.02}),
}


@pytest.mark.parametrize("criterion", PAIRS)
def test_each_criterion_outweighs_all_that_come_after_it(criterion):
    better, worse = (candidate(name, **values) for name, values in zip("ab", PAIRS[criterion], strict=True))
    first, second = keys_of([better, worse])
    assert first < second
    second, first = keys_of([worse, better])
    assert first < second


@pytest.mark.parametrize(
    ("one", "other"),
    [({"margin": -5.0}, {"margin": -6.5}), ({"efficiency": 0.93}, {"efficiency": 0.915})],
    ids=["missed", "losses"],
)
def test_small_differences_in_missed_decibels_and_losses_are_none(one, other):
    keys = keys_of([candidate("a", **one), candidate("b", **other, parts=2)])
    assert keys[1] < keys[0]  # fewer parts decide


# --- the reason ------------------------------------------------------------------------------------------


def reason_of(*candidates: Candidate) -> tuple[Ranking, str]:
    """The ranking of some candidates as the program sorts them, and its reason."""
    keys = keys_of(candidates)
    made = [candidates[k] for k in sorted(range(len(keys)), key=keys.__getitem__)]
    ranking = Ranking(tuple(made), next(k for k, c in enumerate(made) if c.allowed))
    return ranking, ranking.reason


def untrue(ranking: Ranking) -> str:
    """What of a reason is not so of the two it compares, or nothing."""
    others = [c for c in ranking.candidates[ranking.chosen + 1 :] if c.fitted and c.allowed]
    if not others:
        return "" if ranking.reason == "the only one that does it" else ranking.reason
    first, second, reason = ranking.winner, others[0], ranking.reason
    beyond = [sum(e.beyond for e in c.extremes) for c in (first, second)]
    claims = [
        (r"it keeps limit and margin, and .+ does not", first.missed == 0 < second.missed),
        (r"margin", first.missed < second.missed),
        (r"trough dip", first.trough_dip < second.trough_dip),
        (r"beyond building", beyond[0] < beyond[1]),
        (r"dB short", first.missed < second.missed),
        (r"% efficient", first.efficiency > second.efficiency),
        (r"extreme", len(first.extremes) < len(second.extremes)),
        (r"\d+ parts, against", first.parts < second.parts),
        (r"as good as", (first.parts, first.trough_dip) == (second.parts, second.trough_dip)),
    ]
    said = [true for pattern, true in claims if re.search(pattern, reason)]
    return "" if second.name in reason and said and any(said) else f"{reason}: {first} {second}"


WORDS = {
    "trough dip": r"trough dip 0\.09, against 0\.11 of b",
    "beyond building": r"no parts beyond building, against 1 part of b",
    "what is missing": r"4\.0 dB short of limit and margin, against 12\.0 dB of b",
    "losses": r"93\.0 % efficient, against 88\.0 % of b",
    "extreme values": r"1 part with a value or current that is extreme, against 2 parts of b",
    "parts": r"3 parts, against 4 of b",
    "less of a dip": r"trough dip 0\.010, against 0\.020 of b",
}


@pytest.mark.parametrize("criterion", WORDS)
def test_reason_names_the_criterion_that_decided_with_both_its_figures(criterion):
    better, worse = (candidate(name, **values) for name, values in zip("ab", PAIRS[criterion], strict=True))
    ranking, reason = reason_of(worse, better)
    assert ranking.winner is better
    assert re.fullmatch(WORDS[criterion], reason)


def test_reason_says_who_meets_the_limit_and_who_does_not():
    assert reason_of(candidate("b", margin=-1.0), candidate("a", margin=3.5))[1] == (
        "it keeps limit and margin, and b does not"
    )


def test_one_that_meets_the_limit_but_not_the_margin_is_not_said_to_miss_the_limit():
    _, reason = reason_of(candidate("b", margin=1.9), candidate("a", margin=8.0, parts=4))
    assert "b does not" not in reason or "margin" in reason


def test_the_only_one_says_so():
    assert reason_of(candidate("a"))[1] == "the only one that does it"


def test_reason_stands_against_the_next_that_may_be_designed_not_against_a_mere_outlook():
    # the outlook is the most efficient of all, and moves the steps of loss between the two others
    out = candidate("outlook", efficiency=0.935, allowed=False)
    ranking, _ = reason_of(out, candidate("a", efficiency=0.916, parts=6), candidate("b", efficiency=0.91, parts=4))
    assert ranking.winner.name == "a"
    assert untrue(ranking) == ""


some = st.builds(
    lambda name, margin, dip, number, beyond, efficiency, parts, allowed: candidate(
        f"net{name}",
        margin=margin,
        trough_dip=dip,
        extremes=extremes(number, min(number, beyond)),
        efficiency=efficiency,
        parts=parts,
        allowed=allowed,
    ),
    st.integers(0, 10**6),
    st.one_of(st.floats(-20.0, 10.0), st.sampled_from([0.0, 3.0, -1.0])),
    st.sampled_from([0.01, 0.05, 0.09, 0.15, 0.4]),
    st.integers(0, 3),
    st.integers(0, 2),
    st.floats(0.5, 0.99),
    st.integers(2, 9),
    st.booleans(),
)


@settings(max_examples=150)
@given(candidates=st.lists(some, min_size=2, max_size=8, unique_by=lambda c: c.network))
def test_reason_of_any_ranking_is_true(candidates):
    if not any(c.allowed for c in candidates):
        return
    assert untrue(reason_of(*candidates)[0]) == ""


def test_one_without_a_steady_state_is_refused_with_its_words_and_the_next_is_chosen():
    names = ("a", "outlook", "b", "c")
    made = [candidate(name, parts=k + 2, allowed=name != "outlook") for k, name in enumerate(names)]
    found = Ranking(tuple(made), 0).settled(made[3].fitted, ["network a: no output", "rings"])
    assert found.winner.network == "c"
    assert [(c.network, c.refused) for c in found.candidates if not c.fitted] == [("a", "no output"), ("b", "rings")]


# --- whole designs ---------------------------------------------------------------------------------------

RANKED = {
    "no limit": BASE,
    "limit": LIMITED,
    "filter where needed": {**LIMITED, "filter": "auto"},
    "no filter": {**LIMITED, "filter": "none"},
    "order 5": {**LIMITED, "filter": "5"},
    "tube": {
        "carrier": 3.6e6,
        "power": 400.0,
        "conduction_angle": 130.0,
        "supply": 2500.0,
        "family": "tube",
        "limit": "us-amateur",
    },
    "some refused": {**BASE, "loaded_q": 5.0, "limit": "60dB"},
}


@pytest.fixture(scope="module")
def ranked():
    return {name: book(**job) for name, job in RANKED.items()}


@pytest.mark.parametrize("name", RANKED)
def test_every_network_is_there_once_alone_and_once_with_a_filter_where_it_misses_the_limit(ranked, name):
    made = ranked[name]
    for network in NETWORKS:
        alone = [c for c in made.ranking.candidates if c.network == network and c.filter is None]
        behind = [c for c in made.ranking.candidates if c.network == network and c.filter is not None]
        behind += [c for c in made.ranking.candidates if c.network == f"{network} + filter"]
        assert len(alone) == 1
        wanted = alone[0].fitted is not None and (alone[0].missed > 0 or name == "order 5")
        assert len(behind) == wanted


@pytest.mark.parametrize("name", RANKED)
def test_the_winner_is_what_is_designed(ranked, name):
    made = ranked[name]
    winner = made.ranking.winner
    assert winner.fitted
    assert winner.allowed
    assert not any(c.fitted and c.allowed for c in made.ranking.candidates[: made.ranking.chosen])
    assert made.tank.network == winner.network == made.assumed["tank.network"]
    assert made.filter == winner.filter
    assert tuple(p.branch for p in made.tank.parts) == winner.fitted.circuit.branches
    assert made.tank.efficiency == pytest.approx(winner.efficiency, rel=1e-12)
    assert made.tank.trough_dip == pytest.approx(winner.trough_dip, rel=1e-12)
    if winner.margin is not None:
        assert made.worst.margin == pytest.approx(winner.margin, abs=1e-9)


@pytest.mark.parametrize("name", RANKED)
def test_what_is_refused_says_why_and_stands_last(ranked, name):
    candidates = ranked[name].ranking.candidates
    assert all(bool(c.refused) != bool(c.fitted) for c in candidates)
    fitted = [bool(c.fitted) for c in candidates]
    assert fitted == sorted(fitted, reverse=True)
    assert all("\n" not in c.refused and "nan" not in c.refused for c in candidates)


@pytest.mark.parametrize("name", RANKED)
def test_the_order_is_that_of_the_keys_and_the_reason_is_true(ranked, name):
    ranking = ranked[name].ranking
    keys = keys_of([c for c in ranking.candidates if c.fitted])
    assert keys == sorted(keys)
    assert untrue(ranking) == ""


@pytest.mark.parametrize("name", RANKED)
def test_every_candidate_shows_its_load_resistance_to_node_equations(ranked, name):
    made = ranked[name]
    for c in made.ranking.candidates:
        if c.fitted:
            branches = c.fitted.circuit.branches
            volts, _ = solve_nodes(branches, made.settings.load_impedance, made.job.carrier)
            assert abs(volts[0] / c.fitted.point.load_resistance - 1) < 1e-9
            power = abs(volts[-1] * c.fitted.point.fundamental_current) ** 2 / 2 / 50
            assert power == pytest.approx(made.job.power, rel=1e-9)


@pytest.mark.parametrize("name", ["limit", "filter where needed", "order 5"])
def test_margin_of_every_candidate_is_that_of_an_independent_cascade(ranked, name):
    made = ranked[name]
    pulse = np.abs(pulse_coefficients(math.radians(60), highest_order=10))[1:]
    for c in made.ranking.candidates:
        if c.fitted:
            volts = load_volts(c.fitted.circuit.branches, 50.0, 7.1e6 * np.arange(1, 11))
            levels = 20 * np.log10(np.abs(volts) * pulse)
            # SOURCE: 47 CFR 97.307(d): 43 dB below 30 MHz
            assert c.margin == pytest.approx(levels[0] - levels[1:].max() - 43.0, abs=1e-6)


def test_a_filter_that_was_not_asked_for_is_shown_but_never_designed(ranked):
    for name in ("limit", "no filter"):
        made = ranked[name]
        assert made.filter is None
        assert any(c.filter and not c.allowed for c in made.ranking.candidates)


def test_a_given_network_is_not_ranked():
    made = book(**BASE, network="pi")
    assert made.ranking is None
    assert "tank.network" not in made.assumed


def test_auto_given_is_auto_assumed():
    assert book(**BASE, network="auto").tank == book(**BASE).tank


def test_same_job_gives_the_same_ranking():
    one, other = book(**RANKED["filter where needed"]), book(**RANKED["filter where needed"])
    assert design_record(one, []) == design_record(other, [])


def test_a_job_that_no_network_does_is_one_line_with_what_a_pi_lacks():
    with pytest.raises(ImpossibleError, match=r"no network does it; pi: tank\.loaded_q: 0\.1 is too low") as error:
        book(**BASE, loaded_q=0.1)
    assert "\n" not in str(error.value)


def test_a_job_wrong_for_every_network_is_refused_before_any_is_tried():
    with pytest.raises(InputError, match="both a loaded Q and an input-side Q"):
        Job(**BASE, loaded_q=10.0, input_q=5.0)


# --- filters ---------------------------------------------------------------------------------------------

# SOURCE: 47 CFR 97.307(d), (e): 43 dB below 30 MHz; above, 60 dB for more than 25 W
STAGES = [
    pytest.param(1.85e6, 25.0, 28.0, 120.0, 43.0, id="1.85MHz-25W-28V"),
    pytest.param(7.1e6, 120.0, 50.0, 120.0, 43.0, id="7.1MHz-120W-50V"),
    pytest.param(14.2e6, 60.0, 28.0, 120.0, 43.0, id="14.2MHz-60W-28V"),
    pytest.param(28.5e6, 100.0, 50.0, 140.0, 43.0, id="28.5MHz-100W-50V"),
    pytest.param(50.1e6, 30.0, 28.0, 140.0, 60.0, id="50MHz-30W-28V"),
    pytest.param(145e6, 100.0, 50.0, 140.0, 60.0, id="145MHz-100W-50V"),
]


@pytest.mark.parametrize(("carrier", "power", "supply", "angle", "wanted"), STAGES)
def test_filter_where_needed_meets_the_limit_and_the_margin_by_the_book_and_settled(
    carrier, power, supply, angle, wanted
):
    job = Job(
        carrier=carrier,
        power=power,
        supply=supply,
        conduction_angle=angle,
        family="fet",
        limit="us-amateur",
        filter="auto",
    )
    by_book, settled = design(job, textbook=True), design(job)
    for made in (by_book, settled):
        assert made.filter is not None
        for b in (p.branch for p in made.tank.parts if p.branch.origin == "part"):
            q = b.q if b.kind not in ("transformer",) else None
            assert q in (100.0, 150.0, 1000.0) or b.kind == "coupled"  # choke, coils, capacitors as stated
        pulse = np.abs(pulse_coefficients(math.radians(angle / 2), highest_order=10))[1:]
        branches = [p.branch for p in made.tank.parts]
        levels = 20 * np.log10(np.abs(load_volts(branches, 50.0, carrier * np.arange(1, 11))) * pulse)
        assert levels[0] - levels[1:].max() >= wanted + MARGIN - 1e-6
        assert made.worst.margin >= MARGIN - 1e-6
    assert settled.settled is not None
    assert max(h.level for h in settled.settled.harmonics if h.level is not None) <= -wanted - MARGIN + 1e-6
    assert settled.settled.output_power == pytest.approx(power, rel=1e-3)


def test_the_margin_asked_is_kept():
    assert book(**LIMITED, filter="auto", margin=10.0).worst.margin >= 10.0 - 1e-6
    assert book(**LIMITED, filter="auto", margin=0.0).worst.margin >= -1e-6


def test_no_filter_where_the_tank_does_it_alone():
    made = book(**{**BASE, "limit": "20dB"}, filter="auto")
    assert made.filter is None
    assert made.worst.margin >= MARGIN


@pytest.mark.parametrize("order", ["3", "5", "9", "11"])
@pytest.mark.parametrize("network", ["pi", "auto"])
def test_order_asked_is_the_order_fitted(network, order):
    made = book(**BASE, network=network, filter=order)
    assert made.filter.order == int(order)
    assert {b.name for b in made.filter.parts} <= {p.branch.name for p in made.tank.parts}


@pytest.mark.parametrize("kind", KINDS)
def test_kind_asked_is_the_kind_fitted(kind):
    made = book(**LIMITED, network="pi", filter="auto", filter_kind=kind)
    assert made.filter.kind == kind
    assert made.worst.margin >= MARGIN - 1e-6


@pytest.mark.parametrize("harmonic", [2, 3, 4])
@pytest.mark.parametrize("network", ["pi", "auto"])
def test_trap_asked_for_a_harmonic_resonates_on_it(network, harmonic):
    made = book(**BASE, network=network, filter="5", filter_kind="chebyshev-trap", trap=harmonic)
    (trap,) = (p.branch for p in made.tank.parts if p.branch.kind == "trap")
    resonance = 1 / (2 * math.pi * math.sqrt(float(trap.value) * float(trap.second)))
    assert resonance == pytest.approx(harmonic * 7.1e6, rel=1e-12)
    plain = book(**BASE, network="pi", filter="5", filter_kind="chebyshev")
    volts, without = (
        abs(solve_nodes([p.branch for p in d.tank.parts], 50.0, harmonic * 7.1e6)[0][-1]) for d in (made, plain)
    )
    assert volts < without / 10


def test_no_two_parts_of_tank_and_filter_have_one_name():
    for network in NETWORKS:
        names = [p.branch.name for p in book(**BASE, network=network, filter="5").tank.parts]
        assert len(set(names)) == len(names)


@pytest.mark.parametrize("network", ["pi", "auto"])
@pytest.mark.parametrize("textbook", [True, False])
def test_limit_that_no_filter_reaches_is_refused_with_order_and_missing_decibels(network, textbook):
    job = Job(**{**BASE, "limit": "200dB"}, network=network, filter="auto", coil_q=20.0)
    with pytest.raises(ImpossibleError, match=r"order 11 .* is [\d.]+ dB short at harmonic \d"):
        design(job, textbook=textbook)


def test_filter_where_needed_without_a_limit_is_refused():
    with pytest.raises(InputError, match=r"tank\.filter: auto needs limit\.rule"):
        Job(**BASE, filter="auto")


@pytest.mark.parametrize("key", ["filter_kind", "trap"])
def test_key_of_a_filter_without_a_filter_is_refused(key):
    with pytest.raises(InputError, match=rf"tank\.{key}: is of no use without tank\.filter"):
        Job(**BASE, **{key: {"filter_kind": "elliptic", "trap": 3}[key]})


def test_trap_for_a_filter_that_has_none_is_refused():
    with pytest.raises(InputError, match=r"tank\.trap: is of no use for a elliptic filter|an elliptic filter"):
        Job(**BASE, filter="5", filter_kind="elliptic", trap=3)


# --- the record ------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", RANKED)
def test_record_holds_the_filter_and_every_candidate(ranked, name):
    made = ranked[name]
    record = json.loads(json.dumps(design_record(made, []), allow_nan=False))
    if made.filter is None:
        assert record["filter"] is None
    else:
        assert set(record["filter"]) >= {
            "kind",
            "order",
            "ripple_db",
            "cutoff_hz",
            "form",
            "line_ohm",
            "parts",
            "insertion_loss_db",
            "return_loss_db",
        }
        assert set(record["filter"]["parts"]) <= {b["name"] for b in record["tank"]["branches"]}
    ranking = record["ranking"]
    assert len(ranking) == len(made.ranking.candidates)
    assert sum(c["chosen"] for c in ranking) == 1
    keys = {"network", "filter", "chosen", "allowed", "refused", "margin_db", "trough_dip", "efficiency", "parts"}
    for c in ranking:
        assert set(c) >= {*keys, "extremes"}
        assert (c["refused"] is None) == (c["efficiency"] is not None)
        assert c["network"] in NETWORKS
    chosen = next(c for c in ranking if c["chosen"])
    assert chosen["network"] == record["tank"]["network"]
    assert chosen["efficiency"] == pytest.approx(record["tank"]["efficiency"], rel=1e-12)


def test_record_of_a_given_network_has_no_ranking():
    assert design_record(book(**BASE, network="pi"), [])["ranking"] is None


def test_the_program_does_the_same_and_its_exit_status_follows_the_limit(run):
    words = ["design", "--carrier", "7.1MHz", "--power", "10W", "--angle", "120", "--supply", "13.8", "--textbook"]
    missed = run(*words, "--limit", "us-amateur", "--json")
    met = run(*words, "--limit", "us-amateur", "--filter", "auto", "--json")
    assert (missed.returncode, met.returncode) == (1, 0)
    assert json.loads(missed.stdout)["filter"] is None
    assert json.loads(met.stdout)["filter"]["kind"] in KINDS
    assert min(h["margin_db"] for h in json.loads(met.stdout)["harmonics"]) >= MARGIN - 1e-6


# --- anything at all -------------------------------------------------------------------------------------


def decades(low: float, high: float) -> st.SearchStrategy[float]:
    return st.floats(math.log10(low), math.log10(high)).map(lambda x: 10.0**x)


jobs = st.fixed_dictionaries(
    {
        "carrier": decades(1e5, 3e8),
        "power": decades(0.1, 1500),
        "conduction_angle": st.floats(60, 270),
        "supply": decades(6, 3000),
        "network": st.sampled_from(["auto", "auto", *NETWORKS]),
    },
    optional={
        "family": st.sampled_from(["bipolar", "fet", "tube"]),
        "load": st.builds(complex, decades(8, 300), st.floats(-100, 100)),
        "loaded_q": st.floats(2, 40),
        "coil_q": st.one_of(decades(20, 1000), st.just(math.inf)),
        "capacitor_q": st.one_of(decades(50, 3000), st.just(math.inf)),
        "output_capacitance": decades(1e-13, 1e-9),
        "transformer": decades(0.2, 5),
        "exponent": st.floats(1, 2.5),
        "limit": st.sampled_from(["us-amateur", "43+10log", "60dB", "25uW"]),
        "filter": st.sampled_from(["auto", "none", "3", "4", "5", "7"]),
        "harmonics": st.integers(2, 20),
    },
)


@settings(max_examples=60, deadline=None, suppress_health_check=list(HealthCheck))
@given(job=jobs)
def test_any_job_ends_in_a_sound_design_or_in_an_error_for_people(job):
    try:
        made = book(**job)
    except RfstageError:
        return
    assert broken_invariants(made) == []
    branches = [p.branch for p in made.tank.parts]
    volts, _ = solve_nodes(branches, complex(made.settings.load_impedance), made.job.carrier)
    assert abs(volts[0] / made.point.load_resistance - 1) < 1e-9
    json.dumps(design_record(made, []), allow_nan=False)
    if made.ranking:
        assert untrue(made.ranking) == ""
        assert all(
            math.isfinite(x)
            for c in made.ranking.candidates
            for x in (c.margin or 0.0, c.missed, c.trough_dip, c.efficiency)
        )
    if job.get("filter") == "auto" and isinstance(made.filter, Filter):
        assert made.worst.margin >= MARGIN - 1e-6


def test_current_of_both_sides_of_a_coil_counts():
    # with the device at the tap a tenth of the coil's current passes there; what circulates in it heats it
    tapped = {"carrier": 14.2e6, "power": 100.0, "conduction_angle": 140.0, "supply": 50.0, "family": "fet"}
    found = book(**tapped, network="auto")
    one = next(c for c in found.ranking.candidates if c.name == "tapped-coil")
    part = next(p for p in design(Job(**tapped, network="tapped-coil"), textbook=True).tank.parts if p.far_current)
    assert part.rms_current < 15.0 < part.far_current < 30.0
    assert any(e.part == "L1" and "carries" in e.words for e in one.extremes)
