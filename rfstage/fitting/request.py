"""What is asked of the parts: former, wire, series and margins; what is not given is chosen."""

from __future__ import annotations

from typing import NamedTuple

from rfstage.job import Job
from rfstage.parts.leads import LEADED, lead_for
from rfstage.parts.stress import Margins


class PartsRequest(NamedTuple):
    """Mean diameter of all coils and their wire [m], or None; E series; margins [-]; lead of a capacitor [H]."""

    former: float | None = None
    wire: float | None = None
    series: str = "E12"
    margins: Margins = Margins()
    lead: float = LEADED


def request_of(job: Job) -> PartsRequest:
    """Return what a job says of its parts."""
    usual = Margins()
    return PartsRequest(
        former=job.former,
        wire=job.wire,
        series=job.series or "E12",
        margins=Margins(
            voltage=job.voltage_margin or usual.voltage,
            current=job.current_margin or usual.current,
        ),
        lead=lead_for(job.carrier) if job.lead is None else job.lead,
    )
