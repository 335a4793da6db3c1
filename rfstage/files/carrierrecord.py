"""One tank for several carriers as JSON."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from rfstage.designs.carriers import Tuned
from rfstage.files.records import VERSION, complex_pair, design_record


def carriers_record(tuned: Sequence[Tuned]) -> dict[str, Any]:
    """Return the carriers as ``rfstage.carriers``, version 1; a key of what does not exist is null."""
    return {
        "format": "rfstage.carriers",
        "version": VERSION,
        "network": tuned[0].design.tank.network,
        "carriers": [
            {
                "carrier_hz": t.design.job.carrier,
                "loaded_q": t.design.tank.loaded_q,
                "decided_by": t.decided_by or None,
                "settings": [
                    {
                        "part": s.part,
                        "unit": s.unit,
                        "value": s.value,
                        "turns_share": s.turns,
                        "least": None if s.variable is None else s.variable.least,
                        "most": None if s.variable is None else s.variable.most,
                        "within": s.within,
                    }
                    for s in t.settings
                ],
                "loads": [
                    {
                        "vswr": m.vswr,
                        "phase_deg": m.phase,
                        "load_ohm": complex_pair(m.load),
                        "matched": m.matched,
                        "tap_moved": m.tap_moved,
                        "settings": dict(m.settings),
                        "change": m.change or None,
                    }
                    for m in t.loads
                ],
                "design": design_record(t.design, []),
            }
            for t in tuned
        ],
    }
