"""Gather what journeys need of a timetable: calls of lines at stations, and times of changes."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass, field
from statistics import median_low

import networkx as nx
import numpy as np

from gtfs_schematic.drift.ground import local_metres
from gtfs_schematic.drift.placed import TimedPattern
from gtfs_schematic.feed.model import Pattern, Timetable
from gtfs_schematic.network.between import from_station_to_station
from gtfs_schematic.network.model import Network

_ON_FOOT = frozenset([0, 1, 2])
"""Transfer types of GTFS that a rider walks."""
_DETOUR = 1.5
"""A step between two calls belongs to the drawn line if its links lead so directly."""

Ids = tuple[str, ...]
Times = tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Timing:
    """The timetable of a network's service date, by stations and lines."""

    patterns: tuple[TimedPattern, ...] = ()
    change_s: Mapping[str, int] = field(default_factory=dict)
    """Per station id the time that the feed gives for a change within it, seconds."""


def timing_of(timetable: Timetable, network: Network) -> Timing:
    """Write a timetable's patterns as stations, lines and times.

    Parameters
    ----------
    timetable
        What the feed says of the service date.
    network
        Its network; stops that are not drawn are skipped, and so are patterns that leave the
        drawn links of their line, for a rider does not see them.

    Returns
    -------
    Timing
        Patterns that call at the same stations are one: times are medians over all trips,
        departures are united. Sorted by line and stations.
    """
    station_of = {stop: s.id for s in network.stations for stop in s.stop_ids}
    line_of = {route: line.id for line in network.lines for route in line.route_ids}
    drawn = _Drawn(network)
    found: dict[tuple[str, Ids], list[tuple[Times, Pattern]]] = defaultdict(list)
    for pattern in timetable.patterns:
        line = line_of.get(pattern.route_id)
        stations, times = _calls(pattern, station_of)
        steps = itertools.pairwise(stations)
        if line and len(stations) > 1 and all(drawn.runs(line, a, b) for a, b in steps):
            found[line, stations].append((times, pattern))
    patterns = [
        TimedPattern(
            line,
            stations,
            _median_times(group),
            tuple(sorted(d for _, pattern in group for d in pattern.departures_s)),
        )
        for (line, stations), group in sorted(found.items())
    ]
    return Timing(tuple(patterns), _changes(timetable, station_of))


class _Drawn:
    """Which steps of which lines the diagram shows."""

    def __init__(self, network: Network) -> None:
        places = local_metres([(s.lon, s.lat) for s in network.stations])
        self._at = {s.id: complex(p) for s, p in zip(network.stations, places, strict=True)}
        self._tracks: dict[str, nx.Graph] = {line.id: nx.Graph() for line in network.lines}
        self._known: dict[tuple[str, str, str], bool] = {}
        for link in from_station_to_station(network):
            length = abs(self._at[link.start] - self._at[link.end])
            for line in link.lines:
                self._tracks[line].add_edge(link.start, link.end, length=length)

    def runs(self, line: str, a: str, b: str) -> bool:
        """Tell whether the line's links lead from `a` to `b` without a great detour."""
        key = (line, min(a, b), max(a, b))
        if key not in self._known:
            self._known[key] = self._leads(self._tracks[line], a, b)
        return self._known[key]

    def _leads(self, track: nx.Graph, a: str, b: str) -> bool:
        if track.has_edge(a, b):
            return True
        if a not in track or b not in track:
            return False
        try:
            way = nx.dijkstra_path_length(track, a, b, weight="length")
        except nx.NetworkXNoPath:
            return False
        return bool(way <= _DETOUR * abs(self._at[a] - self._at[b]))


def _calls(pattern: Pattern, station_of: Mapping[str, str]) -> tuple[Ids, Times]:
    """Give the stations of a pattern, without immediate repeats, and when it comes to each."""
    stations: list[str] = []
    times: list[int] = []
    for stop, time in zip(pattern.stop_ids, pattern.offsets_s, strict=True):
        station = station_of.get(stop)
        if station is not None and station != (stations[-1] if stations else None):
            stations.append(station)
            times.append(time)
    return tuple(stations), tuple(times)


def _median_times(group: list[tuple[Times, Pattern]]) -> Times:
    """Give the median time at each call, over trips; never running backwards."""
    trips = np.array([len(pattern.departures_s) for _, pattern in group])
    times = np.repeat(np.array([times for times, _ in group]), trips, axis=0)
    medians = np.maximum.accumulate(np.sort(times, axis=0)[(len(times) - 1) // 2])
    return tuple(int(t) for t in medians)


def _changes(timetable: Timetable, station_of: Mapping[str, str]) -> dict[str, int]:
    """Give the median of the change times that the feed gives between stops of one station."""
    given: dict[str, list[int]] = defaultdict(list)
    for transfer in timetable.transfers:
        if transfer.transfer_type not in _ON_FOOT or transfer.min_time_s is None:
            continue
        station = station_of.get(transfer.from_stop_id)
        if station is not None and station == station_of.get(transfer.to_stop_id):
            given[station].append(transfer.min_time_s)
    return {station: median_low(sorted(given[station])) for station in sorted(given)}
