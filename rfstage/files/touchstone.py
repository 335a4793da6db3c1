"""Touchstone files through scikit-rf: read a measured load, write the two-port of a stage.

scikit-rf's ``Network(path)`` tries to unpickle a file before it parses it, so text is read here and only
handed over; a prescan finds the line of anything that is not Touchstone.
"""

from __future__ import annotations

import io
import math
import warnings
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from rfstage.designs.design import Design
from rfstage.errors import FileError
from rfstage.fields import plain
from rfstage.files.tables import unreadable
from rfstage.ladder import Ladder
from rfstage.load import MeasuredLoad
from rfstage.quantity import exact_complex, exact_text
from rfstage.stagevalues import described, losses_described
from rfstage.verify.scattering import two_port

PORT_RESISTANCE = 50.0  # ohm
_UNITS = ("hz", "khz", "mhz", "ghz")
_FORMATS = ("ri", "ma", "db")


def read_load(path: str | Path) -> MeasuredLoad:
    """Return a measured load from a Touchstone one-port.

    Parameters
    ----------
    path : str or Path
        A ``.s1p`` file of reflection (or impedance) over rising frequency.

    Raises
    ------
    FileError
        If the file can't be read or is not a Touchstone one-port, with the line.
    InputError
        If the load in it is not passive.
    """
    path = Path(path)
    network = read_network(path, ports=1)
    z = np.asarray(network.z[:, 0, 0], dtype=np.complex128)
    return MeasuredLoad(np.asarray(network.f, dtype=np.float64), z, str(path))


def read_network(path: Path, *, ports: int) -> Any:
    """Return scikit-rf's network of a Touchstone file with this many ports; errors as `read_load`."""
    name = plain(path)
    try:
        raw = path.read_bytes()
    except OSError as error:
        raise FileError(unreadable(name, error)) from None
    text = _checked(raw.decode("utf-8", errors="replace").lstrip("\ufeff"), name, ports)
    import skrf

    stream = io.StringIO(text)
    stream.name = f"load.s{ports}p"
    try:
        network = skrf.Network()
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # of frequencies that fall: the load itself refuses those
            network.read_touchstone(stream)
    except (ValueError, IndexError, KeyError, TypeError, AttributeError, NotImplementedError, EOFError):
        raise FileError(f"{name}: is not a Touchstone file that can be read") from None
    if network.nports != ports:
        raise FileError(f"{name}: has {network.nports} ports; wanted {ports}")
    return network


def _checked(text: str, name: str, ports: int) -> str:
    """Return the text with its option line in the usual order, or say what line is wrong."""
    out: list[str] = []
    option_seen = False
    numbers = 0
    for count, line in enumerate(text.splitlines(), start=1):
        body = line.split("!")[0].strip()
        if not body:
            continue
        if body.startswith("#"):
            if not option_seen:
                out.append(_option_line(body, name, count))
            option_seen = True
        elif body.startswith("["):
            out.append(body)
        else:
            columns = _count_numbers(body, name, count)
            if ports == 1 and columns != 3:
                raise FileError(
                    f"{name}: line {count} has {columns} columns; a one-port has 3, a frequency and two numbers, so "
                    + ("a row is cut" if columns < 3 else "the file is no one-port")
                )
            numbers += columns
            out.append(body)
    if not option_seen:
        raise FileError(f"{name}: is not a Touchstone file: it has no option line (such as # MHz S RI R 50)")
    row = 1 + 2 * ports**2
    if numbers == 0 or numbers % row:
        raise FileError(
            f"{name}: holds {numbers} numbers; a {ports}-port has {row} for each frequency, so a row is cut "
            "or the file has another number of ports"
        )
    return "\n".join(out) + "\n"


def _count_numbers(body: str, name: str, line: int) -> int:
    words = body.split()
    for word in words:
        try:
            value = float(word)
        except ValueError:
            hint = "; write a decimal point, not a comma" if "," in word else ""
            raise FileError(f"{name}: line {line}: {word[:40]!r} is not a number{hint}") from None
        if not math.isfinite(value):
            raise FileError(f"{name}: line {line}: {word!r} is not a finite number")
    return len(words)


def _option_line(body: str, name: str, line: int) -> str:
    words = body[1:].lower().split()
    unit, parameter, form, resistance = "ghz", "s", "ma", "50"
    k = 0
    while k < len(words):
        word = words[k]
        if word in _UNITS:
            unit = word
        elif word in _FORMATS:
            form = word
        elif word in ("s", "z", "y"):
            parameter = word
        elif word == "r" and k + 1 < len(words):
            k += 1
            resistance = words[k]
            try:
                good = 0 < float(resistance) < math.inf
            except ValueError:
                good = False
            if not good:
                raise FileError(f"{name}: line {line}: reference resistance {resistance!r}; wanted above 0 ohm")
        else:
            raise FileError(f"{name}: line {line}: {word!r} is not known in an option line (such as # MHz S RI R 50)")
        k += 1
    return f"# {unit} {parameter} {form} r {resistance}"


def grid(carrier: float, highest_order: int) -> NDArray[np.float64]:
    """Return the frequencies of an export [Hz]: dense around the carrier, each harmonic exactly on it."""
    top = max(10, highest_order)
    ratios = np.concatenate(
        [np.linspace(0.1, 0.9, 41), np.linspace(0.9, 1.1, 201), np.linspace(1.1, top + 0.5, 50 * top)]
    )
    exact = carrier * np.arange(1, top + 1)
    others = carrier * np.round(ratios, 9)
    apart = np.abs(others[:, np.newaxis] / exact - 1).min(axis=1) > 1e-9
    return np.unique(np.concatenate([others[apart], exact]))


def touchstone_text(design: Design) -> str:
    """Return the Touchstone text of a design's two-port, from device node to load, with its comments.

    Choke and blocking capacitor are in it; the output capacitance is left out, as it belongs to the
    device's own model.
    """
    branches = [branch for branch in design.stage.ladder.branches if branch.origin != "device"]
    frequencies = grid(design.job.carrier, design.settings.highest_order)
    s = two_port(Ladder(branches), frequencies, PORT_RESISTANCE)
    if not np.all(np.isfinite(s)):
        raise FileError("the two-port is not finite at every frequency; nothing to export")
    return _network_text(frequencies, s, _comments(design))


def _network_text(frequencies: NDArray[np.float64], s: NDArray[np.complex128], comments: list[str]) -> str:
    import skrf

    network = skrf.Network(frequency=skrf.Frequency.from_f(frequencies, unit="Hz"), s=s, z0=PORT_RESISTANCE)
    body: str = network.write_touchstone("stage.s2p", return_string=True, skrf_comment=False, form="ri", version="1.0")
    text = "".join(f"! rfstage: {_clean(line)}\n" for line in comments) + body
    stream = io.StringIO(text)
    stream.name = "stage.s2p"
    again = skrf.Network()
    again.read_touchstone(stream)
    if not (np.array_equal(again.f, frequencies) and np.array_equal(again.s, s)):
        raise FileError("the Touchstone text does not read back as what was written; nothing was written")
    return text


def _clean(line: str) -> str:
    return "".join(c if 32 <= ord(c) < 127 else "?" for c in line)


def _comments(design: Design) -> list[str]:
    job = design.job
    lines = [
        "two-port from the device's output node (port 1) to the load (port 2), 50 ohm at both",
        "choke and blocking capacitor are in it; the device's output capacitance is left out",
        f"carrier {exact_text(job.carrier, 'Hz')}, {exact_text(job.power, 'W')} at the load, conduction angle "
        f"{exact_text(job.conduction_angle, 'deg')}, supply {exact_text(job.supply, 'V')}",
        f"device's load resistance {design.point.load_resistance:.6g} ohm, designed to the {design.designed_to} power",
        f"load {exact_complex(design.settings.load_impedance)} ohm at the carrier; harmonics lie exactly on the grid",
    ]
    for branch in design.stage.ladder.branches:
        words = ", ".join((*described(branch, 6), *losses_described(branch)))
        left = ", left out" if branch.origin == "device" else ""
        lines.append(f"{branch.name} {branch.place} {branch.kind} {_ascii(words)}{left}")
    return lines


def _ascii(text: str) -> str:
    return text.replace("µ", "u").replace("Ω", "ohm")
