"""Which parts each branch gets: capacitors by what they bear, coils by their current, traps of both."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

from rfstage.designs.design import Design
from rfstage.errors import ImpossibleError, RfstageError
from rfstage.fitting.capacitors import BLOCKING, FIXED, TRIMMED, Bought, choose_capacitor
from rfstage.fitting.coils import Winding, choose_coil, flaw, tap_for
from rfstage.fitting.request import PartsRequest
from rfstage.kinds import THROUGH
from rfstage.ladder import Branch
from rfstage.matching.exact import with_losses
from rfstage.parts.stress import Burden
from rfstage.stage import BLOCKING as BLOCKER

COUPLING_OFF = 0.03  # from the designed coupling: what a made coil may be off before it is to be designed again


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
                found.wound[branch.name] = _coil_for(made, branch.name, value, burden.rms_current, asked)
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


def _coil_for(made: Design, name: str, value: float, current: float, asked: PartsRequest) -> Winding:
    q = made.settings.request.coil_q
    wound = choose_coil(
        name,
        value,
        current,
        carrier=made.job.carrier,
        q=0.0 if math.isinf(q) else q,
        former=asked.former,
        wire=asked.wire,
    )
    if wrong := flaw(wound.coil):
        raise ImpossibleError(wrong)
    return wound


def _trap(made: Design, branch: Branch, burden: Burden, asked: PartsRequest, found: Chosen) -> None:
    """Choose a trap's capacitor, and the coil that keeps its resonance with it."""
    capacitance, omega = float(branch.second), 2 * math.pi * burden.carrier
    through = burden.rf_peak_voltage * omega * capacitance / math.sqrt(2) if branch.place == "series" else None
    own = Burden(
        carrier=burden.carrier,
        rms_current=burden.rms_current if through is None else through,
        rf_peak_voltage=burden.rf_peak_voltage
        if through is not None
        else burden.rms_current * math.sqrt(2) / (omega * capacitance),
    )
    q = None if branch.second_q is None else float(branch.second_q)
    bought = choose_capacitor(branch.name, capacitance, FIXED, own, q, asked)
    # its leads are not in the ladder: what they add is tuned out with the coil, on the trap's resonance
    current = abs(burden.rms_current) + (through or 0.0)
    wound = _coil_for(made, branch.name, float(branch.value) * capacitance / bought.total, current, asked)
    found.bought[branch.name] = bought._replace(lead=0.0)
    found.wound[branch.name] = wound._replace(note="squeeze or spread it until the trap is on its harmonic")


def _pair(made: Design, branch: Branch, asked: PartsRequest) -> list[Winding]:
    """Return the windings of a tapped coil or a link: what is made has a coupling of its own, which is said."""
    part = next(p for p in made.tank.parts if p.branch.name == branch.name)
    first, second, k = float(branch.value), float(branch.second), float(branch.coupling)
    near, far = part.rms_current or 0.0, part.far_current or 0.0
    if branch.tap:
        whole = first + second + 2 * k * math.sqrt(first * second)
        wound = _coil_for(made, branch.name, whole, near + far, asked)
        turns, coupling = tap_for(wound.coil, second)
        note = f"tap at {turns:.2f} turns from the grounded end; coupling of its parts {coupling:.2f}, designed {k:.2f}"
        if abs(coupling - k) > COUPLING_OFF:
            note += f": design again with --coupling {coupling:.2f}"
        return [wound._replace(note=note)]
    primary = _coil_for(made, branch.name, first, near, asked)
    link = _coil_for(made, f"{branch.name} link", second, far, asked)
    return [primary, link._replace(note=f"at the grounded end of {branch.name}, moved until the coupling is {k:.2f}")]


def real(branch: Branch, chosen: Chosen) -> Branch:
    """Return a branch as it is with its parts."""
    bought, winding = chosen.bought.get(branch.name), chosen.wound.get(branch.name)
    if branch.kind == "trap" and bought and winding:
        return replace(branch, value=winding.coil.rf_inductance, q=winding.coil.unloaded_q, second=bought.total)
    if branch.kind == "coupled" and winding:
        link = chosen.wound.get(f"{branch.name} link", winding)
        ends = with_losses(
            [branch], coil_q=winding.coil.unloaded_q or math.inf, capacitor_q=1.0, carrier=winding.coil.carrier
        )
        return ends[0] if branch.tap else replace(ends[0], second_q=link.coil.unloaded_q)
    if bought:
        return replace(branch, value=bought.total, lead_inductance=bought.lead)
    if winding:
        coil = winding.coil
        assert coil.self_capacitance is not None
        return replace(branch, value=coil.rf_inductance, q=coil.unloaded_q, self_capacitance=coil.self_capacitance)
    return branch
