"""Reading large tables block by block: regular rows in bulk, odd rows one by one.

A block is some megabytes of whole lines. Compiled loops (kernels.py) find the fields of its rows.
Rows that are not plainly regular, or whose values are not, go through the strict reader
(tables.py), so that findings name the same rows and values as if all rows did. From a row on that
does not end with its line (a quoted line end), the strict reader takes the rest of the table.
"""

from __future__ import annotations

import codecs
import io
import itertools
from collections.abc import Callable, Generator, Iterator
from concurrent.futures import ThreadPoolExecutor
from contextlib import closing
from dataclasses import dataclass
from functools import cached_property
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.errors import FeedError
from gtfs_schematic.feed import kernels
from gtfs_schematic.feed.interned import Interned
from gtfs_schematic.feed.kernels import Bytes, Ints, Places
from gtfs_schematic.feed.picker import Picker
from gtfs_schematic.feed.tables import MOST_ROWS, Tables

_SIZE = 1 << 21
_ROWS = 1 << 16
_LONGEST = 1 << 26
_LF = 10
_NONE: Places = np.empty(0, dtype=np.int32)

Masks = NDArray[Any]
"""One truth per row or per thing."""
Bulk = Callable[["Block"], Masks]
"""Takes the regular rows of a block and tells which of them it could not use."""
Single = Callable[[int, tuple[str, ...]], None]
"""Takes one row: its number (the header is row 1) and the stripped texts of its fields."""


@dataclass(frozen=True)
class Block:
    """Rows of a table, split into fields; it holds until the next but one is made."""

    buffer: Bytes
    first: int
    last: int
    """Where in the buffer the rows start and end."""
    starts: Places
    ends: Places
    """Where fields lie, (columns, rows)."""
    kinds: Bytes
    """What kind of row each is; only the fields of regular ones are known."""
    first_row: int
    """Number of the first row; the header is row 1."""
    numbers: Places
    """Number of each row's first wanted field among the texts given; empty if none were."""

    @property
    def rows(self) -> Ints:
        """Row numbers."""
        return self.first_row + np.arange(len(self.kinds))

    @cached_property
    def regular(self) -> Masks:
        """Which rows have one line and as many fields as the header."""
        return np.asarray(self.kinds == kernels.REGULAR)

    def column(self, number: int) -> tuple[Bytes, Places, Places]:
        """Give a buffer, and where in it each row's field of one column starts and ends."""
        return (
            self.buffer,
            self.starts[number],
            self.ends[number],
        )


def whole_lines(stream: io.BufferedIOBase, name: str, size: int = _SIZE) -> Iterator[Bytes]:
    """Yield a file in pieces of about `size` bytes that end with a line, but for the last.

    A piece holds until the next but one is asked for.

    Raises
    ------
    FeedError
        A line longer than any line of a feed.
    """
    buffer, spare = bytearray(size), bytearray(size)
    filled = 0
    while read := stream.readinto(memoryview(buffer)[filled:]):
        filled += read
        cut = buffer.rfind(b"\n", 0, filled) + 1
        if cut:
            yield np.frombuffer(buffer, dtype=np.uint8, count=cut)
            rest = buffer[cut:filled]
            if len(spare) < len(buffer):
                spare = bytearray(len(buffer))
            spare[: len(rest)] = rest
            buffer, spare, filled = spare, buffer, len(rest)
        if filled == len(buffer):
            if filled >= _LONGEST:
                raise FeedError(f"has a line of more than {_LONGEST:,} bytes.", file=name)
            buffer = buffer + bytearray(filled)
    if filled:
        yield np.frombuffer(buffer, dtype=np.uint8, count=filled)


def read_in_blocks(
    tables: Tables,
    name: str,
    columns: tuple[str, ...],
    bulk: Bulk,
    single: Single,
    *,
    known: Interned | None = None,
) -> None:
    """Read a table, if the feed has it; a column that it lacks is empty.

    Within a block, `bulk` is called first, then `single` in order of row for what it left.

    Parameters
    ----------
    known
        Texts among which the first column's are looked up while the block before is used.

    Raises
    ------
    FeedError
        As `Tables.rows`.
    """
    if not tables.has(name):
        return
    with tables.files.open(name) as stream:
        pieces = whole_lines(stream, name)
        first = next(pieces, np.empty(0, dtype=np.uint8))
        line = _first_line(first)
        header = _header(tables, name, line) if tables.is_utf8(name) else None
        if header is None:
            rest, behind = _chained(first, 0, pieces), None
        else:
            splitter = _Splitter(name, header, columns, known)
            picker = Picker(tables, name, header, columns)
            row = 2
            with closing(_ahead(splitter.blocks(first, len(line), pieces))) as coming:
                for block in coming:
                    odd = (block.kinds == kernels.ODD) | (block.regular & bulk(block))
                    if odd.any():
                        _take_odd(block, np.flatnonzero(odd), (tables, name, picker), single)
                    row += len(block.kinds)
            if splitter.left is None:
                return
            rest, behind = _chained(*splitter.left, pieces), (row, list(header))
        raw = cast("io.BufferedReader", io.BufferedReader(_Stream(rest)))
        for number, texts in tables.rows_from(raw, name, columns, behind):
            single(number, texts)


def _ahead(items: Iterator[Block]) -> Generator[Block]:
    """Yield items while the next one is being made in another thread."""
    with ThreadPoolExecutor(1) as pool:
        coming = pool.submit(next, items, None)
        while (item := coming.result()) is not None:
            coming = pool.submit(next, items, None)
            yield item


class _Splitter:
    """Splits the pieces of one table into blocks."""

    def __init__(
        self,
        name: str,
        header: tuple[str, ...],
        columns: tuple[str, ...],
        known: Interned | None,
    ) -> None:
        self._name, self._known = name, known
        numbers = [columns.index(c) if c in columns else -1 for c in header]
        self._columns = np.array(numbers, dtype=np.int64)
        # Taken in turns: one is filled while the other is used.
        self._spare = [
            (
                np.empty((len(columns), _ROWS), dtype=np.int32),
                np.empty((len(columns), _ROWS), dtype=np.int32),
                np.empty(_ROWS, dtype=np.uint8),
            )
            for _ in range(2)
        ]
        self.left: tuple[Bytes, int] | None = None
        """When all blocks are made: the piece, and the place in it, of the first row that does
        not end with its line; None if all do."""

    def blocks(self, first: Bytes, start: int, pieces: Iterator[Bytes]) -> Iterator[Block]:
        """Yield the blocks of a piece from `start` on, and of those after it."""
        row = 2
        for piece in itertools.chain([first], pieces):
            while start < len(piece):
                self._spare.reverse()
                starts, ends, kinds = self._spare[0]
                count, end = kernels.split_lines(piece, start, self._columns, *self._spare[0])
                if row + count > MOST_ROWS:
                    fault = f"has more than {MOST_ROWS:,} rows, which no feed has."
                    raise FeedError(fault, file=self._name)
                starts, ends = starts[:, :count], ends[:, :count]
                numbers = _NONE
                if self._known is not None:
                    numbers = self._known.find((piece, starts[0], ends[0]))
                yield Block(piece, start, end, starts, ends, kinds[:count], row, numbers)
                row += count
                if end < len(piece) and count < _ROWS:
                    self.left = piece, end
                    return
                start = end
            start = 0


def _take_odd(block: Block, odd: Ints, table: tuple[Tables, str, Picker], single: Single) -> None:
    """Read some of the lines of a block strictly, given their numbers from 0."""
    tables, name, picker = table
    lines = block.buffer[block.first : block.last]
    ends = np.append(np.flatnonzero(lines == _LF) + 1, len(lines))
    starts = np.append(0, ends)
    for n in odd.tolist():
        number = block.first_row + n
        values = tables.values(name, number, lines[starts[n] : ends[n]].tobytes())
        texts = picker.texts(number, values)
        if texts is not None:
            single(number, texts)


class _Stream(io.RawIOBase):
    """Pieces of bytes as a stream to read from."""

    def __init__(self, pieces: Iterator[bytes]) -> None:
        self._pieces = pieces
        self._left = memoryview(b"")

    def readable(self) -> bool:
        """Tell that it can be read."""
        return True

    def readinto(self, target: Any, /) -> int:  # noqa: ANN401 - typing has no word for buffers yet
        """Fill a buffer and tell how far; 0 at the end."""
        if not self._left:
            self._left = memoryview(next((piece for piece in self._pieces if piece), b""))
        view = memoryview(target).cast("B")
        size = min(len(view), len(self._left))
        view[:size], self._left = self._left[:size], self._left[size:]
        return size


def _first_line(piece: Bytes) -> bytes:
    """Give the first line, with its end and what byte order mark there is."""
    ends = np.flatnonzero(piece[: kernels.LONGEST_LINE] == _LF)
    return piece[: ends[0] + 1 if len(ends) else len(piece)].tobytes()


def _header(tables: Tables, name: str, line: bytes) -> tuple[str, ...] | None:
    """Give the column names; None if the header may not be one line."""
    if b"\r" in line.rstrip(b"\r\n") or line.count(b'"') % 2:
        return None
    return tuple(tables.header_of(name, line.removeprefix(codecs.BOM_UTF8)))


def _chained(first: Bytes, start: int, others: Iterator[Bytes]) -> Iterator[bytes]:
    """Yield a piece from `start` on, and the pieces after it."""
    yield first[start:].tobytes()
    yield from (piece.tobytes() for piece in others)
