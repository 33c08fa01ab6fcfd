"""Pairs and routes that a diagram shows wrongly, on drawings made to do so."""

from __future__ import annotations

from dataclasses import replace

import pytest
import small_diagrams
from small_diagrams import Drawn, Named, Stop, rail

from gtfs_schematic.drift.measure import measure_edition
from gtfs_schematic.drift.model import DriftSettings


def test_rows_that_are_drawn_near_and_lie_far_are_false_neighbors():
    found = measure_edition(small_diagrams.comb(b_mm=9.0)).false_neighbors
    assert {(p.start, p.end) for p in found} == {(f"a{i}", f"b{i}") for i in range(5)}
    assert all(p.true_m == pytest.approx(4000, rel=0.01) for p in found)
    assert all(p.drawn_mm == pytest.approx(9) for p in found)
    # Six trips of A and two of B leave all stations but the last.
    assert [p.departures for p in found] == [8, 8, 8, 8, 0]
    assert (found[-1].start, found[-1].end) == ("a4", "b4")


@pytest.mark.parametrize(
    ("b_mm", "told"),
    [(9.0, 5), (10.0, 5), (10.5, 0), (40.0, 0)],
)
def test_false_neighbors_look_a_typical_link_apart_at_most(b_mm, told):
    assert len(measure_edition(small_diagrams.comb(b_mm=b_mm)).false_neighbors) == told


def test_false_neighbors_that_a_link_or_walk_joins_are_told_by_the_diagram():
    diagram = small_diagrams.comb(b_mm=9.0)
    joined = rail("x", diagram.stations[0], diagram.stations[5], time_s=600)
    for part in ("links", "walks"):
        more = replace(diagram, **{part: (*getattr(diagram, part), joined)})
        pairs = {(p.start, p.end) for p in measure_edition(more).false_neighbors}
        assert ("a0", "b0") not in pairs
        assert ("a1", "b1") in pairs


def test_thresholds_move():
    diagram = small_diagrams.comb(b_mm=9.0)
    assert measure_edition(diagram, DriftSettings(false_far_m=5000)).false_neighbors == ()
    assert measure_edition(diagram, DriftSettings(misleading_factor=9)).false_neighbors == ()


def test_rows_that_are_near_and_drawn_far_hide_walks():
    found = measure_edition(small_diagrams.comb(b_mm=60.0, gap_m=300.0)).hidden_walks
    assert {(p.start, p.end) for p in found} == {(f"a{i}", f"b{i}") for i in range(5)}
    assert all(p.drawn_links == pytest.approx(6) for p in found)
    assert measure_edition(small_diagrams.comb(b_mm=5.0, gap_m=300.0)).hidden_walks == ()
    assert measure_edition(small_diagrams.comb(b_mm=60.0, gap_m=600.0)).hidden_walks == ()


def test_walks_that_are_drawn_are_not_hidden():
    diagram = small_diagrams.comb(b_mm=60.0, gap_m=300.0)
    walk = rail("w", diagram.stations[0], diagram.stations[5], time_s=300)
    pairs = {
        (p.start, p.end) for p in measure_edition(replace(diagram, walks=(walk,))).hidden_walks
    }
    assert ("a0", "b0") not in pairs
    assert len(pairs) == 4


def test_without_a_timetable_departures_are_unknown():
    found = measure_edition(replace(small_diagrams.comb(b_mm=9.0), patterns=())).false_neighbors
    assert [p.departures for p in found] == [None] * 5


def lens(north_mm: float) -> Drawn:
    """Draw two ways from A to D, with tails: over B 2.8 km, over C 3.6 km, C `north_mm` off."""
    a, d = Stop("a", 0, 0, 0, 0, "a"), Stop("d", 2000, 0, 20, 0, "d")
    b, c = Stop("b", 1000, 1000, 10, -10, "b"), Stop("c", 1000, -1500, 10, north_mm, "c")
    ends = [
        Stop(f"t{i}", x, y, x / 100, -y / 100, f"t{i}")
        for i, (x, y) in enumerate([(-1000, 500), (-1000, -500), (3000, 500), (3000, -500)])
    ]
    links = [
        rail("ab", a, b, "1"),
        rail("bd", b, d, "1"),
        rail("ac", a, c, "2"),
        rail("cd", c, d, "2"),
        rail("ta", ends[0], a, "1"),
        rail("ua", ends[1], a, "2"),
        rail("td", ends[2], d, "1"),
        rail("ud", ends[3], d, "2"),
    ]
    return Drawn((a, b, c, d, *ends), tuple(links), (), (Named("1", "1"), Named("2", "2")))


# By hand: true ways 2 x 1414 m and 2 x 1803 m; drawn 2 x 14.14 mm and 2 x hypot(10, y).
@pytest.mark.parametrize(
    ("y", "told"), [(15.0, 0), (19.0, 0), (19.5, 1), (24.0, 1), (11.0, 1), (11.3, 0)]
)
def test_competing_routes_by_hand(y, told):
    found = measure_edition(lens(y)).competing
    assert len(found) == told
    if told:
        (routes,) = found
        assert (routes.first, routes.second) == (("a", "b", "d"), ("a", "c", "d"))
        ratio = ((100 + y * y) / 200) ** 0.5 / (3.25e6 / 2e6) ** 0.5
        assert routes.difference == pytest.approx(ratio - 1, rel=1e-3)


def test_routes_with_two_changes_do_not_compete():
    diagram = lens(24.0)
    lines = {"ac": ("3",), "cd": ("4",)}
    links = tuple(replace(k, lines=lines.get(k.id, k.lines)) for k in diagram.links)
    named = (*diagram.lines, Named("3", "3"), Named("4", "4"))
    assert len(measure_edition(replace(diagram, links=links, lines=named)).competing) == 1
    # A stop more on the way, with a change at either: two changes.
    a, b, c, d, *ends = diagram.stations
    e = replace(c, id="e", x_m=1200, x_mm=12)
    parts = [k for k in links if k.id != "cd"]
    parts += [rail("ce", c, e, "5"), rail("ed", e, d, "4")]
    more = Drawn((a, b, c, d, *ends, e), tuple(parts), (), (*named, Named("5", "5")))
    assert measure_edition(more).competing == ()


def test_long_ways_round_do_not_compete():
    assert measure_edition(lens(24.0), DriftSettings(competing_detour=1.2)).competing == ()


def test_the_worked_diagram_misleads():
    report = measure_edition(small_diagrams.two_ways())
    assert report.competing == ()  # its stations are no junctions: both lines go on together
    assert report.journeys.largest > 1.8
