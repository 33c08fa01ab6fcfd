"""Count six kinds of defects of parallel lines on drawn networks.

Run as ``python tests/benchmarks/bundle_defects.py FEED...``. The kinds are those of Sadahiro,
Tanabe, Pierre and Fujii 2014, "Computer-aided design of bus route maps"; how each is measured is
our own:

- intersection: two lines cross more often than their orders on the links and the ground ask for;
- gap: two neighbours of a link stand further apart than a line and a gap, along a straight piece;
- overlap: two lines run over each other for longer than a crossing takes;
- shift: a line changes its place although just the same lines go on on both sides of a station;
- misalignment: the points of a station's marker on one straight bundle are not in one row across;
- acute bend: a line turns by more than 90 degrees within a course.
"""
# ruff: noqa: T201 - a script's results go to standard output

from __future__ import annotations

import itertools
import math
import sys
from collections import Counter, defaultdict
from collections.abc import Iterator

import numpy as np
import shapely

from gtfs_schematic.bundles.model import BundledLayout
from gtfs_schematic.pipeline import draw

KINDS = ("intersection", "gap", "overlap", "shift", "misalignment", "acute bend")
_TOLERANCE_MM = 0.05
_CROSSING_WIDTHS = 3.2
"""A crossing at 45 degrees keeps two lines within a line's width of each other for 2.83 widths."""


def defects(bundled: BundledLayout) -> Counter[str]:
    """Count the defects by kind."""
    found: Counter[str] = Counter(dict.fromkeys(KINDS, 0))
    found["intersection"] = _intersections(bundled)
    found["overlap"] = sum(1 for _ in _overlaps(bundled))
    for link in bundled.layout.network.links:
        found["gap"] += _gaps(bundled, link.id)
    for station in bundled.layout.network.stations:
        found["shift"] += _shifts(bundled, station.id)
        found["misalignment"] += _misaligned(bundled, station.id)
    for stretch in bundled.stretches:
        points = [corner.at_mm for corner in stretch.corners]
        found["acute bend"] += sum(turn > 90.5 for turn in _turns(points))
    return found


def _lines(bundled: BundledLayout) -> list[tuple[str, shapely.LineString]]:
    return [
        (s.line_id, shapely.LineString([corner.at_mm for corner in s.corners]))
        for s in bundled.stretches
    ]


def _intersections(bundled: BundledLayout) -> int:
    """Count the crossings of courses beyond those of the orders and of the ground."""
    network = bundled.layout.network
    asked = bundled.quality.crossings
    for crossing in bundled.layout.crossings:
        pair = [network.link.get(key) for key in (crossing.first, crossing.second)]
        asked += math.prod(len(link.lines) if link else 0 for link in pair)
    points: set[tuple[str, str, float, float]] = set()
    for (one, a), (other, b) in itertools.combinations(_lines(bundled), 2):
        if one == other or not a.crosses(b):
            continue
        met = a.intersection(b)
        for part in getattr(met, "geoms", [met]):
            if part.geom_type == "Point":
                points.add((*sorted((one, other)), round(part.x, 1), round(part.y, 1)))
    return max(0, len(points) - asked)


def _overlaps(bundled: BundledLayout) -> Iterator[tuple[str, str]]:
    """Give the pairs of lines of which one runs over the other for longer than a crossing."""
    width = bundled.settings.line_width_mm
    lines = _lines(bundled)
    zones = [line.buffer(0.9 * width, cap_style="flat") for _, line in lines]
    tree = shapely.STRtree(zones)
    for i, (name, line) in enumerate(lines):
        for j in sorted(tree.query(line, predicate="intersects").tolist()):
            if lines[j][0] == name or j <= i:
                continue
            shared = line.intersection(zones[j])
            for part in getattr(shared, "geoms", [shared]):
                if part.length > _CROSSING_WIDTHS * width:
                    yield name, lines[j][0]


def _gaps(bundled: BundledLayout, link_id: str) -> int:
    """Count the neighbours that stand too far apart amid a link's longest straight piece."""
    path = bundled.layout.paths[link_id]
    p, q = max(itertools.pairwise(path), key=lambda piece: math.dist(*piece))
    pitch = bundled.settings.line_width_mm + bundled.settings.line_gap_mm
    order = bundled.orders[link_id]
    reach = len(order) * pitch
    if len(order) < 2 or math.dist(p, q) < 1.0:
        return 0
    middle = (np.array(p) + q) / 2.0
    along = (np.array(q) - p) / math.dist(p, q)
    across = np.array([-along[1], along[0]])
    section = shapely.LineString([middle - reach * across, middle + reach * across])
    places: dict[str, float] = {}
    for line_id, course in _lines(bundled):
        if line_id in order:
            met = course.intersection(section)
            for part in getattr(met, "geoms", [met]):
                if part.geom_type == "Point":
                    places[line_id] = section.project(part)
    values = [places[line_id] for line_id in order if line_id in places]
    return sum(abs(b - a) > pitch + _TOLERANCE_MM for a, b in itertools.pairwise(values))


def _shifts(bundled: BundledLayout, station_id: str) -> int:
    """Count 1 if the same lines pass between two links in another order."""
    links = [link for link in bundled.layout.network.links if station_id in (link.start, link.end)]
    if len(links) != 2 or links[0].lines != links[1].lines:
        return 0
    orders = []
    for link, arrives in zip(links, (True, False), strict=True):
        order = bundled.orders[link.id]
        forward = (link.end if arrives else link.start) == station_id
        orders.append(order if forward else order[::-1])
    return int(orders[0] != orders[1])


def _misaligned(bundled: BundledLayout, station_id: str) -> int:
    """Count 1 if the marker's points on a straight bundle do not lie in one row across it."""
    links = [link for link in bundled.layout.network.links if station_id in (link.start, link.end)]
    span = bundled.spans.get(station_id)
    if len(links) != 2 or span is None or len(span.points_mm) < 2:
        return 0
    ways = []
    for link in links:
        path = bundled.layout.paths[link.id]
        path = path if link.start == station_id else path[::-1]
        ways.append(np.array(path[1]) - path[0])
    if np.dot(*ways) > -0.99 * np.linalg.norm(ways[0]) * np.linalg.norm(ways[1]):
        return 0
    along = ways[1] / np.linalg.norm(ways[1])
    heights = np.array(span.points_mm) @ along
    return int(np.ptp(heights) > _TOLERANCE_MM)


def _turns(points: list[tuple[float, float]]) -> Iterator[float]:
    """Give by how many degrees a course turns at each of its corners."""
    for a, b, c in zip(points, points[1:], points[2:], strict=False):
        into, out = math.atan2(b[1] - a[1], b[0] - a[0]), math.atan2(c[1] - b[1], c[0] - b[0])
        turn = abs(math.degrees(out - into)) % 360.0
        yield min(turn, 360.0 - turn)


def main(feeds: list[str]) -> None:
    """Print the counts of every feed, and which lines run over each other."""
    for feed in feeds:
        bundled = draw(feed).bundled
        print(feed, dict(defects(bundled)))
        pairs: dict[tuple[str, str], int] = defaultdict(int)
        for pair in _overlaps(bundled):
            pairs[pair] += 1
        for pair in sorted(pairs):
            print("  overlap of", *pair, f"({pairs[pair]} times)")


if __name__ == "__main__":
    main(sys.argv[1:])
