"""Merge stops into the places that a rider takes for one station."""

from __future__ import annotations

import itertools
import statistics
from collections import Counter, defaultdict
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, replace

from gtfs_schematic.feed.model import Boarding, LeftOut, Stop, Timetable
from gtfs_schematic.geometry import Point, distance
from gtfs_schematic.network.ground import Ground, ground_about
from gtfs_schematic.network.model import NetworkSettings
from gtfs_schematic.network.naming import name_key


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
    merge_confidence: float = 1.0
    """How sure the least sure merge was, 0 … 1."""
    short_name: str = ""
    """What is left of the name without the endings that told its parts apart; "" if nothing is."""

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
        self, clusters: Iterable[Sequence[str]], verdict: Callable[[Sequence[Site]], Verdict]
    ) -> Sites:
        """Give the sites with each cluster of site ids made one, and why."""
        sites = dict(self.sites)
        site_of = dict(self.site_of)
        for cluster in clusters:
            members = [self.sites[site_id] for site_id in cluster]
            whole = _merge(members, verdict(members))
            for site_id in cluster:
                del sites[site_id]
            sites[whole.id] = whole
            site_of.update((stop_id, whole.id) for stop_id in whole.stop_ids)
        return replace(self, sites=dict(sorted(sites.items())), site_of=site_of)

    def with_short_names(self) -> Sites:
        """Use the short names of merged sites wherever no other site could be meant by them."""
        known = {
            key: (name_key(site.name), name_key(site.short_name))
            for key, site in self.sites.items()
        }
        begun: Counter[str] = Counter()
        for names in known.values():
            words = [name.split() for name in names]
            begun.update({" ".join(w[: n + 1]) for w in words for n in range(len(w))})
        sites = {
            key: replace(site, name=site.short_name) if begun[known[key][1]] == 1 else site
            for key, site in self.sites.items()
        }
        return replace(self, sites=sites)


@dataclass(frozen=True, slots=True)
class Verdict:
    """Why some sites are one, how sure that is (0 … 1), and what all of them are called."""

    reason: str
    confidence: float
    short_name: str = ""


def sites_by_parent(timetable: Timetable, settings: NetworkSettings) -> Sites:
    """Gather the stops that are called at into sites by parent station.

    1. Platforms go to the station on top of their chain of parents.
    2. Places without coordinates, and outliers, are left out and named.
    """
    return _near_sites(_sites_by_parent(timetable), settings)


def join_close(
    sites: Mapping[str, Site],
    pairs: Iterable[tuple[str, str]],
    same: Callable[[Site, Site], float],
    *,
    most: int = 1000,
    surest_first: bool = False,
) -> list[tuple[str, ...]]:
    """Join sites, nearest pairs first, into clusters of which all pairs are the same.

    Clusters hold at most `most` sites. That *all* pairs must agree keeps a long row of stops
    from growing into one. `same` says how surely two sites are one, 0 that they are not;
    `surest_first` joins in that order, and by distance only where it is equal.
    """
    cluster_of: dict[str, tuple[str, ...]] = {
        site_id: (site_id,) for pair in pairs for site_id in pair
    }
    ranked = sorted(
        (
            -same(sites[a], sites[b]) if surest_first else 0.0,
            distance(sites[a].at, sites[b].at),
            a,
            b,
        )
        for a, b in pairs
    )
    for _, _, a, b in ranked:
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
    """Rule 2: the ground's centre is the median, so distance to it is the length of `at`.

    A country's ends lie further from its middle than any stop of a town: what is far is told by the
    median of those distances as well (as the median absolute deviation tells outliers, Hampel
    1974).
    """
    away = {site.id: distance(site.at, (0.0, 0.0)) for site in sites.sites.values()}
    spread = statistics.median(away.values()) if away else 0.0
    limit = max(settings.outlier_km * 1000.0, settings.outlier_spreads * spread)
    far = {ident for ident, meters in away.items() if not meters <= limit}
    reason = f"further than {limit / 1000.0:.0f} km from the middle of the network"
    return replace(
        sites,
        sites={key: site for key, site in sites.sites.items() if key not in far},
        site_of={stop: site for stop, site in sites.site_of.items() if site not in far},
        left_out=(*sites.left_out, *(LeftOut("stop", key, reason) for key in sorted(far))),
    )


def _merge(members: Sequence[Site], verdict: Verdict) -> Site:
    """Make one site of several.

    Its id is the least of those with parents, else the least; its place that of the only one
    with a parent, else the mean; its name the one most called at.
    """
    stations = [site for site in members if site.has_parent] or list(members)
    located = stations if len(stations) == 1 else members
    known = min(members, key=lambda site: (-site.calls, site.id))
    names = sorted({site.name for site in members} - {known.name})
    note = f"{verdict.reason}: {', '.join(sorted(site.id for site in members))}"
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
        merge_confidence=min(verdict.confidence, *(site.merge_confidence for site in members)),
        short_name=verdict.short_name or known.short_name,
    )
