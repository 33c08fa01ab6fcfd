"""Texts of a large column as numbers, each text kept once, as bytes."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.feed import kernels
from gtfs_schematic.feed.kernels import Bytes, Ints, Places

UNKNOWN = -1


class Interned:
    """Texts, numbered from 0 in the order in which they first came.

    A few million ids take some ten bytes each here, and a hundred as Python's strings.
    """

    def __init__(self, texts: Iterable[str] = ()) -> None:
        self._count = 0
        self._bytes: Bytes = np.empty(1 << 10, dtype=np.uint8)
        self._bounds: Ints = np.zeros(1 << 8, dtype=np.int64)
        self._table: Places = np.full(1 << 9, -1, dtype=np.int32)
        encoded = [text.encode("utf-8", "surrogateescape") for text in texts]
        ends = np.cumsum([0, *map(len, encoded)], dtype=np.int64)
        self.add((np.frombuffer(b"".join(encoded), dtype=np.uint8), ends[:-1], ends[1:]))

    def __len__(self) -> int:
        """Tell how many texts there are."""
        return self._count

    def __getitem__(self, number: int) -> str:
        """Give the text of a number."""
        if not 0 <= number < self._count:
            raise IndexError(number)
        start, end = self._bounds[number : number + 2]
        return self._bytes[start:end].tobytes().decode("utf-8", "surrogateescape")

    def add(
        self, block: tuple[Bytes, NDArray[np.signedinteger], NDArray[np.signedinteger]]
    ) -> Places:
        """Give the numbers of texts, new ones included.

        Parameters
        ----------
        block
            A buffer, and where in it each text starts and ends.
        """
        buffer, starts, ends = block
        starts, ends = starts.astype(np.int32), ends.astype(np.int32)
        self._make_room(len(starts), int((ends - starts).sum()))
        numbers = np.empty(len(starts), dtype=np.int32)
        self._count = kernels.number_texts(
            (buffer, starts, ends),
            np.ones(len(starts), dtype=np.uint8),
            (self._bytes, self._bounds, self._table),
            self._count,
            numbers,
        )
        return numbers

    def add_text(self, text: str) -> int:
        """Give the number of one text, new or not."""
        data = np.frombuffer(text.encode("utf-8", "surrogateescape"), dtype=np.uint8)
        return int(self.add((data, np.zeros(1, np.int32), np.full(1, len(data), np.int32)))[0])

    def find(self, block: tuple[Bytes, Places, Places], wanted: Bytes | None = None) -> Places:
        """Give the numbers of texts, `UNKNOWN` for those that have none or are not wanted."""
        numbers = np.empty(len(block[1]), dtype=np.int32)
        kernels.number_texts(
            block,
            np.ones(len(numbers), dtype=np.uint8) if wanted is None else wanted,
            (self._bytes, self._bounds, self._table),
            -1 - self._count,
            numbers,
        )
        return numbers

    def find_text(self, text: str) -> int:
        """Give the number of one text, `UNKNOWN` if it has none."""
        data = np.frombuffer(text.encode("utf-8", "surrogateescape"), dtype=np.uint8)
        return int(self.find((data, np.zeros(1, np.int32), np.full(1, len(data), np.int32)))[0])

    def __contains__(self, text: object) -> bool:
        """Tell whether a text has a number."""
        return isinstance(text, str) and self.find_text(text) != UNKNOWN

    def _make_room(self, more: int, size: int) -> None:
        """Grow so that `more` new texts of `size` bytes together fit."""
        used = int(self._bounds[self._count])
        if used + size > len(self._bytes):
            self._bytes = _grown(self._bytes, used + size)
        if self._count + more + 1 > len(self._bounds):
            self._bounds = _grown(self._bounds, self._count + more + 1)
        slots = len(self._table)
        while slots < 2 * (self._count + more):
            slots *= 2
        if slots > len(self._table):
            self._table = np.empty(slots, dtype=np.int32)
            kernels.refill(self._bytes, self._bounds, self._count, self._table)


def _grown(array: NDArray[np.generic], least: int) -> NDArray:  # type: ignore[type-arg]
    larger = np.zeros(max(2 * len(array), least), dtype=array.dtype)
    larger[: len(array)] = array
    return larger
