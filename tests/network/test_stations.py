"""Stops become the stations that a rider takes for one place."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.model import NetworkSettings
from gtfs_schematic.network.naming import loose_key, name_key, natural_key

if TYPE_CHECKING:
    from conftest import Town


def test_platforms_become_their_top_parent(town):
    network = (
        town.stop("S", 0, name="Quarry", location_type=1, boarding="yes")
        .stop("S1", 30, 20, name="Quarry 1", parent_id="S")
        .stop("S2", -30, 20, name="Quarry 2", parent_id="S1")
        .row("BC", x=900)
        .run("red", "S1 B C")
        .run("red", "C B S2")
        .network()
    )
    station = network.station["S"]
    assert station.name == "Quarry"
    assert set(station.stop_ids) == {"S", "S1", "S2"}
    assert (station.lon, station.lat) == pytest.approx((12.0, 45.0), abs=1e-7)
    assert station.boarding == "yes"
    assert len(network.links) == 2


def test_missing_and_circular_parents_end_the_way(town):
    network = (
        town.stop("A", 0, parent_id="nowhere")
        .stop("B", 600, parent_id="C")
        .stop("C", 1200, parent_id="B")
        .stop("D", 1800)
        .both("red", "A B D")
        .network()
    )
    assert [station.id for station in network.stations] == ["A", "B", "D"]


def test_boarding_is_unknown_where_platforms_disagree(town):
    network = (
        town.stop("S", 0, location_type=1)
        .stop("S1", 0, 10, parent_id="S", boarding="yes")
        .stop("S2", 0, -10, parent_id="S", boarding="no")
        .stop("B", 900, boarding="no")
        .run("red", "S1 B")
        .run("red", "B S2")
        .network()
    )
    assert network.station["S"].boarding == "unknown"
    assert network.station["B"].boarding == "no"


def test_stops_of_one_name_across_the_street_merge_and_say_why(town):
    network = (
        town.stop("b2", 600, 70, name="Mill Lane")
        .stop("b1", 610, -60, name="MILL  lane")
        .row(["A", "C"], gap_m=1200)
        .run("9", "A b1 C")
        .run("9", "C b2 A")
        .network()
    )
    station = network.station["b1"]
    assert station.stop_ids == ("b1", "b2")
    assert "same name" in station.merge_reason
    assert len(network.stations) == 3
    assert len(network.links) == 2


def test_same_name_far_apart_stays_two_stations(town):
    network = (
        town.stop("A", 0, name="Church")
        .stop("B", 700, name="Mill")
        .stop("C", 1400, name="Church")
        .both("9", "A B C")
        .network()
    )
    assert [station.name for station in network.stations] == ["Church", "Mill", "Church"]


def test_a_long_row_of_one_name_does_not_grow_into_one_station(town):
    ids = ["A", "B", "C", "D", "E", "F"]
    written = town.stop("Z", 3000)
    for i, stop_id in enumerate(ids):
        written = written.stop(stop_id, 140 * i, name="High Street")
    network = written.both("9", [*ids, "Z"]).network()
    # No two members may be further apart than the limit, so no station holds three stops.
    assert max(len(station.stop_ids) for station in network.stations) == 2


def test_kerbs_merge_by_headings_under_any_name(town):
    written = (
        town.row(["A", "C"], gap_m=1200)
        .stop("b1", 600, 15, name="Library")
        .stop("b2", 605, -15, name="Town Hall")
        .run("9", "A b1 C", trips=50)
        .run("9", "C b2 A", trips=40)
    )
    network = written.network()
    assert network.station["b1"].stop_ids == ("b1", "b2")
    assert network.station["b1"].name == "Library"
    assert "Town Hall" in network.station["b1"].merge_reason
    assert len(written.network(merge_kerbs_m=0.0).stations) == 4


def test_close_stops_with_the_same_heading_stay_apart(town):
    network = (
        town.row(["A", "C"], gap_m=1200)
        .stop("b1", 600, 0, name="Library")
        .stop("b2", 640, 0, name="Town Hall")
        .run("9", "A b1 b2 C")
        .network()
    )
    assert len(network.stations) == 4


def test_pole_codes_merge_unless_called_at_in_a_row(town):
    written = (
        town.row(["A", "D"], gap_m=1200)
        .stop("b1", 560, 60, name="Mill Lane A12")
        .stop("b2", 600, -60, name="Mill Lane A13")
        .run("9", "D b2 A")
    )
    assert len(written.run("9", "A b1 D").network().stations) == 3
    assert len(written.run("9", "A b2 b1 D").network().stations) == 4


def test_namesakes_of_two_railways_are_joined_on_foot_or_not_at_all(town):
    def written(gap_m: float) -> Town:
        return (
            town.stop("S", 0, name="Quarry")
            .stop("T", gap_m, name="Quarry")
            .stops({"A": (-900, 0), "B": (900, 900), "C": (1500, 900)})
            .both("red", "A S")
            .both("blue", "T B C")
        )

    near = written(60).network()
    assert near.station["S"].stop_ids == ("S", "T")
    assert near.station["S"].merge_confidence < 0.75
    assert any("Quarry" in f.message and f.value == "S" for f in near.findings)
    assert len(written(130).network().stations) == 5
    # Two lines of the street that both stop at the Quarry stop at one place.
    in_street = written(130).route("x", mode="bus")
    buses = replace(
        in_street.timetable,
        routes=tuple(replace(r, mode="bus") for r in in_street.timetable.routes),
    )
    assert len(build_network(buses, NetworkSettings()).stations) == 4


def _hub(town: Town, **told: object) -> Town:
    """Two poles 45 m apart at a corner, where lines 1 and 2 stop; they also meet at M."""
    return (
        town.stops({"A": (-900, 0), "C": (0, 900), "M": (900, 900)})
        .stop("p", 0, 0, name="Harbour Street", **told)
        .stop("q", 27, 36, name="Fish Market")
        .route("1", mode="bus")
        .route("2", mode="bus")
        .both("1", "A p M")
        .both("2", "C q M")
    )


def test_poles_at_a_corner_are_one_hub_if_their_lines_meet(town):
    network = _hub(town).network()
    station = network.station["p"]
    assert station.stop_ids == ("p", "q")
    assert "45 m apart" in station.merge_reason
    assert station.merge_confidence < 0.75
    assert [f.value for f in network.findings if f.file == "stops.txt"] == ["p"]
    assert len(_hub(town).network(merge_hub_m=40.0).stations) == 5


def test_poles_of_lines_that_never_meet_are_no_hub(town):
    network = (
        town.stops({"A": (-900, 0), "C": (0, 900), "M": (900, 900), "N": (900, -900)})
        .stop("p", 0, 0, name="Harbour Street")
        .stop("q", 27, 36, name="Fish Market")
        .route("1", mode="bus")
        .route("2", mode="bus")
        .both("1", "A p M")
        .both("2", "C q N")
        .network()
    )
    assert len(network.stations) == 6


def test_what_the_feed_calls_a_station_is_no_pole_of_a_hub(town):
    network = _hub(town.stop("P", 0, name="Harbour", location_type=1), parent_id="P").network()
    assert len(network.stations) == 5


def test_parts_of_a_stop_lose_their_endings_on_the_diagram(town):
    names = {"b1": (600, 10, "Mill Lane outbound"), "b2": (600, -10, "Mill Lane inbound")}
    written = town.row(["A", "C", "D"], gap_m=1200)
    for stop_id, (x, y, name) in names.items():
        written = written.stop(stop_id, x, y, name=name)
    run = written.run("9", "A b1 C D").run("9", "D C b2 A")
    assert run.network().station["b1"].name == "Mill Lane"
    taken = written.stop("d", 2400, 500, name="Mill Lane").run("9", "A b1 C d").run("9", "d C b2 A")
    assert taken.network().station["b1"].name == "Mill Lane outbound"


def test_two_stations_of_one_name_merge_only_if_no_transfer_could_have_said_so(town):
    written = (
        town.stop("S", 0, name="Quarry", location_type=1)
        .stop("S1", 0, 5, parent_id="S")
        .stop("T", 60, name="Quarry", location_type=1)
        .stop("T1", 60, 5, parent_id="T")
        .stops({"A": (-900, 0), "B": (900, 0), "C": (1500, 0)})
        .both("red", "A S1")
        .both("blue", "T1 B C")
    )
    assert len(written.network().stations) == 4
    assert len(written.transfer("B", "C").network().stations) == 5


def test_places_that_cannot_be_are_left_out_and_named(town):
    network = (
        town.row("ABC")
        .stop("far", 900_000.0)
        .stop("null", 0, lon=0.0, lat=0.0)
        .stop("none", 0, lon=None, lat=None)
        .both("red", "A null B none C far")
        .network()
    )
    assert [station.id for station in network.stations] == ["A", "B", "C"]
    reasons = {out.id: out.reason for out in network.left_out if out.kind == "stop"}
    assert set(reasons) == {"far", "null", "none"}
    assert "300 km" in reasons["far"]
    assert network.lines[0].itineraries == (("A", "B", "C"),)


def test_the_ends_of_a_country_are_no_outliers(town):
    """Stops every 100 km: the outermost lie 500 km from the middle one, twice the median."""
    ids = [f"c{n:02d}" for n in range(11)]
    country = town.row(ids, 100_000.0).both("red", ids)
    assert len(country.network().stations) == 11
    alone = country.network(outlier_spreads=0.0)
    assert {o.id for o in alone.left_out if "300 km" in o.reason} == {"c00", "c01", "c09", "c10"}
    wide = country.stop("far", 9_000_000.0).both("blue", "c05 far")
    assert "far" not in {station.id for station in wide.network().stations}


@pytest.mark.parametrize(
    ("one", "other"),
    [
        ("Mill Lane (school)", "Mill Lane"),
        ("Mill Lane inbound", "Mill Lane Outbound"),
        ("Mill Lane - C2", "Mill Lane B104"),
        ("Mill Lane, bay 3", "Mill Lane"),
        ("Oak/Elm", "Elm & Oak"),
    ],
)
def test_names_alike_but_for_the_kerb(one, other):
    assert loose_key(one) == loose_key(other) != ""
    assert name_key(one) != name_key(other)


def test_names_that_only_look_alike():
    assert loose_key("Mill Lane") != loose_key("Mill Street")
    assert loose_key("12 Street") != loose_key("14 Street")
    assert loose_key("Gate 9") == ""
    assert name_key("Cafe\u0301") == name_key("CAF\u00c9")


def test_natural_order():
    assert sorted(["10", "9", "10A", "X1", "1"], key=natural_key) == ["1", "9", "10", "10A", "X1"]
    assert natural_key("9" * 5000) > natural_key("10")
