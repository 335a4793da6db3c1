r"""The device's law in numbers: its current and junction charge at the electrode voltages, with slopes.

::

    s   = soft(v_control − V_t + v/μ, ε)        soft(x, ε) = max(x, 0) + ε ln(1 + exp(−|x|/ε))
    i0  = K s^p                                 the flat part of the characteristic
    v_k = V_k + R_k i0                          the knee grows with current along one ohmic line
    i   = i0 tanh(w) − g soft(−v − V_f, ε_f)    w = v/v_k for a FET, soft(v/v_k, 0.1) otherwise
    q   = C_j φ/(1−m) [(1 + v/φ)^(1−m) − 1]     below v = −φ/2 continued with a straight dq/dv

    symbol      name in `rfstage.device`                        unit
    ----------  ----------------------------------------------  ---------
    K, p        transfer_factor, exponent                       A/V^p, -
    V_t, ε      threshold, threshold_softness                   V
    V_k, R_k    knee_voltage, knee_resistance                   V, ohm
    μ           amplification_factor                            -
    g, V_f, ε_f reverse_conduction: conductance, threshold, …   S, V
    C_j, φ, m   junction_capacitance: at_zero, potential, …     F, V, -

The law is smooth where its softnesses are above 0, rises with v, and overflows nowhere. Its foot decays
exponentially, so that a device biased off carries no current that is an artefact of the softening. The
constant output capacitance is no part of it: that one stands in the ladder. Feedback capacitance, charge
stored in a junction, grid currents and heating are not modelled.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from rfstage.device import Device

Array = NDArray[np.float64]

ONE_WAY_SOFTNESS = 0.1  # of the knee: how sharply a one-way device closes near zero volts
HARD = 1e-200  # V; a hard corner is the limit of the soft one, and |x|/HARD still overflows for no voltage


class Parts(NamedTuple):
    """What any of a law's devices has; ``one_way`` and ``both_ways`` say whether there are such devices."""

    mu: bool
    one_way: bool
    both_ways: bool
    reverse: bool
    charge: bool


class Law(NamedTuple):
    """The parameters of one device or many, as arrays of shape (stages..., 1) that meet samples in time.

    Names and units as in the table above; ``inverse_mu`` is 1/μ, and 0 without one; absent junctions have
    a conductance or a capacitance of 0. ``one_way`` is False for a FET. ``parts`` spares looking for
    what no device has.
    """

    parts: Parts
    transfer_factor: Array
    exponent: Array
    threshold: Array
    softness: Array
    knee_voltage: Array
    knee_resistance: Array
    inverse_mu: Array
    one_way: NDArray[np.bool_]
    reverse_conductance: Array
    reverse_threshold: Array
    reverse_softness: Array
    junction_at_zero: Array
    junction_potential: Array
    junction_grading: Array

    @classmethod
    def of(cls, devices: Sequence[Device]) -> Law:
        """Return the law of each device, one a row."""
        rows = []
        for d in devices:
            diode, junction = d.reverse_conduction, d.junction_capacitance
            rows.append(
                (
                    d.transfer_factor,
                    d.exponent,
                    d.threshold,
                    d.threshold_softness,
                    d.knee_voltage,
                    d.knee_resistance,
                    1 / d.amplification_factor if d.amplification_factor is not None else 0.0,
                    d.family != "fet",
                    *((diode.conductance, diode.threshold, diode.softness) if diode else (0.0, 0.0, 0.0)),
                    *((junction.at_zero, junction.potential, junction.grading) if junction else (0.0, 1.0, 0.0)),
                )
            )
        columns: list[Any] = list(np.array(rows, dtype=np.float64).T[:, :, np.newaxis])
        mu, one_way, reverse, charge = (
            columns[_COLUMNS.index(name)] != 0
            for name in ("inverse_mu", "one_way", "reverse_conductance", "junction_at_zero")
        )
        columns[_COLUMNS.index("one_way")] = one_way
        return cls(
            Parts(bool(mu.any()), bool(one_way.any()), not one_way.all(), bool(reverse.any()), bool(charge.any())),
            *columns,
        )

    def take(self, rows: Any) -> Law:
        """Return the law of the chosen rows."""
        return Law(self.parts, *(getattr(self, name)[rows] for name in _COLUMNS))

    def softened(self, factor: float) -> Law:
        """Return the same device with a knee and a reverse junction ``factor`` times as soft."""
        return self._replace(
            knee_voltage=self.knee_voltage * factor,
            knee_resistance=self.knee_resistance * factor,
            reverse_conductance=self.reverse_conductance / factor,
            reverse_softness=self.reverse_softness * factor,
        )


_COLUMNS = Law._fields[1:]


class DrivenLaw(NamedTuple):
    """A law with its control voltage applied, ready to be asked for currents many times.

    ``overdrive`` is the control voltage above the threshold [V], shape (stages..., samples). Without a μ the
    flat current and the knee do not depend on the output voltage: ``flat`` [A] and ``inverse_knee`` [1/V]
    hold them then, and are None otherwise.
    """

    law: Law
    overdrive: Array
    flat: Array | None
    inverse_knee: Array | None

    @classmethod
    def at(cls, law: Law, control: Array) -> DrivenLaw:
        """Apply a control voltage [V], shape (stages..., samples)."""
        overdrive = control - law.threshold
        if law.parts.mu:
            return cls(law, overdrive, None, None)
        flat, _ = _flat(law, overdrive)
        return cls(law, overdrive, flat, 1 / (law.knee_voltage + law.knee_resistance * flat))

    def take(self, rows: Any) -> DrivenLaw:
        """Return the chosen rows."""
        flat = None if self.flat is None else self.flat[rows]
        inverse = None if self.inverse_knee is None else self.inverse_knee[rows]
        return DrivenLaw(self.law.take(rows), self.overdrive[rows], flat, inverse)

    def effective_drive(self, voltage: Array) -> Array:
        """Return the drive above the threshold [V] that the current follows, at output voltages [V]."""
        return self.overdrive + voltage * self.law.inverse_mu

    def flat_current(self, voltage: Array) -> Array:
        """Return i0 [A], what the device would carry with voltage to spare, at output voltages [V]."""
        return self.flat if self.flat is not None else _flat(self.law, self.effective_drive(voltage))[0]

    def current(self, voltage: Array) -> tuple[Array, Array]:
        """Return the current [A] and its slope [S] at output voltages [V], shape (stages..., samples)."""
        law = self.law
        slope: Array | None = None
        if self.flat is not None and self.inverse_knee is not None:
            flat, rate = self.flat, self.inverse_knee
            ratio = voltage * rate
        else:
            flat, slope = _flat(law, self.effective_drive(voltage))
            slope = slope * law.inverse_mu
            rate = 1 / (law.knee_voltage + law.knee_resistance * flat)
            ratio = voltage * rate
            rate = rate * (1 - ratio * law.knee_resistance * slope)
        if not law.parts.both_ways:
            ratio, factor = soft(ratio, ONE_WAY_SOFTNESS)
            rate = rate * factor
        elif law.parts.one_way:
            closing, factor = soft(ratio, ONE_WAY_SOFTNESS)
            ratio = np.where(law.one_way, closing, ratio)
            rate = np.where(law.one_way, rate * factor, rate)
        bend = np.tanh(ratio)
        current = flat * bend
        conductance = flat * (1 - bend * bend) * rate
        if slope is not None:
            conductance = conductance + slope * bend
        if law.parts.reverse:
            beyond, on = soft(-voltage - law.reverse_threshold, law.reverse_softness)
            current = current - law.reverse_conductance * beyond
            conductance = conductance + law.reverse_conductance * on
        return current, conductance


def soft(x: Array, softness: float | Array) -> tuple[Array, Array]:
    """Return the softened max(x, 0) and its slope; ``softness`` in the unit of ``x``, and 0 is a hard corner."""
    width = np.maximum(softness, HARD)
    foot = np.exp(-np.abs(x) / width)
    whole = 1 + foot
    return np.maximum(x, 0) + width * np.log1p(foot), np.where(x >= 0, 1.0, foot) / whole


def _flat(law: Law, drive: Array) -> tuple[Array, Array]:
    """Return K s^p and its slope over the drive."""
    s, slope = soft(drive, law.softness)
    p = law.exponent
    first = float(p.flat[0])
    if first in (1.0, 1.5, 2.0) and bool((p == first).all()):
        below = np.ones_like(s) if first == 1 else np.sqrt(s) if first == 1.5 else s
    else:
        below = s ** (p - 1)
    return law.transfer_factor * s * below, law.transfer_factor * p * below * slope


def current(device: Device, *, control: ArrayLike, voltage: ArrayLike) -> tuple[Array, Array]:
    """Return a device's current and output conductance.

    Parameters
    ----------
    device : Device
        Its law.
    control, voltage : array_like, shapes that broadcast to (...)
        Control and output voltage [V].

    Returns
    -------
    current : ndarray, shape (...)
        Into the output electrode [A], capacitances not counted.
    conductance : ndarray, shape (...)
        Its derivative over the output voltage [S].

    Notes
    -----
    At v = v_k the current is 76 % of its flat part, at 3 v_k 99.5 %.

    Examples
    --------
    >>> fet = Device(family="fet", transfer_factor=2.0, exponent=1.0, threshold=3.0, threshold_softness=0.04,
    ...              knee_voltage=0.07, knee_resistance=0.1)
    >>> amperes, siemens = current(fet, control=[2.0, 5.0, 5.0], voltage=[10.0, 10.0, 0.47])
    >>> [round(float(i), 3) + 0.0 for i in amperes]
    [0.0, 4.0, 3.046]
    """
    controls, volts = np.broadcast_arrays(np.asarray(control, dtype=np.float64), np.asarray(voltage, dtype=np.float64))
    driven = DrivenLaw.at(Law.of([device]), controls.reshape(1, -1))
    amperes, siemens = driven.current(volts.reshape(1, -1))
    return amperes.reshape(volts.shape), siemens.reshape(volts.shape)


def junction_charge(law: Law, voltage: Array) -> tuple[Array, Array]:
    """Return the charge [C] of the junction capacitance and its slope [F] at output voltages [V].

    Both of shape (stages..., samples); zero at 0 V. Below half the potential on the conducting side the
    capacitance goes on as a straight line of the same value and slope, since the formula's pole is not real.

    Examples
    --------
    >>> from rfstage.device import JunctionCapacitance
    >>> fet = Device(family="fet", transfer_factor=2.0, exponent=1.0, threshold=3.0, threshold_softness=0.04,
    ...              knee_voltage=0.07, knee_resistance=0.1, junction_capacitance=JunctionCapacitance(
    ...                  at_zero=400e-12, potential=0.8, grading=0.5))
    >>> charge, capacitance = junction_charge(Law.of([fet]), np.array([[0.0, 12.0]]))
    >>> [round(1e12 * float(c), 6) for c in capacitance[0]]
    [400.0, 100.0]
    """
    zero, potential, m = law.junction_at_zero, law.junction_potential, law.junction_grading
    inside = 1 + voltage / potential
    safe = np.maximum(inside, 0.5)
    beyond = np.minimum(inside - 0.5, 0.0)  # in units of the potential, 0 above the half-way point
    capacitance = zero * safe**-m
    charge = potential / (1 - m) * (capacitance * safe - zero)
    slope = -2 * m * capacitance  # dC/d(v/φ) at the half-way point, the only place it is used
    return (charge + potential * beyond * (capacitance + beyond * slope / 2), capacitance + beyond * slope)
