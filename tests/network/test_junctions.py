"""Lines on one street are one bundle, from the junction where they join to where they part."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from gtfs_schematic.network.between import from_station_to_station, idle_junctions
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.check import faults
from gtfs_schematic.network.ground import Ground
from gtfs_schematic.network.model import Network, NetworkSettings

_GROUND = Ground(12.0, 45.0)


def _places(network: Network) -> list[tuple[int, int]]:
    """Give the junctions in metres from the town's corner, to the nearest hundred."""
    metres = _GROUND.metres([(j.lon, j.lat) for j in network.junctions])
    return sorted((int(round(x, -2)), int(round(y, -2))) for x, y in metres)


def _course(network: Network, line: str) -> str:
    return " ".join(
        "+" if node in network.junction else node for node in network.line[line].courses[0]
    )


def _shared(network: Network) -> float:
    """Give the length of all links that carry more than one line, metres."""
    nodes = (*network.stations, *network.junctions)
    metres = _GROUND.metres([(node.lon, node.lat) for node in nodes])
    at = {node.id: place for node, place in zip(nodes, metres, strict=True)}
    return sum(
        float(np.hypot(*(at[link.start] - at[link.end])))
        for link in network.links
        if len(link.lines) > 1
    )


A_LINE = (
    "a",
    {"A0": (0, -900), "A1": (1000, 0), "A2": (2000, 0), "A9": (3000, -900)},
    [(0, -900), (0, 0), (3000, 0), (3000, -900)],
)


def test_interleaved_stops_of_one_street_are_one_bundle_between_two_junctions(town):
    b = {"B0": (0, 900), "B1": (1500, 0), "B2": (2500, 0), "B9": (3000, 900)}
    network = town.buses(A_LINE, ("b", b, [(0, 900), (0, 0), (3000, 0), (3000, 900)])).network()
    assert faults(network) == ()
    assert _places(network) == [(0, 0), (3000, 0)]
    assert _course(network, "a") == "A0 + A1 B1 A2 B2 + A9"
    assert _course(network, "b") == "B0 + A1 B1 A2 B2 + B9"
    assert _shared(network) == pytest.approx(3000.0, abs=60.0)
    assert network.station["A1"].lines == ("a",)
    assert {s.kind for s in network.stations} == {"stop", "terminus"}


def test_a_street_without_stops_is_one_link_from_junction_to_junction(town):
    network = town.buses(
        ("a", {"A0": (0, -900), "A9": (3000, -900)}, A_LINE[2]),
        ("b", {"B0": (0, 900), "B9": (3000, 900)}, [(0, 900), (0, 0), (3000, 0), (3000, 900)]),
    ).network()
    assert faults(network) == ()
    assert _course(network, "a") == "A0 + + A9"
    assert _course(network, "b") == "B0 + + B9"
    assert [link.lines for link in network.links if len(link.lines) > 1] == [("a", "b")]
    ways = from_station_to_station(network)
    assert [(way.start, way.end, len(way.via), len(way.links)) for way in ways] == [
        ("A0", "A9", 2, 3),
        ("B0", "B9", 2, 3),
    ]


@pytest.mark.parametrize("aside", [0.0, 40.0])
def test_lines_that_leave_a_station_together_part_where_they_fork(town, aside):
    network = town.buses(
        ("a", {"H": (0, 0), "A9": (3000, 0)}, [(0, 0), (3000, 0)]),
        ("b", {"H": (0, 0), "B9": (2000, 1500)}, [(0, aside), (1200, aside), (2000, 1500)]),
    ).network()
    assert faults(network) == ()
    assert _places(network) == [(1200, 0)]
    assert (_course(network, "a"), _course(network, "b")) == ("A9 + H", "B9 + H")


def test_lines_that_cross_do_not_join(town):
    network = town.buses(
        ("a", {"A0": (0, 0), "A9": (3000, 0)}, [(0, 0), (3000, 0)]),
        ("b", {"B0": (1500, -1500), "B9": (1500, 1500)}, [(1500, -1500), (1500, 1500)]),
    ).network()
    assert network.junctions == ()
    assert len(network.links) == 2


@pytest.mark.parametrize(("together", "count"), [(200, 0), (400, 2)])
def test_lines_join_only_for_a_while(town, together, count):
    x = 1500 + together
    b = [(1500, -1500), (1500, 0), (x, 0), (x, 1500)]
    network = town.buses(
        ("a", {"A0": (0, 0), "A9": (3000, 0)}, [(0, 0), (3000, 0)]),
        ("b", {"B0": (1500, -1500), "B9": (x, 1500)}, b),
    ).network()
    assert faults(network) == ()
    assert len(network.junctions) == count


@pytest.mark.parametrize(("apart", "count"), [(50, 2), (150, 0)])
def test_a_one_way_pair_of_streets_is_one_if_it_is_close(town, apart, count):
    east = [(0, -900), (0, 0), (3000, 0), (3000, -900)]
    west = [(3000, 900), (3000, apart), (0, apart), (0, 900)]
    town = town.stops({"A0": (0, -900), "A9": (3000, -900), "B0": (0, 900), "B9": (3000, 900)})
    town = town.route("a", mode="bus").route("b", mode="bus").shape("east", east)
    town = town.shape("west", west).run("a", "A0 A9", shape="east").run("b", "B9 B0", shape="west")
    network = town.network()
    assert faults(network) == ()
    assert len(network.junctions) == count
    # Either direction can be told, on every link.
    assert all(len(line.one_way_links) == len(line.courses[0]) - 1 for line in network.lines)


def test_a_third_line_splits_the_street_of_two(town):
    b = {"B0": (0, 900), "B9": (3000, 900)}
    c = {"C0": (1000, 900), "C9": (2000, -900)}
    network = town.buses(
        ("a", {"A0": (0, -900), "A9": (3000, -900)}, A_LINE[2]),
        ("b", b, [(0, 900), (0, 0), (3000, 0), (3000, 900)]),
        ("c", c, [(1000, 900), (1000, 0), (2000, 0), (2000, -900)]),
    ).network()
    assert faults(network) == ()
    assert _places(network) == [(0, 0), (1000, 0), (2000, 0), (3000, 0)]
    assert sorted(len(link.lines) for link in network.links) == [1] * 6 + [2, 2, 3]


def test_tracks_off_the_street_do_not_join(town):
    network = town.buses(
        ("a", {"A0": (0, -900), "A9": (3000, -900)}, A_LINE[2]),
        ("b", {"B0": (0, 900), "B9": (3000, 900)}, [(0, 900), (0, 0), (3000, 0), (3000, 900)]),
    )
    routes = tuple(replace(route, mode="metro") for route in network.timetable.routes)
    assert network._with(routes=routes).network().junctions == ()


def test_without_shapes_and_by_wish_links_run_from_station_to_station(busy_town, town):
    assert busy_town.network() == busy_town.network(corridors="stations")
    b = {"B0": (0, 900), "B9": (3000, 900)}
    shaped = town.buses(A_LINE, ("b", b, [(0, 900), (0, 0), (3000, 0), (3000, 900)]))
    assert shaped.network().junctions
    assert shaped.network(corridors="stations").junctions == ()


def test_junctions_say_where_they_are_and_depend_on_no_order(town):
    b = {"B0": (0, 900), "B9": (3000, 900)}
    shaped = town.buses(A_LINE, ("b", b, [(0, 900), (0, 0), (3000, 0), (3000, 900)]))
    table = shaped.timetable
    turned = replace(
        table,
        patterns=table.patterns[::-1],
        stops=table.stops[::-1],
        routes=table.routes[::-1],
        shapes=dict(reversed(table.shapes.items())),
    )
    network = shaped.network()
    assert build_network(turned, NetworkSettings()) == network
    for junction in network.junctions:
        lon, lat = map(float, junction.id.removeprefix("@").split(","))
        assert (lon, lat) == pytest.approx((junction.lon, junction.lat), abs=1e-5)


def test_a_junction_at_which_nothing_parts_any_more_is_idle():
    courses = [("A", "j", "k", "B"), ("C", "j", "k", "D")]
    assert idle_junctions(courses, ["j", "k"]) == frozenset()
    assert idle_junctions(courses[:1], ["j", "k"]) == {"j", "k"}
    # Once k is gone, nothing but two links to E is left at j.
    assert idle_junctions([("A", "j", "k", "E"), ("A", "j", "E")], ["j", "k"]) == {"j", "k"}


_BLOCK_M = 700


@st.composite
def _walks(draw: st.DrawFn) -> list[tuple[list[tuple[int, int]], list[int]]]:
    """Give lines that walk the streets of a grid, each with stops at some of its corners."""
    lines = []
    for _ in range(draw(st.integers(2, 4))):
        x, y = draw(st.integers(0, 3)), draw(st.integers(0, 3))
        corners = [(x, y)]
        for turn in draw(st.lists(st.sampled_from([(1, 0), (0, 1), (0, -1)]), min_size=2)):
            step = (corners[-1][0] + turn[0], corners[-1][1] + turn[1])
            if 0 <= step[0] <= 5 and 0 <= step[1] <= 3 and step not in corners:
                corners.append(step)
        if len(corners) > 2:
            marks = draw(st.lists(st.booleans(), min_size=len(corners), max_size=len(corners)))
            marks[0] = marks[-1] = True
            lines.append((corners, [i for i, mark in enumerate(marks) if mark]))
    return lines


@settings(max_examples=60)
@given(_walks())
def test_every_line_keeps_to_its_streets_and_calls_in_order(town, lines):
    if not lines:
        return
    shapes = {}
    for n, (corners, marks) in enumerate(lines):
        # Stops of a line of its own stand a little past the corner, on its side of the street.
        points = [(_BLOCK_M * x, _BLOCK_M * y) for x, y in corners]
        shapes[f"l{n}"] = shapely.LineString(points)
        stops = {f"{n}.{i}": (points[i][0] + 3 * n, points[i][1] - 3 * n) for i in marks}
        town = town.buses((f"l{n}", stops, points))
    network = town.network(merge_hub_m=0.0, merge_kerbs_m=0.0)
    assert faults(network) == ()
    station_of = {stop: s.id for s in network.stations for stop in s.stop_ids}
    for line in network.lines:
        calls = tuple(station_of[f"{line.id[1:]}.{i}"] for i in lines[int(line.id[1:])][1])
        assert line.itineraries in ((calls,), (calls[::-1],))
        places = {j.id: (j.lon, j.lat) for j in network.junctions}
        for node in set(line.courses[0]) & set(places):
            at = shapely.Point(_GROUND.metres([places[node]])[0])
            # Ends of streets that part lie a snap apart at most.
            assert shapes[line.id].distance(at) < 200.0


def test_stops_at_one_point_of_a_shape_are_no_street(town):
    """Here stops stand beside the same end of a shape, which leads nowhere between them."""
    b = {"B0": (0, 200), "B1": (0, 100), "B9": (2000, 0)}
    network = town.buses(A_LINE, ("b", b, [(0, 0), (2000, 0)])).network()
    assert faults(network) == ()
    assert network.line["b"].itineraries == (("B0", "B1", "B9"),)
    c = {"C0": (0, 200), "C1": (0, 150)}
    network = town.buses(A_LINE, ("c", c, [(0, 0), (0.001, 0)])).network()
    assert faults(network) == ()
    assert _course(network, "c") == "C0 C1"


def test_a_junction_of_a_pattern_that_another_shows_is_none(town):
    """The short working leaves the street where the long one does, at no stop of its own."""
    points = [(0, 0), (3000, 0), (3000, 900)]
    long = town.buses(("a", {"A0": (0, 0), "A1": (3000, 400), "A9": (3000, 900)}, points))
    network = long.shape("short", [(0, 0), (3000, 0), (3000, 400)])
    network = network.both("a", "A0 A1", shape="short").network()
    assert faults(network) == ()
    assert network.junctions == ()
