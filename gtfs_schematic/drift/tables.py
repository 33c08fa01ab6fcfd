"""The tables of the drift page: sortable, and each row shows what it speaks of on the picture."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from html import escape

from gtfs_schematic.drift.cells import Column, Shown, number, row, size, table
from gtfs_schematic.drift.model import (
    CompetingRoutes,
    DriftReport,
    Itinerary,
    Journey,
    Leg,
    LinkDrift,
    MisleadingPair,
    StationDrift,
)
from gtfs_schematic.drift.placed import Diagram
from gtfs_schematic.drift.verdict import kilometres, names_of, wind

Names = Mapping[str, str]


def tables(report: DriftReport, diagram: Diagram, unit: str) -> str:
    """Write all tables, those that mislead riders first; `unit` is that of drawn lengths."""
    names = names_of(report)
    lines = {line.id: line.name for line in diagram.lines}
    return "".join(
        (
            _journeys(report, names, lines),
            _false_neighbors(report, names),
            _hidden_walks(report, names),
            _competing(report.competing, names),
            _stations(report.stations),
            _links(report.links, diagram, names, unit),
        )
    )


def _stations(stations: Sequence[StationDrift]) -> str:
    ranked = sorted(enumerate(stations), key=lambda s: (-s[1].displacement_m, s[1].station_id))
    rows = [
        row(
            Shown(
                s.name,
                (s.station_id,),
                say=f"{s.name} is drawn {kilometres(s.displacement_m)} to the "
                f"{wind(s.direction_deg)} of its true place.",
                key=f"station-{i}",
            ),
            (
                number(s.displacement_m, 0),
                number(100.0 * s.displacement_share, 1),
                f"<td>{wind(s.direction_deg)}</td>",
                number(s.local_scale, 2),
                size(s.local_rotation_deg, 0),
            ),
        )
        for i, s in ranked
    ]
    columns = (
        Column("Station"),
        Column("Displaced, m", numbers=True, falling=True),
        Column("% of diagonal", numbers=True, falling=True),
        Column("Towards"),
        Column("Local scale", numbers=True, falling=True),
        Column("Local turn, °", numbers=True, falling=True),
    )
    about = (
        "Displacement: from where a true map of the same size has the station to where it is "
        "drawn. Local scale (1 is as everywhere) and turn (clockwise) of the best affine map of "
        "the surroundings."
    )
    return table("stations", "Stations", columns, rows, about=about)


def _links(links: Sequence[LinkDrift], diagram: Diagram, names: Names, unit: str) -> str:
    lines = {line.id: line.name for line in diagram.lines}
    carried = {link.id: link.lines for link in diagram.links}
    ranked = sorted(links, key=lambda k: (-abs(k.bearing_change_deg or 0.0), k.link_id))
    rows = [
        row(
            Shown(
                f"{names[k.start]} – {names[k.end]}",
                (k.start, k.end),
                ((k.start, k.end),),
                say=f"{names[k.start]} – {names[k.end]}: "
                f"{kilometres(k.true_length_m)} on the ground, turned by "
                f"{abs(k.bearing_change_deg or 0.0):.0f}°.",
            ),
            (
                f"<td>{escape(', '.join(lines[key] for key in carried.get(k.link_id, ())))}</td>",
                size(k.bearing_change_deg, 1),
                number(k.length_ratio, 2),
                number(k.true_length_m, 0),
                number(k.drawn_length_mm, 1),
            ),
        )
        for k in ranked
    ]
    columns = (
        Column("Link"),
        Column("Lines"),
        Column("Turn, °", numbers=True, falling=True),
        Column("Length ratio", numbers=True, falling=True),
        Column("True, m", numbers=True, falling=True),
        Column(f"Drawn, {unit}", numbers=True, falling=True),
    )
    about = (
        "Turn: drawn against true bearing, clockwise. Length ratio: drawn over true length, "
        "against that of the median link; 2 is drawn twice as long as usual."
    )
    return table("links", "Links", columns, rows, about=about)


def _false_neighbors(report: DriftReport, names: Names) -> str:
    told = report.settings
    about = (
        f"Drawn within {told.false_near_links:g} typical links of each other, without a link or "
        f"walk between them, yet over {told.false_far_m:g} m apart. Most departures first."
    )
    return _pairs("false-neighbors", "False neighbors", report.false_neighbors, names, about)


def _hidden_walks(report: DriftReport, names: Names) -> str:
    told = report.settings
    about = (
        f"At most {told.hidden_near_m:g} m apart in a straight line, yet drawn over "
        f"{told.hidden_far_links:g} typical links apart. Whether there is a way on foot, no feed "
        "says: go and look. Most departures first."
    )
    return _pairs("hidden-walks", "Hidden walks", report.hidden_walks, names, about)


def _pairs(key: str, title: str, pairs: Sequence[MisleadingPair], names: Names, about: str) -> str:
    rows = [
        row(
            Shown(
                f"{names[p.start]} – {names[p.end]}",
                (p.start, p.end),
                say=f"{names[p.start]} and {names[p.end]}: {kilometres(p.true_m)} apart, drawn "
                f"{p.drawn_links:.1f} typical links apart.",
            ),
            (
                number(p.true_m, 0),
                number(p.drawn_links, 2),
                number(p.departures, 0),
            ),
        )
        for p in pairs
    ]
    columns = (
        Column("Stations"),
        Column("True, m", numbers=True, falling=True),
        Column("Drawn, links", numbers=True, falling=True),
        Column("Departures", numbers=True, falling=True),
    )
    return table(key, title, columns, rows, about=about)


def _journeys(report: DriftReport, names: Names, lines: Names) -> str:
    journeys = report.journeys
    worst = journeys.worst if journeys else ()
    rows = [_journey(journey, names, lines) for journey in worst]
    columns = (
        Column("From – to"),
        Column("Ratio", numbers=True, falling=True),
        Column("Longer, min", numbers=True, falling=True),
        Column("Both ways", wide=True),
    )
    about = (
        f"The worst of {journeys.pairs:,} journeys. Marked: the way that looks shortest in broad "
        "orange, the fastest in dashed magenta."
        if journeys
        else "Not measured: the data of this diagram holds no timetable. Draw it again from its "
        "feed."
    )
    return table("journeys", "Misleading journeys", columns, rows, about=about)


def _journey(journey: Journey, names: Names, lines: Names) -> str:
    seen, fast = journey.looks_shortest, journey.fastest
    longer = (seen.time_s - fast.time_s) / 60.0
    name = f"{names[journey.start]} – {names[journey.end]}"
    ways = (
        f'<td class="ways"><b>Looks shortest</b> ({seen.time_s / 60.0:.0f} min): '
        f"{escape(_spelled(seen, names, lines))}<br><b>Fastest</b> ({fast.time_s / 60.0:.0f} min): "
        f"{escape(_spelled(fast, names, lines))}</td>"
    )
    shown = Shown(
        name,
        (journey.start, journey.end),
        (_passed(seen), _passed(fast)),
        say=f"{name}. Looks shortest: {_spelled(seen, names, lines)}. "
        f"Fastest: {_spelled(fast, names, lines)}. {longer:.0f} minutes between them.",
    )
    return row(shown, (number(journey.ratio, 2), number(longer, 0), ways))


def _passed(itinerary: Itinerary) -> list[str]:
    """Give all stations on the way, changes once."""
    passed: list[str] = []
    for leg in itinerary.legs:
        passed += leg.stations[1:] if passed else leg.stations
    return passed


def _spelled(itinerary: Itinerary, names: Names, lines: Names) -> str:
    return ", ".join(_leg(leg, names, lines) for leg in itinerary.legs)


def _leg(leg: Leg, names: Names, lines: Names) -> str:
    way = f"line {lines[leg.line]}" if leg.line else "on foot"
    return f"{way} to {names[leg.stations[-1]]}"


def _competing(routes: Sequence[CompetingRoutes], names: Names) -> str:
    rows = [
        row(
            Shown(
                f"{names[r.first[0]]} – {names[r.first[-1]]}",
                (r.first[0], r.first[-1]),
                (r.first, r.second),
                say=f"{names[r.first[0]]} – {names[r.first[-1]]}: {_way(r.second, names)} "
                f"is drawn {abs(100.0 * r.difference):.0f} % too "
                f"{'long' if r.difference > 0.0 else 'short'} against "
                f"{_way(r.first, names)}.",
            ),
            (
                size(100.0 * r.difference, 0),
                number(r.true_m[1] / r.true_m[0], 2),
                number(r.drawn_mm[1] / r.drawn_mm[0], 2),
                (
                    f'<td class="ways">{escape(_way(r.first, names))}, or '
                    f"{escape(_way(r.second, names))}</td>"
                ),
            ),
        )
        for r in routes
    ]
    columns = (
        Column("From – to"),
        Column("Looks longer by, %", numbers=True, falling=True),
        Column("True ratio", numbers=True, falling=True),
        Column("Drawn ratio", numbers=True, falling=True),
        Column("Ways", wide=True),
    )
    about = (
        "Two ways without a station in common, each with at most one change. Ratio: length of "
        "the second over that of the first. Marked: the first in broad orange, the second in "
        "dashed magenta."
    )
    return table("competing-routes", "Competing routes", columns, rows, about=about)


def _way(way: Sequence[str], names: Names) -> str:
    return f"the way via {names[way[len(way) // 2]]}" if len(way) > 2 else "the direct way"
