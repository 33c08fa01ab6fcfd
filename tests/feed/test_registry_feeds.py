"""Three real feeds, with figures counted by plain loops over their rows and by partridge."""

from __future__ import annotations

import csv
import datetime as dt
import io
import statistics
import warnings
import zipfile
from collections import defaultdict

import pytest

from gtfs_schematic.feed.check import faults
from gtfs_schematic.feed.model import FeedSettings
from gtfs_schematic.feed.read import read_feed

with warnings.catch_warnings():
    warnings.simplefilter("ignore")  # of partridge's own imports
    import partridge

FEEDS = ("cairns_feed", "nyc_subway_feed", "ann_arbor_feed")


@pytest.fixture(scope="module", params=FEEDS)
def path(request):
    return request.getfixturevalue(request.param)


@pytest.fixture(scope="module")
def timetable(path):
    return read_feed([path], FeedSettings(date="busiest"))


@pytest.fixture(scope="module")
def tables(path):
    """Give the feed's tables as lists of dicts, read with no code of ours."""
    with zipfile.ZipFile(path) as archive:
        return {
            name: list(csv.DictReader(io.TextIOWrapper(archive.open(name), "utf-8-sig")))
            for name in archive.namelist()
        }


def seconds(text):
    hours, minutes, rest = text.strip().split(":")
    return int(hours) * 3600 + int(minutes) * 60 + int(rest)


@pytest.fixture(scope="module")
def counted(tables, timetable):
    """Count the trips of the service date by route and stops: first departures and arrivals."""
    date = timetable.info.service_date.replace("-", "")
    weekday = ["monday", "tuesday", "wednesday", "thursday", "friday", "saturday", "sunday"][
        dt.date.fromisoformat(timetable.info.service_date).weekday()
    ]
    running = {
        row["service_id"]
        for row in tables.get("calendar.txt", [])
        if row[weekday] == "1" and row["start_date"] <= date <= row["end_date"]
    }
    for row in tables.get("calendar_dates.txt", []):
        if row["date"] == date:
            (running.add if row["exception_type"] == "1" else running.discard)(row["service_id"])
    calls = defaultdict(list)
    for row in tables["stop_times.txt"]:
        if row.get("pickup_type") == row.get("drop_off_type") == "1":
            continue  # a timing point, where riders can neither board nor alight
        calls[row["trip_id"]].append(row)
    patterns = defaultdict(list)
    for trip in tables["trips.txt"]:
        if trip["service_id"] in running:
            ordered = sorted(calls[trip["trip_id"]], key=lambda row: int(row["stop_sequence"]))
            stops = [row["stop_id"] for row in ordered]
            once = [b for a, b in zip([None, *stops], stops, strict=False) if a != b]
            key = (trip["route_id"], tuple(once))
            patterns[key].append(ordered)
    return patterns


def test_no_error_and_no_fault(timetable):
    assert [f for f in timetable.findings if f.severity == "error"] == []
    assert faults(timetable) == ()


def test_patterns_and_trips_agree_with_plain_counting(timetable, counted):
    got = {(p.route_id, p.stop_ids): p for p in timetable.patterns}
    assert got.keys() == counted.keys()
    for key, trips in counted.items():
        departures = sorted(seconds(rows[0]["departure_time"]) for rows in trips)
        assert list(got[key].departures_s) == departures
        last = statistics.median(
            seconds(rows[-1]["arrival_time"]) - seconds(rows[0]["departure_time"])
            for rows in trips
            if rows[-1]["arrival_time"].strip()
        )
        assert abs(got[key].offsets_s[-1] - last) <= 0.5


def test_stops_and_routes_agree_with_plain_counting(timetable, tables, counted):
    rows = {row["stop_id"]: row for row in tables["stops.txt"]}
    called = {stop for _, stops in counted for stop in stops}
    parents = {rows[stop].get("parent_station") or None for stop in called} - {None}
    assert {stop.id for stop in timetable.stops} == called | parents
    for stop in timetable.stops:
        assert (stop.lon, stop.lat) == (
            float(rows[stop.id]["stop_lon"]),
            float(rows[stop.id]["stop_lat"]),
        )
    routes = {route for route, _ in counted}
    assert {route.id for route in timetable.routes} == routes
    others = {row["route_id"] for row in tables["routes.txt"]} - routes
    assert {item.id for item in timetable.left_out if item.kind == "route"} == others


def test_shapes_have_all_their_points(timetable, tables):
    points = defaultdict(list)
    for row in tables["shapes.txt"]:
        place = (float(row["shape_pt_lon"]), float(row["shape_pt_lat"]))
        points[row["shape_id"]].append((int(row["shape_pt_sequence"]), place))
    assert timetable.shapes
    for ident, shape in timetable.shapes.items():
        assert shape.tolist() == [list(place) for _, place in sorted(points[ident])]


def test_the_date_agrees_with_partridge(path, timetable):
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        date, _ = partridge.read_busiest_date(str(path))
        trips = partridge.read_trip_counts_by_date(str(path))[date]
    assert timetable.info.service_date == date.isoformat()
    assert sum(len(p.departures_s) for p in timetable.patterns) == trips


def test_all_three_read_as_the_other_date_too(path, timetable):
    """A date given by hand reads as the busiest one does."""
    again = read_feed([path], FeedSettings(date=timetable.info.service_date))
    assert again.patterns == timetable.patterns
    assert "was asked for" in again.info.service_reason
