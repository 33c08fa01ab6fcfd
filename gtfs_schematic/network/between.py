"""See a network as riders do: from station to station, whatever junctions lie between."""

from __future__ import annotations

import itertools
from collections import Counter, defaultdict
from collections.abc import Collection, Container, Iterable, Mapping, Sequence
from dataclasses import dataclass

from gtfs_schematic.network.links import link_id
from gtfs_schematic.network.model import Line, Link, Network, ServicePattern
from gtfs_schematic.network.patterns import Ids

_PARTS = 3
"""So many links meet at least where lines join or part."""


@dataclass(frozen=True, slots=True)
class Between:
    """The way of lines from one station to the next; `start` sorts before `end`."""

    id: str
    start: str
    end: str
    lines: Ids
    """Ids of the lines that run so, sorted."""
    via: Ids
    """Ids of the junctions between, from start to end; mostly none."""
    links: Ids
    """Ids of the network's links, from start to end."""


def from_station_to_station(network: Network) -> tuple[Between, ...]:
    """Give the ways between neighbouring stations, sorted by id.

    Without junctions these are the network's links.
    """
    lines: dict[Ids, set[str]] = defaultdict(set)
    for line in network.lines:
        for course in line.courses:
            for part in cut_at_stations(course, network.junction):
                lines[part if part[0] < part[-1] else part[::-1]].add(line.id)
    ways = [
        Between(
            link_id(way[0], way[-1]),
            way[0],
            way[-1],
            tuple(sorted(ids)),
            way[1:-1],
            tuple(network.link_between[frozenset(step)].id for step in itertools.pairwise(way)),
        )
        for way, ids in lines.items()
    ]
    return tuple(sorted(ways, key=lambda way: (way.id, way.via)))


def link_towards(network: Network, start: str, end: str) -> Link | None:
    """Give the link between two neighbouring stations, or the first on the way over junctions."""
    link = network.link_between.get(frozenset((start, end)))
    if link is not None or not network.junctions:
        return link
    ways = (w for w in from_station_to_station(network) if {w.start, w.end} == {start, end})
    way = next(ways, None)
    return None if way is None else network.link[way.links[0 if way.start == start else -1]]


def part_service_of(network: Network, line: Line) -> tuple[tuple[str, str, ServicePattern], ...]:
    """Give the part service of a line from station to station; see `Line.part_service`."""
    service = {frozenset((start, end)): part for start, end, part in line.part_service}
    found: list[tuple[str, str, ServicePattern]] = []
    for way in from_station_to_station(network) if service else ():
        steps = map(frozenset, itertools.pairwise((way.start, *way.via, way.end)))
        parts = {service.get(step) for step in steps}
        # Where more runs on a part of the way, that is by other patterns of the line.
        some: list[ServicePattern] = sorted(part for part in parts if part is not None)
        if some and line.id in way.lines:
            found.append((way.start, way.end, some[0]))
    return tuple(found)


def cut_at_stations(course: Sequence[str], junctions: Container[str]) -> list[Ids]:
    """Cut a course at its stations; every part begins and ends at one."""
    cuts = [i for i, node in enumerate(course) if node not in junctions]
    return [tuple(course[i : j + 1]) for i, j in itertools.pairwise(cuts)]


def agreed(
    ways: Mapping[str, Sequence[tuple[Ids, Ids]]], junctions: Container[str]
) -> dict[str, tuple[tuple[Ids, Ids], ...]]:
    """Let all lines run over the same junctions between two stations, and over no idle ones.

    Parameters
    ----------
    ways
        Per line id its (itinerary, course) pairs.
    junctions
        Which nodes of the courses are junctions.
    """
    while True:
        courses = [course for some in ways.values() for _, course in some]
        count = Counter(
            part if part[0] < part[-1] else part[::-1]
            for course in courses
            for part in cut_at_stations(course, junctions)
        )
        best: dict[tuple[str, str], Ids] = {}
        for part in sorted(count, key=lambda part: (-count[part], len(part), part)):
            best.setdefault((part[0], part[-1]), part)
        named = {node for course in courses for node in course if node in junctions}
        idle = idle_junctions([best[part[0], part[-1]] for part in count], named)
        fresh = {
            line: tuple((calls, _over(course, best, idle, junctions)) for calls, course in some)
            for line, some in ways.items()
        }
        if fresh == ways:
            return fresh
        ways = fresh


def _over(
    course: Ids,
    best: Mapping[tuple[str, str], Ids],
    idle: Container[str],
    junctions: Container[str],
) -> Ids:
    """Write a course over the best way from station to station, without idle junctions."""
    over = [course[0]]
    for part in cut_at_stations(course, junctions):
        a, b = part[0], part[-1]
        over += (best[a, b] if a < b else best[b, a][::-1])[1:]
    return tuple(node for node in over if node not in idle)


def idle_junctions(courses: Iterable[Sequence[str]], junctions: Collection[str]) -> frozenset[str]:
    """Find the junctions at which no more than two links meet: nothing joins or parts there."""
    idle: set[str] = set()
    some = [tuple(course) for course in courses]
    while True:
        around: dict[str, set[str]] = defaultdict(set)
        for course in some:
            for p, q in itertools.pairwise(node for node in course if node not in idle):
                around[p].add(q)
                around[q].add(p)
        found = {node for node in junctions if node not in idle and len(around[node]) < _PARTS}
        if not found:
            return frozenset(idle)
        idle |= found
