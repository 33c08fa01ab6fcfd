"""Reading large tables block by block: regular rows in bulk, odd rows one by one.

A block is some megabytes of whole lines. Compiled loops (kernels.py) find the fields of its rows.
Rows that are not plainly regular, or whose values are not, go through the strict reader
(tables.py), so that findings name the same rows and values as if all rows did. From a row on that
does not end with its line (a quoted line end), the strict reader takes the rest of the table.
"""

from __future__ import annotations

import codecs
import io
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.errors import FeedError
from gtfs_schematic.feed import kernels
from gtfs_schematic.feed.kernels import Bytes, Ints, Places
from gtfs_schematic.feed.tables import MOST_ROWS, Picker, Tables

_SIZE = 1 << 22
_LF = 10

Masks = NDArray[Any]
"""One truth per row or per thing."""
Bulk = Callable[["Block"], Masks]
"""Takes the regular rows of a block and tells which of them it could not use."""
Single = Callable[[int, tuple[str, ...]], None]
"""Takes one row: its number (the header is row 1) and the stripped texts of its fields."""


@dataclass(frozen=True)
class Block:
    """Rows of a table, split into fields."""

    buffer: Bytes
    starts: Places
    ends: Places
    regular: Masks
    """Rows of one line with as many fields as the header; the others have no fields here."""
    first_row: int
    """Number of the first row; the header is row 1."""

    @property
    def rows(self) -> Ints:
        """Row numbers."""
        return self.first_row + np.arange(len(self.starts))

    def column(self, number: int) -> tuple[Bytes, Places, Places]:
        """Give a buffer, and where in it each row's field of one column starts and ends."""
        return (
            self.buffer,
            np.ascontiguousarray(self.starts[:, number]),
            np.ascontiguousarray(self.ends[:, number]),
        )


def whole_lines(stream: io.BufferedIOBase, size: int = _SIZE) -> Iterator[bytes]:
    """Yield a file in pieces of about `size` bytes that end with a line, but for the last."""
    rest = b""
    while piece := stream.read(size):
        cut = piece.rfind(b"\n") + 1
        if cut == 0:
            rest += piece
            continue
        yield rest + piece[:cut]
        rest = piece[cut:]
    if rest:
        yield rest


def read_in_blocks(
    tables: Tables, name: str, columns: tuple[str, ...], bulk: Bulk, single: Single
) -> None:
    """Read a table, if the feed has it; a column that it lacks is empty.

    Within a block, `bulk` is called first, then `single` in order of row for what it left.

    Raises
    ------
    FeedError
        As `Tables.rows`.
    """
    if not tables.has(name):
        return
    with tables.files.open(name) as stream:
        pieces = whole_lines(stream)
        first = next(pieces, b"")
        header = None if name in tables.not_utf8 else _header(tables, name, first)
        if header is None:
            rest, behind = _chained(first, pieces), None
        else:
            reader = _Reader(tables, name, header, columns)
            body = first[first.find(b"\n") + 1 :] if b"\n" in first else b""
            for piece in _chained(body, pieces):
                left = reader.take(piece, bulk, single)
                if left:
                    rest, behind = _chained(left, pieces), (reader.row, list(header))
                    break
            else:
                return
        raw = cast("io.BufferedReader", io.BufferedReader(_Stream(rest)))
        for number, texts in tables.rows_from(raw, name, columns, behind):
            single(number, texts)


class _Reader:
    """Reads the pieces of one table one after the other; `row` is the number of the next row."""

    def __init__(
        self, tables: Tables, name: str, header: tuple[str, ...], columns: tuple[str, ...]
    ) -> None:
        self._tables, self._name = tables, name
        self._picker = Picker(tables, name, header, columns)
        self._wanted = len(columns)
        numbers = [columns.index(c) if c in columns else -1 for c in header]
        self._columns = np.array(numbers, dtype=np.int64)
        self.row = 2

    def take(self, piece: bytes, bulk: Bulk, single: Single) -> bytes:
        """Read a piece of whole lines; give what no row that ends with its line begins."""
        buffer = np.frombuffer(piece, dtype=np.uint8)
        most = piece.count(b"\n") + 1
        starts = np.empty((most, self._wanted), dtype=np.int32)
        ends = np.empty_like(starts)
        kinds = np.empty(most, dtype=np.uint8)
        count, consumed = kernels.split_lines(
            buffer, len(piece), self._columns, starts, ends, kinds
        )
        if self.row + count > MOST_ROWS:
            raise FeedError(
                f"has more than {MOST_ROWS:,} rows, which no feed has.", file=self._name
            )
        kinds = kinds[:count]
        regular = kinds == kernels.REGULAR
        block = Block(buffer, starts[:count], ends[:count], regular, self.row)
        odd = (kinds == kernels.ODD) | (regular & bulk(block))
        if odd.any():
            lines = np.append(0, np.flatnonzero(buffer[:consumed] == _LF) + 1)
            for n in np.flatnonzero(odd).tolist():
                number = self.row + n
                line = piece[lines[n] : lines[n + 1] if n + 1 < len(lines) else consumed]
                texts = self._picker.texts(number, self._tables.values(self._name, number, line))
                if texts is not None:
                    single(number, texts)
        self.row += count
        return piece[consumed:]


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
            self._left = memoryview(next(self._pieces, b""))
        view = memoryview(target).cast("B")
        size = min(len(view), len(self._left))
        view[:size], self._left = self._left[:size], self._left[size:]
        return size


def _header(tables: Tables, name: str, first: bytes) -> tuple[str, ...] | None:
    """Give the column names; None if the header may not be one line."""
    line = first.removeprefix(codecs.BOM_UTF8)
    line = line[: line.find(b"\n") + 1] or line
    if b"\r" in line.rstrip(b"\r\n") or line.count(b'"') % 2:
        return None
    return tuple(tables.header_of(name, line))


def _chained(first: bytes, others: Iterator[bytes]) -> Iterator[bytes]:
    if first:
        yield first
    yield from others
