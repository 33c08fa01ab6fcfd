"""Describe every line: its name, color, itineraries and service."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from gtfs_schematic.feed.model import Finding, Pattern, Route, Timetable
from gtfs_schematic.network.colors import contrast, generated_colors, is_usable, text_color_on
from gtfs_schematic.network.lines import name_of
from gtfs_schematic.network.model import Line, ServicePattern, Station
from gtfs_schematic.network.patterns import Ids, one_way_links
from gtfs_schematic.network.service import pattern_of, service_of

_DOUBTFUL = 0.75
"""Merges that are less sure than this are listed for a person to look at."""
_VISIBLE = 3.0
"""Least contrast of graphics that matter with the paper (WCAG 2.2, 1.4.11)."""


Run = tuple[Ids, tuple[int, ...]]
"""The course of a kept pattern, as it is run, and its first departures in seconds."""


@dataclass(frozen=True)
class Known:
    """What the feed says of lines."""

    timetable: Timetable
    groups: Mapping[str, Sequence[Route]]
    """Per line id its routes."""
    site_of: Mapping[str, str]
    """Per stop id its station."""


def described_lines(
    known: Known,
    ways: Mapping[str, Sequence[tuple[Ids, Ids]]],
    runs: Mapping[str, Sequence[Run]],
) -> tuple[Line, ...]:
    """Make the lines of a network, sorted by id.

    Parameters
    ----------
    known
        For departures, operating days and routes.
    ways
        Per line id its (itinerary, course) pairs; other lines are not made.
    runs
        Per line id its kept patterns.
    """
    groups, days = known.groups, known.timetable.operating_days
    patterns: dict[str, list[Pattern]] = defaultdict(list)
    for pattern in known.timetable.patterns:
        patterns[pattern.route_id].append(pattern)
    main = {line_id: _main_route(groups[line_id], patterns) for line_id in sorted(ways)}
    own = {key: r.color for key, r in main.items() if r.color and is_usable(r.color)}
    colors = own | dict(generated_colors([key for key in main if key not in own], own.values()))
    all_days = frozenset[int]().union(*days.values())
    lines = []
    for line_id, pairs in sorted(ways.items()):
        group = groups[line_id]
        own_days = frozenset[int]().union(*(days.get(route.id, ()) for route in group))
        service = service_of(
            [pattern for route in group for pattern in patterns[route.id]],
            own_days,
            all_days,
            known.site_of,
        )
        wanted = main[line_id].text_color if line_id in own else None
        orders = [route.sort_order for route in group if route.sort_order is not None]
        lines.append(
            Line(
                id=line_id,
                name=name_of(group),
                long_name=main[line_id].long_name,
                color=colors[line_id],
                text_color=text_color_on(colors[line_id], wanted),
                color_from_feed=line_id in own,
                mode=group[0].mode,
                route_ids=tuple(sorted(route.id for route in group)),
                itineraries=tuple(itinerary for itinerary, _ in pairs),
                courses=tuple(course for _, course in pairs),
                trips=service.trips,
                service=service.pattern,
                first_departure_s=service.first_s,
                last_departure_s=service.last_s,
                headway_s=service.headway_s,
                one_way_links=one_way_links(course for course, _ in runs[line_id]),
                periods=service.periods,
                part_service=_part_service(runs[line_id], service.pattern),
                sort_order=min(orders, default=None),
            )
        )
    return tuple(lines)


def _part_service(
    runs: Iterable[Run], whole: ServicePattern
) -> tuple[tuple[str, str, ServicePattern], ...]:
    """Give the links on which a line runs in the peak or at night only, unless all of it does."""
    departures: dict[tuple[str, str], list[int]] = defaultdict(list)
    for course, times in runs:
        for a, b in {(min(step), max(step)) for step in itertools.pairwise(course)}:
            departures[a, b].extend(times)
    found = ((a, b, pattern_of(times, (), ())) for (a, b), times in sorted(departures.items()))
    return tuple(
        (a, b, pattern)
        for a, b, pattern in found
        if pattern in ("peak", "night") and pattern != whole
    )


def color_findings(lines: Sequence[Line]) -> tuple[Finding, ...]:
    """Name the colors that were chosen here, and those of the feed that are hard to see."""
    findings = []
    for line in lines:
        ratio = contrast(line.color, "#FFFFFF")
        if not line.color_from_feed:
            message = f"line {line.name} has no color that shows on white; {line.color} was chosen"
            findings.append(Finding("info", "routes.txt", message, field="route_color"))
        elif ratio < _VISIBLE:
            message = f"line {line.name} is pale: contrast {ratio:.2f}:1 on white, 3:1 is wanted"
            findings.append(
                Finding("warning", "routes.txt", message, field="route_color", value=line.color)
            )
    return tuple(findings)


def merge_findings(stations: Iterable[Station]) -> tuple[Finding, ...]:
    """Name the stations of which it is doubtful that riders take them for one place."""
    return tuple(
        Finding(
            "info",
            "stops.txt",
            f"station {station.name} may be several places (confidence "
            f"{station.merge_confidence:.2f}): {station.merge_reason}",
            field="stop_name",
            value=station.id,
        )
        for station in stations
        if station.merge_confidence < _DOUBTFUL
    )


def _main_route(group: Sequence[Route], patterns: Mapping[str, Sequence[Pattern]]) -> Route:
    """Give the route with most trips, of which the line has its color and long name."""

    def trips(route: Route) -> int:
        return sum(len(pattern.departures_s) for pattern in patterns[route.id])

    return min(group, key=lambda route: (-trips(route), route.id))
