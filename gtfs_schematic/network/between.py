"""See a network as riders do: from station to station, whatever junctions lie between."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Collection, Container, Iterable, Sequence
from dataclasses import dataclass

from gtfs_schematic.network.links import link_id
from gtfs_schematic.network.model import Network
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


def cut_at_stations(course: Sequence[str], junctions: Container[str]) -> list[Ids]:
    """Cut a course at its stations; every part begins and ends at one."""
    cuts = [i for i, node in enumerate(course) if node not in junctions]
    return [tuple(course[i : j + 1]) for i, j in itertools.pairwise(cuts)]


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
