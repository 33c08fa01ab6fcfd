"""Ways of the previous drawing: its paths by their ends, and through closed stations."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.places import place_of, point_of, without_straights

Ways = Mapping[str, Mapping[str, tuple[Point, ...]]]
"""Per station and neighbour the path from the one to the other, millimetres."""


def ways_of(positions: Mapping[str, Point], paths: Mapping[str, tuple[Point, ...]]) -> Ways:
    """Find the stations at which the paths of a drawing end."""
    station_at = {point: station for station, point in sorted(positions.items())}
    ways: dict[str, dict[str, tuple[Point, ...]]] = defaultdict(dict)
    for _, path in sorted(paths.items()):
        a, b = station_at.get(path[0]), station_at.get(path[-1])
        if a is not None and b is not None:
            ways[a][b], ways[b][a] = path, path[::-1]
    return dict(ways)


def way_through(ways: Ways, gone: set[str], start: str, end: str) -> tuple[Point, ...] | None:
    """Path of the previous drawing between two stations through closed ones only."""
    if end in ways.get(start, {}):
        return ways[start][end]
    found: list[tuple[str, tuple[Point, ...]]] = [(start, ())]
    seen = {start}
    while found:
        here, way = found.pop(0)
        for there in sorted(ways.get(here, {})):
            onward = (*way, *ways[here][there][bool(way) :])
            if there == end:
                places = without_straights([place_of(point) for point in onward])
                return tuple(point_of(place) for place in places)
            if there in gone and there not in seen:
                seen.add(there)
                found.append((there, onward))
    return None
