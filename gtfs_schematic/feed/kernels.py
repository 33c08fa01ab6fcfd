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
"""Places in a buffer, or numbers of texts."""
Ints = NDArray[np.int64]

REGULAR, ODD, BLANK, BROKEN = 0, 1, 2, 3

_LF, _CR, _SPACE, _QUOTE, _COMMA = 10, 13, 32, 34, 44
LONGEST_LINE = 100_000
_MIX = np.uint64(0xC6A4A7935BD1E995)
_SHIFT = np.uint64(47)
_ONE, _EIGHT = np.uint64(1), np.uint64(8)
_LOW, _HIGH = np.uint64(0x0101010101010101), np.uint64(0x8080808080808080)
_LINE_ENDS = np.uint64(0x0A0A0A0A0A0A0A0A)
# Places are unsigned within the loops: a signed one would be tested for counting from the end.


@njit(cache=True, nogil=True)
def _word(buffer: Bytes, start: np.uint64) -> np.uint64:
    """Give eight bytes as one number, the first byte least."""
    word = np.uint64(0)
    for byte in range(8):
        word |= np.uint64(buffer[start + np.uint64(byte)]) << np.uint64(8 * byte)
    return word


@njit(cache=True, nogil=True)
def murmur(
    buffer: Bytes, start: np.uint64, end: np.uint64, seeds: tuple[int, int]
) -> tuple[np.uint64, np.uint64]:
    """Hash a piece of a buffer to 64 bits with each of two seeds.

    MurmurHash64A (Appleby 2008, placed in the public domain), with both seeds in one loop.
    """
    place, end = np.uint64(start), np.uint64(end)
    length = (end - place) * _MIX
    first, second = np.uint64(seeds[0]) ^ length, np.uint64(seeds[1]) ^ length
    while place + _EIGHT <= end:
        word = _word(buffer, place) * _MIX
        word = (word ^ (word >> _SHIFT)) * _MIX
        first = (first ^ word) * _MIX
        second = (second ^ word) * _MIX
        place += _EIGHT
    if place < end:
        word = shift = np.uint64(0)
        while place < end:
            word |= np.uint64(buffer[place]) << shift
            shift += _EIGHT
            place += _ONE
        first = (first ^ word) * _MIX
        second = (second ^ word) * _MIX
    first = (first ^ (first >> _SHIFT)) * _MIX
    second = (second ^ (second >> _SHIFT)) * _MIX
    return first ^ (first >> _SHIFT), second ^ (second >> _SHIFT)


@njit(cache=True, nogil=True)
def _line_end(buffer: Bytes, place: np.uint64, size: np.uint64) -> np.uint64:
    """Give the place of the next line feed, or the end.

    Eight bytes at a time: a byte of a word is zero where subtracting one from every byte borrows
    into its highest bit (Mycroft 1987, known from many string libraries).
    """
    while place + _EIGHT <= size:
        word = _word(buffer, place) ^ _LINE_ENDS
        if (word - _LOW) & ~word & _HIGH:
            break
        place += _EIGHT
    while place < size and buffer[place] != _LF:
        place += _ONE
    return place


@njit(cache=True, nogil=True)
def hash_lines(buffer: Bytes, start: int) -> tuple[np.uint64, np.uint64, int]:
    """Give two sums modulo 2^64 of the hashes of all lines that are not blank, and their number.

    Line ends do not count.
    """
    first = second = np.uint64(0)
    count = 0
    place, end = np.uint64(start), np.uint64(len(buffer))
    while place < end:
        stop = _line_end(buffer, place, end)
        last = stop
        while last > place and buffer[last - _ONE] == _CR:
            last -= _ONE
        if last > place:
            one, two = murmur(buffer, place, last, (1, 2))
            first += one
            second += two
            count += 1
        place = stop + _ONE
    return first, second, count


@njit(cache=True, nogil=True)
def _is_space(byte: int) -> bool:
    """Whether a byte is white space to `str.strip` (all of ASCII that is)."""
    return byte == _SPACE or 9 <= byte <= 13 or 28 <= byte <= 31


@njit(cache=True, nogil=True)
def _quoted(buffer: Bytes, size: np.uint64, place: np.uint64) -> tuple[np.uint64, np.uint64, int]:
    """Give where a field in quotes ends, where its comma or line end is, and its kind.

    `place` is behind the first quote. The kind is `REGULAR`, `ODD` (quotes inside quotes) or
    `BROKEN` (a line end inside quotes).
    """
    kind = REGULAR
    inside = True
    end = place
    while place < size and (inside or buffer[place] not in (_COMMA, _LF, _CR)):
        byte = buffer[place]
        if byte in (_LF, _CR):
            return end, place, BROKEN
        if not inside:
            kind = ODD
        if byte == _QUOTE:
            inside = not inside
            end = place
        place += _ONE
    return end, place, BROKEN if inside else kind


@njit(cache=True, nogil=True)
def split_lines(  # noqa: C901, PLR0912 - a call in its inner loop doubles its time
    buffer: Bytes, first: int, columns: Ints, starts: Places, ends: Places, kinds: Bytes
) -> tuple[int, int]:
    """Split lines into fields, as CSV with commas and double quotes.

    Parameters
    ----------
    buffer, first
        Whole lines, and where to begin.
    columns
        For every column of the table its number among the fields wanted, -1 if it is not wanted.
    starts, ends, kinds
        Filled with the places of the wanted fields, (fields, rows), white space around them left
        out, and with what kind of row each is. Fields of columns that the table lacks are empty.

    Returns
    -------
    rows, end
        How many rows were split, and where the last ends: as many as there is room for, unless
        the lines end or a row does not end with its line, or may not. Then the rest needs
        another reader.
    """
    rows, place, stop = 0, np.uint64(first), np.uint64(len(buffer))
    while place < stop and rows < len(kinds):
        begin = place
        kind, field = REGULAR, 0
        for n in range(len(starts)):
            starts[n, rows] = ends[n, rows] = 0
        while kind != BROKEN:
            start = end = place
            if place < stop and buffer[place] == _QUOTE:
                start = place + _ONE
                end, place, odd = _quoted(buffer, stop, start)
                kind = max(kind, odd)
            else:
                while place < stop and buffer[place] not in (_COMMA, _LF, _CR):
                    place += _ONE
                end = place
            if field < len(columns) and columns[field] >= 0:
                while start < end and _is_space(buffer[start]):
                    start += _ONE
                while end > start and _is_space(buffer[end - _ONE]):
                    end -= _ONE
                starts[columns[field], rows], ends[columns[field], rows] = start, end
            field += 1
            if place == stop or buffer[place] != _COMMA:
                break
            place += _ONE
        blank = place == begin
        if kind == BROKEN:
            return rows, int(np.int64(begin))
        if place < stop and buffer[place] == _CR:
            place += _ONE
            if place == stop or buffer[place] != _LF:
                return rows, int(np.int64(begin))
        place = min(place + _ONE, stop)
        if blank:
            kind = BLANK
        elif field != len(columns) or place - begin > np.uint64(LONGEST_LINE):
            kind = ODD
        kinds[rows] = kind
        rows += 1
    return rows, int(np.int64(place))


@njit(cache=True, nogil=True)
def _same(one: Bytes, start: int, other: Bytes, begin: int, length: int) -> bool:
    """Tell whether two pieces of bytes are the same."""
    for n in range(np.uint64(length)):
        if one[np.uint64(start) + n] != other[np.uint64(begin) + n]:
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
            slot = (slot + _ONE) & mask
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
            slot = (slot + _ONE) & mask
        table[slot] = number
