"""Stops and stations that lie hundreds of kilometres off are named and do not spoil the map."""

from __future__ import annotations

import pytest

from gtfs_schematic.feed.check import faults
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.model import NetworkSettings


def test_a_stop_astray_is_named_and_left_out(read_town, table):
    # Tamselby's longitude lost its point: some 5,400 km to the east.
    text = table("stops.txt").replace("47.010,8.000", "47.010,80.00")
    timetable = read_town({"stops.txt": text})
    assert faults(timetable) == ()
    assert "tams" not in {stop.id for stop in timetable.stops}
    assert [(f.severity, f.row, f.value) for f in timetable.findings] == [("error", 5, "tams")]
    reasons = {i.id: i.reason for i in timetable.left_out if i.kind == "stop"}
    assert reasons["tams"].startswith("Tamselby lies 5")
    assert reasons["tams"].endswith(" km from the stops before and after it")
    # The tram runs on without it; of the bus, one stop remains.
    assert {p.stop_ids for p in timetable.patterns} == {
        ("gate1", "vend", "parv"),
        ("parv", "vend", "gate2"),
    }
    names = {s.name for s in build_network(timetable, NetworkSettings()).stations}
    assert names == {"Oulmgate", "Vendrick Locks", "Parvinholm"}


def test_a_terminus_astray_does_not_take_its_neighbour_along(read_town, table):
    text = table("stops.txt").replace("47.030,8.020", "43.030,8.020")
    timetable = read_town({"stops.txt": text})
    assert {i.id for i in timetable.left_out if i.kind == "stop"} == {"parv"}
    assert {stop.id for stop in timetable.stops} == {"gate", "gate1", "gate2", "tams", "vend"}


def test_far_stops_that_a_trip_can_reach_stay(read_town, table):
    """A coach to a town 100 km away is no mistake."""
    stops = table("stops.txt") + "far,Farholm,9,47.9,8.0,0,,\n"
    trips = table("trips.txt") + "b7,wk,b7b,Farholm,,\n"
    times = table("stop_times.txt") + (
        "b7b,07:00:00,07:00:00,vend,1\nb7b,08:20:00,08:20:00,far,2\n"
    )
    changes = {"stops.txt": stops, "trips.txt": trips, "stop_times.txt": times}
    timetable = read_town(changes)
    assert timetable.findings == ()
    assert "far" in {stop.id for stop in timetable.stops}


def test_a_station_astray_is_put_amid_its_stops(read_town, table):
    text = table("stops.txt").replace("47.000,8.000,1", "7.000,8.000,1")
    timetable = read_town({"stops.txt": text})
    (gate,) = (stop for stop in timetable.stops if stop.id == "gate")
    assert abs(gate.lat - 47.00015) < 1e-9
    assert abs(gate.lon - 8.00015) < 1e-9
    assert [(f.severity, f.row, f.value) for f in timetable.findings] == [("error", 2, "gate")]


def test_a_platform_astray_is_put_to_its_station(read_town, table):
    """One digit of its longitude is wrong: 60 km off. Its trams go on calling at the station."""
    text = table("stops.txt").replace("47.0002,8.0002", "47.0002,8.8002")
    timetable = read_town({"stops.txt": text})
    assert faults(timetable) == ()
    stops = {stop.id: stop for stop in timetable.stops}
    assert abs(stops["gate2"].lon - 8.00005) < 1e-9  # amid the station and its other platform
    assert timetable.patterns == read_town().patterns
    assert [(f.severity, f.row, f.value) for f in timetable.findings] == [("error", 4, "gate2")]


@pytest.mark.parametrize("place", ["47.010,8.800", "47.510,8.000"])
def test_one_wrong_digit_in_a_small_town_is_enough(read_town, table, place):
    """Some 60 km off, four and five minutes from the stops before and after."""
    timetable = read_town({"stops.txt": table("stops.txt").replace("47.010,8.000", place)})
    assert faults(timetable) == ()
    assert [(f.severity, f.row, f.value) for f in timetable.findings] == [("error", 5, "tams")]
    assert "tams" not in {stop.id for stop in timetable.stops}


def times_by(places, minutes):
    """Write calls of a bus at places, so many minutes apart."""
    rows = [
        f"b7a,{7 + n // 60:02d}:{n % 60:02d}:00,{7 + n // 60:02d}:{n % 60:02d}:00,{place},{k}\n"
        for k, (place, n) in enumerate(zip(places, minutes, strict=True))
    ]
    return "trip_id,arrival_time,departure_time,stop_id,stop_sequence\n" + "".join(rows)


def test_a_far_terminus_with_times_spread_evenly_stays(read_town, table):
    """Times between timing points may be spread by number of calls: the whole way has the time."""
    changes = {
        "stops.txt": table("stops.txt") + "port,Airport,9,47.55,8.0,0,,\n",
        "stop_times.txt": times_by(["gate1", "tams", "vend", "parv", "port"], [0, 10, 20, 30, 40]),
    }
    timetable = read_town(changes, routes=("7",))
    assert "port" in {stop.id for stop in timetable.stops}
    assert [(f.severity, f.row) for f in timetable.findings] == [("warning", 8)]
    assert timetable.findings[0].value.startswith("parv, port: 5")


def test_nobody_runs_60_km_out_and_back_in_ten_minutes(read_town, table):
    """The whole way has the time, but a stop between two others cannot lie that far off."""
    changes = {
        "stops.txt": table("stops.txt").replace("47.010,8.000", "47.010,8.800"),
        "stop_times.txt": times_by(["gate1", "vend", "tams", "parv", "vend"], [0, 45, 50, 55, 90]),
    }
    timetable = read_town(changes, routes=("7",))
    assert [p.stop_ids for p in timetable.patterns] == [("gate1", "vend", "parv", "vend")]
    assert [(f.severity, f.row, f.value) for f in timetable.findings] == [("error", 5, "tams")]


def test_times_that_are_no_times_prove_nothing(read_town, table):
    """All at the same minute: nobody would believe the other stops either."""
    changes = {
        "stops.txt": table("stops.txt")
        + "mid,Midholm,8,47.3,8.0,0,,\nend,Endholm,8,47.9,8.0,0,,\n",
        "stop_times.txt": times_by(["gate1", "tams", "mid", "end"], [0, 0, 0, 0]),
    }
    timetable = read_town(changes, routes=("7",))
    assert {"mid", "end"} <= {stop.id for stop in timetable.stops}
    assert {f.severity for f in timetable.findings} == {"warning"}


def test_a_fault_is_found_once_though_stops_are_looked_at_again(read_town, table):
    """A stop without a name, and another one astray."""
    text = table("stops.txt").replace("47.010,8.000", "47.010,80.00").replace("Parvinholm", "")
    found = read_town({"stops.txt": text}).findings
    assert len(found) == len(set(found)) == 2


def test_a_stop_some_kilometers_off_is_doubtful_but_stays(read_town, table):
    """A wrong digit again: what is 7.6 km off can be reached in four minutes, but not 15 km."""
    timetable = read_town({"stops.txt": table("stops.txt").replace("47.010,8.000", "47.010,8.100")})
    assert "tams" in {stop.id for stop in timetable.stops}
    assert {(f.severity, f.row) for f in timetable.findings} == set()
    timetable = read_town({"stops.txt": table("stops.txt").replace("47.010,8.000", "47.010,8.200")})
    assert "tams" in {stop.id for stop in timetable.stops}
    assert {(f.severity, f.row) for f in timetable.findings} == {("warning", 5)}
