"""A network taken apart, to be changed and put together again."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass, field, replace

from gtfs_schematic.errors import UsageError
from gtfs_schematic.network.between import agreed
from gtfs_schematic.network.kinds import kinds_of
from gtfs_schematic.network.links import links_of
from gtfs_schematic.network.model import Line, Network, Station, Walk
from gtfs_schematic.network.smooth import corridors_of
from gtfs_schematic.network.transfers import walk_id

Ids = tuple[str, ...]
Ways = tuple[tuple[Ids, Ids], ...]


@dataclass
class Draft:
    """Stations, lines with their (itinerary, course) pairs, and walks, while they change."""

    stations: dict[str, Station]
    lines: dict[str, Line]
    ways: dict[str, Ways]
    walks: dict[tuple[str, str], int | None]
    became: dict[str, str] = field(default_factory=dict)
    """Per station that was merged or split the station that its id means now."""
    line_became: dict[str, str] = field(default_factory=dict)
    """Per line that was grouped the line that its id means now."""

    @classmethod
    def of(cls, network: Network) -> Draft:
        """Take a network apart."""
        return cls(
            {s.id: s for s in network.stations},
            {k.id: k for k in network.lines},
            {k.id: tuple(zip(k.itineraries, k.courses, strict=True)) for k in network.lines},
            {(w.start, w.end): w.time_s for w in network.walks},
        )

    def merge(self, ids: Ids, name: str) -> None:
        """Make one station of several; it stands in their middle and has the least id."""
        some = [self.stations[key] for key in ids]
        whole = min(ids)
        merged = replace(
            self.stations[whole],
            name=name or some[0].name,
            second_name="" if name else some[0].second_name,
            stop_ids=tuple(sorted({stop for s in some for stop in s.stop_ids})),
            lon=round(sum(s.lon for s in some) / len(some), 7),
            lat=round(sum(s.lat for s in some) / len(some), 7),
            boarding=some[0].boarding if len({s.boarding for s in some}) == 1 else "unknown",
            merge_reason="an adjustment says so",
            merge_confidence=1.0,
        )
        for key in ids:
            del self.stations[key]
        self.stations[whole] = merged
        names = dict.fromkeys(ids, whole)
        self.became |= names
        for line, ways in self.ways.items():
            self.ways[line] = tuple(
                (_renamed(calls, names), _renamed(course, names)) for calls, course in ways
            )
        self._walk_anew(names)

    def hide_station(self, key: str) -> None:
        """Let all lines pass as if the station were not there."""
        del self.stations[key]
        for line, ways in self.ways.items():
            self.ways[line] = tuple(
                (
                    _renamed([s for s in calls if s != key], {}),
                    _renamed([s for s in course if s != key], {}),
                )
                for calls, course in ways
            )
        self.walks = {pair: time for pair, time in self.walks.items() if key not in pair}

    def hide_line(self, key: str) -> None:
        """Take a line out; stations that no other line has go with it."""
        del self.lines[key]
        del self.ways[key]

    def _walk_anew(self, names: dict[str, str]) -> None:
        walks: dict[tuple[str, str], int | None] = {}
        for (a, b), time in sorted(self.walks.items()):
            start, end = sorted((names.get(a, a), names.get(b, b)))
            if start != end:
                times = [t for t in (time, walks.get((start, end))) if t is not None]
                walks[start, end] = min(times, default=None)
        self.walks = walks


def _renamed(ids: Sequence[str], names: dict[str, str]) -> Ids:
    """Give ids by their new names, without a station repeated at once."""
    return tuple(key for key, _ in itertools.groupby(names.get(s, s) for s in ids))


def rebuilt(network: Network, draft: Draft) -> Network:
    """Put a network together again; what is not in the draft is taken from the network.

    Raises
    ------
    UsageError
        If no line is left.
    """
    kept = {line: draft.ways[line] for line in sorted(draft.lines)}
    # A station at which nothing calls any more is no station.
    called = {s for some in kept.values() for calls, _ in some if len(calls) > 1 for s in calls}
    called |= network.junction.keys()
    ways = {line: _trimmed(some, called) for line, some in kept.items()}
    ways = agreed({line: some for line, some in ways.items() if some}, network.junction)
    if not ways:
        raise UsageError("The adjustments hide every line: nothing is left to draw.")
    links = links_of({line: [course for _, course in some] for line, some in ways.items()})
    linked = {frozenset((k.start, k.end)) for k in links}
    ends = {end for k in links for end in (k.start, k.end)}
    calls: dict[str, set[str]] = {s: set() for s in ends - network.junction.keys()}
    for line, some in ways.items():
        for itinerary, _ in some:
            for station in itinerary:
                calls[station].add(line)
    walks = tuple(
        Walk(walk_id(a, b), a, b, time)
        for (a, b), time in sorted(draft.walks.items())
        if a in calls and b in calls and frozenset((a, b)) not in linked
    )
    group = _groups(sorted(calls), walks)
    walked = frozenset(end for walk in walks for end in (walk.start, walk.end))
    kinds = kinds_of({s: frozenset(ids) for s, ids in calls.items()}, links, walked, ways)
    stations = tuple(
        replace(
            draft.stations[key],
            kind=kinds[key],
            group=group[key],
            lines=tuple(sorted(calls[key])),
        )
        for key in sorted(calls)
    )
    return replace(
        network,
        stations=stations,
        links=links,
        walks=tuple(sorted(walks, key=lambda walk: walk.id)),
        lines=tuple(_line(draft.lines[key], some) for key, some in ways.items()),
        corridors=corridors_of(stations, links),
        junctions=tuple(j for j in network.junctions if j.id in ends),
    )


def _trimmed(ways: Ways, called: set[str]) -> Ways:
    """End each course where its itinerary does, and drop what calls but once, or twice the same."""
    found: dict[Ids, Ids] = {}
    for itinerary, course in ways:
        if len(itinerary) < 2:
            continue
        first = course.index(itinerary[0])
        last = len(course) - course[::-1].index(itinerary[-1])
        if itinerary not in found and itinerary[::-1] not in found:
            found[itinerary] = _renamed([s for s in course[first:last] if s in called], {})
    return tuple(found.items())


def _groups(stations: list[str], walks: tuple[Walk, ...]) -> dict[str, str]:
    group = {station: station for station in stations}
    for walk in walks:
        low, high = sorted((group[walk.start], group[walk.end]))
        group = {station: low if head == high else head for station, head in group.items()}
    return group


def _line(line: Line, ways: Ways) -> Line:
    steps: dict[frozenset[str], set[tuple[str, str]]] = defaultdict(set)
    for _, course in ways:
        for a, b in itertools.pairwise(course):
            steps[frozenset((a, b))].add((a, b))
    return replace(
        line,
        itineraries=tuple(itinerary for itinerary, _ in ways),
        courses=tuple(course for _, course in ways),
        one_way_links=tuple(p for p in line.one_way_links if frozenset(p) in steps),
        part_service=tuple(p for p in line.part_service if frozenset(p[:2]) in steps),
    )
