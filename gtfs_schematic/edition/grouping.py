"""Make one line of several, as an adjustment asks."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace

from gtfs_schematic.edition.adjustments import LineGroup
from gtfs_schematic.edition.rebuilt import Draft
from gtfs_schematic.feed.model import Timetable
from gtfs_schematic.network.model import Line, ServicePattern
from gtfs_schematic.network.service import service_of

Pairs = set[tuple[str, str]]


def group_lines(
    draft: Draft, ids: Sequence[str], told: LineGroup, timetable: Timetable | None
) -> None:
    """Make one line of several; it has the least id, and the first one's name and color.

    Parameters
    ----------
    draft
        Is altered.
    ids
        The lines, at least two.
    told
        Name and colors of the whole.
    timetable
        What the network was built from: how often the whole runs. Without it the headway of the
        whole is unknown.
    """
    some = [draft.lines[key] for key in ids]
    whole = min(ids)
    first = some[0]
    name = told.name or first.name
    joined = replace(
        first,
        id=whole,
        name=name,
        long_name="" if told.name else first.long_name,
        color=(told.color or first.color).upper(),
        text_color=(told.text_color or first.text_color).upper(),
        color_from_feed=first.color_from_feed or told.color is not None,
        route_ids=tuple(sorted({route for line in some for route in line.route_ids})),
        one_way_links=tuple(sorted(_one_way(some))),
        part_service=tuple(_part_service(some)),
        sort_order=min((k.sort_order for k in some if k.sort_order is not None), default=None),
    )
    ways = tuple(itertools.chain.from_iterable(draft.ways[key] for key in ids))
    for key in ids:
        del draft.lines[key], draft.ways[key]
    draft.lines[whole] = _served(joined, some, draft, timetable)
    draft.ways[whole] = ways
    draft.line_became |= dict.fromkeys(ids, whole)


def _served(line: Line, some: Sequence[Line], draft: Draft, timetable: Timetable | None) -> Line:
    """Say when and how often the whole runs."""
    if timetable is None:
        return replace(
            line,
            trips=sum(k.trips for k in some),
            first_departure_s=min(k.first_departure_s for k in some),
            last_departure_s=max(k.last_departure_s for k in some),
            headway_s=None,
            periods=(),
        )
    routes = set(line.route_ids)
    days = timetable.operating_days
    service = service_of(
        [pattern for pattern in timetable.patterns if pattern.route_id in routes],
        frozenset[int]().union(*(days.get(route, ()) for route in line.route_ids)),
        frozenset[int]().union(*days.values()),
        {stop: s.id for s in draft.stations.values() for stop in s.stop_ids},
    )
    return replace(
        line,
        service=service.pattern,
        trips=service.trips,
        first_departure_s=service.first_s,
        last_departure_s=service.last_s,
        headway_s=service.headway_s,
        periods=service.periods,
    )


def _runs(line: Line) -> Pairs:
    """Give the steps that a line runs, in the directions in which it runs them."""
    steps = {pair for course in line.courses for pair in itertools.pairwise(course)}
    both = steps | {(b, a) for a, b in steps}
    return both - {(b, a) for a, b in line.one_way_links}


def _one_way(some: Iterable[Line]) -> Pairs:
    """Give the steps that no line runs the other way."""
    every = set[tuple[str, str]]().union(*map(_runs, some))
    return {(a, b) for a, b in every if (b, a) not in every}


def _part_service(some: Sequence[Line]) -> Iterable[tuple[str, str, ServicePattern]]:
    """Keep what holds of every line on a link."""
    said: Mapping[tuple[str, str], list[ServicePattern]] = defaultdict(list)
    runs: Mapping[tuple[str, str], int] = defaultdict(int)
    for line in some:
        for a, b, service in line.part_service:
            said[a, b].append(service)
        for pair in {(min(step), max(step)) for step in _runs(line)}:
            runs[pair] += 1  # type: ignore[index]
    for pair in sorted(said):
        if len(said[pair]) == runs[pair] and len(set(said[pair])) == 1:
            yield (*pair, said[pair][0])
