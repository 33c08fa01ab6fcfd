"""What a label must know of its station: marker, directions of the lines, wording."""

from __future__ import annotations

import itertools
import math
from collections import defaultdict
from dataclasses import dataclass
from typing import Literal

from gtfs_schematic.bundles.model import BundledLayout
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels.badges import line_ends
from gtfs_schematic.labels.model import LabelSettings, Side
from gtfs_schematic.labels.obstacles import marker_radius, span_points

OCTANTS: tuple[Side, ...] = ("E", "SE", "S", "SW", "W", "NW", "N", "NE")
"""The eight sides clockwise from east; the index is the direction's angle by 45 degrees, y down."""

Run = Literal["horizontal", "vertical", "rising", "falling", "end", "node"]
"""How the lines run at a station; a rising one goes up to the right."""

_RUNS: dict[frozenset[int], Run] = {
    frozenset({0, 4}): "horizontal",
    frozenset({2, 6}): "vertical",
    frozenset({3, 7}): "rising",
    frozenset({1, 5}): "falling",
}


@dataclass(frozen=True, slots=True)
class Site:
    """A station as the label sees it; positions in sheet millimetres, y down."""

    station_id: str
    name: str
    second_name: str
    badges: tuple[tuple[str, str], ...]
    """(line id, name) of the lines that end here."""
    bold: bool
    at: Point
    points: tuple[Point, ...]
    """The points that the marker covers."""
    radius: float
    directions: tuple[int, ...]
    """Octants (indexes of `OCTANTS`) in which lines leave, sorted, without repeats."""
    run: Run
    lines: frozenset[str]
    """Ids of the lines that call."""
    passing: frozenset[str]
    """Ids of the lines on the links that meet there, calling or not."""
    shortened: bool = False
    """Whether the name is a short form."""
    rows: tuple[str, ...] = ()
    """The rows in which a person wants the name; empty: as it falls."""
    angle: int | None = None
    """Degrees by which a person wants it to rise to the right."""

    def support(self, side: Side) -> Point:
        """Give the covered point furthest to a side; where several are, the middle of them."""
        u, v = side_vector(side)
        reach = max(x * u + y * v for x, y in self.points)
        far = [(x, y) for x, y in self.points if x * u + y * v > reach - 0.05]
        xs, ys = [x for x, _ in far], [y for _, y in far]
        return ((min(xs) + max(xs)) / 2.0, (min(ys) + max(ys)) / 2.0)


def side_vector(side: Side) -> Point:
    """Give the unit vector towards a side, y down."""
    angle = math.radians(45.0 * OCTANTS.index(side))
    return (math.cos(angle), math.sin(angle))


def octant(from_point: Point, to_point: Point) -> int:
    """Give the octant in which the second point lies as seen from the first."""
    angle = math.degrees(math.atan2(to_point[1] - from_point[1], to_point[0] - from_point[0]))
    return round(angle / 45.0) % 8


def sites_of(bundled: BundledLayout, settings: LabelSettings) -> tuple[Site, ...]:
    """Give the site of every station, sorted by station id."""
    network = bundled.layout.network
    ends = line_ends(network) if settings.line_badges else {}
    directions = _directions(bundled)
    passing: dict[str, frozenset[str]] = defaultdict(frozenset)
    for link in network.links:
        for end in (link.start, link.end):
            passing[end] |= frozenset(link.lines)
    sites = []
    for station in sorted(network.stations, key=lambda station: station.id):
        octants = tuple(sorted(directions[station.id]))
        name = station.name.strip() or station.id
        rows = settings.rows.get(station.id, ())
        said = " ".join(rows) or settings.short_names.get(station.id, name)
        sites.append(
            Site(
                station_id=station.id,
                name=said,
                second_name=" ".join(
                    part
                    for part in (station.second_name.strip(), settings.remarks.get(station.id))
                    if part
                ),
                badges=ends.get(station.id, ()),
                bold=station.kind != "stop",
                at=bundled.layout.positions[station.id],
                points=span_points(bundled, station.id),
                radius=marker_radius(bundled, settings, station.id),
                directions=octants,
                run=_run(octants),
                lines=frozenset(station.lines),
                passing=passing[station.id] | frozenset(station.lines),
                shortened=said != name,
                rows=rows,
                angle=settings.angles.get(station.id),
            )
        )
    return tuple(sites)


def _directions(bundled: BundledLayout) -> dict[str, set[int]]:
    """Give per station the octants in which its links leave."""
    directions: dict[str, set[int]] = defaultdict(set)
    for link in bundled.layout.network.links:
        path = [point for point, _ in itertools.groupby(bundled.layout.paths[link.id])]
        if len(path) > 1:
            directions[link.start].add(octant(path[0], path[1]))
            directions[link.end].add(octant(path[-1], path[-2]))
    return directions


def _run(octants: tuple[int, ...]) -> Run:
    """Tell how the lines run at a station from the octants in which they leave."""
    if len(octants) == 1:
        return "end"
    return _RUNS.get(frozenset(octants), "node")
