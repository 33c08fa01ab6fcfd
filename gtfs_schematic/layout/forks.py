"""Fork a vertex with more pieces than directions: neighbouring pieces leave it together.

A stem leads from the vertex to a fork a short way off, where the pieces part. The cyclic order
stays. Published grid-graph routing knows no vertex of more pieces than ports (Bast, Brosi and
Storandt 2020): such vertices must be split.
"""

from __future__ import annotations

import itertools
import math
from collections import defaultdict
from dataclasses import dataclass, field, replace

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.layout.plane import Part, Piece, PlaneGraph
from gtfs_schematic.layout.spread import spread

_STEM_SHARE = 0.5
"""Station spacings that even spacing gives a stem; taken from the pieces that share it."""
_LONGEST_STEM = 1.0
_CLEARANCE = 0.75
"""Distance that anchors get from foreign segments, station spacings."""
_ANGLE_COST = 4.0
"""Cost of leaving together, per right angle between two neighbouring pieces, …"""
_PASS_COST = 3.0
"""… per line that runs from one of them to the other, and so would turn back at the fork, …"""
_MIXED_COST = 6.0
"""… for a walk beside a line, which hides it, …"""
_WIDTH_COST = 0.1
"""… per line on the stem, …"""
_SIZE_COST = 0.7
"""… and per pair of pieces on it beyond the first. Common practice, no source."""
_HALVINGS = 30


def fork(
    graph: PlaneGraph, anchors: NDArray[np.float64], ports: int
) -> tuple[PlaneGraph, NDArray[np.float64]]:
    """Give a plane graph no vertex of which has more than `ports` pieces, and its anchors.

    Parameters
    ----------
    graph
        Plane graph of the network.
    anchors
        Where its points should stand, in station spacings, shape (n, 2).
    ports
        Count of directions of the diagram; at least three.

    Returns
    -------
    tuple
        The graph itself if no vertex has too many pieces; else one with forks among its vertices,
        after the others.
    """
    if all(len(around) <= ports for around in graph.rotation):
        return graph, anchors
    growth = _Growth(graph, anchors)
    waiting = list(range(graph.n_vertices))
    while waiting:
        vertex = waiting.pop(0)
        if len(growth.rotation[vertex]) > ports:
            waiting += growth.split(vertex, ports)
    forked, places = growth.result()
    a, b = forked.segments.T
    vectors = places[b] - places[a]
    return forked, np.round(spread(places, forked.segments, vectors, _CLEARANCE), 6)


@dataclass
class _Growth:
    """The graph while it grows; new vertices and points are numbered after all old points."""

    graph: PlaneGraph
    anchors: NDArray[np.float64]
    pieces: list[Piece] = field(init=False)
    rotation: dict[int, list[int]] = field(init=False)
    ground: list[NDArray[np.float64]] = field(init=False)
    places: list[NDArray[np.float64]] = field(init=False)
    through: dict[int, dict[tuple[int, int], int]] = field(init=False)
    stems: dict[int, int] = field(default_factory=dict)
    """Per fork the stem that leads to it."""

    def __post_init__(self) -> None:
        self.pieces = list(self.graph.pieces)
        self.rotation = {v: list(around) for v, around in enumerate(self.graph.rotation)}
        self.ground, self.places = list(self.graph.points), list(self.anchors)
        self.through = defaultdict(dict)
        for v, a, b, count in self.graph.through:
            self.through[v][a, b] = count

    def split(self, v: int, ports: int) -> list[int]:
        """Let groups of pieces leave a vertex together; gives the forks that this makes."""
        around = self.rotation[v]
        if v in self.stems:
            # The stem that leads here is no part of a group, so it stands first.
            k = around.index(2 * self.stems[v] + 1)
            around = around[k:] + around[:k]
        groups = self._groups(v, around, ports)
        made = []
        self.rotation[v] = []
        for group in groups:
            if len(group) == 1:
                self.rotation[v].append(group[0])
            else:
                made.append(self._fork(v, group))
        return made

    # ---- which pieces leave together ---------------------------------------------------------

    def _groups(self, v: int, around: list[int], ports: int) -> list[list[int]]:
        """Part the pieces round a vertex into `ports` runs of neighbours at the least cost."""
        fixed = 1 if v in self.stems else 0
        count = len(around)
        largest = max(ports - 1, math.ceil((count - fixed) / (ports - fixed)))
        best: tuple[float, list[list[int]]] = (math.inf, [])
        # In a circle any of the pieces may begin a group; round a fork the stem stands alone.
        for turn in range(1 if fixed else min(count, largest)):
            order = around[turn:] + around[:turn]
            cost, groups = self._cut(v, order[fixed:], ports - fixed, largest)
            if cost < best[0] - 1e-9:
                best = (cost, [[end] for end in order[:fixed]] + groups)
        return best[1]

    def _cut(
        self, v: int, order: list[int], parts: int, largest: int
    ) -> tuple[float, list[list[int]]]:
        """Cut a row into so many groups (dynamic programme over the cuts)."""
        count = len(order)
        best = {(0, 0): (0.0, 0)}
        for i, part in itertools.product(range(1, count + 1), range(1, parts + 1)):
            for size in range(1, min(i, largest) + 1):
                before = best.get((i - size, part - 1))
                if before is None:
                    continue
                cost = before[0] + self._cost(v, order[i - size : i])
                if cost < best.get((i, part), (math.inf, 0))[0] - 1e-9:
                    best[i, part] = (cost, size)
        if (count, parts) not in best:
            return math.inf, []
        groups, i = [], count
        for part in range(parts, 0, -1):
            size = best[i, part][1]
            groups.append(order[i - size : i])
            i -= size
        return best[count, parts][0], groups[::-1]

    def _cost(self, v: int, group: list[int]) -> float:
        if len(group) == 1:
            return 0.0
        cost = _SIZE_COST * (math.comb(len(group), 2) - 1)
        for a, b in itertools.pairwise(group):
            cost += _ANGLE_COST * self._angle(v, a, b) / (math.pi / 2.0)
        for a, b in itertools.combinations(group, 2):
            cost += _PASS_COST * self.through[v].get((min(a, b), max(a, b)), 0)
        walks = [self.pieces[end // 2].is_walk for end in group]
        cost += _MIXED_COST * (any(walks) and not all(walks))
        return cost + _WIDTH_COST * sum(len(self.pieces[end // 2].lines) for end in group)

    def _bearing(self, v: int, end: int) -> float:
        dx, dy = self.places[self._next(end)] - self.places[v]
        return math.atan2(dy, dx)

    def _angle(self, v: int, a: int, b: int) -> float:
        """Angle from one piece end counter-clockwise to the next."""
        return (self._bearing(v, b) - self._bearing(v, a)) % math.tau

    def _next(self, end: int) -> int:
        """First point of a piece after its end."""
        nodes = self.pieces[end // 2].nodes
        return nodes[1] if end % 2 == 0 else nodes[-2]

    # ---- a stem and its fork -----------------------------------------------------------------

    def _fork(self, v: int, group: list[int]) -> int:
        """Join a group of piece ends by a stem from vertex `v` to a fork; gives the fork."""
        vector = self._stem(v, group)
        ahead = [self._next(end) for end in group]
        new, stem = len(self.places), len(self.pieces)
        away = np.array([self.places[i] for i in ahead]) - self.places[v]
        part = float(np.hypot(*vector)) / max(float(np.hypot(*away.T).mean()), 1e-9)
        self.places.append(self.places[v] + vector)
        middle = np.mean([self.ground[i] for i in ahead], axis=0)
        self.ground.append(self.ground[v] + min(0.5, part) * (middle - self.ground[v]))
        owners = [self._owner(end) for end in group]
        first, *others = owners
        lines = sorted({line for end in group for line in self.pieces[end // 2].lines})
        parts = (Part(first[0], _STEM_SHARE, first[1]),)
        self.pieces.append(Piece((v, new), parts, (), (v, new), tuple(lines), tuple(others)))
        for end in group:
            self.pieces[end // 2] = _moved(self.pieces[end // 2], end % 2, new)
        self.rotation[v].append(2 * stem)
        self.rotation[new] = [*group, 2 * stem + 1]
        self._pass_on(v, new, group, stem)
        self.stems[new] = stem
        return new

    def _owner(self, end: int) -> tuple[str, bool]:
        """Link at a piece end, and whether it leaves the vertex from its start."""
        parts = self.pieces[end // 2].parts
        part = parts[0] if end % 2 == 0 else parts[-1]
        return part.owner, part.forward == (end % 2 == 0)

    def _pass_on(self, v: int, new: int, group: list[int], stem: int) -> None:
        """Lead the lines of a group through the stem."""
        here: dict[tuple[int, int], int] = defaultdict(int)
        for (a, b), count in self.through[v].items():
            ends = [2 * stem if end in group else end for end in (a, b)]
            if ends[0] != ends[1]:
                here[min(ends), max(ends)] += count
        self.through[v] = here
        for end in group:
            self.through[new][end, 2 * stem + 1] = max(1, len(self.pieces[end // 2].lines))

    def _stem(self, v: int, group: list[int]) -> NDArray[np.float64]:
        """Vector from a vertex to the fork of a group: amid it, and past nothing else."""
        first = self._bearing(v, group[0])
        middle = first + sum(self._angle(v, a, b) for a, b in itertools.pairwise(group)) / 2.0
        way = np.array([math.cos(middle), math.sin(middle)])
        ahead = [self._next(end) for end in group]
        near = min(float(np.hypot(*(self.places[i] - self.places[v]))) for i in ahead)
        length = min(_LONGEST_STEM, 0.45 * near)
        points = np.array(self.places)
        own = {v, *ahead}
        others = np.array([i for i in range(len(points)) if i not in own], dtype=np.int64)
        segments = self._segments()
        far = shapely.linestrings(points[segments[~np.isin(segments, [v]).any(axis=1)]])
        for _ in range(_HALVINGS):
            tip = points[v] + length * way
            swept = [shapely.Polygon([points[v], tip, points[i]]) for i in ahead]
            courses = [shapely.LineString([points[v], tip, points[i]]) for i in ahead]
            clear = not any(
                shapely.intersects(shape, shapely.points(points[others])).any() for shape in swept
            )
            if clear and not any(shapely.crosses(far, course).any() for course in courses):
                break
            length /= 2.0
        return np.asarray(length * way)

    def _segments(self) -> NDArray[np.int64]:
        pairs = [pair for piece in self.pieces for pair in itertools.pairwise(piece.nodes)]
        return np.array(pairs, dtype=np.int64)

    # ---- the result ----------------------------------------------------------------------

    def result(self) -> tuple[PlaneGraph, NDArray[np.float64]]:
        """Renumber, so that forks stand behind the other vertices and before all other points."""
        n, old = self.graph.n_vertices, len(self.graph.points)
        order = np.array([*range(n), *range(old, len(self.places)), *range(n, old)])
        new = np.empty(len(order), dtype=np.int64)
        new[order] = np.arange(len(order))
        pieces = tuple(
            replace(
                piece,
                ends=(int(new[piece.ends[0]]), int(new[piece.ends[1]])),
                nodes=tuple(int(new[node]) for node in piece.nodes),
            )
            for piece in self.pieces
        )
        vertices = sorted(self.rotation, key=lambda v: int(new[v]))
        through = sorted(
            (int(new[v]), a, b, count)
            for v, pairs in self.through.items()
            for (a, b), count in pairs.items()
        )
        graph = PlaneGraph(
            points=np.array(self.ground)[order],
            station_of=self.graph.station_of + (None,) * len(self.stems),
            pieces=pieces,
            rotation=tuple(tuple(self.rotation[v]) for v in vertices),
            through=tuple(through),
            forks=tuple(sorted(int(new[v]) for v in self.stems)),
            junctions=self.graph.junctions,
        )
        return graph, np.array(self.places)[order]


def _moved(piece: Piece, i: int, vertex: int) -> Piece:
    """Let a piece end at another vertex; the stem's share is taken from its first part."""
    ends = (vertex, piece.ends[1]) if i == 0 else (piece.ends[0], vertex)
    nodes = (vertex, *piece.nodes[1:]) if i == 0 else (*piece.nodes[:-1], vertex)
    k = 0 if i == 0 else len(piece.parts) - 1
    parts = list(piece.parts)
    parts[k] = replace(parts[k], share=max(_STEM_SHARE, parts[k].share - _STEM_SHARE))
    return replace(piece, ends=ends, nodes=nodes, parts=tuple(parts))
