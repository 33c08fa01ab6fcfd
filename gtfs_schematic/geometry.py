"""Points and small pieces of plane geometry that several rooms share."""

from __future__ import annotations

import itertools
import math

Point = tuple[float, float]
"""A point of the plane; the docstring of whoever uses it names frame and unit."""


def distance(p: Point, q: Point) -> float:
    """Give the Euclidean distance between two points, in their unit."""
    return math.hypot(q[0] - p[0], q[1] - p[1])


def unit_vector(p: Point, q: Point) -> Point:
    """Give the unit vector from `p` to `q`; (1, 0) if they coincide."""
    length = distance(p, q)
    if length == 0.0:
        return (1.0, 0.0)
    return ((q[0] - p[0]) / length, (q[1] - p[1]) / length)


def left_normal(direction: Point) -> Point:
    """Give the unit normal to the left of a direction *as seen on the sheet* (y points down)."""
    return (direction[1], -direction[0])


def polyline_length(points: tuple[Point, ...]) -> float:
    """Give the length of a polyline, in the unit of its points."""
    return sum(distance(p, q) for p, q in itertools.pairwise(points))
