"""The truth about the service change: every difference between the two demo feeds, by kind."""

from __future__ import annotations

import json
import math
from typing import Any

from gtfs_schematic.demo import region as change
from gtfs_schematic.demo.ground import lon_lat
from gtfs_schematic.demo.lines import Line
from gtfs_schematic.demo.places import Place
from gtfs_schematic.demo.region import AFTER, BEFORE, Region
from gtfs_schematic.demo.stops import platform_ids, top_ids

Record = dict[str, Any]

_OLD, _NEW = BEFORE.place(), AFTER.place()


def _line(region: Region, key: str) -> Line:
    return next(line for line in region.lines if line.key == key)


def _station(place: Place, **more: object) -> Record:
    return {"name": place.name, "stop_ids": list(top_ids(place)), **more}


def _route(line: Line, **more: object) -> Record:
    return {"route_id": line.key, "name": line.name, **more}


def _only_here(keys: tuple[str, ...], region: Region) -> list[Place]:
    """Give the places of `keys` at which no line of `region` calls."""
    served = {place.key for place in region.served()}
    places = {**_OLD, **_NEW}
    return [places[key] for key in keys if key not in served]


def _stations() -> Record:
    withdrawn = _line(BEFORE, change.WITHDRAWN).runs[0].calls
    moved = {"meters": math.hypot(change.MOVED_EAST, change.MOVED_NORTH)}
    for word, place in (("old", _OLD[change.MOVED]), ("new", _NEW[change.MOVED])):
        moved[f"{word}_lon"], moved[f"{word}_lat"] = lon_lat(place.east, place.north)
    renumbered = {
        "name": _OLD[change.RENUMBERED].name,
        "old_stop_ids": list(top_ids(_OLD[change.RENUMBERED])),
        "new_stop_ids": list(top_ids(_NEW[change.RENUMBERED])),
    }
    renamed = {
        "stop_ids": list(top_ids(_OLD[change.RENAMED])),
        "old_name": _OLD[change.RENAMED].name,
        "new_name": change.NEW_NAME,
    }
    return {
        "closed": [
            _station(_OLD[change.CLOSED], because="station closed"),
            *(_station(p, because="line withdrawn") for p in _only_here(withdrawn, AFTER)),
        ],
        "opened": [
            *(_station(_NEW[key], because="line extended") for key in change.EXTENSION),
            *(
                _station(place, because="line new")
                for place in _only_here(change.NEW_LINE.runs[0].calls, BEFORE)
            ),
        ],
        "renamed": [renamed],
        "renumbered": [renumbered],
        "moved": [_station(_OLD[change.MOVED], **moved)],
    }


def _lines() -> Record:
    extended = _line(AFTER, change.EXTENDED)
    old_end = _OLD[_line(BEFORE, change.EXTENDED).runs[0].calls[0]]
    old_route = _line(BEFORE, change.REROUTED).runs[0].calls
    new_route = _line(AFTER, change.REROUTED).runs[0].calls
    via = [key for key in new_route if key not in old_route]
    at = new_route.index(via[0])
    added = [stop for key in change.EXTENSION for stop in top_ids(_NEW[key])]
    return {
        "withdrawn": [_route(_line(BEFORE, change.WITHDRAWN))],
        "new": [_route(change.NEW_LINE)],
        "extended": [
            _route(
                extended,
                old_terminus_stop_ids=list(top_ids(old_end)),
                new_terminus_stop_ids=list(top_ids(_NEW[extended.runs[0].calls[0]])),
                added_stop_ids=added,
                old_long_name=_line(BEFORE, change.EXTENDED).long_name,
                new_long_name=extended.long_name,
            )
        ],
        "rerouted": [
            _route(
                _line(AFTER, change.REROUTED),
                between_stop_ids=[
                    *top_ids(_NEW[new_route[at - 1]]),
                    *top_ids(_NEW[new_route[at + len(via)]]),
                ],
                added_stop_ids=[stop for key in via for stop in top_ids(_NEW[key])],
                removed_stop_ids=[],
            )
        ],
        "calls_dropped": [
            _route(line, stop_ids=list(top_ids(_OLD[change.CLOSED])))
            for line in BEFORE.lines
            if any(change.CLOSED in run.calls for run in line.runs)
        ],
    }


def _platforms() -> Record:
    """Give platforms that come or go at stations that both feeds have."""
    old, new = platform_ids(BEFORE), platform_ids(AFTER)
    both = sorted(old.keys() & new.keys())
    return {
        "opened": sorted(stop for key in both for stop in {*new[key]} - {*old[key]}),
        "closed": sorted(stop for key in both for stop in {*old[key]} - {*new[key]}),
    }


def _feed(name: str, region: Region) -> Record:
    return {
        "file": name,
        "feed_version": region.version,
        "feed_start_date": region.start_date,
        "feed_end_date": region.end_date,
        "holiday": region.holiday,
    }


def truth() -> bytes:
    """Give the differences as JSON.

    Stations are named by those of their stop ids that have no parent, lines by their route id;
    a station "closed" or "opened" says because of what. A platform is listed only if its
    station is in both feeds.
    """
    record = {
        "before": _feed("before.zip", BEFORE),
        "after": _feed("after.zip", AFTER),
        "lines": _lines(),
        "stations": _stations(),
        "platforms": _platforms(),
    }
    return (json.dumps(record, ensure_ascii=False, indent=2) + "\n").encode()
