"""The load over frequency: one impedance with a reactance that continues, or a measured table.

::

    a figure at the carrier      R + jX, X > 0   →  R in series with L = X/ω
                                 R − jX          →  R in series with C = 1/(ωX)
    a measured one-port          interpolated where it reaches; beyond either end it continues
                                 from the impedance there by the same rule

Real impedances are ``complex`` with no imaginary part. All frequencies are in hertz, impedances in ohms.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from rfstage.errors import InputError, OutOfRangeError

SMALLEST = 1e-300  # ohm: of less a number has no reciprocal
REFERENCE_RESISTANCE = 50.0  # ohm; a measured load is interpolated as the reflection against it


class Load(Protocol):
    """Anything with an impedance over frequency."""

    def impedance(self, frequency: ArrayLike) -> NDArray[np.complex128]:
        """Return the impedance [ohm] at each frequency [Hz], same shape."""


def _continued(impedance: complex, at: float, frequency: NDArray[np.float64]) -> NDArray[np.complex128]:
    """Continue R + jX from frequency ``at``: a positive reactance as a coil, a negative one as a capacitor."""
    ratio = frequency / at
    reactance = impedance.imag * (ratio if impedance.imag > 0 else 1 / ratio)
    return np.asarray(impedance.real + 1j * reactance, dtype=np.complex128)


@dataclass(frozen=True, slots=True)
class SeriesLoad:
    """A load given by one impedance at one frequency, continued as series R + L or R + C.

    Parameters
    ----------
    at_carrier : complex
        Impedance [ohm]; the real part above 0.
    carrier : float
        Frequency where it holds [Hz].

    Examples
    --------
    >>> load = SeriesLoad(50 + 20j, carrier=7e6)
    >>> complex(load.impedance(14e6))
    (50+40j)
    """

    at_carrier: complex
    carrier: float

    def __post_init__(self) -> None:
        if not (self.at_carrier.real > SMALLEST and math.isfinite(abs(self.at_carrier))):
            raise OutOfRangeError("load impedance", self.at_carrier, "finite, its resistance above 0 ohm")

    def impedance(self, frequency: ArrayLike) -> NDArray[np.complex128]:
        """Return the impedance [ohm] at each frequency [Hz], same shape."""
        return _continued(self.at_carrier, self.carrier, np.asarray(frequency, dtype=np.float64))


@dataclass(frozen=True, slots=True, eq=False)
class MeasuredLoad:
    """A measured one-port: interpolated within its table, continued beyond its ends.

    The reflection coefficient against 50 Ω is interpolated linearly between the points of the table.

    Parameters
    ----------
    frequencies : ndarray, shape (n,)
        Rising frequencies [Hz].
    impedances : ndarray, shape (n,)
        Impedances there [ohm], each with a resistance above 0.
    name : str
        What to call it in messages, such as the file's name.

    Raises
    ------
    InputError
        If the table is empty, not rising, or not passive.
    """

    frequencies: NDArray[np.float64]
    impedances: NDArray[np.complex128]
    name: str

    def __post_init__(self) -> None:
        f, z = self.frequencies, self.impedances
        if f.size == 0 or not np.all(np.isfinite(f)) or not np.all(np.isfinite(z)):
            raise InputError(f"{self.name}: the load table is empty or has points that are not finite")
        if f[0] <= 0 or np.any(np.diff(f) <= 0):
            raise InputError(f"{self.name}: the frequencies of the load must be above 0 and rise")
        if np.any(z.real <= 0):
            worst = int(np.argmin(z.real))
            raise InputError(
                f"{self.name}: the load has {z.real[worst]:.3g} ohm resistance at {f[worst]:.6g} Hz; "
                "a passive load has more than 0 (is the analyser's calibration good?)"
            )

    def beyond(self, carrier: float, highest_order: int) -> tuple[int, ...]:
        """Return the harmonic orders from 2 of a carrier [Hz] at which the load is continued beyond its table."""
        return tuple(n for n in range(2, highest_order + 1) if not self.reaches(n * carrier))

    def reaches(self, frequency: float) -> bool:
        """Return whether the table covers this frequency [Hz]."""
        return bool(self.frequencies[0] <= frequency <= self.frequencies[-1])

    def impedance(self, frequency: ArrayLike) -> NDArray[np.complex128]:
        """Return the impedance [ohm] at each frequency [Hz], same shape."""
        wanted = np.asarray(frequency, dtype=np.float64)
        table = (self.impedances - REFERENCE_RESISTANCE) / (self.impedances + REFERENCE_RESISTANCE)
        reflection = np.interp(wanted, self.frequencies, table.real) + 1j * np.interp(
            wanted, self.frequencies, table.imag
        )
        inside = REFERENCE_RESISTANCE * (1 + reflection) / (1 - reflection)
        below = _continued(complex(self.impedances[0]), float(self.frequencies[0]), wanted)
        above = _continued(complex(self.impedances[-1]), float(self.frequencies[-1]), wanted)
        return np.where(wanted < self.frequencies[0], below, np.where(wanted > self.frequencies[-1], above, inside))
