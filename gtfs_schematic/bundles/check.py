"""Find the faults in a bundled layout; shares no code with the work that made it."""

from __future__ import annotations

import itertools
import math
from collections import Counter, defaultdict
from collections.abc import Iterator, Mapping

import numpy as np
import shapely

from gtfs_schematic.bundles.model import BundledLayout, Stretch
from gtfs_schematic.layout.model import Layout
from gtfs_schematic.network.model import Network

_TOLERANCE_MM = 0.02
_CHORDS_PER_TURN = 48
_SHARES = tuple(np.linspace(0.08, 0.92, 15))
"""Where along a straight piece of a link its lines are measured."""


def faults(bundled: BundledLayout) -> tuple[str, ...]:
    """Give every fault of a bundled layout as a sentence; none in a good one.

    1. The order of a link holds each of its lines once.
    2. The links of a line lie on its stretches, each on one.
    3. Crossings and separations are counted right, and no fewer than the bound.
    4. Arcs fit between their neighbours, and ends are sharp.
    5. Amid each straight piece of a link that is long enough, all lines stand in order, at their
       offsets from the centre line, and so a line's width and gap apart.
    6. Every station has a span, whose points lie on the courses of its lines.
    7. Links that leave a station together share a stretch with all their lines; none is cut short.
    """
    plain = (*_order_faults(bundled), *_coverage_faults(bundled), *_fork_faults(bundled))
    if plain:
        # What is missing cannot be measured.
        return plain
    by_line = _courses(bundled)
    return (
        *_quality_faults(bundled),
        *(fault for stretch in bundled.stretches for fault in _radius_faults(stretch)),
        *_offset_faults(bundled, by_line),
        *_span_faults(bundled, by_line),
    )


def count_order(layout: Layout, orders: Mapping[str, tuple[str, ...]]) -> tuple[int, int]:
    """Count crossings and separations straight from their definitions.

    Two lines cross at a station for every two of their ways whose ends interleave in the cyclic
    order of all line ends there; they part where they go on together from one link to another
    and are neighbours in only one of them.
    """
    crossings = separations = 0
    for station_id, ways in _ways(layout.network).items():
        views = _views(layout, orders, station_id)
        port = {key: i for i, key in enumerate((k, m) for k, view in views for m in view)}
        seen = dict(views)
        for (m, a, b), (n, c, d) in itertools.combinations(sorted(ways), 2):
            if m == n:
                continue
            low, high = sorted((port[a, m], port[b, m]))
            crossings += (low < port[c, n] < high) != (low < port[d, n] < high)
            if (a, b) == (c, d):
                gaps = [abs(seen[k].index(m) - seen[k].index(n)) for k in (a, b)]
                separations += (gaps[0] == 1) != (gaps[1] == 1)
    return crossings, separations


def _ways(network: Network) -> dict[str, set[tuple[str, str, str]]]:
    """Give per station (line, station before, station after), the two stations sorted.

    A line with just two neighbours counts as passing even if all its courses end there.
    """
    ways: dict[str, set[tuple[str, str, str]]] = defaultdict(set)
    for line in network.lines:
        for course in line.courses:
            stops = list(course)
            if len(stops) > 2 and stops[0] == stops[-1]:
                stops.append(stops[1])
            for before, here, after in zip(stops, stops[1:], stops[2:], strict=False):
                if before != after:
                    ways[here].add((line.id, min(before, after), max(before, after)))
    beside: dict[tuple[str, str], set[str]] = defaultdict(set)
    for link in network.links:
        for line_id in link.lines:
            beside[link.start, line_id].add(link.end)
            beside[link.end, line_id].add(link.start)
    for (here, line_id), around in beside.items():
        if len(around) == 2 and not any(way[0] == line_id for way in ways[here]):
            ways[here].add((line_id, min(around), max(around)))
    return dict(sorted(ways.items()))


def _views(
    layout: Layout, orders: Mapping[str, tuple[str, ...]], station_id: str
) -> list[tuple[str, tuple[str, ...]]]:
    """Give per neighbour, clockwise, the lines from left to right looking there."""
    found = []
    for link in layout.network.links:
        path = np.array(layout.paths[link.id])
        if link.start == station_id:
            found.append((*(path[1] - path[0]), link.end, orders[link.id]))
        elif link.end == station_id:
            found.append((*(path[-2] - path[-1]), link.start, orders[link.id][::-1]))
    found.sort(key=lambda view: math.atan2(view[1], view[0]))
    return [(neighbor, order) for _, _, neighbor, order in found]


def _order_faults(bundled: BundledLayout) -> Iterator[str]:
    for link in bundled.forked.network.links:
        if Counter(bundled.orders.get(link.id, ())) != Counter(link.lines):
            yield f"link {link.id}: its order does not hold each of its lines once"


def _coverage_faults(bundled: BundledLayout) -> Iterator[str]:
    drawn = Counter(
        (stretch.line_id, link_id) for stretch in bundled.stretches for link_id in stretch.link_ids
    )
    wanted = {(m, link.id) for link in bundled.forked.network.links for m in link.lines}
    for line_id, link_id in sorted(wanted | set(drawn)):
        times = drawn[line_id, link_id]
        if times != ((line_id, link_id) in wanted):
            yield f"line {line_id}: drawn {times} times on link {link_id}"


def _fork_faults(bundled: BundledLayout) -> Iterator[str]:
    """Compare links with what they are cut into."""
    whole, cut = bundled.layout, bundled.forked
    stems = set(cut.network.link) - set(whole.network.link)
    courses = {key: shapely.LineString(path) for key, path in cut.paths.items()}
    carried: dict[str, set[str]] = {key: set() for key in stems}
    for link in whole.network.links:
        path = shapely.LineString(whole.paths[link.id])
        along = sorted(k for k in stems if path.buffer(_TOLERANCE_MM).covers(courses[k]))
        for key in along:
            carried[key] |= set(link.lines)
        parts = [courses[link.id], *(courses[key] for key in along)]
        length = sum(part.length for part in parts)
        lost = path.difference(shapely.union_all(parts).buffer(_TOLERANCE_MM))
        if not lost.is_empty or abs(length - path.length) > _TOLERANCE_MM:
            yield f"link {link.id}: it is not whole where it is cut at forks"
    for key in sorted(stems):
        if carried[key] != set(cut.network.link[key].lines):
            yield f"link {key}: it does not have the lines of the links that run through it"


def _quality_faults(bundled: BundledLayout) -> Iterator[str]:
    quality = bundled.quality
    counted = count_order(bundled.forked, bundled.orders)
    if counted != (quality.crossings, quality.separations):
        yield f"order: {counted} crossings and separations, but {quality} is claimed"
    if quality.crossings < quality.crossings_bound:
        yield f"order: fewer crossings than its bound, {quality}"


def _radius_faults(stretch: Stretch) -> Iterator[str]:
    where = f"line {stretch.line_id} from link {stretch.link_ids[0]}"
    at = np.array([corner.at_mm for corner in stretch.corners])
    radius = np.array([corner.radius_mm for corner in stretch.corners])
    steps = np.diff(at, axis=0)
    length = np.hypot(*steps.T)
    if len(at) < 2 or (length <= 0.0).any():
        yield f"{where}: repeated corners"
        return
    if radius[0] != 0.0 or radius[-1] != 0.0:
        yield f"{where}: a rounded end"
    bearing = np.arctan2(steps[:, 1], steps[:, 0])
    turn = np.abs((np.diff(bearing) + np.pi) % (2.0 * np.pi) - np.pi)
    if (turn > math.radians(170.0)).any():
        yield f"{where}: turns back on itself"
    tangent = np.concatenate([[0.0], radius[1:-1] * np.tan(turn / 2.0), [0.0]])
    for i in np.flatnonzero(tangent[:-1] + tangent[1:] > length + 1e-6):
        yield f"{where}: arcs of corners {i} and {i + 1} do not fit between them"


def _courses(bundled: BundledLayout) -> dict[tuple[str, str], shapely.LineString]:
    """Give per line and link the drawn course of the stretch, arcs as chords."""
    courses = {}
    for stretch in bundled.stretches:
        corners = stretch.corners
        points = [corners[0].at_mm]
        for a, b, c in zip(corners, corners[1:], corners[2:], strict=False):
            points.extend(
                _arc(np.array(a.at_mm), np.array(b.at_mm), np.array(c.at_mm), b.radius_mm)
            )
        course = shapely.LineString([*points, corners[-1].at_mm])
        courses.update({(stretch.line_id, link_id): course for link_id in stretch.link_ids})
    return courses


def _arc(a: np.ndarray, b: np.ndarray, c: np.ndarray, radius: float) -> list[tuple[float, float]]:
    """Give points on the circle that touches both sides of a corner: centre on its bisector."""
    u, v = (a - b) / np.linalg.norm(a - b), (c - b) / np.linalg.norm(c - b)
    half = math.acos(max(-1.0, min(1.0, float(u @ v)))) / 2.0
    if radius == 0.0 or half > math.pi / 2.0 - 1e-7:
        return [(float(b[0]), float(b[1]))]
    center = b + (u + v) / np.linalg.norm(u + v) * radius / math.sin(half)
    p, q = (b + w * radius / math.tan(half) - center for w in (u, v))
    count = max(2, math.ceil(_CHORDS_PER_TURN * (math.pi - 2.0 * half) / (2.0 * math.pi)) + 1)
    sweep = math.pi - 2.0 * half
    shares = np.linspace(0.0, 1.0, count)
    points = np.sin((1.0 - shares) * sweep)[:, None] * p + np.sin(shares * sweep)[:, None] * q
    return [(float(x), float(y)) for x, y in center + points / math.sin(sweep)]


def _offset_faults(
    bundled: BundledLayout, courses: Mapping[tuple[str, str], shapely.LineString]
) -> Iterator[str]:
    pitch = bundled.settings.line_width_mm + bundled.settings.line_gap_mm
    widest: Counter[str] = Counter()
    for link in bundled.forked.network.links:
        for end in (link.start, link.end):
            widest[end] = max(widest[end], len(link.lines))
    for link in bundled.forked.network.links:
        order = bundled.orders[link.id]
        wanted = (np.arange(len(order)) - (len(order) - 1) / 2.0) * pitch
        wanted = wanted + bundled.asides.get(link.id, 0.0)
        # Joints and arcs take room at both ends, the more the wider the bundles that meet there;
        # a shorter piece may be all joint, and is not measured.
        room = (widest[link.start] + widest[link.end]) * pitch
        room += 2.0 * bundled.settings.corner_radius_mm
        for p, q in itertools.pairwise(np.array(bundled.forked.paths[link.id])):
            length = float(np.hypot(*(q - p)))
            if length < room:
                continue
            right = np.array([p[1] - q[1], q[0] - p[0]]) / length
            lines = [courses[line_id, link.id] for line_id in order]
            rays = [(p + share * (q - p), right) for share in _SHARES]
            if not any(_at_offsets(lines, wanted, *ray) for ray in rays):
                yield f"link {link.id}: its lines are nowhere beside each other as they should be"


def _at_offsets(
    lines: list[shapely.LineString], wanted: np.ndarray, middle: np.ndarray, right: np.ndarray
) -> bool:
    """Say whether each line meets a ray across the link at its wanted offset from the middle."""
    reach = float(np.abs(wanted).max()) + 1.0
    ray = shapely.LineString([middle - reach * right, middle + reach * right])
    for line, offset in zip(lines, wanted, strict=True):
        found = (shapely.get_coordinates(line.intersection(ray)) - middle) @ right
        if not (np.abs(found - offset) < _TOLERANCE_MM).any():
            return False
    return True


def _span_faults(
    bundled: BundledLayout, courses: Mapping[tuple[str, str], shapely.LineString]
) -> Iterator[str]:
    own: dict[str, list[shapely.LineString]] = defaultdict(list)
    calls = {station.id: set(station.lines) for station in bundled.forked.network.stations}
    for link in bundled.forked.network.links:
        for station_id in (link.start, link.end):
            own[station_id] += [
                courses[m, link.id] for m in link.lines if m in calls.get(station_id, ())
            ]
    for station_id in sorted(calls):
        span = bundled.spans.get(station_id)
        if span is None or not span.points_mm:
            yield f"station {station_id}: no span"
            continue
        for point in span.points_mm if own[station_id] else ():
            away = shapely.Point(point).distance(shapely.MultiLineString(own[station_id]))
            if away > 5.0 * _TOLERANCE_MM:
                yield f"station {station_id}: span point {point} is {away:.2f} mm off"
