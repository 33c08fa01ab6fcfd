"""Split a station into several by its stops, as an adjustment asks."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import replace
from statistics import fmean

from gtfs_schematic.edition.adjustments import Part
from gtfs_schematic.edition.rebuilt import Draft
from gtfs_schematic.feed.model import Stop, Timetable
from gtfs_schematic.network.model import Station


def split_station(
    draft: Draft, key: str, parts: Sequence[Part], timetable: Timetable | None
) -> list[str]:
    """Split a station; each line calls at the part at whose stops most of its trips call.

    The first part keeps the station's id, its walks, and what no other part asks for. A part
    stands in the middle of its stops.

    Parameters
    ----------
    draft
        Is altered.
    key
        The station's id.
    parts
        Its parts.
    timetable
        What the network was built from.

    Returns
    -------
    list[str]
        Why the station could not be split as asked; empty if it was.
    """
    if timetable is None:
        return ["without a timetable no station can be split"]
    station = draft.stations[key]
    strange = [stop for p in parts for stop in p.stops if stop not in station.stop_ids]
    if strange:
        return [f"stop {stop} is not one of the station's" for stop in strange]
    owner = {stop: i for i, part in enumerate(parts) for stop in part.stops}
    members: list[list[str]] = [
        [stop for stop in station.stop_ids if owner.get(stop, 0) == i] for i in range(len(parts))
    ]
    calls = _calls(timetable, station, owner)
    part_of = {}
    for line in draft.lines.values():
        trips = [sum(calls[route, i] for route in line.route_ids) for i in range(len(parts))]
        part_of[line.id] = trips.index(max(trips))
    ids = [key]
    for part in parts[1:]:
        fresh = part.id or min(part.stops)
        while fresh in draft.stations:
            fresh += "+"
        ids.append(fresh)
    stops = {stop.id: stop for stop in timetable.stops}
    for fresh, part, own in zip(ids, parts, members, strict=True):
        draft.stations[fresh] = _part(station, fresh, part, [stops[s] for s in own if s in stops])
    for line_id, ways in draft.ways.items():
        mine = ids[part_of[line_id]]
        draft.ways[line_id] = tuple(
            (_exchanged(itinerary, key, mine), _exchanged(course, key, mine))
            for itinerary, course in ways
        )
    return []


def _calls(
    timetable: Timetable, station: Station, owner: Mapping[str, int]
) -> Counter[tuple[str, int]]:
    """Count calls by route and part."""
    own = set(station.stop_ids)
    calls: Counter[tuple[str, int]] = Counter()
    for pattern in timetable.patterns:
        for stop in pattern.stop_ids:
            if stop in own:
                calls[pattern.route_id, owner.get(stop, 0)] += len(pattern.departures_s)
    return calls


def _part(station: Station, key: str, part: Part, stops: Sequence[Stop]) -> Station:
    placed = [(s.lon, s.lat) for s in stops if s.lon is not None and s.lat is not None]
    name = part.name or next((s.name for s in stops if s.name), station.name)
    same = name == station.name
    return replace(
        station,
        id=key,
        name=name,
        second_name=station.second_name if same else "",
        stop_ids=tuple(sorted(s.id for s in stops)) or part.stops,
        lon=round(fmean(x for x, _ in placed), 7) if placed else station.lon,
        lat=round(fmean(y for _, y in placed), 7) if placed else station.lat,
        merge_reason="",
        merge_confidence=1.0,
    )


def _exchanged(ids: tuple[str, ...], old: str, new: str) -> tuple[str, ...]:
    return tuple(new if key == old else key for key in ids)
