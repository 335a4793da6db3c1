"""What can hurt someone, or burn, in a stage: from its own numbers and from what is known of what stands around it.

::

    supply: reservoir, bleeder ── choke: self-capacitance, rating ── stage ── antenna: gain
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import NamedTuple

from rfstage.cautions import Caution, about_resonance, safety
from rfstage.constants import SAFE_VOLTAGE
from rfstage.designs.judging import supply_reaches_load
from rfstage.device import PUSH_PULL
from rfstage.parts.leads import check_short, lead_for
from rfstage.quantity import show
from rfstage.stage import BLOCKING, CHOKE, OUTPUT_CAPACITANCE, Stage
from rfstage.steady import SteadyState

BLEED_TIME = 30.0  # s in which a bleeder that is proposed brings the reservoir down (common practice, no source)
RESISTOR_VOLTS = 500.0  # V: above it a bleeder is several resistors in series (common practice, no source)
CHOKE_JOULES = 1e-3  # J: a choke that holds more draws a spark when its current is broken (common practice, no source)
SHORT = 0.1  # reactance of a blocking capacitor over the resistance it works into (common practice, no source)


class Station(NamedTuple):
    """What stands around a stage; None where it isn't known.

    ``reservoir`` [F] and ``bleeder`` [ohm] of the supply, self-capacitance [F] and rated rms current [A] of the choke,
    gain of the antenna over an isotropic radiator [dB].
    """

    reservoir: float | None = None
    bleeder: float | None = None
    choke_self_capacitance: float | None = None
    choke_max_current: float | None = None
    antenna_gain: float | None = None


def station_of(source: object) -> Station:
    """Return what a job, or anything with attributes of the same names, says of what stands around its stage."""
    return Station(**{name: getattr(source, name) for name in Station._fields})


class Exposed(NamedTuple):
    """The most that parts carry in the open: peak volts and rms amperes, each with the name of its part."""

    volts: float
    volts_of: str
    amperes: float
    amperes_of: str


def most_exposed(stresses: Iterable[tuple[str, float, float]]) -> Exposed:
    """Return the most of name, peak volts and rms amperes of parts; zeros where there are none.

    The device's own capacitance is no part in the open, the choke's amperes are mostly direct current.

    Examples
    --------
    >>> most_exposed([("Lchoke", 20.0, 3.0), ("C1", 20.0, 1.0), ("L1", 25.0, 0.8)])
    Exposed(volts=25.0, volts_of='L1', amperes=1.0, amperes_of='C1')
    """
    parts = [part for part in stresses if part[0] != OUTPUT_CAPACITANCE]
    name, volts, _ = max(parts, key=lambda part: part[1], default=("none", 0.0, 0.0))
    carrier, _, amperes = max(
        (part for part in parts if part[0] != CHOKE), key=lambda part: part[2], default=("none", 0.0, 0.0)
    )
    return Exposed(volts, name, amperes, carrier)


def exposed_when_settled(state: SteadyState) -> Exposed:
    """Return the most exposed parts of a settled stage; a blocking capacitor's volts are the supply's and left out."""
    return most_exposed((b.name, 0.0 if b.name == BLOCKING else b.peak_voltage, b.rms_current) for b in state.branches)


def safety_cautions(
    stage: Stage, *, dc_current: float, exposed: Exposed, power: float, station: Station | None = None
) -> list[Caution]:
    """Return what can hurt someone in a stage of these amperes dc and watts, with what is exposed in it."""
    station = station or Station()
    found = safety(
        family=stage.device.family,
        supply=stage.supply.voltage,
        dc_current=dc_current,
        volts=(exposed.volts, exposed.volts_of),
        amperes=(exposed.amperes, exposed.amperes_of),
        power=power,
        output=_at_the_output(stage),
        carrier=stage.carrier,
    )
    stored = _stored_energy(stage, dc_current, station)
    at = 1 if stage.supply.voltage > SAFE_VOLTAGE else 0  # behind the high voltage that it goes with
    found[at:at] = stored
    if station.antenna_gain is not None and power > 0:
        found.insert(len(found) - 1, _exposure(stage.carrier, power, station.antenna_gain))
    return found


def settled_safety(state: SteadyState, station: Station | None = None) -> list[Caution]:
    """Return what is wrong with choke and blocking capacitor of a settled stage, and what can hurt someone in it."""
    station = station or Station()
    return [
        *choke_cautions(state, station),
        *resonance_cautions(state),
        *_blocking(state),
        *safety_cautions(
            state.stage,
            dc_current=state.dc_current,
            exposed=exposed_when_settled(state),
            power=state.output_power,
            station=station,
        ),
    ]


def choke_cautions(state: SteadyState, station: Station) -> list[Caution]:
    """Return what is wrong with the supply choke of a settled stage, by what is known of it."""
    if station.choke_self_capacitance is None and station.choke_max_current is None:
        return []
    from rfstage.designs.choke import check_choke

    found = check_choke(
        state,
        self_capacitance=station.choke_self_capacitance or 0.0,
        current_rating=station.choke_max_current,
    )
    return [Caution("choke", f"{problem}.") for problem in found.problems]


def resonance_cautions(state: SteadyState) -> list[Caution]:
    """Return the warning of a choke resonance that stands above the carrier's level, and what damps it."""
    from rfstage.designs.choke import CHOKE_SHARE, DAMPER_PLACE, choke_resonance

    found = choke_resonance(state)
    if found is None:
        return []
    cure = ""
    if found.damping is not None:
        d = found.damping
        left = "nothing of it"
        if d.level is not None:
            left = f"it {abs(d.level):.0f} dB {'above' if d.level > 0 else 'below'} the carrier's level"
        cure = (
            f"put {show(d.resistance, 'ohm')} {DAMPER_PLACE} ({show(d.bypass, 'F')} or more), and a second choke of "
            f"{show(d.second_choke, 'H')} or more from there to the supply; that leaves {left} and costs "
            f"{show(d.carrier_loss, 'W')} at the carrier"
        )
    elif found.choke_share < CHOKE_SHARE:
        cure = (
            f"only {100 * found.choke_share:.0f} % of its energy swings through the choke, so that it is damped in the "
            "network, by a lower loaded Q or another network"
        )
    return about_resonance((found.frequency, found.level), cure)


def blocking_cautions(stage: Stage, resistance: float) -> list[Caution]:
    """Return what is wrong with a blocking capacitor and its leads that work into a resistance [ohm]."""
    branch = next((b for b in stage.branches if b.name == BLOCKING and b.kind == "capacitor"), None)
    if branch is None or branch.place != "series":
        return []
    leads = float(branch.lead_inductance) or lead_for(stage.carrier)
    found = check_short(
        float(branch.value), frequency=stage.carrier, allowed_reactance=SHORT * resistance, lead_inductance=leads
    )
    if not found.problem:
        return []
    share = f"a tenth of the {show(resistance, 'ohm')} it works into"
    return [Caution("blocking reactance", f"{BLOCKING} should be a short, {share}: {found.problem}.")]


def _blocking(state: SteadyState) -> list[Caution]:
    device = state.stage.device
    if not state.has_output or device.pair == PUSH_PULL:
        return []
    seen = abs(complex(state.device_voltage[1]) / complex(state.device_current[1]))
    return blocking_cautions(state.stage, seen / (2 if device.pair else 1))


def _at_the_output(stage: Stage) -> str:
    """Return what to do about a failed blocking capacitor in words, or nothing where none would reach the load."""
    if stage.supply.voltage <= SAFE_VOLTAGE or not supply_reaches_load(stage.branches):
        return ""
    from rfstage.designs.choke import safety_choke

    found = safety_choke(stage)
    if not found.advisable:
        return found.reason
    least = "" if found.least_inductance is None else f" of {show(found.least_inductance, 'H')} or more"
    return f"put an RF choke{least} across the output, of wire that outlasts the fuse, so that the fuse blows instead"


def _stored_energy(stage: Stage, dc_current: float, station: Station) -> list[Caution]:
    voltage = stage.supply.voltage
    words = []
    if station.reservoir is not None:
        words.append(_reservoir(station.reservoir, station.bleeder, voltage))
    elif voltage > SAFE_VOLTAGE:
        words.append("give supply.reservoir (--reservoir) for the joules it holds and the bleeder it needs")
    choke = stage.supply.choke * dc_current**2 / (4 if stage.device.pair == PUSH_PULL else 2)
    if choke >= CHOKE_JOULES:
        words.append(
            f"the choke holds {show(choke, 'J')} at {show(dc_current, 'A')}: break its current by the drive, never by "
            "a plug"
        )
    return [Caution("stored energy", f"{'; '.join(words)}.")] if words else []


def _reservoir(capacitance: float, resistance: float | None, voltage: float) -> str:
    """Return what a reservoir [F] holds, and what its bleeder [ohm] does, or which one to fit."""
    from rfstage.parts.bleeder import bleeder, bleeder_for

    safe = show(SAFE_VOLTAGE, "V")
    asked = None
    if voltage > SAFE_VOLTAGE:
        asked = bleeder_for(BLEED_TIME, capacitance=capacitance, voltage=voltage, series="E12")
    held = f"the reservoir of {show(capacitance, 'F')} holds {show(capacitance * voltage**2 / 2, 'J')} at " + (
        show(voltage, "V")
    )
    if resistance is None and asked is None:
        return f"{held}: a short takes that at once; fuse the lead at the supply"
    found = asked if resistance is None else bleeder(resistance, capacitance=capacitance, voltage=voltage)
    assert found is not None
    rated = (
        f"made of resistors that stand {show(found.power_to_stand, 'W')} together"
        if found.power_rating is None
        else f"rated {show(found.power_rating, 'W')} or more"
    )
    if voltage > RESISTOR_VOLTS and found.power_rating is not None:
        rated += ", several in series for the voltage"
    burns = f"it burns {show(found.loss, 'W')}"
    falls = f"reaches {safe} after {show(found.discharge_time, 's')}"
    if resistance is None:
        return f"{held}: fit a bleeder of {show(found.resistance, 'ohm')} {rated}; {burns} and {falls}"
    said = f"{held}. Its bleeder of {show(resistance, 'ohm')} must be {rated}; {burns}"
    if asked is None:
        return said
    if found.discharge_time > BLEED_TIME:
        slow = f", which is long: {show(asked.resistance, 'ohm')} does it in {show(asked.discharge_time, 's')}"
        return f"{said} and {falls}{slow}"
    return f"{said} and {falls}"


def _exposure(carrier: float, power: float, gain: float) -> Caution:
    """Return how far people must keep from the antenna by the far-field estimate, or why there is none."""
    from rfstage.exposure import SOURCE, exposure_distance

    ground = "typical ground"
    general, occupational = (
        exposure_distance(power, frequency=carrier, gain_dbi=gain, population=population, reflection=ground)
        for population in ("general", "occupational")
    )
    sent = f"{show(power, 'W')} into an antenna of {gain:.3g} dBi".replace("-", "−")
    if general.limit is None:
        words = f"no distance for {sent}: {general.reason}"
    elif general.distance is None:  # the occupational limit would be nearer still
        words = f"no distance is given by the general limit of {SOURCE} for {sent}: {general.reason}"
    else:
        near = f"that of the occupational limit lies inside λ/2π = {show(general.near_field, 'm')}"
        if occupational.distance is not None:
            near = f"the occupational limit is met at {show(occupational.distance, 'm')}"
        words = (
            f"with {sent} all the time keep people {show(general.distance, 'm')} away, the far-field estimate over "
            f"{ground} for the general limit of {SOURCE}; {near}. An estimate in the main direction, no evaluation"
        )
    return Caution("exposure", f"{words}. Local rules decide.")
