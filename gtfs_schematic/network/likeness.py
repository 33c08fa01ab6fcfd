"""Judge which sites are one station, why, and how surely."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from scipy.spatial import cKDTree

from gtfs_schematic.feed.model import Timetable
from gtfs_schematic.geometry import distance
from gtfs_schematic.network.kerbs import facing_pairs
from gtfs_schematic.network.model import NetworkSettings
from gtfs_schematic.network.naming import loose_key, name_key
from gtfs_schematic.network.stations import Site, Sites, Verdict, join_close, sites_by_parent
from gtfs_schematic.network.suffixes import Called, Endings, learned_endings, shared_name
from gtfs_schematic.network.ways import way_of_mode

_SAME_NAME = 0.97
_SAME_BUT_FOR_KERB = 0.9
_FACING = 0.8
_HUB = 0.5
_HUB_SHARES = 0.15
"""Added for a route in common, and as much for each half of the words in common."""
_FEW_POLES = 4
"""A place with more names than that is a quarter, not a hub."""


def sites_of(timetable: Timetable, settings: NetworkSettings) -> Sites:
    """Gather the stops that are called at into sites.

    1. Platforms go to the station on top of their chain of parents (`sites_by_parent`).
    2. Sites of the same name merge within `merge_name_m` if one of them has no parent and they
       have a line in common or one stands in a street: two railways of one name may be two
       stations, which transfers.py decides. The two kerbs of a street, and the stands of a
       terminal, often differ by a direction, a code or whatever else this feed appends
       (`learned_endings`); then they merge unless a trip calls at one right after the other.
       Stops that face each other (kerbs.py) merge under any name.
    3. What is left of differently named poles in streets merges within `merge_hub_m` if lines
       that stop there meet, no trip calls at one right after the other, and they are few.
    """
    sites = sites_by_parent(timetable, settings)
    judge = _judge(timetable, sites, settings)
    radius = max(settings.merge_name_m, settings.merge_kerbs_m, settings.merge_group_m)
    clusters = join_close(sites.sites, _pairs_within(sites.sites, radius), judge.same)
    sites = sites.merged(clusters, judge.why)
    judge = _judge(timetable, sites, settings)
    hubs = join_close(
        sites.sites,
        _pairs_within(sites.sites, settings.merge_hub_m),
        judge.hub,
        most=_FEW_POLES,
        surest_first=True,
    )
    return sites.merged(hubs, judge.why_hub)


@dataclass(frozen=True)
class _Judge:
    """What the rules ask about two sites."""

    settings: NetworkSettings
    follows: frozenset[frozenset[str]]
    """Pairs of sites at which some trip calls one right after the other."""
    facing: frozenset[frozenset[str]]
    lines: Mapping[str, frozenset[str]]
    """Per site the lines that call: routes of one agency with one short name count as one."""
    connections: Mapping[str, frozenset[str]]
    """Per line the lines that it meets at some site, itself included."""
    in_street: frozenset[str]
    """Sites at which only buses and trams call."""
    endings: Endings

    def same(self, a: Site, b: Site) -> float:
        """Rule 2."""
        if a.has_parent and b.has_parent:
            return 0.0
        pair = frozenset((a.id, b.id))
        common = not self.lines[a.id].isdisjoint(self.lines[b.id])
        near = distance(a.at, b.at) <= self.settings.merge_name_m
        if near and (common or pair & self.in_street):
            if name_key(a.name) == name_key(b.name):
                return _SAME_NAME
            kerbs = loose_key(a.name) == loose_key(b.name) != ""
            numbered = self.endings.numbered(a.name, b.name)
            learned = self.endings.alike(a.name, b.name) and (common or numbered)
            if (kerbs or learned) and not (a.has_parent or b.has_parent or pair in self.follows):
                return _SAME_BUT_FOR_KERB
        return _FACING * (pair in self.facing and not (a.has_parent or b.has_parent))

    def why(self, members: Sequence[Site]) -> Verdict:
        """Say what made `same` true of all pairs."""
        surety = min(self.same(p, q) or 1.0 for p, q in itertools.combinations(members, 2))
        names = [s.name for s in sorted(members, key=lambda site: (-site.calls, site.id))]
        if len({name_key(name) for name in names}) == 1:
            return Verdict("same name, close together", surety)
        if surety == _FACING:
            return Verdict("across the street from each other", surety)
        return Verdict("same name but for the part of the stop", surety, shared_name(names))

    def hub(self, a: Site, b: Site) -> float:
        """Rule 3: the surer, the more routes and words two poles have in common."""
        pair = frozenset((a.id, b.id))
        apart = distance(a.at, b.at)
        fit = pair <= self.in_street and not (a.has_parent or b.has_parent)
        if not fit or pair in self.follows or apart > self.settings.merge_hub_m:
            return 0.0
        mine, theirs = self.lines[a.id], self.lines[b.id]
        meeting = frozenset[str]().union(*(self.connections[line] for line in mine))
        if meeting.isdisjoint(theirs):
            return 0.0
        shared = not mine.isdisjoint(theirs)
        words = set(name_key(a.name).split()), set(name_key(b.name).split())
        overlap = len(words[0] & words[1]) / max(1, min(map(len, words)))
        return round(_HUB + _HUB_SHARES * (shared + (overlap >= 0.5)), 2)

    def why_hub(self, members: Sequence[Site]) -> Verdict:
        """Say what made `hub` true of all pairs."""
        surety = min(self.hub(p, q) for p, q in itertools.combinations(members, 2))
        far = max(distance(p.at, q.at) for p, q in itertools.combinations(members, 2))
        names = [s.name for s in sorted(members, key=lambda site: (-site.calls, site.id))]
        shared = shared_name(names)
        # A common beginning that ends in a small word ("Depot at") is no name.
        whole = not shared.rpartition(" ")[2].islower()
        reason = f"stands of one place, {far:.0f} m apart at most"
        return Verdict(reason, surety, shared if whole else "")


def _judge(timetable: Timetable, sites: Sites, settings: NetworkSettings) -> _Judge:
    line_of = {
        route.id: f"{route.agency_id} {route.mode} {route.short_name or route.id}"
        for route in timetable.routes
    }
    in_street = {r.id for r in timetable.routes if way_of_mode(r.mode) == "street"}
    follows: set[frozenset[str]] = set()
    lines: dict[str, set[str]] = {site_id: set() for site_id in sites.sites}
    elsewhere: set[str] = set()
    for pattern in timetable.patterns:
        called = [sites.site_of[stop] for stop in pattern.stop_ids if stop in sites.site_of]
        follows.update(frozenset(step) for step in itertools.pairwise(called))
        for site_id in called:
            lines[site_id].add(line_of.get(pattern.route_id, pattern.route_id))
        if pattern.route_id not in in_street:
            elsewhere.update(called)
    connections: dict[str, set[str]] = defaultdict(set)
    for ids in lines.values():
        for line in ids:
            connections[line] |= ids
    served = {site_id: frozenset(ids) for site_id, ids in lines.items()}
    places = {site.id: site.at for site in sites.sites.values()}
    return _Judge(
        settings=settings,
        follows=frozenset(follows),
        facing=facing_pairs(timetable, places, sites.site_of, settings.merge_kerbs_m),
        lines=served,
        connections={line: frozenset(ids) for line, ids in connections.items()},
        in_street=frozenset(sites.sites.keys() - elsewhere),
        endings=_endings(sites, served, follows, settings.merge_name_m),
    )


def _endings(
    sites: Sites,
    lines: Mapping[str, frozenset[str]],
    follows: Collection[frozenset[str]],
    near_m: float,
) -> Endings:
    named = [
        Called(site.id, site.name, site.at, lines[site.id])
        for site in sites.sites.values()
        if not site.has_parent
    ]
    return learned_endings(named, lambda a, b: frozenset((a, b)) in follows, near_m)


def _pairs_within(sites: Mapping[str, Site], radius: float) -> list[tuple[str, str]]:
    ids = sorted(sites)
    if len(ids) < 2:
        return []
    tree = cKDTree(np.array([sites[site_id].at for site_id in ids]))
    return sorted((ids[i], ids[j]) for i, j in tree.query_pairs(radius))
