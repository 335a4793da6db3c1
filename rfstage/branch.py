"""One branch of the ladder: a part with its losses and strays, as an impedance or as a two-port.

::

    symbol  name                    unit    losses
    ------  ----------------------  ------  ------------------------------------------------------
    L       inductance of a coil    H       Q at the carrier: R = ω₀L/Q · √(f/f₀)
    C       capacitance             F       Q: R = 1/(ωCQ) at every frequency (constant loss tangent)
    R       series resistance       ohm     either may state a constant series resistance instead

    through:  V1 = Z11·I1 − Zm·I2      coupled pair: Z11, Z22 its windings, Zm = jω·k·√(L1·L2)
              V2 = Zm·I1 − Z22·I2      transformer:  Zm = Zmagnetizing/n, and so on
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.errors import OutOfRangeError
from rfstage.kinds import THROUGH

Real = float | NDArray[np.float64]
Complex = complex | NDArray[np.complex128]


class Ports(NamedTuple):
    """A through branch: ``V1 = own·I1 − mutual·I2``, ``V2 = mutual·I1 − far·I2`` [ohm]; 1 is at the device."""

    own: Any
    mutual: Any
    far: Any

    def inwards(self, voltage: Any, current: Any) -> tuple[Any, Any]:
        """Return voltage and current at the device's side from those at the load's."""
        near = (voltage + self.far * current) / self.mutual
        return self.own * near - self.mutual * current, near

    def outwards(self, voltage: Any, current: Any) -> tuple[Any, Any]:
        """Return voltage and current at the load's side from those at the device's."""
        beyond = (self.own * current - voltage) / self.mutual
        return self.mutual * current - self.far * beyond, beyond

    def weighed(self, near: Any, beyond: Any, parts: tuple[Any, Any, Any]) -> Any:
        """Return a quadratic form of the two currents: twice a loss [W], four times an energy [J]."""
        own, mutual, far = parts
        return own * _square(near) - 2 * mutual * (near * np.conj(beyond)).real + far * _square(beyond)


@dataclass(frozen=True, slots=True)
class Branch:
    """One part of the ladder.

    Parameters
    ----------
    name : str
        Such as ``"C1"``.
    place : str
        ``"series"``, ``"shunt"`` or ``"through"``.
    kind : str
        ``"coil"``, ``"capacitor"``, ``"resistor"`` or ``"trap"``; through: ``"coupled"`` or ``"transformer"``.
    value : float or ndarray, shape (samples...)
        Inductance [H], capacitance [F] or resistance [ohm]; of a trap its coil's, of a coupled pair the first
        winding's inductance, of a transformer the ratio of turns [-], device over load.
    q : float, ndarray or None
        Quality factor [-] at ``q_frequency``, of the coil where there is one; None is lossless unless
        ``series_resistance`` is given.
    q_frequency : float or None
        Where a coil's Q holds [Hz]: the carrier. A capacitor's Q is the same at all frequencies.
    series_resistance : float, ndarray or None
        Constant series resistance [ohm], instead of a Q; of a transformer its windings', at the device's side.
    lead_inductance : float or ndarray
        In series with a capacitor, resistor or shunt trap [H]; of a transformer its leakage.
    self_capacitance : float or ndarray
        Across a coil [F].
    origin : str
        ``"part"``, ``"device"`` or ``"stray"``.
    second : float or ndarray
        Of a trap its capacitance [F], of a coupled pair the second winding [H], of a transformer the
        magnetizing inductance at the device's side [H].
    second_q : float, ndarray or None
        Quality factor of ``second`` [-].
    coupling : float or ndarray
        Coefficient of a coupled pair [-].
    tap : str
        Where a coupled pair is one tapped coil: ``"load"`` or ``"device"``, whichever is at the tap.
    """

    name: str
    place: str
    kind: str
    value: Real
    q: Real | None = None
    q_frequency: float | None = None
    series_resistance: Real | None = None
    lead_inductance: Real = 0.0
    self_capacitance: Real = 0.0
    origin: str = "part"
    second: Real = 0.0
    second_q: Real | None = None
    coupling: Real = 0.0
    tap: str = ""

    @property
    def blocks(self) -> bool:
        """Whether it keeps direct current from what follows."""
        return self.kind == "capacitor" and self.place == "series"

    @property
    def grounds(self) -> bool:
        """Whether it conducts direct current to ground."""
        return self.place == THROUGH or (self.place == "shunt" and self.kind in ("coil", "resistor"))

    def impedance(self, frequency: Real) -> Any:
        """Return the branch's impedance [ohm]; sample axes come before those of ``frequency`` [Hz]."""
        omega = 2 * math.pi * frequency
        value = lift(self.value, frequency)
        if self.kind == "coil":
            z = value * (1j * omega + self._loss_per_henry(self.q, frequency))
            if self.series_resistance is not None:
                z = z + lift(self.series_resistance, frequency)
            if _present(self.self_capacitance):
                z = z / (1 + 1j * omega * lift(self.self_capacitance, frequency) * z)
            return z
        if self.kind == "capacitor":
            z = _capacitor(value, self.q, frequency)
        elif self.kind == "trap":
            inner = value * (1j * omega + self._loss_per_henry(self.q, frequency))
            beside = _capacitor(lift(self.second, frequency), self.second_q, frequency)
            if self.place == "series":
                return inner * beside / (inner + beside)
            z = inner + beside
        else:
            z = value + 0j
        if self.series_resistance is not None:
            z = z + lift(self.series_resistance, frequency)
        if _present(self.lead_inductance):
            z = z + 1j * omega * lift(self.lead_inductance, frequency)
        return z

    def admittance(self, frequency: Real) -> Any:
        """Return one over the impedance [S]; a capacitor without strays costs no division by its value."""
        if self.kind == "capacitor" and self.series_resistance is None and not _present(self.lead_inductance):
            loss = 0.0 if self.q is None else 1 / lift(self.q, frequency)
            return lift(self.value, frequency) * (2 * math.pi * frequency * ((loss + 1j) / (loss * loss + 1)))
        return 1 / self.impedance(frequency)

    def ports(self, frequency: Real) -> Ports:
        """Return a through branch as a two-port [ohm]; axes as `impedance`."""
        omega = 2 * math.pi * frequency
        value, second = lift(self.value, frequency), lift(self.second, frequency)
        below = second * (1j * omega + self._loss_per_henry(self.second_q, frequency))
        if self.kind == "transformer":
            own = 1j * omega * lift(self.lead_inductance, frequency) + below
            if self.series_resistance is not None:
                own = own + lift(self.series_resistance, frequency)
            return Ports(own, below / value, below / value**2)
        above = value * (1j * omega + self._loss_per_henry(self.q, frequency))
        mutual = 1j * omega * (lift(self.coupling, frequency) * (value * second) ** 0.5)
        if not self.tap:
            return Ports(above, mutual, below)
        whole = above + below + 2 * mutual
        shared = below + mutual
        return Ports(whole, shared, below) if self.tap == "load" else Ports(below, shared, whole)

    def _loss_per_henry(self, q: Real | None, frequency: Real) -> Any:
        """Series resistance per henry that a coil's Q stands for: ω₀/Q · √(f/f₀)."""
        if q is None:
            return 0.0
        if self.q_frequency is None:
            raise OutOfRangeError(f"{self.name}: q_frequency", None, "given where a coil has a Q")
        return 2 * math.pi * self.q_frequency / lift(q, frequency) * (frequency / self.q_frequency) ** 0.5

    def stored_energy(self, frequency: float, current: complex, seen: complex | None = None) -> float:
        """Return mean stored energy [J] at peak ``current`` [A] into the branch, strays counted.

        For one sample and frequency. ``seen`` [ohm] is the impedance at the device's side of a through branch.
        """
        omega = 2 * math.pi * frequency
        square = abs(current) ** 2 / 4
        if self.place == THROUGH:
            assert seen is not None
            ports = self.ports(frequency)
            beyond = ports.outwards(seen * current, current)[1]
            inductances = tuple(complex(z).imag / omega for z in ports)
            return float(ports.weighed(current, beyond, inductances)) / 4  # type: ignore[arg-type]  # three, as ports
        if self.kind == "coil":
            if not _present(self.self_capacitance):
                return float(self.value) * square
            across = current * complex(self.impedance(frequency))
            winding = current - across * 1j * omega * float(self.self_capacitance)
            return (float(self.value) * abs(winding) ** 2 + float(self.self_capacitance) * abs(across) ** 2) / 4
        if self.kind == "trap":
            through_coil = current
            if self.place == "series":
                beside = complex(_capacitor(self.second, self.second_q, frequency))
                through_coil = current * (1 - complex(self.impedance(frequency)) / beside)
            rest = square if self.place == "shunt" else abs(current - through_coil) ** 2 / 4
            held = rest / (omega**2 * float(self.second)) + float(self.value) * abs(through_coil) ** 2 / 4
            return held + float(self.lead_inductance) * square
        if self.kind == "capacitor":
            return square * (float(self.lead_inductance) + 1 / (omega**2 * float(self.value)))
        return square * float(self.lead_inductance)


def _capacitor(value: Any, q: Real | None, frequency: Real) -> Any:
    loss = 0.0 if q is None else 1 / lift(q, frequency)
    return (loss - 1j) / (2 * math.pi * frequency * value)


def lift(value: Real, frequency: Real) -> Any:
    """Give sample arrays one new axis for each axis of ``frequency``; leave plain numbers alone."""
    if isinstance(value, np.ndarray) and isinstance(frequency, np.ndarray):
        return value.reshape(value.shape + (1,) * frequency.ndim)
    return value


def _present(value: Real) -> bool:
    return isinstance(value, np.ndarray) or value != 0


def _square(x: Any) -> Any:
    return abs(x) ** 2
