"""The harmonic filter behind the tank: chosen with tank and device in place, and the tank solved again in front of it.

::

    needed attenuation ──► filter ──► tank closed on what the filter shows it ──► true levels ──┐
            ▲                                                                                   │ where one is short
            └───────────────────────── that much more, at that order ◄──────────────────────────┘
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from rfstage.designs.settings import Settings
from rfstage.designs.textbook import Circuit, Fitted, by_the_book
from rfstage.errors import ImpossibleError
from rfstage.filters.choose import choose_filter
from rfstage.harmonics import ABSENT, decibels, load_powers
from rfstage.ladder import Branch, Ladder
from rfstage.matching.tank import tank_efficiency
from rfstage.operating import OperatingPoint
from rfstage.tankfields import AUTO, NONE

ROUNDS = 12
SPARE = 0.2  # dB more than what was short, so that the rounds end

Array = NDArray[np.float64]


def wants_filter(settings: Settings) -> bool:
    """Return whether the job asks for a filter at all."""
    return settings.job.filter not in (None, NONE)


def suppression(settings: Settings) -> float | None:
    """Return what the limit asks of each harmonic [dB], the margin to keep included; None without a figure."""
    if settings.limit is None:
        return None
    needed = settings.limit.suppression(settings.job.carrier, settings.job.power)
    return None if needed is None else needed + settings.margin


def line_levels(
    settings: Settings, circuit: Circuit, point: OperatingPoint, coefficients: NDArray[np.float64]
) -> Array:
    """Return the textbook's levels [dBc] in the resistive line, orders 2 to the highest shown."""
    orders = np.arange(1.0, settings.highest_order + 1)
    powers = load_powers(
        Ladder(circuit.branches), settings.line, settings.job.carrier * orders, _currents(settings, point, coefficients)
    )
    return decibels(powers)[1:]


def _currents(settings: Settings, point: OperatingPoint, coefficients: NDArray[np.float64]) -> Array:
    """Return the textbook's peak currents [A] of orders 1 to the highest shown; what the pulse has not is 0."""
    own = coefficients[1 : settings.highest_order + 1]
    return np.asarray(np.where(np.abs(own) > ABSENT * abs(own[0]), own, 0.0) * point.peak_current)


def fitted(
    settings: Settings,
    coefficients: NDArray[np.float64],
    circuit: Circuit,
    point: OperatingPoint,
    extra: Array | None = None,
    *,
    always: bool = False,
) -> Fitted:
    """Return a circuit with the filter that makes it meet its limit and the margin, by the book.

    Parameters
    ----------
    settings : Settings
        Without a filter yet.
    coefficients : ndarray
        Of the current pulse, from order 0.
    circuit, point : Circuit, OperatingPoint
        The book's, without a filter.
    extra : ndarray or None
        dB that each order from 2 needs besides, because the steady state has more of it.
    always : bool
        Fit one whatever the job says of filters.

    Raises
    ------
    ImpossibleError
        If no filter does it.
    """
    needed = suppression(settings)
    order = None if always or settings.job.filter == AUTO else int(settings.job.filter or 0)
    levels = line_levels(settings, circuit, point, coefficients)
    add = np.zeros(levels.size) if extra is None else extra.copy()
    lacking = np.full(levels.size, -np.inf) if needed is None else levels + add + needed
    if order is None and lacking.max() <= 0:
        return Fitted(settings, circuit, point, None)
    short, made = lacking, Fitted(settings, circuit, point, None)
    for _ in range(ROUNDS):
        chosen = choose_filter(
            short,
            _Margins(made, coefficients, add),
            carrier=settings.job.carrier,
            resistance=settings.line.at_carrier.real,
            coil_q=settings.request.coil_q,
            capacitor_q=settings.request.capacitor_q,
            kind=settings.job.filter_kind,
            order=order,
            harmonic=settings.job.trap or 2,
            numbers=_numbers(made.circuit.tank),
        )
        closed = replace(settings, filter=chosen.parts)
        made = Fitted(closed, *by_the_book(closed, coefficients), chosen)
        if needed is None:
            return made
        left = line_levels(closed, made.circuit, made.point, coefficients) + needed + (0 if extra is None else extra)
        if left.max() <= 0:
            return made
        add = add + np.where(left > 0, left + SPARE, 0.0)
        short = levels + add + needed
    raise ImpossibleError(
        f"network {settings.request.network}: no filter holds the limit with the tank in front of it; "
        f"{left.max():.1f} dB is short at order {int(left.argmax()) + 2}"
    )


class _Margins:
    """What the search asks of every filter it tries: the margin at each order, tank and device in place.

    The tank will be closed on what the filter shows it, so at the carrier only losses count. Feed and tank are
    walked once, as a two-port.
    """

    def __init__(self, made: Fitted, coefficients: NDArray[np.float64], extra: Array) -> None:
        settings, circuit, point = made.settings, made.circuit, made.point
        self.orders, self.line = settings.highest_order - 1, settings.line
        self.frequencies = settings.job.carrier * np.arange(1.0, settings.highest_order + 1)
        before = Ladder((*circuit.feed, *circuit.tank))
        self.from_voltage, self.from_current = before.chain(self.frequencies[1:])[2:]
        currents = _currents(settings, point, coefficients)[1:]
        admittance = (1 / self.line.impedance(self.frequencies)).real
        self.per_gain = currents**2 / 2 * admittance[1:]
        kept = tank_efficiency(before.branches, settings.tank_load, settings.job.carrier)
        self.into_filter = point.device_rf_power * kept
        self.admittance = admittance[0]
        needed = suppression(settings)
        self.needed = None if needed is None else needed + extra

    def __call__(self, parts: Sequence[Branch]) -> Array:
        """Return margins [dB] of shape (samples, orders), for parts whose values are arrays of samples."""
        into, through = Ladder(parts).transfer(self.frequencies, self.line)
        if self.needed is None:
            return np.full((into.shape[0], self.orders), np.inf)
        gain = abs(through[:, 1:] / (self.from_voltage * into[:, 1:] + self.from_current)) ** 2 * self.per_gain
        passed = abs(through[:, :1]) ** 2 * self.admittance / into[:, :1].real
        with np.errstate(divide="ignore"):
            return np.asarray(-self.needed - 10 * np.log10(gain / (self.into_filter * passed)))


def _numbers(tank: Sequence[Branch]) -> tuple[int, int, int]:
    """Return the first free numbers of coils, capacitors and traps behind a tank."""

    def free(letter: str) -> int:
        return 1 + max((int(b.name[1:]) for b in tank if b.name[0] == letter and b.name[1:].isdigit()), default=0)

    return free("L"), free("C"), 1
