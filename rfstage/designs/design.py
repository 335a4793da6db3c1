"""The main job: from what is asked to a stage with its tank, harmonics, ratings and cautions."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from rfstage.cautions import (
    RESONANCE,
    Caution,
    about_dip,
    about_load_file,
    about_low_resistance,
    about_resonance,
    about_tank_loss,
)
from rfstage.designs.building import Built, build
from rfstage.designs.settings import Settings, with_defaults
from rfstage.designs.textbook import Circuit, Fitted, by_the_book
from rfstage.drive import DriveVoltages
from rfstage.errors import ConvergenceError, ImpossibleError, RfstageError
from rfstage.harmonics import (
    WAVEFORM_ORDERS,
    Harmonic,
    harmonics,
    terminations,
    trough_dip,
    with_settled_levels,
)
from rfstage.job import Job
from rfstage.ladder import Ladder
from rfstage.load import MeasuredLoad
from rfstage.matching.pil import default_middle
from rfstage.matching.quality import strongest_resonance_below
from rfstage.matching.tank import Tank, describe
from rfstage.matching.task import COUPLINGS
from rfstage.operating import OperatingPoint, Rating, ratings
from rfstage.pulse import operating_class, pulse_coefficients
from rfstage.quantity import show_orders
from rfstage.stage import Stage
from rfstage.tankfields import AUTO, NONE

if TYPE_CHECKING:
    from rfstage.designs.heat import Heat
    from rfstage.designs.lowresistance import Way
    from rfstage.designs.ranking import Ranking
    from rfstage.filters.choose import Filter
    from rfstage.steady import SteadyState

FILTER_ROUNDS = 5  # in which the filter is chosen again for what the steady state adds
WAYS_SHOWN = 4  # of the ways out of a low resistance
FILTER_SPARE = 0.2  # dB more than what was short, so that the rounds end


@dataclass(frozen=True, slots=True, kw_only=True)
class Design:
    """A finished design; ``job`` and ``settings`` are what it came from, ``stage`` is what can be built.

    ``designed_to`` is ``"settled"`` or ``"textbook"``; ``coefficients`` are those of the current pulse, from
    order 0; ``point`` holds the book's values for the stage as designed, ``settled`` its steady state, or None
    where that was not asked; ``book_resistance`` [ohm] is the load resistance before any correction;
    ``continued`` names the harmonic orders at which a measured load had to be continued beyond its table;
    ``assumed`` holds what was not given and taken by default, by key. ``filter`` is the harmonic filter in the stage,
    ``ranking`` all networks where they were compared, ``ways_out`` what helps where the load resistance is too low;
    ``heat`` that of the stage in four conditions where it was asked (`with_heat`).
    """

    job: Job
    settings: Settings
    designed_to: str
    coefficients: NDArray[np.float64]
    operating_class: str
    point: OperatingPoint
    book_resistance: float
    drive: DriveVoltages
    ratings: tuple[Rating, ...]
    tank: Tank
    harmonics: tuple[Harmonic, ...]
    continued: tuple[int, ...]
    cautions: tuple[Caution, ...]
    stage: Stage
    assumed: dict[str, object]
    settled: SteadyState | None = None
    filter: Filter | None = None
    ranking: Ranking | None = None
    ways_out: tuple[Way, ...] = ()
    heat: Heat | None = None

    @property
    def filter_terminations(self) -> tuple[tuple[int, complex], ...]:
        """What the filter with its load shows the tank [ohm] at the harmonics, by order; empty without a filter."""
        if self.filter is None:
            return ()
        orders = np.arange(2, self.settings.highest_order + 1)
        z = Ladder(self.filter.parts).impedance(self.job.carrier * orders, self.settings.load)
        return tuple(zip(orders.tolist(), z.tolist(), strict=True))

    @property
    def worst(self) -> Harmonic | None:
        """The harmonic with the least margin, or None without a limit that applies."""
        judged = [h for h in self.harmonics if h.margin is not None]
        return min(judged, key=lambda h: h.margin or 0.0) if judged else None


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
        return _assembled(coefficients, made, book, "textbook", resistance, ranking)
    failed: list[RfstageError] = []
    for made in candidates:
        try:
            found = _to_settled_power(coefficients, made, advise=len(candidates) == 1)
        except (ImpossibleError, ConvergenceError) as error:
            failed.append(error)
            continue
        if ranking is None:
            return found
        return replace(found, ranking=ranking.settled(found.settings.request.network, [str(e) for e in failed]))
    raise failed[0]


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

    extra = np.zeros(made.settings.highest_order - 1)
    for _ in range(FILTER_ROUNDS):
        book = build(made.settings, made.circuit, made.point)
        built, state = corrected(made.settings, coefficients, book, advise=advise)
        resistance = book.point.load_resistance
        found = with_settled(_assembled(coefficients, made, built, "settled", resistance, None), state)
        if made.settings.job.filter in (None, NONE):
            return found
        short = np.array([made.settings.margin - (h.margin or 0.0) if h.limit else 0.0 for h in found.harmonics])
        if short.max() <= 0:
            return found
        extra += np.where(short > 0, short + FILTER_SPARE, 0.0)
        made = _fitted(replace(made.settings, filter=()), coefficients, extra)
    raise ImpossibleError(
        f"network {made.settings.request.network}: no filter holds the limit in steady state; {short.max():.1f} dB is "
        f"short at order {int(short.argmax()) + 2}"
    )


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


def _assembled(
    coefficients: NDArray[np.float64],
    made: Fitted,
    built: Built,
    designed_to: str,
    book_resistance: float,
    ranking: Ranking | None,
) -> Design:
    settings = made.settings
    job, circuit, point = settings.job, built.circuit, built.point
    ladder = Ladder(circuit.branches)
    shown_orders = range(2, settings.highest_order + 1)
    dip = trough_dip(
        ladder,
        settings.load,
        carrier=job.carrier,
        coefficients=coefficients[: WAVEFORM_ORDERS + 1],
        peak_current=point.peak_current,
        swing=point.swing,
    )
    tank = describe(
        settings.request.network,
        circuit.feed,
        circuit.tank,
        behind=circuit.filter,
        load=settings.load,
        carrier=job.carrier,
        current=point.fundamental_current,
        trough_dip=dip,
        terminations=terminations(ladder, settings.load, job.carrier, point.load_resistance, shown_orders),
    )
    levels = harmonics(
        ladder,
        load=settings.load,
        line=settings.line,
        carrier=job.carrier,
        coefficients=coefficients,
        peak_current=point.peak_current,
        highest_order=settings.highest_order,
        output_power=job.power,
        limit=settings.limit,
    )
    ways: tuple[Way, ...] = ()
    if circuit.is_low(point.load_resistance):
        from rfstage.designs.lowresistance import ways_out

        ways = ways_out(settings, coefficients, point.load_resistance)
    load = settings.load
    continued = load.beyond(job.carrier, settings.highest_order) if isinstance(load, MeasuredLoad) else ()
    return Design(
        job=job,
        settings=settings,
        designed_to=designed_to,
        coefficients=coefficients,
        operating_class=operating_class(job.conduction_angle),
        point=point,
        book_resistance=book_resistance,
        drive=built.drive,
        ratings=tuple(
            ratings(
                point, max_voltage=job.max_voltage, max_current=job.max_current, max_dissipation=job.max_dissipation
            )
        ),
        tank=tank,
        harmonics=levels,
        continued=continued,
        cautions=_cautions(built, ways, settings, tank, levels, ladder, continued, designed_to),
        stage=built.stage,
        assumed={**settings.assumed, **_sized(settings, circuit, tank), **built.stand_ins},
        filter=made.filter,
        ranking=ranking,
        ways_out=ways,
    )


def _sized(settings: Settings, circuit: Circuit, tank: Tank) -> dict[str, object]:
    """Return the defaults that follow from the load resistance, by key."""
    job = settings.job
    found: dict[str, object] = {}
    if job.choke is None:
        found["supply.choke"] = circuit.supply.choke
    if job.blocking is None:
        found["tank.blocking"] = float(circuit.coupler[0].value)
    request = settings.request
    if job.network in (None, AUTO):
        found["tank.network"] = request.network
    if request.network not in ("l", "l-high-pass") and (job.loaded_q, job.input_q, job.tap) == (None, None, None):
        found["tank.loaded_q"] = tank.loaded_q
    if request.network == "pi-l" and job.middle_resistance is None:
        found["tank.middle_resistance"] = default_middle(complex(tank.impedance.real), settings.tank_load)
    if request.network in COUPLINGS and job.coupling is None:
        found["tank.coupling"] = COUPLINGS[request.network]
    if request.network == "link" and job.link is None:
        found["tank.link"] = "tuned"
    if job.transformer is not None:
        transformer = circuit.coupler[1]
        if job.transformer_magnetizing is None:
            found["tank.transformer_magnetizing"] = float(transformer.second)
        if job.transformer_leakage is None:
            found["tank.transformer_leakage"] = float(transformer.lead_inductance)
    if settings.limit is not None and job.margin is None and (job.filter or NONE) != NONE:
        found["limit.margin"] = settings.margin
    return found


def _cautions(
    made: Built,
    ways: tuple[Way, ...],
    settings: Settings,
    tank: Tank,
    levels: tuple[Harmonic, ...],
    ladder: Ladder,
    continued: tuple[int, ...],
    designed_to: str,
) -> tuple[Caution, ...]:
    from rfstage.designs.safety import blocking_cautions, most_exposed, safety_cautions, station_of

    job, point = settings.job, made.point
    found = about_dip(tank.trough_dip or 0.0, network=tank.network, corrected=designed_to == "settled")
    found += about_tank_loss(tank.efficiency, tank.loaded_q)
    found += about_low_resistance(
        made.circuit.network_resistance(point.load_resistance),
        made.circuit.input_capacitance,
        job.carrier,
        [way.summary for way in ways[:WAYS_SHOWN]],
    )
    found += about_resonance(strongest_resonance_below(ladder.branches, settings.load, job.carrier))
    found += blocking_cautions(made.stage, point.load_resistance)
    found += about_load_file(continued)
    strayed = [h.order for h in levels if h.strays_decide]
    if strayed:
        orders = "every order shown" if len(strayed) == len(levels) else f"orders {show_orders(strayed)}"
        found.append(
            Caution(
                "strays",
                f"at {orders} the level moves by more than 3 dB with 5 nH of lead in each shunt capacitor: measure, "
                "don't trust.",
            )
        )
    exposed = most_exposed(
        (
            part.branch.name,
            max(part.peak_voltage or 0.0, part.far_voltage or 0.0),
            max(part.rms_current or 0.0, part.far_current or 0.0),
        )
        for part in tank.parts
    )
    safe = safety_cautions(
        made.stage, dc_current=point.dc_current, exposed=exposed, power=job.power, station=station_of(job)
    )
    return (*found, *safe)
