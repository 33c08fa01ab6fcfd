"""The faults of a layout against the guarantees; shares no code with the engine.

1. Every station and link is drawn, and paths end at their stations.
2. Every segment runs at an exact multiple of the layout's angle, 45 or 90 degrees.
3. Links and walks cross where they cross on the ground, and nowhere else.
4. The cyclic order of links round every station is that of the ground.
5. Clearances, pins and limits on the drift are kept, and everything lies on the sheet.

Only at a station with more links and walks than there are directions, and only as far as they part,
may two of them leave together.

On the ground, stations nearer than a few metres to a foreign link touch it as far as anyone can
tell; where the order or a crossing hangs on less than that, both outcomes are right.
"""

from __future__ import annotations

import itertools
import math
from collections import defaultdict
from collections.abc import Mapping

import networkx as nx
import numpy as np
import shapely
from numpy.typing import NDArray
from pyproj import Geod

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.check_stations import (
    Edge,
    common_start,
    shares_needlessly,
    wrong_order,
)
from gtfs_schematic.layout.model import Clearances, Layout, LayoutSettings
from gtfs_schematic.network.model import Link, Walk

_TOUCH_M = 30.0
"""Distance on the ground below which touching and missing are not told apart, metres."""
_TOLERANCE_MM = 0.15
"""What clearances may lack for rounding to hundredths of a millimetre."""


def faults(
    layout: Layout,
    clearances: Clearances,
    pins: Mapping[str, Point] | None = None,
    settings: LayoutSettings | None = None,
) -> tuple[str, ...]:
    """Name everything in which a layout breaks its guarantees; empty if all are kept.

    Parameters
    ----------
    layout
        Positions and paths in sheet millimetres, y down.
    clearances
        Widths and distances that were asked for, millimetres.
    pins
        Places that stations must keep, millimetres.
    settings
        What else was asked for: limits on the drift.
    """
    found = list(_missing(layout))
    if found:
        return tuple(found)
    edges = _edges(layout)
    ground = _ground(layout)
    found += _off_angle(edges, layout.angles)
    found += _wrong_crossings(layout, edges, ground)
    found += wrong_order(layout, edges, ground, _TOUCH_M)
    found += shares_needlessly(edges, 360 // layout.angles)
    found += _too_close(layout, edges, clearances)
    found += _off_sheet(layout, edges)
    found += _off_pin(layout, pins or {})
    found += drifted_too_far(layout, settings or LayoutSettings())
    return tuple(found)


def drifted_too_far(layout: Layout, settings: LayoutSettings) -> list[str]:
    """Name stations that are drawn further from their true places than their limits allow.

    Where a true place is on the sheet tells the least-squares fit of scale and shift to all
    stations, with the ground turned as the layout says, solved by numpy.
    """
    ids = [station.id for station in layout.network.stations]
    limits = [settings.drift_limits_m.get(key, settings.drift_limit_m) for key in ids]
    if not any(limits) and not settings.drift_limit_mm:
        return []
    ground = _ground(layout)
    turn = np.exp(1j * math.radians(layout.rotation_deg))
    as_drawn = np.array([complex(*ground[key]) for key in ids]) * turn
    east_north = np.column_stack([as_drawn.real, as_drawn.imag])
    drawn = np.array([layout.positions[key] for key in ids]) * [1.0, -1.0]
    # Unknown: millimetres to the metre, and where the first station's meridian and parallel meet.
    rows = np.zeros((2 * len(ids), 3))
    rows[:, 0] = east_north.ravel()
    rows[0::2, 1] = rows[1::2, 2] = 1.0
    (scale, *middle), *_ = np.linalg.lstsq(rows, drawn.ravel(), rcond=None)
    away = np.hypot(*(drawn - middle - max(scale, 0.0) * east_north).T)
    return [
        f"Station {key} is drawn {mm:.2f} mm from its true place, further than its limit."
        for key, metres, mm in zip(ids, limits, away.tolist(), strict=True)
        if (metres and mm > metres * scale + _TOLERANCE_MM)
        or (settings.drift_limit_mm and mm > settings.drift_limit_mm + _TOLERANCE_MM)
    ]


def _edges(layout: Layout) -> tuple[Edge, ...]:
    network = layout.network
    links = [Edge(k.id, k.start, k.end, len(k.lines), layout.paths[k.id]) for k in network.links]
    walks = [Edge(w.id, w.start, w.end, 0, layout.walk_paths[w.id]) for w in network.walks]
    return tuple(links + walks)


def _ground(layout: Layout) -> dict[str, Point]:
    """Metres east and north of the first station, by forward geodesics (a second projection)."""
    stations = layout.network.nodes
    geod = Geod(ellps="WGS84")
    count = len(stations)
    lon = float(np.mean([station.lon for station in stations]))
    lat = float(np.mean([station.lat for station in stations]))
    azimuth, _, length = geod.inv(
        [lon] * count, [lat] * count, [s.lon for s in stations], [s.lat for s in stations]
    )
    return {
        station.id: (r * math.sin(math.radians(a)), r * math.cos(math.radians(a)))
        for station, a, r in zip(stations, azimuth, length, strict=True)
    }


def _missing(layout: Layout) -> list[str]:
    network = layout.network
    found = [
        f"Station {station.id} ({station.name}) is not placed."
        for station in network.stations
        if station.id not in layout.positions
    ]
    found += [
        f"Junction {junction.id} is not placed."
        for junction in network.junctions
        if junction.id not in layout.positions
    ]
    paths = {**layout.paths, **layout.walk_paths}
    edges: list[Link | Walk] = [*network.links, *network.walks]
    for edge in edges:
        path = paths.get(edge.id)
        if path is None or len(path) < 2:
            found.append(f"{edge.id} has no path.")
        elif (path[0], path[-1]) != (
            layout.positions.get(edge.start),
            layout.positions.get(edge.end),
        ):
            found.append(f"{edge.id} does not run from its start to its end.")
    return found


def _off_angle(edges: tuple[Edge, ...], angles: int) -> list[str]:
    found = []
    for edge in edges:
        for (ax, ay), (bx, by) in itertools.pairwise(edge.path):
            # Hundredths of a millimetre are whole numbers: the test is exact.
            dx, dy = round((bx - ax) * 100), round((by - ay) * 100)
            if (dx, dy) == (0, 0):
                found.append(f"{edge.id} has a segment without length at ({ax}, {ay}).")
            elif dx != 0 and dy != 0 and (abs(dx) != abs(dy) or angles != 45):
                found.append(f"{edge.id} is off the {360 // angles} directions at ({ax}, {ay}).")
    return found


def _wrong_crossings(
    layout: Layout, edges: tuple[Edge, ...], ground: Mapping[str, Point]
) -> list[str]:
    found = []
    lines = np.array([shapely.LineString(edge.path) for edge in edges])
    pairs = shapely.STRtree(lines).query(lines, predicate="intersects").T
    drawn: dict[tuple[int, int], int] = {}
    for i, j in sorted({(int(i), int(j)) for i, j in pairs if i < j}):
        shared = {edges[i].start, edges[i].end} & {edges[j].start, edges[j].end}
        ends = [shapely.Point(layout.positions[s]) for s in shared]
        ends += [common_start(edges[i], edges[j], s) for s in shared]
        near = shapely.union_all(ends).buffer(0.006)
        for part in shapely.get_parts(lines[i].intersection(lines[j])):
            if near.covers(part):
                continue
            if part.geom_type != "Point":
                found.append(f"{edges[i].id} and {edges[j].id} lie on each other.")
            drawn[i, j] = drawn.get((i, j), 0) + 1
    for i, edge in enumerate(edges):
        if not lines[i].is_simple and edge.start != edge.end:
            found.append(f"{edge.id} crosses itself.")
    courses = np.array([shapely.LineString([ground[e.start], ground[e.end]]) for e in edges])
    return found + _compare_crossings(layout, edges, courses, drawn)


def _compare_crossings(
    layout: Layout,
    edges: tuple[Edge, ...],
    courses: NDArray[np.object_],
    drawn: Mapping[tuple[int, int], int],
) -> list[str]:
    """Compare drawn crossings with those of the straight links on the ground."""
    found = []
    for (i, j), count in drawn.items():
        a, b = edges[i].id, edges[j].id
        if count > 1:
            found.append(f"{a} and {b} cross {count} times.")
        if courses[i].distance(courses[j]) > _TOUCH_M:
            found.append(f"{a} and {b} cross, but not on the ground.")
    real = shapely.STRtree(courses).query(courses, predicate="crosses").T
    for i, j in sorted({(int(i), int(j)) for i, j in real if i < j}):
        if (i, j) in drawn:
            continue
        ends = shapely.points([*courses[i].coords, *courses[j].coords])
        reach = [shapely.distance(ends[:2], courses[j]), shapely.distance(ends[2:], courses[i])]
        if min(map(min, reach)) > _TOUCH_M:
            found.append(f"{edges[i].id} and {edges[j].id} cross on the ground, but not here.")
    listed = {frozenset((c.first, c.second)) for c in layout.crossings}
    found += [
        f"The crossing of {edges[i].id} and {edges[j].id} is not listed."
        for i, j in drawn
        if frozenset((edges[i].id, edges[j].id)) not in listed
    ]
    return found


def _too_close(layout: Layout, edges: tuple[Edge, ...], clearances: Clearances) -> list[str]:
    found = []
    pitch = clearances.line_width_mm + clearances.line_gap_mm
    half = np.array([(max(1, e.lines) * pitch - clearances.line_gap_mm) / 2 for e in edges])
    half[[e.lines == 0 for e in edges]] = clearances.line_width_mm / 4
    lines = np.array([shapely.LineString(edge.path) for edge in edges])
    reach = 2.0 * float(half.max()) + clearances.line_gap_mm
    near = shapely.STRtree(lines).query(lines, predicate="dwithin", distance=reach).T
    ways = _ways(layout, edges)
    for i, j in sorted({(int(i), int(j)) for i, j in near if i < j}):
        a, b = edges[i], edges[j]
        wanted = half[i] + half[j] + clearances.line_gap_mm
        gap = float(lines[i].distance(lines[j]))
        if gap < wanted - _TOLERANCE_MM and not _converge(ways, a, b, wanted):
            found.append(f"{a.id} and {b.id} are {gap:.2f} mm apart, less than {wanted:.2f} mm.")
    places = shapely.points([layout.positions[s.id] for s in layout.network.stations])
    close = (
        shapely.STRtree(places)
        .query(places, predicate="dwithin", distance=clearances.marker_mm - _TOLERANCE_MM)
        .T
    )
    for i, j in sorted({(int(i), int(j)) for i, j in close if i < j}):
        a_id, b_id = layout.network.stations[i].id, layout.network.stations[j].id
        found.append(f"Stations {a_id} and {b_id} are nearer than a marker is wide.")
    return found


def _ways(layout: Layout, edges: tuple[Edge, ...]) -> nx.Graph:
    """Graph of stations and crossings with the drawn lengths between them."""
    at: dict[str, list[Point]] = defaultdict(list)
    for crossing in layout.crossings:
        at[crossing.first].append(crossing.at_mm)
        at[crossing.second].append(crossing.at_mm)
    ways = nx.Graph()
    for edge in edges:
        line = shapely.LineString(edge.path)
        between = sorted((line.project(shapely.Point(p)), p) for p in at[edge.id])
        stops: list[tuple[float, object]] = [(0.0, edge.start), *between, (line.length, edge.end)]
        for (s, a), (t, b) in itertools.pairwise(stops):
            if not ways.has_edge(a, b) or ways.edges[a, b]["length"] > t - s:
                ways.add_edge(a, b, length=t - s, edge=edge.id)
    return ways


def _converge(ways: nx.Graph, a: Edge, b: Edge, wanted: float) -> bool:
    """Whether two links belong to one bend or branching: a short way along the drawing joins them.

    Two links that leave a point at 45 degrees are `wanted` apart only where the way between them is
    longer than `wanted` / sin 22.5°: of all triangles over that side with 45 degrees opposite, the
    one with equal legs has the longest way.
    """
    ends = [n for x, y, d in ways.edges(data="edge") if d == a.id for n in (x, y)]
    others = {n for x, y, d in ways.edges(data="edge") if d == b.id for n in (x, y)}
    reached = nx.multi_source_dijkstra_path_length(
        ways,
        {a.start, a.end, *ends},
        cutoff=wanted / math.sin(math.pi / 8) + _TOLERANCE_MM,
        weight="length",
    )
    return bool(({b.start, b.end} | others) & set(reached))


def _off_pin(layout: Layout, pins: Mapping[str, Point]) -> list[str]:
    return [
        f"Station {station} is not at its pin."
        for station, (x, y) in sorted(pins.items())
        if math.dist(layout.positions.get(station, (math.inf, math.inf)), (x, y)) > 0.011
    ]


def _off_sheet(layout: Layout, edges: tuple[Edge, ...]) -> list[str]:
    sheet = layout.sheet
    return [
        f"{edge.id} leaves the frame of the sheet."
        for edge in edges
        if any(
            not (
                sheet.left_mm - _TOLERANCE_MM <= x <= sheet.right_mm + _TOLERANCE_MM
                and sheet.top_mm - _TOLERANCE_MM <= y <= sheet.bottom_mm + _TOLERANCE_MM
            )
            for x, y in edge.path
        )
    ]
