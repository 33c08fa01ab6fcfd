"""Describe every line: its name, color, itineraries and service."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence

from gtfs_schematic.feed.model import Finding, Pattern, Route, Timetable
from gtfs_schematic.network.colors import contrast, generated_colors, is_usable, text_color_on
from gtfs_schematic.network.lines import name_of
from gtfs_schematic.network.model import Line, Station
from gtfs_schematic.network.patterns import Ids, one_way_links
from gtfs_schematic.network.service import service_of

_DOUBTFUL = 0.75
"""Merges that are less sure than this are listed for a person to look at."""
_VISIBLE = 3.0
"""Least contrast of graphics that matter with the paper (WCAG 2.2, 1.4.11)."""


def described_lines(
    timetable: Timetable,
    groups: Mapping[str, Sequence[Route]],
    ways: Mapping[str, Sequence[tuple[Ids, Ids]]],
    runs: Mapping[str, Sequence[Ids]],
) -> tuple[Line, ...]:
    """Make the lines of a network, sorted by id.

    Parameters
    ----------
    timetable
        For departures and operating days.
    groups
        Per line id its routes.
    ways
        Per line id its (itinerary, course) pairs; other lines are not made.
    runs
        Per line id the courses of its kept patterns, as they are run.
    """
    patterns: dict[str, list[Pattern]] = defaultdict(list)
    for pattern in timetable.patterns:
        patterns[pattern.route_id].append(pattern)
    main = {line_id: _main_route(groups[line_id], patterns) for line_id in sorted(ways)}
    own = {
        key: route.color for key, route in main.items() if route.color and is_usable(route.color)
    }
    colors = own | dict(generated_colors([key for key in main if key not in own], own.values()))
    days = timetable.operating_days
    all_days = frozenset[int]().union(*days.values())
    lines = []
    for line_id, pairs in sorted(ways.items()):
        group = groups[line_id]
        own_days = frozenset[int]().union(*(days.get(route.id, ()) for route in group))
        service = service_of(
            [pattern for route in group for pattern in patterns[route.id]], own_days, all_days
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
                one_way_links=one_way_links(runs[line_id]),
                sort_order=min(orders, default=None),
            )
        )
    return tuple(lines)


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
