"""Choke and transformer on ring cores: flux over all orders and dc, turns, ratio, wire."""

from __future__ import annotations

import math

import numpy as np
import pytest

from rfstage import Job, design, fit_parts
from rfstage.errors import ImpossibleError
from rfstage.fitting.rings import LONG, SHORT, WIRE, choke_ring, volt_seconds
from rfstage.parts.cores import CORES
from rfstage.parts.toroid import flux_limit

BASE = {"carrier": 7.1e6, "power": 10.0, "conduction_angle": 120.0, "supply": 13.8, "network": "pi"}
JOBS = {
    "10 W": BASE,
    "60 W by 1:3": {**BASE, "carrier": 14.1e6, "power": 60.0, "transformer": 3.0},
    "5 W by 1:2": {**BASE, "carrier": 1.85e6, "power": 5.0, "transformer": 2.0},
    "400 W tube": {**BASE, "carrier": 3.65e6, "power": 400.0, "supply": 2000.0, "family": "tube"},
}


@pytest.fixture(scope="module", params=JOBS)
def fitted(request):
    return fit_parts(design(Job(**JOBS[request.param])))


def test_volt_seconds_are_the_integral_of_the_voltage_less_its_mean():
    """A running sum over the printed cycle, its own mean taken off: no Fourier series in it."""
    state = design(Job(**BASE)).settled
    wave = state.waveform.voltage - state.waveform.voltage.mean()
    step = 1 / BASE["carrier"] / wave.size
    linked = np.cumsum((wave + np.roll(wave, -1)) / 2) * step
    linked -= linked.mean()
    assert volt_seconds(state) == pytest.approx(np.abs(linked).max(), rel=2e-3)  # a sum of 2 % steps and no series


def test_flux_is_that_of_volt_seconds_and_direct_current_and_within_the_limit(fitted):
    assert fitted.rings
    for ring in fitted.rings:
        core, turns = ring.coil.core, ring.coil.turns
        dc = fitted.state.dc_current if ring.far_turns is None else 0.0
        linked = volt_seconds(fitted.state) + core.factor * turns**2 * dc
        assert ring.flux == pytest.approx(linked / (turns * core.area), rel=1e-12)
        assert ring.flux <= ring.limit == flux_limit(fitted.stage.carrier)
        assert ring.coil.inductance == pytest.approx(core.factor * turns**2)
        assert ring.coil.inductance >= SHORT * ring.wanted


def test_a_transformer_keeps_its_ratio_in_whole_turns_on_a_ferrite(fitted):
    for ring in fitted.rings:
        if ring.far_turns is None:
            assert ring.coil.inductance <= LONG * ring.wanted
            continue
        branch = next(b for b in fitted.stage.branches if b.kind == "transformer")
        assert ring.coil.core.kind == "ferrite"
        assert ring.far_turns * float(branch.value) / ring.coil.turns == pytest.approx(1, abs=0.05)


def test_the_wire_bears_the_direct_current(fitted):
    choke = next(r for r in fitted.rings if r.far_turns is None)
    assert choke.coil.wire_diameter >= WIRE * math.sqrt(fitted.state.dc_current)


def test_no_smaller_core_of_the_data_would_do_for_the_choke():
    state = fit_parts(design(Job(**BASE))).state
    ring = choke_ring("Lchoke", state.stage.supply.choke, state)
    size = ring.coil.core.outer**2 * ring.coil.core.height
    for core in CORES.values():
        if core.outer**2 * core.height >= size * (1 - 1e-9):
            continue
        for turns in range(1, 60):
            made = core.factor * turns**2
            flux = (volt_seconds(state) + made * state.dc_current) / (turns * core.area)
            bent = min(0.1 * core.inner, 0.9 * core.inner * math.sin(math.pi / max(turns, 2)) / 2)
            wired = bent >= WIRE * math.sqrt(state.dc_current)
            assert not (SHORT <= made / ring.wanted <= LONG and flux <= ring.limit and wired), (core.name, turns)


def test_no_core_is_named_where_none_does_it_or_no_limit_is_known():
    state = design(Job(**BASE)).settled
    with pytest.raises(ImpossibleError, match=r"no ring core of the data holds 1\.00 H under 5\.7 mT"):
        choke_ring("Lchoke", 1.0, state)
    vhf = design(Job(**{**BASE, "carrier": 145e6})).settled
    with pytest.raises(ImpossibleError, match=r"no limit of flux density is known at 145 MHz"):
        choke_ring("Lchoke", 1e-7, vhf)
