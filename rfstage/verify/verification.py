"""One verification: a stage's steady state, what was measured, and the verdict on all of it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import NamedTuple

from rfstage.designs.judging import LINE
from rfstage.device import PUSH_PULL
from rfstage.errors import ImpossibleError, InputError
from rfstage.ladder import Branch
from rfstage.limits import Limit
from rfstage.quantity import show_complex, show_orders
from rfstage.stage import OUTPUT_CAPACITANCE, Stage
from rfstage.steady import SteadyState
from rfstage.verify.capture import Analysed, Capture, Channel, analysed, capture_levels
from rfstage.verify.correction import PartVerdict, Setting, best_setting, part_verdicts
from rfstage.verify.currents import CurrentPulse, current_pulse
from rfstage.verify.levels import LevelList, Measured, MeterReadings, Other, Setup, measured_levels, meter_readings
from rfstage.verify.tankfit import AnalyserData, TankFit, tank_fit
from rfstage.verify.verdict import UNDECIDED, OrderVerdict, decide, margin_of, overall

SHOWN = 10  # the highest order that a verdict asks for
NEAR = 10.0  # dB: an order predicted so near its limit must be measured
FAR_POWER = 3.0  # dB: a carrier measured further off the prediction is pointed at
LOST_POWER = 10.0  # dB: further off, the settings are doubted, and a limit that goes by the power with them
REACTIVE = 0.05  # of the resistance: a load with more reactance is no resistive line
AMPERES = "A"


class Asked(NamedTuple):
    """What a verification is to hold to.

    ``limit`` or None; ``decision`` the rule's name; ``setup`` how it was measured; ``shunt`` [ohm] of a current
    channel in volts, or None; ``device_in``: whether the device's output capacitance was in place at the analyser.
    """

    limit: Limit | None
    decision: str
    setup: Setup
    shunt: float | None = None
    device_in: bool = False


class Source(NamedTuple):
    """One measurement file: its name, its kind in words, and for a capture what was found of the channel."""

    name: str
    kind: str
    analysed: Analysed | None = None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Verification:
    """What was measured, predicted and decided.

    Attributes
    ----------
    state : SteadyState
        The prediction.
    asked : Asked
        Limit, decision rule and setup.
    sources : tuple of Source
        The files.
    carrier : float
        As measured [Hz]; the stage's where nothing measured it.
    power, power_measured : float, bool
        Carrier power [W] that the limit was taken for, and whether it was measured or is the prediction's.
    needed : float or None
        Suppression that the limit asks for [dB].
    orders : tuple of OrderVerdict
        Every order measured, by file.
    others : tuple of (Other, str)
        Readings that are no harmonic, with their file.
    missing, near : tuple of int
        Orders not measured, and those of them whose prediction comes near the limit or is none.
    meters : MeterReadings or None
        What power meters make of the measured harmonics.
    pulse : CurrentPulse or None
        Of a current channel.
    tank, part_verdicts, setting : TankFit or None, tuple of PartVerdict, Setting or None
        Of a network-analyser file.
    remarks : tuple of str
        What else was seen, each a sentence.
    verdict : str or None
        Of everything that was asked; None where nothing was.
    """

    state: SteadyState = field(repr=False)
    asked: Asked
    sources: tuple[Source, ...]
    carrier: float
    power: float
    power_measured: bool
    needed: float | None
    orders: tuple[OrderVerdict, ...]
    others: tuple[tuple[Other, str], ...]
    missing: tuple[int, ...]
    near: tuple[int, ...]
    meters: MeterReadings | None
    pulse: CurrentPulse | None
    tank: TankFit | None
    part_verdicts: tuple[PartVerdict, ...]
    setting: Setting | None
    remarks: tuple[str, ...]
    verdict: str | None


Measurement = LevelList | Capture | AnalyserData


def verify(state: SteadyState, measurements: Sequence[Measurement], asked: Asked) -> Verification:
    """Return measured against predicted and against the limit.

    Parameters
    ----------
    state : SteadyState
        The stage's; its load is what stood there when it was measured.
    measurements : sequence
        Level lists, captures, and at most one network-analyser file.
    asked : Asked
        Limit, decision rule and setup.

    Raises
    ------
    InputError
        If a measurement does not belong to this stage, or can't be what it should be.
    ImpossibleError
        For a network-analyser file of a push-pull stage, whose tank has no port to ground.

    Examples
    --------
    >>> import rfstage
    >>> from rfstage.limits import limit_named
    >>> from rfstage.verify.levels import Reading
    >>> state = rfstage.settle(rfstage.load_stage("examples/beacon-as-built.toml"))
    >>> readings = LevelList("list", "dBc", (Reading(14.2e6, -46.0), Reading(21.3e6, -61.0)))
    >>> found = verify(state, [readings], Asked(limit_named("us-amateur"), "guarded", Setup()))
    >>> [(v.measured.order, v.verdict) for v in found.orders], found.verdict
    ([(2, 'pass'), (3, 'pass')], 'pass')
    """
    stage, setup = state.stage, asked.setup
    measured: list[tuple[str, Measured]] = []
    sources, remarks = [], []
    spoilt: set[str] = set()  # files whose levels are the instrument's own
    pulse: CurrentPulse | None = None
    tank: TankFit | None = None
    for one in measurements:
        if isinstance(one, AnalyserData):
            if tank is not None:
                raise InputError(f"{one.name}: a second network-analyser file; give one at a time")
            tank = tank_fit(
                (*_before(stage, asked.device_in), *stage.branches), one, carrier=stage.carrier, load=stage.load
            )
            sources.append(Source(one.name, f"network-analyser file, {('one port', 'two ports')[one.ports - 1]}"))
        elif isinstance(one, LevelList):
            measured.append((one.name, measured_levels(one, carrier=stage.carrier, setup=setup)))
            sources.append(Source(one.name, f"level list in {one.unit}"))
        else:
            line = stage.limit_load or LINE
            currents = [_is_current(one, channel, asked) for channel in one.channels]
            if currents.count(False) > 1:
                raise InputError(
                    f"{one.name}: both channels are in volts; wanted one, at the load (if the second is a current "
                    "across a resistor, give --shunt)"
                )
            for channel, is_current in zip(one.channels, currents, strict=True):
                if is_current:
                    if pulse is not None:
                        raise InputError(f"{one.name}: a second current; give one at a time")
                    pulse, found = _pulse(one, channel, stage, asked)
                    sources.append(Source(one.name, f"current capture, channel {channel.name}", found))
                    if found.clipped:
                        remarks.append(f"channel {channel.name} is clipped: its pulse has lost its crest")
                else:
                    levels, found = capture_levels(
                        one, channel, carrier=stage.carrier, load=stage.load, line=line, setup=setup
                    )
                    measured.append((one.name, levels))
                    if found.clipped:
                        spoilt.add(one.name)
                    sources.append(Source(one.name, f"voltage capture, channel {channel.name}", found))
    clipped = any(s.analysed is not None and s.analysed.clipped for s in sources)
    powers = [m.power for _, m in measured if m.power is not None]
    power = powers[0] if powers else state.output_power
    carrier = measured[0][1].carrier if measured else stage.carrier
    off = 10 * math.log10(power / state.output_power) if powers and power > 0 and state.has_output else 0.0
    if abs(off) > FAR_POWER:
        remarks.append(
            f"the carrier's power is {abs(off):.3g} dB {'above' if off > 0 else 'below'} the predicted: are "
            "attenuation, sampler and probe told as they were?"
        )
    needed = asked.limit.suppression(carrier, power) if asked.limit is not None and power > 0 else None
    limit = None if needed is None else -needed
    predicted = {h.order: h.level for h in state.harmonics}
    orders = tuple(
        OrderVerdict(
            level,
            predicted.get(level.order),
            limit,
            margin_of(level, limit),
            None if limit is None else UNDECIDED if name in spoilt else decide(level, limit, decision=asked.decision),
            name,
        )
        for name, m in measured
        for level in m.levels
    )
    others = tuple((other, name) for name, m in measured for other in m.others)
    seen = {v.measured.order for v in orders}
    missing = tuple(n for n in range(2, SHOWN + 1) if n not in seen) if measured else ()
    near = tuple(n for n in missing if limit is not None and _near(predicted.get(n), limit))
    for _, m in measured:
        remarks += m.remarks
        if m.uncorrected:
            remarks.append(f"orders {show_orders(m.uncorrected)} lie beyond the sampler's response and are left out")
    if limit is not None and not measured:
        remarks.append("the limit is not judged: no levels were measured")
    z = complex(stage.load.impedance(carrier))
    if limit is not None and measured and abs(z.imag) > REACTIVE * z.real:
        remarks.append(
            f"the stage's load is {show_complex(z)}: a limit is meant in a resistive line, and a reactive load flatters"
        )
    parts = part_verdicts(tank.parts, stage.part_data, decision=asked.decision) if tank else ()
    # where the limit goes by the power, a power so far off may be a setting not told, and the limit wrong with it
    strict = (
        asked.limit.suppression(carrier, state.output_power) if asked.limit is not None and state.has_output else None
    )
    lenient = needed is not None and strict is not None and strict > needed and abs(off) > LOST_POWER
    loose = limit is not None and (
        bool(near) or clipped or lenient or any(o.level > limit for o, _ in others) or not orders
    )
    verdicts = [v.verdict for v in orders] + [p.verdict for p in parts]
    if loose and measured:
        verdicts.append(UNDECIDED)
    return Verification(
        state=state,
        asked=asked,
        sources=tuple(sources),
        carrier=carrier,
        power=power,
        power_measured=bool(powers),
        needed=needed,
        orders=orders,
        others=others,
        missing=missing,
        near=near,
        meters=_meters(orders),
        pulse=pulse,
        tank=tank,
        part_verdicts=parts,
        setting=None if tank is None else _setting(stage, tank, asked.device_in),
        remarks=tuple(dict.fromkeys(remarks)),
        verdict=overall(verdicts),
    )


def _is_current(capture: Capture, channel: Channel, asked: Asked) -> bool:
    """Return whether a channel is a current: in amperes, or the last one in volts where a shunt is given."""
    return channel.unit == AMPERES or (asked.shunt is not None and channel is capture.channels[-1])


def _near(predicted: float | None, limit: float) -> bool:
    return predicted is None or predicted > limit - NEAR


def _meters(orders: Sequence[OrderVerdict]) -> MeterReadings | None:
    """Return what meters make of the orders that were told, of the first file with any."""
    first = next((v.source for v in orders if v.measured.level is not None), None)
    levels = [v.measured.level for v in orders if v.source == first and v.measured.level is not None]
    if not levels or sum(10 ** (level / 20) for level in levels) >= 1:
        return None
    return meter_readings(levels)


def _pulse(capture: Capture, channel: Channel, stage: Stage, asked: Asked) -> tuple[CurrentPulse, Analysed]:
    found = analysed(capture, channel, carrier=stage.carrier, distortion=asked.setup.distortion, both=False)
    scale = 1.0 if channel.unit == AMPERES or asked.shunt is None else 1 / asked.shunt
    pulse = current_pulse(channel, capture.interval, found.fit, exponent=stage.device.exponent, scale=scale)
    return pulse, found


def _before(stage: Stage, device_in: bool) -> tuple[Branch, ...]:
    """Return what stands before the branches at the analyser: the choke, and the device's capacitance if it is in."""
    if stage.device.pair == PUSH_PULL:
        raise ImpossibleError(
            "a push-pull stage's tank stands between two outputs and has no port to ground: measure its parts by "
            "themselves"
        )
    choke = stage.feed[-1]
    if not device_in:
        return (choke,)
    across = _across(stage)
    if not across:
        raise InputError(
            "--device in: the stage file gives no device.output_capacitance; give it, or take the device out"
        )
    return (*across, choke)


def _across(stage: Stage) -> tuple[Branch, ...]:
    """Return the output capacitance of the device, or of both at one node, or nothing."""
    devices = 1 if stage.device.pair is None else 2
    capacitance = devices * stage.device.output_capacitance
    return (Branch(OUTPUT_CAPACITANCE, "shunt", "capacitor", capacitance, origin="device"),) if capacitance else ()


def _setting(stage: Stage, tank: TankFit, device_in: bool) -> Setting | None:
    """Return the trimmer's setting that brings the tank back, seen from the device with its own capacitance."""
    return best_setting(
        tank.branches,
        wanted=(*_before(stage, device_in), *stage.branches),
        before=() if device_in else _across(stage),
        data=stage.part_data,
        carrier=stage.carrier,
        load=stage.load,
    )
