"""The steady state of a real stage, by a balance of harmonics.

::

    settling     the entries: one stage with its orders chosen, or many at once
    single       what the entries ask of stages, answered by those of one device
    pair         the same for pairs of devices: the impedance of each mode, a balanced pair as one device
    pairaccount  powers, losses and stresses of a pair
    report       currents, powers, stresses and harmonics from a solution
    enough       whether the orders suffice
    solve        Newton, then a softened knee, then drive steps
    balance      the equations, their exact Jacobian, damped Newton, a stage axis in front of everything
    circuit      stages as arrays: the ladder's impedance at all orders, the device under drive
    network      the ladders of many stages over all orders
    modes        a pair's even and odd mode
    state        what is handed out
"""

from rfstage.steady.settling import settle, settle_many
from rfstage.steady.state import BranchStress, DeviceShare, HarmonicLevel, OrdersChange, SteadyState, Waveform

__all__ = [
    "BranchStress",
    "DeviceShare",
    "HarmonicLevel",
    "OrdersChange",
    "SteadyState",
    "Waveform",
    "settle",
    "settle_many",
]
