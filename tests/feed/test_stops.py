"""Stops: their stations, their places, who can board, what they are called."""

from __future__ import annotations

import pytest

from gtfs_schematic.feed.model import Stop, Timetable


@pytest.fixture
def read_stops(read_town, table):
    """Give a function that reads the town with rows of stops.txt replaced or added."""

    def read(*rows: str) -> tuple[Timetable, dict[str, Stop]]:
        changed = {row.split(",")[0]: row for row in rows}
        kept = [row for row in table("stops.txt").splitlines() if row.split(",")[0] not in changed]
        timetable = read_town({"stops.txt": "\n".join([*kept, *changed.values()]) + "\n"})
        return timetable, {stop.id: stop for stop in timetable.stops}

    return read


def test_stops_are_those_called_at_and_their_stations(read_stops):
    timetable, stops = read_stops("idle,Idle,,47.0,8.0,0,,", "far,Far,,47.0,8.0,1,,")
    assert list(stops) == ["gate", "gate1", "gate2", "parv", "tams", "vend"]
    assert (stops["gate1"].parent_id, stops["gate"].parent_id) == ("gate", None)
    assert stops["gate1"].code == "101"
    assert [(item.kind, item.id) for item in timetable.left_out] == [
        ("station", "far"),
        ("stop", "idle"),
    ]


def test_a_boarding_area_belongs_to_the_station_of_its_platform(read_town, table):
    stops = table("stops.txt") + "gate1b,,,,,4,gate1,\n"
    times = table("stop_times.txt").replace("gate1,", "gate1b,")
    timetable = read_town({"stops.txt": stops, "stop_times.txt": times})
    found = {stop.id: stop for stop in timetable.stops}
    area = found["gate1b"]
    assert (area.parent_id, area.name, area.boarding) == ("gate", "Oulmgate", "yes")
    assert (area.lon, area.lat) == (8.0001, 47.0001)
    assert "gate1" not in found


def test_boarding_is_inherited_only_where_it_is_not_told(read_stops):
    _, stops = read_stops()
    # GTFS Schedule reference, stops.txt, wheelchair_boarding: empty inherits from the station
    assert {ident: stop.boarding for ident, stop in stops.items()} == {
        "gate": "yes",
        "gate1": "yes",
        "gate2": "no",
        "tams": "unknown",
        "vend": "yes",
        "parv": "no",
    }


@pytest.mark.parametrize("place", ["0,0", "0.0,-0.0", "91,8", "47,181", "x,8", ",8", "89.9,8"])
def test_a_stop_that_cannot_be_placed_is_left_out(read_stops, place):
    timetable, stops = read_stops(f"tams,Tamselby,,{place},0,,")
    assert "tams" not in stops
    assert ("stop", "tams") in {(item.kind, item.id) for item in timetable.left_out}
    assert any(f.file == "stops.txt" and f.severity == "error" for f in timetable.findings)
    assert ("gate1", "vend", "parv") in {pattern.stop_ids for pattern in timetable.patterns}


def test_a_platform_without_place_lies_at_its_station(read_stops):
    timetable, stops = read_stops("gate1,Oulmgate,,,,0,gate,")
    assert (stops["gate1"].lon, stops["gate1"].lat) == (8.0, 47.0)
    assert [(f.severity, f.value) for f in timetable.findings] == [("warning", "gate1")]


def test_a_station_without_place_lies_amid_its_platforms(read_stops):
    _, stops = read_stops("gate,Oulmgate,,,,1,,", "gate3,Oulmgate,,,,0,gate,")
    assert stops["gate"].lon == pytest.approx((8.0001 + 8.0002) / 2)
    assert stops["gate"].lat == pytest.approx((47.0001 + 47.0002) / 2)


def test_stations_that_go_round_or_are_missing_do_not_count(read_stops):
    timetable, stops = read_stops(
        "tams,Tamselby,,47.010,8.000,0,vend,",
        "vend,Vendrick Locks,,47.020,8.010,0,tams,",
        "parv,Parvinholm,,47.030,8.020,0,lost,",
        "gate,Oulmgate,,47.000,8.000,1,parv,1",
    )
    parents = {ident: stop.parent_id for ident, stop in stops.items()}
    assert parents == {
        "gate": None,
        "gate1": "gate",
        "gate2": "gate",
        "parv": None,
        "tams": None,
        "vend": None,
    }
    assert {(f.field, f.value) for f in timetable.findings} == {
        ("parent_station", "tams"),
        ("parent_station", "vend"),
        ("parent_station", "lost"),
        ("parent_station", "parv"),
    }


def test_a_station_that_is_not_marked_as_one_is_found_and_taken(read_stops):
    timetable, stops = read_stops("gate,Oulmgate,,47.000,8.000,0,,1")
    assert stops["gate1"].parent_id == "gate"
    assert {(f.severity, f.value) for f in timetable.findings} == {("warning", "gate")}


def test_a_missing_name_is_found_and_filled_in(read_stops):
    timetable, stops = read_stops(
        "gate1,,101,47.0001,8.0001,0,gate,", "tams,,2,47.010,8.000,0,,", "vend,,,47.02,8.01,0,,1"
    )
    assert [stops[i].name for i in ("gate1", "tams", "vend")] == ["Oulmgate", "2", "vend"]
    assert [f.field for f in timetable.findings] == ["stop_name"] * 3


def test_an_unknown_location_type_is_found(read_stops):
    timetable, stops = read_stops("tams,Tamselby,,47.010,8.000,9,,")
    assert stops["tams"].location_type == 0
    assert [(f.field, f.value) for f in timetable.findings] == [("location_type", "9")]


def test_a_leap_is_found_where_no_vehicle_could_make_it(read_stops):
    # Vendrick to Parvinholm takes 360 s; at 150 km/h and with a minute's grace 17.5 km. A degree
    # of latitude at 47 degrees north is 111.2 km (WGS 84 series expansion, from memory).
    near, _ = read_stops("parv,Parvinholm,4,47.165,8.010,0,,2")
    assert near.findings == ()
    far, _ = read_stops("parv,Parvinholm,4,47.190,8.010,0,,2")
    assert [(f.severity, f.file, f.value) for f in far.findings] == [
        ("warning", "stops.txt", "parv, vend: 19 km in 360 s")
    ]


def test_a_tower_of_parents_is_refused_in_good_time(read_town, table):
    """Ten thousand stops, each above the next: every one of them would be followed to the top."""
    tower = [f"s{n},Stop,,47.0,8.0,0,s{n + 1}," for n in range(10_000)]
    timetable = read_town({"stops.txt": table("stops.txt") + "\n".join(tower) + "\n"})
    assert {stop.id for stop in timetable.stops} == {stop.id for stop in read_town().stops}
    assert any("go up without end" in finding.message for finding in timetable.findings)


@pytest.mark.parametrize(
    ("kind", "parent", "told"),
    [
        ("1", "", "a station"),
        ("2", "gate", "an entrance"),
        ("3", "gate", "a generic node"),
        ("4", "gate1", "a boarding area"),
    ],
)
def test_calls_at_what_is_no_stop_are_found_and_count(read_town, table, kind, parent, told):
    stops = table("stops.txt") + f"odd,Odd place,,47.0001,8.0001,{kind},{parent},\n"
    times = table("stop_times.txt").replace("gate1", "odd")
    timetable = read_town({"stops.txt": stops, "stop_times.txt": times})
    assert "odd" in timetable.patterns[1].stop_ids
    assert [(f.severity, f.row, f.value) for f in timetable.findings] == [("warning", 8, "odd")]
    assert told in timetable.findings[0].message
    (stop,) = (stop for stop in timetable.stops if stop.id == "odd")
    assert stop.parent_id == ("gate" if parent else None)


def test_a_stop_without_coordinates_is_found_once(read_town, table):
    text = table("stops.txt").replace("47.010,8.000", ",")
    timetable = read_town({"stops.txt": text})
    assert [(f.severity, f.row, f.value) for f in timetable.findings] == [("error", 5, "tams")]
    assert "tams" in {item.id for item in timetable.left_out if item.kind == "stop"}
    bad = read_town({"stops.txt": table("stops.txt").replace("47.010,8.000", "north,east")})
    assert [(f.row, f.field) for f in bad.findings] == [(5, "stop_lon")]


def test_a_name_that_no_sheet_could_hold_is_cut_and_found(read_town, table):
    text = table("stops.txt").replace("Tamselby", "Tam " * 1000).replace("Parvinholm", "P" * 250)
    timetable = read_town({"stops.txt": text})
    names = {stop.id: stop.name for stop in timetable.stops}
    assert names["parv"] == "P" * 250
    assert len(names["tams"]) <= 250
    assert names["tams"].startswith("Tam Tam ")
    assert names["tams"].endswith("…")
    assert [(f.severity, f.row, f.value) for f in timetable.findings] == [
        ("warning", 5, names["tams"])
    ]
    long = read_town({"stops.txt": table("stops.txt").replace("Tamselby", "P" * 251)})
    assert {stop.id: stop.name for stop in long.stops}["tams"] == "P" * 249 + "…"
