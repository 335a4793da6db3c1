"""What a design is, put together from circuit and operating point: tank, harmonics, ratings, assumptions, cautions."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from rfstage.cautions import (
    Caution,
    about_dip,
    about_load_file,
    about_low_resistance,
    about_resonance,
    about_tank_loss,
)
from rfstage.designs.building import Built
from rfstage.designs.settings import Settings
from rfstage.designs.textbook import Circuit, Fitted
from rfstage.drive import DriveVoltages
from rfstage.harmonics import (
    WAVEFORM_ORDERS,
    Harmonic,
    harmonics,
    terminations,
    trough_dip,
)
from rfstage.job import Job
from rfstage.ladder import Ladder
from rfstage.load import MeasuredLoad
from rfstage.matching.pil import default_middle
from rfstage.matching.quality import strongest_resonance_below
from rfstage.matching.tank import Tank, describe
from rfstage.matching.task import COUPLINGS
from rfstage.operating import OperatingPoint, Rating, ratings
from rfstage.pulse import operating_class
from rfstage.quantity import show_orders
from rfstage.stage import Stage
from rfstage.tankfields import AUTO, NONE

if TYPE_CHECKING:
    from rfstage.designs.heat import Heat
    from rfstage.designs.lowresistance import Way
    from rfstage.designs.ranking import Ranking
    from rfstage.filters.choose import Filter
    from rfstage.steady import SteadyState

WAYS_SHOWN = 4  # of the ways out of a low resistance


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


def assembled(
    coefficients: NDArray[np.float64],
    made: Fitted,
    built: Built,
    designed_to: str,
    book_resistance: float,
    ranking: Ranking | None,
) -> Design:
    """Return the design of a built stage; ``book_resistance`` [ohm] is the load resistance before any correction."""
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
        [way.summary for way in ways[:WAYS_SHOWN] if not way.spoils],
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
