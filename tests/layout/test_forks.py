"""Stations with more neighbours than directions: neighbouring links leave together and part."""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
import shapely
from generated_networks import hub_network, network_of, star_network
from hypothesis import given, settings
from hypothesis import strategies as st

from gtfs_schematic.config import Settings
from gtfs_schematic.drawing import check as drawing_check
from gtfs_schematic.drawing.compose import compose
from gtfs_schematic.layout.anchors import anchor_points
from gtfs_schematic.layout.check import faults
from gtfs_schematic.layout.engine import lay_out
from gtfs_schematic.layout.forks import fork
from gtfs_schematic.layout.keep import Standing
from gtfs_schematic.layout.model import Clearances, Layout, LayoutSettings, SheetFrame
from gtfs_schematic.layout.planarise import planarise
from gtfs_schematic.layout.plane import PlaneGraph
from gtfs_schematic.layout.revise import revise_layout
from gtfs_schematic.network.model import Network
from gtfs_schematic.pipeline import labelled_anew
from gtfs_schematic.progress import Silent

CLEARANCES = Clearances(1.6, 0.35, 2.6, 3.2, 5.5, {})
FRAMES = tuple(
    SheetFrame(w, h, 12.0, 30.0, w - 12.0, h - 40.0) for w, h in ((210.0, 297.0), (420.0, 594.0))
)
QUICK = LayoutSettings(effort="quick")


def leaving(layout: Layout, station: str) -> list[float]:
    """Bearings in which links leave a station."""
    bearings = []
    for link in layout.network.links:
        path = layout.paths[link.id]
        for here, way in ((link.start, path), (link.end, path[::-1])):
            if here == station:
                (ax, ay), (bx, by) = way[:2]
                bearings.append(round(math.atan2(by - ay, bx - ax), 6))
    return bearings


@pytest.mark.parametrize("arms", [9, 12, 16, 27])
def test_a_star_of_any_degree(arms: int):
    layout = lay_out(star_network(1, arms), QUICK, CLEARANCES, FRAMES)
    assert faults(layout, CLEARANCES) == ()
    bearings = leaving(layout, "C")
    assert len(bearings) == arms
    assert len(set(bearings)) == 8
    assert layout.crossings == ()


def test_eight_links_leave_in_directions_of_their_own():
    layout = lay_out(star_network(2, 8), QUICK, CLEARANCES, FRAMES)
    assert len(set(leaving(layout, "C"))) == 8


@pytest.mark.parametrize("network", [star_network(3, 12), hub_network()], ids=["star", "hub"])
def test_a_busy_hub_is_drawn_from_end_to_end(network: Network):
    # Every stage is checked on the way; what a check faults is an error.
    wanted = Settings(layout=QUICK)
    labelled = labelled_anew(network, wanted, {}, Silent())
    drawing = compose(labelled, wanted.drawing)
    assert drawing_check.faults(drawing, network, unnamed=labelled.unplaced) == ()
    bundled = labelled.bundled
    stems = set(bundled.forked.network.link) - set(network.link)
    assert len(stems) >= 2
    # Under the marker lines may cross, at forks they need not.
    assert bundled.quality.crossings == bundled.quality.crossings_bound


def test_leaving_together_without_need_is_a_fault():
    network = network_of({"A": (0, 0), "B": (1, 0), "C": (1, -0.8)}, ["AB", "AC"])
    at = {"A": (50.0, 50.0), "B": (90.0, 50.0), "C": (90.0, 80.0)}
    paths = {"A-B": (at["A"], at["B"]), "A-C": (at["A"], (60.0, 50.0), at["C"])}
    layout = Layout(network, FRAMES[0], at, paths, {}, ())
    assert "At A 2 links and walks leave in only 1 directions." in faults(layout, CLEARANCES)


def test_links_that_part_on_the_wrong_side_are_a_fault():
    layout = lay_out(star_network(1, 9), QUICK, CLEARANCES, FRAMES)
    assert faults(layout, CLEARANCES) == ()
    together = [
        (a, b)
        for a, b in itertools.combinations(sorted(layout.paths), 2)
        if shapely.LineString(layout.paths[a])
        .intersection(shapely.LineString(layout.paths[b]))
        .length
        > 0.1
    ]
    assert len(together) == 1
    # The mirror image of the sheet has every order wrong, and those that part, too.
    turned = {
        key: tuple((FRAMES[0].width_mm - x, y) for x, y in path)
        for key, path in layout.paths.items()
    }
    at = {key: (FRAMES[0].width_mm - x, y) for key, (x, y) in layout.positions.items()}
    mirrored = Layout(layout.network, layout.sheet, at, turned, {}, ())
    assert any("order of links round C" in fault for fault in faults(mirrored, CLEARANCES))


def contracted(graph: PlaneGraph, vertex: int) -> list[int]:
    """Give the ends round a vertex in order as if all its stems had shrunk to nothing."""
    found: list[int] = []
    for end in graph.rotation[vertex]:
        far = graph.pieces[end // 2].ends[1 - end % 2]
        if far in graph.forks and end % 2 == 0 and graph.pieces[end // 2].ends[0] == vertex:
            inner = contracted(graph, far)
            back = 2 * (end // 2) + 1
            around = list(graph.rotation[far])
            assert back in around
            k = inner.index(back)
            found += inner[k + 1 :] + inner[:k]
        else:
            found.append(end)
    return found


def ends(graph: PlaneGraph, piece: int) -> int:
    """Give the vertex at which a piece ends."""
    return graph.pieces[piece].ends[1]


@settings(max_examples=15, deadline=None)
@given(st.integers(0, 10**6), st.integers(4, 40), st.integers(4, 8))
def test_forks_keep_the_cyclic_order_and_what_lines_pass(seed: int, arms: int, ports: int):
    graph = planarise(star_network(seed, arms, 1))
    anchors = anchor_points(graph, 0.35)
    forked, places = fork(graph, anchors, ports)
    if arms <= ports:
        assert forked is graph
        return
    assert max(len(around) for around in forked.rotation) <= ports
    centre = graph.station_of.index("C")
    before, after = list(graph.rotation[centre]), contracted(forked, centre)
    k = after.index(before[0])
    assert after[k:] + after[:k] == before
    # Nothing crosses where the points stand.
    lines = shapely.linestrings(places[forked.segments])
    assert not shapely.STRtree(lines).query(lines, predicate="crosses").size
    # Every line that passes the centre passes every fork that it meets.
    lines_in = sum(count for _, _, _, count in graph.through)
    assert sum(n for v, _, _, n in forked.through if v == centre) == lines_in
    for v in forked.forks:
        stem = next(p for p in range(len(graph.pieces), len(forked.pieces)) if ends(forked, p) == v)
        others = [forked.pieces[end // 2] for end in forked.rotation[v] if end // 2 != stem]
        assert len(others) == len(forked.rotation[v]) - 1
        passing = sum(n for w, _, _, n in forked.through if w == v)
        assert passing == sum(len(piece.lines) for piece in others)
    assert np.isfinite(places).all()


def test_a_revised_network_keeps_a_hub_as_it_stands():
    old = star_network(1, 12)
    layout = lay_out(old, QUICK, CLEARANCES, FRAMES)
    standing = Standing(layout.positions, {**layout.paths, **layout.walk_paths}, layout.sheet)
    same = revise_layout(old, standing, CLEARANCES)
    assert same is not None
    assert (same.layout.positions, same.layout.paths) == (layout.positions, layout.paths)
    # One arm gets longer by a station: the hub stays.
    places = {s.id: (s.lon / 0.009, s.lat / 0.009) for s in old.stations}
    (x, y), courses = places["A02N2"], [list(line.courses[0]) for line in old.lines]
    places["A02N3"] = (x * 1.5, y * 1.5)
    grown = [["A02N3", *course] if course[0] == "A02N2" else course for course in courses]
    revised = revise_layout(network_of(places, grown), standing, CLEARANCES)
    assert revised is not None
    assert faults(revised.layout, CLEARANCES) == ()
    kept = {key: at for key, at in revised.layout.positions.items() if key != "A02N3"}
    assert sum(at != layout.positions[key] for key, at in kept.items()) <= 2
