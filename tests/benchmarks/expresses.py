"""List the links that look like an express beside a local line, and why they are kept.

Run as ``python tests/benchmarks/expresses.py FEED...``. A link is suspect if its two stations are
also joined by a way over other stations that is hardly longer (`express_detour`), on lines of the
same kind. For each the script measures, on the shape of the lines that run there, how far the
stations of that way lie off: far off, it is another street or tunnel; near, it is a chord, which
must not be.
"""
# ruff: noqa: T201 - a script's results go to standard output

from __future__ import annotations

import sys
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import networkx as nx
import shapely
from shapely.ops import substring

from gtfs_schematic.feed.model import FeedSettings, Timetable
from gtfs_schematic.feed.read import read_feed
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.ground import ground_about
from gtfs_schematic.network.model import Link, Network, NetworkSettings
from gtfs_schematic.network.ways import way_of_mode

_NEAR_M = 120.0
"""A shape that passes both stations of a link this near may run on it."""
_ASTRAY = 1.6
"""A shape that goes so many times further from end to end does not run on the link."""


@dataclass(frozen=True)
class Suspect:
    """A link beside a way that is hardly longer."""

    link: Link
    way: tuple[str, ...]
    detour: float
    """Length of the way by that of the link, straight from station to station."""
    off_m: tuple[float, ...]
    """How far the stations between lie off the nearest shape of the link's lines, metres."""

    in_street: bool

    @property
    def is_chord(self) -> bool:
        """Whether the link's trips run through every station of the way.

        In a street, to within the kerb; railways have room between the tracks of a station.
        """
        limit = NetworkSettings().alongside_m * (1.0 if self.in_street else 2.0)
        return bool(self.off_m) and max(self.off_m) < limit


def suspects(timetable: Timetable, network: Network) -> Iterator[Suspect]:
    """Find the suspects of a network, in the order of its links."""
    ground = ground_about([(s.lon, s.lat) for s in network.stations])
    metres = ground.metres([(s.lon, s.lat) for s in network.stations])
    at = {s.id: shapely.Point(p) for s, p in zip(network.stations, metres, strict=True)}
    graphs: dict[str, nx.Graph] = {}
    for link in network.links:
        for way in sorted({way_of_mode(network.line[x].mode) for x in link.lines}):
            length = at[link.start].distance(at[link.end])
            graphs.setdefault(way, nx.Graph()).add_edge(link.start, link.end, length=length)
    line_of = {route: line.id for line in network.lines for route in line.route_ids}
    for link in network.links:
        direct = at[link.start].distance(at[link.end])
        kind = way_of_mode(network.line[link.lines[0]].mode)
        graph = graphs[kind].copy()
        graph.remove_edge(link.start, link.end)
        try:
            way = tuple(nx.shortest_path(graph, link.start, link.end, weight="length"))
        except nx.NetworkXNoPath:
            continue
        detour = nx.path_weight(graph, way, "length") / direct
        if detour > NetworkSettings().express_detour:
            continue
        shapes = [
            shapely.LineString(ground.metres(timetable.shapes[pattern.shape_id]))
            for pattern in timetable.patterns
            if line_of.get(pattern.route_id) in link.lines and pattern.shape_id in timetable.shapes
        ]
        ends = (at[link.start], at[link.end])
        sections = [
            _between(shape, *ends)
            for shape in shapes
            if all(shape.distance(end) <= _NEAR_M for end in ends)
        ]
        sections = [s for s in sections if s.length <= _ASTRAY * direct]
        offs = [tuple(section.distance(at[x]) for x in way[1:-1]) for section in sections]
        off = min(offs, key=max, default=())
        yield Suspect(link, way, detour, off, kind == "street")


def _between(shape: shapely.LineString, a: shapely.Point, b: shapely.Point) -> shapely.LineString:
    places = sorted((shape.project(a), shape.project(b)))
    return substring(shape, *places)


def main(paths: list[str]) -> None:
    """Print the suspects of every feed."""
    for path in paths:
        timetable = read_feed([Path(path)], FeedSettings())
        network = build_network(timetable, NetworkSettings())
        found = list(suspects(timetable, network))
        chords = [s for s in found if s.is_chord]
        print(f"{path}: {len(network.links)} links, {len(found)} suspects, {len(chords)} chords")
        for suspect in found:
            names = [network.station[x].name for x in suspect.way]
            lines = ", ".join(network.line[x].name for x in suspect.link.lines)
            off = ", ".join(f"{m:.0f}" for m in suspect.off_m)
            kept = "CHORD" if suspect.is_chord else "kept: it runs elsewhere"
            print(f"  {names[0]} – {names[-1]} ({lines}), {kept}")
            print(f"    beside {' – '.join(names)}, {suspect.detour:.2f} times as long,")
            print(f"    which lie {off or 'unknown'} m off its shapes")


if __name__ == "__main__":
    main(sys.argv[1:])
