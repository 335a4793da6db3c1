"""Ring cores of the trade: published inductance factors and dimensions, each with its source. Standard library only.

Powder cores are named by outer diameter and mix (T-50-2), ferrites by outer diameter and type (FT-50-43). The factor is
what the maker measured: computed from dimensions and permeability it comes out up to 14 % off.
"""

from __future__ import annotations

from typing import NamedTuple

from rfstage.errors import InputError
from rfstage.fields import nearest
from rfstage.parts.gauge import INCH

_REPRINTS = "maker's table, alike in three reprints"
_FERRITE = "maker's table, in a reprint"
_NEWER = "maker's newer table, in a reprint"
_DIMENSIONS = "maker's catalogue, from memory"


class Core(NamedTuple):
    """A ring core: dimensions [m], inductance factor [H a turn squared], sources.

    ``older_factor`` is what an earlier table of the maker has, where the material has changed, or None.
    """

    name: str
    kind: str
    material: str
    outer: float
    inner: float
    height: float
    factor: float
    source: str
    older_factor: float | None = None
    dimensions_source: str = _DIMENSIONS

    @property
    def area(self) -> float:
        """Cross-section, taken as a rectangle [m²]; the rounded edges of real cores are left out."""
        return (self.outer - self.inner) / 2 * self.height


# size -> outer diameter, inner diameter, height [in]; factor of mix 2 and of mix 6 [uH for 100 turns]
_POWDER = {
    "T-37": (0.375, 0.205, 0.128, 40, 30),
    "T-44": (0.440, 0.229, 0.159, 52, 42),
    "T-50": (0.500, 0.303, 0.190, 49, 40),
    "T-68": (0.690, 0.370, 0.190, 57, 47),
    "T-80": (0.795, 0.495, 0.250, 55, 45),
    "T-94": (0.942, 0.560, 0.312, 84, 70),
    "T-106": (1.060, 0.570, 0.437, 135, 116),
    "T-130": (1.300, 0.780, 0.437, 110, 96),
    "T-157": (1.570, 0.950, 0.570, 140, 115),
    "T-184": (1.840, 0.950, 0.710, 240, 195),
    "T-200": (2.000, 1.250, 0.550, 120, 100),
}
# size -> outer diameter, inner diameter, height [in]; factor of type 61, of type 43 in the older table, and of type 43
# in the newer one where it is there [mH for 1000 turns]
_FERRITES = {
    "FT-37": (0.375, 0.187, 0.125, 55.3, 420, 375),
    "FT-50": (0.500, 0.281, 0.188, 68.0, 523, 470),
    "FT-50A": (0.500, 0.312, 0.250, 75.0, 570, 510),
    "FT-82": (0.825, 0.520, 0.250, 73.3, 557, 500),
    "FT-114": (1.142, 0.748, 0.295, 79.3, 603, 540),
    "FT-140": (1.400, 0.900, 0.500, 140.0, 952, None),
    "FT-240": (2.400, 1.400, 0.500, 173.0, 1240, None),
}


def _all_cores() -> dict[str, Core]:
    cores = []
    for size, (outer, inner, height, mix_2, mix_6) in _POWDER.items():
        inches = outer * INCH, inner * INCH, height * INCH
        for mix, per_hundred in (("2", mix_2), ("6", mix_6)):
            cores.append(Core(f"{size}-{mix}", "powder", mix, *inches, per_hundred / 10 * 1e-9, _REPRINTS))
    for size, (outer, inner, height, type_61, older, newer) in _FERRITES.items():
        inches = outer * INCH, inner * INCH, height * INCH
        cores.append(Core(f"{size}-61", "ferrite", "61", *inches, type_61 * 1e-9, _FERRITE))
        cores.append(
            Core(f"{size}-43", "ferrite", "43", *inches, older * 1e-9, _FERRITE)
            if newer is None
            else Core(f"{size}-43", "ferrite", "43", *inches, newer * 1e-9, _NEWER, older * 1e-9)
        )
    return {core.name: core for core in cores}


CORES = _all_cores()


def core_named(name: str) -> Core:
    """Return the core of a name; capitals and dashes do not matter.

    Raises
    ------
    InputError
        If no core has that name, with the nearest ones.

    Examples
    --------
    >>> core = core_named("t50-2")
    >>> core.name, round(core.factor * 1e9, 2)
    ('T-50-2', 4.9)
    """
    wanted = _folded(name)
    for core in CORES.values():
        if _folded(core.name) == wanted:
            return core
    raise InputError(f"core: got {name!r}, which is not in the data{_nearest_cores(name)}")


def _folded(name: str) -> str:
    return "".join(c for c in name.upper() if c.isalnum())


def _nearest_cores(name: str) -> str:
    """Return the names of up to three near cores, or of the sizes there are."""
    from difflib import get_close_matches

    near = get_close_matches(name.upper().strip(), CORES, n=3, cutoff=0.7)
    if len(near) == 1:
        return nearest(near[0], near)
    if near:
        return f" (did you mean {', '.join(near[:-1])} or {near[-1]}?)"
    return f"; it has mixes 2 and 6 of {', '.join(_POWDER)}, and types 43 and 61 of {', '.join(_FERRITES)}"
