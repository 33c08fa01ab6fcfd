"""The river and the lake of the invented region, as a background layer."""

from __future__ import annotations

import itertools
import json

from gtfs_schematic.demo.ground import lon_lat, smooth
from gtfs_schematic.geometry import Point

_WEST = [
    (-16500, -1900), (-13600, -900), (-11600, -1500), (-9800, -3300), (-8000, -4300),
    (-6200, -3700), (-5300, -2500), (-3940, -1330), (-2450, -790), (-1350, -500),
    (-360, -500), (450, -700), (1170, -970), (1940, -880), (2900, -1170), (3860, -1880),
    (4500, -2550),
]  # fmt: skip
_SHORE = [
    (4300, -2550), (5050, -2080), (5790, -1860), (6900, -1750), (7700, -1950), (9000, -2150),
    (10600, -2950), (12400, -4500), (12950, -6000), (12300, -7300), (11250, -7900),
    (10000, -8000), (8600, -7350), (7200, -7500), (5900, -6950), (5330, -6400), (4850, -5400),
    (4350, -4600), (4250, -3600),
]  # fmt: skip
_EAST = [(12700, -5200), (13400, -5300), (14400, -6300), (15300, -6200), (16500, -7200)]

RIVERS: tuple[tuple[Point, ...], ...] = (smooth(tuple(_WEST), 6), smooth(tuple(_EAST), 6))
LAKE: tuple[Point, ...] = smooth((*_SHORE, _SHORE[0]), 6, closed=True)
"""Closed, in metres from the region's centre."""


def _signed_area(ring: tuple[Point, ...]) -> float:
    return sum(a[0] * b[1] - b[0] * a[1] for a, b in itertools.pairwise(ring)) / 2


def _feature(name: str, kind: str, geometry: dict[str, object]) -> dict[str, object]:
    properties = {"name": name, "kind": kind}
    return {"type": "Feature", "properties": properties, "geometry": geometry}


def background() -> bytes:
    """Give river and lake as GeoJSON (RFC 7946: lon, lat; outer ring counterclockwise)."""
    shore = LAKE if _signed_area(LAKE) > 0 else LAKE[::-1]
    rivers = [[lon_lat(x, y) for x, y in river] for river in RIVERS]
    lake = [[lon_lat(x, y) for x, y in shore]]
    collection = {
        "type": "FeatureCollection",
        "features": [
            _feature("Sethrå", "river", {"type": "MultiLineString", "coordinates": rivers}),
            _feature("Lóm Ovředa", "lake", {"type": "Polygon", "coordinates": lake}),
        ],
    }
    return (json.dumps(collection, ensure_ascii=False, indent=1) + "\n").encode()
