r"""The book's operating point: swing, load resistance, currents, power, heat and drive.

::

    V_electrode = V_supply − R_choke·I_dc         swing  V1 = V_electrode − V_min
    P_device = P_load/η_tank = V1²/(2 R)          I1 = V1/R = a1·I_peak,  I_dc = a0·I_peak

    symbol   name                 unit
    ------   -------------------  ----
    V1       swing                V      peak of the fundamental at the output electrode
    R        load_resistance      ohm    what the device's current generator must see
    a0, a1   coefficients         -      of the current pulse, peak 1
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

from rfstage.errors import ImpossibleError
from rfstage.quantity import exact_text

AGREEMENT = 0.005  # of the drive: within it values that each fix the drive are taken to agree


class OperatingPoint(NamedTuple):
    """Voltages [V], currents [A], powers [W] and efficiencies [-] of the textbook stage.

    ``dc_power`` is what the supply gives, the choke's dc loss included; ``device_rf_power`` is the
    fundamental's power out of the device; ``dissipation`` is the device's heat.
    """

    load_resistance: float
    electrode_voltage_dc: float
    swing: float
    peak_current: float
    dc_current: float
    fundamental_current: float
    dc_power: float
    device_rf_power: float
    dissipation: float
    choke_loss: float
    device_efficiency: float
    overall_efficiency: float
    peak_voltage: float
    output_power: float


def operating_point(
    *,
    supply: float,
    minimum_voltage: float,
    output_power: float,
    dc_coefficient: float,
    fundamental_coefficient: float,
    tank_efficiency: float = 1.0,
    choke_resistance: float = 0.0,
) -> OperatingPoint:
    """Return the operating point that puts ``output_power`` into the load.

    Parameters
    ----------
    supply, minimum_voltage : float
        Supply voltage and lowest output-electrode voltage [V]; the second below the first.
    output_power : float
        Power at the load [W], above 0.
    dc_coefficient, fundamental_coefficient : float
        ``a0`` and ``a1`` of the current pulse [-].
    tank_efficiency : float
        Power at the load over the fundamental's power out of the device [-], in (0, 1].
    choke_resistance : float
        Direct-current resistance between supply and device [ohm], 0 or more.

    Returns
    -------
    OperatingPoint

    Raises
    ------
    ImpossibleError
        If the choke's dc resistance leaves no swing that gives the power.

    References
    ----------
    The relations of every text on tuned power amplifiers; with a choke resistance the swing solves
    ``V1² − (V_supply − V_min) V1 + 2 R_choke (a0/a1) P = 0``.

    Examples
    --------
    >>> p = operating_point(supply=1000.0, minimum_voltage=100.0, output_power=100.0,
    ...                     dc_coefficient=0.217996, fundamental_coefficient=0.391002)
    >>> round(p.load_resistance), round(p.peak_current, 4), round(100 * p.device_efficiency, 1)
    (4050, 0.5683, 80.7)
    """
    device_power = output_power / tank_efficiency
    available = supply - minimum_voltage
    drop = 2 * choke_resistance * dc_coefficient / fundamental_coefficient * device_power
    square = available**2 - 4 * drop
    if available <= 0 or square < 0:
        most = available**2 * fundamental_coefficient / (8 * dc_coefficient * device_power)
        raise ImpossibleError(
            f"the choke's dc resistance of {exact_text(choke_resistance, 'ohm')} drops too much for "
            f"{exact_text(output_power, 'W')} from {exact_text(supply, 'V')}: at most {most:.3g} ohm would do"
        )
    swing = (available + math.sqrt(square)) / 2
    return operating_point_at(
        swing**2 / (2 * device_power),
        supply=supply,
        minimum_voltage=minimum_voltage,
        dc_coefficient=dc_coefficient,
        fundamental_coefficient=fundamental_coefficient,
        tank_efficiency=tank_efficiency,
        choke_resistance=choke_resistance,
    )


def operating_point_at(
    load_resistance: float,
    *,
    supply: float,
    minimum_voltage: float,
    dc_coefficient: float,
    fundamental_coefficient: float,
    tank_efficiency: float = 1.0,
    choke_resistance: float = 0.0,
) -> OperatingPoint:
    """Return the operating point of a load resistance [ohm]; the other arguments are those of `operating_point`.

    Examples
    --------
    >>> p = operating_point_at(4050.0, supply=1000.0, minimum_voltage=100.0, dc_coefficient=0.217996,
    ...                        fundamental_coefficient=0.391002)
    >>> round(p.output_power, 6)
    100.0
    """
    ratio = dc_coefficient / fundamental_coefficient
    swing = (supply - minimum_voltage) / (1 + choke_resistance * ratio / load_resistance)
    fundamental = swing / load_resistance
    dc_current = ratio * fundamental
    device_power = swing * fundamental / 2
    choke_loss = choke_resistance * dc_current**2
    electrode = supply - choke_resistance * dc_current
    dc_power = supply * dc_current
    output_power = tank_efficiency * device_power
    return OperatingPoint(
        load_resistance=load_resistance,
        electrode_voltage_dc=electrode,
        swing=swing,
        peak_current=fundamental / fundamental_coefficient,
        dc_current=dc_current,
        fundamental_current=fundamental,
        dc_power=dc_power,
        device_rf_power=device_power,
        dissipation=dc_power - choke_loss - device_power,
        choke_loss=choke_loss,
        device_efficiency=device_power / (dc_power - choke_loss),
        overall_efficiency=output_power / dc_power,
        peak_voltage=electrode + swing,
        output_power=output_power,
    )


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
    if family == "fet" and None not in (gate_resistance, input_capacitance, amplitude):
        charging = 2 * math.pi * carrier * input_capacitance * amplitude  # type: ignore[operator]  # none is None here
        return charging**2 * gate_resistance / 2  # type: ignore[operator]
    if family == "tube" and grid_current is not None and amplitude is not None:
        return amplitude * grid_current
    if family == "bipolar" and power_gain is not None:
        return device_rf_power / power_gain
    return None


class Rating(NamedTuple):
    """One rating of the device: what is allowed, what the stage asks, in V, A or W."""

    name: str
    limit: float
    value: float

    @property
    def exceeded(self) -> bool:
        """Whether the stage asks more than the device stands."""
        return self.value > self.limit


def ratings(
    point: OperatingPoint, *, max_voltage: float | None, max_current: float | None, max_dissipation: float | None
) -> Sequence[Rating]:
    """Return the given ratings [V, A, W] against peak voltage, peak current and dissipation."""
    pairs = (
        ("max_voltage", max_voltage, point.peak_voltage),
        ("max_current", max_current, point.peak_current),
        ("max_dissipation", max_dissipation, point.dissipation),
    )
    return tuple(Rating(name, limit, value) for name, limit, value in pairs if limit is not None)
