"""Both feeds hold, read with csv alone, everything that makes real networks hard."""

from __future__ import annotations

import datetime as dt
import itertools
import re
import unicodedata
import warnings
from pathlib import Path
from typing import TYPE_CHECKING

import networkx as nx
import partridge
import pytest
from pyproj import Geod

if TYPE_CHECKING:
    from tests.demo.conftest import Feed

DATA = Path(__file__).parents[2] / "data"
GEOD = Geod(ellps="WGS84")


def _meters(feed: Feed, first: str, second: str) -> float:
    return GEOD.inv(*feed.lon_lat(first), *feed.lon_lat(second))[2]


def _seconds(clock: str) -> int:
    hours, minutes, seconds = map(int, clock.split(":"))
    return hours * 3600 + minutes * 60 + seconds


def _by_name(feed: Feed, name: str) -> list[str]:
    rows = [row for row in feed["stops"] if row["stop_name"] == name]
    return sorted({feed.place(row["stop_id"]) for row in rows})


def _departures(feed: Feed, route: str) -> dict[str, list[int]]:
    first: dict[str, int] = {}
    for row in feed["stop_times"]:
        if feed.trips[row["trip_id"]]["route_id"] == route and row["stop_sequence"] == "1":
            first[row["trip_id"]] = _seconds(row["departure_time"])
    by_service: dict[str, list[int]] = {}
    for trip, time in first.items():
        by_service.setdefault(feed.trips[trip]["service_id"], []).append(time)
    return by_service


def test_size_and_modes(feed: Feed):
    places = {place for route in feed["routes"] for place in feed.served(route["route_id"])}
    assert 75 <= len(places) <= 105
    assert 12 <= len(feed["routes"]) <= 14
    assert {route["route_type"] for route in feed["routes"]} == {"0", "1", "2", "3", "4"}
    lons = [feed.lon_lat(place)[0] for place in places]
    assert GEOD.inv(min(lons), -48, max(lons), -48)[2] == pytest.approx(30_000, abs=2000)


def test_ring(feed: Feed):
    for places in feed.patterns("m1"):
        assert places[0] == places[-1]
        assert len(set(places)) == len(places) - 1 >= 12
        spacing = [_meters(feed, a, b) for a, b in itertools.pairwise(places)]
        assert max(spacing) < 1100
        assert 500 < sum(spacing) / len(spacing) < 900
    assert len(feed.patterns("m1")) == 2


def test_branching_line(feed: Feed):
    graph = nx.Graph()
    for places in feed.patterns("m2"):
        nx.add_path(graph, places)
    assert nx.is_tree(graph)
    assert sorted(degree for _, degree in graph.degree if degree != 2) == [1, 1, 1, 3]


def test_trunk_of_two_lines(feed: Feed):
    first, second = (
        {frozenset(link) for link in itertools.pairwise(feed.longest(route))}
        for route in ("m3", "m4")
    )
    trunk = nx.Graph(tuple(link) for link in first & second)
    assert len(trunk) >= 5
    assert nx.is_connected(trunk)
    assert first - second
    assert second - first


def test_trams_share_a_street_with_different_stops(feed: Feed):
    first, second = feed.longest("t5"), feed.longest("t6")
    start, end = _by_name(feed, "Sethrakéth")[0], _by_name(feed, "Lómgresk")[0]

    def street(places: tuple[str, ...]) -> list[str]:
        low, high = sorted((places.index(start), places.index(end)))
        return sorted(places[low : high + 1], key=lambda place: _meters(feed, start, place))

    ones, twos = street(first), street(second)
    assert set(ones) & set(twos) == {start, end}
    along = sorted({*ones, *twos}, key=lambda place: _meters(feed, start, place))
    owners = ["5" if place in ones else "6" for place in along[1:-1]]
    assert owners == ["5", "6"] * 2  # turn by turn
    for a, b, c in zip(along, along[1:], along[2:], strict=False):
        detour = _meters(feed, a, b) + _meters(feed, b, c) - _meters(feed, a, c)
        assert detour < 20  # one street, not two


def test_express_skips_stations(feed: Feed):
    local, express = feed.longest("r1"), feed.longest("rx")
    order = [local.index(place) for place in express]
    assert order in (sorted(order), sorted(order, reverse=True))
    assert len(local) - len(express) == 5
    ends = [_meters(feed, a, b) for a, b in itertools.pairwise(local)]
    assert all(2000 < length < 5000 for length in (*ends[:3], *ends[-3:]))


def test_ferry(feed: Feed):
    (ferry,) = [route["route_id"] for route in feed["routes"] if route["route_type"] == "4"]
    assert len(feed.longest(ferry)) == 3


def test_which_lines_run_when(feed: Feed):
    services = {
        route["route_id"]: {
            trip["service_id"] for trip in feed["trips"] if trip["route_id"] == route["route_id"]
        }
        for route in feed["routes"]
    }
    weekdays_only = [route for route, names in services.items() if names == {"WK"}]
    assert weekdays_only == ["b8"]
    assert all("WK" in names for names in services.values())
    for route in services:
        times = [time for group in _departures(feed, route).values() for time in group]
        assert (min(times) >= 24 * 3600) == (route == "n1")


def test_peak_only_extension(feed: Feed):
    graph = nx.Graph(itertools.pairwise(feed.longest("m4")))
    off_peak = {place for places in feed.patterns("m4", "WE") for place in places}
    extension = [feed.name(place) for place in feed.longest("m4") if place not in off_peak]
    assert sorted(extension) == ["Kvořimesk", "Uvřathal-ur-Gresk"]
    assert nx.is_connected(graph.subgraph(off_peak))
    inside = []
    for row in feed["stop_times"]:
        trip = feed.trips[row["trip_id"]]
        if feed.place(row["stop_id"]) in set(feed.longest("m4")) - off_peak:
            assert (trip["route_id"], trip["service_id"]) == ("m4", "WK")
            inside.append(_seconds(row["arrival_time"]) / 3600)
    assert all(6 < hour < 10.5 or 15 < hour < 20 for hour in inside)
    reach = [
        bool({feed.place(stop) for stop in calls} - off_peak)
        for trip, calls in feed.calls.items()
        if feed.trips[trip]["route_id"] == "m4"
    ]
    assert reach.count(False) > reach.count(True) > 0


def test_one_way_terminal_loop(feed: Feed):
    graph = nx.DiGraph()
    for places in feed.patterns("t7"):
        nx.add_path(graph, places)
    one_way = nx.DiGraph([edge for edge in graph.edges if edge[::-1] not in graph.edges])
    assert len(one_way) == 4
    assert nx.is_strongly_connected(one_way)
    assert set(dict(one_way.out_degree).values()) == {1}


def test_interchange_joined_by_transfers_alone(feed: Feed):
    names = ("Lómvård", "Lómvård Sål", "Pirő Lómvård")
    ids = [_by_name(feed, name)[0] for name in names]
    rows = {(row["from_stop_id"], row["to_stop_id"]): row for row in feed["transfers"]}
    for pair in itertools.permutations(ids, 2):
        assert rows[pair]["transfer_type"] == "2"
        assert int(rows[pair]["min_transfer_time"]) > 0
        assert 100 <= _meters(feed, *pair) <= 250
    assert [feed.stops[stop]["parent_station"] for stop in ids] == ["", "", ""]
    routes = [r["route_id"] for r in feed["routes"] for i in ids if i in feed.served(r["route_id"])]
    assert sorted(routes) == ["f1", "m2", "t7"]


def test_two_stations_of_one_name_far_apart(feed: Feed):
    names: dict[str, set[str]] = {}
    for row in feed["stops"]:
        names.setdefault(row["stop_name"], set()).add(feed.place(row["stop_id"]))
    twice = {name: sorted(places) for name, places in names.items() if len(places) > 1}
    assert twice.keys() == {"Thanomeső", "Sulåmeső"}
    assert _meters(feed, *twice["Thanomeső"]) > 10_000
    assert _meters(feed, *twice["Sulåmeső"]) < 150  # one place for a rider


def test_platforms_with_parents_and_stops_without(feed: Feed):
    called = {stop for stops in feed.calls.values() for stop in stops}
    with_parent = {stop for stop in called if feed.stops[stop]["parent_station"]}
    assert len(with_parent) > 50
    assert len(called - with_parent) > 50
    for stop in with_parent:
        assert _meters(feed, stop, feed.stops[stop]["parent_station"]) < 90


def test_frequencies_for_one_line(feed: Feed):
    assert {feed.trips[row["trip_id"]]["route_id"] for row in feed["frequencies"]} == {"m2"}
    assert {row["exact_times"] for row in feed["frequencies"]} == {"0"}
    by_trip: dict[str, list[dict[str, str]]] = {}
    for row in feed["frequencies"]:
        by_trip.setdefault(row["trip_id"], []).append(row)
    assert by_trip.keys() == {trip for trip, r in feed.trips.items() if r["route_id"] == "m2"}
    for rows in by_trip.values():
        assert all(a["end_time"] <= b["start_time"] for a, b in itertools.pairwise(rows))


def test_realistic_headways(feed: Feed):
    for route in ("m1", "m3", "m4", "t5", "t6", "t7", "b8"):
        starts = [
            _seconds(row["departure_time"])
            for row in feed["stop_times"]
            if row["stop_sequence"] == "1"
            and feed.trips[row["trip_id"]]["route_id"] == route
            and feed.trips[row["trip_id"]]["service_id"] == "WK"
            and feed.trips[row["trip_id"]]["direction_id"] == "0"
        ]
        day = sorted(time for time in starts if 7 * 3600 <= time <= 18 * 3600)
        gaps = sorted(b - a for a, b in itertools.pairwise(day))
        assert 5 * 60 <= gaps[len(gaps) // 2] <= 15 * 60, route


def test_step_free_flags(feed: Feed):
    tops = [row for row in feed["stops"] if not row["parent_station"]]
    assert {row["wheelchair_boarding"] for row in tops} == {"0", "1", "2"}
    platforms = [row for row in feed["stops"] if row["parent_station"]]
    assert {row["wheelchair_boarding"] for row in platforms} == {"", "2"}
    exceptions = [row for row in platforms if row["wheelchair_boarding"] == "2"]
    assert {feed.stops[row["parent_station"]]["wheelchair_boarding"] for row in exceptions} == {"1"}


def test_shapes_for_some_lines_only(feed: Feed):
    having = {row["route_id"]: set() for row in feed["routes"]}
    for row in feed["trips"]:
        having[row["route_id"]].add(bool(row["shape_id"]))
    assert {route for route, kinds in having.items() if kinds == {True}} == {
        "m1",
        "m2",
        "t5",
        "t6",
        "r1",
        "rx",
    }
    assert sum(kinds == {False} for kinds in having.values()) == len(having) - 6


def test_long_accented_and_second_names(feed: Feed):
    names = {row["stop_name"] for row in feed["stops"]}
    assert {"é", "ř", "ő", "å"} <= {letter for name in names for letter in name}
    assert max(map(len, names)) >= 20
    stops = {
        row["record_id"]: row["translation"]
        for row in feed["translations"]
        if (row["table_name"], row["field_name"]) == ("stops", "stop_name")
    }
    assert stops.keys() == feed.stops.keys()
    for text in stops.values():
        letters = [letter for letter in text if letter.isalpha()]
        assert letters
        assert all(unicodedata.name(letter).startswith("GREEK") for letter in letters), text
    # BCP 47 (RFC 5646, 2.2.1 and 2.2.3): private-use language, four-letter script.
    languages = {row["language"] for row in feed["translations"]}
    assert all(re.fullmatch(r"q[a-t][a-z]-[A-Z][a-z]{3}", language) for language in languages)


def test_feed_info_attributions_and_agency(feed: Feed):
    (info,) = feed["feed_info"]
    assert all(info[f"feed_{key}"] for key in ("publisher_name", "version", "lang"))
    for row in feed["calendar"]:
        assert row["start_date"] == info["feed_start_date"]
        assert row["end_date"] == info["feed_end_date"]
    assert len(feed["attributions"]) == 2
    assert all(
        "1" in (row["is_producer"], row["is_operator"], row["is_authority"])
        for row in feed["attributions"]
    )
    (agency,) = feed["agency"]
    assert agency["agency_url"].split("/")[2].endswith(".example")  # RFC 2606


def test_holiday_runs_as_a_weekend(feed: Feed):
    rows = {
        (row["service_id"], row["exception_type"]): row["date"] for row in feed["calendar_dates"]
    }
    assert rows.keys() == {("WK", "2"), ("WE", "1")}
    day = dt.date.fromisoformat(rows["WK", "2"])
    assert rows["WE", "1"] == rows["WK", "2"]
    assert day.weekday() < 5


def test_sort_order_and_headsigns(feed: Feed):
    orders = [int(row["route_sort_order"]) for row in feed["routes"]]
    assert len(set(orders)) == len(orders)
    for row in feed["trips"]:
        calls = feed.calls[row["trip_id"]]
        if row["route_id"] != "m1":
            assert row["trip_headsign"] == feed.stops[calls[-1]]["stop_name"]
        else:
            assert row["trip_headsign"]


def _luminance(color: str) -> float:
    # Relative luminance as WCAG 2.2 defines it.
    parts = [int(color[i : i + 2], 16) / 255 for i in (0, 2, 4)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def test_colors(feed: Feed):
    colors = {row["route_id"]: row["route_color"] for row in feed["routes"]}
    assert [route for route, color in colors.items() if not color] == ["b8"]
    del colors["b8"]
    # WCAG 2.2, success criterion 1.4.11: 3:1 against the neighbouring color, here white.
    assert all(1.05 / (_luminance(color) + 0.05) >= 3 for color in colors.values())

    def apart(pair: tuple[str, str]) -> int:
        first, second = (bytes.fromhex(colors[route]) for route in pair)
        return max(abs(a - b) for a, b in zip(first, second, strict=True))

    pairs = sorted(itertools.combinations(sorted(colors), 2), key=apart)
    assert pairs[0] == ("m3", "t6")
    assert 0 < apart(pairs[0]) < 16
    assert apart(pairs[1]) > 32


@pytest.mark.parametrize("name", ["before", "after"])
def test_partridge_reads_the_feed_and_the_busiest_date_is_a_weekday(
    name: str, request: pytest.FixtureRequest
):
    feed = request.getfixturevalue(name)
    path = str(DATA / f"{name}.zip")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # partridge's own, about pandas
        date, services = partridge.read_busiest_date(path)
        view = {"trips.txt": {"service_id": services}}
        read = partridge.load_feed(path, view)
        counts = (len(read.routes), len(read.trips), len(read.stop_times))
    assert date.weekday() < 5
    assert services == {"WK"}
    trips = {trip for trip, row in feed.trips.items() if row["service_id"] == "WK"}
    calls = sum(len(feed.calls[trip]) for trip in trips)
    assert counts == (len(feed["routes"]), len(trips), calls)
