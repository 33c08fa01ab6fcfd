"""Paths that the ground no longer bears out, because stations moved: those must be laid anew."""

from __future__ import annotations

import itertools
import math
from collections import Counter
from collections.abc import Iterator

import numpy as np
import shapely

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.draft import Draft
from gtfs_schematic.layout.leaving import bearings

_TOUCH_M = 30.0
"""Distance on the ground below which a crossing and a near miss are not told apart, metres."""


def lift_strained(draft: Draft) -> None:
    """Lift paths until what is left crosses, and goes round stations, as the ground has it."""
    while True:
        count = Counter(key for group in (*_crossed(draft), *_turned(draft)) for key in group)
        if not count:
            return
        # Of two that cross the one with fewer lines goes, unless one is to blame more often.
        worst = min(count, key=lambda key: (-count[key], draft.edges[key].lines, key))
        del draft.path[worst]


def _crossed(draft: Draft) -> Iterator[tuple[str, str]]:
    """Pairs that cross on the ground or on the sheet, but not on both."""
    ids = sorted(draft.path)
    ends = np.array([(draft.edges[k].start, draft.edges[k].end) for k in ids]).reshape(-1, 2)
    ground = [shapely.LineString([draft.ground[a], draft.ground[b]]) for a, b in ends]
    sheet = [shapely.LineString(draft.path[key]) for key in ids]
    pairs = [
        {(int(i), int(j)) for i, j in shapely.STRtree(lines).query(lines, "crosses").T if i < j}
        for lines in (ground, sheet)
    ]
    for i, j in sorted(pairs[0] ^ pairs[1]):
        if set(ends[i]) & set(ends[j]):
            continue
        tips = shapely.points([*ground[i].coords, *ground[j].coords])
        reach = min(*shapely.distance(tips[:2], ground[j]), *shapely.distance(tips[2:], ground[i]))
        if reach > _TOUCH_M:
            yield ids[i], ids[j]


def _turned(draft: Draft) -> Iterator[tuple[str, ...]]:
    """Threes that follow each other round a station otherwise than on the ground."""
    for station in sorted(draft.around):
        ends = []
        around = sorted(draft.around[station], key=lambda e: e.id)
        around = [edge for edge in around if edge.id in draft.path]
        paths = [draft.path[e.id] if e.start == station else draft.path[e.id][::-1] for e in around]
        for edge, drawn in zip(around, bearings(paths), strict=True):
            there = edge.end if edge.start == station else edge.start
            true, length = _bearing(draft.ground[station], draft.ground[there])
            doubt = math.asin(min(1.0, _TOUCH_M / max(length, 1e-9)))
            ends.append((edge.id, true, drawn, doubt))
        for three in itertools.combinations(ends, 3):
            (_, a, p, _), (_, b, q, _), (_, c, r, _) = three
            clear = all(
                abs(math.remainder(one[1] - two[1], math.tau)) > one[3] + two[3]
                for one, two in itertools.combinations(three, 2)
            )
            if clear and _follows(a, b, c) != _follows(p, q, r):
                yield tuple(key for key, *_ in three)


def _bearing(a: Point, b: Point) -> tuple[float, float]:
    return math.atan2(b[1] - a[1], b[0] - a[0]), math.dist(a, b)


def _follows(a: float, b: float, c: float) -> bool:
    """Whether three bearings follow each other counter-clockwise."""
    return (b - a) % math.tau < (c - a) % math.tau
