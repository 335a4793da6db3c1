"""The pages of a stage brought to another carrier, and of what was found at the bench."""

from __future__ import annotations

import math

from rich.text import Text

from rfstage.designs.judging import ratings_of
from rfstage.quantity import show, show_complex
from rfstage.report.judged import signed
from rfstage.report.page import Cell, Look, columns, heading, note, pairs
from rfstage.retuning.arithmetic import Bench
from rfstage.retuning.carrier import Change, Option, Retuned
from rfstage.retuning.windings import wound_inductance
from rfstage.stage import Stage
from rfstage.steady import SteadyState

OUT_OF_TUNE = 20.0  # degrees: a stage that sees more than this is not tuned where it stands
BY_HAND = 0.2  # of a coil's value: what squeezing or spreading gives at most (common practice, no source)
WINDING_OFF = 0.25  # of the coil's value: a winding whose geometry makes as much more or less is mistaken


def carrier_page(found: Retuned, look: Look) -> list[Text]:
    """Return the page of a stage brought to another carrier."""
    before = found.before
    lines = heading(look, f"From {show(found.stage.carrier, 'Hz', 4)} to {show(found.carrier, 'Hz', 4)}")
    items = [("the device sees now", show_complex(found.wanted)), ("output now", show(before.output_power, "W"))]
    if found.untouched is not None:
        items.append(("output there, untouched", _watts(found.untouched.output_power)))
    lines += pairs(look, items)
    angle = math.degrees(math.atan2(found.wanted.imag, found.wanted.real))
    if abs(angle) > OUT_OF_TUNE:
        lines += note(
            look,
            f"! The stage is not in tune where it stands: the device sees a phase of {angle:.0f}°, and would see the "
            "same at the new carrier. Tune it first, or turn for the dip afterwards.".replace("-", "−"),
            style="bold red",
            hanging=2,
        )
    lines += drive_notes(before, look) + _winding_notes(found.stage, look)
    lines += heading(look, "What to change, least work first") + _changes(found, look)
    lines += _unknown_windings(found, look)
    lines += heading(look, "What results, settled") + _results(found, look)
    if not any(option.serves and option.within_reach for option in found.options):
        words = "Nothing that is fitted reaches this carrier: it takes a new part."
        if found.nearest is not None:
            words += f" The nearest that what can be set reaches is {show(found.nearest, 'Hz', 4)}."
        lines += note(look, words, style="bold red")
    if found.unsettled:
        lines += note(look, f"Left out, since they do not settle: {'; '.join(found.unsettled)}.")
    return lines + note(
        look,
        "A coil keeps its Q in this; new leads, turns and unused ends of a tapped coil bring strays. Turn for the dip "
        "after any change.",
        style="dim",
    )


def drive_notes(state: SteadyState, look: Look) -> list[Text]:
    """Return a caution where the drive never reaches the threshold, so that nothing that follows means much."""
    if state.conduction_angle_deg > 0:
        return []
    words = "! The drive stays below the threshold: there is no output to tune. Raise drive.amplitude or drive.bias."
    return note(look, words, style="bold red", hanging=2)


def _winding_notes(stage: Stage, look: Look) -> list[Text]:
    lines = []
    for branch in stage.branches:
        data = stage.part_data.get(branch.name)
        made = None if data is None else wound_inductance(data.winding)
        if made is not None and abs(made / float(branch.value) - 1) > WINDING_OFF:
            lines += note(
                look,
                f"! {branch.name}: its winding makes {show(made, 'H')}, and the file says "
                f"{show(float(branch.value), 'H')}; the file's value is taken, and the winding only for its ratio.",
                hanging=2,
            )
    return lines


def _changes(found: Retuned, look: Look) -> list[Text]:
    rows = [[Cell(t, "dim", right=k in (0, 2, 3)) for k, t in enumerate(("", "part", "now", "wanted", "how"))]]
    for number, option in enumerate(found.options, start=1):
        if not option.changes:
            rows.append([Cell(str(number), "bold", right=True), Cell("nothing changes")])
        for k, change in enumerate(option.changes):
            rows.append(
                [
                    Cell("" if k else str(number), "bold", right=True),
                    Cell(change.part, "bold"),
                    Cell(show(change.now, change.unit), right=True),
                    Cell(show(change.wanted, change.unit, 4), "bold", right=True),
                    Cell(how(change)),
                ]
            )
    return columns(look, rows)


def _unknown_windings(found: Retuned, look: Look) -> list[Text]:
    changes = [change for option in found.options for change in option.changes]
    names = dict.fromkeys(c.part for c in changes if c.unit == "H" and c.way == "new" and c.turns is None)
    if not names:
        return []
    return note(
        look,
        f"With a winding in the stage file ({', '.join(names)}) it could be said how far squeezing, "
        "spreading or a tap goes.",
        style="dim",
    )


def how(change: Change) -> str:
    """Return in words how a part comes to its wanted value."""
    ratio = change.wanted / change.now
    if change.way == "trim":
        return f"trimmer: {moved(ratio)}"
    verb = "squeeze" if ratio > 1 else "spread"
    if change.way == "spread":
        where = "on its core" if change.length is None else f"to {show(change.length, 'm')}"
        return f"{verb} the turns {where}"
    if change.way == "tap":
        return f"tap at {change.turns:.3g} turns"
    if change.unit == "F":
        more = f"new, or {show(change.wanted - change.now, 'F')} more across it"
        return more if ratio > 1 else f"new: {moved(ratio)}"
    if change.turns is not None:
        return f"new: {change.turns:.3g} turns"
    by_hand = f", or {verb} it" if abs(ratio - 1) < BY_HAND else ""
    return f"new: {moved(ratio)}{by_hand}"


def moved(ratio: float) -> str:
    """Return in words by how much a value is moved."""
    verb = "raise" if ratio > 1 else "lower"
    if 0.5 < ratio < 2:
        return f"{verb} by {100 * abs(ratio - 1):.2g} %"
    return f"{verb} {ratio:.3g} times" if ratio > 1 else f"{verb} to {100 * ratio:.2g} %"


def _results(found: Retuned, look: Look) -> list[Text]:
    titles = ("", "sees", "dc", "output", "eff.", "heat", "loaded Q", "2nd", "3rd", "")
    rows = [[Cell(t, "dim", right=True) for t in titles]]
    for number, option in enumerate(found.options, start=1):
        state = option.state
        levels = [next((h.level for h in state.harmonics if h.order == n), None) for n in (2, 3)]
        words = (
            str(number),
            show_complex(option.impedance),
            show(state.dc_current, "A") if state.dc_current else "0 A",
            _watts(state.output_power),
            "none" if state.efficiency is None else f"{100 * state.efficiency:.0f} %",
            _watts(state.dissipation),
            f"{option.loaded_q:.1f}",
            *("none" if level is None else f"{level:.0f}".replace("-", "−") for level in levels),
        )
        rows.append(
            [*(Cell(w, "bold" if k == 0 else "", right=True) for k, w in enumerate(words)), Cell(_mark(option))]
        )
    lines = columns(look, rows, gap=1)
    return lines + note(
        look,
        "2nd and 3rd are dBc in the load; ok: output within 1 dB of now, efficiency at most 5 points lower; ! is "
        "beyond a rating of the device; limit is by how much the stage's own is missed.",
        style="dim",
    )


def _mark(option: Option) -> str:
    """Return what is to be said of an option: that it serves, a rating or a limit that is not kept."""
    words = ["ok"] if option.serves else []
    words += ["!"] if any(rating.exceeded for rating in ratings_of(option.state)) else []
    if option.limit_margin is not None and option.limit_margin < 0:
        words.append(f"limit {signed(option.limit_margin)} dB")
    return " ".join(words)


def _watts(value: float) -> str:
    return show(value, "W") if value else "0 W"


def bench_page(bench: Bench, stage: Stage, look: Look) -> list[Text]:
    """Return what was found at the bench, beside what the stage's file says."""
    items = []
    if bench.coil is not None:
        items += [
            ("inductance", show(float(bench.coil.inductance), "H", 4)),
            ("stray capacitance", show(float(bench.coil.stray_capacitance), "F")),
        ]
    for name, found in (("loaded", bench.loaded), ("unloaded", bench.unloaded)):
        if found is not None:
            items.append((f"{name} Q", f"{float(found.q):.4g}"))
            items.append(
                (f"bandwidth {name}", f"{show(float(found.bandwidth), 'Hz')} at {show(float(found.centre), 'Hz', 4)}")
            )
    if bench.shared is not None:
        items += [
            ("Q of the load alone", f"{float(bench.shared.external_q):.4g}"),
            ("tank efficiency", f"{100 * float(bench.shared.efficiency):.1f} %"),
        ]
    if bench.coupling is not None:
        items += [
            ("coupling", f"{float(bench.coupling.coupling):.4f}"),
            ("both tuned to", show(float(bench.coupling.centre), "Hz", 4)),
        ]
    lines = heading(look, "Found at the bench") + pairs(look, items)
    coils = [b for b in stage.branches if b.kind == "coil"]
    if bench.coil is not None and coils:
        made = float(bench.coil.inductance)
        near = min(coils, key=lambda b: abs(math.log(made / float(b.value))))
        value = show(float(near.value), "H")
        ratio = made / float(near.value)
        words = f"{ratio:.3g} times that" if not 0.5 < ratio < 2 else f"{100 * (ratio - 1):+.2g} % off"
        lines += note(look, f"The nearest coil of the stage is {near.name}, {value}: found {words}.".replace("-", "−"))
    return lines
