"""Every network by name: closed form, then closed exactly with its losses; and what the result is like."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

from rfstage.errors import ConvergenceError, ImpossibleError
from rfstage.ladder import Branch, Ladder
from rfstage.load import Load
from rfstage.matching.exact import behind, close, with_losses
from rfstage.matching.l import l_network
from rfstage.matching.parts import four_figures, parallel_resistance
from rfstage.matching.pi import least_loaded_q, pi_network
from rfstage.matching.quality import bandwidth, input_side_q, loaded_q
from rfstage.quantity import exact_text, show

DEFAULT_LOADED_Q = 10.0
DEFAULT_Q_MARGIN = 2.0


class Request(NamedTuple):
    """What is asked of a network: its name, the parts' Qs [-], and one of two Qs or none."""

    network: str
    coil_q: float
    capacitor_q: float
    loaded_q: float | None = None
    input_q: float | None = None


def solve_network(
    request: Request,
    *,
    feed: Sequence[Branch],
    wanted: complex,
    load: complex,
    carrier: float,
    near: Sequence[Branch] = (),
) -> tuple[Branch, ...]:
    """Return the network's parts, exact with their losses.

    Parameters
    ----------
    request : Request
        Name and Qs.
    feed : sequence of Branch
        What stands before the network: output capacitance, choke, blocking capacitor, or nothing.
    wanted, load : complex
        What the device's current generator must see, and the load [ohm].
    carrier : float
        Hz.
    near : sequence of Branch
        The parts for nearly the same impedances, where they are known: a start that saves time.

    Raises
    ------
    ImpossibleError
        If no such network does it; the text says what would.
    """
    try:
        target = behind(feed, wanted, carrier) if feed else wanted
    except ZeroDivisionError:
        target = complex(-1)
    if not target.real > 0:
        raise ImpossibleError(
            f"the losses of choke and blocking capacitor alone are more than the {four_figures(wanted)} ohm "
            "asked at the device leave room for; raise tank.blocking, or supply.choke and supply.choke_q"
        )
    try:
        if request.network == "pi":
            return _solve_pi(request, feed, wanted, target, load, carrier, near)
        return _solve_l(request, feed, wanted, target, load, carrier)
    except ConvergenceError as error:
        raise ImpossibleError(
            f"network {request.network}: with {_quality('coils', request.coil_q)} and "
            f"{_quality('capacitors', request.capacitor_q)} no parts show {four_figures(wanted)} ohm to "
            f"the device ({error}); raise tank.coil_q and tank.capacitor_q, or lower the loaded Q"
        ) from None


def _quality(parts: str, q: float) -> str:
    return f"lossless {parts}" if math.isinf(q) else f"{parts} of Q {q:.6g}"


def _solve_l(
    request: Request, feed: Sequence[Branch], wanted: complex, target: complex, load: complex, carrier: float
) -> tuple[Branch, ...]:
    high_pass = request.network == "l-high-pass"
    if request.loaded_q is not None or request.input_q is not None:
        asked = request.loaded_q if request.loaded_q is not None else request.input_q
        q = loaded_q((), l_network(wanted, load, carrier=carrier, high_pass=high_pass), load, carrier)
        key = "loaded_q" if request.loaded_q is not None else "input_q"
        raise ImpossibleError(
            f"tank.{key}: got {asked:.6g} for network {request.network}, whose Q follows from the resistances: "
            f"{q:.3g} here; leave the Q out, or ask for network pi"
        )
    try:
        tank = l_network(target, load, carrier=carrier, high_pass=high_pass)
    except ImpossibleError:
        capacitance = _device_capacitance(feed)
        if capacitance and not high_pass:
            room = _room_for_output_capacitance(wanted, load, carrier)
            if room is not None and room < capacitance:
                raise ImpossibleError(
                    _too_much_capacitance(capacitance, wanted, load, carrier, request.coil_q)
                    + f"; an L leaves room for {show(room, 'F')}"
                ) from None
        raise
    lossy = with_losses(tank, coil_q=request.coil_q, capacitor_q=request.capacitor_q, carrier=carrier)
    parts = close(feed, lossy, wanted=wanted, load=load, carrier=carrier)
    if any(float(part.value) <= 0 for part in parts):
        raise ConvergenceError("a part would have to be negative")
    return parts


def _solve_pi(
    request: Request,
    feed: Sequence[Branch],
    wanted: complex,
    target: complex,
    load: complex,
    carrier: float,
    near: Sequence[Branch],
) -> tuple[Branch, ...]:
    omega = 2 * math.pi * carrier
    capacitance = _device_capacitance(feed)
    resistance = 1 / (1 / wanted).real
    taken = resistance * omega * capacitance
    asked = request.loaded_q
    if asked is None and request.input_q is None:
        least = max(least_loaded_q(wanted, load, least_input_q=taken), least_loaded_q(target, load))
        asked = max(DEFAULT_LOADED_Q, least + DEFAULT_Q_MARGIN)
    elif asked is not None:
        pi_network(wanted, load, carrier=carrier, loaded_q=asked)  # says so where the Q is too low
        if asked <= least_loaded_q(target, load):
            raise ImpossibleError(
                f"tank.loaded_q: behind choke and blocking capacitor a pi has to start from "
                f"{four_figures(target)} ohm and needs a loaded Q above {least_loaded_q(target, load):.4g}; "
                f"got {asked:.6g} (a larger tank.blocking or supply.choke brings it down)"
            )
    try:
        input_q = request.input_q
        if input_q is not None:
            pi_network(wanted, load, carrier=carrier, input_q=input_q)  # says so where the Q is too low
            susceptance = input_q / resistance - omega * capacitance
            input_q = parallel_resistance(target) * (susceptance - (1 / target).imag)
        tank = pi_network(target, load, carrier=carrier, loaded_q=asked, input_q=input_q)
        lossy = with_losses(tank, coil_q=request.coil_q, capacitor_q=request.capacitor_q, carrier=carrier)
        if input_q is not None:
            parts = close(feed, lossy, wanted=wanted, load=load, carrier=carrier, fixed=1)
        else:
            parts = close(feed, near or lossy, wanted=wanted, load=load, carrier=carrier, asked_loaded_q=asked)
    except ConvergenceError:
        if capacitance and taken > (request.input_q or request.loaded_q or DEFAULT_LOADED_Q):
            raise ImpossibleError(_too_much_capacitance(capacitance, wanted, load, carrier, request.coil_q)) from None
        raise
    if float(parts[1].value) <= 0:
        raise ConvergenceError("the coil would have to be negative")
    if float(parts[0].value) <= 0:
        if capacitance:
            raise ImpossibleError(_too_much_capacitance(capacitance, wanted, load, carrier, request.coil_q))
        raise ImpossibleError(
            "network pi: the input capacitor comes out at nothing; raise the loaded Q or tank.blocking"
        )
    if float(parts[2].value) <= 0:
        least = least_loaded_q(wanted, load, least_input_q=taken)
        if load.imag >= 0:
            raise ImpossibleError(
                f"network pi: the output capacitor comes out at nothing, from the losses or from a blocking capacitor "
                f"with too much reactance; a loaded Q above {least:.3g} by some margin, or a larger tank.blocking, "
                "helps"
            )
        raise ImpossibleError(
            f"network pi: the load's own capacitance is more than the output capacitor this Q leaves; a loaded Q "
            f"above about {least:.3g} leaves room"
        )
    return parts


def _device_capacitance(feed: Sequence[Branch]) -> float:
    return sum(float(branch.value) for branch in feed if branch.origin == "device")


def _room_for_output_capacitance(wanted: complex, load: complex, carrier: float) -> float | None:
    """Return the shunt capacitance [F] at the device of the L without any, or None if it has none there."""
    try:
        first = l_network(wanted, load, carrier=carrier)[0]
    except ImpossibleError:
        return None
    return float(first.value) if first.place == "shunt" else None


def _too_much_capacitance(capacitance: float, wanted: complex, load: complex, carrier: float, coil_q: float) -> str:
    taken = 2 * math.pi * carrier * capacitance / (1 / wanted).real
    fits = least_loaded_q(wanted, load, least_input_q=1.05 * taken)
    reactance = show(1 / (2 * math.pi * carrier * capacitance), "ohm")
    better = f", with coils of far higher Q than {coil_q:.4g}" if fits > coil_q / 3 else ""
    return (
        f"device.output_capacitance: {show(capacitance, 'F')} has {reactance} reactance at "
        f"{exact_text(carrier, 'Hz')}, an input-side Q of {taken:.3g} by itself against "
        f"{four_figures(wanted)} ohm, which is more than this Q leaves; a pi of loaded Q {fits:.3g} or "
        f"more would take it in{better}"
    )


class PartStress(NamedTuple):
    """A part with what it carries at the carrier: peak voltage [V], rms current [A], loss [W], or None."""

    branch: Branch
    peak_voltage: float | None
    rms_current: float | None
    loss: float | None


class Tank(NamedTuple):
    """A network as designed, and what it is like.

    ``parts`` run from device to load and hold all that shapes the RF; ``impedance`` [ohm] is what the
    device's current generator sees; ``bandwidth`` in Hz; ``terminations`` are (order, |Z(n)|/R).
    """

    network: str
    parts: tuple[PartStress, ...]
    impedance: complex
    loaded_q: float
    input_q: float | None
    bandwidth: float | None
    efficiency: float
    terminations: tuple[tuple[int, float], ...]
    trough_dip: float | None


def tank_efficiency(branches: Sequence[Branch], load: complex, carrier: float) -> float:
    """Return the power in the load over the power into the ladder [-]."""
    z, h = Ladder(branches).transfer(carrier, load)
    return float(abs(h) ** 2 * (1 / load).real / z.real)


def describe(
    network: str,
    feed: Sequence[Branch],
    tank: Sequence[Branch],
    *,
    load: Load,
    carrier: float,
    current: float | None,
    terminations: tuple[tuple[int, float], ...],
    trough_dip: float | None,
) -> Tank:
    """Return the `Tank` for a peak fundamental ``current`` [A] of the device, or without stresses."""
    branches = (*feed, *tank)
    at_carrier = complex(load.impedance(carrier))
    walk = Ladder(branches).walk(carrier, at_carrier)
    parts = []
    for branch, state in zip(branches, walk.branches, strict=True):
        if current is None:
            parts.append(PartStress(branch, None, None, None))
            continue
        amperes = abs(complex(state.current)) * current
        parts.append(
            PartStress(
                branch, amperes * abs(branch.impedance(carrier)), amperes / math.sqrt(2), float(state.loss) * current**2
            )
        )
    z = complex(walk.impedance)
    return Tank(
        network=network,
        parts=tuple(parts),
        impedance=z,
        loaded_q=loaded_q(feed, tank, at_carrier, carrier),
        input_q=input_side_q(feed, tank, 1 / (1 / z).real, carrier),
        bandwidth=bandwidth(branches, load, carrier),
        efficiency=tank_efficiency(branches, at_carrier, carrier),
        terminations=terminations,
        trough_dip=trough_dip,
    )
