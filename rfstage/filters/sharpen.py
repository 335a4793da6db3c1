"""Newton's method on the parts of an elliptic ladder, many samples at once.

What a ladder tells sharply is where it reflects nothing: the n values of its arms follow, to the last digits,
from no reflection (two numbers) at each reflection zero and the right amount at the edge of the ripple. All
derivatives come from the same walk as the reflection.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

_ITERATIONS = 20
_SETTLED = 1e-12  # of each value, in the last step

Array = NDArray[np.float64]


def sharpened(
    shunts: Array, traps: Array, zeros: Array, reflections: Array, factor: Array
) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Return the arms' values, settled, and which samples did settle.

    Parameters
    ----------
    shunts, traps, zeros : ndarray, shapes (arms, samples), (traps, samples), (traps, samples)
        Shunt capacitors and those of the traps as a start [F], and the traps' frequencies [rad/s], for 1 ohm.
    reflections : ndarray, shape (traps, samples)
        Where nothing is reflected [rad/s]; the ripple's edge is at 1.
    factor : ndarray, shape (samples,)
        Of the ripple, ε [-].

    Returns
    -------
    tuple of ndarray
        Shunt capacitors, trap capacitors, and of shape (samples,) whether the last step moved nothing any more.
    """
    count = len(zeros)
    values = np.empty((2 * count + 1, shunts.shape[1]))
    values[::2], values[1::2] = shunts, traps
    crest = factor / np.sqrt(1 + factor**2)
    omega = np.concatenate([reflections, np.ones((1, shunts.shape[1]))])
    settled = np.zeros(shunts.shape[1], dtype=np.bool_)
    for _ in range(_ITERATIONS):
        reflected, change = _reflection(values, zeros, omega)
        at_edge = reflected[-1]
        miss = np.concatenate([reflected[:-1].real, reflected[:-1].imag, [(np.abs(at_edge) ** 2 - crest**2) / crest]])
        edge_change = 2 * (np.conj(at_edge) * change[:, -1]).real / crest
        rows = np.concatenate([change[:, :-1].real, change[:, :-1].imag, edge_change[:, None]], axis=1)
        usable = np.isfinite(rows).all(axis=(0, 1)) & np.isfinite(miss).all(axis=0)
        matrix = np.where(usable, rows, np.eye(len(values))[:, :, None])
        step = _solved(matrix.transpose(2, 1, 0), np.where(usable, -miss, 0.0).T).T
        values = values * (1 + np.clip(step, -0.5, 1.0))
        settled = usable & (np.abs(step).max(axis=0) < _SETTLED)
        if np.all(settled | ~usable):
            break
    return values[::2], values[1::2], settled


def _solved(matrix: Array, right: Array) -> Array:
    """Solve one set of equations a sample; where a set is singular, all of it stays as it is."""
    try:
        return np.asarray(np.linalg.solve(matrix, right[..., None])[..., 0])
    except np.linalg.LinAlgError:
        singular = np.abs(np.linalg.det(matrix)) == 0
        return np.asarray(
            np.linalg.solve(np.where(singular[:, None, None], np.eye(matrix.shape[1]), matrix), right[..., None])[
                ..., 0
            ]
        )


def _reflection(values: Array, zeros: Array, omega: Array) -> tuple[NDArray[np.complex128], NDArray[np.complex128]]:
    """Return the reflection coefficient (frequencies, samples) and its change for a relative change of each value.

    A series impedance changes it by 2 I²/(V + I)² and a shunt admittance by −2 V²/(V + I)² of the input's V and I.
    """
    change = np.empty((len(values), *omega.shape), dtype=np.complex128)
    v = i = np.ones(omega.shape, dtype=np.complex128)
    for k in range(len(values) - 1, -1, -1):
        if k % 2:
            z = 1j * omega / (values[k] * (zeros[k // 2] ** 2 - omega**2))
            change[k] = -z * i**2
            v = v + i * z
        else:
            y = 1j * omega * values[k]
            change[k] = -y * v**2
            i = i + v * y
    total = v + i
    return (v - i) / total, change * (2 / total**2)
