"""Dozens of broken feeds: each gives a network with findings, or one clear error."""

from __future__ import annotations

import pytest

from gtfs_schematic.errors import SchematicError
from gtfs_schematic.feed.check import faults
from gtfs_schematic.feed.model import FeedSettings
from gtfs_schematic.feed.read import read_feed
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.model import NetworkSettings

REFUSED = {
    "au-sydney-entrances": "lacks routes.txt; stop_times.txt; trips.txt",
    "empty_file": "lacks a header in agency.txt",
    "missing_agency": "lacks agency.txt",
    "missing_calendar": "lacks calendar.txt or calendar_dates.txt",
    "missing_column": "lacks column agency_name of agency.txt",
    "missing_routes": "lacks routes.txt",
    "missing_stop_times": "lacks stop_times.txt",
    "missing_stops": "lacks stops.txt",
    "missing_trips": "lacks trips.txt",
    "missing_weekday_column": "lacks column thursday of calendar.txt",
    "unknown_format.zip": "is not a readable zip",
    "upgrade_translations/new-feed": "lacks agency.txt",
    "upgrade_translations/old-feed": "lacks agency.txt",
    "utf16": "agency.txt, row 1.*UTF-16",
}
"""What the error says: the names of the feeds say what is wrong with them."""

FOUND = {
    "bad_utf8": ("agency.txt", "agency_name"),
    "bad_date_format": ("calendar.txt", "start_date"),
    "contains_null": ("routes.txt", "route_url"),
    "duplicate_schedule_id": ("calendar.txt", "service_id"),
    "duplicate_stop": ("routes.txt", "route_url"),
    "duplicate_stop_sequence": ("stop_times.txt", "stop_sequence"),
    "extra_row_cells": ("routes.txt", None),
    "invalid_agency_ids": ("agency.txt", "agency_id"),
    "invalid_route_agency": ("routes.txt", "agency_id"),
    "missing_departure_time": ("stop_times.txt", "arrival_time, departure_time"),
    "missing_endpoint_times": ("stop_times.txt", "arrival_time"),
    "missing_row_cells": ("routes.txt", "route_url"),
    "negative_stop_sequence": ("stop_times.txt", "stop_sequence"),
    "undefined_stop": ("stop_times.txt", "stop_id"),
}
"""File and field of a finding."""

SOUND = {
    *("bad_eol.zip", "filter_unusual_trips", "flatten_feed", "good_feed", "good_feed.zip"),
    *("googletransit/good_feed", "only_calendar_dates", "repeated_route_name"),
    *("same_short_long_name", "unknown_file", "unrecognized_columns", "unused_stop", "utf8bom"),
}
"""Nothing that matters to a diagram is wrong with these, if anything."""


def test_no_feed_is_forgotten(broken_feeds):
    found = {
        path.relative_to(broken_feeds).as_posix()
        for path in broken_feeds.rglob("*")
        if path.suffix == ".zip" or (path.is_dir() and any(path.glob("*.txt")))
    }
    assert found == REFUSED.keys() | FOUND.keys() | SOUND


@pytest.mark.parametrize("name", sorted(REFUSED))
def test_what_cannot_be_used_is_refused_with_one_clear_error(broken_feeds, name):
    with pytest.raises(SchematicError, match=REFUSED[name]):
        read_feed([broken_feeds / name], FeedSettings())


@pytest.mark.parametrize("name", sorted([*FOUND, *SOUND]))
def test_what_can_be_used_becomes_a_network_with_findings(broken_feeds, name):
    timetable = read_feed([broken_feeds / name], FeedSettings())
    assert faults(timetable) == ()
    places = {(finding.file, finding.field) for finding in timetable.findings}
    assert {FOUND[name]} <= places if name in FOUND else not places
    network = build_network(timetable, NetworkSettings())
    assert network.lines
    assert set(timetable.findings) <= set(network.findings)
