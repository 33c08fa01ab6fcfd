"""Finding neighbouring calls that lie too far apart for the time between them."""

from __future__ import annotations

import itertools
from collections.abc import Iterable, Mapping, Sequence

from pyproj import Geod

from gtfs_schematic.feed.findings import Notebook
from gtfs_schematic.feed.model import Pattern, Route, Stop

_FASTEST_KMH = {"rail": 500.0, "other": 500.0}
_FASTEST_ELSE_KMH = 150.0
_FREE_KM = 10.0
_ROUNDING_S = 60
"""Trains reach 500 km/h at most; no street, cable or water vehicle reaches 150 (no source). Times
are often rounded to minutes, so hops under 10 km are never found."""


def find_leaps(
    notebook: Notebook,
    patterns: Iterable[Pattern],
    stops: Sequence[Stop],
    routes: Mapping[str, Route],
) -> None:
    """Find pairs of stops between which a trip would be impossibly fast.

    One of the two most likely has wrong coordinates, which would spoil the map's extent.
    Distances are geodesics on the WGS 84 ellipsoid.
    """
    places = {stop.id: (stop.lon, stop.lat) for stop in stops}
    seconds: dict[tuple[str, str, float], int] = {}
    for pattern in patterns:
        fastest = _FASTEST_KMH.get(routes[pattern.route_id].mode, _FASTEST_ELSE_KMH)
        for n, (start, end) in enumerate(itertools.pairwise(pattern.stop_ids)):
            key = (min(start, end), max(start, end), fastest)
            time = pattern.offsets_s[n + 1] - pattern.offsets_s[n]
            seconds[key] = max(seconds.get(key, 0), time)
    if not seconds:
        return
    keys = sorted(seconds)
    _, _, meters = Geod(ellps="WGS84").inv(
        [places[start][0] for start, _, _ in keys],
        [places[start][1] for start, _, _ in keys],
        [places[end][0] for _, end, _ in keys],
        [places[end][1] for _, end, _ in keys],
    )
    for (start, end, fastest), length in zip(keys, meters, strict=True):
        km, time = length / 1000.0, seconds[start, end, fastest]
        if km > _FREE_KM and km > fastest * (time + _ROUNDING_S) / 3600.0:
            notebook.find(
                "warning",
                "stops.txt",
                "two stops in a row lie too far apart for the time between them; "
                "check their coordinates",
                value=f"{start}, {end}: {km:.0f} km in {time} s",
            )
