"""Lay out a changed network on the drawing that stands: only what is new gets a new place.

Everything that the previous drawing has keeps its place to the hundredth of a millimetre. Links
of closed stations are joined, opened stations stand on the link they divide, and what is new
finds its course through the gaps of the drawing; crossings and cyclic orders are the ground's.
"""

from __future__ import annotations

import itertools
import math
from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
import shapely

from gtfs_schematic.geometry import Point, polyline_length
from gtfs_schematic.layout.detour import STEPS, Course, courses_between, courses_onward
from gtfs_schematic.layout.ground import project
from gtfs_schematic.layout.model import Clearances, Crossing, Layout, SheetFrame
from gtfs_schematic.layout.obstacles import Chain, Edge, Obstacles
from gtfs_schematic.layout.places import at_length, place_of, point_of, without_straights
from gtfs_schematic.layout.snap import UNITS_PER_MM
from gtfs_schematic.layout.ways import way_through, ways_of
from gtfs_schematic.network.model import Network
from gtfs_schematic.progress import Progress, Silent

_NEIGHBOURS = 10
"""Stations whose places tell where a new one belongs."""


def revise_layout(
    network: Network,
    positions: Mapping[str, Point],
    paths: Mapping[str, tuple[Point, ...]],
    clearances: Clearances,
    frame: SheetFrame,
    *,
    progress: Progress = Silent(),  # noqa: B008 - stateless
) -> Layout | None:
    """Lay out a network beside what a previous drawing has of it.

    Parameters
    ----------
    network
        The changed network; stations that stay have the ids that they had.
    positions, paths
        Of the previous drawing: places of stations, and paths of links and walks, millimetres.
    clearances
        What will be drawn, millimetres.
    frame
        The sheet of the previous drawing.
    progress
        Told what is going on.

    Returns
    -------
    Layout or None
        None if the drawing that stands has no room for what is new: then it must give way.
    """
    progress.phase("revising the layout")
    draft = _Draft(network, clearances, frame)
    draft.keep(positions, paths)
    waiting = draft.chains()
    while waiting:
        ready = [c for c in waiting if draft.placed(c.stations[0]) or draft.placed(c.stations[-1])]
        if not ready:
            draft.seed(waiting[0].stations[0])
            continue
        # Chains with two fixed ends have the least choice.
        chain = min(ready, key=lambda c: (-draft.fixed_ends(c), len(c.stations), c.stations))
        if not draft.lay(chain):
            return None
        waiting.remove(chain)
        progress.step()
    return draft.layout()


@dataclass
class _Draft:
    """The drawing while it grows."""

    network: Network
    clearances: Clearances
    frame: SheetFrame
    at: dict[str, Point] = field(default_factory=dict)
    path: dict[str, tuple[Point, ...]] = field(default_factory=dict)

    def __post_init__(self) -> None:
        links = [Edge(k.id, k.start, k.end, len(k.lines)) for k in self.network.links]
        walks = [Edge(w.id, w.start, w.end, 0) for w in self.network.walks]
        self.edges = {edge.id: edge for edge in links + walks}
        self.around: dict[str, list[Edge]] = defaultdict(list)
        for edge in self.edges.values():
            self.around[edge.start].append(edge)
            self.around[edge.end].append(edge)
        stations = self.network.stations
        metres = project([(station.lon, station.lat) for station in stations])
        self.ground = {
            s.id: (float(x), float(y)) for s, (x, y) in zip(stations, metres, strict=True)
        }

    # ---- what stays ----------------------------------------------------------------------

    def keep(self, positions: Mapping[str, Point], paths: Mapping[str, tuple[Point, ...]]) -> None:
        """Take over places and paths; join the paths of closed stations, divide for opened."""
        self.at = {s.id: positions[s.id] for s in self.network.stations if s.id in positions}
        old = ways_of(positions, paths)
        gone = set(old) - set(self.at)
        for edge in self.edges.values():
            if edge.end in old.get(edge.start, {}):
                self.path[edge.id] = old[edge.start][edge.end]
        drawn = {frozenset((e.start, e.end)) for e in self.edges.values()}
        for chain in self.chains():
            a, b = chain.stations[0], chain.stations[-1]
            way = None
            if len(chain.edges) == 1 or frozenset((a, b)) not in drawn:
                way = way_through(old, gone, a, b)
            if way is not None:
                # A course that the ground no longer bears out must be laid anew.
                stops = self._obstacles(chain).stations_along(way, len(chain.edges))
                if stops is not None:
                    self._set(chain, way, stops)

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

    def placed(self, station: str) -> bool:
        """Whether a station has its place."""
        return station in self.at

    def fixed_ends(self, chain: Chain) -> int:
        """Count the ends of a chain that have their place."""
        return sum(station in self.at for station in (chain.stations[0], chain.stations[-1]))

    # ---- what is new ---------------------------------------------------------------------

    def seed(self, station: str) -> None:
        """Give a station of a part without any fixed station the place its neighbours suggest."""
        x, y = self._expected(station)
        frame = self.frame
        x = min(max(x, frame.left_mm), frame.right_mm)
        y = min(max(y, frame.top_mm), frame.bottom_mm)
        self.at[station] = (round(x, 2), round(y, 2))

    def lay(self, chain: Chain) -> bool:
        """Lay a chain along the cheapest course that keeps the guarantees."""
        if chain.stations[0] not in self.at:
            chain = Chain(chain.stations[::-1], chain.edges[::-1])
        first, last = chain.stations[0], chain.stations[-1]
        start = place_of(self.at[first])
        leaving = self._ports(first, chain.edges[0])
        spacing = self._spacing()
        expected = shapely.LineString([self._expected(s) for s in chain.stations])
        if last in self.at:
            arriving = self._ports(last, chain.edges[-1])
            courses = courses_between(start, place_of(self.at[last]), leaving, arriving, spacing)
        else:
            courses = courses_onward(start, leaving, len(chain.edges) * spacing, spacing)
        ranked = sorted(courses, key=lambda c: (self._rank(c, expected, spacing), c.corners))
        obstacles = self._obstacles(chain)
        for course in ranked:
            path = tuple(point_of(corner) for corner in course.corners)
            stops = obstacles.stations_along(path, len(chain.edges))
            if stops is not None and obstacles.allow(course):
                self._set(chain, path, stops)
                return True
        return False

    def _obstacles(self, chain: Chain) -> Obstacles:
        own = {edge.id for edge in chain.edges}
        placed = [
            (e, self.path[e.id])
            for e in self.edges.values()
            if e.id in self.path and e.id not in own
        ]
        return Obstacles.of(chain, placed, self.at, self.ground, (self.clearances, self.frame))

    def _rank(self, course: Course, expected: shapely.LineString, spacing: float) -> float:
        """Cost of a course with its distance from where the ground wants it."""
        points = shapely.points([point_of(corner) for corner in course.corners])
        away = float(shapely.distance(points, expected).mean())
        end = math.dist(point_of(course.corners[-1]), expected.coords[-1])
        return round(course.cost + (away + end) / spacing * 0.5, 6)

    def _set(self, chain: Chain, path: tuple[Point, ...], along: list[float]) -> None:
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

    def _ports(self, station: str, edge: Edge) -> tuple[int, ...]:
        """Directions in which an edge may leave a station, in the ground's cyclic order."""
        taken = [
            (self._bearing(station, other), self._port(station, other))
            for other in self.around[station]
            if other.id != edge.id and other.id in self.path
        ]
        used = {port for _, port in taken}
        free = [port for port in range(8) if port not in used]
        mine = self._bearing(station, edge)
        if len(taken) >= 2:
            taken.sort()
            after = next((p for b, p in taken if b > mine), taken[0][1])
            before = next((p for b, p in reversed(taken) if b < mine), taken[-1][1])
            free = [p for p in free if (p - before) % 8 < ((after - before) % 8 or 8)]
        wanted = mine / (math.pi / 4)
        free.sort(key=lambda p: (abs((p - wanted + 4) % 8 - 4), p))
        return tuple(free[:5])

    def _bearing(self, station: str, edge: Edge) -> float:
        """Ground bearing of an edge at a station, radians counter-clockwise from east."""
        other = edge.end if edge.start == station else edge.start
        (ax, ay), (bx, by) = self.ground[station], self.ground[other]
        return math.atan2(by - ay, bx - ax) % math.tau

    def _port(self, station: str, edge: Edge) -> int:
        path = self.path[edge.id] if edge.start == station else self.path[edge.id][::-1]
        (ax, ay), (bx, by) = path[0], path[1]
        sign = ((bx > ax) - (bx < ax), (by > ay) - (by < ay))
        return STEPS.index(sign)

    def _spacing(self) -> float:
        """Median drawn length of a link, at least the least spacing, millimetres."""
        lengths = [
            polyline_length(self.path[k.id]) for k in self.network.links if k.id in self.path
        ]
        return max(float(np.median(lengths)) if lengths else 0.0, self.clearances.spacing_mm)

    def _expected(self, station: str) -> Point:
        """Where the ground wants a station, by the similarity that suits its placed neighbours."""
        if station in self.at:
            return self.at[station]
        here = complex(*self.ground[station])
        known = (
            sorted(self.at, key=lambda s: (round(abs(complex(*self.ground[s]) - here), 3), s))
            if len(self.at) <= _NEIGHBOURS
            else self._nearest(here)
        )
        ground = np.array([complex(*self.ground[s]) for s in known])
        sheet = np.array([complex(self.at[s][0], -self.at[s][1]) for s in known])
        g, w = ground - ground.mean(), sheet - sheet.mean()
        turn = np.vdot(g, w) / max(float(np.vdot(g, g).real), 1e-9)
        place = complex(sheet.mean() + turn * (here - ground.mean()))
        return (place.real, -place.imag)

    def _nearest(self, here: complex) -> list[str]:
        away = {s: abs(complex(*self.ground[s]) - here) for s in self.at}
        return sorted(away, key=lambda s: (round(away[s], 3), s))[:_NEIGHBOURS]

    # ---- the result ----------------------------------------------------------------------

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
            {s.id: self.at[s.id] for s in self.network.stations},
            {k.id: self.path[k.id] for k in self.network.links},
            {w.id: self.path[w.id] for w in self.network.walks},
            tuple(sorted(crossings, key=lambda c: (c.first, c.second, c.at_mm))),
        )
