"""Lines that the pages of a design and of a settled stage share: ratings, verdict, cautions."""

from __future__ import annotations

from collections.abc import Sequence

from rich.text import Text

from rfstage.cautions import Caution
from rfstage.limits import Limit
from rfstage.operating import Rating
from rfstage.quantity import show
from rfstage.report.page import Look, heading, note

_UNITS_OF = {"max_voltage": "V", "max_current": "A", "max_dissipation": "W"}


def rating_lines(look: Look, ratings: Sequence[Rating]) -> list[Text]:
    """Return a line for each rating: kept, or exceeded and by how much."""
    lines: list[Text] = []
    for rating in ratings:
        unit = _UNITS_OF[rating.name]
        name = rating.name.replace("_", " ").replace("max", "rating: greatest")
        asked = f"{name} {show(rating.limit, unit)}, the stage asks {show(rating.value, unit)}"
        if rating.exceeded:
            over = f"{100 * (rating.value / rating.limit - 1):.3g} % too much"
            lines += note(look, f"EXCEEDED  {asked}: {over}", style="bold red")
        else:
            lines += note(look, f"within    {asked}")
    return lines


def verdict_lines(
    look: Look,
    limit: Limit,
    *,
    worst: tuple[int, float] | None,
    highest: int,
    line: float,
    carrier: float,
    power: float,
) -> list[Text]:
    """Return the verdict on a limit.

    ``worst`` is the order and margin [dB] of the least margin, or None where the rule gives no figure for this
    carrier [Hz] and power [W]; ``highest`` the last order judged; ``line`` the resistive line [ohm].
    """
    where = f"limit {limit.name} ({limit.source}; {limit.conditions})"
    if worst is None:
        return note(look, f"{where}: {limit.silence(carrier, power) or 'finds no harmonic to judge'}.")
    order, margin = worst
    if margin < 0:
        words, style = f"MISSES: needs {signed(-margin).lstrip('+')} dB more at order {order}", "bold red"
    else:
        words, style = f"MEETS to order {highest}: {margin:.1f} dB to spare, least at order {order}", "bold green"
    return note(look, f"{words}, {where}.", style=style) + note(
        look,
        f"Judged in a resistive line of {show(line, 'ohm')}; a measurement and the local rule decide.",
        style="dim",
    )


def signed(decibels: float) -> str:
    """Return decibels with their sign, with more digits where it is close."""
    places = 1 if abs(decibels) >= 0.095 else 3
    return f"{decibels:+.{places}f}".replace("-", "−")


def caution_lines(look: Look, cautions: Sequence[Caution]) -> list[Text]:
    """Return the cautions under their heading."""
    rows = heading(look, "Cautions")
    for caution in cautions:
        rows += note(look, f"! {caution.topic}: {caution.text}", hanging=2)
    return rows
