"""The main job: from what is asked to a stage, by the book or corrected to its settled power, with its steady state."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from rfstage.cautions import (
    RESONANCE,
    Caution,
)
from rfstage.designs.building import build
from rfstage.designs.result import Design, assembled
from rfstage.designs.settings import Settings, with_defaults
from rfstage.designs.textbook import Fitted, by_the_book
from rfstage.errors import ConvergenceError, ImpossibleError, RfstageError
from rfstage.harmonics import (
    WAVEFORM_ORDERS,
    with_settled_levels,
)
from rfstage.job import Job
from rfstage.pulse import pulse_coefficients
from rfstage.stage import Stage
from rfstage.tankfields import AUTO, NONE

if TYPE_CHECKING:
    from rfstage.steady import SteadyState

__all__ = ["Design", "design", "with_heat", "with_settled"]

FILTER_ROUNDS = 5  # in which the filter is chosen again for what the steady state adds
FILTER_SPARE = 0.2  # dB more than what was short, so that the rounds end


def design(job: Job, textbook: bool = False) -> Design:
    """Design a stage.

    Parameters
    ----------
    job : Job
        What is asked.
    textbook : bool
        Keep the book's design, without its steady state (`with_settled` adds that). Otherwise the load
        resistance, and with it current and drive, is corrected until the settled power at the load is the asked
        one within 0.1 %.

    Returns
    -------
    Design

    Raises
    ------
    RfstageError
        If the job contradicts itself, no circuit does it, or the settled power can't be brought to the asked one.

    Examples
    --------
    >>> job = Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8)
    >>> book, real = design(job, textbook=True), design(job)
    >>> round(book.point.load_resistance, 2), round(real.point.load_resistance, 2)
    (7.43, 7.08)
    >>> round(real.settled.output_power, 1), [p.branch.name for p in real.tank.parts]
    (10.0, ['Lchoke', 'Cblock', 'C1', 'L1', 'C2'])
    """
    settings = with_defaults(job)
    orders = max(WAVEFORM_ORDERS, settings.highest_order)
    coefficients = pulse_coefficients(settings.half_angle, highest_order=orders, exponent=settings.exponent)
    ranking = None
    if settings.request.network == AUTO:
        from rfstage.designs.ranking import rank

        ranking = rank(settings, coefficients)
        candidates = ranking.allowed
    else:
        candidates = [_fitted(settings, coefficients)]
    if textbook:
        made = candidates[0]
        book = build(made.settings, made.circuit, made.point)
        resistance = book.point.load_resistance
        return assembled(coefficients, made, book, "textbook", resistance, ranking)
    failed: list[RfstageError] = []
    short: list[tuple[float, int, Design]] = []
    for place, made in enumerate(candidates):
        try:
            found = _to_settled_power(coefficients, made, advise=len(candidates) == 1)
        except (ImpossibleError, ConvergenceError) as error:
            failed.append(error)
            continue
        if ranking is None:
            return found
        margin = found.worst.margin if found.worst and found.worst.margin is not None else 0.0
        kept = ranking.of(made).margin or 0.0
        if margin >= 0 or kept < 0:
            return replace(found, ranking=ranking.settled(made, [str(e) for e in failed]))
        said = f"kept the limit by the book, and misses it by {-margin:.1f} dB in steady state"
        failed.append(ImpossibleError(said))
        short.append((margin, place, found))
    if short and ranking is not None:
        _, place, found = max(short, key=lambda its: its[:2])
        return replace(found, ranking=ranking.settled(candidates[place], [str(e) for e in failed[:place]]))
    if len({str(error) for error in failed}) == 1:
        raise failed[0]
    raise ImpossibleError(
        f"none of {len(failed)} networks does it in steady state; the best by the book: {failed[0]} (--network tries "
        "another, --textbook keeps the book's design)"
    )


def _fitted(settings: Settings, coefficients: NDArray[np.float64], extra: NDArray[np.float64] | None = None) -> Fitted:
    """Return the book's circuit, with a filter where the job asks for one and the limit needs it."""
    circuit, point = by_the_book(settings, coefficients)
    if settings.job.filter in (None, NONE):
        return Fitted(settings, circuit, point, None)
    from rfstage.designs.filtering import fitted

    return fitted(settings, coefficients, circuit, point, extra)


def _to_settled_power(coefficients: NDArray[np.float64], made: Fitted, *, advise: bool) -> Design:
    """Return the design whose settled power is the asked one, its filter good for the settled harmonics too."""
    from rfstage.designs.correction import corrected

    settings = made.settings
    extra = np.zeros(settings.highest_order - 1)
    for _ in range(FILTER_ROUNDS):
        book = build(made.settings, made.circuit, made.point)
        built, state = corrected(made.settings, coefficients, book, advise=advise)
        resistance = book.point.load_resistance
        found = with_settled(assembled(coefficients, made, built, "settled", resistance, None), state)
        if settings.job.filter in (None, NONE):
            return found
        # an order that neither the pulse nor the steady state has is short of nothing
        short = np.array([0.0 if h.margin is None else settings.margin - h.margin for h in found.harmonics])
        if short.max() <= 0:
            return found
        extra = _settled_excess(found, made, coefficients, extra, short)
        made = _fitted(replace(settings, filter=()), coefficients, extra)
    raise ImpossibleError(
        f"network {settings.request.network}: no filter holds the limit in steady state; {short.max():.1f} dB is "
        f"short at order {int(short.argmax()) + 2}"
    )


def _settled_excess(
    found: Design,
    made: Fitted,
    coefficients: NDArray[np.float64],
    extra: NDArray[np.float64],
    short: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Return the dB by which the settled orders stand above the book's, and what was short in spite of that."""
    from rfstage.designs.filtering import line_levels

    book = line_levels(made.settings, made.circuit, made.point, coefficients)
    settled = np.array([np.nan if h.line_level is None else h.line_level for h in found.harmonics])
    excess = np.nan_to_num(np.maximum(settled - book, 0.0), nan=0.0, posinf=0.0)
    again = np.where(
        (short > 0) & (extra >= excess), extra + short + FILTER_SPARE, np.maximum(extra, excess + FILTER_SPARE)
    )
    return np.asarray(np.where(short > 0, again, extra))


def with_settled(made: Design, state: SteadyState | None = None) -> Design:
    """Return a design with the steady state of its stage beside the book's values.

    Parameters
    ----------
    made : Design
        Any design.
    state : SteadyState or None
        The steady state if it is known already.

    Returns
    -------
    Design
        Line levels and what the ratings are held against are then the worse of textbook and settled.
        Where no steady state is reached a
        textbook design comes back as it was, with a caution that says so.
    """
    from rfstage.designs.judging import in_line, settled_cautions
    from rfstage.designs.safety import choke_cautions, station_of
    from rfstage.steady import settle

    shown = made.settings.highest_order
    try:
        if state is None or len(state.harmonics) < shown - 1:
            state = settle(made.stage, listed=shown, start=state)
        line = in_line(made.stage, state, made.settings.line)
    except ConvergenceError as error:
        return replace(made, cautions=(Caution("steady state", str(error)), *made.cautions))
    levels = with_settled_levels(
        made.harmonics,
        settled={h.order: h.level for h in state.harmonics},
        in_line={h.order: h.level for h in line.harmonics},
    )
    most = {
        "max_voltage": state.peak_voltage,
        "max_current": state.peak_current,
        "max_dissipation": state.dissipation,
    }
    return replace(
        made,
        settled=state,
        harmonics=levels,
        ratings=tuple(r._replace(value=max(r.value, most[r.name])) for r in made.ratings),
        cautions=(*settled_cautions(state), *choke_cautions(state, station_of(made.job)), *_damped(made, state)),
    )


def with_heat(
    made: Design,
    *,
    stage: Stage | None = None,
    state: SteadyState | None = None,
    progress: Callable[[int, int], None] | None = None,
) -> Design:
    """Return a design with the heat of its stage in four conditions.

    Parameters
    ----------
    made : Design
        Any design.
    stage : Stage or None
        The stage with its real parts, to be heated instead.
    state : SteadyState or None
        The steady state of that stage, if known already; else the design's own is taken, or it is settled.
    progress : callable or None
        Called with the number of mismatched points done and of all, now and then.

    Raises
    ------
    OutOfRangeError, ImpossibleError
        If the stage's values make no circuit.
    """
    from rfstage.designs.heat import heat_of
    from rfstage.safetyfields import HEAT

    values = {field.name: getattr(made.job, field.name) for field in HEAT}
    if stage is None:
        stage, state = made.stage, state or made.settled
    heat = heat_of(stage, values, state=state, progress=progress)
    return replace(made, heat=heat, assumed={**made.assumed, **heat.assumed})


def _damped(made: Design, state: SteadyState) -> tuple[Caution, ...]:
    """Return a design's cautions, that of a choke resonance with what damps it in steady state."""
    if not any(caution.topic == RESONANCE for caution in made.cautions):
        return made.cautions
    from rfstage.designs.safety import resonance_cautions

    damped = resonance_cautions(state)
    return tuple(c for caution in made.cautions for c in (damped if caution.topic == RESONANCE else (caution,)))
