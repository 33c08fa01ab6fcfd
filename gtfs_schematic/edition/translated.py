"""Give adjustments by other ids of the same stations, lines and stops."""

from __future__ import annotations

from collections.abc import Callable, Mapping

from gtfs_schematic.edition.adjustments import (
    Adjustments,
    LineGroup,
    LinkAdjustment,
    Merge,
    Part,
    Split,
    StationAdjustment,
)

Renamed = Callable[[str], str]


def translated(
    adjustments: Adjustments,
    stations: Mapping[str, str],
    lines: Mapping[str, str],
    stops: Mapping[str, str] | None = None,
) -> Adjustments:
    """Give adjustments by other ids of the same things.

    Parameters
    ----------
    adjustments
        As a person wrote them.
    stations, lines
        Other ids by those that stand there; what is in neither keeps its own.
    stops
        The same of the stops by which stations are split.
    """
    of_stops = stops or {}

    def station(key: str) -> str:
        return stations.get(key, key)

    def line(key: str) -> str:
        return lines.get(key, key)

    def stop(key: str) -> str:
        return of_stops.get(key, key)

    return adjustments.model_copy(
        update={
            "stations": {
                station(k): _station(v, station, line) for k, v in adjustments.stations.items()
            },
            "lines": {line(k): v for k, v in adjustments.lines.items()},
            "links": tuple(_link(each, station, line) for each in adjustments.links),
            "group": tuple(_group(each, line) for each in adjustments.group),
            "merge": tuple(_merge(each, station) for each in adjustments.merge),
            "split": tuple(_split(each, station, stop) for each in adjustments.split),
        }
    )


def _station(told: StationAdjustment, station: Renamed, line: Renamed) -> StationAdjustment:
    update: dict[str, object] = {}
    if told.pin_from is not None:
        other = {"station": station(told.pin_from.station)}
        update["pin_from"] = told.pin_from.model_copy(update=other)
    if told.straight:
        update["straight"] = tuple(map(line, told.straight))
    return told.model_copy(update=update) if update else told


def _link(told: LinkAdjustment, station: Renamed, line: Renamed) -> LinkAdjustment:
    first, second = map(station, told.between)
    update: dict[str, object] = {"between": (first, second)}
    if told.order:
        update["order"] = tuple(map(line, told.order))
    return told.model_copy(update=update)


def _group(told: LineGroup, line: Renamed) -> LineGroup:
    return told.model_copy(update={"lines": tuple(map(line, told.lines))})


def _merge(told: Merge, station: Renamed) -> Merge:
    return told.model_copy(update={"stations": tuple(map(station, told.stations))})


def _split(told: Split, station: Renamed, stop: Renamed) -> Split:
    parts = tuple(_part(part, stop) for part in told.parts)
    return told.model_copy(update={"station": station(told.station), "parts": parts})


def _part(part: Part, stop: Renamed) -> Part:
    """Give a part by other stops; it keeps the id that it had."""
    stops = tuple(map(stop, part.stops))
    key = part.id or min(part.stops)
    return part.model_copy(update={"stops": stops, "id": key if key != min(stops) else ""})
