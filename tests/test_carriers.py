"""One tank for several carriers: settings, taps, Q at the end of a range, the map of loads, and what is refused."""

from __future__ import annotations

import json
import math
from dataclasses import replace

import numpy as np
import pytest
from conftest import PROJECT
from reference_circuits import element_impedance, solve_nodes

from rfstage import design, design_carriers, load_job
from rfstage.designs.loads import PHASES, VSWRS, tank_of
from rfstage.errors import ImpossibleError, InputError
from rfstage.files.job import load_jobs
from rfstage.job import Job, Variable
from rfstage.matching.exact import behind
from rfstage.report.carriers import carriers_page
from rfstage.report.page import Look

JOB = Job(carrier=3.65e6, power=100.0, conduction_angle=120.0, supply=50.0)
HIGH = replace(JOB, supply=400.0)
WORDS = ("--power", "100W", "--angle", "120deg", "--supply", "50V")
FILE = """
[stage]
carrier = {carriers}
power = "100 W"
conduction_angle = "120 deg"
supply = "50 V"
[tank]
network = "{network}"
{variable}
"""


def job_file(folder, *, carriers='["3.65 MHz", "7.1 MHz"]', network="pi", variable=""):
    path = folder / "job.toml"
    path.write_text(
        FILE.format(carriers=carriers, network=network, variable=f"variable = {variable}" if variable else ""),
        encoding="utf-8",
    )
    return path


def values(made):
    return {b.name: float(b.value) for b in tank_of(made)}


def ranges_around(made, names, least=0.6, most=1.6):
    return tuple(Variable(n, least * v, most * v) for n, v in values(made).items() if n in names)


@pytest.fixture(scope="module")
def bands():
    """The example of four carriers by the book, with variable capacitors too small for the lowest."""
    return design_carriers(load_jobs(PROJECT / "examples" / "tower-bands.toml"), textbook=True)


# one network, settings, taps


@pytest.mark.parametrize("textbook", [True, False])
def test_each_carrier_has_the_design_of_its_own_job(textbook):
    """With the choke and the blocking capacitor of the lowest, which are there for all."""
    jobs = [replace(JOB, carrier=f, network="pi") for f in (3.65e6, 7.1e6)]
    lowest = design(jobs[0], textbook).stage
    blocking = next(b.value for b in lowest.branches if b.name == "Cblock")
    for job, t in zip(jobs, design_carriers(jobs, textbook), strict=True):
        same = {} if job is jobs[0] else {"choke": lowest.supply.choke, "blocking": blocking}
        alone = design(replace(job, **same), textbook)
        assert (t.design.stage.supply.choke, t.design.stage.branches[0].value) == (lowest.supply.choke, blocking)
        assert t.design.stage == alone.stage
        assert t.design.point == alone.point
        assert t.design.harmonics == alone.harmonics
        assert {s.part: s.value for s in t.settings} == values(alone)
        assert (t.decided_by, t.loads) == ("", ())


@pytest.mark.parametrize("coupling", [None, 0.3])
def test_all_carriers_have_one_network_the_first_carriers_best(coupling):
    """A number that only other networks have decides nothing: the job of one carrier does not mind it either."""
    jobs = [replace(JOB, carrier=f, power=30.0, supply=13.8, coupling=coupling) for f in (7.1e6, 14.1e6)]
    tuned = design_carriers(jobs, textbook=True)
    best = design(jobs[0], textbook=True)
    assert [t.design.tank.network for t in tuned] == [best.tank.network] * 2
    assert tuned[0].design.stage.branches == best.stage.branches


def test_more_orders_than_the_waveform_needs_are_ranked_too():
    jobs = [replace(JOB, carrier=f, harmonics=40, limit="us-amateur") for f in (3.65e6, 7.1e6)]
    assert [t.design.harmonics[-1].order for t in design_carriers(jobs, textbook=True)] == [40, 40]


def test_a_network_that_fails_a_later_carrier_is_passed_over():
    """At 150 MHz the output capacitance leaves the first carrier's best nothing to work with."""
    jobs = [replace(JOB, carrier=f, supply=600.0, output_capacitance=100e-12) for f in (1.85e6, 150e6)]
    best = design(jobs[0], textbook=True).tank.network
    with pytest.raises(ImpossibleError):
        design(replace(jobs[1], network=best), textbook=True)
    networks = {t.design.tank.network for t in design_carriers(jobs, textbook=True)}
    assert len(networks) == 1
    assert best not in networks


def test_taps_are_the_root_of_the_share_of_the_largest_inductance(bands):
    for name in ("L1",):
        inductance = [values(t.design)[name] for t in bands]
        got = [next(s for s in t.settings if s.part == name).turns for t in bands]
        assert got == pytest.approx([math.sqrt(v / max(inductance)) for v in inductance], rel=1e-12)
        assert max(got) == 1.0
    assert all(s.turns is None for t in bands for s in t.settings if s.unit == "F")


def test_a_network_of_two_coils_has_two_taps():
    low, high = design_carriers([replace(JOB, carrier=f, network="pi-l") for f in (3.65e6, 7.1e6)], textbook=True)
    for name in ("L1", "L2"):
        share = next(s.turns for s in high.settings if s.part == name)
        assert share == pytest.approx(math.sqrt(values(high.design)[name] / values(low.design)[name]), rel=1e-12)


def test_a_setting_says_whether_it_lies_in_its_range():
    made = design(replace(JOB, network="pi"), textbook=True)
    c1, c2 = values(made)["C1"], values(made)["C2"]
    ranges = (Variable("C1", 0.5 * c1, 2 * c1), Variable("C2", 1.1 * c2, 2 * c2))
    (t,) = design_carriers([replace(JOB, network="pi", variable=ranges)], textbook=True)
    assert {s.part: s.within for s in t.settings} == {"C1": True, "L1": None, "C2": False}
    assert not t.loads[0].matched or t.loads[0].tap_moved
    lines = [line.plain for line in carriers_page([t], Look(120))]
    assert any(line.strip().startswith("! 3.6500 MHz: C2 of 6.54 nF is outside its 7.20 nF to") for line in lines)


# the end of a range decides the Q


@pytest.mark.parametrize("textbook", [True, False])
@pytest.mark.parametrize("share", [0.7, 1.4])
def test_an_input_capacitor_at_the_end_of_its_range_decides_the_q(share, textbook):
    job = replace(JOB, network="pi", output_capacitance=100e-12)
    wish = design(job, textbook)
    c1, c2 = values(wish)["C1"], values(wish)["C2"]
    first = Variable("C1", 0.1 * c1, share * c1) if share < 1 else Variable("C1", share * c1, 9 * c1)
    (t,) = design_carriers([replace(job, variable=(first, Variable("C2", c2 / 9, 9 * c2)))], textbook)
    assert t.decided_by == "C1"
    assert next(s for s in t.settings if s.part == "C1").within
    assert values(t.design)["C1"] == pytest.approx(share * c1, rel=1e-9)
    # input-side Q by its definition: load resistance times all the susceptance of capacitors across the device
    omega = 2 * math.pi * job.carrier
    by_hand = t.design.point.load_resistance * omega * (share * c1 + 100e-12)
    assert t.design.tank.input_q == pytest.approx(by_hand, rel=1e-9)
    assert (t.design.tank.loaded_q - wish.tank.loaded_q) * (share - 1) > 0
    assert t.loads[0].matched
    assert not t.loads[0].tap_moved


@pytest.mark.parametrize(
    ("network", "more"), [("pi", {"transformer": 2.0}), ("pi-l", {}), ("link", {}), ("capacitive-divider", {})]
)
@pytest.mark.parametrize("share", [0.7, 1.4])
def test_the_end_of_a_range_decides_the_q_of_any_network_that_begins_with_a_capacitor(network, more, share):
    job = replace(JOB, network=network, **more)
    made = design(job, textbook=True)
    c1, c2 = values(made)["C1"], values(made)["C2"]
    first = Variable("C1", 0.1 * c1, share * c1) if share < 1 else Variable("C1", share * c1, 9 * c1)
    (t,) = design_carriers([replace(job, variable=(first, Variable("C2", c2 / 9, 9 * c2)))], textbook=True)
    assert t.decided_by == "C1"
    assert values(t.design)["C1"] == pytest.approx(share * c1, rel=1e-9)
    seen = seen_by_nodes(t.design, {}, t.design.settings.load_impedance)
    assert seen == pytest.approx(t.design.point.load_resistance, rel=1e-9)


def test_an_end_that_no_q_reaches_is_said_to_be_out_of_range():
    """From 3.6 kohm down to 50 a pi needs a Q above 8.4; half the capacitance of Q 10 is less than any pi has."""
    job = replace(JOB, network="pi", supply=1000.0, power=130.0, loaded_q=10.0)
    made = design(job, textbook=True)
    c1, c2 = values(made)["C1"], values(made)["C2"]
    ranges = (Variable("C1", 0.1 * c1, 0.5 * c1), Variable("C2", c2 / 9, 9 * c2))
    (t,) = design_carriers([replace(job, variable=ranges)], textbook=True)
    assert t.decided_by == ""
    assert next(s for s in t.settings if s.part == "C1").within is False


# the map of loads


def seen_by_nodes(made, settings, load):
    """What the device sees with settings put into the ladder, by node equations."""
    branches = [
        replace(p.branch, value=settings.get(p.branch.name, p.branch.value))
        if p.branch.kind != "transformer"
        else p.branch
        for p in made.tank.parts
    ]
    return complex(solve_nodes(branches, load, made.job.carrier)[0][0])


CASES = [
    (JOB, "pi", ("C1", "C2"), {}),
    (HIGH, "pi", ("C1", "L1"), {}),
    (JOB, "pi", ("L1", "C2"), {"transformer": 2.0}),
    (HIGH, "pi", ("C1", "L1", "C2"), {}),
    (JOB, "pi", ("C1", "C2"), {"filter": "5", "filter_kind": "chebyshev", "limit": "us-amateur"}),
    (JOB, "pi-l", ("C2", "L2"), {}),
    (JOB, "t", ("C1", "L2"), {"transformer": 1.5}),
    (HIGH, "t", ("L1", "C1", "L2"), {}),
    (HIGH, "l", ("L1", "C1"), {}),
    (JOB, "l-high-pass", ("C1", "L1"), {}),
    (HIGH, "link", ("C1", "C2"), {}),
    (JOB, "capacitive-divider", ("C1", "C2"), {}),
]


@pytest.fixture(scope="module", params=CASES, ids=lambda c: f"{c[1]}-{'-'.join(c[2])}-{c[0].supply:g}V")
def mapped(request):
    base, network, names, more = request.param
    job = replace(base, network=network, coil_q=200.0, **more)
    made = design(job, textbook=True)
    (t,) = design_carriers([replace(job, variable=ranges_around(made, names))], textbook=True)
    return t


def check_matches(t):
    ranges = {v.name: v for v in t.design.job.variable}
    resistance = t.design.point.load_resistance
    for m in t.loads:
        size = abs((m.load - 50) / (m.load + 50))
        assert (1 + size) / (1 - size) == pytest.approx(m.vswr, rel=1e-9)
        if not m.matched:
            assert m.change
            continue
        settings = dict(m.settings)
        assert settings.keys() >= ranges.keys()
        assert (len(settings) > len(ranges)) == m.tap_moved
        assert seen_by_nodes(t.design, settings, m.load) == pytest.approx(resistance, rel=1e-6)
        for name, v in ranges.items():
            assert v.least * (1 - 1e-9) <= settings[name] <= v.most * (1 + 1e-9)


def test_settings_of_a_matched_load_show_the_device_its_resistance(mapped):
    assert [m.vswr for m in mapped.loads] == [VSWRS[0], *(v for v in VSWRS[1:] for _ in PHASES)]
    check_matches(mapped)


def test_the_line_itself_is_matched_where_the_design_is_in_its_ranges(mapped):
    assert all(s.within is not False for s in mapped.settings)
    assert mapped.loads[0].matched
    assert not mapped.loads[0].tap_moved


def test_no_setting_in_the_ranges_matches_a_load_that_is_said_to_need_more(mapped):
    """A grid over the ranges: every place where it comes nearest is followed down; none ends at a match inside."""
    from scipy.optimize import minimize

    made = mapped.design
    own = tank_of(made)
    free = [k for k, b in enumerate(own) if b.name in {v.name for v in made.job.variable}]
    if len(free) != 2:
        assert all(m.matched for m in mapped.loads)
        return
    ranges = [next(v for v in made.job.variable if v.name == own[k].name) for k in free]
    before = made.tank.parts[: len(made.tank.parts) - len(own) - (len(made.filter.parts) if made.filter else 0)]
    target = behind([p.branch for p in before], complex(made.point.load_resistance), made.job.carrier)
    ends = np.array([[math.log(v.least), math.log(v.most)] for v in ranges])
    grid = [np.linspace(low, high, 60) for low, high in ends]
    unmatched = [m for m in mapped.loads if not m.matched or m.tap_moved]
    for m in unmatched[:: max(1, len(unmatched) // 4)]:
        load = m.load
        if made.filter:
            load = complex(solve_nodes(made.filter.parts, load, made.job.carrier)[0][0])

        def miss(x, load=load):
            z = complex(load)
            at = dict(zip(free, np.exp(np.moveaxis(np.atleast_2d(x), -1, 0)), strict=True))
            for k in reversed(range(len(own))):
                z = stepped(own[k], at.get(k), z, made.job.carrier)
            return np.abs((z - target) / (z + np.conj(target)))

        field = miss(np.stack(np.meshgrid(*grid, indexing="ij"), axis=-1).reshape(-1, 2)).reshape(60, 60)
        inner = np.pad(field, 1, constant_values=np.inf)
        lows = np.argwhere(
            np.all(
                [field <= inner[1 + i : 61 + i, 1 + j : 61 + j] for i in (-1, 0, 1) for j in (-1, 0, 1)],
                axis=0,
            )
        )
        for i, j in lows:
            start = [grid[0][i], grid[1][j]]
            found = minimize(
                lambda x: float(miss(x)[0]),
                start,
                method="Nelder-Mead",
                bounds=ends,
                options={"xatol": 1e-9, "fatol": 1e-9},
            )
            assert found.fun > 1e-6, (m, np.exp(found.x))


def stepped(branch, value, z, carrier):
    """One branch of a ladder before an impedance, arrays allowed in its value."""
    if branch.kind == "coupled":
        omega = 2 * math.pi * carrier
        first, second = (
            float(x) * omega * (1j + 1 / float(q))
            for x, q in ((branch.value, branch.q), (branch.second, branch.second_q))
        )
        mutual = 1j * omega * float(branch.coupling) * math.sqrt(float(branch.value) * float(branch.second))
        return first - mutual**2 / (second + z)
    one = complex(element_impedance(replace(branch, value=1.0), carrier)[0])
    value = float(branch.value) if value is None else value
    own = one * value if branch.kind == "coil" else one / value
    return own + z if branch.place == "series" else own * z / (own + z)


def pi_matches(t, load, coil):
    """Both capacitors of a pi within their ranges that match a load with this coil [H], from its own equations.

    For each output capacitor the input one must supply what admittance is left; where it is a capacitor of its Q
    there is a match.
    """
    c1, l1, c2 = tank_of(t.design)
    carrier = t.design.job.carrier
    ranges = {v.name: v for v in t.design.job.variable}
    feed = [p.branch for p in t.design.tank.parts[:-3]]
    wanted = 1 / behind(feed, complex(t.design.point.load_resistance), carrier)
    per_farad = [1e9 / complex(element_impedance(replace(c, value=1e-9), carrier)[0]) for c in (c1, c2)]
    series = complex(element_impedance(replace(l1, value=coil), carrier)[0])
    out = np.linspace(ranges["C2"].least, ranges["C2"].most, 4001)
    left = wanted - 1 / (series + 1 / (per_farad[1] * out + 1 / load))
    into = left.imag / per_farad[0].imag
    miss = left.real - per_farad[0].real * into
    k = np.nonzero(miss[1:] * miss[:-1] <= 0)[0]
    at = into[k] + (into[k + 1] - into[k]) * miss[k] / (miss[k] - miss[k + 1])
    return (at >= ranges["C1"].least * (1 - 1e-5)) & (at <= ranges["C1"].most * (1 + 1e-5))


def test_the_map_of_the_example_is_what_the_equations_of_a_pi_say(bands):
    """As the coil is tapped: both directions. With the tap moved: no load that any coil matches is given up."""
    marks = []
    for t in bands:
        check_matches(t)
        now = values(t.design)["L1"]
        for m in t.loads:
            as_tapped = bool(pi_matches(t, m.load, now).any())
            assert as_tapped == (m.matched and not m.tap_moved), (t.design.job.carrier, m)
            if not m.matched:
                coils = now * np.geomspace(0.25, 4, 81)
                assert not any(pi_matches(t, m.load, coil).any() for coil in coils), (t.design.job.carrier, m)
            marks.append("=" if as_tapped else "t" if m.matched else "-")
    assert set(marks) == {"=", "t", "-"}
    assert bands[0].decided_by == "C1"


def test_what_it_would_take_matches_and_lies_beyond_a_range(bands):
    t = bands[0]
    ranges = {v.name: v for v in t.design.job.variable}
    lost = [m for m in t.loads if not m.matched]
    assert lost
    for m in lost:
        settings = dict(m.settings)
        assert seen_by_nodes(t.design, settings, m.load) == pytest.approx(t.design.point.load_resistance, rel=1e-6)
        beyond = [n for n, v in ranges.items() if not v.holds(settings[n])]
        assert beyond
        assert all(f"{n} wants" in m.change for n in beyond)
        assert ("tapped to" in m.change) == ("L1" in settings)


def test_one_carrier_with_variable_parts_has_the_page_and_record_of_several(run, tmp_path):
    path = job_file(tmp_path, carriers='"3.65 MHz"', variable='{ C1 = ["5 nF", "30 nF"], C2 = ["2 nF", "20 nF"] }')
    done = run("design", str(path), "--textbook", "--json")
    assert done.returncode == 0, done.stderr
    got = json.loads(done.stdout)
    assert got["format"] == "rfstage.carriers"
    assert len(got["carriers"]) == 1
    assert len(got["carriers"][0]["loads"]) == 1 + 3 * 12
    assert "Loads matched with C1, C2" in run("design", str(path), "--textbook").stdout


# record, page, exit status


def test_options_and_a_file_list_give_the_same_record(run, tmp_path):
    path = job_file(tmp_path)
    from_file = run("design", str(path), "--textbook", "--json")
    from_options = run("design", "--carrier", "3.65MHz, 7.1MHz", *WORDS, "--network", "pi", "--textbook", "--json")
    assert (from_file.returncode, from_options.returncode) == (0, 0)
    assert from_file.stdout == from_options.stdout
    got = json.loads(from_file.stdout)
    assert (got["format"], got["version"], got["network"]) == ("rfstage.carriers", 1, "pi")
    assert [c["carrier_hz"] for c in got["carriers"]] == [3.65e6, 7.1e6]


def test_an_option_puts_the_file_list_aside(run, tmp_path):
    done = run("design", str(job_file(tmp_path)), "--carrier", "14.1MHz", "--textbook", "--json")
    assert json.loads(done.stdout)["format"] == "rfstage.design"


def test_the_record_has_its_keys_and_types(bands):
    from rfstage.files.carrierrecord import carriers_record

    got = json.loads(json.dumps(carriers_record(bands), allow_nan=False))
    assert set(got) == {"format", "version", "network", "carriers"}
    for t, carrier in zip(bands, got["carriers"], strict=True):
        assert set(carrier) == {"carrier_hz", "loaded_q", "decided_by", "settings", "loads", "design"}
        assert carrier["decided_by"] in ("C1", None)
        assert carrier["design"]["format"] == "rfstage.design"
        assert carrier["design"]["stage"]["carrier_hz"] == carrier["carrier_hz"] == t.design.job.carrier
        for s in carrier["settings"]:
            assert set(s) == {"part", "unit", "value", "turns_share", "least", "most", "within"}
            assert isinstance(s["value"], float)
            assert (s["turns_share"] is None) == (s["unit"] == "F")
            assert (s["least"] is None) == (s["most"] is None) == (s["within"] is None) == (s["part"] == "L1")
        for m in carrier["loads"]:
            assert set(m) == {"vswr", "phase_deg", "load_ohm", "matched", "tap_moved", "settings", "change"}
            assert (type(m["matched"]), type(m["tap_moved"]), len(m["load_ohm"])) == (bool, bool, 2)
            assert (m["change"] is None) == m["matched"]
            assert all(isinstance(v, float) for v in m["settings"].values())


@pytest.mark.parametrize("ascii_only", [False, True])
@pytest.mark.parametrize("width", [80, 120])
def test_the_page_is_no_wider_than_it_may_be(bands, width, ascii_only):
    lines = [line.plain for line in carriers_page(bands, Look(width, ascii_only))]
    assert max(map(len, lines)) <= width
    text = "\n".join(lines)
    for t in bands:
        assert text.count(f"{t.design.job.carrier / 1e6:.5g}"[:4]) >= 3  # settings, performance, map
    assert "VSWR on 50.0" in text


def test_the_plain_page_is_ascii_and_marks_every_load(run):
    done = run("design", str(PROJECT / "examples" / "tower-bands.toml"), "--textbook", "--plain", width=80)
    assert done.returncode == 1  # no pi of this Q meets the limit of the example
    assert done.stdout.isascii()
    assert max(map(len, done.stdout.splitlines())) <= 80
    tabled = done.stdout.split("Loads matched")[1].split("= matched")[0].splitlines()
    marks = [word for line in tabled[2:] for word in line.split() if word in ("=", "t", "-")]
    assert len(marks) == 4 * (1 + 3 * 12)


@pytest.mark.parametrize(("limit", "status"), [("30dB", 0), ("60dB", 1), ("", 0)])
def test_exit_status_is_one_where_a_carrier_misses_the_limit(run, limit, status):
    words = ("--limit", limit) if limit else ()
    done = run("design", "--carrier", "3.65MHz,7.1MHz", *WORDS, "--network", "pi", "--textbook", "--json", *words)
    assert done.returncode == status
    margins = [h["margin_db"] for c in json.loads(done.stdout)["carriers"] for h in c["design"]["harmonics"]]
    assert (min((m for m in margins if m is not None), default=0.0) < 0) == (status == 1)


def test_a_filter_with_several_carriers_is_its_own_at_each():
    jobs = [replace(JOB, carrier=f, network="pi", limit="us-amateur", filter="auto") for f in (3.65e6, 7.1e6)]
    low, high = design_carriers(jobs, textbook=True)
    for t in (low, high):
        assert t.design.worst.margin >= 3 - 1e-9
        assert [s.part for s in t.settings] == ["C1", "L1", "C2"]


# what is refused


@pytest.mark.parametrize(
    "words", [("--save", "x.toml"), ("--touchstone", "x.s2p"), ("--spice", "x.cir"), ("--parts",), ("--heat",)]
)
def test_what_is_for_one_stage_is_refused_for_several(run, tmp_path, words):
    done = run("design", "--carrier", "3.65MHz,7.1MHz", *WORDS, "--textbook", *words)
    assert (done.returncode, done.stdout) == (2, "")
    (line,) = done.stderr.splitlines()
    assert line.startswith(f"rfstage: {words[0]}: ")
    assert "one stage" in line
    assert list(tmp_path.iterdir()) == []


CARRIERS = [
    ('["7.1 MHz", "3.65 MHz"]', "out of order; wanted them rising, each once: 3.65 MHz, 7.1 MHz"),
    ('["7.1 MHz", "7.1 MHz"]', "got one carrier twice"),
    ("[]", "got an empty list"),
    ('["3.65 MHz", "wood", "14.1 MHz"]', "read 'wood', which is not a number with a unit"),
    ('["3.65 MHz", "20 W"]', "read '20 W', which is a power"),
    ('["3.65 MHz", ["7.1 MHz"]]', "got a list"),
    ('["3.65 MHz", "-7.1 MHz"]', "allowed 1 kHz to 30 GHz"),
    ('["wood"]', "read 'wood'"),
]


@pytest.mark.parametrize(("carriers", "said"), CARRIERS)
def test_a_list_of_carriers_that_makes_no_sense_is_one_line(tmp_path, carriers, said):
    path = job_file(tmp_path, carriers=carriers)
    with pytest.raises(InputError) as caught:
        load_jobs(path)
    (line,) = caught.value.problems
    assert line.startswith(f"{path}: stage.carrier: ")
    assert said in line


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("7.1MHz,3.65MHz", "carriers out of order"),
        ("7.1MHz,7100kHz", "one carrier twice"),
        ("7.1MHz,wood", "read 'wood'"),
        ("7.1MHz,", "empty text"),
        ("3.65e6,7.1e6", "has a comma"),
    ],
)
def test_an_option_of_carriers_that_makes_no_sense_is_one_line_and_status_2(run, text, said):
    done = run("design", "--carrier", text, *WORDS)
    assert (done.returncode, done.stdout) == (2, "")
    (line,) = done.stderr.splitlines()
    assert line.startswith("rfstage: --carrier: ")
    assert said in line


def test_a_job_of_several_carriers_is_not_read_as_one(tmp_path):
    with pytest.raises(InputError, match="got 2 carriers; wanted one"):
        load_job(job_file(tmp_path))


VARIABLE = [
    ('{ C1 = ["20 nF", "1 nF"] }', "tank.variable.C1: the least must be below the most"),
    ('{ C1 = ["1 nF", "1 nF"] }', "tank.variable.C1: the least must be below the most"),
    ('{ x = ["1 nF", "2 nF"] }', "tank.variable.x: a variable part is a capacitor or a coil"),
    ('{ "" = ["1 nF", "2 nF"] }', "a variable part is a capacitor or a coil"),
    ('{ "C\\n1" = "1 nF" }', "tank.variable.C\\n1: got '1 nF'; wanted a list"),
    ('{ C1 = ["1 nF"] }', "wanted a list of the least and the most"),
    ('{ C1 = ["1 uH", "2 uH"] }', "is an inductance; wanted a capacitance"),
    ('{ C1 = ["0 pF", "1 nF"] }', "allowed above 0 F"),
    ("[1]", "tank.variable: got a list; wanted a table"),
]


@pytest.mark.parametrize(("variable", "said"), VARIABLE)
def test_variable_parts_that_make_no_sense_are_one_line(tmp_path, variable, said):
    with pytest.raises(InputError) as caught:
        load_jobs(job_file(tmp_path, variable=variable))
    (line,) = caught.value.problems
    assert said in line
    assert line.isprintable()


@pytest.mark.parametrize(
    ("network", "names", "said"),
    [
        ("pi", ("C1",), "got 1 part of network pi"),
        ("pi-l", ("C1", "L1", "C2", "L2"), "got 4 parts of network pi-l"),
        ("pi", ("C1", "C7"), "'C7' is no part of network pi; it has C1, L1, C2"),
        ("pi", ("C1", "C2", "Cblock"), "'Cblock' is no part of network pi"),
        ("pi", ("C1", "Lchoke"), "'Lchoke' is no part of network pi"),
        ("link", ("C1", "L1"), "'L1' of network link is a coupled pair"),
    ],
)
def test_parts_that_can_not_be_set_are_one_line(network, names, said):
    ranges = tuple(Variable(name, 1e-9, 1e-6) for name in names)
    with pytest.raises(InputError) as caught:
        design_carriers([replace(JOB, network=network, variable=ranges)], textbook=True)
    (line,) = caught.value.problems
    assert line.startswith("tank.variable: ")
    assert said in line


def test_one_variable_part_is_status_2(run, tmp_path):
    done = run("design", str(job_file(tmp_path, variable='{ C1 = ["1 nF", "30 nF"] }')), "--textbook")
    assert (done.returncode, done.stdout) == (2, "")
    assert len(done.stderr.splitlines()) == 1
