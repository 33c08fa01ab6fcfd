"""Markers of stations and the small signs on lines: the project's own shapes, sheet millimetres.

A stop is a pale dot with a thin outline, drawn out to a capsule over the lines that call, with a
thin neck across lines that pass. An interchange is a larger, heavier capsule. A terminus is a solid
bar across the line's end.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass

import shapely

from gtfs_schematic.drawing.model import PathShape
from gtfs_schematic.drawing.paths import circle, polyline, rounded_rectangle
from gtfs_schematic.geometry import Point, distance, unit_vector
from gtfs_schematic.network.model import StationKind

_STOP_OUTLINE = 0.24
_INTERCHANGE_OUTLINE = 0.3
_NECK = 0.3
"""In marker radii, as the two above."""
STEP_FREE_COLORS = ("#1F4E8C", "#FFFFFF")
_BAR_THICKNESS = 0.8
"""In radii of the interchange's marker."""


@dataclass(frozen=True, slots=True)
class MarkerLook:
    """Sizes and colours of the markers of one sheet; millimetres."""

    stop_radius: float
    large_radius: float
    pitch: float
    """Distance between neighbouring lines of a bundle."""
    ink: str
    paper: str


def marker(
    kind: StationKind, points: Sequence[Point], across: Point, look: MarkerLook
) -> tuple[PathShape, ...]:
    """Give a station's marker.

    Parameters
    ----------
    kind
        Which of the three signs.
    points
        Where the calling lines pass; at least one.
    across
        Unit vector across the line, for the bar over a single line.
    look
        Sizes and colours.
    """
    if kind == "terminus":
        return (_bar(points, across, look),)
    edges = spanning_edges(points)
    if kind == "interchange":
        return _capsules(points, edges, (look.large_radius, _INTERCHANGE_OUTLINE), look)
    reach = 1.6 * look.pitch
    near = [edge for edge in edges if distance(*edge) <= reach]
    far = [edge for edge in edges if distance(*edge) > reach]
    necks = tuple(
        PathShape(
            polyline(edge), stroke=look.ink, stroke_width=2.0 * _NECK * look.stop_radius, cap="butt"
        )
        for edge in far
    )
    return necks + _capsules(points, near, (look.stop_radius, _STOP_OUTLINE), look)


def spanning_edges(points: Sequence[Point]) -> list[tuple[Point, Point]]:
    """Give the shortest edges that join all points (Prim 1957); ties go to the earlier point."""
    left = list(points[1:])
    tree = list(points[:1])
    edges = []
    while left:
        near, start = min(
            itertools.product(left, tree),
            key=lambda pair: (round(distance(*pair), 6), points.index(pair[1])),
        )
        edges.append((start, near))
        tree.append(near)
        left.remove(near)
    return edges


def chevron(at: Point, direction: Point, size: float, color: str) -> PathShape:
    """Give an arrowhead on a line; `size` is half its height in millimetres."""
    dx, dy = direction
    tip = (at[0] + 0.5 * size * dx, at[1] + 0.5 * size * dy)
    wings = [
        (tip[0] - size * dx - side * size * dy, tip[1] - size * dy + side * size * dx)
        for side in (1.0, -1.0)
    ]
    return PathShape(
        polyline([wings[0], tip, wings[1]]), stroke=color, stroke_width=0.55 * size, cap="round"
    )


def walk_shapes(d: str, color: str, paper: str, width: float) -> tuple[PathShape, PathShape]:
    """Give a walk's connector: two thin parallel strokes along a path."""
    return (
        PathShape(d, stroke=color, stroke_width=width, cap="butt"),
        PathShape(d, stroke=paper, stroke_width=0.5 * width, cap="butt"),
    )


def step_free_sign(
    x: float, y: float, size: float, colors: tuple[str, str]
) -> tuple[PathShape, ...]:
    """Give the step-free sign on a square tile; (x, y) is its upper left corner.

    A plain rendering of the symbol of access of ISO 7000 (number 0100) and ISO 7001, from memory:
    head, seated body and wheel.
    """
    tile, figure = colors

    def stroke(points: Sequence[Point]) -> PathShape:
        d = polyline([(x + size * a, y + size * b) for a, b in points])
        return PathShape(d, stroke=figure, stroke_width=0.085 * size)

    wheel = [
        (0.46 + 0.22 * math.cos(math.radians(a)), 0.64 + 0.22 * math.sin(math.radians(a)))
        for a in range(20, 236, 15)
    ]
    return (
        PathShape(rounded_rectangle((x, y, x + size, y + size), 0.18 * size), fill=tile),
        PathShape(circle((x + 0.43 * size, y + 0.19 * size), 0.075 * size), fill=figure),
        stroke([(0.43, 0.34), (0.43, 0.6), (0.66, 0.6), (0.77, 0.82)]),
        stroke([(0.43, 0.45), (0.63, 0.45)]),
        stroke(wheel),
    )


def _capsules(
    points: Sequence[Point],
    edges: Sequence[tuple[Point, Point]],
    measure: tuple[float, float],
    look: MarkerLook,
) -> tuple[PathShape, ...]:
    """Give discs round the points, drawn out along the edges: all ink first, then all paper.

    Points that lie in a clump get one smooth shape round their hull instead.
    """
    radius, outline = measure
    inner = radius * (1.0 - outline)
    if len(edges) == len(points) - 1 and (hull := _clump(points, look.pitch)):
        d = polyline(hull, closed=True)
        return tuple(
            PathShape(d, stroke=color, stroke_width=2.0 * size, fill=color)
            for size, color in ((radius, look.ink), (inner, look.paper))
        )
    shapes = []
    for size, color in ((radius, look.ink), (inner, look.paper)):
        shapes += [
            PathShape(polyline(edge), stroke=color, stroke_width=2.0 * size) for edge in edges
        ]
        joined = {point for edge in edges for point in edge}
        shapes += [
            PathShape(circle(point, size), fill=color) for point in points if point not in joined
        ]
    return tuple(shapes)


def _clump(points: Sequence[Point], pitch: float) -> tuple[Point, ...]:
    """Give the corners of the points' convex hull if it is slim; nothing for a row or a wide one.

    A slim hull of area A and perimeter P is about 2 A / P wide.
    """
    hull = shapely.MultiPoint(points).convex_hull
    if hull.geom_type != "Polygon" or 2.0 * hull.area > hull.length * pitch:
        return ()
    return tuple((float(x), float(y)) for x, y in hull.normalize().exterior.coords[:-1])


def _bar(points: Sequence[Point], across: Point, look: MarkerLook) -> PathShape:
    """Give a solid bar over all points, drawn out a little beyond the outer ones."""
    first, last = min(points), max(points)
    thickness = _BAR_THICKNESS * look.large_radius
    if first == last:
        way = across
    else:
        first, last = max(itertools.combinations(points, 2), key=lambda pair: distance(*pair))
        way = unit_vector(first, last)
    beyond = look.large_radius - 0.25 * thickness
    start = (first[0] - beyond * way[0], first[1] - beyond * way[1])
    end = (last[0] + beyond * way[0], last[1] + beyond * way[1])
    middle = [point for point in points if point not in (first, last)]
    return PathShape(
        polyline([start, *sorted(middle, key=lambda p: distance(start, p)), end]),
        stroke=look.ink,
        stroke_width=thickness,
        cap="butt",
    )
