"""The truth file tells every difference between the two feeds, and no other."""

from __future__ import annotations

import datetime as dt
from typing import TYPE_CHECKING, Any

import pytest
from pyproj import Geod

if TYPE_CHECKING:
    from tests.demo.conftest import Feed

GEOD = Geod(ellps="WGS84")
Truth = dict[str, Any]


def _tops(feed: Feed) -> dict[str, dict[str, str]]:
    return {stop: row for stop, row in feed.stops.items() if not row["parent_station"]}


def _ids(records: list[dict[str, Any]], field: str = "stop_ids") -> set[str]:
    return {stop for record in records for stop in record[field]}


def test_stop_ids_that_come_and_go(before: Feed, after: Feed, truth: Truth):
    old, new = _tops(before).keys(), _tops(after).keys()
    stations = truth["stations"]
    renumbered = stations["renumbered"]
    assert old - new == _ids(stations["closed"]) | _ids(renumbered, "old_stop_ids")
    assert new - old == _ids(stations["opened"]) | _ids(renumbered, "new_stop_ids")


def test_platforms_that_come_and_go(before: Feed, after: Feed, truth: Truth):
    both = _tops(before).keys() & _tops(after).keys()

    def platforms(feed: Feed) -> set[str]:
        return {s for s, row in feed.stops.items() if row["parent_station"] in both}

    assert sorted(platforms(after) - platforms(before)) == truth["platforms"]["opened"]
    assert sorted(platforms(before) - platforms(after)) == truth["platforms"]["closed"]


def test_every_changed_row_of_stops_is_told(before: Feed, after: Feed, truth: Truth):
    told: dict[str, set[str]] = {}
    for record in truth["stations"]["renamed"]:
        for stop in record["stop_ids"]:
            told.setdefault(stop, set()).add("stop_name")
    for record in truth["stations"]["moved"]:
        for stop in record["stop_ids"]:
            told.setdefault(stop, set()).update(("stop_lat", "stop_lon"))
    for stop in before.stops.keys() & after.stops.keys():
        old, new = before.stops[stop], after.stops[stop]
        changed = {field for field in old if old[field] != new[field]}
        assert changed == told.get(before.stops[stop]["parent_station"] or stop, set()), stop


def test_renamed_renumbered_and_moved(before: Feed, after: Feed, truth: Truth):
    (renamed,) = truth["stations"]["renamed"]
    for stop in renamed["stop_ids"]:
        assert before.stops[stop]["stop_name"] == renamed["old_name"]
        assert after.stops[stop]["stop_name"] == renamed["new_name"]
    (renumbered,) = truth["stations"]["renumbered"]
    (old,), (new,) = renumbered["old_stop_ids"], renumbered["new_stop_ids"]
    assert {**before.stops[old], "stop_id": new} == after.stops[new]
    (moved,) = truth["stations"]["moved"]
    for stop in moved["stop_ids"]:
        length = GEOD.inv(*before.lon_lat(stop), *after.lon_lat(stop))[2]
        assert length == pytest.approx(80, abs=0.5)
        assert moved["meters"] == 80
    place = before.place(moved["stop_ids"][0])
    assert (moved["old_lon"], moved["old_lat"]) == pytest.approx(before.lon_lat(place), abs=2e-6)
    assert (moved["new_lon"], moved["new_lat"]) == pytest.approx(after.lon_lat(place), abs=2e-6)


def test_one_station_is_closed_and_the_rest_follow_from_lines(
    before: Feed, after: Feed, truth: Truth
):
    closed, opened = truth["stations"]["closed"], truth["stations"]["opened"]
    reasons = [record["because"] for record in closed]
    assert reasons.count("station closed") == 1
    for record in closed:
        routes = {r["route_id"] for r in before["routes"]}
        places = {before.place(stop) for stop in record["stop_ids"]}
        calling = {route for route in routes if places & before.served(route)}
        told = {r["route_id"] for r in truth["lines"]["withdrawn"]}
        assert (calling == told) == (record["because"] == "line withdrawn")
    kinds = {"line new": "new", "line extended": "extended"}
    for record in opened:
        places = {after.place(stop) for stop in record["stop_ids"]}
        calling = {r["route_id"] for r in after["routes"] if places & after.served(r["route_id"])}
        assert calling == {r["route_id"] for r in truth["lines"][kinds[record["because"]]]}


def test_lines_withdrawn_and_new(before: Feed, after: Feed, truth: Truth):
    old, new = ({r["route_id"]: r for r in feed["routes"]} for feed in (before, after))
    assert old.keys() - new.keys() == {r["route_id"] for r in truth["lines"]["withdrawn"]}
    assert new.keys() - old.keys() == {r["route_id"] for r in truth["lines"]["new"]}
    (extended,) = truth["lines"]["extended"]
    for route in old.keys() & new.keys():
        changed = {field for field in old[route] if old[route][field] != new[route][field]}
        expected = {"route_long_name"} if route == extended["route_id"] else set()
        assert changed == expected
    assert old[extended["route_id"]]["route_long_name"] == extended["old_long_name"]
    assert new[extended["route_id"]]["route_long_name"] == extended["new_long_name"]


def _renumbered(feed: Feed, route: str, truth: Truth) -> set[tuple[str, ...]]:
    (record,) = truth["stations"]["renumbered"]
    (old,), (new,) = record["old_stop_ids"], record["new_stop_ids"]
    return {
        tuple(new if place == old else place for place in places) for places in feed.patterns(route)
    }


def test_itineraries_change_where_told_and_nowhere_else(before: Feed, after: Feed, truth: Truth):
    lines = truth["lines"]
    told = {
        r["route_id"] for kind in ("extended", "rerouted", "calls_dropped") for r in lines[kind]
    }
    both = {r["route_id"] for r in before["routes"]} & {r["route_id"] for r in after["routes"]}
    changed = {r for r in both if _renumbered(before, r, truth) != after.patterns(r)}
    assert changed == told


def test_how_the_itineraries_change(before: Feed, after: Feed, truth: Truth):
    (extended,) = truth["lines"]["extended"]
    route, added = extended["route_id"], tuple(extended["added_stop_ids"])
    assert {(*added, *p) for p in before.patterns(route)} & after.patterns(route)
    assert added[0] == extended["new_terminus_stop_ids"][0]
    old = {places[0] for places in before.patterns(route)}
    assert set(extended["old_terminus_stop_ids"]) <= old

    (rerouted,) = truth["lines"]["rerouted"]
    start, end = rerouted["between_stop_ids"]
    for places in after.patterns(rerouted["route_id"]):
        low, high = sorted((places.index(start), places.index(end)))
        assert list(places[low + 1 : high]) == rerouted["added_stop_ids"]
        kept = places[: low + 1] + places[high:]
        assert kept in _renumbered(before, rerouted["route_id"], truth)
    assert rerouted["removed_stop_ids"] == []

    (dropped,) = truth["lines"]["calls_dropped"]
    gone = {before.place(stop) for stop in dropped["stop_ids"]}
    without = {
        tuple(place for place in places if place not in gone)
        for places in before.patterns(dropped["route_id"])
    }
    assert without == after.patterns(dropped["route_id"])


def test_the_feeds_follow_each_other(before: Feed, after: Feed, truth: Truth):
    days = []
    for word, feed in (("before", before), ("after", after)):
        (info,) = feed["feed_info"]
        for field in ("feed_version", "feed_start_date", "feed_end_date"):
            assert truth[word][field] == info[field]
        assert truth[word]["holiday"] in {row["date"] for row in feed["calendar_dates"]}
        days += [dt.date.fromisoformat(info[f"feed_{end}_date"]) for end in ("start", "end")]
    assert days == sorted(days)
    assert days[2] - days[1] == dt.timedelta(days=1)


@pytest.mark.parametrize("table", ["agency", "transfers", "frequencies", "attributions", "shapes"])
def test_other_tables_stay_as_they_are(before: Feed, after: Feed, table: str):
    assert before[table] == after[table]
    assert before[table]
