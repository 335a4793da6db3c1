"""The page of a tune-up: cautions first, the steps with what the meters should show, and the wrong way."""

from __future__ import annotations

from rich.text import Text

from rfstage.quantity import show, show_complex
from rfstage.report.judged import caution_lines
from rfstage.report.page import Look, heading, note
from rfstage.report.retune import drive_notes
from rfstage.retuning.procedure import Point, Procedure


def procedure_page(steps: Procedure, look: Look) -> list[Text]:
    """Return the steps of a tune-up."""
    stage = steps.stage
    lines = caution_lines(look, steps.cautions) + heading(look, f"Tune-up at {show(stage.carrier, 'Hz', 4)}")
    lines += drive_notes(steps.now, look)
    load = show_complex(complex(stage.load.impedance(stage.carrier)))
    words = [
        f"Dummy load of {load} with a power meter; supply lowered to {show(steps.start_supply, 'V', 2)}; drive "
        f"{show(stage.drive.amplitude, 'V')} peak. Watch dc current and output.",
        _turn(steps, steps.first_dip, "at this supply"),
        f"Supply up to {show(stage.supply.voltage, 'V')}. " + _turn(steps, steps.dip, "now"),
    ]
    if steps.output_peak is not None:
        peak = steps.output_peak
        where = "lies beside the dip" if steps.dip is not None else "is found"
        stay = " Between the two is the place to stay." if steps.dip is not None else ""
        words.append(
            f"The greatest output {where}: {show(peak.output_power, 'W')} at {steps.tuning} "
            f"{_value(steps, peak.value)}, with {show(peak.dc_current, 'A')}.{stay}"
        )
    words += _loading(steps)
    for number, text in enumerate(words, start=1):
        lines += note(look, f"{number}. {text}", hanging=3)
    lines += heading(look, "The wrong way")
    for text in _wrong(steps):
        lines += note(look, f"- {text}", hanging=2)
    return lines


def _value(steps: Procedure, value: float, part: str | None = None) -> str:
    kind = next(b.kind for b in steps.stage.branches if b.name == (part or steps.tuning))
    return show(value, "H" if kind == "coil" else "F")


def _turn(steps: Procedure, dip: Point | None, when: str) -> str:
    verb = f"Turn {steps.tuning}" if steps.adjustable else f"Change {steps.tuning} (it has no trimmer)"
    if dip is None:
        return f"{verb} for the greatest output: {when} the dc current has no dip within its range."
    return (
        f"{verb} for the dip of the dc current: {when} {show(dip.dc_current, 'A')} and "
        f"{show(dip.output_power, 'W')} at {_value(steps, dip.value)}."
    )


def _loading(steps: Procedure) -> list[str]:
    if steps.loading is None:
        return ["Nothing else can be turned: the loading is what is fitted."]
    shown = [
        f"{_value(steps, loading.value, steps.loading)}: "
        + (
            "no dip"
            if loading.tuned is None
            else f"{show(loading.tuned.dc_current, 'A')}, {show(loading.tuned.output_power, 'W')}"
        )
        for loading in steps.loadings
    ]
    text = (
        f"Load with {steps.loading} in small steps, back to the dip with {steps.tuning} after each. At the dip: "
        f"{'; '.join(shown)}."
    )
    dips = [(loading.value, loading.tuned.dc_current) for loading in steps.loadings if loading.tuned is not None]
    if len(dips) > 1:
        heavier = "more" if (dips[-1][1] - dips[0][1]) * (dips[-1][0] - dips[0][0]) > 0 else "less"
        text += f" {heavier.capitalize()} {steps.loading} loads the stage more: a higher current, a shallower dip."
    return [text]


def _wrong(steps: Procedure) -> list[str]:
    found = []
    if steps.dip is not None and steps.below is not None and steps.above is not None:
        for side, point in (("below", steps.below), ("above", steps.above)):
            change = 100 * (point.dc_current / steps.dip.dc_current - 1)
            output = 100 * (point.output_power / steps.dip.output_power - 1)
            found.append(
                f"{steps.tuning} 5 % {side} the dip: dc current {_percent(change)}, output {_percent(output)}."
            )
        steep = "below" if steps.below.dc_current > steps.above.dc_current else "above"
        found.append(f"The current rises faster {steep} the dip: come from there and stop at the lowest.")
    found.append(
        f"More dc current than {show(1.25 * steps.now.dc_current, 'A')} and little output: off resonance, or on a "
        "harmonic. Lower the supply at once and turn back."
    )
    found.append("A deep dip with little output: too lightly loaded, and the tank's voltage is high. Load more.")
    found.append("No dip at all: loaded too heavily, or too little drive.")
    return found


def _percent(change: float) -> str:
    return f"{change:+.2g} %".replace("-", "−")
