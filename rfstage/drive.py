"""The drive at the control electrode: bias, amplitude and, where it can be honest, power.

::

    v(t) = bias + amplitude·cos ωt          current flows where v exceeds the threshold
    threshold = bias + A cos θ              A the amplitude, θ the half angle
    I_peak = K [A (1 − cos θ)]^p            a triode's anode swing works against A: A = amplitude − swing/mu
"""

from __future__ import annotations

import math
from typing import NamedTuple

from rfstage.errors import ImpossibleError
from rfstage.quantity import exact_text

AGREEMENT = 0.005  # of the drive: within it values that each fix the drive are taken to agree


class DriveVoltages(NamedTuple):
    """Drive at the control electrode: bias and peak amplitude [V], or None where nothing fixes them.

    ``unbiased_amplitude`` gives the conduction angle with no bias at all; it exists only where the
    threshold times the cosine of the half angle is above zero. It says nothing of the peak current.
    ``power`` is in watts.
    """

    bias: float | None
    amplitude: float | None
    unbiased_amplitude: float | None
    power: float | None


def drive_voltages(
    *,
    half_angle: float,
    peak_current: float,
    exponent: float,
    threshold: float | None,
    transfer_factor: float | None,
    bias: float | None,
    amplitude: float | None = None,
    anode_feedback: tuple[float, float] = (0.0, 0.0),
) -> tuple[float | None, float | None, float | None]:
    """Return bias, amplitude and unbiased amplitude [V] that give the angle.

    Parameters
    ----------
    half_angle : float
        Half of the conduction angle [rad].
    peak_current, exponent : float
        Of the pulse: peak [A], power law [-].
    threshold : float or None
        Control voltage where current starts [V].
    transfer_factor : float or None
        K [A/V^exponent] of ``i = K (v − threshold)^exponent``.
    bias, amplitude : float or None
        Given bias and peak drive [V]; with no transfer factor one of them fixes the other.
    anode_feedback : tuple of float
        For a triode: direct anode voltage and swing, both over the amplification factor [V]. The first aids the
        control voltage, the second works against the drive.

    Raises
    ------
    ImpossibleError
        If what is given contradicts the angle or itself, or a triode's swing over mu exceeds the drive.
    """
    cosine = math.cos(half_angle)
    if abs(cosine) < 1e-15:
        cosine = 0.0
    lifted, opposed = anode_feedback
    degrees = math.degrees(2 * half_angle)
    if amplitude is not None and amplitude <= opposed:
        raise ImpossibleError(
            f"drive.amplitude: got {exact_text(amplitude, 'V')}; the swing over the amplification factor, "
            f"{opposed:.4g} V, is more than that, so the tube never conducts at the trough: drive harder, or give a "
            "tube of higher amplification factor"
        )
    ways: list[tuple[str, float]] = []  # what is given, and the drive it makes effective
    if transfer_factor is not None:
        share = 2 * math.sin(half_angle / 2) ** 2  # 1 − cos, with its digits at small angles
        ways.append(("device.transfer_factor", (peak_current / transfer_factor) ** (1 / exponent) / share))
    if amplitude is not None:
        ways.append(("drive.amplitude", amplitude - opposed))
    if threshold is None:
        start, unbiased = None, None
    else:
        start = threshold - lifted
        unbiased = start / cosine + opposed if start * cosine > 0 else None
        if bias is not None:
            ways += _drive_of_bias(degrees, cosine, start, bias)
    if not ways:
        return bias, None, unbiased
    name, effective = ways[0]
    for other, demanded in ways[1:]:
        if abs(demanded - effective) > AGREEMENT * effective:
            got = bias if other == "drive.bias" else amplitude
            wanted = "" if start is None else f"a bias of {start - effective * cosine:.4g} V and "
            raise ImpossibleError(
                f"{other}: {name}, {degrees:.4g} deg and the power ask for {wanted}a drive of "
                f"{effective + opposed:.4g} V peak; got {exact_text(got or 0.0, 'V')} (leave one of them out)"
            )
    if bias is None and start is not None:
        bias = start - effective * cosine
    return bias, effective + opposed, unbiased


def _drive_of_bias(degrees: float, cosine: float, start: float, bias: float) -> list[tuple[str, float]]:
    """Return what a bias makes of the drive [V], nothing at 180° where it says nothing of it."""
    if cosine == 0:
        if abs(bias - start) > AGREEMENT * max(abs(start), abs(bias)):
            raise ImpossibleError(
                f"drive.bias: at 180 deg the bias equals the threshold of {start:.6g} V; got {exact_text(bias, 'V')}"
            )
        return []
    if (start - bias) * cosine <= 0:
        side = "below" if cosine > 0 else "above"
        raise ImpossibleError(
            f"drive.bias: {degrees:.4g} deg needs a bias {side} the threshold of {start:.6g} V; "
            f"got {exact_text(bias, 'V')}"
        )
    return [("drive.bias", (start - bias) / cosine)]


def drive_power(
    family: str,
    *,
    carrier: float,
    device_rf_power: float,
    amplitude: float | None,
    gate_resistance: float | None,
    input_capacitance: float | None,
    power_gain: float | None,
    grid_current: float | None,
) -> float | None:
    """Return the drive power [W] where the given data allow an honest figure, else None.

    Parameters
    ----------
    family : str
        ``"fet"``: the charging current of ``input_capacitance`` [F] through ``gate_resistance`` [ohm],
        ½(ωCA)²R (common practice, no source). ``"tube"``: peak grid swing times the direct
        ``grid_current`` [A] (H. P. Thomas, Proc. IRE 21, 1933, from memory). ``"bipolar"``: the
        device's RF power over ``power_gain`` [-].
    carrier, device_rf_power, amplitude : float
        Hz, W and peak V at the control electrode.
    """
    if family == "fet" and gate_resistance is not None and input_capacitance is not None and amplitude is not None:
        charging = 2 * math.pi * carrier * input_capacitance * amplitude
        return charging**2 * gate_resistance / 2
    if family == "tube" and grid_current is not None and amplitude is not None:
        return amplitude * grid_current
    if family == "bipolar" and power_gain is not None:
        return device_rf_power / power_gain
    return None
