"""Find pairs of stops that face each other across a street, whatever their names."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping

import numpy as np
from scipy.spatial import cKDTree

from gtfs_schematic.feed.model import Timetable
from gtfs_schematic.geometry import Point, unit_vector

_OPPOSED = -0.5
"""Greatest cosine between two opposed headings: 120° or more apart."""


def facing_pairs(
    timetable: Timetable, at: Mapping[str, Point], site_of: Mapping[str, str], limit_m: float
) -> frozenset[frozenset[str]]:
    """Give the pairs of sites at which one route calls in opposed headings, close together.

    Parameters
    ----------
    timetable
        For its patterns.
    at
        Per site its place in local metres.
    site_of
        Per stop id its site.
    limit_m
        Greatest distance of the two, metres; 0 gives no pairs.
    """
    headings = _headings(timetable, at, site_of)
    ids = sorted(headings)
    if len(ids) < 2 or limit_m <= 0.0:
        return frozenset()
    tree = cKDTree(np.array([at[site] for site in ids]))
    return frozenset(
        frozenset((ids[i], ids[j]))
        for i, j in tree.query_pairs(limit_m)
        if _opposed(headings[ids[i]], headings[ids[j]])
    )


def _headings(
    timetable: Timetable, at: Mapping[str, Point], site_of: Mapping[str, str]
) -> dict[str, dict[str, list[Point]]]:
    """Per site and route the headings of its trips there: from the stop before to the next."""
    headings: dict[str, dict[str, list[Point]]] = defaultdict(lambda: defaultdict(list))
    for pattern in timetable.patterns:
        sites = [site_of[stop] for stop in pattern.stop_ids if stop in site_of]
        for i, site in enumerate(sites):
            before, after = at[sites[max(i - 1, 0)]], at[sites[min(i + 1, len(sites) - 1)]]
            if before != after:
                headings[site][pattern.route_id].append(unit_vector(before, after))
    return headings


def _opposed(one: Mapping[str, list[Point]], other: Mapping[str, list[Point]]) -> bool:
    return any(
        p[0] * q[0] + p[1] * q[1] <= _OPPOSED
        for route in one.keys() & other.keys()
        for p in one[route]
        for q in other[route]
    )
