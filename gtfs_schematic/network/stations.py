"""Merge stops into the places that a rider takes for one station."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy.spatial import cKDTree

from gtfs_schematic.feed.model import Boarding, LeftOut, Stop, Timetable
from gtfs_schematic.geometry import Point, distance
from gtfs_schematic.network.ground import Ground, ground_about
from gtfs_schematic.network.kerbs import facing_pairs
from gtfs_schematic.network.model import NetworkSettings
from gtfs_schematic.network.naming import loose_key, name_key


@dataclass(frozen=True, slots=True)
class Site:
    """A station in the making; `at` is its place in local metres."""

    id: str
    name: str
    second_name: str
    stop_ids: tuple[str, ...]
    at: Point
    has_parent: bool
    boardings: tuple[Boarding, ...]
    """What the feed says of each platform that is called at."""
    calls: int
    """Departures and arrivals of the service date, to tell which of several names is known best."""
    merge_reason: str = ""

    @property
    def boarding(self) -> Boarding:
        """What all platforms agree on; "unknown" where they do not."""
        return self.boardings[0] if len(set(self.boardings)) == 1 else "unknown"


@dataclass(frozen=True)
class Sites:
    """All places of a timetable and the stops that stand for each."""

    ground: Ground
    sites: Mapping[str, Site]
    site_of: Mapping[str, str]
    """Per stop id the id of its site; stops that are left out are missing."""
    left_out: tuple[LeftOut, ...] = ()

    def merged(
        self, clusters: Iterable[Sequence[str]], reason: Callable[[Sequence[Site]], str]
    ) -> Sites:
        """Give the sites with each cluster of site ids made one, and why."""
        sites = dict(self.sites)
        site_of = dict(self.site_of)
        for cluster in clusters:
            members = [self.sites[site_id] for site_id in cluster]
            whole = _merge(members, reason(members))
            for site_id in cluster:
                del sites[site_id]
            sites[whole.id] = whole
            site_of.update((stop_id, whole.id) for stop_id in whole.stop_ids)
        return replace(self, sites=dict(sorted(sites.items())), site_of=site_of)


def sites_of(timetable: Timetable, settings: NetworkSettings) -> Sites:
    """Gather the stops that are called at into sites by parent station, then by name.

    1. Platforms go to the station on top of their chain of parents.
    2. Places without coordinates, and outliers, are left out and named.
    3. Sites of the same name merge within `merge_name_m` if one of them has no parent. The two
       kerbs of a street often differ by a direction or a pole code; then they merge unless a
       trip calls at one right after the other. Stops that face each other (kerbs.py) merge under
       any name.
    4. Where the feed says of both that they are stations of their own, they merge within
       `merge_group_m`, and only if the feed has no transfers: if it has, those decide.
    """
    sites = _near_sites(_sites_by_parent(timetable), settings)
    follows = _followers(timetable, sites.site_of)
    places = {site.id: site.at for site in sites.sites.values()}
    facing = facing_pairs(timetable, places, sites.site_of, settings.merge_kerbs_m)

    def same(a: Site, b: Site) -> bool:
        apart = distance(a.at, b.at)
        alike = name_key(a.name) == name_key(b.name)
        if a.has_parent and b.has_parent:
            return alike and apart <= settings.merge_group_m and not timetable.transfers
        if a.has_parent or b.has_parent:
            return alike and apart <= settings.merge_name_m
        pair = frozenset((a.id, b.id))
        kerbs = loose_key(a.name) == loose_key(b.name) != "" and pair not in follows
        return pair in facing or ((alike or kerbs) and apart <= settings.merge_name_m)

    radius = max(settings.merge_name_m, settings.merge_kerbs_m, settings.merge_group_m)
    clusters = join_close(sites.sites, _pairs_within(sites.sites, radius), same)
    return sites.merged(clusters, _why)


def _why(members: Sequence[Site]) -> str:
    if len({name_key(site.name) for site in members}) == 1:
        return "same name, close together"
    if len({loose_key(site.name) for site in members}) == 1:
        return "same name but for the side of the street"
    return "across the street from each other"


def join_close(
    sites: Mapping[str, Site],
    pairs: Iterable[tuple[str, str]],
    same: Callable[[Site, Site], bool],
    *,
    most: int = 1000,
) -> list[tuple[str, ...]]:
    """Join sites, nearest pairs first, into clusters of which all pairs are the same.

    Clusters hold at most `most` sites. That *all* pairs must agree keeps a long row of stops
    from growing into one.
    """
    cluster_of: dict[str, tuple[str, ...]] = {
        site_id: (site_id,) for pair in pairs for site_id in pair
    }
    ranked = sorted((distance(sites[a].at, sites[b].at), a, b) for a, b in pairs)
    for _, a, b in ranked:
        one, other = cluster_of[a], cluster_of[b]
        if one == other or len(one) + len(other) > most:
            continue
        if all(same(sites[p], sites[q]) for p, q in itertools.product(one, other)):
            joined = tuple(sorted(one + other))
            cluster_of.update((site_id, joined) for site_id in joined)
    return sorted({cluster for cluster in cluster_of.values() if len(cluster) > 1})


def top_parent(stop_id: str, stops: Mapping[str, Stop]) -> str:
    """Follow the parents of a stop to the top; a parent that is missing or a ring ends the way."""
    seen = {stop_id}
    while (parent := stops[stop_id].parent_id) is not None and parent in stops:
        if parent in seen:
            return min(seen)
        seen.add(parent)
        stop_id = parent
    return stop_id


def _sites_by_parent(timetable: Timetable) -> Sites:
    """Rule 1, for all stops that a pattern calls at and that have a place."""
    stops = {stop.id: stop for stop in timetable.stops}
    calls: dict[str, int] = defaultdict(int)
    for pattern in timetable.patterns:
        for stop_id in pattern.stop_ids:
            calls[stop_id] += len(pattern.departures_s)
    members: dict[str, list[str]] = defaultdict(list)
    for stop_id in sorted(calls):
        members[top_parent(stop_id, stops)].append(stop_id)
    placed = [place for stop_id in calls if (place := _place(stops[stop_id])) is not None]
    ground = ground_about(sorted(placed))
    sites: dict[str, Site] = {}
    left_out: list[LeftOut] = []
    for top, children in sorted(members.items()):
        places = [p for p in (_place(stops[top]),) if p] or [
            p for p in (_place(stops[child]) for child in children) if p
        ]
        if not places:
            left_out.append(LeftOut("stop", top, "it has no coordinates"))
            continue
        x, y = ground.metres(places).mean(axis=0)
        sites[top] = Site(
            id=top,
            name=stops[top].name or stops[children[0]].name or top,
            second_name=stops[top].second_name or stops[children[0]].second_name,
            stop_ids=tuple(sorted({top, *children})),
            at=(float(x), float(y)),
            has_parent=children != [top],
            boardings=tuple(_boarding(stops[child], stops[top]) for child in children),
            calls=sum(calls[child] for child in children),
        )
    site_of = {stop_id: site.id for site in sites.values() for stop_id in site.stop_ids}
    return Sites(ground, sites, site_of, tuple(left_out))


def _place(stop: Stop) -> Point | None:
    """Give lon and lat; 0° N 0° E stands for "not known" in feeds."""
    if stop.lon is None or stop.lat is None or (stop.lon == 0.0 and stop.lat == 0.0):
        return None
    return (stop.lon, stop.lat)


def _boarding(platform: Stop, top: Stop) -> Boarding:
    """Let a platform without a word of its own inherit its station's (GTFS, stops.txt)."""
    return platform.boarding if platform.boarding != "unknown" else top.boarding


def _near_sites(sites: Sites, settings: NetworkSettings) -> Sites:
    """Rule 2: the ground's centre is the median, so distance to it is the length of `at`."""
    limit = settings.outlier_km * 1000.0
    far = {site.id for site in sites.sites.values() if not distance(site.at, (0.0, 0.0)) <= limit}
    reason = f"further than {settings.outlier_km:g} km from the middle of the network"
    return replace(
        sites,
        sites={key: site for key, site in sites.sites.items() if key not in far},
        site_of={stop: site for stop, site in sites.site_of.items() if site not in far},
        left_out=(*sites.left_out, *(LeftOut("stop", key, reason) for key in sorted(far))),
    )


def _followers(timetable: Timetable, site_of: Mapping[str, str]) -> set[frozenset[str]]:
    """Pairs of sites at which some trip calls one right after the other."""
    return {
        frozenset((site_of[a], site_of[b]))
        for pattern in timetable.patterns
        for a, b in itertools.pairwise(pattern.stop_ids)
        if a in site_of and b in site_of
    }


def _pairs_within(sites: Mapping[str, Site], radius: float) -> list[tuple[str, str]]:
    ids = sorted(sites)
    if len(ids) < 2:
        return []
    tree = cKDTree(np.array([sites[site_id].at for site_id in ids]))
    return sorted((ids[i], ids[j]) for i, j in tree.query_pairs(radius))


def _merge(members: Sequence[Site], reason: str) -> Site:
    """Make one site of several.

    Its id is the least of those with parents, else the least; its place that of the only one
    with a parent, else the mean; its name the one most called at.
    """
    stations = [site for site in members if site.has_parent] or list(members)
    located = stations if len(stations) == 1 else members
    known = min(members, key=lambda site: (-site.calls, site.id))
    names = sorted({site.name for site in members} - {known.name})
    note = f"{reason}: {', '.join(sorted(site.id for site in members))}"
    if names:
        note += f" (also named {', '.join(names)})"
    reasons = sorted({site.merge_reason for site in members} - {""})
    return Site(
        id=min(site.id for site in stations),
        name=known.name,
        second_name=known.second_name,
        stop_ids=tuple(sorted({stop for site in members for stop in site.stop_ids})),
        at=(
            sum(site.at[0] for site in located) / len(located),
            sum(site.at[1] for site in located) / len(located),
        ),
        has_parent=any(site.has_parent for site in members),
        boardings=tuple(b for site in members for b in site.boardings),
        calls=sum(site.calls for site in members),
        merge_reason="; ".join([*reasons, note]),
    )
