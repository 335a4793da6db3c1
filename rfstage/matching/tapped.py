r"""The tapped coil: one coil to ground with a capacitor across it, and the lower resistance at its tap.

::

    top ──┬──┐                    La above the tap, Lb below it, k their coupling, s = √(Lb/La)
         C1  La                   t = s/(1 + s): the tap's share of the turns, where inductance goes as turns squared
          │  ├── tap              whole coil  X = ω(La + Lb + 2M),  M = k√(La·Lb)
          │  Lb
          ┴──┴                    Device at the top and load at the tap, or the other way round.

With w = ωLa/R, ξ = 1 + s² + 2ks and R at the tap, the coil alone shows at the top

    conductance      G·R = s²(s + k)² / (w²s⁴(1 − k²)² + ξ²)
    susceptance over conductance        (ξ/w + w·s⁴(1 − k²)) / (s²(s + k)²)

so for a Q the root w of a quadratic is left to one unknown, s.
"""

from __future__ import annotations

import math
from dataclasses import replace

from rfstage.errors import ImpossibleError
from rfstage.ladder import Branch
from rfstage.matching.exact import Free
from rfstage.matching.parts import four_figures, parallel_resistance
from rfstage.matching.pi import behind_feed
from rfstage.matching.solving import asked_q, between_ends, finish, positive, refuse_q
from rfstage.matching.task import COUPLINGS, Task

_BISECTIONS = 80
_WIDEST = 1e4  # √(Lb/La): with the tap at 99.99 % of the turns there is no tap left


def tap_share(branch: Branch) -> float:
    """Return the share of the turns [-] below the tap, where the parts' inductance goes as turns squared."""
    above, below = math.sqrt(float(branch.value)), math.sqrt(float(branch.second))
    return below / (above + below)


def least_tap(high: float, low: float, coupling: float) -> float:
    """Return the least share of the turns [-] below the tap that brings a resistance [ohm] down to a lower one."""

    def reached(s: float) -> bool:
        return s * (s + coupling) / (1 + s * s + 2 * coupling * s) >= math.sqrt(low / high)

    least, most = 0.0, _WIDEST
    for _ in range(_BISECTIONS):
        middle = (least + most) / 2
        least, most = (least, middle) if reached(middle) else (middle, most)
    return most / (1 + most)


def _shape(s: float, coupling: float, q: float) -> tuple[float, float] | None:
    """Return conductance at the top times R, and w, at a Q; None where the leakage is too much for it."""
    xi, step, loose = 1 + s * s + 2 * coupling * s, s * s * (s + coupling) ** 2, s**4 * (1 - coupling**2)
    half = q * step / 2
    inside = half**2 - loose * xi
    if inside < 0:
        return None
    w = xi / (half + math.sqrt(inside))
    return step / ((w * s * s * (1 - coupling**2)) ** 2 + xi**2), w


def _ratio(low_over_high: float, coupling: float, q: float) -> tuple[float, float] | None:
    """Return s and w for a conductance at the top times R, at a Q; None where there is no such tap."""
    least, most = 1e-6, _WIDEST
    for _ in range(_BISECTIONS):
        middle = math.sqrt(least * most)
        found = _shape(middle, coupling, q)
        if found is None or found[0] < low_over_high:
            least = middle
        else:
            most = middle
    found = _shape(most, coupling, q)
    if found is None or abs(found[0] / low_over_high - 1) > 1e-6:
        return None
    return most, found[1]


def tapped_coil(
    wanted: complex, load: complex, *, carrier: float, coupling: float, tank_q: float | None, tap: float | None = None
) -> tuple[Branch, ...]:
    """Return the lossless tapped coil between two resistances, a start for others.

    Parameters
    ----------
    wanted, load : complex
        Impedances [ohm] at the carrier, both with a resistance above 0; the higher one is at the top. Exact where
        the lower one has no reactance.
    carrier : float
        Hz.
    coupling : float
        Between the parts of the coil [-], above 0 and below 1.
    tank_q : float or None
        Resistance at the top over the reactance of the capacitor [-]; or
    tap : float or None
        the share of the turns below the tap [-].

    Returns
    -------
    tuple of Branch
        C1 and the coil L1, or L1 and C1 where the device is at the tap.

    Raises
    ------
    ImpossibleError
        If no tap of the coil does it, saying what would.

    References
    ----------
    Kirchhoff's laws for two coupled coils; with k = 1 it is the ideal autotransformer of every handbook.

    Examples
    --------
    >>> parts = tapped_coil(2000, 50, carrier=7e6, coupling=0.5, tank_q=15)
    >>> [f"{b.name} {b.value:.4g}" for b in parts], f"{tap_share(parts[1]):.3f}"
    (['C1 1.705e-10', 'L1 2.253e-06'], '0.217')
    """
    down = parallel_resistance(wanted) >= parallel_resistance(load)
    top, joint = (wanted, load) if down else (load.conjugate(), wanted.conjugate())
    high, low = parallel_resistance(top), parallel_resistance(joint)
    if tap is not None:
        s = tap / (1 - tap)
        xi, step = 1 + s * s + 2 * coupling * s, s * s * (s + coupling) ** 2
        loose = s * s * (1 - coupling**2)
        square = (step * high / low - xi**2) / loose**2
        if square <= 0:
            raise ImpossibleError(
                f"tank.tap: got {tap:.4g} of the turns, which leaves no resonant coil between "
                f"{four_figures(wanted)} ohm and {four_figures(load)} ohm; it must be above "
                f"{least_tap(high, low, coupling):.4g}, and below 1"
            )
        w = math.sqrt(square)
        tank_q = (xi / w + w * s * s * loose) / step
    else:
        assert tank_q is not None
        found = _ratio(low / high, coupling, tank_q)
        if found is None:
            raise ImpossibleError(
                f"tank.coupling: with {coupling:.4g} between the coil's parts and a Q of {tank_q:.4g} no tap inside "
                f"the coil joins {four_figures(wanted)} ohm and {four_figures(load)} ohm; a tighter coupling or a "
                "higher loaded Q does"
            )
        s, w = found
    omega = 2 * math.pi * carrier
    capacitor = Branch("C1", "shunt", "capacitor", (tank_q / high + (1 / top).imag) / omega)
    above = w * low / omega
    coil = Branch("L1", "through", "coupled", above, second=above * s * s, coupling=coupling, tap="load")
    return (capacitor, coil) if down else (replace(coil, tap="device"), capacitor)


def solve(task: Task) -> tuple[Branch, ...]:
    """Return the tapped coil of a task, exact with its losses; errors as `rfstage.matching.networks.solve_network`."""
    request = task.request
    coupling = request.coupling or COUPLINGS["tapped-coil"]
    down = parallel_resistance(task.target) >= parallel_resistance(task.load)
    if not down:
        refuse_q(task, also=", or tank.tap")
    room = task.least_shunt_q if down else max(0.0, parallel_resistance(task.load) * (1 / task.load).imag)
    asked = q = None
    if request.input_q is not None:
        q = behind_feed(task, request.input_q)
    elif request.tap is None:
        asked = q = asked_q(task, room)
    made = tapped_coil(task.target, task.load, carrier=task.carrier, coupling=coupling, tank_q=q, tap=request.tap)
    place = 1 if down else 0
    free: tuple[Free, ...]
    if request.tap is not None:
        free = (Free(1 - place), Free(place, "value", ("second",)))
    else:
        windings = (Free(place), Free(place, "second"))
        free = windings if asked is None else (Free(1 - place), *windings)
    return between_ends(task, lambda: positive(finish(task, made, asked_loaded_q=asked, free=free)))
