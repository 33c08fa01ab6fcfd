"""Compiled loops over the bytes of large tables: hashes, lines, fields, texts as numbers.

Every loop works on whole lines in one buffer of bytes. What it does not understand at once it
marks as odd, never guesses: odd rows are read one by one by the strict reader (tables.py).
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

Bytes = NDArray[np.uint8]
Places = NDArray[np.int32]
"""Places of fields in a buffer, (rows, columns)."""
Ints = NDArray[np.int64]

REGULAR, ODD, BLANK, BROKEN = 0, 1, 2, 3

_LF, _CR, _SPACE, _QUOTE, _COMMA = 10, 13, 32, 34, 44
_LONGEST_LINE = 100_000
_MIX = np.uint64(0xC6A4A7935BD1E995)
_SHIFT = np.uint64(47)


@njit(cache=True, nogil=True)
def _word(buffer: Bytes, start: int, size: int) -> np.uint64:
    """Give up to eight bytes as one number, the first byte least."""
    word = np.uint64(0)
    for byte in range(size):
        word |= np.uint64(buffer[start + byte]) << np.uint64(8 * byte)
    return word


@njit(cache=True, nogil=True)
def murmur(
    buffer: Bytes, start: int, end: int, seeds: tuple[int, int]
) -> tuple[np.uint64, np.uint64]:
    """Hash a piece of a buffer to 64 bits with each of two seeds.

    MurmurHash64A (Appleby 2008, placed in the public domain), with both seeds in one loop.
    """
    length = np.uint64(end - start) * _MIX
    first, second = np.uint64(seeds[0]) ^ length, np.uint64(seeds[1]) ^ length
    place = start
    while place + 8 <= end:
        word = _word(buffer, place, 8) * _MIX
        word = (word ^ (word >> _SHIFT)) * _MIX
        first = (first ^ word) * _MIX
        second = (second ^ word) * _MIX
        place += 8
    if place < end:
        word = _word(buffer, place, end - place)
        first = (first ^ word) * _MIX
        second = (second ^ word) * _MIX
    first = (first ^ (first >> _SHIFT)) * _MIX
    second = (second ^ (second >> _SHIFT)) * _MIX
    return first ^ (first >> _SHIFT), second ^ (second >> _SHIFT)


@njit(cache=True, nogil=True)
def hash_lines(buffer: Bytes, start: int, end: int) -> tuple[np.uint64, np.uint64, int]:
    """Give two sums modulo 2^64 of the hashes of all lines that are not blank, and their number.

    Line ends do not count.
    """
    first = second = np.uint64(0)
    count = 0
    place = start
    while place < end:
        stop = place
        while stop < end and buffer[stop] != _LF:
            stop += 1
        last = stop
        while last > place and buffer[last - 1] == _CR:
            last -= 1
        if last > place:
            one, two = murmur(buffer, place, last, (1, 2))
            first += one
            second += two
            count += 1
        place = stop + 1
    return first, second, count


@njit(cache=True, nogil=True)
def _is_space(byte: int) -> bool:
    """Whether a byte is white space to `str.strip` (all of ASCII that is)."""
    return byte == _SPACE or 9 <= byte <= 13 or 28 <= byte <= 31


@njit(cache=True, nogil=True)
def _field(buffer: Bytes, size: int, place: int) -> tuple[int, int, int, int]:
    """Give where a field starts and ends, where its comma or line end is, and its kind.

    The kind is `REGULAR`, `ODD` (quotes inside quotes) or `BROKEN` (a line end inside quotes).
    """
    start = place
    if place == size or buffer[place] != _QUOTE:
        while place < size and buffer[place] not in (_COMMA, _LF, _CR):
            place += 1
        return start, place, place, REGULAR
    kind = REGULAR
    inside = True
    end = place = place + 1
    while place < size and (inside or buffer[place] not in (_COMMA, _LF, _CR)):
        byte = buffer[place]
        if byte in (_LF, _CR):
            return start, place, place, BROKEN
        if not inside:
            kind = ODD
        if byte == _QUOTE:
            inside = not inside
            end = place
        place += 1
    return start + 1, end, place, BROKEN if inside else kind


@njit(cache=True, nogil=True)
def _row(
    buffer: Bytes, size: int, place: int, columns: Ints, row: tuple[Places, Places]
) -> tuple[int, int, int]:
    """Split one row; give where its line end is, how many fields it has, and its kind."""
    starts, ends = row
    kind, field = REGULAR, 0
    for n in range(len(starts)):
        starts[n] = ends[n] = 0
    while kind != BROKEN:
        start, end, place, odd = _field(buffer, size, place)
        kind = max(kind, odd)
        if field < len(columns) and columns[field] >= 0:
            while start < end and _is_space(buffer[start]):
                start += 1
            while end > start and _is_space(buffer[end - 1]):
                end -= 1
            starts[columns[field]], ends[columns[field]] = start, end
        field += 1
        if place == size or buffer[place] != _COMMA:
            break
        place += 1
    return place, field, kind


@njit(cache=True, nogil=True)
def split_lines(
    buffer: Bytes, size: int, columns: Ints, starts: Places, ends: Places, kinds: Bytes
) -> tuple[int, int]:
    """Split lines into fields, as CSV with commas and double quotes.

    Parameters
    ----------
    buffer, size
        Whole lines and how many bytes they take.
    columns
        For every column of the table its number among the fields wanted, -1 if it is not wanted.
    starts, ends, kinds
        Filled with the places of the wanted fields, white space around them left out, and with
        what kind of row each is. Fields of columns that the table lacks stay empty.

    Returns
    -------
    rows, consumed
        How many rows and bytes were split. It is fewer than all if a row does not end with its
        line, or may not: then the rest needs another reader.
    """
    rows = place = 0
    while place < size:
        begin = place
        place, fields, kind = _row(buffer, size, begin, columns, (starts[rows], ends[rows]))
        blank = place == begin
        if kind == BROKEN:
            return rows, begin
        if place < size and buffer[place] == _CR:
            place += 1
            if place == size or buffer[place] != _LF:
                return rows, begin
        place += 1
        if blank:
            kind = BLANK
        elif fields != len(columns) or place - begin > _LONGEST_LINE:
            kind = ODD
        kinds[rows] = kind
        rows += 1
    return rows, size


@njit(cache=True, nogil=True)
def _same(one: Bytes, start: int, other: Bytes, begin: int, length: int) -> bool:
    """Tell whether two pieces of bytes are the same."""
    for n in range(length):  # noqa: SIM110 - a compiled loop knows no generators
        if one[start + n] != other[begin + n]:
            return False
    return True


@njit(cache=True, nogil=True)
def number_texts(
    block: tuple[Bytes, Places, Places],
    wanted: Bytes,
    known: tuple[Bytes, Ints, Places],
    count: int,
    found: Places,
) -> int:
    """Give texts numbers in the order in which they first came; give how many are known then.

    Parameters
    ----------
    block
        Buffer, and starts and ends of one text per row.
    wanted
        1 for rows to be looked at.
    known
        Bytes of all texts, where each starts (and the last ends), and a hash table of their
        numbers, a power of two in size, -1 where it is free; linear probing.
    count
        How many texts are known; -1 - count: learn no new ones.
    found
        Filled with the numbers, -1 for rows not wanted and texts not known.
    """
    buffer, starts, ends = block
    texts, bounds, table = known
    learn = count >= 0
    count = count if learn else -1 - count
    mask = np.uint64(len(table) - 1)
    before = -1
    for row in range(len(starts)):
        found[row] = -1
        if wanted[row] == 0:
            continue
        start, length = starts[row], ends[row] - starts[row]
        if (
            before >= 0
            and ends[before] - starts[before] == length
            and _same(buffer, start, buffer, starts[before], length)
        ):
            found[row] = found[before]
            continue
        before = row
        slot = murmur(buffer, start, start + length, (0, 0))[0] & mask
        while table[slot] >= 0:
            at = bounds[table[slot]]
            if bounds[table[slot] + 1] - at == length and _same(buffer, start, texts, at, length):
                found[row] = table[slot]
                break
            slot = (slot + np.uint64(1)) & mask
        if found[row] < 0 and learn:
            found[row] = table[slot] = count
            texts[bounds[count] : bounds[count] + length] = buffer[start : start + length]
            bounds[count + 1] = bounds[count] + length
            count += 1
    return count


@njit(cache=True, nogil=True)
def refill(texts: Bytes, bounds: Ints, count: int, table: Places) -> None:
    """Fill a new hash table with all texts known."""
    table[:] = -1
    mask = np.uint64(len(table) - 1)
    for number in range(count):
        slot = murmur(texts, bounds[number], bounds[number + 1], (0, 0))[0] & mask
        while table[slot] >= 0:
            slot = (slot + np.uint64(1)) & mask
        table[slot] = number
