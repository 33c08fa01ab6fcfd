"""Cut courses into hops: the streets from one station to the next that the diagram has there."""

from __future__ import annotations

import itertools
from collections.abc import Mapping, Sequence

import numpy as np
import shapely
from shapely.ops import substring

from gtfs_schematic.geometry import Point
from gtfs_schematic.network.links import Expansion, Pair
from gtfs_schematic.network.patterns import Ids
from gtfs_schematic.network.tracks import Course, Track, length_of

_LEAST_M = 1.0
"""Stations beside the same point of a street, as far as anyone can tell, divide it nowhere."""


def street_hops(
    tracks: Sequence[Track],
    expansion: Expansion,
    way_of: Mapping[str, str],
    at: Mapping[str, Point],
) -> dict[Pair, Course]:
    """Give the street of every hop, from the lesser id to the greater, local metres.

    A hop is two stations that follow each other on some course, called at or passed. Of several
    patterns that run it, one that calls at both ends goes first, then the one with most trips.
    Hops are left out that something runs which keeps off the street, and those without a shape.
    """
    best: dict[Pair, tuple[tuple[bool, int, int], Course]] = {}
    barred: set[Pair] = set()
    for n, track in enumerate(tracks):
        street = way_of[track.calling.line_id] == "street"
        steps = itertools.pairwise(track.calling.stations)
        for (a, b), section in zip(steps, track.sections, strict=True):
            way = expansion.way(a, b)
            hops = [(min(step), max(step)) for step in itertools.pairwise(way)]
            if not street:
                barred.update(hops)
            if not street or not track.shaped:
                continue
            rank = (len(way) > 2, -track.calling.trips, n)
            for hop, start, piece in zip(hops, way, _cut(section, way, at), strict=False):
                if length_of(piece) >= _LEAST_M and (hop not in best or rank < best[hop][0]):
                    best[hop] = (rank, piece if start == hop[0] else piece[::-1])
    return {hop: course for hop, (_, course) in sorted(best.items()) if hop not in barred}


def _cut(section: Course, way: Ids, at: Mapping[str, Point]) -> tuple[Course, ...]:
    """Cut a section beside every station between its ends; none where they come out of order."""
    if len(way) == 2:
        return (section,)
    line = shapely.linestrings(section)
    dots = shapely.points([at[station] for station in way[1:-1]])
    cuts = np.concatenate([[0.0], shapely.line_locate_point(line, dots), [line.length]])
    if (np.diff(cuts) < _LEAST_M).any():
        return ()
    return tuple(
        shapely.get_coordinates(substring(line, low, high))
        for low, high in itertools.pairwise(cuts)
    )
