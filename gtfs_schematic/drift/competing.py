"""Two routes between the same stations whose drawn lengths compare otherwise than true ones."""

from __future__ import annotations

import itertools
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_array
from scipy.sparse.csgraph import dijkstra

from gtfs_schematic.drift.lookalikes import Places
from gtfs_schematic.drift.model import CompetingRoutes, DriftSettings
from gtfs_schematic.drift.placed import CourseLink, Diagram, PlacedWalk
from gtfs_schematic.drift.rides import course_length

_MOST_PAIRS = 10000
"""Pairs of junctions that are looked at: all of a large metro, the near ones of a bus network."""
_MOST_CHANGES = 1
"""Routes with more changes do not compete."""

Ends = tuple[int, int]
Integers = NDArray[np.int64]
Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class _Edge:
    true: float
    drawn: float
    lines: frozenset[str]


def competing_routes(
    diagram: Diagram, places: Places, settings: DriftSettings
) -> tuple[CompetingRoutes, ...]:
    """Find pairs of routes of which the diagram makes one look shorter or longer than it is.

    Notes
    -----
    Between two stations where routes part or meet, the shortest way on the ground and the
    shortest that shares no station with it compete if the second is at most `competing_detour`
    times as long, and each can be ridden with at most one change. With true lengths t and drawn
    lengths d, difference = (d₂ / d₁) / (t₂ / t₁) − 1; pairs are told if d₂ / d₁ is more than
    `competing_difference` above t₂ / t₁, or t₂ / t₁ so much above d₂ / d₁. A line drawn longer
    by 20 % has been shown to lose 1.9 to 5.7 percentage points of riders (Guo, Zhao, Whong,
    Mishra and Wyman 2017, Transportation Research A 106:158-169). The largest first. Where there
    are very many junctions, of each only its nearest are looked at.
    """
    board = _Board(diagram, places)
    near = max(_MOST_PAIRS // max(len(board.junctions), 1), 1)
    told = []
    for a in board.junctions:
        firsts = board.ways_from(a)
        others = [b for b in board.junctions if b > a and firsts.reaches(b)]
        for b in sorted(others, key=lambda b: (firsts.length[b], b))[:near]:
            first = firsts.way(b)
            if not board.is_direct(first):
                continue
            second = board.second(a, b, first, settings.competing_detour * firsts.length[b])
            if second is None or not board.is_direct(second):
                continue
            routes = board.compared(first, second)
            share = 1.0 + settings.competing_difference
            if not 1.0 / share <= 1.0 + routes.difference <= share:
                told.append(routes)
    told.sort(key=lambda r: (-abs(np.log1p(r.difference)), r.first, r.second))
    return tuple(told)


@dataclass(frozen=True, slots=True)
class _Firsts:
    """Shortest ways from one station."""

    start: int
    length: Floats
    before: Integers

    def reaches(self, end: int) -> bool:
        return bool(np.isfinite(self.length[end]))

    def way(self, end: int) -> tuple[int, ...]:
        way = [end]
        while way[-1] != self.start:
            way.append(int(self.before[way[-1]]))
        return tuple(reversed(way))


class _Board:
    """Links and walks as edges with their true and drawn lengths."""

    def __init__(self, diagram: Diagram, places: Places) -> None:
        self.ids = tuple(station.id for station in diagram.stations)
        index = {key: i for i, key in enumerate(self.ids)}
        self.edges: dict[tuple[int, int], _Edge] = {}
        parts: list[tuple[CourseLink | PlacedWalk, frozenset[str]]] = [
            *((link, frozenset(link.lines)) for link in diagram.links),
            *((walk, frozenset[str]()) for walk in diagram.walks),
        ]
        for part, lines in parts:
            a, b = sorted((index[part.start], index[part.end]))
            apart = float(abs(places.ground[a] - places.ground[b]))
            if (a, b) not in self.edges and apart > 0.0:
                self.edges[a, b] = _Edge(apart, course_length(part), lines)
        degree = Counter(end for key in self.edges for end in key)
        self.junctions = [i for i in range(len(self.ids)) if degree[i] > 2]
        pairs = np.array(sorted(self.edges), dtype=np.int64).reshape(-1, 2)
        self._pairs = np.concatenate([pairs, pairs[:, ::-1]])
        true = np.array([self.edges[int(a), int(b)].true for a, b in pairs])
        self._true = np.concatenate([true, true])

    def ways_from(
        self, start: int, closed: Sequence[int] = (), most: float = np.inf, without: Ends = (-1, -1)
    ) -> _Firsts:
        """Search from one station, without some stations and one edge, up to a length."""
        ends = self._pairs
        shut = np.zeros(len(self.ids), dtype=bool)
        shut[list(closed)] = True
        open_ = ~(shut[ends].any(axis=1)) & ~(
            np.isin(ends[:, 0], without) & np.isin(ends[:, 1], without)
        )
        weights = (self._true[open_], (ends[open_, 0], ends[open_, 1]))
        matrix = csr_array(weights, shape=(len(self.ids), len(self.ids)))
        length, before = dijkstra(matrix, indices=start, return_predecessors=True, limit=most)
        return _Firsts(start, length, before)

    def second(self, a: int, b: int, first: Sequence[int], most: float) -> tuple[int, ...] | None:
        """Give the shortest way that shares no station and no edge with the first."""
        found = self.ways_from(a, first[1:-1], most, (a, b))
        return found.way(b) if found.reaches(b) else None

    def is_direct(self, way: Sequence[int]) -> bool:
        """Tell whether a way can be ridden with few changes; walks are no rides."""
        changes = -1
        going: frozenset[str] = frozenset()
        for edge in self._along(way):
            going &= edge.lines
            if edge.lines and not going:
                changes += 1
                going = edge.lines
        return changes <= _MOST_CHANGES

    def compared(self, first: Sequence[int], second: Sequence[int]) -> CompetingRoutes:
        """Compare two ways."""
        true = tuple(sum(edge.true for edge in self._along(way)) for way in (first, second))
        drawn = tuple(sum(edge.drawn for edge in self._along(way)) for way in (first, second))
        return CompetingRoutes(
            first=tuple(self.ids[i] for i in first),
            second=tuple(self.ids[i] for i in second),
            true_m=(true[0], true[1]),
            drawn_mm=(drawn[0], drawn[1]),
            difference=(drawn[1] / drawn[0]) / (true[1] / true[0]) - 1.0,
        )

    def _along(self, way: Sequence[int]) -> list[_Edge]:
        return [self.edges[min(p, q), max(p, q)] for p, q in itertools.pairwise(way)]
