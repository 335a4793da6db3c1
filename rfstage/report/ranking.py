"""The networks compared: every one with and without a filter, the chosen one marked, and why it is first."""

from __future__ import annotations

from rich.text import Text

from rfstage.designs.ranking import Candidate, Ranking
from rfstage.report.judged import signed
from rfstage.report.page import Cell, Look, columns, heading, note

ROOMY = 90  # columns, from which the columns stand two apart


def ranking_lines(ranking: Ranking, look: Look) -> list[Text]:
    """Return the table of networks, the reason of the first, and what was said of those refused."""
    judged = any(c.margin is not None for c in ranking.candidates)
    filtered = any(c.filter for c in ranking.candidates)
    titles = ["", "network", *(["filter"] if filtered else []), *(["margin"] if judged else [])]
    titles += ["dip", "tank eff.", "parts", "extreme"]
    left = ("", "network", "filter")
    rows = [[Cell(title, "dim", right=title not in left) for title in titles]]
    made = [c for c in ranking.candidates if c.fitted]
    for place, candidate in enumerate(ranking.candidates):
        if candidate.fitted:
            rows.append(_row(candidate, chosen=place == ranking.chosen, judged=judged, filtered=filtered))
    lines = heading(look, "Networks compared, by the book") + columns(look, rows, gap=1 if look.width < ROOMY else 2)
    lines += note(look, f"{ranking.winner.name} is taken: {ranking.reason}.")
    for words in (extreme.words for extreme in ranking.winner.extremes):
        lines += note(look, f"extreme: {words}", hanging=2)
    if any(extreme.beyond for c in made for extreme in c.extremes):
        lines += note(look, "! among the extremes one that is beyond building", style="dim")
    if not all(c.allowed for c in made):
        outlook = any(not c.allowed and c.filter for c in made)
        words = (
            "in brackets: with the filter that --filter auto would fit"
            if outlook
            else ("in brackets: without the filter asked for")
        )
        lines += note(look, words, style="dim")
    for candidate in ranking.candidates:
        if not candidate.fitted:
            lines += note(look, f"refused, {candidate.name}: {candidate.refused}", style="dim", hanging=2)
    return lines


def _row(candidate: Candidate, *, chosen: bool, judged: bool, filtered: bool) -> list[Cell]:
    style = "bold" if chosen else "" if candidate.allowed else "dim"
    made = candidate.filter
    words = "none" if made is None else f"{made.kind} {made.order}"
    cells = [
        Cell(">" if chosen else "", style),
        Cell(candidate.network if candidate.allowed else f"({candidate.network})", style),
        *([Cell(words, style)] if filtered else []),
    ]
    if judged:
        margin = "none" if candidate.margin is None else signed(candidate.margin)
        cells.append(Cell(margin, style, right=True))
    beyond = sum(extreme.beyond for extreme in candidate.extremes)
    extreme = f"{len({e.part for e in candidate.extremes})}{'!' * (beyond > 0)}"
    return [
        *cells,
        Cell(
            f"{candidate.trough_dip + 0.0:z.3f}" if candidate.trough_dip < 1 else f"{candidate.trough_dip:.2g}",
            style,
            right=True,
        ),
        Cell(f"{100 * candidate.efficiency:.1f} %", style, right=True),
        Cell(str(candidate.parts), style, right=True),
        Cell(extreme, style, right=True),
    ]
