"""What a label must keep clear of: drawn lines, walks, markers and the sheet's edge."""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.bundles.model import BundledLayout, Stretch
from gtfs_schematic.geometry import Point, distance, unit_vector
from gtfs_schematic.labels.blocking import Blocks, blocks_of, least_free_push
from gtfs_schematic.labels.model import LabelSettings
from gtfs_schematic.layout.model import SheetFrame

WALK_WIDTH_MM = 1.0
"""Width that a walk takes on the sheet, millimetres."""
_ARC_STEP = math.radians(11.25)

Shapes = NDArray[np.object_]
"""An array of shapely geometries in sheet millimetres."""


@dataclass(frozen=True)
class Obstacles:
    """The drawn things, as geometries with spatial indexes."""

    frame: SheetFrame
    half_width: float
    """Half of a line's width, millimetres."""
    clearance: float
    pieces: Shapes
    """Centre lines of the lines' courses, cut into straight pieces."""
    piece_lines: tuple[str, ...]
    """The line id of every piece."""
    piece_tree: shapely.STRtree
    walk_tree: shapely.STRtree
    stations: tuple[str, ...]
    """Ids of the stations, in the order of `markers`."""
    markers: Shapes
    marker_tree: shapely.STRtree
    blocks: Blocks
    """All of these, each with the distance that labels keep from it."""

    def blocked(self, corners: NDArray[np.float64]) -> NDArray[np.bool_]:
        """Tell for each box, shape (N, 4, 2), whether it is not free."""
        still = np.zeros((len(corners), 2))
        return ~np.isfinite(least_free_push(corners, still, self.blocks, step_mm=1.0, steps=0))


def obstacles_of(bundled: BundledLayout, settings: LabelSettings) -> Obstacles:
    """Collect what is drawn, in the order of ids."""
    pieces: list[shapely.LineString] = []
    piece_lines: list[str] = []
    for stretch in bundled.stretches:
        for a, b in itertools.pairwise(course(stretch)):
            pieces.append(shapely.LineString([a, b]))
            piece_lines.append(stretch.line_id)
    walks = [
        shapely.LineString(path)
        for _, path in sorted(bundled.layout.walk_paths.items())
        if len(set(path)) > 1
    ]
    stations = tuple(sorted(bundled.layout.network.station))
    markers = [marker_outline(bundled, settings, station_id) for station_id in stations]
    radii = [marker_radius(bundled, settings, station_id) for station_id in stations]
    hulls = [shapely.MultiPoint(span_points(bundled, key)).convex_hull for key in stations]
    half = bundled.settings.line_width_mm / 2.0
    shapes = [
        *((piece, half) for piece in pieces),
        *((walk, WALK_WIDTH_MM / 2.0) for walk in walks),
        *zip(hulls, radii, strict=True),
    ]
    sheet = bundled.layout.sheet
    blocks = blocks_of(
        [(shape, reach + settings.clearance_mm) for shape, reach in shapes],
        (sheet.left_mm, sheet.top_mm, sheet.right_mm, sheet.bottom_mm),
    )
    piece_array, marker_array = np.array(pieces, dtype=object), np.array(markers, dtype=object)
    return Obstacles(
        frame=bundled.layout.sheet,
        half_width=bundled.settings.line_width_mm / 2.0,
        clearance=settings.clearance_mm,
        pieces=piece_array,
        piece_lines=tuple(piece_lines),
        piece_tree=shapely.STRtree(piece_array),
        walk_tree=shapely.STRtree(np.array(walks, dtype=object)),
        stations=stations,
        markers=marker_array,
        marker_tree=shapely.STRtree(marker_array),
        blocks=blocks,
    )


def span_points(bundled: BundledLayout, station_id: str) -> tuple[Point, ...]:
    """Give the points that a station's marker covers, or its place if no line calls."""
    span = bundled.spans.get(station_id)
    return span.points_mm if span and span.points_mm else (bundled.layout.positions[station_id],)


def marker_radius(bundled: BundledLayout, settings: LabelSettings, station_id: str) -> float:
    """Give the outer radius of a station's marker round the points that it covers."""
    if bundled.layout.network.station[station_id].kind == "stop":
        return settings.marker_radius_mm
    return settings.interchange_radius_mm


def marker_outline(
    bundled: BundledLayout, settings: LabelSettings, station_id: str
) -> shapely.Polygon:
    """Give the outline of a station's marker: the hull of its points, widened by its radius."""
    hull = shapely.MultiPoint(span_points(bundled, station_id)).convex_hull
    return hull.buffer(marker_radius(bundled, settings, station_id), quad_segs=6)


def course(stretch: Stretch) -> tuple[Point, ...]:
    """Give a stretch's course with its corners rounded, as a polyline within 0.02 radii."""
    corners = stretch.corners
    points: list[Point] = [corners[0].at_mm]
    for before, corner, after in zip(corners, corners[1:], corners[2:], strict=False):
        points += _rounded(before.at_mm, corner.at_mm, after.at_mm, corner.radius_mm)
    points.append(corners[-1].at_mm)
    return tuple(point for point, _ in itertools.groupby(points))


def _rounded(before: Point, at: Point, after: Point, radius: float) -> list[Point]:
    """Give points along the arc that rounds a corner; a tight corner gets a smaller radius."""
    back, on = unit_vector(at, before), unit_vector(at, after)
    cosine = max(-1.0, min(1.0, back[0] * on[0] + back[1] * on[1]))
    half = math.acos(cosine) / 2.0
    turn = math.pi - 2.0 * half
    if radius <= 0.0 or turn < 1e-6 or half < 1e-6:
        return [at]
    room = min(distance(before, at), distance(at, after))
    reach = min(radius / math.tan(half), room)
    radius = reach * math.tan(half)
    middle = (back[0] + on[0], back[1] + on[1])
    scale = radius / math.sin(half) / math.hypot(*middle)
    center = (at[0] + middle[0] * scale, at[1] + middle[1] * scale)
    first = (at[0] + back[0] * reach, at[1] + back[1] * reach)
    start = math.atan2(first[1] - center[1], first[0] - center[0])
    way = 1.0 if back[0] * on[1] - back[1] * on[0] < 0.0 else -1.0
    steps = max(1, math.ceil(turn / _ARC_STEP))
    return [
        (
            center[0] + radius * math.cos(start + way * turn * i / steps),
            center[1] + radius * math.sin(start + way * turn * i / steps),
        )
        for i in range(steps + 1)
    ]
