"""Build the network of a timetable: the one way from `Timetable` to `Network`."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Mapping, Sequence
from collections.abc import Set as AbstractSet
from dataclasses import dataclass

from gtfs_schematic.errors import FeedError
from gtfs_schematic.feed.model import LeftOut, Route, Timetable
from gtfs_schematic.geometry import distance
from gtfs_schematic.network.alongside import passed_alongside
from gtfs_schematic.network.between import idle_junctions
from gtfs_schematic.network.describe import (
    Known,
    Run,
    color_findings,
    described_lines,
    merge_findings,
)
from gtfs_schematic.network.junctions import junctions_of, named_junctions
from gtfs_schematic.network.kinds import kinds_of
from gtfs_schematic.network.likeness import sites_of
from gtfs_schematic.network.lines import route_groups
from gtfs_schematic.network.links import (
    Expansion,
    expresses,
    links_of,
    steps_of,
)
from gtfs_schematic.network.model import Junction, Link, Network, NetworkSettings, Station, Walk
from gtfs_schematic.network.patterns import (
    Calling,
    Ids,
    callings_of,
    itineraries_of,
    shows,
    united,
    without_rare,
)
from gtfs_schematic.network.smooth import corridors_of
from gtfs_schematic.network.stations import Sites
from gtfs_schematic.network.tracks import Track, sections_by_pair, track_of
from gtfs_schematic.network.transfers import footways_of, merge_by_transfer, walks_between
from gtfs_schematic.network.ways import way_of_mode
from gtfs_schematic.progress import Progress, Silent

_SILENT = Silent()


@dataclass(frozen=True)
class _Chosen:
    """Lines and the patterns of theirs that are drawn."""

    groups: Mapping[str, tuple[Route, ...]]
    """Per line id its routes."""
    callings: tuple[Calling, ...]
    left_out: tuple[LeftOut, ...]


def build_network(
    timetable: Timetable, settings: NetworkSettings, *, progress: Progress = _SILENT
) -> Network:
    """Turn the timetable of one service date into its route-station graph.

    Parameters
    ----------
    timetable
        What the feed room read.
    settings
        How stops become stations and trips become links.
    progress
        Who listens.

    Returns
    -------
    Network
        Depends on the content of the timetable alone, not on the order of its tuples.

    Raises
    ------
    FeedError
        If nothing is left to draw.
    """
    progress.phase("Merging stops into stations")
    sites = _sites(timetable, settings)
    progress.phase("Gathering lines")
    chosen = _choose(timetable, sites, settings)
    if not chosen.callings:
        raise FeedError(
            "No trip of the service date calls at two places with coordinates, so there is no "
            "network to draw. Choose another date or other modes.",
            file="stop_times.txt",
        )
    progress.phase("Joining stations by links")
    expansion, junctions = _expand(timetable, sites, chosen, settings)
    ways = _ways(chosen, expansion)
    # Patterns that others show may have been all that joined or parted at a junction.
    while idle := _idle(ways, junctions):
        expansion = expansion.without(idle)
        ways = _ways(chosen, expansion)
        junctions = tuple(junction for junction in junctions if junction.id not in idle)
    links = links_of({line: [course for _, course in pairs] for line, pairs in ways.items()})
    ends = {end for link in links for end in (link.start, link.end)}
    drawn = ends - {junction.id for junction in junctions}
    footways, far_walks = footways_of(timetable, sites, settings)
    walks = walks_between(footways, drawn, _joined(ways, drawn))
    stations = _stations(sites, drawn, links, walks, ways)
    known = Known(timetable, chosen.groups, sites.site_of)
    lines = described_lines(known, ways, _runs(chosen, expansion))
    undrawn = tuple(
        LeftOut("station", site_id, "only patterns that are left out call here")
        for site_id in sites.sites
        if site_id not in drawn
    )
    left_out = (*sites.left_out, *chosen.left_out, *undrawn, *far_walks)
    return Network(
        info=timetable.info,
        agencies=tuple(sorted({agency.name for agency in timetable.agencies})),
        stations=stations,
        links=links,
        walks=walks,
        lines=lines,
        corridors=corridors_of(stations, links),
        findings=(*timetable.findings, *color_findings(lines), *merge_findings(stations)),
        left_out=tuple(
            sorted({*timetable.left_out, *left_out}, key=lambda o: (o.kind, o.id, o.reason))
        ),
        junctions=junctions,
    )


def _joined(
    ways: Mapping[str, Sequence[tuple[Ids, Ids]]], stations: AbstractSet[str]
) -> set[frozenset[str]]:
    """Stations between which some line runs without another."""
    courses = (course for pairs in ways.values() for _, course in pairs)
    called = ([node for node in course if node in stations] for course in courses)
    return {frozenset(step) for course in called for step in itertools.pairwise(course)}


def _sites(timetable: Timetable, settings: NetworkSettings) -> Sites:
    sites = sites_of(timetable, settings)
    footways, _ = footways_of(timetable, sites, settings)
    return merge_by_transfer(sites, footways, settings).with_short_names()


def _choose(timetable: Timetable, sites: Sites, settings: NetworkSettings) -> _Chosen:
    routes = sorted(timetable.routes, key=lambda route: route.id)
    named, groups = (
        {
            group[0].id: group
            for group in route_groups(routes, timetable.patterns, sites.site_of, by)
        }
        for by in ("route", settings.group_lines)
    )
    line_of = {route.id: line_id for line_id, group in named.items() for route in group}
    by_line: dict[str, list[Calling]] = defaultdict(list)
    for calling in callings_of(timetable.patterns, line_of, sites.site_of):
        by_line[calling.line_id].append(calling)

    def length(a: str, b: str) -> float:
        return distance(sites.sites[a].at, sites.sites[b].at)

    def same_way(part: Ids, whole: Ids) -> bool:
        return shows(part, whole, length, settings.express_detour)

    kept: list[Calling] = []
    left_out = [
        LeftOut("route", route.id, "none of its trips calls at two places that are drawn")
        for route in routes
        if route.id not in line_of
    ]
    for line_id in sorted(by_line):
        some, rare = without_rare(by_line[line_id], settings.min_pattern_share, same_way)
        kept.extend(some)
        left_out.extend(rare)
    # A pattern is rare among the trips of its own name, not among those of a whole trunk.
    trunk_of = {route.id: line_id for line_id, group in groups.items() for route in group}
    return _Chosen(groups, united(kept, trunk_of), tuple(left_out))


def _expand(
    timetable: Timetable, sites: Sites, chosen: _Chosen, settings: NetworkSettings
) -> tuple[Expansion, tuple[Junction, ...]]:
    at = {site_id: site.at for site_id, site in sites.sites.items()}
    tracks = _tracks(timetable, sites, chosen)
    way_of = {line_id: way_of_mode(group[0].mode) for line_id, group in chosen.groups.items()}
    sections = sections_by_pair(tracks)
    over = expresses(steps_of(tracks, sections, way_of), at, settings)
    courses = {pair: course for pair, (course, _) in sections.items()}
    over |= passed_alongside(tracks, courses, way_of, at, over, settings)
    if settings.corridors == "stations":
        return Expansion(over), ()
    found = junctions_of(tracks, Expansion(over), way_of, at, settings)
    junctions = named_junctions(found.places, sites.ground, sites.sites)
    names = {key: junction.id for key, junction in junctions.items()}
    ways = {hop: tuple(names.get(node, node) for node in way) for hop, way in found.over.items()}
    return Expansion(over | ways), tuple(sorted(junctions.values(), key=lambda j: j.id))


def _tracks(timetable: Timetable, sites: Sites, chosen: _Chosen) -> tuple[Track, ...]:
    at = {site_id: site.at for site_id, site in sites.sites.items()}
    placed = [s for s in timetable.stops if s.id in sites.site_of and s.lon is not None]
    metres = sites.ground.metres([(s.lon or 0.0, s.lat or 0.0) for s in placed])
    stops = {s.id: (float(x), float(y)) for s, (x, y) in zip(placed, metres, strict=True)}
    shapes = {
        shape_id: sites.ground.metres(timetable.shapes[shape_id])
        for shape_id in sorted({c.shape_id for c in chosen.callings if c.shape_id is not None})
        if shape_id in timetable.shapes
    }
    return tuple(
        track_of(calling, stops, at, shapes.get(calling.shape_id or ""))
        for calling in chosen.callings
    )


def _ways(chosen: _Chosen, expansion: Expansion) -> dict[str, tuple[tuple[Ids, Ids], ...]]:
    """Per line its (itinerary, course) pairs."""
    by_line: dict[str, list[Calling]] = defaultdict(list)
    for calling in chosen.callings:
        by_line[calling.line_id].append(calling)
    return {
        line_id: itineraries_of(callings, expansion.course)
        for line_id, callings in sorted(by_line.items())
    }


def _idle(
    ways: Mapping[str, Sequence[tuple[Ids, Ids]]], junctions: Sequence[Junction]
) -> frozenset[str]:
    courses = (course for pairs in ways.values() for _, course in pairs)
    return idle_junctions(courses, [junction.id for junction in junctions])


def _runs(chosen: _Chosen, expansion: Expansion) -> dict[str, list[Run]]:
    """Per line the courses of all kept patterns, in the direction in which they are run."""
    runs: dict[str, list[Run]] = defaultdict(list)
    for calling in chosen.callings:
        course = expansion.course(calling.stations)
        runs[calling.line_id].append((course, calling.departures_s))
    return runs


def _stations(
    sites: Sites,
    drawn: AbstractSet[str],
    links: Sequence[Link],
    walks: Sequence[Walk],
    ways: Mapping[str, Sequence[tuple[Ids, Ids]]],
) -> tuple[Station, ...]:
    calls: dict[str, set[str]] = {station: set() for station in drawn}
    for line_id, pairs in ways.items():
        for itinerary, _ in pairs:
            for station in itinerary:
                calls[station].add(line_id)
    group = {station: station for station in calls}
    for walk in walks:
        low, high = sorted((group[walk.start], group[walk.end]))
        group = {station: low if head == high else head for station, head in group.items()}
    walked = frozenset(end for walk in walks for end in (walk.start, walk.end))
    kinds = kinds_of({s: frozenset(ids) for s, ids in calls.items()}, links, walked, ways)
    ids = sorted(calls)
    degrees = sites.ground.degrees([sites.sites[station].at for station in ids])
    return tuple(
        Station(
            id=site.id,
            name=site.name,
            second_name=site.second_name,
            stop_ids=site.stop_ids,
            lon=round(float(lon), 7),
            lat=round(float(lat), 7),
            kind=kinds[site.id],
            group=group[site.id],
            lines=tuple(sorted(calls[site.id])),
            boarding=site.boarding,
            merge_reason=site.merge_reason,
            merge_confidence=site.merge_confidence,
        )
        for site, (lon, lat) in zip((sites.sites[s] for s in ids), degrees, strict=True)
    )
