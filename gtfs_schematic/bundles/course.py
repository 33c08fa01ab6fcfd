"""Turn rounded corners into points, for whoever measures a course."""

from __future__ import annotations

import math
from collections.abc import Sequence

from gtfs_schematic.bundles.model import Corner
from gtfs_schematic.bundles.slots import moved, turn_angle
from gtfs_schematic.geometry import Point, unit_vector

_STEP_RAD = math.radians(7.5)


def tangent_mm(corners: Sequence[Corner], i: int) -> float:
    """Give how much of the straights beside a corner its arc takes, millimetres.

    That is r tan(θ / 2) for a turn by θ: more than the radius beyond a right angle.
    """
    if i in (0, len(corners) - 1):
        return 0.0
    into = unit_vector(corners[i - 1].at_mm, corners[i].at_mm)
    out = unit_vector(corners[i].at_mm, corners[i + 1].at_mm)
    return corners[i].radius_mm * math.tan(abs(turn_angle(into, out)) / 2.0)


def flatten(corners: Sequence[Corner]) -> list[Point]:
    """Give the points of a rounded course, sheet millimetres; arcs in chords of at most 7.5°."""
    points: list[Point] = [corners[0].at_mm]
    for i in range(1, len(corners) - 1):
        corner = corners[i]
        into = unit_vector(corners[i - 1].at_mm, corner.at_mm)
        out = unit_vector(corner.at_mm, corners[i + 1].at_mm)
        turn = turn_angle(into, out)
        tangent = tangent_mm(corners, i)
        if tangent < 1e-9:
            points.append(corner.at_mm)
            continue
        side = math.copysign(1.0, turn)
        start = moved(corner.at_mm, into, -tangent)
        center = moved(start, (-into[1] * side, into[0] * side), corner.radius_mm)
        steps = max(1, math.ceil(abs(turn) / _STEP_RAD))
        for k in range(steps + 1):
            angle = turn * k / steps
            arm = (start[0] - center[0], start[1] - center[1])
            cos, sin = math.cos(angle), math.sin(angle)
            points.append(
                (
                    center[0] + arm[0] * cos - arm[1] * sin,
                    center[1] + arm[0] * sin + arm[1] * cos,
                )
            )
    points.append(corners[-1].at_mm)
    return points
