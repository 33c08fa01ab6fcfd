"""Finding stops that lie too far from their neighbours for the time between them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import chain
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyproj import Geod

from gtfs_schematic.feed.findings import Notebook
from gtfs_schematic.feed.model import Pattern, Route, Stop

_FASTEST_KMH = {"rail": 500.0, "other": 500.0}
_FASTEST_ELSE_KMH = 150.0
_FREE_KM = 10.0
_ROUNDING_S = 60
"""Trains reach 500 km/h at most; no street, cable or water vehicle reaches 150 (no source). Times
are often rounded to minutes, so hops under 10 km are never found."""
_ASTRAY_KM = 100.0
"""What lies this far off has wrong coordinates; closer by, the times may be wrong (no source)."""
_GEOD = Geod(ellps="WGS84")

Ints = NDArray[Any]


@dataclass(frozen=True)
class _Hops:
    """Pairs of stops that some pattern calls at one after the other, each once."""

    start: Ints
    end: Ints
    """Numbers of stops, the lesser one in `start`."""
    km: NDArray[Any]
    """Geodesic on the WGS 84 ellipsoid."""
    seconds: Ints
    """The longest time that a trip takes."""
    leap: NDArray[Any]
    """Whether that is impossibly fast."""


def find_leaps(
    notebook: Notebook,
    patterns: Sequence[Pattern],
    stops: Sequence[Stop],
    routes: Mapping[str, Route],
    rows: Mapping[str, int],
) -> frozenset[str]:
    """Find hops that are impossibly fast, and give the stops that lie astray.

    A stop lies astray if all its hops are leaps of 100 km or more, to stops that do not lie
    astray themselves; of two that have nothing but such hops, the one further from the median
    stop does. Other leaps are only found.

    Parameters
    ----------
    rows
        Per stop its row in stops.txt.
    """
    hops = _hops(patterns, stops, routes)
    if not hops.leap.any():
        return frozenset()
    astray = _astray(hops, stops)
    for n in np.flatnonzero(hops.leap).tolist():
        start, end = stops[hops.start[n]].id, stops[hops.end[n]].id
        if astray.isdisjoint((start, end)):
            notebook.find(
                "warning",
                "stops.txt",
                "two stops in a row lie too far apart for the time between them; "
                "check their coordinates",
                value=f"{start}, {end}: {hops.km[n]:.0f} km in {hops.seconds[n]} s",
            )
    for number, stop in enumerate(stops):
        if stop.id in astray:
            nearest = hops.km[(hops.start == number) | (hops.end == number)].min()
            told = f"lies {nearest:.0f} km from the stops before and after it"
            fault = "stop lies too far from those before and after it to be right; it is left out"
            notebook.find("error", "stops.txt", fault, row=rows[stop.id], value=stop.id)
            notebook.leave_out("stop", stop.id, f"{stop.name or stop.id} {told}")
    return astray


def with_stations_in_place(
    notebook: Notebook, stops: Sequence[Stop], rows: Mapping[str, int]
) -> tuple[Stop, ...]:
    """Put stations that lie astray amid their stops, and find them."""
    below: dict[str, list[Stop]] = {}
    for stop in stops:
        if stop.parent_id is not None:
            below.setdefault(stop.parent_id, []).append(stop)
    settled = []
    for stop in stops:
        place = stop
        if stop.id in below:
            lon, lat = (
                float(np.mean([getattr(child, axis) for child in below[stop.id]]))
                for axis in ("lon", "lat")
            )
            _, _, meters = _GEOD.inv(stop.lon, stop.lat, lon, lat)
            if meters > 1000.0 * _ASTRAY_KM:
                fault = "station lies too far from its stops to be right; it is put amid them"
                notebook.find("error", "stops.txt", fault, row=rows[stop.id], value=stop.id)
                place = replace(stop, lon=lon, lat=lat)
        settled.append(place)
    return tuple(settled)


def _hops(patterns: Sequence[Pattern], stops: Sequence[Stop], routes: Mapping[str, Route]) -> _Hops:
    numbers = {stop.id: n for n, stop in enumerate(stops)}
    called = np.array([numbers[ident] for p in patterns for ident in p.stop_ids], dtype=np.int64)
    times = np.fromiter(chain.from_iterable(p.offsets_s for p in patterns), dtype=np.int64)
    lengths = [len(p.stop_ids) for p in patterns]
    kmh = [_FASTEST_KMH.get(routes[p.route_id].mode, _FASTEST_ELSE_KMH) for p in patterns]
    trip = np.repeat(np.arange(len(patterns)), lengths)
    inside = trip[1:] == trip[:-1]
    low, high = np.minimum(called[1:], called[:-1]), np.maximum(called[1:], called[:-1])
    speed = np.repeat(kmh, lengths)[1:].astype(np.int64)
    table = np.column_stack([low, high, speed])[inside]
    pairs, which = np.unique(_joined(table, len(stops)), return_inverse=True)
    firsts = np.zeros(len(pairs), dtype=np.int64)
    firsts[which] = np.arange(len(which))
    seconds = np.zeros(len(pairs), dtype=np.int64)
    np.maximum.at(seconds, which, np.diff(times)[inside])
    start, end, fastest = table[firsts].T
    lon, lat = (np.array([getattr(stop, axis) for stop in stops]) for axis in ("lon", "lat"))
    _, _, meters = _GEOD.inv(lon[start], lat[start], lon[end], lat[end])
    km = meters / 1000.0
    leap = (km > _FREE_KM) & (km > fastest * (seconds + _ROUNDING_S) / 3600.0)
    return _Hops(start, end, km, seconds, leap)


def _joined(table: Ints, count: int) -> Ints:
    """Give one number per row of start, end and speed, in the same order."""
    return np.asarray((table[:, 0] * count + table[:, 1]) * 1000 + table[:, 2])


def _astray(hops: _Hops, stops: Sequence[Stop]) -> frozenset[str]:
    far = hops.leap & (hops.km >= _ASTRAY_KM)
    ends = np.concatenate([hops.start, hops.end])
    others = np.concatenate([hops.end, hops.start])
    count = np.bincount(ends, minlength=len(stops))
    suspect = (count > 0) & (np.bincount(ends, np.tile(far, 2), minlength=len(stops)) == count)
    if not suspect.any():
        return frozenset()
    lon, lat = (np.array([getattr(stop, axis) for stop in stops]) for axis in ("lon", "lat"))
    middle = [np.full(len(stops), np.median(axis)) for axis in (lon, lat)]
    _, _, away = _GEOD.inv(lon, lat, middle[0], middle[1])
    # Of two suspects side by side the further one is at fault; the order of ids breaks ties.
    ranks = np.argsort(np.lexsort((np.arange(len(stops)), away)))
    beaten = suspect[ends] & suspect[others] & (ranks[ends] < ranks[others])
    suspect[ends[beaten]] = False
    return frozenset(stops[n].id for n in np.flatnonzero(suspect).tolist())
