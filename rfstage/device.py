"""The device by its data: transfer, knee, capacitances, ratings.

::

    s   = softened max(v_control − threshold + v/mu, 0)         one curve with an exponential foot
    i0  = transfer_factor · s^exponent                          what the device would give with voltage to spare
    v_k = knee_voltage + knee_resistance · i0                   where it runs out of voltage
    i   = i0 tanh(v/v_k)                                        both ways for a FET, one way otherwise

The law in numbers is in `rfstage.devicelaw`. Values outside their range raise `OutOfRangeError` here, so
that no law is ever evaluated with them.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from rfstage.errors import OutOfRangeError

FAMILIES = ("bipolar", "fet", "tube")
PUSH_PULL, PARALLEL = "push-pull", "parallel"
PAIRS = (PUSH_PULL, PARALLEL)


def _need(name: str, value: float, need: str, *, holds: bool, hint: str = "") -> None:
    if not (holds and math.isfinite(value)):
        raise OutOfRangeError(name, value, need, hint)


@dataclass(frozen=True, slots=True, kw_only=True)
class JunctionCapacitance:
    """A capacitance that falls with voltage: ``at_zero`` [F], ``potential`` [V], ``grading`` [-] in [0, 1)."""

    at_zero: float
    potential: float
    grading: float

    def __post_init__(self) -> None:
        _need("junction_capacitance.at_zero", self.at_zero, "0 F or more", holds=self.at_zero >= 0)
        _need("junction_capacitance.potential", self.potential, "above 0 V", holds=self.potential > 0)
        _need("junction_capacitance.grading", self.grading, "from 0 to below 1", holds=0 <= self.grading < 1)


@dataclass(frozen=True, slots=True, kw_only=True)
class ReverseConduction:
    """A diode across the output: ``conductance`` [S] beyond ``threshold`` [V], corner ``softness`` [V]."""

    conductance: float
    threshold: float
    softness: float

    def __post_init__(self) -> None:
        _need("reverse_conduction.conductance", self.conductance, "0 S or more", holds=self.conductance >= 0)
        _need("reverse_conduction.threshold", self.threshold, "0 V or more", holds=self.threshold >= 0)
        _need("reverse_conduction.softness", self.softness, "0 V or more", holds=self.softness >= 0)


@dataclass(frozen=True, slots=True, kw_only=True)
class Device:
    """One device in SI units; a tube's current is the space current.

    ``family`` is ``"bipolar"``, ``"fet"`` or ``"tube"``; ``transfer_factor`` is in A/V^exponent;
    ``threshold``, ``threshold_softness`` and ``knee_voltage`` in V; ``knee_resistance`` in ohm;
    ``amplification_factor`` (mu of a triode) a ratio or None; ``output_capacitance`` in F; the ratings
    ``max_voltage``, ``max_current`` and ``max_dissipation`` in V, A and W, or None.

    ``pair`` is None for a single device, or ``"push-pull"`` or ``"parallel"`` for two of them; every other number is
    still that of one. ``imbalance`` d [-] is the relative difference of their transfer factors K: the first has
    K (1 + d/2), the second K (1 − d/2).

    Raises
    ------
    OutOfRangeError
        If a value is outside its range: the transfer factor and the knee voltage are above 0, the exponent
        is from 1 to 3, a softness, resistance or capacitance is 0 or more, the imbalance from 0 to below 2, and
        0 where there is no pair.
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
    pair: str | None = None
    imbalance: float = 0.0

    def __post_init__(self) -> None:
        if self.family not in FAMILIES:
            raise OutOfRangeError("family", self.family, "bipolar, fet or tube")
        _need("transfer_factor", self.transfer_factor, "above 0", holds=self.transfer_factor > 0)
        _need("exponent", self.exponent, "from 1 to 3", holds=1 <= self.exponent <= 3)
        _need("threshold", self.threshold, "finite", holds=True)
        _need("threshold_softness", self.threshold_softness, "0 V or more", holds=self.threshold_softness >= 0)
        _need(
            "knee_voltage",
            self.knee_voltage,
            "above 0 V",
            holds=self.knee_voltage > 0,
            hint="0.5 % of the supply will do; no device saturates at zero volts",
        )
        _need("knee_resistance", self.knee_resistance, "0 ohm or more", holds=self.knee_resistance >= 0)
        _need("output_capacitance", self.output_capacitance, "0 F or more", holds=self.output_capacitance >= 0)
        if self.amplification_factor is not None:
            _need(
                "amplification_factor",
                self.amplification_factor,
                "above 0",
                holds=self.amplification_factor > 0,
                hint="leave it out for none",
            )
        if self.pair is None:
            _need("imbalance", self.imbalance, "0 where there is no pair", holds=self.imbalance == 0)
        elif self.pair not in PAIRS:
            raise OutOfRangeError("pair", self.pair, " or ".join(PAIRS))
        _need("imbalance", self.imbalance, "from 0 to below 2", holds=0 <= self.imbalance < 2)


def knee_from_lowest_voltage(lowest: float, peak_current: float, supply: float) -> tuple[float, float]:
    """Return knee voltage [V] and knee resistance [ohm] that suit a lowest output voltage [V].

    The knee at the peak current [A] is a third of the lowest voltage, half of it constant and half
    resistive: with the harmonics shorted the settled power is then 0.2 % below the textbook's. It is never
    below 0.5 % of the supply [V], since no device saturates at zero volts.
    """
    at_peak = max(lowest / 3, 0.005 * supply)
    return at_peak / 2, at_peak / 2 / peak_current
