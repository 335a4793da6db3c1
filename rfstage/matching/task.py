"""What is asked of a network, and what it has to work between."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

from rfstage.errors import ImpossibleError
from rfstage.kinds import THROUGH
from rfstage.ladder import Branch
from rfstage.matching.exact import behind
from rfstage.matching.parts import four_figures, parallel_resistance

DEFAULT_LOADED_Q = 10.0
DEFAULT_Q_MARGIN = 2.0
# Of an air coil's parts at a tap, and of a link at the cold end; common practice, no source
COUPLINGS = {"tapped-coil": 0.4, "link": 0.35}


class Request(NamedTuple):
    """What is asked of a network: its name, the parts' Qs [-], one of two Qs or none, and what only some have.

    ``middle_resistance`` [ohm] between the sections of a pi-L; ``coupling`` [-] of a tapped coil's parts or a link;
    ``tap``, the share of a tapped coil's turns below it, instead of a Q; ``link``, ``"tuned"`` or ``"untuned"``.
    """

    network: str
    coil_q: float
    capacitor_q: float
    loaded_q: float | None = None
    input_q: float | None = None
    middle_resistance: float | None = None
    coupling: float | None = None
    tap: float | None = None
    link: str | None = None


class Task(NamedTuple):
    """A request between ``feed`` and ``load`` [ohm] at the carrier [Hz].

    ``wanted`` [ohm] is what the device must see, ``target`` what must follow the feed for that; ``near`` holds the
    parts for nearly the same impedances where they are known, a start that saves time.
    """

    request: Request
    feed: tuple[Branch, ...]
    wanted: complex
    target: complex
    load: complex
    carrier: float
    near: tuple[Branch, ...]

    @classmethod
    def between(
        cls,
        request: Request,
        *,
        feed: Sequence[Branch],
        wanted: complex,
        load: complex,
        carrier: float,
        near: Sequence[Branch] = (),
    ) -> Task:
        """Return the task; arguments as the attributes.

        Raises
        ------
        ImpossibleError
            If the losses of the feed leave nothing for a network.
        """
        try:
            target = behind(feed, wanted, carrier) if feed else wanted
        except ZeroDivisionError:
            target = complex(-1)
        if not target.real > 0:
            through = any(branch.place == THROUGH for branch in feed)
            lossy = "choke, blocking capacitor and transformer" if through else "choke and blocking capacitor"
            cure = "leave the transformer out, or " if through else ""
            raise ImpossibleError(
                f"the losses of {lossy} alone are more than the {four_figures(wanted)} ohm asked at the device leave "
                f"room for; {cure}raise tank.blocking, or supply.choke and supply.choke_q"
            )
        return cls(request, tuple(feed), wanted, target, load, carrier, tuple(near))

    @property
    def omega(self) -> float:
        """Angular frequency of the carrier [rad/s]."""
        return 2 * math.pi * self.carrier

    @property
    def capacitance(self) -> float:
        """Output capacitance of the device [F]."""
        return sum(float(branch.value) for branch in self.feed if branch.origin == "device")

    @property
    def transformed(self) -> bool:
        """Whether a transformer stands before the network."""
        return any(branch.place == THROUGH for branch in self.feed)

    @property
    def start(self) -> complex:
        """What the network begins at [ohm], choke, blocking and output capacitance left aside where that is exact."""
        return self.target if self.transformed else self.wanted

    @property
    def taken(self) -> float:
        """Input-side Q [-] that the output capacitance takes for itself."""
        if self.transformed:
            return max(0.0, -parallel_resistance(self.target) * (1 / self.target).imag)
        return self.omega * self.capacitance / (1 / self.wanted).real

    @property
    def least_shunt_q(self) -> float:
        """Input-side Q [-] that what must be tuned out behind the feed takes for itself."""
        return max(0.0, -parallel_resistance(self.target) * (1 / self.target).imag)
