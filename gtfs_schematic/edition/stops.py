"""Tell which stops of a station are the same in two feeds, whatever became of their ids."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence

import numpy as np
from pyproj import Geod
from scipy.optimize import linear_sum_assignment

from gtfs_schematic.feed.model import Stop

_EARTH = Geod(ellps="WGS84")
_OTHER_M = 60.0
"""Another name, code or platform counts like so many metres between them; common practice, no
source."""
_SAME_ID_M = -150.0
"""So far a stop may move and still be believed by its id."""
_FAR_M = 500.0
"""Stops further apart, all told, are not the same."""


def same_stops(
    old: Iterable[Stop],
    new: Iterable[Stop],
    stations: Iterable[tuple[Sequence[str], Sequence[str]]],
) -> dict[str, str]:
    """Match stops within stations that are the same.

    Parameters
    ----------
    old, new
        Stops of both feeds.
    stations
        Per station the ids of its stops before and now.

    Returns
    -------
    dict
        New ids by old ones; stops of which one feed has none are left out. Together the matches
        differ least in place, name, code and platform (a linear assignment).
    """
    before = {stop.id: stop for stop in old}
    after = {stop.id: stop for stop in new}
    found: dict[str, str] = {}
    for was, now in stations:
        ids = [key for key in sorted(was) if key in before]
        others = [key for key in sorted(now) if key in after]
        if ids and others:
            found |= _matched([before[k] for k in ids], [after[k] for k in others])
    return found


def _matched(old: Sequence[Stop], new: Sequence[Stop]) -> Mapping[str, str]:
    costs = np.array([[_unlike(a, b) for b in new] for a in old])
    rows, columns = linear_sum_assignment(costs)
    return {
        old[i].id: new[j].id
        for i, j in zip(rows.tolist(), columns.tolist(), strict=True)
        if costs[i, j] < _FAR_M
    }


def _unlike(a: Stop, b: Stop) -> float:
    """Say how unlike two stops are, as a distance in metres."""
    placed = None not in (a.lon, a.lat, b.lon, b.lat)
    away = float(_EARTH.inv(a.lon, a.lat, b.lon, b.lat)[2]) if placed else _OTHER_M
    for one, other in (
        (a.name, b.name),
        (a.code, b.code),
        (a.platform_code, b.platform_code),
        (a.location_type, b.location_type),
    ):
        away += _OTHER_M * (one != other)
    return round(away + _SAME_ID_M * (a.id == b.id), 3)
