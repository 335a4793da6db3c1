"""The ways out where a load resistance, or an input capacitor's reactance, is too small to build: tried and ranked.

::

    a higher supply          load resistance goes as the square of the swing
    two devices              each with half the power and twice the resistance, into one load
    a transformer 1:N        the network works into N² times the resistance, behind leakage and magnetizing inductance
"""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from rfstage.cautions import LOW_RESISTANCE
from rfstage.designs.ranking import Candidate, keys_of, measured
from rfstage.designs.settings import Settings, with_defaults
from rfstage.designs.textbook import Fitted, by_the_book
from rfstage.errors import RfstageError
from rfstage.job import Job
from rfstage.quantity import show
from rfstage.tankfields import SPECIAL, misfits

RATIOS = (2.0, 3.0, 4.0)  # of the transformers tried
ROOM = 1.1  # times the least resistance, that a higher supply should give
DEEPEST_DIP = 0.3  # of a way worth the name
MOST_SUPPLY = 4.0  # times the given supply: beyond that it is another device


class Way(NamedTuple):
    """One way out, by the book: what it is in words, load resistance and what the network begins at [ohm].

    ``still_low`` where it does not suffice; ``candidate`` what the ranking knows of it, None where it was refused
    and ``refused`` says why.
    """

    words: str
    load_resistance: float
    network_resistance: float
    still_low: bool
    candidate: Candidate | None
    refused: str = ""

    @property
    def spoils(self) -> bool:
        """Whether the trough dips so deep that it is no way out."""
        return self.candidate is None or self.candidate.trough_dip > DEEPEST_DIP

    @property
    def summary(self) -> str:
        """The way in a few words with its figures."""
        if self.candidate is None:
            return f"{self.words} (refused: {self.refused})"
        at = f"{show(self.load_resistance, 'ohm')} at the device"
        if self.network_resistance != self.load_resistance:
            at += f", {show(self.network_resistance, 'ohm')} at the network"
        low = ", still low" if self.still_low else ""
        known = self.candidate
        return (
            f"{self.words} (network {known.network}: {at}{low}; dip {known.trough_dip:.2f}, tank efficiency "
            f"{100 * known.efficiency:.1f} %)"
        )


def ways_out(settings: Settings, coefficients: NDArray[np.float64], resistance: float) -> tuple[Way, ...]:
    """Return the ways out of a load resistance [ohm] that is too low, best first, refused ones last.

    Parameters
    ----------
    settings : Settings
        Of the design, its network chosen.
    coefficients : ndarray
        Of the current pulse, from order 0.
    resistance : float
        Load resistance by the book [ohm].
    """
    job = settings.job
    trials: list[tuple[str, Job]] = []
    if job.transformer is None:
        trials += [(f"a transformer 1:{n:g}", replace(job, transformer=n)) for n in RATIOS]
    for least in (LOW_RESISTANCE * ROOM, 4 * LOW_RESISTANCE):
        times = math.sqrt(max(least / resistance, 1.0))
        if 1 < times <= MOST_SUPPLY:
            supply = float(f"{times * job.supply:.2g}")
            lowest = job.minimum_voltage
            if job.max_voltage is not None and 2 * supply - settings.minimum_voltage > job.max_voltage:
                continue  # the device's rating is no way out
            lifted = None if lowest is None else lowest * supply / job.supply
            trials.append((f"a supply of {show(supply, 'V')}", replace(job, supply=supply, minimum_voltage=lifted)))
    trials.append(("two devices, half the power each", replace(job, power=job.power / 2)))
    found = [_tried(words, trial, settings, coefficients) for words, trial in trials]
    made = [way for way in found if way.candidate]
    keys = keys_of([way.candidate for way in made if way.candidate])
    order = sorted(range(len(made)), key=lambda k: (made[k].spoils, made[k].still_low, keys[k]))
    return (*(made[k] for k in order), *(way for way in found if not way.candidate))


def with_network(job: Job, network: str) -> Job:
    """Return a job with a network, less the numbers that are of no use for it."""
    useless: dict[str, Any] = {
        field.name: None for field in SPECIAL if misfits({"network": network, field.name: getattr(job, field.name)})
    }
    return replace(job, network=network, **useless)


def _tried(words: str, job: Job, settings: Settings, coefficients: NDArray[np.float64]) -> Way:
    """Return a way with the network of the design, or with a pi where that serves better."""
    found: list[Way] = []
    for network in dict.fromkeys((settings.request.network, "pi")):
        try:
            own = with_defaults(with_network(job, network))
            made = Fitted(own, *by_the_book(own, coefficients), None)
        except RfstageError as error:
            found.append(Way(words, 0.0, 0.0, True, None, str(error)))
            continue
        at = made.point.load_resistance
        circuit, known = made.circuit, measured(made, coefficients)
        found.append(Way(words, at, circuit.network_resistance(at), circuit.is_low(at), known))
    return min(
        found, key=lambda way: (way.candidate is None, way.spoils, way.still_low, way.candidate and way.candidate.grade)
    )
