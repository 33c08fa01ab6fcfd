"""Places on the sheet in whole units, and stations along a course of them."""

from __future__ import annotations

from collections.abc import Iterable

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.snap import UNITS_PER_MM

Place = tuple[int, int]
"""A place on the sheet in units of 1 / `UNITS_PER_MM` mm, y down."""


def at_length(corners: list[Place], lengths: list[float], wanted: float) -> tuple[Place, int]:
    """Place at a length along corners, and the segment on which it lies."""
    for k, length in enumerate(lengths):
        if wanted <= length + 1e-6 or k == len(lengths) - 1:
            (ax, ay), (bx, by) = corners[k], corners[k + 1]
            steps = max(abs(bx - ax), abs(by - ay))
            step = min(steps, round(wanted / length * steps)) if length else 0
            place = (
                ax + step * ((bx > ax) - (bx < ax)),
                ay + step * ((by > ay) - (by < ay)),
            )
            return place, k
        wanted -= length
    return corners[-1], len(lengths) - 1


def without_straights(places: Iterable[Place]) -> list[Place]:
    """Drop the corners at which a course goes straight on."""
    kept: list[Place] = []
    for place in places:
        if len(kept) >= 2 and _sign(kept[-2], kept[-1]) == _sign(kept[-1], place):
            kept.pop()
        kept.append(place)
    return kept


def _sign(a: Place, b: Place) -> Place:
    return ((b[0] > a[0]) - (b[0] < a[0]), (b[1] > a[1]) - (b[1] < a[1]))


def place_of(point: Point) -> Place:
    """Give the whole-unit place of a point in millimetres."""
    return round(point[0] * UNITS_PER_MM), round(point[1] * UNITS_PER_MM)


def point_of(place: Place) -> Point:
    """Give the point in millimetres of a whole-unit place."""
    return place[0] / UNITS_PER_MM, place[1] / UNITS_PER_MM
