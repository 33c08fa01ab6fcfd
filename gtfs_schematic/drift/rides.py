"""Direct rides between stations: how long each takes, how long one waits, how long it is drawn."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import networkx as nx
import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.drift.model import DriftSettings
from gtfs_schematic.drift.placed import CourseLink, Diagram, PlacedWalk, TimedPattern
from gtfs_schematic.geometry import polyline_length

Ids = tuple[str, ...]
Integers = NDArray[np.int64]

_Key = tuple[str, int, int, int]
"""Line, first and last station, drawn length."""
_Member = tuple[int, int, int]
"""Which run makes a ride, and between which of its calls."""

UNITS_PER_LINK = 1000
"""Drawn lengths are counted in thousandths of a typical link, so that equal ones are equal."""


@dataclass(frozen=True, slots=True)
class Rides:
    """All direct rides of a timetable, index by index."""

    start: Integers
    """Index of the station where one boards."""
    end: Integers
    time_s: Integers
    """Median time in the vehicle."""
    wait_s: Integers
    """Half the median headway, or the longest wait."""
    drawn: Integers
    """Length of the drawn course, thousandths of a typical link."""
    line: tuple[str, ...]
    stations: tuple[Ids, ...]
    """Every station on the drawn course, passed ones included."""


def typical_length(links: Sequence[CourseLink]) -> float:
    """Give the median drawn length of a link's course, millimetres; 0 without links."""
    if not links:
        return 0.0
    return float(np.median([course_length(link) for link in links]))


def course_length(link: CourseLink | PlacedWalk) -> float:
    """Give the length of a drawn course, bends and all, millimetres."""
    return polyline_length(tuple(link.path_mm))


def rides_of(diagram: Diagram, settings: DriftSettings) -> Rides:
    """Give every ride without a change that the timetable offers.

    Notes
    -----
    1. Only trips that start by day count, if there are any: by night other lines run.
    2. A ride is a line, a boarding and an alighting station and a drawn course. Trips that agree
       in these are one ride, whether or not they call between. A ride that too small a share
       of the line's trips makes is none: the diagram does not speak of it.
    3. The time is the median over its trips, the wait half of the median gap between departures:
       riders come at any time (common practice for frequent services, e.g. Osuna and Newell
       1972, Transportation Science 6:52-65, of which this is the case of even headways).
    """
    index = {station.id: i for i, station in enumerate(diagram.stations)}
    courses = _Courses(diagram)
    runs = [run for p in by_day(diagram.patterns, settings) for run in courses.runs(p)]
    groups: dict[_Key, list[_Member]] = defaultdict(list)
    for number, run in enumerate(runs):
        stops = [index[key] for key in run.pattern.stations]
        for i in range(len(stops) - 1):
            for j in range(i + 1, len(stops)):
                if stops[i] != stops[j]:
                    key = (run.pattern.line, stops[i], stops[j], run.drawn[j] - run.drawn[i])
                    groups[key].append((number, i, j))
    waits = _Waits(runs, settings.longest_wait_s)
    trips = _trips(runs, groups)
    least = {line: settings.rare_share * n for line, n in _trips_of_lines(runs).items()}
    keys = sorted(key for key in groups if trips[key] >= least[key[0]])
    members = [groups[key] for key in keys]
    return Rides(
        start=np.array([key[1] for key in keys], dtype=np.int64),
        end=np.array([key[2] for key in keys], dtype=np.int64),
        time_s=np.array([_time(runs, group) for group in members], dtype=np.int64),
        wait_s=np.array([waits.of(group) for group in members], dtype=np.int64),
        drawn=np.array([key[3] for key in keys], dtype=np.int64),
        line=tuple(key[0] for key in keys),
        stations=tuple(runs[n].course(i, j) for (n, i, j), *_ in members),
    )


def by_day(patterns: Sequence[TimedPattern], settings: DriftSettings) -> tuple[TimedPattern, ...]:
    """Keep the trips that start by day, or all if there are none."""
    first, last = 3600.0 * settings.day_from_h, 3600.0 * settings.day_to_h
    kept = [
        replace(p, departures_s=tuple(d for d in p.departures_s if first <= d < last))
        for p in patterns
    ]
    return tuple(p for p in kept if p.departures_s) or tuple(patterns)


@dataclass(frozen=True, slots=True)
class _Run:
    """A pattern, or a part of one, whose every step is drawn."""

    pattern: TimedPattern
    drawn: tuple[int, ...]
    """Drawn length from the first station to each, thousandths of a typical link."""
    steps: tuple[Ids, ...]
    """Per step its stations, both calls included."""

    def course(self, i: int, j: int) -> Ids:
        """Give all stations on the way from call `i` to call `j`."""
        between = itertools.chain.from_iterable(step[1:] for step in self.steps[i:j])
        return (self.pattern.stations[i], *between)


class _Courses:
    """Where each line runs on the diagram between two of its calls."""

    def __init__(self, diagram: Diagram) -> None:
        self._unit = (typical_length(diagram.links) or 1.0) / UNITS_PER_LINK
        self._tracks: dict[str, nx.Graph] = defaultdict(nx.Graph)
        self._steps: dict[tuple[str, str, str], tuple[Ids, int] | None] = {}
        for link in diagram.links:
            units = max(round(course_length(link) / self._unit), 1)
            for line in link.lines:
                self._tracks[line].add_edge(link.start, link.end, units=units)

    def runs(self, pattern: TimedPattern) -> list[_Run]:
        """Cut a pattern wherever its line is not drawn from one call to the next."""
        steps = [self._step(pattern.line, a, b) for a, b in itertools.pairwise(pattern.stations)]
        runs = []
        first = 0
        for last in range(len(steps) + 1):
            if last == len(steps) or steps[last] is None:
                if last > first:
                    part = [step for step in steps[first:last] if step is not None]
                    runs.append(self._run(pattern, first, part))
                first = last + 1
        return runs

    @staticmethod
    def _run(pattern: TimedPattern, first: int, steps: Sequence[tuple[Ids, int]]) -> _Run:
        whole = slice(first, first + len(steps) + 1)
        start = pattern.times_s[first]
        part = TimedPattern(
            pattern.line,
            pattern.stations[whole],
            tuple(time - start for time in pattern.times_s[whole]),
            tuple(departure + start for departure in pattern.departures_s),
        )
        drawn = itertools.accumulate((units for _, units in steps), initial=0)
        return _Run(part, tuple(drawn), tuple(way for way, _ in steps))

    def _step(self, line: str, a: str, b: str) -> tuple[Ids, int] | None:
        key = (line, a, b)
        if key not in self._steps:
            self._steps[key] = self._way(self._tracks[line], a, b)
        return self._steps[key]

    @staticmethod
    def _way(track: nx.Graph, a: str, b: str) -> tuple[Ids, int] | None:
        if a not in track or b not in track:
            return None
        if track.has_edge(a, b):
            return (a, b), int(track[a][b]["units"])
        try:
            units, way = nx.single_source_dijkstra(track, a, b, weight="units")
        except nx.NetworkXNoPath:
            return None
        return tuple(way), int(units)


class _Waits:
    """Waits at boarding, reckoned once for all rides that are served by the same trips."""

    def __init__(self, runs: Sequence[_Run], longest_s: int) -> None:
        self._runs = runs
        self._longest = longest_s
        self._known: dict[tuple[tuple[int, int], ...], int] = {}

    def of(self, group: Sequence[_Member]) -> int:
        """Give half of the median gap between departures, rounded down, seconds."""
        boardings = tuple(sorted({(number, i) for number, i, _ in group}))
        if boardings not in self._known:
            self._known[boardings] = self._wait(boardings)
        return self._known[boardings]

    def _wait(self, boardings: Sequence[tuple[int, int]]) -> int:
        times: list[int] = []
        for number, i in boardings:
            pattern = self._runs[number].pattern
            times.extend(time + pattern.times_s[i] for time in pattern.departures_s)
        if len(times) < 2:
            return self._longest
        return min(int(np.median(np.diff(np.sort(times)))) // 2, self._longest)


def _trips(runs: Sequence[_Run], groups: Mapping[_Key, Sequence[_Member]]) -> dict[_Key, int]:
    """Count the trips that make each ride."""
    trips = [len(run.pattern.departures_s) for run in runs]
    return {key: sum(trips[n] for n in {n for n, _, _ in group}) for key, group in groups.items()}


def _trips_of_lines(runs: Sequence[_Run]) -> dict[str, int]:
    trips: dict[str, int] = defaultdict(int)
    for run in runs:
        trips[run.pattern.line] += len(run.pattern.departures_s)
    return trips


def _time(runs: Sequence[_Run], group: Sequence[_Member]) -> int:
    """Give the (lower) median time in the vehicle over all trips of a ride, seconds."""
    weighed = sorted(
        (runs[n].pattern.times_s[j] - runs[n].pattern.times_s[i], len(runs[n].pattern.departures_s))
        for n, i, j in group
    )
    half = sum(trips for _, trips in weighed) / 2.0
    passed = itertools.accumulate(trips for _, trips in weighed)
    return next(time for (time, _), trips in zip(weighed, passed, strict=True) if trips >= half)


def departures_of(patterns: Sequence[TimedPattern]) -> Mapping[str, int]:
    """Count the departures of the service date at each station; a trip's end is none."""
    counts: dict[str, int] = defaultdict(int)
    for pattern in patterns:
        for station in pattern.stations[:-1]:
            counts[station] += len(pattern.departures_s)
    return counts
