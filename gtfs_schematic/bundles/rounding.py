"""Give corners their radii: concentric within a bundle, and no larger than the straights allow."""

from __future__ import annotations

import math
from collections import defaultdict

from gtfs_schematic.bundles.joints import Group, Knot
from gtfs_schematic.bundles.model import Corner
from gtfs_schematic.bundles.slots import turn_angle
from gtfs_schematic.geometry import distance, unit_vector

_TIGHTEST = 0.25
"""Share of the wanted inner radius that a bundle keeps before its outer lines give way."""


def round_corners(courses: list[list[Knot]], radius_mm: float) -> list[tuple[Corner, ...]]:
    """Round the corners of all courses.

    An arc of radius r that turns by θ takes r tan(θ / 2) of the straights beside it. Where two
    arcs want more of a straight than there is, they share it in proportion. The arcs of a bend of
    a bundle keep one centre: all give way as far as the tightest must.
    """
    halves = [[_half_tangents(knots, i) for i in range(len(knots))] for knots in courses]
    limits = [_limits(*pair, radius_mm) for pair in zip(courses, halves, strict=True)]
    inner: dict[Group, float] = defaultdict(lambda: radius_mm)
    for knots, most in zip(courses, limits, strict=True):
        for knot, limit in zip(knots, most, strict=True):
            if knot.group is not None:
                tightest = max(limit - knot.extra_mm, _TIGHTEST * radius_mm)
                inner[knot.group] = min(inner[knot.group], tightest)
    rounded = []
    for knots, most in zip(courses, limits, strict=True):
        corners = []
        for i, (knot, limit) in enumerate(zip(knots, most, strict=True)):
            base = inner[knot.group] if knot.group is not None else radius_mm
            is_end = i in (0, len(knots) - 1)
            corners.append(Corner(knot.at, 0.0 if is_end else min(base + knot.extra_mm, limit)))
        rounded.append(tuple(corners))
    return rounded


def _half_tangents(knots: list[Knot], i: int) -> float:
    """Give tan(θ / 2) of the turn at a knot, 0 at the ends."""
    if i in (0, len(knots) - 1):
        return 0.0
    into = unit_vector(knots[i - 1].at, knots[i].at)
    out = unit_vector(knots[i].at, knots[i + 1].at)
    return math.tan(min(abs(turn_angle(into, out)), 3.1) / 2.0)


def _limits(knots: list[Knot], halves: list[float], radius_mm: float) -> list[float]:
    """Give the largest radius that each knot may have."""
    wanted = [half * (radius_mm + knot.extra_mm) for half, knot in zip(halves, knots, strict=True)]
    allowed = list(wanted)
    for i in range(len(knots) - 1):
        length = distance(knots[i].at, knots[i + 1].at)
        both = wanted[i] + wanted[i + 1]
        if both > length:
            allowed[i] = min(allowed[i], wanted[i] * length / both)
            allowed[i + 1] = min(allowed[i + 1], wanted[i + 1] * length / both)
    return [
        radius_mm + knot.extra_mm if half < 1e-9 else room / half
        for room, half, knot in zip(allowed, halves, knots, strict=True)
    ]
