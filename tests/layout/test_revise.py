"""A revised layout keeps what stands and gives what is new a place that keeps the guarantees."""

from __future__ import annotations

import itertools
import math

import pytest
import shapely
from generated_networks import network_of, radial_network
from hypothesis import given, settings
from hypothesis import strategies as st

from gtfs_schematic.layout.check import faults
from gtfs_schematic.layout.detour import STEPS, courses_between
from gtfs_schematic.layout.engine import lay_out
from gtfs_schematic.layout.keep import Standing
from gtfs_schematic.layout.model import Clearances, Layout, LayoutSettings, SheetFrame
from gtfs_schematic.layout.revise import revise_layout
from gtfs_schematic.network.model import Network

CLEARANCES = Clearances(1.6, 0.35, 2.6, 3.2, 5.5, {})
TIGHT = Clearances(4.0, 0.5, 5.0, 3.2, 9.0, {})
FRAME = SheetFrame(420.0, 297.0, 12.0, 30.0, 408.0, 257.0)
PLACES = {
    "A": (0.0, 0.0), "B": (1.0, 0.1), "C": (2.0, 0.0), "D": (3.0, 0.2), "E": (4.0, 0.1),
    "N": (2.1, 1.0), "O": (2.0, 2.1), "S": (1.9, -1.0), "T": (2.1, -2.0),
}  # fmt: skip
BASE = ["ABCDE", "ONCST"]


@pytest.fixture(scope="module")
def old() -> Layout:
    settings = LayoutSettings(effort="quick")
    return lay_out(network_of(PLACES, BASE), settings, CLEARANCES, [FRAME])


def revised(old: Layout, network: Network, *, moving: bool = False) -> Layout:
    paths = {**old.paths, **old.walk_paths}
    found = revise_layout(network, Standing(old.positions, paths, FRAME), CLEARANCES)
    assert found is not None
    if moving:
        assert faults(found.layout, CLEARANCES) == ()
        return found.layout
    assert found.moved == ()
    new = found.layout
    assert faults(new, CLEARANCES) == ()
    kept = [s for s in new.positions if s in old.positions]
    assert all(new.positions[s] == old.positions[s] for s in kept)
    return new


def test_nothing_changed_nothing_moves(old: Layout):
    new = revised(old, old.network)
    assert new == old


def test_a_closed_station_joins_its_links(old: Layout):
    new = revised(old, network_of(PLACES, ["ACDE", "ONCST"]))
    joined = shapely.LineString([*old.paths["A-B"], *old.paths["B-C"]])
    assert shapely.LineString(new.paths["A-C"]).equals(joined)


def test_an_opened_station_stands_on_the_link_it_divides(old: Layout):
    places = PLACES | {"M": (3.5, 0.15)}
    new = revised(old, network_of(places, ["ABCDME", "ONCST"]))
    link = shapely.LineString(old.paths["D-E"])
    assert link.distance(shapely.Point(new.positions["M"])) < 0.005
    assert new.paths["A-B"] == old.paths["A-B"]


def test_an_extension_goes_on_beyond_the_terminus(old: Layout):
    places = PLACES | {"F": (5.0, 0.1), "G": (6.0, 0.1)}
    new = revised(old, network_of(places, ["ABCDEFG", "ONCST"]))
    x = [new.positions[s][0] for s in "DEFG"]
    assert x == sorted(x)


def test_a_new_line_crosses_what_the_ground_makes_it_cross(old: Layout):
    places = PLACES | {"U": (0.4, 0.9), "V": (1.5, -1.2)}
    new = revised(old, network_of(places, [*BASE, "UV"]))
    assert [(c.first, c.second) for c in new.crossings] == [("A-B", "U-V")] or [
        (c.first, c.second) for c in new.crossings
    ] == [("B-C", "U-V")]


def test_a_new_line_crosses_a_link_of_its_own_first_station(old: Layout):
    places = PLACES | {"X": (0.5, 0.6), "Y": (0.6, -0.8)}
    new = revised(old, network_of(places, [*BASE, "AXY"]), moving=True)
    assert [(c.first, c.second) for c in new.crossings] == [("A-B", "X-Y")]


def test_what_finds_no_gap_makes_room_in_its_neighbourhood():
    """Between two lines 9 mm apart there is no room for a third, 4 mm wide, until one gives way."""
    rows = [[f"{row}{i}" for i in range(8)] for row in "LM"]
    ground = {key: (float(i), float(y)) for y, row in enumerate(rows) for i, key in enumerate(row)}
    courses = [*rows, ["L0", "M0"], ["L7", "M7"]]
    at = {key: (60.0 + 20.0 * x, 150.0 - 9.0 * y) for key, (x, y) in ground.items()}
    standing = Standing(
        at,
        {f"{a}-{b}": (at[a], at[b]) for row in courses for a, b in itertools.pairwise(row)},
        FRAME,
    )
    between = {f"N{i}": (1.5 + i, 0.5) for i in range(5)}
    network = network_of(ground | between, [*courses, ["L1", *between, "M6"]])
    found = revise_layout(network, standing, TIGHT)
    assert found is not None
    assert faults(found.layout, TIGHT) == ()
    assert found.moved
    # Every move is told, and nothing else moved.
    moved = {m.station_id: m for m in found.moved}
    for station, place in at.items():
        far = math.dist(place, found.layout.positions[station])
        assert (station in moved) == (far > 0.01)
        if station in moved:
            assert moved[station].length_mm == pytest.approx(far, abs=0.01)
            assert moved[station].because in found.layout.paths


def test_a_withdrawn_line_leaves_the_rest_where_it_is(old: Layout):
    new = revised(old, network_of(PLACES, ["ABCDE"]))
    assert set(new.paths) == {"A-B", "B-C", "C-D", "D-E"}


@settings(max_examples=10)
@given(st.integers(0, 30), st.integers(0, 7), st.integers(0, 7))
def test_links_added_to_a_radial_network(seed: int, first: int, second: int):
    base = radial_network(seed, 8, 1, 5)
    layout = lay_out(base, LayoutSettings(effort="quick"), CLEARANCES, [FRAME])
    a, b = f"A{first}N05", f"A{second}N05"
    if first == second or abs(first - second) in (1, 7) or abs(first - second) == 4:
        return
    courses = [line.courses[0] for line in base.lines]
    places = {s.id: (s.lon / 0.009, s.lat / 0.009) for s in base.stations}
    network = network_of(places, [*courses, [a, b]])
    paths = {**layout.paths, **layout.walk_paths}
    found = revise_layout(network, Standing(layout.positions, paths, FRAME), CLEARANCES)
    # No room is an honest answer; what is drawn keeps every guarantee.
    assert found is None or faults(found.layout, CLEARANCES) == ()


@given(st.integers(-4000, 4000), st.integers(-4000, 4000))
def test_courses_arrive_and_keep_the_directions(dx: int, dy: int):
    every = tuple(range(8))
    for course in courses_between((0, 0), (dx, dy), every, every, 6.0)[:50]:
        assert course.corners[0] == (0, 0)
        assert course.corners[-1] == (dx, dy)
        headings = []
        for (ax, ay), (bx, by) in itertools.pairwise(course.corners):
            step = max(abs(bx - ax), abs(by - ay))
            headings.append(STEPS.index(((bx - ax) // step, (by - ay) // step)))
        turns = [min((p - q) % 8, (q - p) % 8) for p, q in itertools.pairwise(headings)]
        assert all(turn in {1, 2} for turn in turns)
