"""Give a new network the ids of the edition before it, so that ids are stable over editions."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import replace

from gtfs_schematic.edition.identity import Match, Matches
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.network.links import link_id
from gtfs_schematic.network.model import Line, Link, Network, Station, Walk
from gtfs_schematic.network.smooth import corridors_of
from gtfs_schematic.network.transfers import walk_id


def with_carried_ids(network: Network, edition: Edition, matches: Matches) -> Network:
    """Rename stations and lines to the ids that they have in the edition.

    A new station or line whose id the edition uses for another gets a mark at its end.
    """
    stations = _renaming(
        [s.id for s in network.stations], matches.stations, {s.id for s in edition.stations}
    )
    lines = _renaming([k.id for k in network.lines], matches.lines, {k.id for k in edition.lines})
    links = _links(network, stations, lines)
    walks = _walks(network, stations)
    groups: dict[str, str] = {}
    for station in network.stations:
        mine = stations[station.id]
        groups[station.group] = min(groups.get(station.group, mine), mine)
    renamed = tuple(
        sorted((_station(s, stations, lines, groups) for s in network.stations), key=_id)
    )
    return replace(
        network,
        stations=renamed,
        links=links,
        walks=walks,
        lines=tuple(sorted((_line(k, stations, lines) for k in network.lines), key=_id)),
        corridors=corridors_of(renamed, links),
    )


def _renaming(
    ids: Collection[str], matches: Mapping[str, Match], taken: Collection[str]
) -> dict[str, str]:
    names = {new: match.old_id for new, match in matches.items()}
    used = set(taken) | set(names.values())
    for new in sorted(set(ids) - set(names)):
        name = new
        while name in used:
            name += "+"
        names[new] = name
        used.add(name)
    return names


def _id(item: Station | Line | Link | Walk) -> str:
    return item.id


def _station(
    station: Station,
    stations: Mapping[str, str],
    lines: Mapping[str, str],
    groups: Mapping[str, str],
) -> Station:
    return replace(
        station,
        id=stations[station.id],
        group=groups[station.group],
        lines=tuple(sorted(lines[k] for k in station.lines)),
    )


def _line(line: Line, stations: Mapping[str, str], lines: Mapping[str, str]) -> Line:
    pairs = tuple((stations[a], stations[b]) for a, b in line.one_way_links)
    part = []
    for a, b, service in line.part_service:
        start, end = sorted((stations[a], stations[b]))
        part.append((start, end, service))
    return replace(
        line,
        id=lines[line.id],
        itineraries=tuple(tuple(stations[s] for s in course) for course in line.itineraries),
        courses=tuple(tuple(stations[s] for s in course) for course in line.courses),
        one_way_links=tuple(sorted(pairs)),
        part_service=tuple(sorted(part)),
    )


def _links(
    network: Network, stations: Mapping[str, str], lines: Mapping[str, str]
) -> tuple[Link, ...]:
    links = []
    for link in network.links:
        start, end = sorted((stations[link.start], stations[link.end]))
        on = tuple(sorted(lines[k] for k in link.lines))
        links.append(Link(link_id(start, end), start, end, on))
    return tuple(sorted(links, key=_id))


def _walks(network: Network, stations: Mapping[str, str]) -> tuple[Walk, ...]:
    walks = []
    for walk in network.walks:
        start, end = sorted((stations[walk.start], stations[walk.end]))
        walks.append(Walk(walk_id(start, end), start, end, walk.time_s))
    return tuple(sorted(walks, key=_id))
