r"""The L network: one coil and one capacitor, the shunt arm at the higher resistance.

::

    shunt arm first                       series arm first
    wanted ──┬──[jX]── load               wanted ──[jX]──┬── load
           [jB]                                        [jB]

    low-pass: X a coil, B a capacitor.    high-pass: X a capacitor, B a coil.

For resistances, ``Q = √(R_high/R_low − 1)``, ``|X| = Q R_low``, ``1/|B| = R_high/Q``; there is no freedom
left, so a Q can't be asked of it. Here both ends may be complex.
"""

from __future__ import annotations

import math

from rfstage.errors import ImpossibleError
from rfstage.ladder import Branch
from rfstage.matching.parts import capacitor, coil, four_figures, parallel_resistance
from rfstage.matching.pi import too_much_capacitance
from rfstage.matching.quality import loaded_q
from rfstage.matching.solving import finish, positive
from rfstage.matching.task import Task
from rfstage.quantity import show


def l_network(wanted: complex, load: complex, *, carrier: float, high_pass: bool = False) -> tuple[Branch, ...]:
    """Return the lossless L network that shows ``wanted`` when ``load`` is connected.

    Parameters
    ----------
    wanted, load : complex
        Impedances [ohm] at the carrier, both with a resistance above 0.
    carrier : float
        Hz.
    high_pass : bool
        Series capacitor and shunt coil instead of series coil and shunt capacitor.

    Returns
    -------
    tuple of Branch
        From device to load.

    Raises
    ------
    ImpossibleError
        If no such network exists for these impedances, saying what would work.

    References
    ----------
    D. K. Misra, *Radio-Frequency and Microwave Communication Circuits*, 2nd ed. (2004), ch. 6.

    Examples
    --------
    600 Ω to 50 Ω at 400 MHz, from the worked example 6.6 of that book:

    >>> [f"{b.name} {b.value:.4g}" for b in l_network(600, 50, carrier=400e6)]
    ['C1 2.199e-12', 'L1 6.598e-08']
    """
    shunt_first = wanted.real > load.real
    forms = (_shunt_first, _series_first) if shunt_first else (_series_first, _shunt_first)
    for form in forms:
        for reactance, susceptance in form(wanted, load):
            series_fits = reactance < 0 if high_pass else reactance > 0
            shunt_fits = susceptance < 0 if high_pass else susceptance > 0
            if series_fits and shunt_fits:
                return _parts(reactance, susceptance, carrier, first_shunt=form is _shunt_first)
    name, other = ("l-high-pass", "l") if high_pass else ("l", "l-high-pass")
    if abs(wanted - load) <= 1e-12 * abs(load):
        raise ImpossibleError(
            f"network {name}: the load already is the wanted {four_figures(wanted)} ohm, "
            "so an L has nothing to do; ask for network pi, which also filters"
        )
    raise ImpossibleError(
        f"network {name}: no such L turns the load of {four_figures(load)} ohm into "
        f"{four_figures(wanted)} ohm at the device; try {other} or pi"
    )


def _shunt_first(wanted: complex, load: complex) -> list[tuple[float, float]]:
    """Both solutions (series reactance, shunt susceptance) with the shunt arm at the device."""
    square = load.real * parallel_resistance(wanted) - load.real**2
    if square <= 0:
        return []
    target = 1 / wanted
    found = []
    for root in (math.sqrt(square), -math.sqrt(square)):
        reactance = root - load.imag
        found.append((reactance, target.imag - (1 / complex(load.real, root)).imag))
    return found


def _series_first(wanted: complex, load: complex) -> list[tuple[float, float]]:
    """Both solutions (series reactance, shunt susceptance) with the shunt arm at the load."""
    y = 1 / load
    square = y.real / wanted.real - y.real**2
    if square <= 0:
        return []
    found = []
    for root in (math.sqrt(square), -math.sqrt(square)):
        susceptance = root - y.imag
        found.append((wanted.imag - (1 / complex(y.real, root)).imag, susceptance))
    return found


def _parts(reactance: float, susceptance: float, carrier: float, *, first_shunt: bool) -> tuple[Branch, ...]:
    series = (
        coil("L1", "series", reactance, carrier) if reactance > 0 else capacitor("C1", "series", -reactance, carrier)
    )
    shunt = (
        capacitor("C1", "shunt", 1 / susceptance, carrier)
        if susceptance > 0
        else coil("L1", "shunt", -1 / susceptance, carrier)
    )
    return (shunt, series) if first_shunt else (series, shunt)


def solve(task: Task) -> tuple[Branch, ...]:
    """Return the L of a task, exact with its losses; errors as `rfstage.matching.networks.solve_network`."""
    request, load, carrier = task.request, task.load, task.carrier
    high_pass = request.network == "l-high-pass"
    if request.loaded_q is not None or request.input_q is not None:
        asked = request.loaded_q if request.loaded_q is not None else request.input_q
        q = loaded_q((), l_network(task.start, load, carrier=carrier, high_pass=high_pass), load, carrier)
        key = "loaded_q" if request.loaded_q is not None else "input_q"
        raise ImpossibleError(
            f"tank.{key}: got {asked:.6g} for network {request.network}, whose Q follows from the resistances: "
            f"{q:.3g} here; leave the Q out, or ask for network pi"
        )
    try:
        tank = l_network(task.target, load, carrier=carrier, high_pass=high_pass)
    except ImpossibleError:
        room = None if high_pass or not task.capacitance else _room_for_output_capacitance(task)
        if room is not None and room < task.capacitance:
            raise ImpossibleError(too_much_capacitance(task) + f"; an L leaves room for {show(room, 'F')}") from None
        raise
    return positive(finish(task, tank, asked_loaded_q=None))


def _room_for_output_capacitance(task: Task) -> float | None:
    """Return the shunt capacitance [F] at the device of the L without any, or None if it has none there."""
    try:
        first = l_network(task.start, task.load, carrier=task.carrier)[0]
    except ImpossibleError:
        return None
    return float(first.value) if first.place == "shunt" else None
