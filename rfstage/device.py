"""The device by its data: transfer, knee, capacitances, ratings.

::

    s   = softened max(v_control − threshold + v/mu, 0)         one curve with an exponential foot
    i0  = transfer_factor · s^exponent                          what the device would give with voltage to spare
    v_k = knee_voltage + knee_resistance · i0                   where it runs out of voltage
    i   = i0 tanh(v/v_k)                                        both ways for a FET, one way otherwise
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, kw_only=True)
class JunctionCapacitance:
    """A capacitance that falls with voltage: ``at_zero`` [F], ``potential`` [V], ``grading`` [-]."""

    at_zero: float
    potential: float
    grading: float


@dataclass(frozen=True, slots=True, kw_only=True)
class ReverseConduction:
    """A diode across the output: ``conductance`` [S] beyond ``threshold`` [V], corner ``softness`` [V]."""

    conductance: float
    threshold: float
    softness: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Device:
    """One device in SI units; a tube's current is the space current.

    ``family`` is ``"bipolar"``, ``"fet"`` or ``"tube"``; ``transfer_factor`` is in A/V^exponent;
    ``threshold``, ``threshold_softness`` and ``knee_voltage`` in V; ``knee_resistance`` in ohm;
    ``amplification_factor`` (mu of a triode) a ratio or None; ``output_capacitance`` in F; the ratings
    ``max_voltage``, ``max_current`` and ``max_dissipation`` in V, A and W, or None.
    """

    family: str
    transfer_factor: float
    exponent: float
    threshold: float
    threshold_softness: float
    knee_voltage: float
    knee_resistance: float
    amplification_factor: float | None = None
    output_capacitance: float = 0.0
    junction_capacitance: JunctionCapacitance | None = None
    reverse_conduction: ReverseConduction | None = None
    max_voltage: float | None = None
    max_current: float | None = None
    max_dissipation: float | None = None


def knee_from_lowest_voltage(lowest: float, peak_current: float, supply: float) -> tuple[float, float]:
    """Return knee voltage [V] and knee resistance [ohm] that suit a lowest output voltage [V].

    The knee at the peak current [A] is a third of the lowest voltage, half of it constant and half
    resistive: with the harmonics shorted the settled power is then 0.2 % below the textbook's. It is never
    below 0.5 % of the supply [V], since no device saturates at zero volts.
    """
    at_peak = max(lowest / 3, 0.005 * supply)
    return at_peak / 2, at_peak / 2 / peak_current
