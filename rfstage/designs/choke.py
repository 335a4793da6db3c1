r"""Chokes: the supply choke against its self-resonance, its current and its resonance; a safety choke at the output.

::

    supply ── second choke ──┬──[ choke ]──┬── device      resonance at f_r: the choke with the capacitors behind it,
                             │             │               characteristic impedance Z = 2π f_r L of the choke
                         [ damper ]        ├──┤├── tank
                             │             │               damper R = Z
                         [ bypass ]

The damper belongs in series with the bypass capacitor at the supply's end of the choke, where it carries no more than
the choke's carrier current: V² R/(2(R² + X²)). Across the choke it would cost V²/(2R), which is (f/f_r)² times as much
and more. The second choke keeps the supply from shorting it.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

from rfstage.constants import SAFE_VOLTAGE
from rfstage.designs.judging import supply_reaches_load
from rfstage.ladder import Branch
from rfstage.load import Load
from rfstage.matching.quality import strongest_resonance_below
from rfstage.parts.ranges import need
from rfstage.quantity import show
from rfstage.stage import CHOKE, Stage
from rfstage.steady import SteadyState

DAMPER_PLACE = "in series with the bypass capacitor at the supply's end of the choke"
DETUNING = 0.01  # of the impedance at the device, that a safety choke may move
FREE_OF_RESONANCE = 2.0  # self-resonance over carrier from where a choke is one (common practice, no source)
BESIDE = 10.0  # at the resonance: damper over bypass, second choke over damper (common practice, no source)
CHOKE_SHARE = 0.25  # of a resonance's energy: with less in the choke, damping it does little
_NUDGE = 1.02  # of the choke, to see how far the resonance follows


class ChokeState(NamedTuple):
    """The supply choke at work.

    ``dc_current`` [A]; ``dc_drop`` [V] and ``dc_loss`` [W] of its resistance; ``rms_current`` [A] with RF;
    ``stored_energy`` [J]; ``self_resonance`` [Hz] and ``apparent_inductance`` [H] at the carrier, both None where no
    self-capacitance was given, the second also where the choke is a capacitor there; ``problems`` in words, empty where
    there are none.
    """

    dc_current: float
    dc_drop: float
    dc_loss: float
    rms_current: float
    stored_energy: float
    self_resonance: float | None
    apparent_inductance: float | None
    problems: tuple[str, ...]


class Damping(NamedTuple):
    """A resistor that damps a choke resonance, in the place `DAMPER_PLACE`.

    ``resistance`` [ohm]; ``bypass`` the least bypass capacitor in series with it [F]; ``second_choke`` the least
    inductance between it and the supply [H]; ``level`` of the strongest resonance left [dB against the carrier], None
    where there is none; ``carrier_loss`` [W] in the resistor, and ``loss_across`` [W] what it would be across the
    choke, both at the carrier voltage the stage has without it.
    """

    resistance: float
    bypass: float
    second_choke: float
    level: float | None
    carrier_loss: float
    loss_across: float


class ChokeResonance(NamedTuple):
    """The strongest resonance below half the carrier.

    ``frequency`` [Hz]; ``level`` [dB against the carrier]; ``choke_share`` [-], the part of its energy that swings
    through the choke, 1 where it is the choke's own; ``damping`` where the resonance stands above the carrier and is
    the choke's, else None.
    """

    frequency: float
    level: float
    choke_share: float
    damping: Damping | None


class SafetyChoke(NamedTuple):
    """Whether an RF choke across the output is advisable, its least inductance [H] or None for any, and why."""

    advisable: bool
    least_inductance: float | None
    reason: str


def check_choke(
    state: SteadyState, *, self_capacitance: float = 0.0, current_rating: float | None = None
) -> ChokeState:
    """Return what the supply choke of a settled stage does, and what is wrong with it.

    Parameters
    ----------
    state : SteadyState
        Of the stage; of a push-pull pair the choke that carries more.
    self_capacitance : float
        Of the choke [F]; 0 where it isn't known, and then nothing is said of self-resonance.
    current_rating : float or None
        What the choke stands, or carries before it saturates [A]; None where it isn't known.

    Raises
    ------
    OutOfRangeError
        If the capacitance is below 0, or the rating not above 0.

    Notes
    -----
    A long choke has more resonances above the first, of its sections in series, which one self-capacitance doesn't
    show: measure it.
    """
    need("self_capacitance", self_capacitance, "F", least=0)
    if current_rating is not None:
        need("current_rating", current_rating, "A", above=0)
    stage, supply = state.stage, state.stage.supply
    stress = next(branch for branch in state.branches if branch.name == CHOKE)
    current = max((share.dc_current for share in state.devices), default=state.dc_current)
    if stage.device.pair == "parallel":
        current = state.dc_current
    problems = []
    if current_rating is not None and stress.rms_current > current_rating:
        problems.append(
            f"the choke carries {show(stress.rms_current, 'A')}, beyond its rating of {show(current_rating, 'A')}"
        )
    resonance = apparent = None
    if self_capacitance > 0:
        resonance = 1 / (2 * math.pi * math.sqrt(supply.choke * self_capacitance))
        ratio = resonance / stage.carrier
        if ratio > 1:
            apparent = supply.choke / (1 - 1 / ratio**2)
        if ratio < FREE_OF_RESONANCE:
            kind = "a coil still, barely" if ratio > 1 else "no coil any more"
            problems.append(
                f"the choke resonates with its own {show(self_capacitance, 'F')} at {show(resonance, 'Hz')}: at the "
                f"carrier it is {kind}; fewer turns, or a winding in sections"
            )
    return ChokeState(
        dc_current=current,
        dc_drop=current * supply.choke_resistance,
        dc_loss=current**2 * supply.choke_resistance,
        rms_current=stress.rms_current,
        stored_energy=supply.choke * current**2 / 2,
        self_resonance=resonance,
        apparent_inductance=apparent,
        problems=tuple(problems),
    )


def choke_resonance(state: SteadyState) -> ChokeResonance | None:
    """Return the strongest resonance below half the carrier of a settled stage, damped where it needs to be.

    Of a push-pull pair that of each half in the odd mode. None where there is no resonance.

    Notes
    -----
    The damping resistor is the characteristic impedance of the resonance, of which a few times either way will do.
    Whether the stage would oscillate there depends on feedback in the device, which isn't modelled.
    """
    stage = _seen_by_the_device(state.stage)
    branches, load, carrier = stage.ladder.branches, stage.load, stage.carrier
    found = strongest_resonance_below(branches, load, carrier)
    if found is None:
        return None
    frequency, level = found
    share = _choke_share(branches, load, carrier, frequency)
    damping = None
    if level > 0 and share >= CHOKE_SHARE:
        damping = _damping(stage, branches, frequency, abs(complex(state.device_voltage[1])))
    return ChokeResonance(frequency, level, share, damping)


def safety_choke(stage: Stage) -> SafetyChoke:
    """Return whether a choke across the output would save people from a failed blocking capacitor, and its least value.

    It lets the supply's current through so that the fuse blows, and must stand that current until then. The least
    inductance moves the impedance at the device by 1 %.

    Examples
    --------
    >>> from rfstage.device import Device
    >>> from rfstage.load import SeriesLoad
    >>> from rfstage.stage import Drive, Supply
    >>> tube = Device(family="tube", transfer_factor=1e-3, exponent=1.5, threshold=-40.0, threshold_softness=1.0,
    ...               knee_voltage=50.0, knee_resistance=100.0)
    >>> parts = (Branch("Cblock", "series", "capacitor", 1e-9), Branch("C1", "shunt", "capacitor", 150e-12),
    ...          Branch("L1", "series", "coil", 15e-6), Branch("C2", "shunt", "capacitor", 1.2e-9))
    >>> stage = Stage(carrier=3.65e6, device=tube, drive=Drive(bias=-60.0, amplitude=80.0), branches=parts,
    ...               supply=Supply(voltage=2000.0, choke=50e-6), load=SeriesLoad(50 + 0j, 3.65e6))
    >>> found = safety_choke(stage)
    >>> found.advisable, round(1e6 * found.least_inductance)
    (True, 63)
    """
    if stage.device.pair == "push-pull":
        return SafetyChoke(
            False, None, "both ends of a push-pull load are alike for direct current: choke each to ground"
        )
    least = _least_across_output(_seen_by_the_device(stage))
    volts = show(stage.supply.voltage, "V")
    if not supply_reaches_load(stage.branches):
        return SafetyChoke(False, least, "the supply doesn't reach the output when one capacitor fails")
    if stage.supply.voltage <= SAFE_VOLTAGE:
        return SafetyChoke(False, least, f"a failed blocking capacitor puts no more than {volts} on the output")
    return SafetyChoke(True, least, f"a failed blocking capacitor would put {volts} on the output")


def _seen_by_the_device(stage: Stage) -> Stage:
    """Return the stage whose ladder one device looks into."""
    if stage.device.pair is None:
        return stage

    from rfstage.steady.pair import half_between, shared_node  # rooms that most runs do without

    return half_between(stage) if stage.device.pair == "push-pull" else shared_node(stage)


def _with_choke(branches: Sequence[Branch], choke: Branch) -> tuple[Branch, ...]:
    return tuple(choke if branch.name == CHOKE else branch for branch in branches)


def _choke_of(branches: Sequence[Branch]) -> Branch:
    return next(branch for branch in branches if branch.name == CHOKE)


def _choke_share(branches: Sequence[Branch], load: Load, carrier: float, frequency: float) -> float:
    """Return the share of a resonance's magnetic energy in the choke [-]: how its frequency follows the inductance.

    d ln f/d ln L is minus half the share, as f goes with one over √L where the choke is all the inductance.
    """
    choke = _choke_of(branches)
    larger = _with_choke(branches, replace(choke, value=choke.value * _NUDGE))
    moved = strongest_resonance_below(larger, load, carrier)
    if moved is None:
        return 0.0
    return min(1.0, max(0.0, -2 * math.log(moved[0] / frequency) / math.log(_NUDGE)))


def _damping(stage: Stage, branches: Sequence[Branch], frequency: float, carrier_peak: float) -> Damping:
    """Return the damper of a resonance, with what is left of it on the stage's own ladder."""
    choke, omega = _choke_of(branches), 2 * math.pi * frequency
    resistance = omega * float(choke.value)
    damped = replace(choke, series_resistance=float(choke.series_resistance or 0.0) + resistance)
    left = strongest_resonance_below(_with_choke(branches, damped), stage.load, stage.carrier)
    through = carrier_peak / abs(complex(damped.impedance(stage.carrier)))
    return Damping(
        resistance=resistance,
        bypass=BESIDE / (omega * resistance),
        second_choke=BESIDE * resistance / omega,
        level=None if left is None else left[1],
        carrier_loss=through**2 * resistance / 2,
        loss_across=carrier_peak**2 / (2 * resistance),
    )


def _least_across_output(stage: Stage) -> float | None:
    """Return the inductance across the load [H] that moves the impedance at the device by `DETUNING`.

    With the chain terms A B C D and the load's admittance Y the device sees (A + B Y)/h, h = C + D Y. A susceptance
    −b more at the load moves that by b/(|h| |h − jDb|), as AD − BC = 1; set to so much of it, b solves a quadratic.
    """
    carrier = stage.carrier
    a, b, c, d = (complex(term) for term in stage.ladder.chain(carrier))
    admittance = 1 / complex(stage.load.impedance(carrier))
    h = c + d * admittance
    k = DETUNING * abs(a + b * admittance)
    square = 1 - k**2 * abs(d) ** 2
    half = k**2 * (h * (-1j * d).conjugate()).real
    if square <= 0:
        return None  # the load is so far from the device that hardly anything across it is felt there
    susceptance = (half + math.sqrt(half**2 + square * k**2 * abs(h) ** 2)) / square
    return 1 / (2 * math.pi * carrier * susceptance)
