"""The faults in the demo files, found by reading them again as a stranger would."""

from __future__ import annotations

import csv
import io
import itertools
import json
import zipfile
from collections.abc import Mapping

Rows = list[dict[str, str]]

_REFERENCES = (
    ("routes.txt", "agency_id", "agency.txt", "agency_id"),
    ("trips.txt", "route_id", "routes.txt", "route_id"),
    ("trips.txt", "service_id", "calendar.txt", "service_id"),
    ("trips.txt", "shape_id", "shapes.txt", "shape_id"),
    ("stop_times.txt", "trip_id", "trips.txt", "trip_id"),
    ("stop_times.txt", "stop_id", "stops.txt", "stop_id"),
    ("stops.txt", "parent_station", "stops.txt", "stop_id"),
    ("frequencies.txt", "trip_id", "trips.txt", "trip_id"),
    ("transfers.txt", "from_stop_id", "stops.txt", "stop_id"),
    ("transfers.txt", "to_stop_id", "stops.txt", "stop_id"),
)
_KEYS = (
    ("stops.txt", ("stop_id",)),
    ("routes.txt", ("route_id",)),
    ("trips.txt", ("trip_id",)),
    ("stop_times.txt", ("trip_id", "stop_sequence")),
    ("shapes.txt", ("shape_id", "shape_pt_sequence")),
    ("translations.txt", ("table_name", "field_name", "language", "record_id")),
)


def _read(content: bytes) -> dict[str, Rows]:
    with zipfile.ZipFile(io.BytesIO(content)) as archive:
        return {
            name: list(csv.DictReader(io.StringIO(archive.read(name).decode())))
            for name in archive.namelist()
        }


def _reference_faults(tables: dict[str, Rows]) -> list[str]:
    faults = []
    for file, field, target, key in _REFERENCES:
        known = {row[key] for row in tables[target]} | {""}
        unknown = {row[field] for row in tables[file]} - known
        faults += [f"{file}: {field} {value!r} is not in {target}" for value in sorted(unknown)]
    for file, keys in _KEYS:
        values = [tuple(row[key] for key in keys) for row in tables[file]]
        if len(set(values)) < len(values):
            faults.append(f"{file}: {', '.join(keys)} not unique")
    return faults


def _seconds(clock: str) -> int:
    hours, minutes, seconds = clock.split(":")
    return int(hours) * 3600 + int(minutes) * 60 + int(seconds)


def _time_faults(tables: dict[str, Rows]) -> list[str]:
    faults = []
    for trip_id, group in itertools.groupby(tables["stop_times.txt"], lambda row: row["trip_id"]):
        rows = list(group)
        times = [
            _seconds(row[field]) for row in rows for field in ("arrival_time", "departure_time")
        ]
        if times != sorted(times):
            faults.append(f"stop_times.txt: trip {trip_id} runs back in time")
        if len(rows) < 2:
            faults.append(f"stop_times.txt: trip {trip_id} has one call")
    return faults


def _stop_faults(tables: dict[str, Rows]) -> list[str]:
    kinds = {row["stop_id"]: row["location_type"] for row in tables["stops.txt"]}
    called = {row["stop_id"] for row in tables["stop_times.txt"]}
    faults = [
        f"stop_times.txt: {stop} is no stop or platform"
        for stop in sorted(called)
        if kinds.get(stop) != "0"
    ]
    faults += [
        f"stops.txt: no trip calls at {stop}"
        for stop, kind in sorted(kinds.items())
        if kind == "0" and stop not in called
    ]
    faults += [
        f"stops.txt: the parent of {row['stop_id']} is no station"
        for row in tables["stops.txt"]
        if row["parent_station"] and kinds.get(row["parent_station"]) != "1"
    ]
    return faults


def faults(files: Mapping[str, bytes]) -> tuple[str, ...]:
    """Give what is wrong with the demo files, one sentence each; empty if nothing is."""
    found: list[str] = []
    feeds = {name: _read(files[name]) for name in ("before.zip", "after.zip")}
    for name, tables in feeds.items():
        part = [*_reference_faults(tables), *_time_faults(tables), *_stop_faults(tables)]
        found += [f"{name}: {fault}" for fault in part]
    ends = feeds["before.zip"]["feed_info.txt"][0]["feed_end_date"]
    if feeds["after.zip"]["feed_info.txt"][0]["feed_start_date"] <= ends:
        found.append("after.zip: begins before before.zip has ended")
    truth = json.loads(files["changes-truth.json"])
    for word in ("before", "after"):
        info = feeds[f"{word}.zip"]["feed_info.txt"][0]
        for field in ("feed_version", "feed_start_date", "feed_end_date"):
            if truth[word][field] != info[field]:
                found.append(f"changes-truth.json: {word} {field} is not the feed's")
    return tuple(found)
