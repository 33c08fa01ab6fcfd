"""The faults in a timetable, looked for on every build and without the code that made it."""

from __future__ import annotations

import datetime as dt
import itertools
import math
import re
from collections.abc import Iterable, Iterator

from gtfs_schematic.feed.model import Pattern, Stop, Timetable

_MODES = set(
    "tram metro rail bus ferry cable aerial funicular trolleybus monorail other".split()  # noqa: SIM905 - reads better
)


def faults(timetable: Timetable) -> tuple[str, ...]:
    """List what is wrong in a timetable, one sentence each; empty if nothing is.

    Looked at: ids are there once and sorted; whatever is named exists; every stop has a place on
    Earth and is called at or stands above one that is; parents are top stations; patterns have
    two calls or more, departures in order, times that never run back; colors, modes, dates and
    the fingerprint are well formed; what is drawn is not listed as left out.
    """
    return tuple(
        fault
        for look in (_info, _order, _stops, _routes, _patterns, _transfers, _shapes, _left_out)
        for fault in look(timetable)
    )


def _info(timetable: Timetable) -> Iterator[str]:
    info = timetable.info
    if not re.fullmatch("[0-9a-f]{64}", info.sha256):
        yield f"fingerprint {info.sha256!r} is no SHA-256"
    for name in ("start_date", "end_date", "service_date"):
        text = getattr(info, name)
        try:
            written = dt.date.fromisoformat(text).isoformat()
        except ValueError:
            written = ""
        if written != text:
            yield f"{name} {text!r} is no date"
    if not info.start_date <= info.service_date <= info.end_date:
        yield f"service date {info.service_date} is outside {info.start_date} to {info.end_date}"
    if not info.service_reason:
        yield "no reason is given for the service date"


def _order(timetable: Timetable) -> Iterator[str]:
    for name in ("agencies", "stops", "routes"):
        ids = [item.id for item in getattr(timetable, name)]
        yield from (
            f"{name}: {after!r} follows {before!r}"
            for before, after in itertools.pairwise(ids)
            if not before < after
        )


def _stops(timetable: Timetable) -> Iterator[str]:
    stops = {stop.id: stop for stop in timetable.stops}
    called = {ident for pattern in timetable.patterns for ident in pattern.stop_ids}
    parents = {stops[ident].parent_id for ident in called if ident in stops}
    for stop in timetable.stops:
        yield from _stop(stop, stops)
        if stop.id not in called and stop.id not in parents:
            yield f"stop {stop.id} is neither called at nor above one that is"


def _stop(stop: Stop, stops: dict[str, Stop]) -> Iterator[str]:
    if not stop.name.strip():
        yield f"stop {stop.id} has no name"
    if stop.lon is None or stop.lat is None:
        yield f"stop {stop.id} has no place"
    elif not (-180.0 <= stop.lon <= 180.0 and -90.0 <= stop.lat <= 90.0):
        yield f"stop {stop.id} lies at {stop.lon}, {stop.lat}, which is no place"
    if stop.parent_id is not None:
        parent = stops.get(stop.parent_id)
        if parent is None:
            yield f"stop {stop.id}: station {stop.parent_id} above it is missing"
        elif parent.parent_id is not None:
            yield f"stop {stop.id}: station {stop.parent_id} above it is not the top one"


def _routes(timetable: Timetable) -> Iterator[str]:
    running = {pattern.route_id for pattern in timetable.patterns}
    for route in timetable.routes:
        if route.id not in running:
            yield f"route {route.id} has no pattern"
        if route.mode not in _MODES:
            yield f"route {route.id} has the unknown mode {route.mode!r}"
        for color in (route.color, route.text_color):
            if color is not None and not re.fullmatch("#[0-9A-F]{6}", color):
                yield f"route {route.id} has the color {color!r}, which is none"
        days = timetable.operating_days.get(route.id)
        if not days or not days <= set(range(7)):
            yield f"route {route.id} has the operating days {days}"
    missing = running - {route.id for route in timetable.routes}
    yield from (f"route {ident} of a pattern is missing" for ident in sorted(missing))


def _patterns(timetable: Timetable) -> Iterator[str]:
    stops = {stop.id for stop in timetable.stops}
    seen = set()
    for pattern in timetable.patterns:
        name = f"pattern of route {pattern.route_id} from {pattern.stop_ids[:1]}"
        key = (pattern.route_id, pattern.stop_ids)
        if key in seen:
            yield f"{name} is there twice"
        seen.add(key)
        for fault in _pattern(pattern, stops):
            yield f"{name} {fault}"


def _pattern(pattern: Pattern, stops: set[str]) -> Iterator[str]:
    if len(pattern.stop_ids) < 2:
        yield "has fewer than two calls"
    if any(a == b for a, b in itertools.pairwise(pattern.stop_ids)):
        yield "calls at one stop twice running"
    yield from (f"calls at the missing stop {s}" for s in pattern.stop_ids if s not in stops)
    if not pattern.departures_s or _runs_back(pattern.departures_s):
        yield "has no departures or has them out of order"
    if len(pattern.offsets_s) != len(pattern.stop_ids):
        yield "has not one time per call"
    elif pattern.offsets_s[0] != 0 or _runs_back(pattern.offsets_s):
        yield "has times that do not run forward from 0"


def _runs_back(numbers: Iterable[int]) -> bool:
    kept = list(numbers)
    return kept != sorted(kept)


def _transfers(timetable: Timetable) -> Iterator[str]:
    stops = {stop.id for stop in timetable.stops}
    for transfer in timetable.transfers:
        ends = (transfer.from_stop_id, transfer.to_stop_id)
        if ends[0] == ends[1]:
            yield f"transfer {ends} joins a stop to itself"
        yield from (f"transfer {ends} names the missing stop {s}" for s in ends if s not in stops)
        if transfer.min_time_s is not None and transfer.min_time_s < 0:
            yield f"transfer {ends} takes {transfer.min_time_s} s"


def _shapes(timetable: Timetable) -> Iterator[str]:
    used = {pattern.shape_id for pattern in timetable.patterns if pattern.shape_id is not None}
    for ident in sorted(used ^ timetable.shapes.keys()):
        yield f"shape {ident} is {'missing' if ident in used else 'not used'}"
    for ident, shape in timetable.shapes.items():
        if shape.ndim != 2 or shape.shape[0] < 2 or shape.shape[1] != 2:
            yield f"shape {ident} has the form {shape.shape}"
        elif not all(
            math.isfinite(lon) and abs(lon) <= 180.0 and abs(lat) <= 90.0
            for lon, lat in shape.tolist()
        ):
            yield f"shape {ident} leaves the Earth"


def _left_out(timetable: Timetable) -> Iterator[str]:
    drawn = {("route", route.id) for route in timetable.routes}
    drawn |= {(kind, stop.id) for kind in ("stop", "station") for stop in timetable.stops}
    for item in timetable.left_out:
        if (item.kind, item.id) in drawn:
            yield f"{item.kind} {item.id} is in the timetable and listed as left out"
        if not item.reason:
            yield f"{item.kind} {item.id} is left out without a reason"
