"""Tell stops, interchanges and termini apart as a cartographer would."""

from __future__ import annotations

import itertools
from collections import Counter, defaultdict
from collections.abc import Iterable, Mapping, Sequence

from gtfs_schematic.network.model import Link, StationKind
from gtfs_schematic.network.patterns import Ids

_EXPRESS = 2
"""A line that passes so many stations in a row is an express there."""


def kinds_of(
    calls: Mapping[str, frozenset[str]],
    links: Sequence[Link],
    walked: frozenset[str],
    ways: Mapping[str, Sequence[tuple[Ids, Ids]]],
) -> dict[str, StationKind]:
    """Give the kind of every station.

    1. A station with a walk is an interchange.
    2. So is one at which several lines call that do not all run together on every link there
       (they branch, cross, or one ends), or where one of them sets off to pass several stations
       that another calls at.
    3. The end of an itinerary is a terminus, unless the itinerary comes through there again.
    4. All others are stops, also where several lines run along a trunk.

    Parameters
    ----------
    calls
        Per station the lines that call.
    links
        All links.
    walked
        Stations with a walk.
    ways
        Per line its (itinerary, course) pairs; junctions on courses are passed over.
    """
    around: dict[str, list[frozenset[str]]] = defaultdict(list)
    for link in links:
        for station in (link.start, link.end):
            around[station].append(frozenset(link.lines))
    ends = _ends(pair[0] for pairs in ways.values() for pair in pairs)
    fast = _express_calls(ways, calls)

    def kind(station: str, lines: frozenset[str]) -> StationKind:
        used = [ids for ids in around[station] if ids & lines]
        parts = len(used) > 2 or any(not lines <= ids for ids in used)
        if station in walked or (len(lines) > 1 and (parts or station in fast)):
            return "interchange"
        return "terminus" if station in ends else "stop"

    return {station: kind(station, lines) for station, lines in sorted(calls.items())}


def _ends(itineraries: Iterable[Ids]) -> set[str]:
    ends: set[str] = set()
    for ids in itineraries:
        counts = Counter(ids)
        ends.update(station for station in (ids[0], ids[-1]) if counts[station] == 1)
    return ends


def _express_calls(
    ways: Mapping[str, Sequence[tuple[Ids, Ids]]], calls: Mapping[str, frozenset[str]]
) -> set[str]:
    """Stations beside a row of at least two that a line passes and others call at."""
    found: set[str] = set()
    for line, pairs in ways.items():
        for _, nodes in pairs:
            course = [node for node in nodes if node in calls]
            called = [i for i, station in enumerate(course) if line in calls[station]]
            for i, j in itertools.pairwise(called):
                if j - i > _EXPRESS:
                    found.update((course[i], course[j]))
    return found
