"""Decimal numbers of a regular text, many at once: ``-1.23e-04,0.5`` and a line's end, thousands of times over.

Fields of one layout (length, sign, place of point and exponent) lie above each other as a matrix of digits, and their
values are one product with powers of ten. It is exact: whole numbers below 2^53, then one division or multiplication
by a power of ten that a double holds, which rounds correctly. What does not fit is left to slower readers.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Codes = NDArray[np.uint8]
Array = NDArray[np.float64]
Places = NDArray[np.int64]

LONGEST = 24  # characters of one number
MOST_DIGITS = 15  # of its mantissa: below 2^53 whatever they are
MOST_POWER = 22  # 10^22 is the last power of ten that a double holds exactly
MOST_LAYOUTS = 100
_LINE_END, _POINT, _E, _ZERO = ord("\n"), ord("."), ord("e"), ord("0")
_SIGNS = np.zeros(256, dtype=np.int64)
_SIGNS[ord("+")], _SIGNS[ord("-")] = 1, 2
_POWERS = 10.0 ** np.arange(MOST_POWER + 1)


def decimal_rows(block: bytes, split: str, columns: int) -> Array | None:
    r"""Return the numbers of whole lines, shape (rows, columns), or None where they are not of the regular kind.

    Every line must hold as many numbers as there are columns, and the block end with a line's end.

    Examples
    --------
    >>> decimal_rows(b"-1.5e-3,2\n4,0.25\n", ",", 2).tolist()
    [[-0.0015, 2.0], [4.0, 0.25]]
    >>> decimal_rows(b"1,2\n3\n", ",", 2) is None
    True
    """
    if b"\r" in block:
        block = block.replace(b"\r\n", b"\n")
    codes = np.frombuffer(block, dtype=np.uint8)
    marked = np.flatnonzero((codes == ord(split)) | (codes == _LINE_END) | (codes == _POINT) | ((codes | 32) == _E))
    marks = codes[marked]
    at_end = np.flatnonzero((marks == ord(split)) | (marks == _LINE_END))
    ends = marked[at_end]
    if ends.size == 0 or ends.size % columns or ends[-1] != codes.size - 1:
        return None
    closing = marks[at_end].reshape(-1, columns)
    if not (np.all(closing[:, -1] == _LINE_END) and np.all(closing[:, :-1] == ord(split))):
        return None
    starts = np.concatenate(([0], ends[:-1] + 1))
    # before a field's end stands its e, if it has one, and before that its point; counted from 1, 0 where there is none
    raised = (marks[at_end - 1] | 32) == _E
    exponent = np.where(raised, marked[at_end - 1] - starts + 1, 0)
    before = at_end - 1 - raised
    pointed = marks[before] == _POINT
    point = np.where(pointed, marked[before] - starts + 1, 0)
    if np.count_nonzero(raised) + np.count_nonzero(pointed) + ends.size != marks.size:
        return None  # a field has two of one kind, or its point behind its e
    values = _values(codes, starts, ends - starts, point, exponent)
    return None if values is None else values.reshape(-1, columns)


def _values(codes: Codes, starts: Places, length: Places, point: Places, exponent: Places) -> Array | None:
    if length.min() < 1 or length.max() > LONGEST:
        return None
    sign = _SIGNS[codes[starts]]
    sign_of_exponent = np.where(exponent > 0, _SIGNS[codes[starts + exponent]], 0)
    layout = length | point << 5 | exponent << 10 | sign << 15 | sign_of_exponent << 17
    kinds = np.flatnonzero(np.bincount(layout, minlength=1 << 19))
    if kinds.size > MOST_LAYOUTS:
        return None
    values = np.empty(starts.size)
    for kind in kinds.tolist():
        rows = np.flatnonzero(layout == kind)
        some = _of_one_layout(codes, starts[rows], kind)
        if some is None:
            return None
        values[rows] = some
    return values


def _of_one_layout(codes: Codes, starts: Places, kind: int) -> Array | None:
    length, point, exponent = kind & 31, (kind >> 5 & 31) - 1, (kind >> 10 & 31) - 1
    sign, sign_of_exponent = kind >> 15 & 3, kind >> 17
    end = exponent if exponent >= 0 else length
    if point > end:
        return None
    digits = np.lib.stride_tricks.sliding_window_view(codes, length)[starts] - np.uint8(_ZERO)
    places = [k for k in range(1 if sign else 0, end) if k != point]
    if not 1 <= len(places) <= MOST_DIGITS:
        return None
    mantissa = _whole(digits, places)
    if mantissa is None:
        return None
    power: int | Places = point + 1 - end if point >= 0 else 0
    if exponent >= 0:
        places = list(range(exponent + (2 if sign_of_exponent else 1), length))
        raised = _whole(digits, places) if 1 <= len(places) <= 3 else None
        if raised is None:
            return None
        power = power + (-raised if sign_of_exponent == 2 else raised).astype(np.int64)
    if np.max(np.abs(power)) > MOST_POWER:
        return None
    scale = _POWERS[np.abs(power)]
    value: Array = np.where(np.asarray(power) < 0, mantissa / scale, mantissa * scale)
    return -value if sign == 2 else value


def _whole(digits: Codes, places: list[int]) -> Array | None:
    """Return the whole numbers that the digits in these places make, or None if any is no digit."""
    some = digits[:, places]
    if some.max() > 9:
        return None
    weights = 10.0 ** np.arange(len(places) - 1, -1, -1)
    found: Array = some.astype(np.float64) @ weights
    return found
