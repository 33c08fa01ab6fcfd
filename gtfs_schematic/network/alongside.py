"""Put stations of one line onto the course of another that runs along the same way."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.geometry import Point, distance
from gtfs_schematic.network.links import Pair
from gtfs_schematic.network.model import NetworkSettings
from gtfs_schematic.network.patterns import Ids
from gtfs_schematic.network.tracks import Course, Track, samples

_TOGETHER = 5.0
"""Two courses run along each other if they stay within `alongside_m` for this many times as far:
at a crossing of 30° or more they part sooner (2 / sin 30° = 4)."""
_END_M = 20.0
"""A station this near the end of a step stands beside its stop, not between two stops."""
_STRETCH = 1.1
"""Stations put in may not make a step longer than by this factor: no zigzags."""


@dataclass(frozen=True)
class _Run:
    """One pattern with what the comparison needs, computed once."""

    track: Track
    way: str

    @cached_property
    def line(self) -> shapely.LineString:
        line = shapely.linestrings(self.track.whole)
        shapely.prepare(line)
        return line

    @cached_property
    def points(self) -> Course:
        return samples(self.track.whole)

    @cached_property
    def dots(self) -> NDArray[np.object_]:
        return np.asarray(shapely.points(self.points))

    @cached_property
    def called(self) -> frozenset[str]:
        return frozenset(self.track.calling.stations)

    @cached_property
    def steps(self) -> tuple[tuple[Pair, Course], ...]:
        steps = itertools.pairwise(self.track.calling.stations)
        return tuple(zip(steps, self.track.sections, strict=True))


def passed_alongside(
    tracks: Sequence[Track],
    way_of: Mapping[str, str],
    at: Mapping[str, Point],
    done: Mapping[Pair, Ids],
    settings: NetworkSettings,
) -> dict[Pair, Ids]:
    """Find the stations that stand beside a step of another line which runs along it.

    A station goes in if (1) it lies within `alongside_m` of the step's course, between its ends;
    (2) the step's pattern does not call there, nor any pattern right before or after the step;
    (3) a pattern on the same kind of way calls there and stays within `alongside_m` of the first
    for a long stretch about the station; (4) off the street, where tracks side by side are often
    separate: both patterns also call at a common station before and after it, and stay together
    between the two.

    Parameters
    ----------
    tracks
        All kept patterns.
    way_of
        Per line id the kind of way that it runs on.
    at
        Places of the stations, local metres.
    done
        Pairs that already run over other stations.
    settings
        For `alongside_m`.

    Returns
    -------
    dict
        Per pair the whole way from the lesser id to the greater.
    """
    runs = [_Run(track, way_of[track.calling.line_id]) for track in _undirected(tracks)]
    callers: dict[str, list[_Run]] = defaultdict(list)
    for run in runs:
        for station in sorted(run.called):
            callers[station].append(run)
    ids = sorted(callers)
    tree = shapely.STRtree([shapely.points(at[station]) for station in ids])
    judge = _Judge(at, settings.alongside_m)
    beside = _neighbours(tracks)
    found: dict[Pair, set[str]] = defaultdict(set)
    courses: dict[Pair, Course] = {}
    for run in runs:
        for step, section in run.steps:
            pair = (min(step), max(step))
            if pair in done:
                continue
            line = shapely.linestrings(section)
            near = tree.query(line, predicate="dwithin", distance=settings.alongside_m)
            for station in sorted({ids[i] for i in near} - run.called - beside[pair]):
                if judge.is_between(station, line) and any(
                    judge.runs_along(run, other, step, station) for other in callers[station]
                ):
                    found[pair].add(station)
                    courses.setdefault(pair, section if step == pair else section[::-1])
    ways = {pair: _in_order(pair, found[pair], courses[pair], at) for pair in sorted(found)}
    return {pair: way for pair, way in ways.items() if len(way) > 2}


@dataclass(frozen=True)
class _Judge:
    """Decides whether two patterns run along each other at a station."""

    at: Mapping[str, Point]
    radius: float
    _inside: dict[tuple[int, int], NDArray[np.bool_]] = field(default_factory=dict)

    def is_between(self, station: str, line: shapely.LineString) -> bool:
        """Rule 1: whether the station stands beside the step, not beside its ends."""
        place = float(shapely.line_locate_point(line, shapely.points(self.at[station])))
        return bool(_END_M < place < line.length - _END_M)

    def runs_along(self, run: _Run, other: _Run, step: Pair, station: str) -> bool:
        """Rules 3 and 4: whether `other`, which calls at the station, runs along the step."""
        common = () if run.way == "street" else _common_around(run, other, step)
        if other.way != run.way or common is None:
            return False
        points, inside = other.points, self._near(run, other)
        middle = _nearest(points, self.at[station])
        if not inside[middle]:
            return False
        outside = np.flatnonzero(~inside)
        first = int(outside[outside < middle].max(initial=-1)) + 1
        last = int(outside[outside > middle].min(initial=len(points))) - 1
        together = float(np.hypot(*np.diff(points[first : last + 1], axis=0).T).sum())
        return together >= _TOGETHER * self.radius and all(
            first <= _nearest(points, self.at[s]) <= last for s in common
        )

    def _near(self, run: _Run, other: _Run) -> NDArray[np.bool_]:
        """Which points of `other` lie near `run`."""
        key = (id(run), id(other))
        if key not in self._inside:
            self._inside[key] = shapely.dwithin(run.line, other.dots, self.radius)
        return self._inside[key]


def _common_around(run: _Run, other: _Run, step: Pair) -> tuple[str, str] | None:
    """Rule 4: the nearest station on either side of the step at which both call, if there are."""
    ids = run.track.calling.stations
    i = next(k for k, pair in enumerate(itertools.pairwise(ids)) if pair == step)
    before = next((s for s in ids[i::-1] if s in other.called), None)
    after = next((s for s in ids[i + 1 :] if s in other.called), None)
    return None if before is None or after is None else (before, after)


def _undirected(tracks: Sequence[Track]) -> list[Track]:
    """Keep one direction of every pattern that is run both ways over the same stations."""
    kept: dict[tuple[str, Ids], Track] = {}
    for track in tracks:
        stations = track.calling.stations
        kept.setdefault((track.calling.line_id, min(stations, stations[::-1])), track)
    return list(kept.values())


def _neighbours(tracks: Sequence[Track]) -> dict[Pair, set[str]]:
    """Per step the stations that some pattern calls at right before or after it."""
    beside: dict[Pair, set[str]] = defaultdict(set)
    for track in tracks:
        ids = track.calling.stations
        for i, (a, b) in enumerate(itertools.pairwise(ids)):
            beside[min(a, b), max(a, b)].update(ids[max(0, i - 1) : i], ids[i + 2 : i + 3])
    return beside


def _nearest(points: Course, place: Point) -> int:
    return int(np.argmin(np.hypot(points[:, 0] - place[0], points[:, 1] - place[1])))


def _in_order(pair: Pair, stations: set[str], course: Course, at: Mapping[str, Point]) -> Ids:
    """Sort the stations along the step; drop the farthest aside until none makes a zigzag."""
    line = shapely.linestrings(course)
    dots = {station: shapely.points(at[station]) for station in sorted(stations)}
    place = {s: float(shapely.line_locate_point(line, dot)) for s, dot in dots.items()}
    aside = {s: float(shapely.distance(line, dot)) for s, dot in dots.items()}
    inner = sorted(stations, key=lambda s: (place[s], s))
    limit = _STRETCH * max(line.length, distance(at[pair[0]], at[pair[1]]))
    while inner:
        way = (pair[0], *inner, pair[1])
        if sum(distance(at[p], at[q]) for p, q in itertools.pairwise(way)) <= limit:
            return way
        inner.remove(max(inner, key=lambda s: (aside[s], s)))
    return pair
