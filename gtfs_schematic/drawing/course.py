"""Where lines run: points and directions on their drawn courses, sheet millimetres."""

from __future__ import annotations

import itertools
import math
from collections.abc import Collection, Iterator

from gtfs_schematic.bundles.model import BundledLayout
from gtfs_schematic.geometry import Point, distance, unit_vector

_ON_LINE_MM = 0.05
_SAME_WAY = math.cos(math.radians(30.0))


def straight_middle(path: tuple[Point, ...]) -> tuple[Point, Point]:
    """Give the middle of a path's longest straight piece, and its direction; ties: the first."""
    p, q = max(itertools.pairwise(path), key=lambda piece: round(distance(*piece), 6))
    return ((p[0] + q[0]) / 2.0, (p[1] + q[1]) / 2.0), unit_vector(p, q)


def on_line(
    bundled: BundledLayout, line_id: str, at: Point, way: Point
) -> tuple[Point, Point] | None:
    """Give the point of a line nearest to `at` where it runs along `way`, and its direction.

    The direction is turned to agree with `way`; None where the line runs nowhere that way.
    """
    best: tuple[float, Point, Point] | None = None
    for p, q in _segments(bundled, (line_id,)):
        course = unit_vector(p, q)
        along = course[0] * way[0] + course[1] * way[1]
        if abs(along) < _SAME_WAY:
            continue
        foot = _foot(at, p, q)
        gap = distance(at, foot)
        if best is None or gap < best[0] - 1e-9:
            best = gap, foot, course if along > 0.0 else (-course[0], -course[1])
    return None if best is None else best[1:]


def across(bundled: BundledLayout, line_ids: Collection[str], at: Point) -> Point:
    """Give the unit vector across the lines at a point; (0, 1) where none of them passes it."""
    for p, q in _segments(bundled, line_ids):
        if distance(at, _foot(at, p, q)) <= _ON_LINE_MM:
            along = unit_vector(p, q)
            return (-along[1], along[0])
    return (0.0, 1.0)


def _segments(bundled: BundledLayout, line_ids: Collection[str]) -> Iterator[tuple[Point, Point]]:
    for stretch in bundled.stretches:
        if stretch.line_id in line_ids:
            for first, second in itertools.pairwise(stretch.corners):
                if distance(first.at_mm, second.at_mm) > 0.0:
                    yield first.at_mm, second.at_mm


def _foot(at: Point, p: Point, q: Point) -> Point:
    """Give the point of the segment from `p` to `q` that is nearest to `at`."""
    dx, dy = q[0] - p[0], q[1] - p[1]
    share = ((at[0] - p[0]) * dx + (at[1] - p[1]) * dy) / (dx * dx + dy * dy)
    share = min(1.0, max(0.0, share))
    return (p[0] + share * dx, p[1] + share * dy)
