"""Routes and their modes: colors, agencies, what is kept."""

from __future__ import annotations

import pytest

from gtfs_schematic.errors import UsageError
from gtfs_schematic.feed.modes import MODES, mode_of

# GTFS Schedule reference, routes.txt, route_type, and the published extended route types
# (100 to 117 railway, 200 to 209 coach, 400 to 405 urban railway, 700 to 716 bus); the others
# are from memory of the list they come from.
KNOWN = {
    "tram": (0, 900, 906),
    "metro": (1, 400, 401, 402),
    "rail": (2, 100, 101, 109, 117),
    "bus": (3, 200, 209, 700, 702, 716),
    "ferry": (4, 1000, 1200),
    "cable": (5,),
    "aerial": (6, 1300),
    "funicular": (7, 1400),
    "trolleybus": (11, 800),
    "monorail": (12, 405),
    "other": (1100, 1500, 1700),
}


def test_every_mode_is_reached_by_its_types():
    assert set(KNOWN) == set(MODES)
    assert {t: mode_of(t) for types in KNOWN.values() for t in types} == {
        t: mode for mode, types in KNOWN.items() for t in types
    }


@pytest.mark.parametrize("route_type", [-1, 8, 13, 99, 1600, 1800, 9999])
def test_other_numbers_are_unknown(route_type):
    assert mode_of(route_type) is None


@pytest.mark.parametrize("text", ["9999", "tram", "", "3.0"])
def test_an_unknown_type_is_found_and_drawn_as_other(read_town, table, text):
    routes = table("routes.txt").replace("Locks bus,3", f"Locks bus,{text}")
    timetable = read_town({"routes.txt": routes})
    assert {r.id: r.mode for r in timetable.routes} == {"b7": "other", "t1": "tram"}
    assert [(f.row, f.field, f.value) for f in timetable.findings] == [(3, "route_type", text)]


@pytest.mark.parametrize("route_type", ["110", "714"])
def test_replacement_services_are_left_out_unless_asked_for(read_town, table, route_type):
    changes = {"routes.txt": table("routes.txt").replace("bus,3", f"bus,{route_type}")}
    timetable = read_town(changes)
    assert [route.id for route in timetable.routes] == ["t1"]
    assert ("route", "b7", "replacement service, a mode to be asked for") in {
        (item.kind, item.id, item.reason) for item in timetable.left_out
    }
    assert [r.id for r in read_town(changes, modes=("tram", "rail", "bus")).routes] == ["t1"]
    assert [r.id for r in read_town(changes, modes=("replacement",)).routes] == ["b7"]


def test_modes_are_filtered_and_the_busiest_date_follows(read_town, table):
    trips = table("trips.txt") + "".join(f"b7,sa,s{n},,,\n" for n in range(9))
    times = table("stop_times.txt") + "".join(
        f"s{n},08:00:00,08:00:00,vend,1\ns{n},08:05:00,08:05:00,tams,2\n" for n in range(9)
    )
    changes = {"trips.txt": trips, "stop_times.txt": times}
    assert read_town(changes, date="busiest").info.service_date == "2026-03-07"
    tram = read_town(changes, date="busiest", modes=("tram",))
    assert tram.info.service_date == "2026-03-02"
    assert [(r.id, r.mode) for r in tram.routes] == [("t1", "tram")]
    assert "mode bus is not among those asked for" in {item.reason for item in tram.left_out}
    with pytest.raises(UsageError, match=r"no mode 'trams'.*tram"):
        read_town(modes=("trams",))


def test_colors_are_normal_or_none(read_town, table):
    assert {r.id: (r.color, r.text_color) for r in read_town().routes} == {
        "t1": ("#1A2B3C", "#FFFFFF"),
        "b7": (None, None),
    }
    text = table("routes.txt").replace("1a2B3c,FFFFFF", "#1a2B3c,white")
    timetable = read_town({"routes.txt": text})
    (tram,) = [route for route in timetable.routes if route.id == "t1"]
    assert (tram.color, tram.text_color) == ("#1A2B3C", None)
    assert [(f.severity, f.row, f.field, f.value) for f in timetable.findings] == [
        ("info", 2, "route_color", "#1a2B3c"),
        ("warning", 2, "route_text_color", "white"),
    ]


def test_a_sole_agency_needs_no_id(read_town, table):
    changes = {
        "agency.txt": table("agency.txt").replace("oulm,", ","),
        "routes.txt": table("routes.txt").replace(",oulm,", ",,"),
    }
    timetable = read_town(changes)
    assert [(a.id, a.name, a.lang) for a in timetable.agencies] == [("", "Oulm Tramways", "en")]
    assert {route.agency_id for route in timetable.routes} == {""}
    assert timetable.findings == ()


def test_agencies_without_routes_are_left_out_and_unknown_ones_found(read_town, table):
    agencies = table("agency.txt") + "idle,Idle,https://idle.example,Europe/Zurich,\n"
    routes = table("routes.txt").replace("b7,oulm", "b7,lost")
    timetable = read_town({"agency.txt": agencies, "routes.txt": routes})
    assert [a.id for a in timetable.agencies] == ["oulm"]
    assert ("agency", "idle") in {(item.kind, item.id) for item in timetable.left_out}
    assert [(f.field, f.value) for f in timetable.findings] == [("agency_id", "lost")]


def test_routes_without_trips_and_without_names_are_told(read_town, table):
    text = table("routes.txt") + "n3,oulm,,,3,,\n"
    timetable = read_town({"routes.txt": text})
    assert [(f.row, f.value) for f in timetable.findings] == [(4, "n3")]
    assert {i.id: i.reason for i in timetable.left_out if i.kind == "route"} == {
        "n3": "has no trips"
    }


def test_operating_days_are_those_of_the_routes_services(read_town):
    days = read_town().operating_days
    assert days == {"t1": frozenset({0, 1, 2, 3, 4, 5}), "b7": frozenset({0, 1, 2, 3, 4})}


def test_the_only_agency_stands_in_for_one_that_is_missing(read_town, table):
    changes = {"routes.txt": table("routes.txt").replace("b7,oulm", "b7,olum")}
    timetable = read_town(changes)
    assert {route.agency_id for route in timetable.routes} == {"oulm"}
    assert [(f.row, f.field, f.value) for f in timetable.findings] == [(3, "agency_id", "olum")]
    two = table("agency.txt") + "lok,Locks Buses,https://lok.example,Europe/Zurich,en\n"
    both = read_town({**changes, "agency.txt": two})
    assert {route.id: route.agency_id for route in both.routes}["b7"] == "olum"
