"""The faults of a layout round its stations; shares no code with the engine.

The cyclic order of links round every station is that of the ground. Two links or walks may leave
a station together, as far as they part, but only at one with more of them than directions.
"""

from __future__ import annotations

import itertools
import math
from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cmp_to_key

import shapely

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.model import Layout

_Step = tuple[int, int]
"""Hundredths of a millimetre east and north, whole numbers."""


@dataclass(frozen=True)
class Edge:
    """A link or walk: its stations and its path on the sheet, millimetres."""

    id: str
    start: str
    end: str
    lines: int
    path: tuple[Point, ...]

    def seen_from(self, station: str) -> list[_Step]:
        """Give the path as it leaves a station."""
        path = self.path if self.start == station else self.path[::-1]
        return [(round(x * 100), -round(y * 100)) for x, y in path]


def common_start(a: Edge, b: Edge, station: str) -> shapely.LineString:
    """Give the stretch on which two edges leave a station together; empty if they do not."""
    common, _ = _parting(a.seen_from(station), b.seen_from(station))
    return shapely.LineString([(x / 100, -y / 100) for x, y in common] if common[1:] else [])


def shares_needlessly(edges: Sequence[Edge], directions: int) -> list[str]:
    """Name stations that edges leave together though there are `directions` enough."""
    found = []
    for station, around in sorted(_around(edges).items()):
        used = len({_direction(edge.seen_from(station)) for edge in around})
        if used < min(len(around), directions):
            found.append(
                f"At {station} {len(around)} links and walks leave in only {used} directions."
            )
    return found


def wrong_order(
    layout: Layout, edges: Sequence[Edge], ground: Mapping[str, Point], touch_m: float
) -> list[str]:
    """Compare, for every three links at a station, their turn on the ground and here.

    Links whose order hangs on less than `touch_m` metres may stand in either.
    """
    found = []
    for station, around in sorted(_around(edges).items()):
        x, y = ground[station]
        ends: list[tuple[float, float, float]] = []
        for rank, edge in enumerate(_counter_clockwise(around, station)):
            there = ground[edge.end if edge.start == station else edge.start]
            dx, dy = there[0] - x, there[1] - y
            doubt = math.asin(min(1.0, touch_m / max(math.hypot(dx, dy), 1e-9)))
            ends.append((math.atan2(dy, dx), math.tau * rank / len(around), doubt))
        for a, b, c in itertools.combinations(ends, 3):
            clear = all(
                abs(math.remainder(p[0] - q[0], math.tau)) > p[2] + q[2]
                for p, q in ((a, b), (b, c), (a, c))
            )
            if clear and _turn(a[0], b[0], c[0]) != _turn(a[1], b[1], c[1]):
                known = layout.network.station.get(station)
                name = "a junction" if known is None else known.name
                found.append(f"The order of links round {station} ({name}) is not the ground's.")
                break
    return found


def _around(edges: Sequence[Edge]) -> dict[str, list[Edge]]:
    around: dict[str, list[Edge]] = defaultdict(list)
    for edge in edges:
        around[edge.start].append(edge)
        around[edge.end].append(edge)
    return around


def _turn(a: float, b: float, c: float) -> bool:
    """Whether three bearings follow each other counter-clockwise."""
    return (b - a) % math.tau < (c - a) % math.tau


def _counter_clockwise(around: list[Edge], station: str) -> list[Edge]:
    """Sort edges as they leave a station; those that leave together, as they part."""

    def compare(a: Edge, b: Edge) -> int:
        p, q = a.seen_from(station), b.seen_from(station)
        if _direction(p) == _direction(q):
            return _parting(p, q)[1]
        return -1 if _bearing(p) < _bearing(q) else 1

    return sorted(around, key=cmp_to_key(compare))


def _bearing(path: list[_Step]) -> float:
    return math.atan2(path[1][1] - path[0][1], path[1][0] - path[0][0])


def _direction(path: list[_Step]) -> _Step:
    dx, dy = path[1][0] - path[0][0], path[1][1] - path[0][1]
    whole = math.gcd(dx, dy) or 1
    return dx // whole, dy // whole


def _parting(p: list[_Step], q: list[_Step]) -> tuple[list[_Step], int]:
    """Give the corners of what two paths have in common from their start on, and a side.

    The side is 1 if the first goes off to the left of the second, −1 if to the right, 0 if they
    do not part.
    """
    common = [p[0]]
    i = j = 1
    while i < len(p) and j < len(q):
        here = common[-1]
        u = (p[i][0] - here[0], p[i][1] - here[1])
        v = (q[j][0] - here[0], q[j][1] - here[1])
        cross = v[0] * u[1] - v[1] * u[0]
        if cross != 0 or u[0] * v[0] + u[1] * v[1] <= 0:
            # Which of the two is to the left counts as seen on arrival.
            before = common[-2] if common[1:] else here
            came = (here[0] - before[0], here[1] - before[1])
            return common, 1 if _turned(came, u) > _turned(came, v) else -1
        near = min((u, v), key=lambda step: step[0] ** 2 + step[1] ** 2)
        common.append((here[0] + near[0], here[1] + near[1]))
        i += common[-1] == p[i]
        j += common[-1] == q[j]
    return common, 0


def _turned(came: _Step, on: _Step) -> float:
    """Angle by which a course turns to the left, −π … π."""
    return math.atan2(came[0] * on[1] - came[1] * on[0], came[0] * on[0] + came[1] * on[1])
