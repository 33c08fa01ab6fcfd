"""Give a new network the ids of the edition before it, so that ids are stable over editions."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import replace

from gtfs_schematic.drift.ground import local_metres
from gtfs_schematic.edition.identity import Match, Matches
from gtfs_schematic.edition.model import Edition, EditionLine
from gtfs_schematic.edition.roster import Roster, RosterLine
from gtfs_schematic.network.links import link_id
from gtfs_schematic.network.model import Line, Link, Network, Station, Walk
from gtfs_schematic.network.smooth import corridors_of
from gtfs_schematic.network.transfers import walk_id

_SAME_JUNCTION_M = 150.0
"""A junction no further off than this is the one that the edition has, metres."""


def with_carried_ids(network: Network, edition: Edition | Roster, matches: Matches) -> Network:
    """Rename stations and lines to the ids that they have in the edition.

    A new station or line whose id the edition uses for another gets a mark at its end. A line
    whose color this program chose keeps the one that riders know.
    """
    stations, lines = names_of(network, edition, matches)
    nodes = stations | _junction_names(network, edition)
    known = {line.id: line for line in edition.lines}
    links = _links(network, nodes, lines)
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
        lines=tuple(
            sorted((_colored(_line(k, nodes, lines), known) for k in network.lines), key=_id)
        ),
        corridors=corridors_of(renamed, links),
        junctions=tuple(
            sorted((replace(j, id=nodes[j.id]) for j in network.junctions), key=lambda j: j.id)
        ),
    )


def _junction_names(network: Network, edition: Edition | Roster) -> dict[str, str]:
    """Give junctions the ids that the nearest have in the edition, if they are the same place."""
    old = [(j.id, (j.lon, j.lat)) for j in edition.junctions]
    places = [at for _, at in old] + [(j.lon, j.lat) for j in network.junctions]
    metres = [complex(at) for at in local_metres(places)] if places else []
    pairs = sorted(
        (abs(p - q), was, b.id)
        for (was, _), p in zip(old, metres, strict=False)
        for b, q in zip(network.junctions, metres[len(old) :], strict=True)
    )
    names: dict[str, str] = {}
    for gap, was, now in pairs:
        if gap <= _SAME_JUNCTION_M and now not in names and was not in names.values():
            names[now] = was
    taken = {key for key, _ in old} | {s.id for s in network.stations}
    taken |= {s.id for s in edition.stations}
    for junction in network.junctions:
        if junction.id not in names:
            name = junction.id
            while name in taken:
                name += "+"
            names[junction.id] = name
            taken.add(name)
    return names


def names_of(
    later: Network | Roster, earlier: Edition | Roster, matches: Matches
) -> tuple[dict[str, str], dict[str, str]]:
    """Give the ids to be carried: per id of now, of stations and of lines."""
    return (
        _renaming(
            [s.id for s in later.stations], matches.stations, {s.id for s in earlier.stations}
        ),
        _renaming([k.id for k in later.lines], matches.lines, {k.id for k in earlier.lines}),
    )


def carried_matches(
    later: Network | Roster, earlier: Edition | Roster, matches: Matches
) -> Matches:
    """Give matches by the ids that the later things have once they are carried."""
    stations, lines = names_of(later, earlier, matches)

    def parts(some: tuple[Match, ...], names: Mapping[str, str]) -> tuple[Match, ...]:
        return tuple(replace(match, new_id=names[match.new_id]) for match in some)

    return replace(
        matches,
        stations={m.new_id: m for m in parts(tuple(matches.stations.values()), stations)},
        lines={m.new_id: m for m in parts(tuple(matches.lines.values()), lines)},
        merged_stations=parts(matches.merged_stations, stations),
        split_stations=parts(matches.split_stations, stations),
        merged_lines=parts(matches.merged_lines, lines),
        split_lines=parts(matches.split_lines, lines),
    )


def carried_roster(later: Roster, earlier: Roster, matches: Matches) -> Roster:
    """Rename the stations and lines of a roster as `with_carried_ids` does those of a network."""
    stations, lines = names_of(later, earlier, matches)

    def ids(names: Mapping[str, str], some: tuple[str, ...]) -> tuple[str, ...]:
        return tuple(names[key] for key in some)

    return replace(
        later,
        stations=tuple(
            sorted(
                (
                    replace(s, id=stations[s.id], lines=tuple(sorted(ids(lines, s.lines))))
                    for s in later.stations
                ),
                key=lambda s: s.id,
            )
        ),
        lines=tuple(
            sorted(
                (
                    replace(
                        k,
                        id=lines[k.id],
                        itineraries=tuple(ids(stations, i) for i in k.itineraries),
                    )
                    for k in later.lines
                ),
                key=lambda k: k.id,
            )
        ),
        links=tuple((stations[a], stations[b], ids(lines, on)) for a, b, on in later.links),
        walks=tuple((stations[a], stations[b], time) for a, b, time in later.walks),
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


def _colored(line: Line, known: Mapping[str, EditionLine | RosterLine]) -> Line:
    """Keep the color of the edition where the feed has none, or one that will not do."""
    if line.color_from_feed or line.id not in known:
        return line
    return replace(line, color=known[line.id].color, text_color=known[line.id].text_color)


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
