"""The plane graph of a network on the ground: stations, crossings, and the pieces between them."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class Part:
    """A share of one link or walk inside a piece, in station spacings.

    The shares of one link over all pieces sum to 1, or more where several others cross it.
    """

    owner: str
    share: float
    forward: bool
    """Whether the piece runs through the link from its `start` towards its `end`."""


@dataclass(frozen=True)
class Piece:
    """An edge of the plane graph: part of a corridor (or walk) between two vertices.

    `parts` are met in order from ``ends[0]`` to ``ends[1]``; ``stations[i]`` stands between
    ``parts[i]`` and ``parts[i + 1]``. `nodes` are the indices, ends included, of the ground
    points that the piece runs through: vertices, then smoothed stations between them.
    """

    ends: tuple[int, int]
    parts: tuple[Part, ...]
    stations: tuple[str, ...]
    nodes: tuple[int, ...]
    lines: tuple[str, ...]
    others: tuple[tuple[str, bool], ...] = ()
    """Of a stem: what runs through it beside its part's owner, and whether from start to end."""

    @property
    def is_walk(self) -> bool:
        """Whether the piece carries no line."""
        return not self.lines

    @cached_property
    def spans(self) -> float:
        """Length in station spacings that even spacing would give the piece."""
        return sum(part.share for part in self.parts)


@dataclass(frozen=True)
class PlaneGraph:
    """A planar straight-line drawing of the network on the ground, local metres, y north.

    Vertices 0 … `n_vertices` − 1 come first among the points: kept stations (`station_of[v]` is
    their id), then crossings and forks (`station_of[v]` is None); smoothed stations follow.
    """

    points: NDArray[np.float64]
    station_of: tuple[str | None, ...]
    pieces: tuple[Piece, ...]
    rotation: tuple[tuple[int, ...], ...]
    """Per vertex the piece ends around it, counter-clockwise; end i of piece p is 2 p + i."""
    through: tuple[tuple[int, int, int, int], ...]
    """Per pair of piece ends that lines pass through: vertex, end, end, count of lines."""
    forks: tuple[int, ...] = ()
    """Vertices at which pieces part that left a station together."""
    junctions: frozenset[str] = frozenset()
    """Ids among `station_of` that are no stations, but junctions of the network."""

    @property
    def n_vertices(self) -> int:
        """Count of vertices: kept stations, crossings and forks."""
        return len(self.station_of)

    @cached_property
    def segments(self) -> NDArray[np.int64]:
        """Straight segments between neighbouring points, shape (m, 2), point indices."""
        pairs = [
            pair
            for piece in self.pieces
            for pair in zip(piece.nodes[:-1], piece.nodes[1:], strict=True)
        ]
        return np.array(pairs, dtype=np.int64).reshape(-1, 2)

    @cached_property
    def segment_shares(self) -> NDArray[np.float64]:
        """Station spacings that even spacing gives each segment, shape (m,)."""
        return np.array([part.share for piece in self.pieces for part in piece.parts])
