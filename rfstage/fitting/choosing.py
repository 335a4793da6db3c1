"""Which parts each branch gets: capacitors by what they bear, coils by their current, traps of both."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

from rfstage.designs.design import Design
from rfstage.errors import RfstageError
from rfstage.fitting.capacitors import BLOCKING, FIXED, TRIMMED, Bought, choose_capacitor
from rfstage.fitting.coils import Winding, choose_coil, tap_for, tapped
from rfstage.fitting.request import PartsRequest
from rfstage.kinds import THROUGH
from rfstage.ladder import Branch
from rfstage.parts.stress import Burden
from rfstage.stage import BLOCKING as BLOCKER
from rfstage.steady import SteadyState


class Chosen(NamedTuple):
    """Parts by branch: capacitors bought, coils wound, and why others stay as designed."""

    bought: dict[str, Bought]
    wound: dict[str, Winding]
    ideal: dict[str, str]


def burdens(made: Design) -> dict[str, Burden]:
    """Return what each capacitor bears: in steady state with all orders and dc, or by the book at the carrier."""
    carrier, supply = made.job.carrier, made.job.supply
    found, held = {}, supply
    settled = {b.name: b for b in made.settled.branches} if made.settled else {}
    for part in made.tank.parts:
        branch = part.branch
        dc = held if branch.blocks or (branch.place == "shunt" and branch.kind == "capacitor") else 0.0
        current, peak = part.rms_current or 0.0, part.peak_voltage or 0.0
        if branch.name in settled:
            current, peak = settled[branch.name].rms_current, max(settled[branch.name].peak_voltage - dc, peak)
        found[branch.name] = Burden(carrier=carrier, rms_current=current, rf_peak_voltage=peak, dc_voltage=dc)
        if branch.blocks or branch.place == THROUGH:
            held = 0.0
    return found


def as_settled(
    chosen: Chosen, state: SteadyState, branches: Sequence[Branch], borne: dict[str, Burden], asked: PartsRequest
) -> Chosen:
    """Return the parts with the stresses and currents of the steady state they make."""
    bought, wound = dict(chosen.bought), dict(chosen.wound)
    found = {stress.name: stress for stress in state.branches}
    for branch in branches:
        stress, before = found[branch.name], borne[branch.name]
        now = replace(
            before,
            rms_current=stress.rms_current,
            rf_peak_voltage=max(stress.peak_voltage - before.dc_voltage, 0.0),
        )
        if branch.name in bought:
            part, q = bought[branch.name], branch.second_q if branch.kind == "trap" else branch.q
            if branch.kind == "trap":
                now, current = _within_trap(branch, now)
                wound[branch.name] = wound[branch.name]._replace(current=current)
            else:  # with leads the capacitor itself has more than is seen across the two
                own = stress.rms_current * math.sqrt(2) / (2 * math.pi * now.carrier * part.total)
                now = replace(now, rf_peak_voltage=max(now.rf_peak_voltage, own))
            bought[branch.name] = part.bearing(now, None if q is None else float(q), asked)
        elif branch.name in wound and branch.kind == "coil":
            wound[branch.name] = wound[branch.name]._replace(current=stress.rms_current, heat=stress.loss)
        elif branch.name in wound and branch.tap:
            wound[branch.name] = wound[branch.name]._replace(heat=stress.loss)
    return chosen._replace(bought=bought, wound=wound)


def chosen_parts(
    made: Design, branches: Sequence[Branch], borne: dict[str, Burden], asked: PartsRequest, trimmed: str
) -> Chosen:
    """Return the parts of all branches; the capacitor named ``trimmed`` gets a trimmer."""
    found = Chosen({}, {}, {})
    for branch in branches:
        burden, value = borne[branch.name], float(branch.value)
        q = None if branch.q is None else float(branch.q)
        try:
            if branch.kind == "capacitor":
                role = BLOCKING if branch.name == BLOCKER else TRIMMED if branch.name == trimmed else FIXED
                found.bought[branch.name] = choose_capacitor(branch.name, value, role, burden, q, asked)
            elif branch.kind == "coil":
                found.wound[branch.name] = coil_for(made, branch.name, value, burden.rms_current, asked)
            elif branch.kind == "trap":
                _trap(made, branch, burden, asked, found)
            elif branch.kind == "coupled":
                for winding in _pair(made, branch, asked):
                    found.wound[winding.name] = winding
            else:
                found.ideal[branch.name] = "wound on a ring core and measured: rfstage coil --core gives the turns"
        except RfstageError as error:
            found.ideal[branch.name] = str(error).removeprefix(f"{branch.name}: ")
    return found


def coil_for(made: Design, name: str, value: float, current: float, asked: PartsRequest) -> Winding:
    """Return a coil for an inductance [H] and a current [A rms], of the Q that the design counts on."""
    q = made.settings.request.coil_q
    return choose_coil(
        name,
        value,
        current,
        carrier=made.job.carrier,
        q=0.0 if math.isinf(q) else q,
        former=asked.former,
        wire=asked.wire,
    )


def _trap(made: Design, branch: Branch, burden: Burden, asked: PartsRequest, found: Chosen) -> None:
    """Choose a trap's capacitor, and the coil that keeps its resonance with it."""
    capacitance = float(branch.second)
    own, current = _within_trap(branch, burden)
    q = None if branch.second_q is None else float(branch.second_q)
    # its leads are not in the ladder: what they add is tuned out with the coil, on the trap's resonance
    bought = choose_capacitor(branch.name, capacitance, FIXED, own, q, asked, total=capacitance)
    wound = coil_for(made, branch.name, float(branch.value) * capacitance / bought.total, current, asked)
    found.bought[branch.name] = bought._replace(lead=0.0)
    found.wound[branch.name] = wound._replace(note="squeeze or spread it until the trap is on its harmonic")


def _within_trap(branch: Branch, burden: Burden) -> tuple[Burden, float]:
    """Return what a trap's capacitor bears, and its coil's current [A rms]."""
    reactance = 1 / (2 * math.pi * burden.carrier * float(branch.second))
    current, peak = burden.rms_current, burden.rf_peak_voltage
    if branch.place == "series":  # the two circulate, besides what passes
        current = peak / reactance / math.sqrt(2)
        return replace(burden, rms_current=current), burden.rms_current + current
    return replace(burden, rf_peak_voltage=current * math.sqrt(2) * reactance), current


def _pair(made: Design, branch: Branch, asked: PartsRequest) -> list[Winding]:
    """Return the windings of a tapped coil or a link."""
    part = next(p for p in made.tank.parts if p.branch.name == branch.name)
    first, second, k = float(branch.value), float(branch.second), float(branch.coupling)
    near, far = part.rms_current or 0.0, part.far_current or 0.0
    if branch.tap:
        whole = first + second + 2 * k * math.sqrt(first * second)
        wound = coil_for(made, branch.name, whole, near + far, asked)
        return [wound._replace(tap=tap_for(wound.coil, second))]
    primary = coil_for(made, branch.name, first, near, asked)
    link = coil_for(made, link_of(branch.name), second, far, asked)
    return [primary, link._replace(note=moved_until(branch.name, k))]


def link_of(name: str) -> str:
    """Return what the second winding of a coil is called."""
    return f"{name} link"


def moved_until(name: str, coupling: float) -> str:
    """Return how a link is set to its coupling [-]."""
    return f"at the grounded end of {name}, moved until the coupling is {coupling:.3f}"


def real(branch: Branch, chosen: Chosen) -> Branch:
    """Return a branch as it is with its parts."""
    bought, winding = chosen.bought.get(branch.name), chosen.wound.get(branch.name)
    if branch.kind == "trap" and bought and winding:
        return replace(branch, value=winding.coil.rf_inductance, q=winding.coil.unloaded_q, second=bought.total)
    if branch.kind == "coupled" and winding:
        coil = winding.coil
        assert coil.unloaded_q is not None
        if winding.tap is None:
            link = chosen.wound[link_of(branch.name)].coil
            return replace(
                branch,
                value=coil.rf_inductance,
                q=coil.unloaded_q,
                q_frequency=coil.carrier,
                second=link.rf_inductance,
                second_q=link.unloaded_q,
            )
        above, below, coupling = tapped(coil, winding.tap)
        # the wire's resistance goes with its turns, and the parts take it by their own inductance
        q = coil.unloaded_q * (above + below) / coil.rf_inductance
        return replace(branch, value=above, second=below, coupling=coupling, q=q, second_q=q, q_frequency=coil.carrier)
    if bought:
        return replace(branch, value=bought.total, lead_inductance=bought.lead)
    if winding:
        coil = winding.coil
        assert coil.self_capacitance is not None
        return replace(branch, value=coil.rf_inductance, q=coil.unloaded_q, self_capacitance=coil.self_capacitance)
    return branch
