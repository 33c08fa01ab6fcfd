"""The six criteria of the multicriteria hill climb, for any drawing of stations and links.

Stott, Rodgers, Martinez-Ovando and Walker (2011), "Automatic Metro Map Layout Using Multicriteria
Optimization", IEEE TVCG 17(1):101-114; formulas from memory. All are sums, zero at best. Theirs are
for straight edges; where a link bends between stations, the bend counts in angular resolution and
straightness as a station with two edges would, so that bending costs whoever does it.
"""

from __future__ import annotations

import itertools
import math
from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import shapely

Point = tuple[float, float]


@dataclass(frozen=True)
class Drawing:
    """Links drawn as polylines, in any unit; the handedness of the plane does not matter."""

    ends: Mapping[str, tuple[str, str]]
    """Per link its two stations."""
    paths: Mapping[str, Sequence[Point]]
    """Per link its polyline from the first station to the second."""
    passes: Sequence[tuple[str, str, str]]
    """(station, link, link) for every line that runs through a station, once per line."""


def angular_resolution(drawing: Drawing) -> float:
    """Sum over stations and neighbouring links of abs(2 pi / degree - angle), radians."""
    around: dict[str, list[float]] = defaultdict(list)
    for link, (start, end) in drawing.ends.items():
        path = drawing.paths[link]
        around[start].append(_bearing(path[0], path[1]))
        around[end].append(_bearing(path[-1], path[-2]))
    total = 2.0 * sum(abs(turn) for turn, _ in _bends(drawing))
    for bearings in around.values():
        bearings.sort()
        if len(bearings) > 1:
            after = [*bearings[1:], bearings[0] + math.tau]
            even = math.tau / len(bearings)
            total += sum(abs(even - (b - a)) for a, b in zip(bearings, after, strict=True))
    return total


def edge_length(drawing: Drawing, wanted: float) -> float:
    """Sum over links of abs(length / wanted - 1)."""
    return sum(abs(length / wanted - 1.0) for length in lengths(drawing).values())


def balanced_edge_length(drawing: Drawing, wanted: float) -> float:
    """Sum over stations with two links of the difference of their lengths, by the wanted length."""
    around: dict[str, list[float]] = defaultdict(list)
    length = lengths(drawing)
    for link, ends in drawing.ends.items():
        for station in ends:
            around[station].append(length[link])
    return sum(abs(pair[0] - pair[1]) for pair in around.values() if len(pair) == 2) / wanted


def straightness(drawing: Drawing, lines_on: Mapping[str, int]) -> float:
    """Sum over lines of all their turns, at stations and between them, radians.

    `lines_on` gives per link how many lines run on it.
    """
    total = 0.0
    for station, first, second in drawing.passes:
        one, other = (_leaving(drawing, station, link) for link in (first, second))
        total += abs(math.remainder(other - one - math.pi, math.tau))
    return total + sum(abs(turn) * lines_on[link] for turn, link in _bends(drawing))


def octilinearity(drawing: Drawing) -> float:
    """Sum over straight pieces of abs(sin(4 bearing)): 0 on the eight directions, 1 between."""
    return sum(
        abs(math.sin(4.0 * _bearing(p, q)))
        for path in drawing.paths.values()
        for p, q in itertools.pairwise(path)
    )


def crossings(drawing: Drawing) -> int:
    """Count points in which two links meet other than at a station of both."""
    ids = sorted(drawing.paths)
    shapes = np.array([shapely.LineString(drawing.paths[i]) for i in ids])
    pairs = shapely.STRtree(shapes).query(shapes, predicate="intersects").T
    count = 0
    for i, j in ((int(i), int(j)) for i, j in pairs if i < j):
        shared = set(drawing.ends[ids[i]]) & set(drawing.ends[ids[j]])
        places = [shapely.Point(_place(drawing, station, ids[i])) for station in shared]
        reach = 1e-6 * (1.0 + shapes[i].length)
        count += sum(
            all(part.distance(place) > reach for place in places)
            for part in shapely.get_parts(shapes[i].intersection(shapes[j]))
        )
    return count


def lengths(drawing: Drawing) -> dict[str, float]:
    """Length of every link."""
    return {
        link: sum(math.dist(p, q) for p, q in itertools.pairwise(path))
        for link, path in drawing.paths.items()
    }


def _bearing(p: Point, q: Point) -> float:
    return math.atan2(q[1] - p[1], q[0] - p[0])


def _place(drawing: Drawing, station: str, link: str) -> Point:
    return drawing.paths[link][0 if drawing.ends[link][0] == station else -1]


def _leaving(drawing: Drawing, station: str, link: str) -> float:
    path = drawing.paths[link]
    if drawing.ends[link][0] == station:
        return _bearing(path[0], path[1])
    return _bearing(path[-1], path[-2])


def _bends(drawing: Drawing) -> Iterator[tuple[float, str]]:
    for link, path in drawing.paths.items():
        bearings = [_bearing(p, q) for p, q in itertools.pairwise(path)]
        for a, b in itertools.pairwise(bearings):
            yield math.remainder(b - a, math.tau), link
