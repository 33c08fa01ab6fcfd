"""Compiled loops that read times and numbers from the bytes of large tables.

They take the fields that `kernels.split_lines` found, one per row, for the rows wanted. What they
do not understand at once they mark as odd, and leave to the strict reader (values.py).
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

from gtfs_schematic.feed.kernels import Bytes, Ints, Places

NO_TIME = -1

_SPACE, _PLUS, _MINUS, _DOT, _ZERO, _SIX, _NINE, _COLON, _TILDE = (
    32,
    43,
    45,
    46,
    48,
    54,
    57,
    58,
    126,
)


@njit(cache=True, nogil=True)
def _clock(buffer: Bytes, start: int, end: int) -> int:
    """Give the seconds of H:MM:SS, HH:MM:SS or HHH:MM:SS; `NO_TIME` for all else."""
    if not 7 <= end - start <= 9:
        return NO_TIME
    value, unit = 0, 1
    for back in range(1, end - start + 1):
        byte = np.int64(buffer[end - back])
        if back in (3, 6):
            if byte != _COLON:
                return NO_TIME
            unit = 60 if back == 3 else 3600
        elif not _ZERO <= byte <= _NINE or (back in (2, 5) and byte >= _SIX):
            return NO_TIME
        else:
            value += unit * int(byte - _ZERO)
            unit *= 10
    return value


@njit(cache=True, nogil=True)
def parse_times(block: tuple[Bytes, Places, Places], wanted: Bytes, odd: Bytes, out: Ints) -> None:
    """Read times of day as seconds; empty is `NO_TIME`, what is no time is odd."""
    buffer, starts, ends = block
    for row in range(len(starts)):
        out[row] = NO_TIME
        if wanted[row] and starts[row] < ends[row]:
            out[row] = _clock(buffer, starts[row], ends[row])
            if out[row] == NO_TIME:
                odd[row] = 1


@njit(cache=True, nogil=True)
def parse_wholes(block: tuple[Bytes, Places, Places], wanted: Bytes, odd: Bytes, out: Ints) -> None:
    """Read whole numbers of up to 15 digits; all else, also empty, is odd."""
    buffer, starts, ends = block
    for row in range(len(starts)):
        out[row] = 0
        if wanted[row] == 0:
            continue
        start, end = starts[row], ends[row]
        negative = start < end and buffer[start] == _MINUS
        if negative or (start < end and buffer[start] == _PLUS):
            start += 1
        value = np.int64(0)
        good = 1 <= end - start <= 15
        if good:
            for place in range(start, end):
                good = good and _ZERO <= buffer[place] <= _NINE
                value = 10 * value + np.int64(buffer[place]) - _ZERO
        if good:
            out[row] = -value if negative else value
        else:
            odd[row] = 1


@njit(cache=True, nogil=True)
def parse_decimals(
    block: tuple[Bytes, Places, Places], wanted: Bytes, odd: Bytes, out: NDArray[np.float64]
) -> None:
    """Read decimal numbers of up to 15 digits without exponent; all else is odd.

    The digits as a whole number and the power of ten below them are both exact, so that their
    quotient is the nearest float (Clinger 1990, "How to read floating point numbers accurately").
    """
    buffer, starts, ends = block
    for row in range(len(starts)):
        out[row] = 0.0
        if wanted[row] == 0:
            continue
        start, end = starts[row], ends[row]
        negative = start < end and buffer[start] == _MINUS
        if negative or (start < end and buffer[start] == _PLUS):
            start += 1
        digits = scale = 0
        value = np.int64(0)
        point = False
        good = end - start <= 16
        if good:
            for place in range(start, end):
                byte = buffer[place]
                if byte == _DOT and not point:
                    point = True
                    continue
                good = good and _ZERO <= byte <= _NINE
                value = 10 * value + np.int64(byte) - _ZERO
                digits += 1
                scale += point
        if good and 1 <= digits <= 15:
            out[row] = (-1.0 if negative else 1.0) * (np.float64(value) / 10.0**scale)
        else:
            odd[row] = 1


@njit(cache=True, nogil=True)
def mark_unprintable(block: tuple[Bytes, Places, Places], wanted: Bytes, odd: Bytes) -> None:
    """Mark rows whose text is empty or holds anything but printable ASCII as odd."""
    buffer, starts, ends = block
    for row in range(len(starts)):
        if wanted[row] == 0:
            continue
        if starts[row] == ends[row]:
            odd[row] = 1
        for place in range(starts[row], ends[row]):
            if buffer[place] < _SPACE or buffer[place] > _TILDE:
                odd[row] = 1
