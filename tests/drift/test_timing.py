"""What journeys need of a timetable is gathered from the demo's own tables."""

from __future__ import annotations

import csv
import io
import zipfile
from collections import Counter
from dataclasses import replace
from pathlib import Path

import pytest

from gtfs_schematic.config import Settings
from gtfs_schematic.drift.timing import timing_of
from gtfs_schematic.feed.model import Transfer
from gtfs_schematic.pipeline import inspect

BEFORE = Path(__file__).parents[2] / "data" / "before.zip"


@pytest.fixture(scope="module")
def demo():
    return inspect(BEFORE, Settings())


def rows(name: str) -> list[dict[str, str]]:
    with zipfile.ZipFile(BEFORE) as archive:
        return list(csv.DictReader(io.StringIO(archive.read(name).decode("utf-8-sig"))))


def test_every_trip_of_the_date_is_timed_once(demo):
    """Trips as the feed room counts them; all of the demo's are drawn."""
    timetable, network = demo
    timing = timing_of(timetable, network)
    assert sum(len(p.departures_s) for p in timing.patterns) == sum(
        line.trips for line in network.lines
    )
    keys = [(p.line, p.stations) for p in timing.patterns]
    assert keys == sorted(set(keys))


def test_times_are_those_of_stop_times(demo):
    """Running times of a pattern, as seconds between arrivals of some trip in the file."""
    timetable, network = demo
    timing = timing_of(timetable, network)
    station = {stop: s.id for s in network.stations for stop in s.stop_ids}
    trips: dict[str, list[tuple[int, str, int]]] = {}
    for row in rows("stop_times.txt"):
        hours, minutes, seconds = map(int, row["arrival_time"].split(":"))
        time = 3600 * hours + 60 * minutes + seconds
        stop = station[row["stop_id"]]
        trips.setdefault(row["trip_id"], []).append((int(row["stop_sequence"]), stop, time))
    seen = Counter()
    for calls in trips.values():
        calls.sort()
        start = calls[0][2]
        seen[tuple(c[1] for c in calls), tuple(c[2] - start for c in calls)] += 1
    for pattern in timing.patterns:
        assert seen[pattern.stations, pattern.times_s] > 0, pattern.line


def test_changes_within_stations_are_those_of_transfers(demo):
    timetable, network = demo
    station = {stop: s.id for s in network.stations for stop in s.stop_ids}
    given: dict[str, list[int]] = {}
    for row in rows("transfers.txt"):
        a, b = station[row["from_stop_id"]], station[row["to_stop_id"]]
        if a == b and row["from_stop_id"] != row["to_stop_id"] and row["min_transfer_time"]:
            given.setdefault(a, []).append(int(row["min_transfer_time"]))
    timing = timing_of(timetable, network)
    assert timing.change_s
    assert {key: {value} for key, value in timing.change_s.items()} == {
        key: set(values) for key, values in given.items()
    }


def test_impossible_transfers_take_no_time(demo):
    timetable, network = demo
    stops = next(s.stop_ids for s in network.stations if len(s.stop_ids) > 1)
    never = Transfer(stops[0], stops[1], 3, 60)
    timing = timing_of(replace(timetable, transfers=(never,)), network)
    assert timing.change_s == {}


def test_patterns_that_leave_the_drawn_links_are_left_out(demo):
    timetable, network = demo
    pattern = max(timetable.patterns, key=lambda p: len(p.stop_ids))
    line = next(k for k in network.lines if pattern.route_id in k.route_ids)
    there = {s.id for s in network.stations if line.id in s.lines}
    far = next(s for s in network.stations if s.id not in there and line.id not in s.lines)
    lost = replace(pattern, stop_ids=(*pattern.stop_ids[:-1], far.stop_ids[0]))
    one = timing_of(replace(timetable, patterns=(pattern,)), network)
    two = timing_of(replace(timetable, patterns=(pattern, lost)), network)
    assert len(one.patterns) == 1
    assert one == two


def test_stops_that_are_not_drawn_are_skipped(demo):
    timetable, network = demo
    pattern = timetable.patterns[0]
    ghost = replace(
        pattern,
        stop_ids=(pattern.stop_ids[0], "ghost", *pattern.stop_ids[1:]),
        offsets_s=(pattern.offsets_s[0], pattern.offsets_s[0], *pattern.offsets_s[1:]),
    )
    assert timing_of(replace(timetable, patterns=(ghost,)), network) == timing_of(
        replace(timetable, patterns=(pattern,)), network
    )
