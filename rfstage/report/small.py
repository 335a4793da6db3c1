"""The pages of the small commands: a current pulse, one network by itself."""

from __future__ import annotations

from collections.abc import Sequence

from rich.text import Text

from rfstage.cautions import about_load_file
from rfstage.matching.tank import Tank
from rfstage.quantity import show, show_complex
from rfstage.report.circuit import circuit
from rfstage.report.design import tank_lines
from rfstage.report.page import NO_BREAK, Cell, Look, columns, heading, note


def pulse_page(
    look: Look,
    *,
    angle: float,
    exponent: float,
    operating_class: str,
    coefficients: Sequence[float],
    fundamental_to_dc: float,
) -> list[Text]:
    """Return the coefficients of a pulse of this conduction angle [deg]."""
    a = coefficients
    lines = heading(look, f"Current pulse, {angle:g}° conduction, class {operating_class}, exponent {exponent:g}")
    rows = [[Cell("order", "dim", right=True), Cell("share of the peak", "dim", right=True)]]
    rows += [
        [Cell(str(n), right=True), Cell(f"{value:+z.6f}".replace("-", "−"), right=True)] for n, value in enumerate(a)
    ]
    lines += columns(look, rows)
    return lines + note(
        look,
        f"fundamental over dc {fundamental_to_dc:.5f}; greatest efficiency {50 * fundamental_to_dc:.2f} % "
        "(full swing, harmonics shorted, no losses)",
    )


def match_page(
    look: Look,
    *,
    tank: Tank,
    load: complex,
    carrier: float,
    transfer: Sequence[tuple[int, float]],
    continued: Sequence[int] = (),
) -> list[Text]:
    """Return one network at its carrier [Hz], with what it does to harmonics from a current generator."""
    at = f"{show_complex(tank.impedance)} at the device, {show(carrier, 'Hz', 5)}"
    lines = heading(look, f"Network {tank.network}, {at}")
    lines += circuit(look, tank.parts, start="device", end=f"load {show_complex(load)}")
    lines += heading(look, "Tank") + tank_lines(tank, look)
    words = "  ".join(f"{n}:{NO_BREAK}{level:.1f}".replace("-", "−") for n, level in transfer)
    lines += heading(look, "Harmonic transfer, dB against the carrier")
    lines += note(look, words) + note(look, "Load current for equal device currents.", style="dim")
    for caution in about_load_file(continued):
        lines += note(look, f"! {caution.topic}: {caution.text}", hanging=2)
    return lines
