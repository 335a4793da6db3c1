"""One network by itself: what `match` answers."""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from rfstage.designs.settings import load_over_frequency
from rfstage.harmonics import terminations
from rfstage.ladder import Ladder
from rfstage.load import MeasuredLoad
from rfstage.matching.networks import solve_network
from rfstage.matching.tank import Tank, describe, tank_efficiency
from rfstage.matching.task import Request


class SingleNetwork(NamedTuple):
    """A network, the load at the carrier [ohm], (order, dB) of its harmonic transfer.

    ``continued`` names the orders at which a measured load was continued beyond its table.
    """

    tank: Tank
    load: complex
    transfer: tuple[tuple[int, float], ...]
    continued: tuple[int, ...] = ()


def single_network(
    *,
    wanted: complex,
    load: complex | MeasuredLoad,
    carrier: float,
    network: str = "pi",
    loaded_q: float | None = None,
    input_q: float | None = None,
    coil_q: float = 150.0,
    capacitor_q: float = 1000.0,
    power: float | None = None,
    harmonics: int = 10,
    middle_resistance: float | None = None,
    coupling: float | None = None,
    tap: float | None = None,
    link: str | None = None,
) -> SingleNetwork:
    """Return one network that shows ``wanted`` when ``load`` is connected.

    Parameters
    ----------
    wanted : complex
        What the device should see [ohm].
    load : complex or MeasuredLoad
        The load [ohm].
    carrier : float
        Hz.
    network : str
        One of `rfstage.tankfields.NETWORKS`.
    loaded_q, input_q, coil_q, capacitor_q : float
        Of a pi at most one of the first two [-]; of the parts, infinite for lossless.
    power : float or None
        Power at the load [W], for the parts' stresses.
    harmonics : int
        Highest order of the transfer.
    middle_resistance, coupling, tap, link : float or str
        What only some networks have, as in `rfstage.matching.task.Request`.

    Returns
    -------
    SingleNetwork
        The transfer is the load current at n times the carrier against the carrier's, for equal device
        currents [dB].

    Raises
    ------
    RfstageError
        If no such network exists, or the load does not reach the carrier.

    Examples
    --------
    >>> made = single_network(wanted=1000, load=50, carrier=3.5e6, input_q=12, coil_q=math.inf, capacitor_q=math.inf)
    >>> [round(level, 2) for _, level in made.transfer[:2]]
    [-38.21, -50.2]
    """
    over_frequency = load_over_frequency(load, carrier)
    at_carrier = complex(over_frequency.impedance(carrier))
    request = Request(network, coil_q, capacitor_q, loaded_q, input_q, middle_resistance, coupling, tap, link)
    branches = solve_network(request, feed=(), wanted=complex(wanted), load=at_carrier, carrier=carrier)
    ladder = Ladder(branches)
    orders = range(2, harmonics + 1)
    current = None
    if power is not None:
        device_power = power / tank_efficiency(branches, at_carrier, carrier)
        current = math.sqrt(2 * device_power / complex(ladder.impedance(carrier, at_carrier)).real)
    tank = describe(
        network,
        (),
        branches,
        load=over_frequency,
        carrier=carrier,
        current=current,
        trough_dip=None,
        terminations=terminations(ladder, over_frequency, carrier, abs(wanted), orders),
    )
    frequencies = carrier * np.arange(1, harmonics + 1)
    z = over_frequency.impedance(frequencies)
    amperes = np.abs(ladder.transimpedance(frequencies, z) / z)
    levels = 20 * np.log10(amperes / amperes[0])
    load_table = over_frequency if isinstance(over_frequency, MeasuredLoad) else None
    continued = load_table.beyond(carrier, harmonics) if load_table else ()
    return SingleNetwork(tank, at_carrier, tuple((n, float(levels[n - 1])) for n in orders), continued)
