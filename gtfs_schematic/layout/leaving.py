"""In which order paths leave a station, also those that leave it together and part later."""

from __future__ import annotations

import math
from collections.abc import Sequence
from functools import cmp_to_key

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.places import Place, place_of

_APART = 1e-4
"""Angle by which those that leave together are told apart, radians."""


def bearings(paths: Sequence[Sequence[Point]]) -> list[float]:
    """Give the bearing, counter-clockwise from east, in which each path leaves one station.

    Paths that leave together get bearings a little apart, in the order in which they part.

    Parameters
    ----------
    paths
        From the station on, millimetres, y down.
    """
    ways = [[(x, -y) for x, y in map(place_of, path)] for path in paths]
    first = [math.atan2(way[1][1] - way[0][1], way[1][0] - way[0][0]) for way in ways]
    found = list(first)
    for k, bearing in enumerate(first):
        together = [i for i, other in enumerate(first) if abs(other - bearing) < _APART]
        if len(together) > 1:
            order = sorted((ways[i] for i in together), key=cmp_to_key(_side))
            found[k] = bearing + _APART * (order.index(ways[k]) + 1)
    return found


def _side(p: Sequence[Place], q: Sequence[Place]) -> int:
    """Give 1 if the first of two ways goes off to the left where they part, −1 if to the right."""
    came, here = (0, 0), p[0]
    i = j = 1
    while i < len(p) and j < len(q):
        u, v = (p[i][0] - here[0], p[i][1] - here[1]), (q[j][0] - here[0], q[j][1] - here[1])
        if u[0] * v[1] != u[1] * v[0] or u[0] * v[0] + u[1] * v[1] <= 0:
            return 1 if _turn(came, u) > _turn(came, v) else -1
        came = min(u, v, key=lambda step: abs(step[0]) + abs(step[1]))
        here = (here[0] + came[0], here[1] + came[1])
        i, j = i + (here == p[i]), j + (here == q[j])
    return 0


def _turn(came: Place, on: Place) -> float:
    return math.atan2(came[0] * on[1] - came[1] * on[0], came[0] * on[0] + came[1] * on[1])
