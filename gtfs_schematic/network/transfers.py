"""Turn transfers between stations into merged stations or into walks."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Collection, Iterable, Sequence
from dataclasses import dataclass

import networkx as nx

from gtfs_schematic.feed.model import LeftOut, Timetable
from gtfs_schematic.geometry import distance
from gtfs_schematic.network.model import NetworkSettings, Walk
from gtfs_schematic.network.naming import name_key
from gtfs_schematic.network.stations import Site, Sites, Verdict, join_close

_ON_FOOT = frozenset([0, 1, 2])
"""Transfer types that a rider walks; 3 is impossible, 4 and 5 stay in the vehicle."""
_FARTHEST_M = 2000.0
"""Nobody changes lines by a longer walk; common practice in feed validation."""
_FEW = 3
"""A complex of more stations is drawn as several joined by walks: one point could not hold all
its lines."""
_SURE = 0.95
"""The feed itself says that one walks here, if not that riders call it one station."""
_INFERRED = 0.7
"""Two railways of one name may be two stations on parallel streets."""


@dataclass(frozen=True, slots=True)
class Footway:
    """A walk that the feed recommends between two sites; `start` sorts before `end`."""

    start: str
    end: str
    length_m: float
    time_s: int | None
    inferred: bool = False
    """Whether the feed does not say so, but two stations have one name."""


def footways_of(
    timetable: Timetable, sites: Sites, settings: NetworkSettings
) -> tuple[tuple[Footway, ...], tuple[LeftOut, ...]]:
    """Gather transfers on foot between different sites, and list those that are too long.

    A feed without any transfers has not thought of them: then stations of the same name no
    further apart than `merge_group_m` are taken to be joined on foot.
    """
    if not timetable.transfers:
        return _inferred(sites, settings), ()
    times: dict[tuple[str, str], list[int]] = {}
    for transfer in timetable.transfers:
        ends = (sites.site_of.get(transfer.from_stop_id), sites.site_of.get(transfer.to_stop_id))
        a, b = sorted(end or "" for end in ends)
        if not a or a == b or transfer.transfer_type not in _ON_FOOT:
            continue
        times.setdefault((a, b), []).extend(
            [] if transfer.min_time_s is None else [transfer.min_time_s]
        )
    footways, left_out = [], []
    for (a, b), seconds in sorted(times.items()):
        length = distance(sites.sites[a].at, sites.sites[b].at)
        if length > _FARTHEST_M:
            reason = f"{length / 1000.0:.1f} km are too far to walk"
            left_out.append(LeftOut("transfer", f"{a} – {b}", reason))
        else:
            footways.append(Footway(a, b, length, min(seconds, default=None)))
    return tuple(footways), tuple(left_out)


def _inferred(sites: Sites, settings: NetworkSettings) -> tuple[Footway, ...]:
    named: dict[str, list[Site]] = defaultdict(list)
    for site in sites.sites.values():
        named[name_key(site.name)].append(site)
    footways = [
        Footway(min(a.id, b.id), max(a.id, b.id), length, None, inferred=True)
        for group in named.values()
        for a, b in itertools.combinations(group, 2)
        if (length := distance(a.at, b.at)) <= settings.merge_group_m
    ]
    return tuple(sorted(footways, key=lambda way: (way.start, way.end)))


def merge_by_transfer(
    sites: Sites, footways: Sequence[Footway], settings: NetworkSettings
) -> Sites:
    """Merge sites of one interchange that are close (all pairs) and few.

    Close is `merge_name_m` if the names agree and `merge_group_m` if they do not.
    """
    graph = nx.Graph([(way.start, way.end) for way in footways])
    clusters: list[tuple[str, ...]] = []
    for group in sorted(sorted(part) for part in nx.connected_components(graph)):
        pairs = [(a, b) for i, a in enumerate(group) for b in group[i + 1 :]]
        clusters += join_close(
            sites.sites, pairs, lambda a, b: float(_close(a, b, settings)), most=_FEW
        )
    guessed = any(way.inferred for way in footways)
    verdict = (
        Verdict("stations of one name, close together", _INFERRED)
        if guessed
        else Verdict("joined by transfers, close together", _SURE)
    )
    return sites.merged(clusters, lambda _: verdict)


def walks_between(
    footways: Iterable[Footway], drawn: Collection[str], linked: Collection[frozenset[str]]
) -> tuple[Walk, ...]:
    """Join the drawn stations of each interchange by as few and as short walks as it takes.

    Parameters
    ----------
    footways
        Transfers on foot.
    drawn
        Ids of the stations that the network holds.
    linked
        Pairs of stations that a line joins: these need no walk.

    Notes
    -----
    A minimum spanning forest (Kruskal 1956), so that an interchange of n stations has n - 1
    walks, none of which a rider could replace by two shorter ones.
    """
    ways = [
        way
        for way in footways
        if way.start in drawn and way.end in drawn and frozenset((way.start, way.end)) not in linked
    ]
    graph = nx.Graph()
    for rank, way in enumerate(sorted(ways, key=lambda w: (w.length_m, w.start, w.end))):
        graph.add_edge(way.start, way.end, rank=rank, way=way)
    chosen = [way for _, _, way in nx.minimum_spanning_tree(graph, "rank").edges.data("way")]
    walks = [Walk(walk_id(w.start, w.end), w.start, w.end, w.time_s) for w in chosen]
    return tuple(sorted(walks, key=lambda walk: walk.id))


def walk_id(start: str, end: str) -> str:
    """Give the id of a walk; the doubled mark keeps it apart from every link's."""
    return f"{escaped(start)}~~{escaped(end)}"


def escaped(station_id: str) -> str:
    """Give a station id in which the mark between two ids cannot occur."""
    return station_id.replace("%", "%25").replace("~", "%7E")


def _close(a: Site, b: Site, settings: NetworkSettings) -> bool:
    agree = name_key(a.name) == name_key(b.name)
    limit = max(settings.merge_name_m, settings.merge_group_m) if agree else settings.merge_group_m
    return distance(a.at, b.at) <= limit
