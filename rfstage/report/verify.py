"""The page of a verification: the verdict first, then orders, other readings, meters, current, tank, what was taken."""

from __future__ import annotations

from rich.text import Text

from rfstage.fields import plain
from rfstage.quantity import show, show_orders
from rfstage.report.judged import signed
from rfstage.report.page import Cell, Look, columns, heading, note
from rfstage.verify.correction import PartVerdict, worst_part
from rfstage.verify.currents import expected_ratios
from rfstage.verify.levels import USUAL_UNCERTAINTY
from rfstage.verify.tankfit import PartEstimate, TankFit
from rfstage.verify.verdict import DECISIONS, FAIL, PASS, UNDECIDED, OrderVerdict
from rfstage.verify.verification import NEAR, Verification

FAR = 6.0  # dB: a level further off its prediction is pointed at
LOSSY = 1.5  # times the nominal loss: a part with more is pointed at
OTHERS = 12  # readings listed that are no harmonic
_STYLE = {PASS: "bold green", FAIL: "bold red", UNDECIDED: "bold yellow", None: ""}
_UNIT = {"coil": "H", "capacitor": "F"}


def verify_page(found: Verification, look: Look) -> list[Text]:
    """Return the page of a verification."""
    stage = found.state.stage
    lines = note(
        look, f"{show(stage.carrier, 'Hz', 5)} stage, measured against its steady state", style="bold", indent=0
    )
    lines += _verdict(found, look)
    for remark in found.remarks:
        lines += note(look, f"! {remark}", style="bold red", hanging=2)
    if found.orders:
        lines += heading(look, "Harmonics") + _orders(found, look)
    if found.others:
        lines += heading(look, "No harmonics of this carrier") + _others(found, look)
    if found.meters is not None:
        lines += heading(look, "What power meters read") + _meters(found, look)
    if found.pulse is not None:
        lines += heading(look, "Current pulse") + _pulse(found, look)
    if found.tank is not None:
        lines += heading(look, "Tank") + _tank(found, found.tank, look)
    return lines + heading(look, "What was taken") + _taken(found, look)


def _verdict(found: Verification, look: Look) -> list[Text]:
    limit = found.asked.limit
    words = {
        PASS: "PASS",
        FAIL: "FAIL",
        UNDECIDED: "UNDECIDED",
        None: "No verdict: no limit and no tolerance is asked for",
    }[found.verdict]
    lines = note(look, words, style=_STYLE[found.verdict])
    if found.power_measured:
        lines += note(
            look,
            f"Carrier at {show(found.carrier, 'Hz', 6)}: {show(found.power, 'W')} measured, "
            f"{show(found.state.output_power, 'W')} predicted.",
        )
    if limit is not None:
        where = f"limit {limit.name} ({limit.source}; {limit.conditions})"
        measured = "measured" if found.power_measured else "predicted, none was measured"
        power = f"at {show(found.power, 'W')} of carrier ({measured})"
        if found.needed is None:
            lines += note(look, f"{where}: {limit.silence(found.carrier, found.power)}, {power}.")
        else:
            lines += note(look, f"{where}: {found.needed:.1f} dB below the carrier {power}.")
    if found.verdict is not None:
        lines += note(look, f"Decided by {DECISIONS[found.asked.decision]}.")
    if found.near:
        lines += note(
            look,
            f"Not measured, and predicted within {NEAR:g} dB of the limit or not at all: order{_s(found.near)} "
            f"{show_orders(found.near)}. Measure them.",
            style="bold yellow",
        )
    return lines


def _s(orders: tuple[int, ...]) -> str:
    return "s" if len(orders) > 1 else ""


def _level(decibels: float | None) -> str:
    return "none" if decibels is None else f"{decibels:.1f}".replace("-", "−")


def _orders(found: Verification, look: Look) -> list[Text]:
    judged = found.needed is not None
    titles = ["n", "frequency", "measured", "±", "predicted", *(("limit", "margin", "verdict") if judged else ())]
    rows = [[Cell(t, "dim", right=True) for t in titles]]
    for v in found.orders:
        rows.append(_order(v, judged))
    lines = columns(look, rows)
    if any(v.measured.level is None for v in found.orders):
        lines += note(look, "below: not told from noise, steps and distortion of the instrument.", style="dim")
    if len({v.source for v in found.orders}) > 1:
        lines += note(
            look, f"In turn from {', '.join(dict.fromkeys(plain(v.source) for v in found.orders))}.", style="dim"
        )
    strange = tuple(
        v.measured.order
        for v in found.orders
        if v.measured.level is not None and v.predicted is not None and abs(v.measured.level - v.predicted) > FAR
    )
    if strange:
        lines += note(
            look,
            f"More than {FAR:g} dB off the prediction: order{_s(strange)} {show_orders(sorted(set(strange)))}. Strays, "
            "the load at that frequency, or a part that is off.",
        )
    if found.missing:
        lines += note(look, f"Not measured: order{_s(found.missing)} {show_orders(found.missing)}.", style="dim")
    return lines


def _order(v: OrderVerdict, judged: bool) -> list[Cell]:
    m = v.measured
    shown = f"below {_level(m.floor)}" if m.level is None else _level(m.level)
    row = [
        Cell(str(m.order), right=True),
        Cell(show(m.frequency, "Hz", 4), right=True),
        Cell(shown, "bold", right=True),
        Cell("" if m.uncertainty is None else f"{m.uncertainty:.1f}", right=True),
        Cell(_level(v.predicted), right=True),
    ]
    if judged:
        row += [
            Cell(_level(v.limit), right=True),
            Cell("none" if v.margin is None else signed(v.margin), right=True),
            Cell(v.verdict or "none", _STYLE[v.verdict], right=True),
        ]
    return row


def _others(found: Verification, look: Look) -> list[Text]:
    limit = None if found.needed is None else -found.needed
    rows = [[Cell(t, "dim", right=True) for t in ("frequency", "dBc", "carriers")] + [Cell("", "dim")]]
    for other, _ in found.others[:OTHERS]:
        above = limit is not None and other.level > limit
        rows.append(
            [
                Cell(show(other.frequency, "Hz", 5), right=True),
                Cell(_level(other.level), right=True),
                Cell(f"{other.frequency / found.carrier:.4f}", right=True),
                Cell("above the limit" if above else "", "bold yellow"),
            ]
        )
    lines = columns(look, rows)
    if len(found.others) > OTHERS:
        lines += note(look, f"and {len(found.others) - OTHERS} more", style="dim")
    return lines + note(
        look,
        "Whether they are the stage's own is not told here: look again with it switched off. One above the limit "
        "leaves the verdict undecided.",
        style="dim",
    )


def _meters(found: Verification, look: Look) -> list[Text]:
    meters = found.meters
    assert meters is not None

    def against(decibels: float) -> str:
        return f"{signed(decibels)} dB"

    return note(
        look,
        f"Against the carrier alone, with the harmonics measured: a thermal meter {against(meters.thermal)}, since it "
        f"takes in their power; a peak detector marked for a sine from {against(meters.peak_least)} to "
        f"{against(meters.peak_most)}, by their phases: it reads a crest, no mean power.",
    )


def _pulse(found: Verification, look: Look) -> list[Text]:
    pulse, state = found.pulse, found.state
    assert pulse is not None
    by_ratio = "none" if pulse.angle_from_ratio_deg is None else f"{pulse.angle_from_ratio_deg:.1f}°"
    figures = [
        ("", "measured", "predicted"),
        (
            "conduction angle",
            f"{pulse.conduction_angle_deg:.1f}° ± {2 * pulse.angle_error_deg:.1f}°",
            f"{state.conduction_angle_deg:.1f}°",
        ),
        ("the same, from fundamental over dc", by_ratio, ""),
        ("peak current", show(pulse.peak, "A"), show(state.peak_current, "A")),
        ("dc current", show(pulse.mean, "A"), show(state.dc_current, "A")),
        ("off the law's pulse, of the peak", f"{100 * pulse.shape_misfit:.1f} %", ""),
    ]
    table = [
        [Cell(row[0], "dim"), *(Cell(c, "" if k else "dim", right=True) for c in row[1:])]
        for k, row in enumerate(figures)
    ]
    law = expected_ratios(pulse.conduction_angle_deg, state.stage.device.exponent)
    rows = [
        [Cell("n", "dim", right=True), *(Cell(str(k + 2), "dim", right=True) for k in range(len(pulse.ratios[:6])))]
    ]
    for title, ratios in (("measured, of the fundamental", pulse.ratios), ("law's pulse of that angle", law)):
        rows.append([Cell(title, "dim"), *(Cell(f"{100 * r:.1f} %", right=True) for r in ratios[: len(rows[0]) - 1])])
    lines = columns(look, table) + columns(look, rows)
    return lines + note(
        look,
        "The angle is read from the flanks below half of the crest. A capacitance between the probe and the device "
        "adds its own current; saturation flattens the crest, and the two angles then differ.",
        style="dim",
    )


def _tank(found: Verification, tank: TankFit, look: Look) -> list[Text]:
    verdicts = {v.name: v for v in found.part_verdicts}
    titles = ("part", "nominal", "measured", "± k=2", "off", "Q", "measured Q", "")
    rows = [[Cell(titles[0], "dim"), *(Cell(t, "dim", right=True) for t in titles[1:-1]), Cell("", "dim")]]
    rows += [_part(part, verdicts.get(part.name)) for part in tank.parts]
    lines = columns(look, rows)
    worst = worst_part(found.part_verdicts)
    if worst is not None:
        lines += note(
            look,
            f"{worst.name} is off: {signed(worst.off)} % where {worst.tolerance:g} % is "
            f"{'its tolerance' if worst.stated else 'allowed (common practice; it states no tolerance)'}.",
            style="bold red",
        )
    lossy = [part for part in tank.parts if _lossy(part)]
    for part in lossy:
        lines += note(
            look,
            f"{part.name} loses more than its file says: Q {part.q_estimated:.3g} where {part.q_nominal:.4g} is given.",
            style="bold red",
        )
    open_ones = [v for v in found.part_verdicts if not v.beyond and abs(v.off) > v.tolerance]
    for v in open_ones:
        lines += note(
            look,
            f"{v.name} may be off: {signed(v.off)} % ± {v.uncertainty:.2g} % where {v.tolerance:g} % is allowed.",
            style="bold yellow",
        )
    if worst is None and not lossy and not open_ones and found.part_verdicts:
        lines += note(look, "No part that the data tell is off.", style="bold green")
    setting = found.setting
    if setting is not None:
        unit = _UNIT[setting.kind]
        how = (
            "brings the impedance at the device back"
            if setting.after < 0.1
            else "is the best that one trimmer does; more is wanted"
        )
        lines += note(
            look,
            f"Set {setting.name} from {show(setting.found, unit)} to {show(setting.wanted, unit)}: that {how} "
            f"(reflection against the wanted impedance from {setting.before:.2f} to {setting.after:.2f}).",
            style="bold",
        )
    untold = [p.name for p in tank.parts if p.estimated is None]
    together = [name for group in tank.together for name in group]
    for group in tank.together:
        lines += note(look, f"The data can't tell apart: {', '.join(group)}. Only together do they show.")
    alone = [name for name in untold if name not in together]
    if alone:
        lines += note(look, f"The data say too little of: {', '.join(alone)}. Measure nearer to where they count.")
    if tank.exchanged:
        lines += note(
            look,
            "The ports look exchanged: port 1 belongs at the device's place, port 2 at the load's.",
            style="bold red",
        )
    if tank.systematic:
        lines += note(
            look,
            f"More is left than noise (rms {tank.noise:.2g} where point to point shows {tank.seen_noise:.2g}): "
            "the tank holds something that the stage file lacks, such as leads. The errors above are then too small.",
            style="bold yellow",
        )
    return lines


def _lossy(part: PartEstimate) -> bool:
    """Return whether a part's loss is surely (k = 2) above `LOSSY` times its nominal loss."""
    if part.q_estimated is None or part.q_standard_error is None or part.q_nominal is None:
        return False
    loss, error = 1 / part.q_estimated, part.q_standard_error / part.q_estimated**2
    return loss - 2 * error > LOSSY / part.q_nominal


def _part(part: PartEstimate, verdict: PartVerdict | None) -> list[Cell]:
    unit = _UNIT[part.kind]
    if part.estimated is None or part.standard_error is None or verdict is None:
        told = [Cell("not told", right=True), Cell("", right=True), Cell("", right=True)]
    else:
        told = [
            Cell(show(part.estimated, unit, 4), "bold", right=True),
            Cell(show(2 * part.standard_error, unit, 2), right=True),
            Cell(f"{signed(verdict.off)} %", "bold red" if verdict.beyond else "", right=True),
        ]
    q = "not told" if part.q_estimated is None else f"{part.q_estimated:.3g}"
    return [
        Cell(part.name, "bold"),
        Cell(show(part.nominal, unit), right=True),
        *told,
        Cell("none" if part.q_nominal is None else f"{part.q_nominal:.4g}", right=True),
        Cell(q, right=True),
        Cell((verdict.verdict or "") if verdict else "", _STYLE[verdict.verdict if verdict else None]),
    ]


def _taken(found: Verification, look: Look) -> list[Text]:
    setup = found.asked.setup
    lines = []
    for source in found.sources:
        words = f"{plain(source.name)}: {source.kind}"
        if source.analysed is not None:
            fit, steps = source.analysed.fit, source.analysed.steps
            words += (
                f"; {fit.samples} samples, {fit.periods:.4g} periods, carrier {show(fit.frequency, 'Hz', 8)}; "
                + (f"{steps.bits} bits seen" if steps.bits else "no steps seen")
                + f", instrument's own harmonics taken {source.analysed.distortion:g} dB below the carrier"
            )
        lines += note(look, words, hanging=2)
    usual = ", common practice" if setup.uncertainty == USUAL_UNCERTAINTY else ""
    words = f"uncertainty of a level {setup.uncertainty:g} dB (k = 2{usual})"
    if setup.attenuation:
        words += f"; attenuation {setup.attenuation:g} dB"
    if setup.sampler is not None:
        words += f"; sampler {plain(setup.sampler.name)}"
    if setup.probe != 1:
        words += f"; probe {setup.probe:g}"
    if found.asked.shunt is not None:
        words += f"; shunt {show(found.asked.shunt, 'ohm')}"
    lines += note(look, words, hanging=2)
    if any(s.analysed is not None for s in found.sources) and setup.distortion is None:
        lines += note(
            look,
            "The instrument's distortion is the usual one of its bits (common practice, no source): it is coherent "
            "with the carrier and no averaging lessens it. Better figures: --instrument-distortion.",
            style="dim",
        )
    return lines
