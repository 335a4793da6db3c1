"""Read a measurement, whichever kind of file it is: level list, waveform (CSV or .npy), network-analyser file.

Nothing is ever unpickled: .npy is mapped with pickles refused, Touchstone is parsed as text.
"""

from __future__ import annotations

import warnings
from pathlib import Path
from tokenize import TokenError
from typing import Any

import numpy as np
from numpy.typing import NDArray

from rfstage.errors import FileError
from rfstage.fields import plain
from rfstage.files.columns import AMPERES, TIME, VOLTS, Column, read_head, titled
from rfstage.files.levellists import is_level_list, read_level_list
from rfstage.files.tables import unreadable
from rfstage.files.touchstone import read_network
from rfstage.files.waveforms import MOST_CHANNELS, Spacing, is_waveform, read_waveform
from rfstage.verify.capture import Capture, Channel
from rfstage.verify.sums import CHUNK
from rfstage.verify.tankfit import AnalyserData
from rfstage.verify.verification import Measurement

SHAPES = "(n,) with --sample-rate, or (n, 2) and (n, 3) with the time [s] first, then volts, then amperes"


def read_measurement(path: str | Path, *, sample_rate: float | None = None) -> Measurement:
    """Return a measurement from its file.

    Parameters
    ----------
    path : str or Path
        ``.s1p`` or ``.s2p``: a network-analyser file. ``.npy``: a waveform. Anything else: a table in text, a level
        list or a waveform by its head.
    sample_rate : float or None
        Of waveforms [Hz], instead of what the file says.

    Raises
    ------
    FileError
        If it can't be read as what it should be; with the line, of a text.
    """
    path = Path(path)
    kind = path.suffix.lower()
    if kind in (".s1p", ".s2p"):
        return read_analyser(path)
    if kind == ".npy":
        return read_array(path, sample_rate=sample_rate)
    head = read_head(path)
    if is_level_list(head):
        return read_level_list(path, head)
    if is_waveform(head):
        return read_waveform(path, head, sample_rate=sample_rate)
    columns = ", ".join(f"{plain(c.name)} ({plain(c.unit)})" for c in head.columns)
    raise FileError(
        f"{plain(path)}: line {head.line - 1}: columns {columns} are neither a level list (frequency, level) nor a "
        "waveform (time, one or two channels in V or A)"
    )


def read_analyser(path: Path) -> AnalyserData:
    """Return a network-analyser file against one real resistance.

    Raises
    ------
    FileError
        If it is no Touchstone file with as many ports as its name says, or its ports differ.
    """
    network = read_network(path, ports=int(path.suffix[2]))
    z0 = np.asarray(network.z0)
    r = float(z0.real.flat[0])
    if np.any(z0 != r):
        raise FileError(f"{plain(path)}: its ports have different or complex reference impedances; wanted one, real")
    return AnalyserData(
        plain(path), np.asarray(network.f, dtype=np.float64), np.asarray(network.s, dtype=np.complex128), r
    )


def read_array(path: Path, *, sample_rate: float | None) -> Capture:
    """Return a waveform from a .npy file, which stays where it is and is mapped.

    Raises
    ------
    FileError
        If it is no array of real numbers, of a shape that can be a waveform, all finite and evenly timed.
    """
    name = plain(path)
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # of headers in an old spelling
            array = np.load(path, mmap_mode="r", allow_pickle=False)
    except OSError as error:
        raise FileError(unreadable(name, error)) from None
    except (ValueError, EOFError, SyntaxError, TypeError, OverflowError, MemoryError, TokenError):
        raise FileError(f"{name}: is not a .npy file of plain numbers that can be read") from None
    if not isinstance(array, np.ndarray):
        raise FileError(f"{name}: is not a .npy file of one array")
    channels, times = _columns(array, name, sample_rate)
    for channel in channels:
        if channel.samples.dtype.kind not in "iuf":
            raise FileError(f"{name}: holds {channel.samples.dtype} numbers; wanted real ones")
        _check_finite(channel, name)
    if sample_rate is not None:
        return Capture(name, 1 / sample_rate, channels)
    if times is None:
        raise FileError(f"{name}: has no column of time; give --sample-rate")
    interval = _interval(*times, name)
    return Capture(name, interval, channels)


def _columns(
    array: NDArray[Any], name: str, sample_rate: float | None
) -> tuple[tuple[Channel, ...], tuple[NDArray[Any], float] | None]:
    """Return the channels of an array, and its times with their factor to seconds if it has any."""
    if array.dtype.names is not None and array.ndim == 1:
        found = [(titled(text, name), array[text]) for text in array.dtype.names]
    elif array.ndim == 1:
        found = [(Column("samples", VOLTS, "V", 1.0), array)]
    elif array.ndim == 2 and 1 <= array.shape[1] <= MOST_CHANNELS + 1:
        kinds = [
            Column("time", TIME, "s", 1.0),
            Column("voltage", VOLTS, "V", 1.0),
            Column("current", AMPERES, "A", 1.0),
        ]
        kinds = kinds[: array.shape[1]] if sample_rate is None or array.shape[1] == 3 else kinds[1 : 1 + array.shape[1]]
        found = [(column, array[:, k]) for k, column in enumerate(kinds)]
    else:
        turned = " (turn it round?)" if array.ndim == 2 and array.shape[0] <= MOST_CHANNELS + 1 else ""
        raise FileError(f"{name}: has the shape {array.shape}{turned}; wanted {SHAPES}")
    times = next(((values, column.factor) for column, values in found if column.quantity == TIME), None)
    channels = tuple(
        Channel(c.name, _unit(c, values), values if c.factor == 1 else values * c.factor)
        for c, values in found
        if c.quantity in (VOLTS, AMPERES)
    )
    if not 1 <= len(channels) <= MOST_CHANNELS or len(channels) + (times is not None) != len(found):
        raise FileError(f"{name}: has {len(channels)} channels in V or A; wanted one or two, and a time [s] or none")
    return channels, times


def _unit(column: Column, values: NDArray[Any]) -> str:
    """Return the unit of a channel: whole numbers are counts of a converter, and have none."""
    return "" if values.dtype.kind in "iu" and column.quantity == VOLTS else column.quantity


def _check_finite(channel: Channel, name: str) -> None:
    for first in range(0, channel.samples.size, CHUNK):
        good = np.isfinite(channel.samples[first : first + CHUNK])
        if not good.all():
            raise FileError(
                f"{name}: sample {first + int(np.argmin(good)) + 1} of channel {channel.name} is not a finite number"
            )


def _interval(times: NDArray[Any], factor: float, name: str) -> float:
    """Return the interval [s] of the times of an array; the factor makes them seconds."""
    if times.size < 2:
        raise FileError(f"{name}: holds {times.size} samples; wanted more to see a wave in")
    spacing = Spacing()
    for first in range(0, times.size, CHUNK):
        wrong = spacing.take(factor * np.asarray(times[first : first + CHUNK], dtype=np.float64))
        if wrong:
            raise FileError(f"{name}: sample {spacing.at + 1}: {wrong}")
    interval = spacing.interval()
    if interval is None:
        raise FileError(f"{name}: the time is uneven: its interval changes along the record")
    return interval
