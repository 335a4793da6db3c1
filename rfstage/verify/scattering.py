"""S-parameters of a ladder, as a network analyser shows them: looked into at the device's place, or through."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from rfstage.ladder import Ladder
from rfstage.load import Load

Complex = NDArray[np.complex128]


def reflection(ladder: Ladder, frequencies: NDArray[np.float64], load: Load, resistance: float) -> Complex:
    """Return S11 at the device's place with the load attached, shape (samples…, frequencies, 1, 1).

    Frequencies in Hz; ``resistance`` of the port [ohm].
    """
    z: Any = ladder.impedance(frequencies, load)
    found: Complex = ((z - resistance) / (z + resistance))[..., np.newaxis, np.newaxis]
    return found


def two_port(ladder: Ladder, frequencies: NDArray[np.float64], resistance: float) -> Complex:
    """Return the S-parameters from the device's place (port 1) to the load's (port 2).

    Shape (samples…, frequencies, 2, 2); frequencies in Hz, ``resistance`` of both ports [ohm].
    """
    a, b, c, d = ladder.chain(frequencies)
    r = resistance
    total = a + b / r + c * r + d
    s = np.empty((*np.shape(total), 2, 2), dtype=np.complex128)
    s[..., 0, 0] = (a + b / r - c * r - d) / total
    s[..., 0, 1] = s[..., 1, 0] = 2 / total
    s[..., 1, 1] = (-a + b / r - c * r + d) / total
    return s
