"""Seeded single faults in stages as they are built, and what the meters then read: for the tests of causes.

Eight stages of all families and ladders that a design gives, each with its first tuning capacitor on a trimmer of
±20 %. A fault takes one suspect (a coil or capacitor that is felt, the load, the drive) off by 5 to 35 % either way. A
fault must move a reading by more than three errors of a 1 % meter at the settings read, and leave a twentieth of the
output: one that is smaller is seen by nobody, one that is larger is a stage that doesn't work.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import replace
from typing import NamedTuple

import numpy as np

from rfstage import Job, design
from rfstage.errors import ConvergenceError
from rfstage.retuning.explored import suspects
from rfstage.retuning.reading import Reading
from rfstage.stage import PartData, Stage
from rfstage.stagevalues import fitted_value, with_value
from rfstage.steady import SteadyState, settle, settle_many

SEED = 20250301
METER = 0.01
SETTINGS = (0.85, 1.0, 1.15)  # of the trimmer, against its value

JOBS = (
    Job(network="pi", carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8),
    Job(network="pi", carrier=3.6e6, power=40.0, conduction_angle=140.0, supply=28.0, family="fet", loaded_q=8.0),
    Job(network="pi", carrier=14.2e6, power=100.0, conduction_angle=150.0, supply=50.0, family="fet", loaded_q=10.0),
    Job(network="pi", carrier=1.9e6, power=400.0, conduction_angle=130.0, supply=2000.0, family="tube", loaded_q=12.0),
    Job(network="pi", carrier=28.5e6, power=25.0, conduction_angle=180.0, supply=28.0, family="bipolar"),
    Job(
        network="pi",
        carrier=50.1e6,
        power=5.0,
        conduction_angle=110.0,
        supply=12.0,
        family="fet",
        output_capacitance=40e-12,
    ),
    Job(network="pi", carrier=7.05e6, power=800.0, conduction_angle=160.0, supply=2800.0, family="tube", loaded_q=14.0),
    Job(
        network="pi",
        carrier=10.1e6,
        power=15.0,
        conduction_angle=100.0,
        supply=24.0,
        family="fet",
        load=40 + 12j,
        loaded_q=7.0,
    ),
)


class Fault(NamedTuple):
    """A stage as its file says, what is off in it, by which factor, and the part on a trimmer; and what is settled."""

    stage: Stage
    suspect: str
    factor: float
    trimmer: str
    known: dict[tuple[float, float | None], SteadyState]

    def stage_at(self, setting: float | None = None, *, supply: float | None = None) -> Stage:
        """The stage with its fault at a setting of the trimmer [F]."""
        stage = self.stage if setting is None else with_value(self.stage, self.trimmer, setting)
        if supply is not None:
            stage = with_value(stage, "supply.voltage", supply)
        now = fitted_value(stage, self.suspect)
        assert now is not None
        return with_value(stage, self.suspect, now * self.factor)

    def settled(self, setting: float | None = None, *, supply: float | None = None) -> SteadyState:
        """Its steady state there, with the orders chosen."""
        at = setting or fitted_value(self.stage, self.trimmer) or 0.0
        if (at, supply) not in self.known:
            self.known[at, supply] = settle(self.stage_at(at, supply=supply))
        return self.known[at, supply]

    def read(
        self, setting: float | None, random: np.random.Generator | None, *, supply: float | None = None
    ) -> Reading:
        """What the meters read there, with their errors or exact."""
        state = self.settled(setting, supply=supply)
        noise = (1.0, 1.0) if random is None else 1 + METER * random.standard_normal(2)
        return Reading(
            dc_current=state.dc_current * float(noise[0]),
            output_power=state.output_power * float(noise[1]),
            supply=self.stage.supply.voltage if supply is None else supply,
            settings=() if setting is None else ((self.trimmer, setting),),
        )

    def read_dip(self) -> Reading | None:
        """What the meters read at the dip along the trimmer, and where; None without one.

        Found with 16 orders, placed to a thousandth by nine points with 40, read with the orders chosen.
        """
        now = fitted_value(self.stage, self.trimmer)
        assert now is not None
        values = (now * np.geomspace(0.5, 2.0, 33)).tolist()
        coarse = self._currents(values, 16)
        dips = [k for k in range(1, 32) if coarse[k - 1] >= coarse[k] < coarse[k + 1]]
        if not dips:
            return None
        k = min(dips, key=lambda k: coarse[k])
        x = np.linspace(-1, 1, 9)
        middle, half = (values[k - 1] + values[k + 1]) / 2, (values[k + 1] - values[k - 1]) / 2
        curve = np.polynomial.Polynomial.fit(x, self._currents((middle + half * x).tolist(), 40), 6)
        fine = np.linspace(-1, 1, 2001)
        place = middle + half * float(fine[int(np.argmin(curve(fine)))])
        return replace(self.read(place, None), dip=self.trimmer)

    def _currents(self, values: Sequence[float], orders: int) -> list[float]:
        return [state.dc_current for state in settle_many([self.stage_at(v) for v in values], orders=orders)]


def stages(jobs: Sequence[Job] = JOBS) -> list[tuple[Stage, str]]:
    """The stages, and the part of each that is on a trimmer."""
    found = []
    for job in jobs:
        stage = design(job).stage
        now = fitted_value(stage, "C1")
        assert now is not None
        data = {**stage.part_data, "C1": PartData(trim=(0.5 * now, 2.0 * now))}
        found.append((replace(stage, part_data=data), "C1"))
    return found


def faults(
    count: int, settings: Sequence[float], *, seed: int = SEED, built: Sequence[tuple[Stage, str]] = ()
) -> Iterator[Fault]:
    """Yield faults that the meters can feel at these settings (factors of the trimmer), the same for the same seed."""
    random = np.random.default_rng(seed)
    built = built or stages()
    made = 0
    sound: dict[tuple[int, float], SteadyState] = {}
    while made < count:
        which = int(random.integers(len(built)))
        stage, trimmer = built[which]
        read = (Reading(dc_current=1.0, supply=stage.supply.voltage),)
        named = suspects(stage, read)
        suspect = named[int(random.integers(len(named)))]
        size = math.exp(random.uniform(math.log(1.05), math.log(1.35)))
        fault = Fault(stage, suspect, size if random.random() < 0.5 else 1 / size, trimmer, {})
        now = fitted_value(stage, trimmer)
        assert now is not None
        felt = False
        try:
            for setting in settings:
                if (which, setting) not in sound:
                    sound[which, setting] = settle(with_value(stage, trimmer, now * setting))
                before, after = sound[which, setting], fault.settled(now * setting)
                if after.output_power < 0.05 * before.output_power:
                    raise ConvergenceError("no stage that works")
                moved = (after.dc_current / before.dc_current, after.output_power / before.output_power)
                felt |= max(abs(math.log(m)) for m in moved) > 3 * METER
        except ConvergenceError:
            continue
        if felt:
            made += 1
            yield fault
