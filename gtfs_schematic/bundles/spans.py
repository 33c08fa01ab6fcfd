"""Find where the calling lines pass every station, for its marker to cover."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping

import shapely

from gtfs_schematic.bundles.course import flatten
from gtfs_schematic.bundles.junction import Junction
from gtfs_schematic.bundles.model import StationSpan, Stretch
from gtfs_schematic.bundles.slots import Slots, moved, right_normal
from gtfs_schematic.geometry import Point, unit_vector
from gtfs_schematic.layout.model import Layout


def find_spans(
    layout: Layout, nodes: Mapping[str, Junction], slots: Slots, stretches: tuple[Stretch, ...]
) -> Mapping[str, StationSpan]:
    """Give the span of every station.

    A line's point is where its course meets the station's axis, a straight line across the widest
    bundle, so that the points of a bundle stand in a row; a course that misses the axis gives its
    point nearest to the station. A station without lines has its own place as only point.
    """
    courses: dict[tuple[str, str], list[shapely.LineString]] = defaultdict(list)
    for stretch in stretches:
        course = shapely.LineString(flatten(stretch.corners))
        for link_id in stretch.link_ids:
            courses[stretch.line_id, link_id].append(course)
    spans = {}
    for station in layout.network.stations:
        points: set[Point] = set()
        if station.id in nodes:
            junction = nodes[station.id]
            axis = _axis(junction, slots)
            for line_id in station.lines:
                near = [c for leg in junction.legs for c in courses.get((line_id, leg.link_id), ())]
                if near:
                    points.add(_passing_point(junction.at_mm, axis, near))
        spans[station.id] = StationSpan(
            station.id, tuple(sorted(points)) or (layout.positions[station.id],)
        )
    return spans


def _axis(junction: Junction, slots: Slots) -> shapely.LineString:
    """Give the line across the widest bundle, a little longer than that is wide.

    Where all lines only turn from one link into another it halves the angle.
    """
    widest = max(junction.legs, key=lambda leg: (slots.half_width(leg.link_id), leg.link_id))
    across = right_normal(widest.direction)
    if len(junction.legs) == 2:
        across = right_normal(unit_vector(junction.legs[1].direction, junction.legs[0].direction))
    aside = max(abs(slots.asides.get(leg.link_id, 0.0)) for leg in junction.legs)
    reach = 1.3 * slots.half_width(widest.link_id) + slots.pitch + aside
    return shapely.LineString(
        [moved(junction.at_mm, across, -reach), moved(junction.at_mm, across, reach)]
    )


def _passing_point(at: Point, axis: shapely.LineString, courses: list[shapely.LineString]) -> Point:
    here = shapely.Point(at)
    meetings = [course.intersection(axis) for course in courses]
    found = [meeting for meeting in meetings if not meeting.is_empty]
    nearest = min(found or courses, key=here.distance)
    point = shapely.get_point(shapely.shortest_line(nearest, here), 0)
    return (round(point.x, 6), round(point.y, 6))
