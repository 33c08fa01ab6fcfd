"""The two shortest ways between stations: as they look on the diagram, and by the timetable."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_array
from scipy.sparse.csgraph import dijkstra

from gtfs_schematic.drift.ground import local_metres
from gtfs_schematic.drift.model import DriftSettings, Itinerary, Leg
from gtfs_schematic.drift.placed import Diagram
from gtfs_schematic.drift.rides import (
    UNITS_PER_LINK,
    Rides,
    course_length,
    rides_of,
    typical_length,
)

Integers = NDArray[np.int64]
Floats = NDArray[np.float64]

_TIMES = 2**20
"""More seconds than any way takes: 12 days."""
_LENGTHS = 2**27
"""More thousandths of a typical link than any way is drawn long."""

_CHANGE = -1
_WALK = -2


@dataclass(frozen=True)
class _Graph:
    """Weighted steps between nodes, the least for each pair, and which step each one is."""

    matrix: csr_array
    step: dict[tuple[int, int], int]


@dataclass(frozen=True)
class Ways:
    """All steps of journeys: node i is station i before boarding, node n + i after alighting."""

    station_ids: tuple[str, ...]
    typical_mm: float
    rides: Rides
    tail: Integers
    head: Integers
    time_s: Integers
    drawn: Integers
    kind: Integers
    """Index of the ride, or `_CHANGE`, or `_WALK`."""

    @cached_property
    def _by_look(self) -> _Graph:
        return self._graph(self.drawn * _TIMES + self.time_s)

    @cached_property
    def _by_time(self) -> _Graph:
        return self._graph(self.time_s * _LENGTHS + self.drawn)

    def seen_and_least_s(self, origins: Integers) -> tuple[Floats, Floats]:
        """Give times of the ways that look shortest, and least times, from some stations to all.

        Both weights, length and time, are packed into one whole number below 2^53, which a float
        holds exactly: so the shortest way that is fastest among its equals comes out of one
        search (Dijkstra 1959), and its time is the remainder.

        Returns
        -------
        tuple of NDArray
            Two arrays of shape (len(origins), n), seconds; infinite where no way leads.
        """
        n = len(self.station_ids)
        look = dijkstra(self._by_look.matrix, indices=origins)[:, n:]
        least = dijkstra(self._by_time.matrix, indices=origins)[:, n:]
        reached = np.isfinite(look)
        seen = np.full(look.shape, np.inf)
        seen[reached] = np.mod(look[reached], _TIMES)
        return seen, np.floor(least / _LENGTHS)

    def looks_shortest(self, start: int, end: int) -> Itinerary:
        """Spell out the way that looks shortest."""
        return self._itinerary(self._by_look, start, end)

    def fastest(self, start: int, end: int) -> Itinerary:
        """Spell out the fastest way."""
        return self._itinerary(self._by_time, start, end)

    def _graph(self, weight: Integers) -> _Graph:
        order = np.lexsort((self.kind, weight, self.head, self.tail))
        tail, head = self.tail[order], self.head[order]
        first = np.ones(len(order), dtype=bool)
        first[1:] = (tail[1:] != tail[:-1]) | (head[1:] != head[:-1])
        chosen = order[first]
        nodes = 2 * len(self.station_ids)
        ends = (self.tail[chosen], self.head[chosen])
        matrix = csr_array((weight[chosen].astype(np.float64), ends), shape=(nodes, nodes))
        pairs = zip(ends[0].tolist(), ends[1].tolist(), strict=True)
        return _Graph(matrix, dict(zip(pairs, chosen.tolist(), strict=True)))

    def _itinerary(self, graph: _Graph, start: int, end: int) -> Itinerary:
        n = len(self.station_ids)
        before = dijkstra(graph.matrix, indices=start, return_predecessors=True)[1]
        nodes = [n + end]
        while nodes[-1] != start:
            nodes.append(int(before[nodes[-1]]))
        nodes.reverse()
        steps = [graph.step[pair] for pair in itertools.pairwise(nodes)]
        legs = tuple(self._leg(step) for step in steps if self.kind[step] != _CHANGE)
        drawn = int(self.drawn[steps].sum())
        return Itinerary(
            legs, int(self.time_s[steps].sum()), drawn * self.typical_mm / UNITS_PER_LINK
        )

    def _leg(self, step: int) -> Leg:
        ride = int(self.kind[step])
        if ride == _WALK:
            n = len(self.station_ids)
            ends = (int(self.tail[step]) % n, int(self.head[step]) % n)
            stations = tuple(self.station_ids[i] for i in ends)
            return Leg("", stations, 0, int(self.time_s[step]))
        rides = self.rides
        return Leg(
            rides.line[ride], rides.stations[ride], int(rides.wait_s[ride]), int(rides.time_s[ride])
        )


def ways_of(diagram: Diagram, settings: DriftSettings) -> Ways:
    """Gather rides, changes and walks as steps between nodes.

    Parameters
    ----------
    diagram
        With a timetable.
    settings
        Times and looks of changes, speed of walks.
    """
    n = len(diagram.stations)
    rides = rides_of(diagram, settings)
    typical = typical_length(diagram.links)
    look = round(settings.change_links * UNITS_PER_LINK)
    rows = [(*row, _CHANGE) for row in _changes(diagram, settings, look)]
    rows += [(*row, _WALK) for row in _walks(diagram, settings, look)]
    others = np.array(rows, dtype=np.int64).reshape(-1, 5)
    # A step that takes no time at all would be no step in a sparse matrix.
    ride_s = np.maximum(rides.time_s + rides.wait_s, 1)
    return Ways(
        station_ids=tuple(station.id for station in diagram.stations),
        typical_mm=typical,
        rides=rides,
        tail=np.concatenate([rides.start, others[:, 0]]),
        head=np.concatenate([rides.end + n, others[:, 1]]),
        time_s=np.concatenate([ride_s, np.maximum(others[:, 2], 1)]),
        drawn=np.concatenate([rides.drawn, others[:, 3]]),
        kind=np.concatenate([np.arange(len(rides.line)), others[:, 4]]),
    )


Row = tuple[int, int, int, int]
"""Tail, head, seconds, drawn length."""


def _changes(diagram: Diagram, settings: DriftSettings, look: int) -> list[Row]:
    n = len(diagram.stations)
    return [
        (n + i, i, settings.change_s if station.change_s is None else station.change_s, look)
        for i, station in enumerate(diagram.stations)
    ]


def _walks(diagram: Diagram, settings: DriftSettings, look: int) -> list[Row]:
    """Walk before the first ride, after the last, or between two, which is a change as well."""
    n = len(diagram.stations)
    index = {station.id: i for i, station in enumerate(diagram.stations)}
    unit = (typical_length(diagram.links) or 1.0) / UNITS_PER_LINK
    rows = []
    for walk in diagram.walks:
        ends = (index[walk.start], index[walk.end])
        time = walk.time_s
        if time is None:
            time = round(_apart(diagram, ends) / settings.walking_m_s)
        drawn = round(course_length(walk) / unit)
        for a, b in (ends, ends[::-1]):
            rows += [
                (a, b, time, drawn),
                (n + a, n + b, time, drawn),
                (n + a, b, time, drawn + look),
            ]
    return rows


def _apart(diagram: Diagram, ends: Sequence[int]) -> float:
    places = local_metres([(diagram.stations[i].lon, diagram.stations[i].lat) for i in ends])
    return float(abs(places[0] - places[1]))
