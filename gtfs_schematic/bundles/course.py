"""Turn rounded corners into points, for whoever measures a course."""

from __future__ import annotations

import math
from collections.abc import Sequence

from gtfs_schematic.bundles.model import Corner
from gtfs_schematic.bundles.slots import moved, turn_angle
from gtfs_schematic.geometry import Point, unit_vector

_STEP_RAD = math.radians(7.5)


def flatten(corners: Sequence[Corner]) -> list[Point]:
    """Give the points of a rounded course, sheet millimetres; arcs in chords of at most 7.5°."""
    points: list[Point] = [corners[0].at_mm]
    for i in range(1, len(corners) - 1):
        corner = corners[i]
        into = unit_vector(corners[i - 1].at_mm, corner.at_mm)
        out = unit_vector(corner.at_mm, corners[i + 1].at_mm)
        turn = turn_angle(into, out)
        half = math.tan(abs(turn) / 2.0)
        if corner.radius_mm <= 0.0 or half < 1e-9:
            points.append(corner.at_mm)
            continue
        side = math.copysign(1.0, turn)
        start = moved(corner.at_mm, into, -corner.radius_mm * half)
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
