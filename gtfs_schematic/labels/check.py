"""The faults of placed labels, found without the code that placed them."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator, Sequence

import shapely
from shapely import affinity

from gtfs_schematic.bundles.model import BundledLayout, Corner
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels.model import Label, LabelledLayout
from gtfs_schematic.network.model import Station

_ARC_SHARES = tuple(k / 3.0 for k in range(-3, 4))
"""Points of an arc, in halves of its turn from its middle: chords of 15° where it turns by 90°."""
TOLERANCE_MM = 0.1
"""What clearances may fall short by: arcs and discs are approximated differently here."""
_EDGE_MM = 0.01
_WALK_HALF_MM = 0.5


def faults(labelled: LabelledLayout) -> tuple[str, ...]:
    """List what is wrong with the labels of a layout, sorted; empty if they are sound.

    1. Every station has a label or is listed without one, not both, and says its name.
    2. Rows and badges lie within the label's outline, and the outline within the frame.
    3. No two labels, no label and marker, line or walk are nearer than the clearance.
    4. Names along lines lie on their own line and cover no label, marker, walk or other line.
    """
    found = [
        *_completeness(labelled),
        *itertools.chain.from_iterable(
            _within(labelled, labelled.labels[station_id]) for station_id in sorted(labelled.labels)
        ),
        *_nearness(labelled),
        *_along(labelled),
    ]
    return tuple(sorted(found))


def _completeness(labelled: LabelledLayout) -> Iterator[str]:
    """Give the faults against rule 1."""
    network = labelled.bundled.layout.network
    for station in network.stations:
        label = labelled.labels.get(station.id)
        if (label is None) != (station.id in labelled.unplaced):
            yield f"Station {station.id} must have a label or be listed without, and is not."
        if label is None:
            continue
        said = "".join(line.text for line in label.lines if not line.second)
        wanted = labelled.abbreviated.get(station.id, station.name)
        if _bare(said) != _bare(wanted) or not _is_short_for(labelled, wanted, station):
            yield f"The label of station {station.id} says {said!r}, not {station.name!r}."
    for station_id in labelled.labels:
        if station_id not in network.station:
            yield f"There is a label for {station_id}, which is no station."


def _is_short_for(labelled: LabelledLayout, short: str, station: Station) -> bool:
    """Tell whether a person asked for it, or each word is one that the settings give for it."""
    table = labelled.settings.abbreviations
    rows = labelled.settings.rows.get(station.id, ())
    asked = " ".join(rows) or labelled.settings.short_names.get(station.id, station.name)
    name = asked or station.name
    listed = [part for word in name.split() for part in table.get(word, word).split()]
    return short.split() in (name.split(), listed)


def _bare(text: str) -> str:
    """Give a text without white space."""
    return "".join(text.split())


def _within(labelled: LabelledLayout, label: Label) -> Iterator[str]:
    """Give one label's faults against rule 2."""
    outline = shapely.Polygon(label.outline_mm)
    grown = outline.buffer(_EDGE_MM)
    frame = labelled.bundled.layout.sheet
    room = shapely.box(frame.left_mm, frame.top_mm, frame.right_mm, frame.bottom_mm)
    if not room.buffer(_EDGE_MM).contains(outline):
        yield f"The label of station {label.station_id} leaves the sheet's frame."
    for row in label.lines:
        ends = [(row.x_mm, row.y_mm), (row.x_mm + row.width_mm, row.y_mm)]
        if not grown.covers(_turned(shapely.LineString(ends), label)):
            yield f"The row {row.text!r} of station {label.station_id} leaves its outline."
    for badge in label.badges:
        box = shapely.box(
            badge.x_mm, badge.y_mm, badge.x_mm + badge.width_mm, badge.y_mm + badge.height_mm
        )
        if not grown.covers(_turned(box, label)):
            yield f"The badge {badge.text!r} of station {label.station_id} leaves its outline."


def _turned(shape: shapely.Geometry, label: Label) -> shapely.Geometry:
    """Give a shape rotated as the label is; in a frame with y down, shapely's angles turn so."""
    return affinity.rotate(shape, label.angle_deg, origin=label.pivot_mm)


def _nearness(labelled: LabelledLayout) -> Iterator[str]:
    """Give the faults against rule 3."""
    least = max(0.0, labelled.settings.clearance_mm - TOLERANCE_MM)
    ids = sorted(labelled.labels)
    boxes = [shapely.Polygon(labelled.labels[station_id].outline_mm) for station_id in ids]
    tree = shapely.STRtree(boxes)
    for i, box in enumerate(boxes):
        for j in sorted(tree.query(box, predicate="dwithin", distance=least).tolist()):
            if i < j and _too_near(box, boxes[j], least):
                yield f"The labels of stations {ids[i]} and {ids[j]} come too near."
    for name, shape in _drawn(labelled):
        for i in sorted(tree.query(shape, predicate="dwithin", distance=least).tolist()):
            if _too_near(boxes[i], shape, least):
                yield f"The label of station {ids[i]} comes too near to {name}."


def _along(labelled: LabelledLayout) -> Iterator[str]:
    """Give the faults against rule 4."""
    badges = labelled.run_badges
    boxes = []
    for badge in badges:
        (x, y), w, h = badge.at_mm, badge.width_mm / 2.0, badge.height_mm / 2.0
        box = affinity.rotate(shapely.box(x - w, y - h, x + w, y + h), badge.angle_deg)
        boxes.append(box.buffer(-TOLERANCE_MM))
    tree = shapely.STRtree(boxes)
    on_line: set[int] = set()
    for name, shape in (*_drawn(labelled), *_outlines(labelled)):
        for i in sorted(tree.query(shape, predicate="intersects").tolist()):
            if name == f"line {badges[i].line_id}":
                on_line |= {i} if shape.covers(shapely.Point(badges[i].at_mm)) else set()
            elif shape.intersection(boxes[i]).area > TOLERANCE_MM * badges[i].width_mm:
                yield f"The name along line {badges[i].line_id} covers {name}."
    for i in sorted(set(range(len(badges))) - on_line):
        yield f"The name along line {badges[i].line_id} at {badges[i].at_mm} lies off it."


def _outlines(labelled: LabelledLayout) -> Iterator[tuple[str, shapely.Geometry]]:
    """Give the name and the outline of every label."""
    for station_id in sorted(labelled.labels):
        outline = shapely.Polygon(labelled.labels[station_id].outline_mm)
        yield f"the label of station {station_id}", outline


def _too_near(first: shapely.Geometry, second: shapely.Geometry, least: float) -> bool:
    """Tell whether two shapes overlap or are nearer than a distance."""
    return bool(first.distance(second) < least or first.intersection(second).area > 0.0)


def _drawn(labelled: LabelledLayout) -> Iterator[tuple[str, shapely.Geometry]]:
    """Give the name and the inked area of every line, walk and marker."""
    bundled, settings = labelled.bundled, labelled.settings
    half = bundled.settings.line_width_mm / 2.0
    for stretch in bundled.stretches:
        path = shapely.LineString(_cut_corners(stretch.corners))
        yield f"line {stretch.line_id}", path.buffer(half)
    for walk_id in sorted(bundled.layout.walk_paths):
        path = shapely.LineString(bundled.layout.walk_paths[walk_id])
        yield f"walk {walk_id}", path.buffer(_WALK_HALF_MM)
    for station in bundled.layout.network.stations:
        stop = station.kind == "stop"
        radius = settings.marker_radius_mm if stop else settings.interchange_radius_mm
        points = shapely.MultiPoint(_covered(bundled, station.id))
        yield f"the marker of station {station.id}", points.convex_hull.buffer(radius)


def _covered(bundled: BundledLayout, station_id: str) -> tuple[Point, ...]:
    """Give the points under a station's marker."""
    span = bundled.spans.get(station_id)
    return span.points_mm if span and span.points_mm else (bundled.layout.positions[station_id],)


def _cut_corners(corners: Sequence[Corner]) -> list[Point]:
    """Give a course with each corner replaced by points of the arc that rounds it.

    With half the turn t, the arc of radius r has its middle r / cos t from the corner, towards the
    inside; its points lie s t to either side of the corner as seen from there, -1 ≤ s ≤ 1.
    """
    points = [corners[0].at_mm]
    for before, corner, after in zip(corners, corners[1:], corners[2:], strict=False):
        (ax, ay), (x, y), (bx, by) = before.at_mm, corner.at_mm, after.at_mm
        first, second = math.atan2(ay - y, ax - x), math.atan2(by - y, bx - x)
        between = abs((second - first + math.pi) % (2.0 * math.pi) - math.pi)
        half_turn = (math.pi - between) / 2.0
        legs = min(math.dist((ax, ay), (x, y)), math.dist((bx, by), (x, y)))
        if corner.radius_mm <= 0.0 or not 1e-6 < half_turn < math.pi / 2.0 - 1e-6:
            points.append(corner.at_mm)
            continue
        touch = min(corner.radius_mm * math.tan(half_turn), legs)
        radius = touch / math.tan(half_turn)
        inside = math.atan2(math.sin(first) + math.sin(second), math.cos(first) + math.cos(second))
        side = math.copysign(1.0, math.sin(second - inside))
        for share in _ARC_SHARES:
            inward = radius * (1.0 / math.cos(half_turn) - math.cos(share * half_turn))
            beside = side * radius * math.sin(share * half_turn)
            points.append(
                (
                    x + inward * math.cos(inside) - beside * math.sin(inside),
                    y + inward * math.sin(inside) + beside * math.cos(inside),
                )
            )
    points.append(corners[-1].at_mm)
    return [point for point, _ in itertools.groupby(points)]
