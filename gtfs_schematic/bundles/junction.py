"""What meets at a station: link ends in clockwise order, and which lines pass between them."""

from __future__ import annotations

import itertools
import math
from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

from gtfs_schematic.geometry import Point, distance, unit_vector
from gtfs_schematic.layout.model import Layout
from gtfs_schematic.network.model import Network


@dataclass(frozen=True, slots=True)
class Leg:
    """The end of a link at a station, seen from the station; sheet millimetres, y down."""

    link_id: str
    forward: bool
    """Whether the station is the link's `start`, so that leaving runs from start to end."""
    direction: Point
    """Unit vector in which the link leaves."""
    length_mm: float
    """Length of the link's first straight piece."""
    bend: Point | None
    """Unit vector of the second straight piece, if the link bends."""


@dataclass(frozen=True, slots=True)
class Pass:
    """A line that goes on from one link to another at a station; `first` sorts before `second`."""

    line_id: str
    first: str
    second: str


@dataclass(frozen=True)
class Junction:
    """A station with its legs in clockwise order as seen on the sheet, and its passes."""

    station_id: str
    at_mm: Point
    legs: tuple[Leg, ...]
    passes: tuple[Pass, ...]

    @cached_property
    def leg(self) -> dict[str, Leg]:
        """Legs by link id."""
        return {leg.link_id: leg for leg in self.legs}

    @cached_property
    def rank(self) -> dict[str, int]:
        """Clockwise rank of every leg by link id."""
        return {leg.link_id: i for i, leg in enumerate(self.legs)}


def junctions(layout: Layout) -> Mapping[str, Junction]:
    """Give the junction of every station that has a link, by station id."""
    passes = line_passes(layout.network)
    legs: dict[str, list[Leg]] = defaultdict(list)
    for link in layout.network.links:
        path = layout.paths[link.id]
        legs[link.start].append(_leg(link.id, path, forward=True))
        legs[link.end].append(_leg(link.id, path[::-1], forward=False))
    return {
        station_id: Junction(
            station_id,
            layout.positions[station_id],
            tuple(sorted(legs[station_id], key=_clockwise)),
            passes.get(station_id, ()),
        )
        for station_id in sorted(legs)
    }


def line_passes(network: Network) -> Mapping[str, tuple[Pass, ...]]:
    """Give per station the passes of its lines: two links that a course uses one after the other.

    A closed course (its first station is its last) also passes there; a course that turns back
    on its own link does not. Where a line has just two links and no course uses one after the
    other, as at the far end of a terminal loop, it passes all the same.
    """
    found: dict[str, set[tuple[str, str, str]]] = defaultdict(set)
    for line in network.lines:
        for course in line.courses:
            closed = len(course) > 2 and course[0] == course[-1]
            walked = (*course, course[1]) if closed else course
            for a, b, c in zip(walked, walked[1:], walked[2:], strict=False):
                first = network.link_between[frozenset((a, b))].id
                second = network.link_between[frozenset((b, c))].id
                if first != second:
                    found[b].add((line.id, min(first, second), max(first, second)))
    for (station_id, line_id), links in _own_links(network).items():
        if len(links) == 2 and all(line_id != way[0] for way in found[station_id]):
            found[station_id].add((line_id, min(links), max(links)))
    return {
        station_id: tuple(Pass(*key) for key in sorted(found[station_id]))
        for station_id in sorted(found)
    }


def _own_links(network: Network) -> dict[tuple[str, str], list[str]]:
    """Give the links of each line at each station, by (station, line)."""
    own: dict[tuple[str, str], list[str]] = defaultdict(list)
    for link in network.links:
        for line_id in link.lines:
            own[link.start, line_id].append(link.id)
            own[link.end, line_id].append(link.id)
    return own


def _leg(link_id: str, path: tuple[Point, ...], *, forward: bool) -> Leg:
    points = [p for p, q in itertools.pairwise(path) if p != q] + [path[-1]]
    bend = unit_vector(points[1], points[2]) if len(points) > 2 else None
    return Leg(link_id, forward, unit_vector(*points[:2]), distance(*points[:2]), bend)


def _clockwise(leg: Leg) -> tuple[float, str]:
    """Sort key; with y down, growing angles run clockwise on the sheet."""
    return (round(math.atan2(leg.direction[1], leg.direction[0]), 9), leg.link_id)
