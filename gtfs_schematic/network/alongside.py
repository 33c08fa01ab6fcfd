"""Put stations of one line onto the course of another that runs along the same way."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field

import shapely

from gtfs_schematic.geometry import Point, distance
from gtfs_schematic.network.links import Pair
from gtfs_schematic.network.model import NetworkSettings
from gtfs_schematic.network.patterns import Ids
from gtfs_schematic.network.runs import Alongside, Run
from gtfs_schematic.network.tracks import Course, Track, length_of

_KERB = 2.0
"""A station lies within this many `alongside_m` of every course that passes it: its place may be
off the course of those who call there by as much as that is off the other course."""
_END_M = 20.0
"""A station this near the end of a step stands beside its stop, not between two stops."""
_STRETCH = 1.1
"""Stations put in may not make a step longer than by this factor: no zigzags."""
_ASTRAY = 2.0
"""A pattern that goes so many times further than most others does not say where they run."""
_ROUNDS = 3
"""Who passes a station shows it to others that run along there: so many times at most."""


def passed_alongside(
    tracks: Sequence[Track],
    courses: Mapping[Pair, Course],
    way_of: Mapping[str, str],
    at: Mapping[str, Point],
    done: Mapping[Pair, Ids],
    settings: NetworkSettings,
) -> dict[Pair, Ids]:
    """Find the stations that stand beside a step of another line which runs along it.

    A station goes in if

    1. it lies beside the step's course, between its ends; where patterns take different streets
       from one station to the next, the street with most stations stands for all;
    2. no pattern calls there right before, in or right after the step, except in the very same
       street, where buses turn back at the end of a spur;
    3. a pattern on the same kind of way calls there, or passes by these rules, and runs along
       the first about the station (`Alongside`): within `alongside_m`, turned by no more than
       `alongside_deg`, either way round, for at least `alongside_min_m`;
    4. off the street, where tracks side by side are often separate: both patterns also call at a
       common station before and after it, and stay together between the two.

    Parameters
    ----------
    tracks
        All kept patterns.
    courses
        Per step the course that stands for all, from the lesser id to the greater.
    way_of
        Per line id the kind of way that it runs on.
    at
        Places of the stations, local metres.
    done
        Pairs that already run over other stations.
    settings
        For the tolerances.

    Returns
    -------
    dict
        Per pair the whole way from the lesser id to the greater.
    """
    runs = [Run.of(track, way_of[track.calling.line_id]) for track in _undirected(tracks)]
    judge = _Judge(at, Alongside.by(settings))
    steps = _open_steps(runs, courses, _neighbours(tracks), at, settings)
    steps = [step for step in steps if step.pair not in done]
    shown = [(station, run) for run in runs for station in sorted(run.called)]
    by_pair: dict[Pair, list[_Step]] = defaultdict(list)
    for step in steps:
        by_pair[step.pair].append(step)
    over = dict(done)
    for _ in range(_ROUNDS):
        fresh = _find(steps, shown, judge)
        before = dict(over)
        # The shortest first: of two steps that each could run over the other, it comes first.
        for pair in sorted(fresh, key=lambda p: (length_of(courses[p]), p)):
            over.pop(pair, None)
            way = _way_of(by_pair[pair], at, over, settings)
            if len(way) > 2:
                over[pair] = way
        shown = [
            (station, step.run)
            for step in steps
            if step.pair in fresh
            for station in over.get(step.pair, ())[1:-1]
            if station not in before.get(step.pair, ())
        ]
        if not shown:
            break
    return {pair: way for pair, way in sorted(over.items()) if pair not in done}


def _find(steps: Sequence[_Step], shown: Iterable[tuple[str, Run]], judge: _Judge) -> set[Pair]:
    """Add to every step what rules 3 and 4 find, and give the pairs for which something was."""
    there: dict[str, list[Run]] = defaultdict(list)
    for station, run in shown:
        there[station].append(run)
    fresh: set[Pair] = set()
    for step in steps:
        for station in step.beside:
            if station not in step.found and any(
                judge.runs_along(step, other, station) for other in there[station]
            ):
                step.found.add(station)
                fresh.add(step.pair)
    return fresh


def _way_of(
    steps: Sequence[_Step],
    at: Mapping[str, Point],
    over: Mapping[Pair, Ids],
    settings: NetworkSettings,
) -> Ids:
    """Give a pair the way with most stations, and with all that was found in its street."""
    best = max(steps, key=lambda step: len(step.found))
    found = set(best.found)
    for step in steps:
        if not step.found <= found:
            middle = shapely.line_interpolate_point(step.line, 0.5, normalized=True)
            if shapely.dwithin(best.line, middle, settings.alongside_m):
                found |= step.found
    return _in_order(best, found, at, over)


@dataclass(frozen=True)
class _Step:
    """A step that other lines' stations may stand beside."""

    run: Run
    index: int
    pair: Pair
    """Its stations, the lesser id first."""
    line: shapely.LineString
    """Its course, from the lesser id to the greater."""
    beside: tuple[str, ...]
    """Stations that rules 1 and 2 allow."""
    found: set[str] = field(default_factory=set)
    """Those of them that rules 3 and 4 found so far."""


def _open_steps(
    runs: Sequence[Run],
    courses: Mapping[Pair, Course],
    neighbours: Mapping[Pair, set[str]],
    at: Mapping[str, Point],
    settings: NetworkSettings,
) -> list[_Step]:
    """Gather steps and what stands beside them, by rules 1 and 2."""
    ids = sorted({station for run in runs for station in run.called})
    tree = shapely.STRtree([shapely.points(at[station]) for station in ids])
    reach = _KERB * settings.alongside_m
    steps = []
    for run in runs:
        for index, (step, section) in enumerate(run.steps):
            pair = (min(step), max(step))
            line = shapely.linestrings(section if step == pair else section[::-1])
            if line.length > _ASTRAY * length_of(courses[pair]):
                continue
            near = {ids[i] for i in tree.query(line, predicate="dwithin", distance=reach)}
            barred = neighbours[pair]
            if run.way == "street":
                same = 0.5 * settings.alongside_m
                barred = barred - {
                    ids[i] for i in tree.query(line, predicate="dwithin", distance=same)
                }
            beside = tuple(
                station
                for station in sorted(near - barred - {*pair})
                if _to_ends(at[station], line) > _END_M
            )
            if beside:
                steps.append(_Step(run, index, pair, line, beside))
    return steps


def _to_ends(place: Point, line: shapely.LineString) -> float:
    """Distance along the line from the point nearest to a place to the nearer end, metres."""
    along = float(shapely.line_locate_point(line, shapely.points(place)))
    return min(along, float(line.length) - along)


@dataclass(frozen=True)
class _Judge:
    """Decides whether two patterns run along each other at a station."""

    at: Mapping[str, Point]
    alongside: Alongside

    def runs_along(self, step: _Step, other: Run, station: str) -> bool:
        """Rules 3 and 4: whether `other`, which calls or passes there, runs along the step."""
        run = step.run
        if other.way != run.way or other is run:
            return False
        common = () if run.way == "street" else _common_around(run, other, step.index)
        return common is not None and self.alongside.together(
            run, step.line, other, self.at[station], [self.at[s] for s in common]
        )


def _common_around(run: Run, other: Run, index: int) -> tuple[str, str] | None:
    """Rule 4: the nearest station on either side of the step at which both call, if there are."""
    ids = run.stations
    before = next((s for s in ids[index::-1] if s in other.called), None)
    after = next((s for s in ids[index + 1 :] if s in other.called), None)
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


def _in_order(
    step: _Step, stations: set[str], at: Mapping[str, Point], over: Mapping[Pair, Ids]
) -> Ids:
    """Put stations in, nearest to the course first, unless they make a zigzag or a circle."""
    pair, line = step.pair, step.line
    dots = {station: shapely.points(at[station]) for station in sorted(stations)}
    place = {s: float(shapely.line_locate_point(line, dot)) for s, dot in dots.items()}
    aside = {s: float(shapely.distance(line, dot)) for s, dot in dots.items()}
    limit = _STRETCH * max(line.length, distance(at[pair[0]], at[pair[1]]))
    way: Ids = pair
    for station in sorted(stations, key=lambda s: (aside[s], s)):
        inner = sorted({*way[1:-1], station}, key=lambda s: (place[s], s))
        longer = (pair[0], *inner, pair[1])
        length = sum(distance(at[p], at[q]) for p, q in itertools.pairwise(longer))
        if length <= limit and not _runs_over(longer, pair, over):
            way = longer
    return way


def _runs_over(way: Ids, pair: Pair, over: Mapping[Pair, Ids]) -> bool:
    """Whether a step of the way runs over the pair, or over one that does."""
    open_steps = [(min(p, q), max(p, q)) for p, q in itertools.pairwise(way)]
    seen: set[Pair] = set()
    while open_steps:
        step = open_steps.pop()
        if step == pair:
            return True
        if step in over and step not in seen:
            seen.add(step)
            open_steps += [(min(p, q), max(p, q)) for p, q in itertools.pairwise(over[step])]
    return False
