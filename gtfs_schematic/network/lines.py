"""Which routes a rider takes for one line, and what that line is called."""

from __future__ import annotations

import re
from collections import Counter, defaultdict
from collections.abc import Iterable, Mapping, Sequence

import networkx as nx

from gtfs_schematic.feed.model import Pattern, Route
from gtfs_schematic.network.model import LineGrouping
from gtfs_schematic.network.naming import natural_key
from gtfs_schematic.network.patterns import Ids, collapsed

_SAME_COURSE = 0.8
"""Share of stations that two directions of one line must have in common, in order."""
_DIRECTION = re.compile(
    r"[\s(/-]*\b(north|south|east|west|in|out)?(bound)?\b[\s)]*$|(?<=\d)[NSEW]$", re.IGNORECASE
)


def route_groups(
    routes: Sequence[Route],
    patterns: Iterable[Pattern],
    site_of: Mapping[str, str],
    grouping: LineGrouping = "route",
) -> tuple[tuple[Route, ...], ...]:
    """Gather the routes of every line, sorted by the line's id: its least route id.

    1. Routes of one agency and mode with the same short name are one line if they meet: shuttles
       on opposite ends of a city may share a letter without being one line.
    2. Routes that are each run in one direction, one the mirror image of the other, are one line
       if agency, mode and color agree and the names do not speak against it.
    3. If lines are grouped by color or by network: routes of one agency and mode that share it
       and meet are one line.
    """
    runs = _runs_by_route(patterns, site_of)
    known = {route.id: route for route in routes if route.id in runs}
    graph = nx.Graph()
    graph.add_nodes_from(known)
    named: dict[tuple[str, str, str], list[str]] = defaultdict(list)
    colored: dict[tuple[str, str, str], list[str]] = defaultdict(list)
    for route in known.values():
        if route.short_name:
            named[route.agency_id, route.mode, route.short_name].append(route.id)
        colored[route.agency_id, route.mode, route.color or ""].append(route.id)
    trunks: dict[tuple[str, str, str], list[str]] = defaultdict(list)
    for route in known.values():
        if (trunk := _trunk(route, grouping)) is not None:
            trunks[route.agency_id, route.mode, trunk].append(route.id)
    for ids in (*named.values(), *trunks.values()):
        met: dict[str, str] = {}
        for route_id in ids:
            called = {station for run in runs[route_id] for station in run}
            graph.add_edges_from(
                (met.setdefault(station, route_id), route_id) for station in called
            )
    single = {route_id for route_id in known if not _runs_both_ways(runs[route_id])}
    for ids in colored.values():
        graph.add_edges_from(
            (a, b)
            for a, b in _pairs([i for i in ids if i in single])
            if _names_agree(known[a], known[b]) and _mirrors(_main(runs[a]), _main(runs[b]))
        )
    groups = sorted(sorted(part) for part in nx.connected_components(graph))
    return tuple(tuple(known[route_id] for route_id in group) for group in groups)


def _trunk(route: Route, grouping: LineGrouping) -> str | None:
    """Give what routes must share to be grouped; None if this one stays as it is."""
    if grouping == "color":
        return route.color
    if grouping == "network":
        return route.network_id or None
    return None


def name_of(routes: Sequence[Route]) -> str:
    """Give what riders call the line: its short names, else its long ones, else its id."""
    for names in ({r.short_name for r in routes}, {r.long_name for r in routes}):
        if names - {""}:
            return " / ".join(sorted(names - {""}, key=lambda n: (natural_key(n), n)))
    return routes[0].id


def _runs_by_route(
    patterns: Iterable[Pattern], site_of: Mapping[str, str]
) -> dict[str, Counter[Ids]]:
    runs: dict[str, Counter[Ids]] = defaultdict(Counter)
    for pattern in patterns:
        stations = collapsed(site_of[s] for s in pattern.stop_ids if s in site_of)
        if len(stations) > 1:
            runs[pattern.route_id][stations] += len(pattern.departures_s)
    return dict(runs)


def _pairs(ids: Sequence[str]) -> list[tuple[str, str]]:
    ids = sorted(ids)
    return [(a, b) for i, a in enumerate(ids) for b in ids[i + 1 :]]


def _main(runs: Counter[Ids]) -> Ids:
    return min(runs, key=lambda ids: (-runs[ids], ids))


def _runs_both_ways(runs: Counter[Ids]) -> bool:
    main = _main(runs)
    return any(_mirrors(main, other) for other in runs) or _mirrors(main, main)


def _mirrors(one: Ids, other: Ids) -> bool:
    """Whether the second runs (nearly) the stations of the first backwards."""
    common = _common(one, other[::-1])
    return common >= 2 and common >= _SAME_COURSE * max(len(one), len(other))


def _common(one: Ids, other: Ids) -> int:
    """Length of the longest common subsequence (Wagner and Fischer 1974), row by row."""
    row = [0] * (len(other) + 1)
    for a in one:
        diagonal = 0
        for j, b in enumerate(other, start=1):
            diagonal, row[j] = row[j], diagonal + 1 if a == b else max(row[j], row[j - 1])
    return row[-1]


def _names_agree(one: Route, other: Route) -> bool:
    """Whether nothing tells riders that these are two lines.

    A color that the operator chose for both speaks for one line under any two names; without
    one, the short names must be the same but for a direction.
    """
    if one.color is not None:
        return True
    names = {_DIRECTION.sub("", route.short_name).strip() for route in (one, other)}
    return len(names) == 1 or "" in names
