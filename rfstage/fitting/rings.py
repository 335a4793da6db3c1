"""Ring cores for the choke and the transformer: the smallest whose flux density, all orders and dc, stays small enough.

::

    RF flux       peak of ∫v dt over the cycle, v the electrode's voltage less its mean   B = (∫v dt)/(N·A)
    dc flux       L·I/(N·A), in the choke
    the two together are held against the limit of `rfstage.parts.toroid.flux_limit`, which falls with frequency
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from rfstage.branch import Branch
from rfstage.errors import ImpossibleError, RfstageError
from rfstage.parts.cores import CORES, Core
from rfstage.parts.toroid import ToroidCoil, flux_limit, toroid_coil
from rfstage.quantity import show
from rfstage.steady import SteadyState

SHORT, LONG = 0.95, 1.6  # times the wanted inductance: what a choke's whole turns may give
LONG_TRANSFORMER = 6.0  # the same of a transformer, which more magnetizing inductance does no harm
WIRE = 0.45e-3  # m of wire diameter for one ampere rms, rising as its root (common practice, no source)
TURNS_OFF = 0.05  # of the ratio: what whole turns on both sides may miss


class Ring(NamedTuple):
    """A coil on a ring core.

    ``far_turns`` are a transformer's at the network's side, None for a choke; ``wanted`` inductance [H]; ``flux`` and
    ``limit`` [T], both peak.
    """

    name: str
    coil: ToroidCoil
    far_turns: int | None
    wanted: float
    flux: float
    limit: float


def volt_seconds(state: SteadyState) -> float:
    """Return the peak of the RF flux linkage that the electrode's voltage makes in a coil across it [V·s].

    Examples
    --------
    >>> from rfstage.designs.design import design
    >>> from rfstage.job import Job
    >>> state = design(Job(carrier=7.1e6, power=10.0, conduction_angle=120.0, supply=13.8, network="pi")).settled
    >>> round(volt_seconds(state) * 2 * math.pi * 7.1e6, 1)
    13.3
    """
    wave = state.waveform.voltage
    spectrum = np.fft.rfft(wave)
    orders = np.arange(spectrum.size)
    linked = np.zeros_like(spectrum)
    linked[1:] = spectrum[1:] / (2j * math.pi * state.stage.carrier * orders[1:])
    return float(np.abs(np.fft.irfft(linked, wave.size)).max())


def choke_ring(name: str, inductance: float, state: SteadyState) -> Ring:
    """Return the smallest ring core for a choke [H] that carries the stage's direct current.

    Raises
    ------
    ImpossibleError
        If none of the data does it, or there is no limit at this carrier.
    """
    return _smallest(name, inductance, state, dc=abs(state.dc_current), rms=abs(state.dc_current), ratio=None)


def transformer_ring(branch: Branch, state: SteadyState) -> Ring:
    """Return the smallest ring core for a transformer, whole turns on both sides; errors as `choke_ring`."""
    borne = next(b for b in state.branches if b.name == branch.name)
    return _smallest(
        branch.name, float(branch.second), state, dc=0.0, rms=borne.rms_current, ratio=1 / float(branch.value)
    )


def _smallest(name: str, wanted: float, state: SteadyState, *, dc: float, rms: float, ratio: float | None) -> Ring:
    carrier = state.stage.carrier
    limit = flux_limit(carrier)
    if limit is None:
        raise ImpossibleError(f"no limit of flux density is known at {show(carrier, 'Hz')}, so no core is chosen")
    linkage = volt_seconds(state)
    most = LONG if ratio is None else LONG_TRANSFORMER
    # a wide-band transformer wants few turns, and so a ferrite
    kinds = ("powder", "ferrite") if ratio is None else ("ferrite",)
    for core in sorted(CORES.values(), key=lambda c: c.outer**2 * c.height):
        for turns in _turns(core, wanted, ratio) if core.kind in kinds else ():
            made = core.factor * turns**2
            flux = (linkage + made * dc) / (turns * core.area)
            if not SHORT * wanted <= made <= most * wanted or flux > limit:
                continue
            far = None if ratio is None else max(1, round(turns * ratio))
            try:
                coil = toroid_coil(core, max(turns, far or 0), carrier=carrier)
            except RfstageError:
                continue
            if coil.wire_diameter < WIRE * math.sqrt(rms):
                continue
            own = toroid_coil(core, turns, carrier=carrier, wire_diameter=coil.wire_diameter)
            return Ring(name, own, far, wanted, flux, limit)
    raise ImpossibleError(
        f"no ring core of the data holds {show(wanted, 'H')} under {1e3 * limit:.2g} mT of flux density, all orders "
        "and dc, with wire for its current: an air coil, a rod, or cores stacked"
    )


def _turns(core: Core, wanted: float, ratio: float | None) -> tuple[int, ...]:
    """Return the turns to try on a core: those about the inductance, and of a transformer those that keep its ratio."""
    least = max(1, math.ceil(math.sqrt(SHORT * wanted / core.factor)))
    tried = range(least, least + (2 if ratio is None else 4))
    if ratio is None:
        return tuple(tried)
    return tuple(n for n in tried if abs(max(1, round(n * ratio)) / (n * ratio) - 1) <= TURNS_OFF)
