"""Stops and stations that lie hundreds of kilometres off are named and do not spoil the map."""

from __future__ import annotations

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
