"""From metres around the region's centre to degrees, and smooth courses through points."""

from __future__ import annotations

from gtfs_schematic.geometry import Point

CENTER_LON, CENTER_LAT = -20.0, -48.0
"""Open ocean: nothing is there that the region could be taken for."""
METERS_PER_DEGREE = (74_626.0, 111_190.0)
"""East and north at 48 degrees of latitude on WGS 84, from the usual series in cos(k * lat)."""


def lon_lat(east: float, north: float) -> tuple[float, float]:
    """Give lon, lat in degrees, to six decimals (a tenth of a metre), of a place in metres."""
    lon = CENTER_LON + east / METERS_PER_DEGREE[0]
    lat = CENTER_LAT + north / METERS_PER_DEGREE[1]
    return (round(lon, 6), round(lat, 6))


def _between(four: tuple[Point, ...], t: float) -> Point:
    """Give the point at `t` (0 ... 1) between the second and the third of four points."""
    weights = (
        t * ((2 - t) * t - 1) / 2,
        (t * t * (3 * t - 5) + 2) / 2,
        t * ((4 - 3 * t) * t + 1) / 2,
        (t - 1) * t * t / 2,
    )
    x = sum(weight * point[0] for weight, point in zip(weights, four, strict=True))
    y = sum(weight * point[1] for weight, point in zip(weights, four, strict=True))
    return (x, y)


def smooth(points: tuple[Point, ...], pieces: int, *, closed: bool = False) -> tuple[Point, ...]:
    """Give a smooth course through all points, `pieces` straight pieces between neighbours.

    A uniform cubic spline through its points (Catmull & Rom 1974). A closed course names its
    first point again at the end.
    """
    before = points[-2] if closed else points[0]
    after = points[1] if closed else points[-1]
    around = (before, *points, after)
    course = [
        _between(around[i : i + 4], step / pieces)
        for i in range(len(points) - 1)
        for step in range(pieces)
    ]
    return (*course, points[-1])
