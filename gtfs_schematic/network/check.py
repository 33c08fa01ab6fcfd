"""Find faults in a network: what a later stage could not rely on."""

from __future__ import annotations

import itertools
import re
from collections import Counter
from collections.abc import Iterator, Sequence
from typing import Protocol

from gtfs_schematic.network.model import Corridor, Line, Link, Network, Walk

_COLOR = re.compile(r"#[0-9A-F]{6}", re.IGNORECASE)


class _HasId(Protocol):
    @property
    def id(self) -> str: ...


def faults(network: Network) -> tuple[str, ...]:
    """Name everything that contradicts the model of a network; empty for a sound one.

    1. Ids are unique and sorted; every id that is named exists.
    2. Links join two different stations, once, in sorted order, and carry lines.
    3. Junctions are no stations, and at least three links meet there; nothing calls there or walks
       there, and between two neighbouring stations all lines run over the same ones.
    4. Every step of every course is a link that carries the line, and every line on a link has
       such a step; calls and courses agree.
    5. Corridors hold every link exactly once, carry its lines, run only through stations of
       degree two without a walk, and could not be longer.
    6. Groups are what the walks join, named by their least station.
    7. Lines have colors, trips and times in order; the trips of their periods add up.
    8. Links of part service carry the line; merges say why, and how surely.
    """
    return (
        *_ids(network),
        *_stations(network),
        *_merges(network),
        *_links(network),
        *_junctions(network),
        *(fault for line in network.lines for fault in _courses(network, line)),
        *_coverage(network),
        *_corridors(network),
        *_groups(network),
        *(fault for line in network.lines for fault in _line(line)),
    )


def _ids(network: Network) -> Iterator[str]:
    kinds: tuple[tuple[str, Sequence[_HasId]], ...] = (
        ("stations", network.stations),
        ("links", network.links),
        ("walks", network.walks),
        ("lines", network.lines),
        ("junctions", network.junctions),
        ("corridors", network.corridors),
    )
    for kind, things in kinds:
        ids = [thing.id for thing in things]
        if ids != sorted(set(ids)):
            yield f"{kind} are not sorted by id without repeats"
    both = {link.id for link in network.links} & {walk.id for walk in network.walks}
    yield from (f"{name} is the id of a link and of a walk" for name in sorted(both))


def _stations(network: Network) -> Iterator[str]:
    calls: dict[str, set[str]] = {station.id: set() for station in network.stations}
    for line in network.lines:
        for itinerary in line.itineraries:
            for station_id in itinerary:
                calls.setdefault(station_id, set()).add(line.id)
    owners = Counter(stop for station in network.stations for stop in station.stop_ids)
    for station in network.stations:
        where = f"station {station.id}"
        if list(station.lines) != sorted(calls[station.id]):
            yield f"{where}: lines {station.lines} are not those that call, {calls[station.id]}"
        if not (-180.0 <= station.lon <= 180.0 and -90.0 <= station.lat <= 90.0):
            yield f"{where}: {station.lon}, {station.lat} is no place on Earth"
        if station.stop_ids != tuple(sorted(station.stop_ids)) or not station.stop_ids:
            yield f"{where}: stop ids are missing or not sorted"
        if not station.name:
            yield f"{where}: no name"
        yield from (
            f"{where}: stop {s} belongs to two stations" for s in station.stop_ids if owners[s] > 1
        )
    yield from (
        f"station {s} is called at but missing" for s in sorted(calls.keys() - network.station)
    )


def _merges(network: Network) -> Iterator[str]:
    for station in network.stations:
        if not 0.0 < station.merge_confidence <= 1.0:
            yield f"station {station.id}: confidence {station.merge_confidence} is not in (0, 1]"
        if station.merge_confidence < 1.0 and not station.merge_reason:
            yield f"station {station.id}: merged without a reason"


def _links(network: Network) -> Iterator[str]:
    pairs: Counter[frozenset[str]] = Counter()
    edges: tuple[Link | Walk, ...] = (*network.links, *network.walks)
    for edge in edges:
        if not edge.start < edge.end:
            yield f"{edge.id}: start {edge.start} does not sort before end {edge.end}"
        known = network.station.keys() | (network.junction.keys() if edge in network.links else ())
        yield from (
            f"{edge.id}: station {end} is missing"
            for end in (edge.start, edge.end)
            if end not in known
        )
        pairs[frozenset((edge.start, edge.end))] += 1
    yield from (
        f"{' and '.join(sorted(pair))} are joined {count} times"
        for pair, count in sorted(pairs.items(), key=lambda item: sorted(item[0]))
        if count > 1
    )
    for link in network.links:
        if not link.lines or list(link.lines) != sorted(set(link.lines)):
            yield f"link {link.id}: lines are missing, repeated or not sorted"
        yield from (
            f"link {link.id}: line {line} is missing"
            for line in link.lines
            if line not in network.line
        )


def _junctions(network: Network) -> Iterator[str]:
    degree = Counter(end for link in network.links for end in (link.start, link.end))
    for junction in network.junctions:
        where = f"junction {junction.id}"
        if junction.id in network.station:
            yield f"{where}: is the id of a station"
        if not (-180.0 <= junction.lon <= 180.0 and -90.0 <= junction.lat <= 90.0):
            yield f"{where}: {junction.lon}, {junction.lat} is no place on Earth"
        if degree[junction.id] < 3:
            yield f"{where}: only {degree[junction.id]} links meet"
    ways: dict[frozenset[str], set[tuple[str, ...]]] = {}
    for line in network.lines:
        called = {station for itinerary in line.itineraries for station in itinerary}
        yield from (
            f"junction {j}: line {line.id} calls" for j in sorted(called & network.junction.keys())
        )
        for course in line.courses:
            before: list[str] = []
            for node in course:
                before.append(node)
                if node in network.station:
                    way = tuple(before) if before[0] < node else tuple(reversed(before))
                    ways.setdefault(frozenset((before[0], node)), set()).add(way)
                    before = [node]
    yield from (
        f"lines run from {way[0]} to {way[-1]} over different junctions"
        for some in ways.values()
        if len(some) > 1
        for way in sorted(some)[:1]
    )


def _courses(network: Network, line: Line) -> Iterator[str]:
    where = f"line {line.id}"
    if not line.itineraries or len(line.itineraries) != len(line.courses):
        yield f"{where}: itineraries and courses do not pair up"
    steps: set[tuple[str, str]] = set()
    for itinerary, course in zip(line.itineraries, line.courses, strict=False):
        rest = iter(course)
        if len(itinerary) < 2 or not all(station in rest for station in itinerary):
            yield f"{where}: course {course} does not run through itinerary {itinerary}"
        if (course[0], course[-1]) != (itinerary[0], itinerary[-1]):
            yield f"{where}: course and itinerary {itinerary} end differently"
        for a, b in itertools.pairwise(course):
            steps |= {(a, b), (b, a)}
            link = network.link_between.get(frozenset((a, b)))
            if link is None or line.id not in link.lines:
                yield f"{where}: no link carries it from {a} to {b}"
    yield from (
        f"{where}: one-way step {a} to {b} is not on its course"
        for a, b in line.one_way_links
        if (a, b) not in steps
    )
    yield from (
        f"{where}: part service from {a} to {b}, where it does not run"
        for a, b, _ in line.part_service
        if (a, b) not in steps or not a < b
    )


def _coverage(network: Network) -> Iterator[str]:
    wanted = {
        (line.id, frozenset(step))
        for line in network.lines
        for course in line.courses
        for step in itertools.pairwise(course)
    }
    for link in network.links:
        for line in link.lines:
            if (line, frozenset((link.start, link.end))) not in wanted:
                yield f"link {link.id}: line {line} has no course here"
    linked = {end for link in network.links for end in (link.start, link.end)}
    yield from (f"station {s.id} has no link" for s in network.stations if s.id not in linked)


def _corridors(network: Network) -> Iterator[str]:
    degree = Counter(end for link in network.links for end in (link.start, link.end))
    walked = {end for walk in network.walks for end in (walk.start, walk.end)}
    held = Counter(link_id for corridor in network.corridors for link_id in corridor.link_ids)
    yield from (
        f"link {link.id} is in {held[link.id]} corridors"
        for link in network.links
        if held[link.id] != 1
    )
    ends: Counter[tuple[str, tuple[str, ...]]] = Counter()
    for corridor in network.corridors:
        yield from _corridor(network, corridor)
        yield from (
            f"corridor {corridor.id} runs through {s}, which should end it"
            for s in corridor.station_ids[1:-1]
            if degree[s] != 2 or s in walked
        )
        if corridor.station_ids[0] != corridor.station_ids[-1]:
            ends[corridor.station_ids[0], corridor.lines] += 1
            ends[corridor.station_ids[-1], corridor.lines] += 1
    yield from (
        f"two corridors of the same lines end at {station}, where none needs to"
        for (station, _), count in sorted(ends.items())
        if count == 2 and degree[station] == 2 and station not in walked
    )


def _corridor(network: Network, corridor: Corridor) -> Iterator[str]:
    stations = corridor.station_ids
    if len(stations) != len(corridor.link_ids) + 1:
        yield f"corridor {corridor.id}: stations and links do not alternate"
        return
    for link_id, a, b in zip(corridor.link_ids, stations, stations[1:], strict=False):
        link = network.link.get(link_id)
        if link is None or {link.start, link.end} != {a, b} or link.lines != corridor.lines:
            yield f"corridor {corridor.id}: link {link_id} does not fit between {a} and {b}"


def _groups(network: Network) -> Iterator[str]:
    label = {station.id: station.id for station in network.stations}
    changed = True
    while changed:
        changed = False
        for walk in network.walks:
            low = min(label.get(walk.start, walk.start), label.get(walk.end, walk.end))
            for end in (walk.start, walk.end):
                if label.get(end) != low:
                    label[end] = low
                    changed = True
    yield from (
        f"station {station.id}: group {station.group} is not {label[station.id]}"
        for station in network.stations
        if station.group != label[station.id]
    )


def _line(line: Line) -> Iterator[str]:
    where = f"line {line.id}"
    if not (_COLOR.fullmatch(line.color) and _COLOR.fullmatch(line.text_color)):
        yield f"{where}: {line.color} on {line.text_color} are not two colors"
    if not line.name or not line.route_ids:
        yield f"{where}: no name or no routes"
    if line.trips < 1 or line.first_departure_s > line.last_departure_s:
        yield f"{where}: {line.trips} trips from {line.first_departure_s} s on"
    if line.periods and sum(period.trips for period in line.periods) != line.trips:
        yield f"{where}: the trips of its periods are not {line.trips} together"
    if line.headway_s is not None and line.headway_s <= 0:
        yield f"{where}: headway {line.headway_s} s"
