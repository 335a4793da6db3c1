"""Ring cores: the data and their sources, whole turns, the wire that fits, the flux."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from rfstage.errors import ImpossibleError, InputError, OutOfRangeError
from rfstage.parts import wire
from rfstage.parts.cores import CORES, core_named
from rfstage.parts.gauge import gauge_diameter
from rfstage.parts.toroid import (
    FINEST,
    exact_turns,
    flux_density,
    flux_limit,
    toroid_coil,
    turns_in_window,
    turns_on,
    whole_turns,
    window_wire,
)

# SOURCE: maker's table of inductance factors, alike in three reprints [µH for 100 turns]; beside it what permeability
# 10 (mix 2) and 8.5 (mix 6) and the core's dimensions would give, recomputed
POWDER = {
    "T-37": (40, 39.3, 30, 33.4),
    "T-44": (52, 52.8, 42, 44.8),
    "T-50": (49, 48.3, 40, 41.1),
    "T-68": (57, 60.2, 47, 51.1),
    "T-80": (55, 60.2, 45, 51.2),
    "T-94": (84, 82.4, 70, 70.1),
    "T-106": (135, 137.7, 116, 117.1),
    "T-130": (110, 113.4, 96, 96.4),
    "T-157": (140, 145.5, 115, 123.7),
    "T-184": (240, 238.4, 195, 202.7),
    "T-200": (120, 131.3, 100, 111.6),
}
# SOURCE: maker's table in a reprint [mH for 1000 turns]: types 43 (older) and 61; recomputed for permeability 125
# beside them; and type 43 in a newer reprint
FERRITES = {
    "FT-37": (420, 55.3, 55.2, 375),
    "FT-50": (523, 68.0, 68.8, 470),
    "FT-50A": (570, 75.0, 74.9, 510),
    "FT-82": (557, 73.3, 73.3, 500),
    "FT-114": (603, 79.3, 79.3, 540),
    "FT-140": (952, 140.0, 140.3, None),
    "FT-240": (1240, 173.0, 171.1, None),
}


def by_geometry(core, permeability):
    """Inductance factor of a ring of rectangular section: µ0 µ h ln(OD/ID)/2π."""
    return 2e-7 * permeability * core.height * math.log(core.outer / core.inner)


@pytest.mark.parametrize("size", POWDER)
def test_powder_cores_have_their_published_factors(size):
    mix_2, _, mix_6, _ = POWDER[size]
    assert CORES[f"{size}-2"].factor == pytest.approx(mix_2 * 1e-10, rel=1e-12)
    assert CORES[f"{size}-6"].factor == pytest.approx(mix_6 * 1e-10, rel=1e-12)


@pytest.mark.parametrize("size", POWDER)
def test_the_dimensions_of_powder_cores_give_the_computed_factors(size):
    _, from_10, _, from_8_5 = POWDER[size]
    assert by_geometry(CORES[f"{size}-2"], 10) * 1e10 == pytest.approx(from_10, abs=0.06)
    assert by_geometry(CORES[f"{size}-6"], 8.5) * 1e10 == pytest.approx(from_8_5, abs=0.06)


@pytest.mark.parametrize("size", POWDER)
def test_published_factors_lie_within_15_percent_of_the_geometric_formula(size):
    for mix, permeability in (("2", 10), ("6", 8.5)):
        core = CORES[f"{size}-{mix}"]
        assert by_geometry(core, permeability) / core.factor == pytest.approx(1, abs=0.15)


@pytest.mark.parametrize("size", FERRITES)
def test_ferrites_have_their_published_factors(size):
    older, type_61, _, newer = FERRITES[size]
    assert CORES[f"{size}-61"].factor == pytest.approx(type_61 * 1e-9, rel=1e-12)
    core = CORES[f"{size}-43"]
    assert core.factor == pytest.approx((newer or older) * 1e-9, rel=1e-12)
    assert core.older_factor == (pytest.approx(older * 1e-9, rel=1e-12) if newer else None)


@pytest.mark.parametrize("size", FERRITES)
def test_the_dimensions_of_ferrites_give_the_computed_factors(size):
    assert by_geometry(CORES[f"{size}-61"], 125) * 1e9 == pytest.approx(FERRITES[size][2], abs=0.06)


@pytest.mark.parametrize("size", [size for size in FERRITES if FERRITES[size][3]])
def test_the_newer_type_43_is_of_permeability_850(size):
    # SOURCE: recomputed: 850 gives 376, 468, 509, 498, 539, listed as 375, 470, 510, 500, 540
    assert by_geometry(CORES[f"{size}-43"], 850) == pytest.approx(CORES[f"{size}-43"].factor, rel=0.006)


@pytest.mark.parametrize("core", CORES.values(), ids=lambda core: core.name)
def test_every_core_names_its_sources(core):
    assert "table" in core.source
    assert "from memory" in core.dimensions_source
    assert 0 < core.inner < core.outer
    assert core.area == pytest.approx((core.outer - core.inner) * core.height / 2)


@pytest.mark.parametrize("name", ["T-50-2", "t-50-2", "T50-2", " t50-2 ", "T502"])
def test_capitals_and_dashes_of_a_core_do_not_matter(name):
    assert core_named(name).name == "T-50-2"


def test_folded_names_tell_all_cores_apart():
    assert len({core_named(name).name for name in CORES}) == len(CORES)
    assert all(core_named(name.replace("-", "")) is core for name, core in CORES.items())


@pytest.mark.parametrize(
    ("name", "near"), [("T-51-2", "T-50-2"), ("T-50-7", "T-50-6"), ("FT-50-44", "FT-50-43"), ("T-200-", "T-200-2")]
)
def test_a_misspelt_core_gets_the_nearest_names(name, near):
    with pytest.raises(InputError, match=rf"core: got '{name}', which is not in the data \(did you mean .*{near}"):
        core_named(name)


@pytest.mark.parametrize("name", ["", "doughnut", "🧲"])
def test_what_is_no_core_gets_the_sizes_there_are(name):
    with pytest.raises(InputError, match=r"it has mixes 2 and 6 of T-37, .* and types 43 and 61 of FT-37"):
        core_named(name)


@pytest.mark.parametrize(
    ("inductance", "factor", "exact", "whole"),
    [
        # SOURCE: US amateur Extra question pool 2016-2020 (NCVEC), E6D: 5 µH with 40 µH for 100 turns
        (5e-6, 4.0e-9, 35.36, 35),
        # SOURCE: the same: 1 mH with 523 mH for 1000 turns; the key says 43, which cuts off: 44 is nearer
        (1e-3, 523e-9, 43.73, 44),
        # SOURCE: a reprint's problem: 12 µH on T-50-2
        (12e-6, 4.9e-9, 49.49, 49),
    ],
)
def test_turns_are_those_of_the_worked_problems(inductance, factor, exact, whole):
    assert exact_turns(inductance, factor) == pytest.approx(exact, abs=0.005)
    assert whole_turns(inductance, factor) == whole


@given(inductance=st.floats(1e-9, 1e-2), core=st.sampled_from(sorted(CORES)))
def test_no_other_whole_turns_come_nearer(inductance, core):
    factor = CORES[core].factor
    n = whole_turns(inductance, factor)
    off = abs(factor * n**2 - inductance)
    assert n >= 1
    assert off <= abs(factor * (n + 1) ** 2 - inductance)
    assert n == 1 or off <= abs(factor * (n - 1) ** 2 - inductance)


@given(turns=st.integers(1, 300), core=st.sampled_from(sorted(CORES)))
def test_turns_to_inductance_and_back(turns, core):
    factor = CORES[core].factor
    assert whole_turns(factor * turns**2, factor) == turns


@given(inner=st.floats(1e-3, 0.2), turns=st.integers(1, 500))
def test_the_thickest_wire_fits_so_often_and_no_more(inner, turns):
    room = window_wire(inner, turns)
    assert turns_in_window(inner, room) == turns
    assert turns_in_window(inner, room * 1.001) == turns - 1
    assert window_wire(inner, turns + 1) < room


def test_wire_in_the_window_touches_its_neighbours():
    # SOURCE: geometry: six equal circles fill the ring around a seventh; three have (2√3 − 3) of the radius
    assert window_wire(9e-3, 6) == pytest.approx(3e-3, rel=1e-12)
    assert window_wire(2.0, 3) / 2 == pytest.approx(2 * math.sqrt(3) - 3, rel=1e-12)
    np.testing.assert_allclose(window_wire([9e-3, 18e-3], 6), [3e-3, 6e-3], rtol=1e-12)


def test_a_coil_on_a_core_is_put_together_as_said():
    core = core_named("T-68-2")
    coil = toroid_coil(core, 22, carrier=7.1e6, wire_diameter=0.8e-3)
    assert coil.inductance == pytest.approx(5.7e-9 * 22**2)
    around = 2 * (0.190 * 25.4e-3 + 0.8e-3) + 2 * ((0.690 - 0.370) / 2 * 25.4e-3 + 0.8e-3)
    assert coil.wire_length == pytest.approx(22 * around)
    assert coil.copper_resistance == pytest.approx(float(wire.ac_resistance(0.8e-3, 7.1e6)) * coil.wire_length)
    assert coil.flux_density(2.0) == pytest.approx(coil.inductance * 2.0 / (22 * core.area))


@given(core=st.sampled_from(sorted(CORES)), turns=st.integers(1, 200), carrier=st.floats(1e4, 1e9))
def test_the_wire_that_is_chosen_fits_with_its_insulation(core, turns, carrier):
    ring = CORES[core]
    if turns > turns_in_window(ring.inner, FINEST):
        return
    coil = toroid_coil(ring, turns, carrier=carrier)
    assert coil.wire_diameter <= 0.9 * coil.largest_wire
    assert math.isfinite(coil.copper_resistance)
    assert coil.copper_resistance > 0


def test_flux_is_that_of_faraday():
    # SOURCE: U/(ω N A) for a sine, since U = ω L I
    peak_voltage, omega, turns, area, inductance = 100.0, 2 * math.pi * 7e6, 20, 20e-6, 2e-6
    current = peak_voltage / (omega * inductance)
    got = flux_density(inductance, current, turns=turns, area=area)
    assert got == pytest.approx(peak_voltage / (omega * turns * area), rel=1e-12)


@pytest.mark.parametrize(
    ("frequency", "tesla"),
    # SOURCE: common practice, from memory, as the module says
    [(0.1e6, 50e-3), (1e6, 15e-3), (7e6, 5.7e-3), (14e6, 4.2e-3), (21e6, 3.6e-3), (28e6, 3.0e-3)],
)
def test_flux_limit_is_exact_at_its_points(frequency, tesla):
    assert flux_limit(frequency) == tesla


def test_flux_limit_falls_with_frequency_and_ends():
    limits = [flux_limit(f) for f in np.geomspace(0.1e6, 28e6, 100)[1:-1]]
    assert all(a > b for a, b in pairwise(limits))
    assert flux_limit(0.09e6) is None
    assert flux_limit(30e6) is None


def test_an_inductance_below_one_turn_is_refused_with_what_one_turn_gives():
    with pytest.raises(ImpossibleError, match=r"1\.00 nH can't be had on T-50-2; the nearest is 4\.90 nH with 1 turn"):
        turns_on(core_named("T-50-2"), 1e-9)


def test_an_inductance_beyond_the_window_is_refused_with_what_fits():
    core = core_named("T-50-2")
    most = turns_in_window(core.inner, gauge_diameter(40))
    with pytest.raises(ImpossibleError, match=rf"wants 452 turns; the nearest is 438 µH with {most} turns of AWG 40"):
        turns_on(core, 1e-3)


def test_wire_too_thick_for_the_window_is_refused_with_what_fits():
    with pytest.raises(OutOfRangeError, match=r"at most 1\.041 mm, for 20 turns .* T-50-2; got 3\.000 mm .*takes 4\)"):
        toroid_coil(core_named("T-50-2"), 20, carrier=7e6, wire_diameter=3e-3)


def test_more_turns_than_the_finest_wire_fits_are_refused():
    with pytest.raises(OutOfRangeError, match=r"turns must be 1 to 299 on T-50-2; got 400"):
        toroid_coil(core_named("T-50-2"), 400, carrier=7e6)


def test_unknown_core_loss_is_said():
    for name in CORES:
        assert any("core loss is not in the data" in words for words in toroid_coil(CORES[name], 10, carrier=7e6).notes)


def test_two_generations_of_type_43_are_said():
    notes = toroid_coil(core_named("FT-50-43"), 10, carrier=0.5e6).notes
    assert any("523 nH" in words and "11 % more" in words for words in notes)
    assert not any("permeability" in words for words in notes)


def test_a_ferrite_above_its_knee_is_flagged():
    assert any("permeability of type 61" in w for w in toroid_coil(core_named("FT-50-61"), 10, carrier=30e6).notes)
