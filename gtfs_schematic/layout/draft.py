"""The drawing while it is revised: what has its place, and what still waits for one."""

from __future__ import annotations

import itertools
import math
from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass, field

import numpy as np
import shapely

from gtfs_schematic.geometry import Point, polyline_length
from gtfs_schematic.layout.ground import project
from gtfs_schematic.layout.model import Clearances, Crossing, Layout, SheetFrame
from gtfs_schematic.layout.obstacles import Chain, Edge, Obstacles
from gtfs_schematic.layout.places import at_length, place_of, point_of, without_straights
from gtfs_schematic.layout.snap import UNITS_PER_MM
from gtfs_schematic.network.model import Network

_NEIGHBOURS = 10
"""Stations whose places tell where a new one belongs."""


@dataclass
class Draft:
    """Places of stations and paths of links and walks, millimetres, y down."""

    network: Network
    clearances: Clearances
    frame: SheetFrame
    at: dict[str, Point] = field(default_factory=dict)
    path: dict[str, tuple[Point, ...]] = field(default_factory=dict)
    thin: dict[str, str] = field(default_factory=dict)
    """Per edge that lacks room, or whose neighbours do, because of what."""

    def __post_init__(self) -> None:  # noqa: D105 - what it gathers is named below
        links = [Edge(k.id, k.start, k.end, len(k.lines)) for k in self.network.links]
        walks = [Edge(w.id, w.start, w.end, 0) for w in self.network.walks]
        self.edges = {edge.id: edge for edge in links + walks}
        self.around: dict[str, list[Edge]] = defaultdict(list)
        for edge in self.edges.values():
            self.around[edge.start].append(edge)
            self.around[edge.end].append(edge)
        nodes = self.network.nodes
        metres = project([(node.lon, node.lat) for node in nodes])
        self.ground = {
            node.id: (float(x), float(y)) for node, (x, y) in zip(nodes, metres, strict=True)
        }

    def copy(self) -> Draft:
        """Give a draft that may be changed without changing this one."""
        return Draft(
            self.network, self.clearances, self.frame,
            dict(self.at), dict(self.path), dict(self.thin),
        )  # fmt: skip

    # ---- what waits ----------------------------------------------------------------------

    def chains(self) -> list[Chain]:
        """Group the edges without a path into chains between fixed or branching stations."""
        missing = [edge for edge in self.edges.values() if edge.id not in self.path]
        chains: list[Chain] = []
        done: set[str] = set()
        ends = [s for s in sorted({s for e in missing for s in (e.start, e.end)}) if self._stops(s)]
        for station in [*ends, *sorted({e.start for e in missing})]:
            for edge in self.around[station]:
                if edge.id in self.path or edge.id in done:
                    continue
                chain = self._walk_chain(station, edge)
                done.update(e.id for e in chain.edges)
                chains.append(chain)
        return chains

    def _stops(self, station: str) -> bool:
        return station in self.at or len(self.around[station]) != 2

    def _walk_chain(self, station: str, edge: Edge) -> Chain:
        stations, edges = [station], [edge]
        while True:
            here = edge.end if edge.start == stations[-1] else edge.start
            stations.append(here)
            if self._stops(here) or here == station:
                return Chain(tuple(stations), tuple(edges))
            edge = next(e for e in self.around[here] if e.id != edge.id)
            edges.append(edge)

    def fixed_ends(self, chain: Chain) -> int:
        """Count the ends of a chain that have their place."""
        return sum(station in self.at for station in (chain.stations[0], chain.stations[-1]))

    # ---- what is known about a place ------------------------------------------------------

    def obstacles(self, chain: Chain) -> Obstacles:
        """Gather what stands in the way of a chain."""
        own = {edge.id for edge in chain.edges}
        placed = [
            (e, self.path[e.id])
            for e in self.edges.values()
            if e.id in self.path and e.id not in own
        ]
        return Obstacles.of(chain, placed, self.at, self.ground, (self.clearances, self.frame))

    def ports(self, station: str, edge: Edge) -> tuple[int, ...]:
        """Directions in which an edge may leave a station, in the ground's cyclic order."""
        mine = self._bearing(station, edge)
        others = [e for e in self.around[station] if e.id != edge.id]
        others.sort(key=lambda e: ((self._bearing(station, e) - mine) % math.tau, e.id))
        # Per laid edge counter-clockwise from here: its port, and how many must pass before it.
        laid = [(self._port(station, e), k) for k, e in enumerate(others, 1) if e.id in self.path]
        free = list(range(8))
        if laid:
            (after, room), (before, last) = laid[0], laid[-1]
            gap, back = (after - before - 1) % 8 + 1, len(others) + 1 - last
            free = [p for p in free if back <= (p - before) % 8 <= gap - room]
        wanted = mine / (math.pi / 4)
        free.sort(key=lambda p: (abs((p - wanted + 4) % 8 - 4), p))
        return tuple(free[:5])

    def beside(self, station: str, edge: Edge) -> list[Edge]:
        """Edges with a path round a station, the nearest to an edge on the ground first."""
        mine = self._bearing(station, edge)
        others = [e for e in self.around[station] if e.id != edge.id and e.id in self.path]
        others.sort(key=lambda e: ((self._bearing(station, e) - mine) % math.tau, e.id))
        ranked = itertools.zip_longest(others, reversed(others))
        return list(dict.fromkeys(e for pair in ranked for e in pair if e is not None))

    def _bearing(self, station: str, edge: Edge) -> float:
        """Ground bearing of an edge at a station, radians counter-clockwise from east."""
        other = edge.end if edge.start == station else edge.start
        (ax, ay), (bx, by) = self.ground[station], self.ground[other]
        return math.atan2(by - ay, bx - ax) % math.tau

    def _port(self, station: str, edge: Edge) -> int:
        path = self.path[edge.id] if edge.start == station else self.path[edge.id][::-1]
        (ax, ay), (bx, by) = path[0], path[1]
        return round(math.atan2(ay - by, bx - ax) / (math.pi / 4)) % 8

    def spacing(self) -> float:
        """Median drawn length of a link, at least the least spacing, millimetres."""
        lengths = [
            polyline_length(self.path[k.id]) for k in self.network.links if k.id in self.path
        ]
        return max(float(np.median(lengths)) if lengths else 0.0, self.clearances.spacing_mm)

    def expected(self, station: str) -> Point:
        """Where the ground wants a station, by the similarity that suits its placed neighbours."""
        if station in self.at:
            return self.at[station]
        here = complex(*self.ground[station])
        away = {s: round(abs(complex(*self.ground[s]) - here), 3) for s in self.at}
        known = sorted(away, key=lambda s: (away[s], s))[:_NEIGHBOURS]
        ground = np.array([complex(*self.ground[s]) for s in known])
        sheet = np.array([complex(self.at[s][0], -self.at[s][1]) for s in known])
        g, w = ground - ground.mean(), sheet - sheet.mean()
        turn = np.vdot(g, w) / max(float(np.vdot(g, g).real), 1e-9)
        place = complex(sheet.mean() + turn * (here - ground.mean()))
        frame = self.frame
        x = min(max(place.real, frame.left_mm), frame.right_mm)
        y = min(max(-place.imag, frame.top_mm), frame.bottom_mm)
        return round(x, 2), round(y, 2)

    def hops(self, sources: Iterable[str]) -> dict[str, int]:
        """Count the links and walks from the nearest of some stations to every one they reach."""
        away = dict.fromkeys(sorted(sources), 0)
        walk = list(away)
        for here in walk:
            for edge in self.around[here]:
                there = edge.end if edge.start == here else edge.start
                if there not in away:
                    away[there] = away[here] + 1
                    walk.append(there)
        return away

    # ---- what gets its place ---------------------------------------------------------------

    def lay(self, chain: Chain, path: tuple[Point, ...], along: list[float]) -> None:
        """Put the chain's stations on a path at lengths along it, and give each edge its share."""
        corners = [place_of(point) for point in path]
        lengths = [math.dist(a, b) for a, b in itertools.pairwise(corners)]
        stops = [at_length(corners, lengths, length * UNITS_PER_MM) for length in along]
        for i, edge in enumerate(chain.edges):
            (begin, k), (finish, m) = stops[i], stops[i + 1]
            run = [begin, *corners[k + 1 : m + 1], finish]
            run = [place for place, _ in itertools.groupby(run)]
            here = chain.stations[i]
            self.at.setdefault(here, point_of(begin))
            self.at.setdefault(chain.stations[i + 1], point_of(finish))
            points = tuple(point_of(place) for place in without_straights(run))
            self.path[edge.id] = points if edge.start == here else points[::-1]

    def lay_thread(self, chain: Chain, path: tuple[Point, ...], along: list[float]) -> None:
        """Do the same with a path whose directions are not exact yet."""
        line = shapely.LineString(path)
        corners = [line.project(shapely.Point(point)) for point in path[1:-1]]
        stops = [path[0], *(_at(line, length) for length in along[1:-1]), path[-1]]
        for i, edge in enumerate(chain.edges):
            inside = [
                p
                for p, t in zip(path[1:-1], corners, strict=True)
                if along[i] + 0.02 < t < along[i + 1] - 0.02
            ]
            here = chain.stations[i]
            self.at.setdefault(here, stops[i])
            self.at.setdefault(chain.stations[i + 1], stops[i + 1])
            points = (stops[i], *inside, stops[i + 1])
            self.path[edge.id] = points if edge.start == here else points[::-1]

    def layout(self) -> Layout:
        """Give the finished layout."""
        ids = [edge.id for edge in self.edges.values()]
        lines = np.array([shapely.LineString(self.path[key]) for key in ids])
        crossings = []
        pairs = shapely.STRtree(lines).query(lines, predicate="crosses").T
        for i, j in sorted({(int(i), int(j)) for i, j in pairs if i < j}):
            a, b = self.edges[ids[i]], self.edges[ids[j]]
            if {a.start, a.end} & {b.start, b.end}:
                continue
            point = lines[i].intersection(lines[j])
            if point.geom_type == "Point":
                first, second = sorted((ids[i], ids[j]))
                crossings.append(Crossing(first, second, (round(point.x, 2), round(point.y, 2))))
        return Layout(
            self.network,
            self.frame,
            {node.id: self.at[node.id] for node in self.network.nodes},
            {k.id: self.path[k.id] for k in self.network.links},
            {w.id: self.path[w.id] for w in self.network.walks},
            tuple(sorted(crossings, key=lambda c: (c.first, c.second, c.at_mm))),
        )


def _at(line: shapely.LineString, length: float) -> Point:
    point = line.interpolate(length)
    return round(point.x, 2), round(point.y, 2)
