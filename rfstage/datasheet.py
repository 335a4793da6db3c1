"""The device's parameters from what a data sheet gives.

======================================== ======================================================
a data sheet gives                       gives here
======================================== ======================================================
transconductance at a current            transfer factor and threshold: `transfer_from_transconductance`
peak current at a peak control voltage   transfer factor: `transfer_from_peak`
on-resistance at a current               knee resistance: `knee_from_on_resistance`
saturation voltage, with the overdrive   knee resistance: `knee_from_saturation`
a point on a tube's diode line           the same, the flat part being the overdriven current
output capacitance at two voltages       a junction capacitance: `junction_from_two_points`
======================================== ======================================================

Each inverts one line of the law in `rfstage.device`, so that the law passes through the given point.
"""

from __future__ import annotations

import math

from rfstage.device import JunctionCapacitance
from rfstage.errors import OutOfRangeError

SILICON_POTENTIAL = 0.8  # V (common practice, no source)


def transfer_from_transconductance(
    transconductance: float, *, current: float, control_voltage: float, exponent: float = 1.0
) -> tuple[float, float]:
    """Return transfer factor [A/V^exponent] and threshold [V] from the slope at one point.

    Parameters
    ----------
    transconductance : float
        Slope there [S], above 0.
    current, control_voltage : float
        Output current [A], above 0, and control voltage [V] where it holds.
    exponent : float
        Power law [-], in [1, 3].

    Raises
    ------
    OutOfRangeError
        If the slope or the current is not above 0, or the exponent out of range.

    Examples
    --------
    >>> transfer_from_transconductance(2.0, current=4.0, control_voltage=5.0)
    (2.0, 3.0)
    """
    _above_zero(transconductance=transconductance, current=current)
    _check_exponent(exponent)
    above = exponent * current / transconductance
    return current / above**exponent, control_voltage - above


def transfer_from_peak(
    peak_current: float, *, control_voltage: float, threshold: float, exponent: float = 1.0
) -> float:
    """Return the transfer factor [A/V^exponent] that gives a peak current [A] at a control voltage [V].

    Raises
    ------
    OutOfRangeError
        If the current is not above 0, the control voltage not above the threshold [V], or the exponent out of
        range.

    Examples
    --------
    >>> transfer_from_peak(1.2, control_voltage=20.0, threshold=-40.0, exponent=1.5)
    0.0025819888974716113
    """
    _above_zero(peak_current=peak_current)
    _check_exponent(exponent)
    if not control_voltage > threshold:
        raise OutOfRangeError("control_voltage", control_voltage, f"above the threshold of {threshold} V")
    return float(peak_current / (control_voltage - threshold) ** exponent)


def knee_from_on_resistance(on_resistance: float, *, current: float, knee_voltage: float) -> float:
    """Return the knee resistance [ohm] of a device whose on-resistance [ohm] is known at a current [A].

    ``knee_voltage`` [V] is the constant part of the knee; 0.5 % of the supply is usual.

    Raises
    ------
    OutOfRangeError
        If a value is not above 0, or the constant part alone is more than the drop.

    Examples
    --------
    >>> round(knee_from_on_resistance(0.14, current=10.0, knee_voltage=0.25), 6)
    0.115
    """
    _above_zero(on_resistance=on_resistance, current=current, knee_voltage=knee_voltage)
    return _knee_resistance(on_resistance * current, current, knee_voltage)


def knee_from_saturation(voltage: float, *, current: float, flat_current: float, knee_voltage: float) -> float:
    """Return the knee resistance [ohm] from a point in saturation, or on a tube's diode line.

    Parameters
    ----------
    voltage, current : float
        Output voltage [V] and current [A] of the point.
    flat_current : float
        What the device would carry there with voltage to spare [A]: the current times the overdrive factor,
        or the flat part of a tube's characteristic at that grid voltage. Above ``current``.
    knee_voltage : float
        Constant part of the knee [V].

    Raises
    ------
    OutOfRangeError
        If a value is not above 0, the flat current not above the current, or the constant part alone is more
        than the knee.

    Examples
    --------
    >>> resistance = knee_from_saturation(0.6, current=5.0, flat_current=10.0, knee_voltage=0.1)
    >>> round(10.0 * math.tanh(0.6 / (0.1 + resistance * 10.0)), 9)
    5.0
    """
    _above_zero(voltage=voltage, current=current, knee_voltage=knee_voltage)
    if not flat_current > current:
        raise OutOfRangeError("flat_current", flat_current, f"above the current of {current} A")
    return _knee_resistance(voltage / math.atanh(current / flat_current), flat_current, knee_voltage)


def junction_from_two_points(
    capacitance: float,
    voltage: float,
    *,
    second_capacitance: float,
    second_voltage: float,
    potential: float = SILICON_POTENTIAL,
) -> JunctionCapacitance:
    """Return the junction capacitance that passes through two points.

    Parameters
    ----------
    capacitance, second_capacitance : float
        Capacitances [F]; that at the higher voltage is the smaller.
    voltage, second_voltage : float
        Where they hold [V], 0 or more.
    potential : float
        Built-in potential [V].

    Raises
    ------
    OutOfRangeError
        If no grading between 0 and 1 joins the points.

    Examples
    --------
    >>> c = junction_from_two_points(400e-12, 0.0, second_capacitance=100e-12, second_voltage=12.0)
    >>> round(c.grading, 6), c.at_zero
    (0.5, 4e-10)
    """
    _above_zero(capacitance=capacitance, second_capacitance=second_capacitance, potential=potential)
    if min(voltage, second_voltage) < 0 or voltage == second_voltage:
        raise OutOfRangeError("voltage", (voltage, second_voltage), "0 V or more, and two different ones")
    span = math.log((second_voltage + potential) / (voltage + potential))
    grading = math.log(capacitance / second_capacitance) / span
    if not 0 < grading < 1:
        raise OutOfRangeError(
            "grading", f"{grading:.3g}", "between 0 and 1", "is the capacitance at the higher voltage the smaller one?"
        )
    return JunctionCapacitance(
        at_zero=capacitance * (1 + voltage / potential) ** grading, potential=potential, grading=grading
    )


def _knee_resistance(knee: float, current: float, knee_voltage: float) -> float:
    if not knee > knee_voltage:
        raise OutOfRangeError("knee_voltage", knee_voltage, f"below the knee of {knee:.4g} V at this current")
    return (knee - knee_voltage) / current


def _above_zero(**values: float) -> None:
    for name, value in values.items():
        if not (value > 0 and math.isfinite(value)):
            raise OutOfRangeError(name, value, "above 0")


def _check_exponent(exponent: float) -> None:
    if not 1 <= exponent <= 3:
        raise OutOfRangeError("exponent", exponent, "from 1 to 3")
