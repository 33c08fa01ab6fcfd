"""Put every step between called stations onto the links that a diagram should share."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Container, Mapping, Sequence
from dataclasses import dataclass, field
from typing import TypedDict

import networkx as nx
import shapely

from gtfs_schematic.geometry import Point, distance
from gtfs_schematic.network.model import Link, NetworkSettings
from gtfs_schematic.network.patterns import Ids
from gtfs_schematic.network.tracks import Course, Track, length_of
from gtfs_schematic.network.transfers import escaped

Pair = tuple[str, str]
"""Two station ids, the lesser first."""

_NEAR_TRACK = 2.0
"""A station that a fast train passes lies within this many `alongside_m` of its shape: a merged
station's place may be off its tracks by as much again as a kerbside stop."""
_PART_WAY = 1.03
"""A step that leaves a track part-way may be so many times as long over it as straight: with a bend
of 28° at its middle it is (1 / cos 14°)."""


class Edge(TypedDict):
    """What the graph of steps knows of two stations that follow each other."""

    length: float
    lines: set[str]
    ways: set[str]


@dataclass(frozen=True, slots=True)
class Step:
    """A pair of stations called at one after the other, with all that runs there."""

    pair: Pair
    course: Course
    """From the lesser station id to the greater, local metres."""
    shaped: bool
    lines: frozenset[str]
    ways: frozenset[str]

    @property
    def length(self) -> float:
        """Length of the course, metres."""
        return length_of(self.course)


@dataclass
class Expansion:
    """Which pairs run over stations between, and the network of those that do not."""

    over: dict[Pair, Ids] = field(default_factory=dict)
    """Per pair the whole way from the lesser id to the greater."""

    def without(self, nodes: Container[str]) -> Expansion:
        """Leave some stations or junctions out of all ways."""
        over = {
            pair: tuple(node for node in way if node not in nodes)
            for pair, way in self.over.items()
        }
        return Expansion({pair: way for pair, way in over.items() if len(way) > 2})

    def way(self, a: str, b: str) -> Ids:
        """Give all stations from a to b, both included, and those that lie between."""
        return self._way(a, b, frozenset())

    def _way(self, a: str, b: str, above: frozenset[Pair]) -> Ids:
        pair = (a, b) if a < b else (b, a)
        if pair not in self.over or pair in above:
            return (a, b)
        stations = self.over[pair] if a < b else self.over[pair][::-1]
        inner = above | {pair}
        steps = (self._way(p, q, inner)[1:] for p, q in itertools.pairwise(stations))
        return (a, *itertools.chain.from_iterable(steps))

    def course(self, stations: Ids) -> Ids:
        """Give a pattern's course: called stations and passed ones."""
        steps = (self.way(a, b)[1:] for a, b in itertools.pairwise(stations))
        return (stations[0], *itertools.chain.from_iterable(steps))


def steps_of(
    tracks: Sequence[Track],
    sections: Mapping[Pair, tuple[Course, bool]],
    way_of: Mapping[str, str],
) -> tuple[Step, ...]:
    """Gather the steps of all patterns, shortest first.

    Parameters
    ----------
    tracks
        All kept patterns.
    sections
        Per pair its course and whether that comes from a shape.
    way_of
        Per line id the kind of way that it runs on.
    """
    lines: dict[Pair, set[str]] = defaultdict(set)
    for track in tracks:
        for a, b in itertools.pairwise(track.calling.stations):
            lines[min(a, b), max(a, b)].add(track.calling.line_id)
    steps = [
        Step(
            pair,
            *sections[pair],
            frozenset(ids),
            frozenset(way_of[line] for line in ids),
        )
        for pair, ids in lines.items()
    ]
    return tuple(sorted(steps, key=lambda step: (step.length, step.pair)))


def expresses(
    steps: Sequence[Step], at: Mapping[str, Point], settings: NetworkSettings
) -> dict[Pair, Ids]:
    """Find the steps that skip stations of a track which others call at.

    Steps are taken from the shortest to the longest, so that the way found consists of the
    shortest hops there are. A way counts if it is at most `express_detour` times as long as the
    step, and

    - where the step has a shape: every station on it lies near the shape;
    - where it has none, and off the street also where no station lies near: one line of the
      same kind calls all along it. A fast railway may take a short cut of its own; on the
      street a shape elsewhere means another street;
    - where it has none, off the street: the step leaves such a track part-way, past two of its
      stations at least, and the track up to there and the rest, straight, are hardly longer.
    """
    graph = nx.Graph()
    dots = {station: shapely.points(place) for station, place in sorted(at.items())}
    over: dict[Pair, Ids] = {}
    for step in steps:
        way = _way_near_shape(step, graph, dots, settings) if step.shaped else None
        if way is None and not (step.shaped and "street" in step.ways):
            way = _way_of_one_line(step, graph, settings)
        if way is None and not step.shaped and "street" not in step.ways:
            way = _way_part_way(step, graph, at)
        if way is None:
            way = step.pair
        else:
            over[step.pair] = way
        for a, b in itertools.pairwise(way):
            if (min(a, b), max(a, b)) in over:
                continue
            if not graph.has_edge(a, b):
                graph.add_edge(a, b, length=distance(at[a], at[b]), lines=set(), ways=set())
            graph.edges[a, b]["lines"] |= step.lines
            graph.edges[a, b]["ways"] |= step.ways
    return over


def _way_near_shape(
    step: Step,
    graph: nx.Graph,
    dots: Mapping[str, shapely.Point],
    settings: NetworkSettings,
) -> Ids | None:
    a, b = step.pair
    if a not in graph or b not in graph:
        return None
    course = shapely.linestrings(step.course)
    shapely.prepare(course)
    radius = _NEAR_TRACK * settings.alongside_m
    near: dict[str, bool] = {a: True, b: True}

    def cost(_u: str, v: str, edge: Edge) -> float | None:
        if v not in near:
            near[v] = bool(shapely.dwithin(course, dots[v], radius))
        usable = near[v] and not step.ways.isdisjoint(edge["ways"])
        return edge["length"] if usable else None

    return _shortest(graph, step, cost, settings.express_detour * step.length)


def _way_of_one_line(step: Step, graph: nx.Graph, settings: NetworkSettings) -> Ids | None:
    a, b = step.pair
    if a not in graph or b not in graph:
        return None
    lines = sorted(
        {line for _, _, ids in graph.edges(a, data="lines") for line in ids}
        & {line for _, _, ids in graph.edges(b, data="lines") for line in ids}
    )
    ways = []
    for line in lines:

        def cost(_u: str, _v: str, edge: Edge, line: str = line) -> float | None:
            usable = line in edge["lines"] and not step.ways.isdisjoint(edge["ways"])
            return edge["length"] if usable else None

        way = _shortest(graph, step, cost, settings.express_detour * step.length)
        if way is not None:
            ways.append(way)
    # Most stations first: the most local of the local tracks.
    return min(ways, key=lambda way: (-len(way), way), default=None)


def _way_part_way(step: Step, graph: nx.Graph, at: Mapping[str, Point]) -> Ids | None:
    """Follow the track of one line from either end as far as it leads towards the other."""
    ways: list[tuple[float, Ids]] = []
    for a, b in (step.pair, step.pair[::-1]):
        if a not in graph:
            continue
        limit = _PART_WAY * distance(at[a], at[b])
        for line in sorted({line for _, _, ids in graph.edges(a, data="lines") for line in ids}):

            def cost(_u: str, v: str, edge: Edge, line: str = line, b: str = b) -> float | None:
                usable = line in edge["lines"] and not step.ways.isdisjoint(edge["ways"])
                return edge["length"] if usable and v != b else None

            lengths, paths = nx.single_source_dijkstra(graph, a, cutoff=limit, weight=cost)
            ways += [
                (length, (*paths[c], b))
                for c, length in lengths.items()
                if len(paths[c]) > 2 and length + distance(at[c], at[b]) <= limit
            ]
    if not ways:
        return None
    _, way = min(ways, key=lambda found: (-found[0], found[1]))
    return way if way[0] == step.pair[0] else way[::-1]


def _shortest(graph: nx.Graph, step: Step, cost: object, limit: float) -> Ids | None:
    a, b = step.pair
    lengths, paths = nx.single_source_dijkstra(graph, a, cutoff=limit, weight=cost)
    return tuple(paths[b]) if b in lengths else None


def links_of(courses: Mapping[str, Sequence[Ids]]) -> tuple[Link, ...]:
    """Give one link for every two stations that stand side by side in some course.

    Parameters
    ----------
    courses
        Per line id its courses.
    """
    lines: dict[Pair, set[str]] = defaultdict(set)
    for line_id, ways in courses.items():
        for way in ways:
            for a, b in itertools.pairwise(way):
                lines[min(a, b), max(a, b)].add(line_id)
    links = (Link(link_id(a, b), a, b, tuple(sorted(ids))) for (a, b), ids in lines.items())
    return tuple(sorted(links, key=lambda link: link.id))


def link_id(start: str, end: str) -> str:
    """Give the id of the link between two stations, the lesser id first."""
    return f"{escaped(start)}~{escaped(end)}"
