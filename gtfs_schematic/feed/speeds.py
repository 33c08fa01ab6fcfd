"""Finding stops that lie too far from their neighbours for the time between them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import chain
from typing import Any

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view
from numpy.typing import NDArray
from pyproj import Geod

from gtfs_schematic.feed.findings import Notebook
from gtfs_schematic.feed.model import Pattern, Route, Stop

_FASTEST_KMH = {"rail": 500.0, "other": 500.0}
_FASTEST_ELSE_KMH = 150.0
_FREE_KM = 3.0
_ROUNDING_S = 60
"""Trains reach 500 km/h at most; no street, cable or water vehicle reaches 150 (no source). Times
are often rounded to minutes, so hops under 3 km are never found."""
_ASTRAY_KM = 100.0
_LEAST_ASTRAY_KM = 20.0
_SPREADS = 5.0
_WILD = 3
"""What lies this far off has wrong coordinates; closer by, the times may be wrong (no source). In a
small network less is enough: some multiple of its spread, the median distance from its median stop
(as the median absolute deviation tells outliers: Hampel 1974, "The influence curve and its role in
robust estimation"; the multiple is our own choice, as networks have long branches)."""
_GEOD = Geod(ellps="WGS84")

Array = NDArray[Any]


@dataclass(frozen=True)
class _Calls:
    """The calls of all patterns in a row: numbers of stops, seconds, numbers of patterns."""

    stop: Array
    time: Array
    pattern: Array
    kmh: Array
    """Per pattern the fastest that its mode can be."""
    lon: Array
    lat: Array
    """Per stop, degrees."""

    def too_fast(self, used: Array) -> Array:
        """Tell which patterns as a whole are impossibly fast, if only some calls count."""
        stop, pattern = self.stop[used], self.pattern[used]
        time, count = self.time[used], len(self.kmh)
        inside = pattern[1:] == pattern[:-1]
        start, end = stop[:-1][inside], stop[1:][inside]
        _, _, meters = _GEOD.inv(self.lon[start], self.lat[start], self.lon[end], self.lat[end])
        km = np.bincount(pattern[1:][inside], np.asarray(meters) / 1000.0, count)
        seconds = np.bincount(pattern[1:][inside], np.diff(time)[inside], count)
        return _is_too_fast(km, seconds, self.kmh)


@dataclass(frozen=True)
class _Hops:
    """Pairs of stops that some pattern calls at one after the other, each once."""

    start: Array
    end: Array
    """Numbers of stops, the lesser one in `start`."""
    km: Array
    """Geodesic on the WGS 84 ellipsoid."""
    seconds: Array
    """The longest time that a trip takes."""
    leap: Array
    """Whether that is impossibly fast."""
    wild: Array
    """Whether it is three times as fast as that."""

    def per_stop(self, values: Array, count: int) -> Array:
        """Sum a value of every hop at both its stops."""
        return np.bincount(np.concatenate([self.start, self.end]), np.tile(values, 2), count)


def find_leaps(
    notebook: Notebook,
    patterns: Sequence[Pattern],
    stops: Sequence[Stop],
    routes: Mapping[str, Route],
    rows: Mapping[str, int],
) -> frozenset[str]:
    """Find hops that are impossibly fast, and give the stops that lie astray.

    1. Suspect is a stop all of whose hops are leaps, as long as five times the network's spread or
       longer (but 20 km in the least spread, 100 km in the widest).
    2. Of two suspects side by side the one further from the median stop is at fault.
    3. It lies astray if some pattern that calls there is possible without all suspects: else the
       times may be wrong. If a hop is shorter than 100 km, all patterns that call there must also
       be impossible as a whole, or all its hops three times too fast and some pattern run through
       it: else times in between may be spread badly on the way to a far terminus.

    Other leaps are only found.

    Parameters
    ----------
    rows
        Per stop its row in stops.txt.
    """
    calls = _calls(patterns, stops, routes)
    hops = _hops(calls)
    if not hops.leap.any():
        return frozenset()
    away = _away(calls)
    astray = _astray(calls, hops, away)
    leaps = hops.per_stop(hops.leap, len(stops))
    others = hops.per_stop(~hops.leap, len(stops))
    for n in np.flatnonzero(hops.leap).tolist():
        pair = (int(hops.start[n]), int(hops.end[n]))
        if astray.isdisjoint(pair):
            # Most likely at fault is the one with most leaps, fewest other hops, or further off.
            worse = max(pair, key=lambda number: (leaps[number], -others[number], away[number]))
            start, end = (stops[number].id for number in pair)
            notebook.find(
                "warning",
                "stops.txt",
                "two stops in a row lie too far apart for the time between them; "
                "check their coordinates and times",
                row=rows[stops[worse].id],
                value=f"{start}, {end}: {hops.km[n]:.0f} km in {hops.seconds[n]} s",
            )
    for number in sorted(astray):
        stop = stops[number]
        nearest = hops.km[(hops.start == number) | (hops.end == number)].min()
        told = f"lies {nearest:.0f} km from the stops before and after it"
        fault = "stop lies too far from those before and after it to be right; it is left out"
        notebook.find("error", "stops.txt", fault, row=rows[stop.id], value=stop.id)
        notebook.leave_out("stop", stop.id, f"{stop.name or stop.id} {told}")
    return frozenset(stops[number].id for number in astray)


def _calls(
    patterns: Sequence[Pattern], stops: Sequence[Stop], routes: Mapping[str, Route]
) -> _Calls:
    numbers = {stop.id: n for n, stop in enumerate(stops)}
    kmh = [_FASTEST_KMH.get(routes[p.route_id].mode, _FASTEST_ELSE_KMH) for p in patterns]
    lon, lat = (np.array([getattr(stop, axis) for stop in stops]) for axis in ("lon", "lat"))
    return _Calls(
        np.array([numbers[ident] for p in patterns for ident in p.stop_ids], dtype=np.int64),
        np.fromiter(chain.from_iterable(p.offsets_s for p in patterns), dtype=np.int64),
        np.repeat(np.arange(len(patterns)), [len(p.stop_ids) for p in patterns]),
        np.array(kmh),
        lon,
        lat,
    )


def _hops(calls: _Calls) -> _Hops:
    inside = calls.pattern[1:] == calls.pattern[:-1]
    low, high = (
        np.minimum(calls.stop[1:], calls.stop[:-1]),
        np.maximum(calls.stop[1:], calls.stop[:-1]),
    )
    speed = calls.kmh[calls.pattern[1:]].astype(np.int64)
    table = np.column_stack([low, high, speed])[inside]
    # One number per row of start, end and speed, in the same order.
    keys = (table[:, 0] * len(calls.lon) + table[:, 1]) * 1000 + table[:, 2]
    pairs, which = np.unique(keys, return_inverse=True)
    firsts = np.zeros(len(pairs), dtype=np.int64)
    firsts[which] = np.arange(len(which))
    seconds = np.zeros(len(pairs), dtype=np.int64)
    np.maximum.at(seconds, which, np.diff(calls.time)[inside])
    start, end, fastest = table[firsts].T
    _, _, meters = _GEOD.inv(calls.lon[start], calls.lat[start], calls.lon[end], calls.lat[end])
    km = np.asarray(meters) / 1000.0
    leap, wild = (_is_too_fast(km, seconds, times * fastest) for times in (1, _WILD))
    return _Hops(start, end, km, seconds, (km > _FREE_KM) & leap, wild)


def _is_too_fast(km: Array, seconds: Array, kmh: Array) -> Array:
    return np.asarray(km > kmh * (seconds + _ROUNDING_S) / 3600.0)


def _away(calls: _Calls) -> Array:
    """Give the distance of every stop from the median stop, km."""
    lon, lat = (np.full(len(calls.lon), np.median(axis)) for axis in (calls.lon, calls.lat))
    _, _, meters = _GEOD.inv(calls.lon, calls.lat, lon, lat)
    return np.asarray(meters) / 1000.0


def _astray(calls: _Calls, hops: _Hops, away: Array) -> frozenset[int]:
    """Give the numbers of the stops that lie astray; the rules are those of `find_leaps`."""
    count = len(away)
    limit = np.clip(_SPREADS * np.median(away), _LEAST_ASTRAY_KM, _ASTRAY_KM)
    every = hops.per_stop(np.ones(len(hops.km)), count)
    suspect = (every > 0) & (hops.per_stop(hops.leap & (hops.km >= limit), count) == every)
    if not suspect.any():
        return frozenset()
    ends = np.concatenate([hops.start, hops.end])
    others = np.concatenate([hops.end, hops.start])
    # The order of ids breaks ties.
    ranks = np.argsort(np.lexsort((np.arange(count), away)))
    beaten = suspect[ends] & suspect[others] & (ranks[ends] < ranks[others])
    suspect[ends[beaten]] = False

    whole = calls.too_fast(np.ones(len(calls.stop), dtype=np.bool_))
    rest = calls.too_fast(~suspect[calls.stop])
    possible, impossible = np.zeros(count, np.bool_), np.ones(count, np.bool_)
    np.logical_or.at(possible, calls.stop, ~rest[calls.pattern])
    np.logical_and.at(impossible, calls.stop, whole[calls.pattern])
    far, wild = (hops.per_stop(~hop, count) == 0 for hop in (hops.km >= _ASTRAY_KM, hops.wild))
    inner = np.zeros(count, np.bool_)
    inner[calls.stop[1:-1][np.ptp(sliding_window_view(calls.pattern, 3), axis=1) == 0]] = True
    sure = far | impossible | (wild & inner)
    return frozenset(np.flatnonzero(suspect & possible & sure).tolist())
