"""The page of one tank for several carriers: a table of settings and taps, and a map of the loads matched."""

from __future__ import annotations

from collections.abc import Sequence

from rich.text import Text

from rfstage.cautions import FAILED_BLOCKING, Caution
from rfstage.designs.carriers import Tuned
from rfstage.designs.loads import PHASES, VSWRS, Matched, stretch
from rfstage.quantity import exact_text, show, show_complex
from rfstage.report.circuit import FAMILY, circuit
from rfstage.report.judged import caution_lines, signed
from rfstage.report.page import Cell, Look, columns, heading, note
from rfstage.stagevalues import described

# a load matched, matched with the coil's tap moved, not matched
_MARKS = ("=", "t", "-")


def carriers_page(tuned: Sequence[Tuned], look: Look) -> list[Text]:
    """Return the whole page."""
    first = tuned[0].design
    job = first.job
    carriers = ", ".join(show(t.design.job.carrier, "Hz", 5) for t in tuned)
    title = look.text(
        f"One tank for {carriers}: {exact_text(job.power, 'W')} into {show_complex(first.settings.load_impedance)} "
        f"from {exact_text(job.supply, 'V')}, {FAMILY[first.settings.family]}, {job.conduction_angle:g}° conduction"
    )
    lines = note(look, title, style="bold", indent=0)
    lines += heading(look, f"Circuit at {show(job.carrier, 'Hz', 5)}, network {first.tank.network}")
    lines += circuit(look, first.tank.parts, start="device", end=f"load {show_complex(first.settings.load_impedance)}")
    if any(t.design.filter for t in tuned):
        lines += _filters(tuned, look)
    lines += _settings(tuned, look)
    lines += _performance(tuned, look)
    if tuned[0].loads:
        lines += _map(tuned, look)
    return lines + caution_lines(look, _cautions(tuned))


def _filters(tuned: Sequence[Tuned], look: Look) -> list[Text]:
    """Return what filter each carrier has: a filter of one would block the next, so they are switched."""
    lines = note(look, "Each carrier has a filter of its own, to be switched with it:", style="dim")
    for t in tuned:
        made = t.design.filter
        words = "none"
        if made is not None:
            parts = ", ".join(" ".join((b.name, *described(b, 3))) for b in made.parts)
            words = f"{made.kind} of order {made.order}, {made.form}: {parts}"
        lines += note(look, f"{show(t.design.job.carrier, 'Hz', 5)}: {words}", hanging=2)
    return lines


def _settings(tuned: Sequence[Tuned], look: Look) -> list[Text]:
    parts = [s.part for s in tuned[0].settings]
    rows = [[Cell("carrier", "dim", right=True), *(Cell(part, "dim", right=True) for part in parts)]]
    for t in tuned:
        cells = [Cell(show(t.design.job.carrier, "Hz", 5), "bold", right=True)]
        for s in t.settings:
            mark = "" if s.within is None else " " if s.within else "!"
            turns = "" if s.turns is None else f" at {100 * s.turns:.0f} %"
            cells.append(Cell(show(s.value, s.unit) + turns + mark, "bold red" if mark == "!" else "", right=True))
        rows.append(cells)
    lines = heading(look, "Settings and coil taps") + columns(look, rows)
    lines += note(
        look,
        "A coil's tap in percent of the turns of its largest setting, inductance taken as the square of the turns: a "
        "start, since a short coil's goes slower.",
        style="dim",
    )
    for t in tuned:
        for s in t.settings:
            if s.within is False and s.variable is not None:
                ends = f"{show(s.variable.least, s.unit)} to {show(s.variable.most, s.unit)}"
                words = f"{s.part} of {show(s.value, s.unit)} is outside its {ends}"
                lines += note(look, f"! {show(t.design.job.carrier, 'Hz', 5)}: {words}", style="bold red")
    return lines


def _performance(tuned: Sequence[Tuned], look: Look) -> list[Text]:
    judged = any(h.limit is not None for t in tuned for h in t.design.harmonics)
    titles = ["carrier", "load R", "loaded Q", "input Q", "efficiency", "second", "third"]
    titles += ["margin"] if judged else []
    rows = [[Cell(title, "dim", right=True) for title in titles]]
    for t in tuned:
        made = t.design
        levels = {h.order: h.line_level for h in made.harmonics}
        q = made.tank.input_q
        words = [
            show(made.job.carrier, "Hz", 5),
            show(made.point.load_resistance, "ohm"),
            f"{made.tank.loaded_q:.3g}{'*' if t.decided_by else ' '}",
            "none" if q is None else f"{q:.3g}",
            f"{100 * made.tank.efficiency:.1f} %",
            *(_dbc(levels.get(n)) for n in (2, 3)),
        ]
        row = [Cell(word, right=True) for word in words]
        if judged:
            margin = _margin(t)
            style = "" if margin is None else "green" if margin >= 0 else "bold red"
            row.append(Cell("none" if margin is None else signed(margin), style, right=True))
        rows.append(row)
    lines = heading(look, "What each carrier gives") + columns(look, rows)
    for t in tuned:
        if t.decided_by:
            lines += note(
                look,
                f"* {show(t.design.job.carrier, 'Hz', 5)}: {t.decided_by} stands at the end of its range, and it and "
                "the output capacitance decide the Q",
                style="dim",
            )
    limit = tuned[0].design.settings.limit
    if limit is None:
        return lines + note(look, "No limit rule was given; --limit names one.", style="dim")
    where = f"limit {limit.name} ({limit.source}; {limit.conditions})"
    missed = [t.design.job.carrier for t in tuned if (_margin(t) or 0.0) < 0]
    if missed:
        verdict, style = f"MISSES at {', '.join(show(f, 'Hz', 5) for f in missed)}, {where}", "bold red"
    else:
        verdict, style = f"MEETS at every carrier it has a figure for, {where}", "bold green"
    silent = [f"{show(t.design.job.carrier, 'Hz', 5)}: the rule {said}" for t in tuned if (said := _silence(t))]
    lines += note(look, verdict + ".", style=style)
    for said in silent:
        lines += note(look, said)
    return lines + note(
        look, "second, third and margin: in the resistive line; a measurement and the local rule decide.", style="dim"
    )


def _margin(t: Tuned) -> float | None:
    return None if t.design.worst is None else t.design.worst.margin


def _silence(t: Tuned) -> str:
    limit, job = t.design.settings.limit, t.design.job
    return "" if limit is None else limit.silence(job.carrier, job.power)


def _dbc(level: float | None) -> str:
    return "none" if level is None else f"{level:.1f}".replace("-", "−")


def _map(tuned: Sequence[Tuned], look: Look) -> list[Text]:
    names = ", ".join(v.name for v in tuned[0].design.job.variable)
    line = show(tuned[0].design.settings.line.at_carrier.real, "ohm")
    lines = heading(look, f"Loads matched with {names}, by VSWR on {line} and phase of the reflection")
    header = ["carrier", "VSWR", *(f"{phase}" for phase in PHASES)]
    rows = [[Cell(word, "dim", right=True) for word in header]]
    for t in tuned:
        for vswr in VSWRS:
            row = [m for m in t.loads if m.vswr == vswr]
            first = Cell(show(t.design.job.carrier, "Hz", 5) if vswr == VSWRS[0] else "", right=True)
            rows.append([first, Cell(f"{vswr:g}", right=True), *(_mark(m) for m in row)])
    lines += columns(look, rows)
    lines += note(
        look,
        "= matched as the coil is tapped   t matched with the tap moved   - not matched; phase in degrees at the "
        "tank's end of the line",
        style="dim",
    )
    for t in tuned:
        changes = [m for m in t.loads if not m.matched]
        if changes:
            worst = max(changes, key=lambda m: _stretch(m, t))
            lines += note(
                look,
                f"{show(t.design.job.carrier, 'Hz', 5)}: {len(changes)} of {len(t.loads)} not matched; furthest, VSWR "
                f"{worst.vswr:g} at {worst.phase:g}°: {worst.change}",
                hanging=2,
            )
        else:
            lines += note(look, f"{show(t.design.job.carrier, 'Hz', 5)}: every load tried is matched")
    return lines


def _stretch(load: Matched, t: Tuned) -> float:
    """Return how far beyond its range the furthest part would have to go, as a ratio."""
    return stretch(load.settings, {v.name: v for v in t.design.job.variable})


def _mark(load: Matched) -> Cell:
    place = 2 if not load.matched else 1 if load.tap_moved else 0
    return Cell(_MARKS[place], ("green", "yellow", "bold red")[place], right=True)


def _for_all_carriers(tuned: Sequence[Tuned]) -> Caution:
    """Return the caution of a failed blocking capacitor that asks for the largest choke across the output."""
    from rfstage.designs.choke import safety_choke

    largest = max(tuned, key=lambda t: safety_choke(t.design.stage).least_inductance or 0.0)
    return next(caution for caution in largest.design.cautions if caution.topic == FAILED_BLOCKING)


def _cautions(tuned: Sequence[Tuned]) -> list[Caution]:
    """Return the cautions of all carriers, each once, with its carrier where it is one's own."""
    found: dict[Caution, list[float]] = {}
    for t in tuned:
        for caution in t.design.cautions:
            if caution.topic == FAILED_BLOCKING:  # one choke across the output, the largest of all, serves them
                found[_for_all_carriers(tuned)] = [u.design.job.carrier for u in tuned]
            else:
                found.setdefault(caution, []).append(t.design.job.carrier)
    return [
        c if len(at) == len(tuned) else Caution(f"{c.topic}, {', '.join(show(f, 'Hz', 5) for f in at)}", c.text)
        for c, at in found.items()
    ]
