"""The faults of a background: what it crosses, and which side of a shore every station is on.

1. A link or walk is crossed as often as on the ground, or less often by an even number.
2. A station lies in a surface if and only if it does so on the ground.
3. Outlines run in the eight directions, do not cross themselves, and stay on the sheet's frame.
4. Surfaces of a kind do not lie over each other.

On the ground, what is nearer to a shore than the layout tells stations and links apart may lie on
either side. Shares no code with the work: places are compared in degrees, as the files have them.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator
from dataclasses import replace

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely.geometry.base import BaseGeometry

from gtfs_schematic.background.model import Background, LeftOut, Shape
from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.model import Layout

_TOUCH_M = 30.0
_M_PER_DEGREE = 111_000.0
_EDGE_MM = 0.01
_OFF = 0.02
"""How far from one of the eight directions a segment may be, radians: corners are rounded."""


def faults(background: Background, layout: Layout) -> tuple[str, ...]:
    """Name everything in which a background breaks its guarantees; empty if all are kept."""
    found: list[str] = []
    for shape in background.shapes:
        drawn = shape.drawn
        found += _wrong_crossings(shape, drawn, layout)
        found += _wrong_sides(shape, drawn, layout)
        found += _wrong_course(shape, drawn, layout)
    return (*found, *_overlaps(background))


def without_faulty(background: Background, layout: Layout) -> Background:
    """Leave out, and list, the shapes that have faults: nothing wrong is drawn."""
    kept: list[Shape] = []
    left_out = list(background.left_out)
    for shape in background.shapes:
        tried = replace(background, shapes=(*kept, shape))
        found = faults(tried, layout)
        if found:
            left_out.append(LeftOut(_called(shape), f"it cannot be carried soundly: {found[0]}"))
        else:
            kept.append(shape)
    return replace(background, shapes=tuple(kept), left_out=tuple(left_out))


def _stretched(geometry: BaseGeometry, layout: Layout) -> BaseGeometry:
    """Make degrees alike in both directions, so that distances mean something."""
    lat = np.mean([station.lat for station in layout.network.stations])
    factor = math.cos(math.radians(float(lat)))
    return shapely.transform(geometry, lambda places: places * (factor, 1.0))


def _places(layout: Layout) -> tuple[NDArray[np.object_], NDArray[np.object_]]:
    """Give the stations on the ground and on the sheet."""
    stations = layout.network.stations
    ground = shapely.points([(s.lon, s.lat) for s in stations])
    sheet = shapely.points([layout.positions[s.id] for s in stations])
    return _stretched(ground, layout), sheet


def _wrong_crossings(shape: Shape, drawn: BaseGeometry, layout: Layout) -> Iterator[str]:
    ground_line = _stretched(_outline(shape.on_ground), layout)
    drawn_line = _within(_outline(drawn), layout) if shape.surface else drawn
    stations = layout.network.station
    touch = _TOUCH_M / _M_PER_DEGREE
    edges = [(k.id, k.start, k.end, layout.paths) for k in layout.network.links]
    edges += [(w.id, w.start, w.end, layout.walk_paths) for w in layout.network.walks]
    for key, start, end, paths in edges:
        if key not in paths:
            continue
        ends = [(stations[e].lon, stations[e].lat) for e in (start, end)]
        course = _stretched(shapely.LineString(ends), layout)
        real = _meetings(ground_line, course)
        here = _meetings(drawn_line, shapely.LineString(paths[key]))
        if here == real or (here < real and (real - here) % 2 == 0):
            continue
        near = min(shapely.distance(shapely.points(course.coords), ground_line))
        if near > touch:
            yield f"{_called(shape)} crosses {key} {here} times, but {real} times on the ground."


def _wrong_sides(shape: Shape, drawn: BaseGeometry, layout: Layout) -> Iterator[str]:
    if not shape.surface:
        return
    ground, sheet = _places(layout)
    whole = _stretched(shape.on_ground, layout)
    inside = shapely.contains(whole, ground)
    here = shapely.contains(drawn, sheet)
    clear = shapely.distance(whole.boundary, ground) > _TOUCH_M / _M_PER_DEGREE
    for i in np.flatnonzero((inside != here) & clear):
        station = layout.network.stations[i]
        side = "in" if here[i] else "out of"
        yield f"{station.id} ({station.name}) is {side} {_called(shape)}, unlike on the ground."


def _wrong_course(shape: Shape, drawn: BaseGeometry, layout: Layout) -> Iterator[str]:
    sheet = layout.sheet
    frame = shapely.box(sheet.left_mm, sheet.top_mm, sheet.right_mm, sheet.bottom_mm)
    if not frame.buffer(_EDGE_MM).covers(drawn):
        yield f"{_called(shape)} leaves the frame of the sheet."
    if not drawn.is_valid:
        yield f"{_called(shape)} crosses itself."
    for ring in shape.rings:
        points = [corner.at_mm for corner in ring]
        for p, q in itertools.pairwise([*points, points[0]] if shape.surface else points):
            if _is_off(p, q):
                yield f"{_called(shape)} is off the eight directions at {p}."


def _overlaps(background: Background) -> Iterator[str]:
    surfaces = [(shape, shape.drawn) for shape in background.shapes if shape.surface]
    for (one, a), (other, b) in itertools.combinations(surfaces, 2):
        if one.kind == other.kind and a.intersection(b).area > _EDGE_MM:
            yield f"{_called(one)} and {_called(other)} lie over each other."


def _is_off(p: Point, q: Point) -> bool:
    length = math.dist(p, q)
    turn = math.remainder(math.atan2(q[1] - p[1], q[0] - p[0]), math.pi / 4.0)
    return length * abs(math.sin(turn)) > _OFF


def _within(line: BaseGeometry, layout: Layout) -> BaseGeometry:
    """Leave out where a surface is only cut off by the frame."""
    sheet = layout.sheet
    edge = shapely.box(sheet.left_mm, sheet.top_mm, sheet.right_mm, sheet.bottom_mm).exterior
    return line.difference(edge.buffer(_EDGE_MM))


def _outline(geometry: BaseGeometry) -> BaseGeometry:
    return geometry.boundary if "Polygon" in geometry.geom_type else geometry


def _meetings(one: BaseGeometry, other: BaseGeometry) -> int:
    """Count the places in which two lines cross."""
    return len([part for part in shapely.get_parts(one.intersection(other)) if not part.is_empty])


def _called(shape: Shape) -> str:
    return f"{shape.kind} {shape.name}".strip()
