r"""Parts of a tank from a network-analyser file: values and losses that make the ladder show what was measured.

::

    symbol  what is fitted                 unit   held by, before anything is measured
    ------  -----------------------------  -----  ---------------------------------------------
    x       ln(value / nominal)            -      0 ± 0.4: half as much, or half as much again
    D       1/Q at the carrier             -      nominal ± the greater of 3 times itself and 0.01

Least squares over the real and imaginary parts of every S-parameter, with those weak ties as further rows. What the
data say nothing about stays where it was with the width of its tie, instead of running away; a part counts as told
where the data cut that width to a quarter. The noise is that of what the fit leaves.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.errors import ConvergenceError, ImpossibleError, InputError
from rfstage.ladder import Branch, Ladder
from rfstage.load import Load
from rfstage.verify.scattering import reflection, two_port

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

FITTED = ("coil", "capacitor")
VALUE_TIE = 0.4
LOSS_TIE = (3.0, 0.01)  # times the nominal loss, and at least
TOLD = 0.25  # of the tie: a narrower standard error tells
REACH = math.log(8)  # of a value, either way
MOST_LOSS = 1.0
LEAST_LOSS = 1e-7
FEWEST_POINTS = 5
PASSIVE = 1.05  # the most that noise and calibration make of 1
NOT_RECIPROCAL = 0.1  # between S21 and S12
SYSTEMATIC = 2.0  # times the noise seen from point to point
ALIKE = 0.95  # correlation of two parts that the data can't tell apart
_STEP = 1e-5  # of a parameter, for slopes: central differences, exact to a part in ten billion
_QUIET = 1e-10  # noise below which numbers rounded in a file would not matter
_ROUNDS = 4
_BAD = 5.0  # times the noise seen from point to point: a fit that leaves more may have stopped at a wrong place


class AnalyserData(NamedTuple):
    """S-parameters of a tank against one resistance [ohm]: frequencies [Hz] (m,), ``s`` (m, ports, ports)."""

    name: str
    frequencies: Array
    s: Complex
    resistance: float

    @property
    def ports(self) -> int:
        """One or two."""
        return int(self.s.shape[-1])


class PartEstimate(NamedTuple):
    """One part: nominal and estimated value [SI], its standard error, Q nominal and estimated.

    ``estimated`` and ``standard_error`` are None where the data don't tell the value, ``q_estimated`` where they
    don't tell the Q.
    """

    name: str
    kind: str
    nominal: float
    estimated: float | None
    standard_error: float | None
    q_nominal: float | None
    q_estimated: float | None
    q_standard_error: float | None


class TankFit(NamedTuple):
    """What a network-analyser file says of a tank.

    ``parts`` in the ladder's order; ``together`` are groups of parts that the data tell only together; ``noise`` rms
    of what is left, real and imaginary parts alike; ``seen_noise`` the same from point to point: much less means that
    the ladder lacks something; ``branches`` with the estimates in place; ``exchanged``: the two ports look as if they
    had been exchanged.
    """

    data: AnalyserData
    parts: tuple[PartEstimate, ...]
    together: tuple[tuple[str, ...], ...]
    noise: float
    seen_noise: float
    branches: tuple[Branch, ...]
    exchanged: bool = False

    @property
    def systematic(self) -> bool:
        """Whether more is left than noise: something is in the tank that is not in its ladder."""
        return self.noise > SYSTEMATIC * max(self.seen_noise, 1e-6)


def nominal_loss(branch: Branch, carrier: float) -> float:
    """Return 1/Q of a coil or capacitor at the carrier [Hz]; 0 where it is lossless."""
    if branch.q is not None:
        return 1 / float(branch.q)
    if branch.series_resistance is None:
        return 0.0
    return float(branch.series_resistance / _reactance(branch, float(branch.value), carrier))


def _reactance(branch: Branch, value: float | Array, carrier: float) -> Any:
    omega = 2 * math.pi * carrier
    return omega * value if branch.kind == "coil" else 1 / (omega * value)


def with_part(branch: Branch, value: float | Array, loss: float | Array, carrier: float) -> Branch:
    """Return a coil or capacitor with another value [SI] and loss 1/Q at the carrier [Hz].

    A part given by a constant series resistance keeps one.
    """
    if branch.series_resistance is not None:
        return replace(branch, value=value, series_resistance=loss * _reactance(branch, value, carrier))
    return replace(branch, value=value, q=1 / loss, q_frequency=carrier)


class _Problem(NamedTuple):
    """The ladder as a function of its parameters: first the values, then the losses, of the fitted branches."""

    branches: Sequence[Branch]
    fitted: tuple[int, ...]
    carrier: float
    data: AnalyserData
    load: Load
    start: Array
    ties: Array

    def built(self, x: Array) -> list[Branch]:
        """Return the branches for parameters of shape (p,) or (samples, p)."""
        count = len(self.fitted)
        made = list(self.branches)
        for k, row in enumerate(self.fitted):
            value = float(self.branches[row].value) * np.exp(x[..., k])
            made[row] = with_part(self.branches[row], value, x[..., count + k], self.carrier)
        return made

    def model(self, x: Array) -> Complex:
        """Return the S-parameters that count, as one row of complex numbers for each sample."""
        ladder, data = Ladder(self.built(x)), self.data
        if data.ports == 1:
            s = reflection(ladder, data.frequencies, self.load, data.resistance)
        else:
            s = two_port(ladder, data.frequencies, data.resistance)
        return s.reshape(*x.shape[:-1], -1)

    def rows(self, x: Array, noise: float) -> Array:
        """Return the residuals over the noise, and the distances from the ties over their widths."""
        left = self.model(x) - self.data.s.reshape(-1)
        return np.concatenate((left.real / noise, left.imag / noise, (x - self.start) / self.ties))

    def slopes(self, x: Array, noise: float) -> Array:
        """Return the residuals' slopes, shape (rows, p)."""
        count = len(self.fitted)
        step = np.where(np.arange(x.size) < count, _STEP, _STEP * np.maximum(x, LEAST_LOSS))
        moved = np.concatenate((x + np.diag(step), x - np.diag(step)))
        found = self.model(moved)
        slope = ((found[: x.size] - found[x.size :]) / (2 * step[:, np.newaxis])).T
        return np.concatenate((slope.real / noise, slope.imag / noise, np.diag(1 / self.ties)))


def tank_fit(branches: Sequence[Branch], data: AnalyserData, *, carrier: float, load: Load) -> TankFit:
    """Return the parts of a ladder as a network analyser's data tell them.

    Parameters
    ----------
    branches : sequence of Branch
        From the device's place to the load's, as they should be; coils and capacitors are fitted, strays and
        everything else are taken as they stand.
    data : AnalyserData
        One port, with the load attached, or two, with the second in the load's place.
    carrier : float
        Where the Qs hold [Hz].
    load : Load
        Used with one port only.

    Raises
    ------
    InputError
        If there are too few points, or none near the carrier.
    ImpossibleError
        If no part can be fitted.
    ConvergenceError
        If the fit does not come to rest.

    Examples
    --------
    >>> from rfstage.load import SeriesLoad
    >>> f = np.linspace(3e6, 15e6, 60)
    >>> real = [Branch("C1", "shunt", "capacitor", 1.1e-9), Branch("L1", "series", "coil", 0.9e-6)]
    >>> data = AnalyserData("a.s2p", f, two_port(Ladder(real), f, 50.0), 50.0)
    >>> wanted = [replace(real[0], value=1e-9), replace(real[1], value=1e-6)]
    >>> fit = tank_fit(wanted, data, carrier=7.1e6, load=SeriesLoad(50, 7.1e6))
    >>> [f"{part.name} {part.estimated:.4g}" for part in fit.parts]
    ['C1 1.1e-09', 'L1 9e-07']
    """
    _check(data, carrier)
    fitted = tuple(k for k, b in enumerate(branches) if b.kind in FITTED)
    if not fitted:
        raise ImpossibleError("the stage has no coil and no capacitor to fit")
    losses = np.array([nominal_loss(branches[k], carrier) for k in fitted])
    start = np.concatenate((np.zeros(len(fitted)), np.maximum(losses, 1e-5)))
    ties = np.concatenate((np.full(len(fitted), VALUE_TIE), np.maximum(LOSS_TIE[0] * losses, LOSS_TIE[1])))
    problem = _Problem(branches, fitted, carrier, data, load, start, ties)
    seen = point_noise(data)
    x, noise, covariance = _fitted(problem, seen)
    return _told(problem, x, covariance, noise, seen)


def _check(data: AnalyserData, carrier: float) -> None:
    f = data.frequencies
    if f.size < FEWEST_POINTS:
        raise InputError(f"{data.name}: holds {f.size} frequencies; wanted {FEWEST_POINTS} or more to fit parts to")
    if f[0] <= 0 or np.any(np.diff(f) <= 0):
        raise InputError(f"{data.name}: its frequencies must be above 0 and rise")
    if f[-1] < carrier / 10 or f[0] > carrier * 10:
        raise InputError(
            f"{data.name}: reaches from {f[0]:.4g} to {f[-1]:.4g} Hz, far from the carrier at {carrier:.4g} Hz (is its "
            "frequency unit right?)"
        )
    if np.any(np.abs(data.s) > PASSIVE):
        raise InputError(
            f"{data.name}: gives back up to {np.abs(data.s).max():.3g} times what arrives; a passive tank at most 1 "
            "(is the analyser's calibration good?)"
        )
    if data.ports == 2 and float(np.abs(data.s[:, 0, 1] - data.s[:, 1, 0]).max()) > NOT_RECIPROCAL:
        raise InputError(
            f"{data.name}: passes not the same both ways; a tank does (is the device still in, or the calibration off?)"
        )


def point_noise(data: AnalyserData) -> float:
    """Return rms noise as seen from point to point, by fourth differences: of real and imaginary parts alike."""
    if data.frequencies.size < FEWEST_POINTS:
        return _QUIET
    fourth = np.diff(data.s, 4, axis=0) / math.sqrt(70)  # 1, 4, 6, 4, 1 squared
    parts = np.concatenate((fourth.real.reshape(-1), fourth.imag.reshape(-1)))
    return max(float(np.median(np.abs(parts))) / 0.6745, _QUIET)


def _fitted(problem: _Problem, seen: float) -> tuple[Array, float, Array]:
    """Return parameters, noise and covariance; other starts are tried where the first one leaves too much."""
    best = _from(problem, problem.start, max(seen, 1e-6))
    if best[1] > _BAD * max(seen, 1e-4):
        count = len(problem.fitted)
        for k in range(count):
            for factor in (-VALUE_TIE, VALUE_TIE):
                other = problem.start.copy()
                other[k] = factor
                tried = _from(problem, other, best[1])
                best = min(best, tried, key=lambda found: found[1])
    x, noise = best
    slopes = problem.slopes(x, noise)
    return x, noise, np.asarray(np.linalg.inv(slopes.T @ slopes), dtype=np.float64)


def _from(problem: _Problem, start: Array, noise: float) -> tuple[Array, float]:
    from scipy.optimize import least_squares  # type: ignore[import-untyped]  # scipy ships no types

    count = len(problem.fitted)
    low = np.concatenate((np.full(count, -REACH), np.full(count, LEAST_LOSS)))
    high = np.concatenate((np.full(count, REACH), np.full(count, MOST_LOSS)))
    x = np.clip(start, low * (1 - 1e-9), high)
    points = 2 * problem.data.s.size
    for _ in range(_ROUNDS):
        found = least_squares(
            problem.rows,
            x,
            problem.slopes,
            bounds=(low, high),
            x_scale=problem.ties,
            xtol=1e-10,
            ftol=1e-10,
            gtol=1e-10,
            max_nfev=200,
            args=(noise,),
        )
        if not found.success:
            raise ConvergenceError(f"{problem.data.name}: the fit of the parts does not come to rest")
        x = found.x
        left = problem.rows(x, 1.0)[:points]
        used = problem.slopes(x, noise)[:points]
        whole = problem.slopes(x, noise)
        freedom = points - float(np.trace(np.linalg.solve(whole.T @ whole, used.T @ used)))
        again = max(math.sqrt(float(left @ left) / max(freedom, 1.0)), _QUIET)
        if abs(again / noise - 1) < 0.02:
            break
        noise = again
    return x, noise


def _told(problem: _Problem, x: Array, covariance: Array, noise: float, seen: float) -> TankFit:
    count = len(problem.fitted)
    errors = np.sqrt(np.diag(covariance))
    told = errors < TOLD * problem.ties
    parts = []
    for k, row in enumerate(problem.fitted):
        branch = problem.branches[row]
        nominal = float(branch.value)
        value = nominal * math.exp(x[k])
        loss, spread = float(x[count + k]), float(errors[count + k])
        known_q = bool(told[k] and told[count + k] and loss > 3 * spread)
        first = nominal_loss(branch, problem.carrier)
        parts.append(
            PartEstimate(
                branch.name,
                branch.kind,
                nominal,
                value if told[k] else None,
                value * float(errors[k]) if told[k] else None,
                1 / first if first else None,
                1 / loss if known_q else None,
                spread / loss**2 if known_q else None,
            )
        )
    names = [problem.branches[row].name for row in problem.fitted]
    together = _groups(names, covariance[:count, :count], told[:count], problem.ties[:count])
    found = TankFit(problem.data, tuple(parts), together, noise, seen, tuple(problem.built(x)))
    return found._replace(exchanged=problem.data.ports == 2 and _exchanged(problem))


def _exchanged(problem: _Problem) -> bool:
    """Return whether the data lie nearer to the nominal tank with their ports exchanged."""
    nominal, s = problem.model(problem.start), problem.data.s
    as_given, turned = (float(np.abs(nominal - one.reshape(-1)).sum()) for one in (s, s[:, ::-1, ::-1]))
    return turned < 0.5 * as_given


def _groups(names: list[str], covariance: Array, told: NDArray[np.bool_], ties: Array) -> tuple[tuple[str, ...], ...]:
    """Return the parts that are told only together: those not told whose errors go with another's."""
    errors = np.sqrt(np.diag(covariance))
    alike = np.abs(covariance / np.outer(errors, errors)) > ALIKE
    wide = errors > 0.05 * ties
    groups: list[set[int]] = []
    for k in np.flatnonzero(~told):
        group = {int(k), *(int(j) for j in np.flatnonzero(alike[k] & wide))}
        if len(group) == 1:
            continue
        for other in [g for g in groups if g & group]:
            groups.remove(other)
            group |= other
        groups.append(group)
    return tuple(tuple(names[j] for j in sorted(group)) for group in groups)
