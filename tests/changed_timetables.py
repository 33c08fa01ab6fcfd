"""Timetables changed as service changes do, with the answer known: which stop and route is which.

Every change takes a timetable and chance, and gives the changed timetable. What a stop or route was
before stands in its `Ids`; a stop or route that is not in it is new. Names are invented.
"""

from __future__ import annotations

import itertools
import math
from collections import Counter, defaultdict
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field, replace
from random import Random

from gtfs_schematic.feed.model import Pattern, Route, Stop, Timetable
from gtfs_schematic.network.model import Network

_METERS_PER_DEGREE = 111_195.0
_SYLLABLES = ("bal", "dor", "fen", "gil", "hest", "jor", "kap", "lum", "mer", "nov", "rask", "tull")

Ids = Mapping[str, str]
"""Per new id the old one."""


@dataclass(frozen=True)
class Changed:
    """A changed timetable, what its stops and routes were before, and what was done to it."""

    timetable: Timetable
    stops: Ids
    routes: Ids
    done: tuple[str, ...] = field(default=())


def chance_of(seed: int) -> Random:
    """Give chance that is the same every time."""
    return Random(seed)  # noqa: S311 - no secrets here


def unchanged(timetable: Timetable) -> Changed:
    """Begin with nothing changed."""
    return Changed(
        timetable, {s.id: s.id for s in timetable.stops}, {r.id: r.id for r in timetable.routes}
    )


def _name(chance: Random) -> str:
    return "".join(chance.choice(_SYLLABLES) for _ in range(3)).title()


def _place(timetable: Timetable, chance: Random) -> tuple[Stop, ...]:
    """Choose a stop that is called at, with all that hang on the same parent."""
    called = sorted({s for p in timetable.patterns for s in p.stop_ids})
    stop = {s.id: s for s in timetable.stops}
    one = stop[chance.choice(called)]
    top = one.parent_id or one.id
    return tuple(s for s in timetable.stops if top in (s.id, s.parent_id))


def _with_stops(changed: Changed, stops: Iterable[Stop], what: str) -> Changed:
    table = changed.timetable
    fresh = {s.id: s for s in stops}
    all_stops = {s.id: s for s in table.stops} | fresh
    table = replace(table, stops=tuple(all_stops[key] for key in sorted(all_stops)))
    return replace(changed, timetable=table, done=(*changed.done, what))


def _without(pattern: Pattern, gone: set[str]) -> Pattern:
    kept = [i for i, s in enumerate(pattern.stop_ids) if s not in gone]
    return replace(
        pattern,
        stop_ids=tuple(pattern.stop_ids[i] for i in kept),
        offsets_s=tuple(pattern.offsets_s[i] for i in kept),
    )


def _with_patterns(changed: Changed, patterns: Iterable[Pattern], what: str) -> Changed:
    good = tuple(p for p in patterns if len(p.stop_ids) > 1)
    table = replace(changed.timetable, patterns=good)
    return replace(changed, timetable=table, done=(*changed.done, what))


def close(changed: Changed, chance: Random) -> Changed:
    """Close a station."""
    gone = {s.id for s in _place(changed.timetable, chance)}
    patterns = [_without(p, gone) for p in changed.timetable.patterns]
    return _with_patterns(changed, patterns, f"closed {sorted(gone)}")


def rename(changed: Changed, chance: Random) -> Changed:
    """Give a station another name, as unlike as names are."""
    name = _name(chance)
    stops = _place(changed.timetable, chance)
    fresh = [replace(s, name=name) for s in stops]
    return _with_stops(changed, fresh, f"renamed {[s.id for s in stops]} to {name}")


def move(changed: Changed, chance: Random) -> Changed:
    """Move a station by 30 to 150 m."""
    stops = _place(changed.timetable, chance)
    length, angle = chance.uniform(30.0, 150.0), chance.uniform(0.0, 2.0 * math.pi)
    fresh = [_shifted(s, length, angle) for s in stops]
    return _with_stops(changed, fresh, f"moved {[s.id for s in stops]} by {length:.0f} m")


def _shifted(stop: Stop, length: float, angle: float) -> Stop:
    if stop.lon is None or stop.lat is None:
        return stop
    shrink = math.cos(math.radians(stop.lat))
    return replace(
        stop,
        lon=stop.lon + length * math.cos(angle) / _METERS_PER_DEGREE / shrink,
        lat=stop.lat + length * math.sin(angle) / _METERS_PER_DEGREE,
    )


def _new_stop(near: Stop, other: Stop, share: float, aside: float, chance: Random) -> Stop:
    """Make a stop on the way from one to another, or beyond, and aside of it."""
    assert None not in (near.lon, near.lat, other.lon, other.lat)
    dx, dy = other.lon - near.lon, other.lat - near.lat
    return Stop(
        id=f"new{chance.randrange(10**9)}",
        name=_name(chance),
        code="",
        lon=near.lon + share * dx - aside * dy,
        lat=near.lat + share * dy + aside * dx,
        location_type=0,
        parent_id=None,
        boarding="unknown",
    )


def _step(changed: Changed, chance: Random) -> tuple[str, str, str]:
    """Choose a route and two places that it calls at one after the other."""
    pattern = chance.choice(changed.timetable.patterns)
    i = chance.randrange(len(pattern.stop_ids) - 1)
    return pattern.route_id, pattern.stop_ids[i], pattern.stop_ids[i + 1]


def _tops(changed: Changed) -> dict[str, str]:
    """Per stop what riders take for the place: its parent, or its name."""
    return {s.id: s.parent_id or s.name for s in changed.timetable.stops}


def open_between(changed: Changed, chance: Random) -> Changed:
    """Open a station on a step of a route, for both directions."""
    route, a, b = _step(changed, chance)
    stop = {s.id: s for s in changed.timetable.stops}
    fresh = _new_stop(stop[a], stop[b], 0.5, chance.uniform(-0.1, 0.1), chance)
    patterns = [
        _inserted(p, (a, b), fresh.id, _tops(changed)) if p.route_id == route else p
        for p in changed.timetable.patterns
    ]
    return _with_stops(
        _with_patterns(changed, patterns, f"opened {fresh.id} between {a} and {b}"), [fresh], "…"
    )


def _inserted(pattern: Pattern, step: tuple[str, str], fresh: str, tops: Ids) -> Pattern:
    wanted = {tops[s] for s in step}
    for i, pair in enumerate(itertools.pairwise(pattern.stop_ids)):
        if {tops.get(s, s) for s in pair} == wanted:
            stops, times = list(pattern.stop_ids), list(pattern.offsets_s)
            stops.insert(i + 1, fresh)
            times.insert(i + 1, (times[i] + times[i + 1]) // 2)
            return replace(pattern, stop_ids=tuple(stops), offsets_s=tuple(times))
    return pattern


def reroute(changed: Changed, chance: Random) -> Changed:
    """Let a route call at a new station aside instead of one of its own."""
    pattern = chance.choice([p for p in changed.timetable.patterns if len(p.stop_ids) > 2])
    i = chance.randrange(1, len(pattern.stop_ids) - 1)
    stop = {s.id: s for s in changed.timetable.stops}
    fresh = _new_stop(
        stop[pattern.stop_ids[i - 1]], stop[pattern.stop_ids[i + 1]], 0.5, 0.6, chance
    )
    tops = _tops(changed)
    gone = tops[pattern.stop_ids[i]]
    patterns = [
        replace(p, stop_ids=tuple(fresh.id if tops[s] == gone else s for s in p.stop_ids))
        if p.route_id == pattern.route_id
        else p
        for p in changed.timetable.patterns
    ]
    what = f"rerouted {pattern.route_id} from {pattern.stop_ids[i]} to {fresh.id}"
    return _with_stops(_with_patterns(changed, patterns, what), [fresh], "…")


def extend(changed: Changed, chance: Random) -> Changed:
    """Extend a route by two stations, for both directions."""
    pattern = chance.choice(changed.timetable.patterns)
    stop = {s.id: s for s in changed.timetable.stops}
    a, b = pattern.stop_ids[-2:]
    fresh = [_new_stop(stop[a], stop[b], share, 0.1, chance) for share in (2.0, 3.0)]
    tops = _tops(changed)
    end = tops[b]
    patterns = []
    for p in changed.timetable.patterns:
        ids, times = p.stop_ids, p.offsets_s
        if p.route_id == pattern.route_id and tops[ids[-1]] == end:
            ids = (*ids, *(s.id for s in fresh))
            times = (*times, times[-1] + 120, times[-1] + 240)
        elif p.route_id == pattern.route_id and tops[ids[0]] == end:
            ids = (*(s.id for s in reversed(fresh)), *ids)
            times = (0, 120, *(t + 240 for t in times))
        patterns.append(replace(p, stop_ids=ids, offsets_s=times))
    what = f"extended {pattern.route_id} beyond {b}"
    return _with_stops(_with_patterns(changed, patterns, what), fresh, "…")


def new_line(changed: Changed, chance: Random) -> Changed:
    """Begin a line between two places of the network, with new stations on the way."""
    table = changed.timetable
    stop = {s.id: s for s in table.stops}
    pattern = chance.choice([p for p in table.patterns if len(p.stop_ids) > 3])
    route = next(r for r in table.routes if r.id == pattern.route_id)
    others = [p for p in table.patterns if p.route_id != route.id] or list(table.patterns)
    a = stop[chance.choice(pattern.stop_ids)]
    # The nearest stop of another route that is some stations away.
    gap = 3.0 * math.dist(*((stop[s].lon, stop[s].lat) for s in pattern.stop_ids[:2]))
    far = {s for p in others for s in p.stop_ids if _away(a, stop[s]) > gap}
    b = stop[min(sorted(far) or [pattern.stop_ids[0]], key=lambda s: _away(a, stop[s]))]
    fresh = [_new_stop(a, b, share, 0.1, chance) for share in (0.33, 0.67)]
    name = f"N{chance.randrange(1000)}"
    ids = (a.id, *(s.id for s in fresh), b.id)
    twin = replace(route, id=name, short_name=name, long_name=_name(chance))
    there = replace(pattern, route_id=name, stop_ids=ids, offsets_s=(0, 120, 240, 360))
    days = dict(table.operating_days)
    if route.id in days:
        days[name] = days[route.id]
    routes = tuple(sorted((*table.routes, twin), key=lambda r: r.id))
    table = replace(table, routes=routes, operating_days=days)
    what = f"began {name} from {a.id} to {b.id}"
    begun = replace(changed, timetable=table)
    return _with_stops(_with_patterns(begun, (*table.patterns, there), what), fresh, "…")


def _away(a: Stop, b: Stop) -> float:
    assert None not in (a.lon, a.lat, b.lon, b.lat)
    return math.hypot(b.lon - a.lon, b.lat - a.lat)


def withdraw(changed: Changed, chance: Random) -> Changed:
    """Withdraw a route."""
    routes = sorted({p.route_id for p in changed.timetable.patterns})
    if len(routes) < 2:
        return changed
    gone = chance.choice(routes)
    patterns = [p for p in changed.timetable.patterns if p.route_id != gone]
    return _with_patterns(changed, patterns, f"withdrew {gone}")


def rename_route(changed: Changed, chance: Random) -> Changed:
    """Give a route another name."""
    routes = list(changed.timetable.routes)
    i = chance.randrange(len(routes))
    routes[i] = replace(routes[i], short_name=f"X{chance.randrange(1000)}", long_name=_name(chance))
    table = replace(changed.timetable, routes=tuple(routes))
    return replace(changed, timetable=table, done=(*changed.done, f"renamed {routes[i].id}"))


def renumber_some(changed: Changed, chance: Random) -> Changed:
    """Give one place and one route other ids."""
    stops = [s.id for s in _place(changed.timetable, chance)]
    route = chance.choice(changed.timetable.routes).id
    fresh = {s: f"re{chance.randrange(10**9)}" for s in stops}
    return renumbered(changed, fresh, {route: f"re{chance.randrange(10**9)}"})


def renumber_all(changed: Changed, chance: Random) -> Changed:
    """Give all stops and routes ids never seen before, in any order."""
    return renumbered(
        changed,
        _fresh([s.id for s in changed.timetable.stops], "s", chance),
        _fresh([r.id for r in changed.timetable.routes], "r", chance),
    )


def permute_all(changed: Changed, chance: Random) -> Changed:
    """Give all stops and routes each other's ids."""
    stops = [s.id for s in changed.timetable.stops]
    routes = [r.id for r in changed.timetable.routes]
    return renumbered(
        changed,
        dict(zip(stops, chance.sample(stops, len(stops)), strict=True)),
        dict(zip(routes, chance.sample(routes, len(routes)), strict=True)),
    )


def _fresh(ids: list[str], letter: str, chance: Random) -> dict[str, str]:
    numbers = chance.sample(range(10**6), len(ids))
    return {key: f"{letter}{n}" for key, n in zip(ids, numbers, strict=True)}


def renumbered(changed: Changed, stops: Ids, routes: Ids) -> Changed:
    """Give stops and routes other ids, by their ids of now."""
    table = changed.timetable

    def stop_id(key: str) -> str:
        return stops.get(key, key)

    def stop_of(stop: Stop) -> Stop:
        parent = None if stop.parent_id is None else stop_id(stop.parent_id)
        return replace(stop, id=stop_id(stop.id), parent_id=parent)

    def route_of(route: Route) -> Route:
        return replace(route, id=routes.get(route.id, route.id))

    patterns = [
        replace(
            p,
            route_id=routes.get(p.route_id, p.route_id),
            stop_ids=tuple(map(stop_id, p.stop_ids)),
        )
        for p in table.patterns
    ]
    transfers = [
        replace(t, from_stop_id=stop_id(t.from_stop_id), to_stop_id=stop_id(t.to_stop_id))
        for t in table.transfers
    ]
    days = {routes.get(key, key): value for key, value in table.operating_days.items()}
    return Changed(
        replace(
            table,
            stops=tuple(sorted(map(stop_of, table.stops), key=lambda s: s.id)),
            routes=tuple(sorted(map(route_of, table.routes), key=lambda r: r.id)),
            patterns=tuple(patterns),
            transfers=tuple(transfers),
            operating_days=days,
        ),
        {stop_id(new): old for new, old in changed.stops.items()},
        {routes.get(new, new): old for new, old in changed.routes.items()},
        (*changed.done, f"renumbered {len(stops)} stops and {len(routes)} routes"),
    )


CHANGES: tuple[Callable[[Changed, Random], Changed], ...] = (
    close, open_between, rename, move, extend, reroute, renumber_some, withdraw, rename_route,
)  # fmt: skip
"""One change each, as a service change brings."""


@dataclass(frozen=True)
class Truth:
    """Pairs that must be found, and pairs of which nobody can say: either may be."""

    certain: frozenset[tuple[str, str]]
    possible: frozenset[tuple[str, str]]

    def missed(self, found: set[tuple[str, str]]) -> set[tuple[str, str]]:
        """Give the certain pairs that were not found."""
        return set(self.certain - found)

    def wrong(self, found: set[tuple[str, str]]) -> set[tuple[str, str]]:
        """Give the pairs that should not have been found."""
        return found - self.certain - self.possible


def true_stations(old: Network, new: Network, changed: Changed) -> Truth:
    """Pairs of stations that are one: each holds more stops of the other than of any third."""
    old_of = {stop: s.id for s in old.stations for stop in s.stop_ids}
    shared: Counter[tuple[str, str]] = Counter()
    for station in new.stations:
        for stop in station.stop_ids:
            before = old_of.get(changed.stops.get(stop, ""))
            if before is not None:
                shared[before, station.id] += 1
    return _truth(shared)


def true_lines(old: Network, new: Network, changed: Changed) -> Truth:
    """Pairs of lines that are one, likewise by routes."""
    old_of = {route: line.id for line in old.lines for route in line.route_ids}
    shared: Counter[tuple[str, str]] = Counter()
    for line in new.lines:
        for route in line.route_ids:
            before = old_of.get(changed.routes.get(route, ""))
            if before is not None:
                shared[before, line.id] += 1
    return _truth(shared)


def _truth(shared: Counter[tuple[str, str]]) -> Truth:
    best: list[dict[str, set[str]]] = []
    for side in (0, 1):
        groups: dict[str, list[tuple[int, str]]] = defaultdict(list)
        for pair, count in shared.items():
            groups[pair[side]].append((count, pair[1 - side]))
        best.append(
            {key: {other for n, other in rows if n == max(rows)[0]} for key, rows in groups.items()}
        )
    possible = {(a, b) for a, b in shared if b in best[0][a] and a in best[1][b]}
    certain = {(a, b) for a, b in possible if len(best[0][a]) == len(best[1][b]) == 1}
    return Truth(frozenset(certain), frozenset(possible))
