"""The guarantees of a layout hold on networks of every kind, as its own check measures them."""

from __future__ import annotations

import cmath
import dataclasses
import itertools

import networkx as nx
import pytest
import shapely
from generated_networks import network_of, radial_network, wandering_network
from hypothesis import given, settings
from hypothesis import strategies as st

from gtfs_schematic.errors import LayoutError
from gtfs_schematic.layout.check import faults
from gtfs_schematic.layout.engine import lay_out
from gtfs_schematic.layout.model import (
    Clearances,
    Layout,
    LayoutSettings,
    SheetFrame,
)
from gtfs_schematic.network.model import Network

CLEARANCES = Clearances(1.6, 0.35, 2.6, 3.2, 5.5, {})
FRAMES = tuple(
    SheetFrame(w, h, 12.0, 30.0, w - 12.0, h - 40.0)
    for w, h in ((210.0, 297.0), (420.0, 594.0), (1189.0, 841.0), (1682.0, 2378.0))
)
QUICK = LayoutSettings(effort="quick")


def laid(network: Network, settings: LayoutSettings = QUICK) -> Layout:
    layout = lay_out(network, settings, CLEARANCES, FRAMES)
    assert faults(layout, CLEARANCES) == ()
    return layout


@settings(max_examples=12)
@given(st.integers(0, 10**6), st.integers(3, 9), st.integers(1, 9), st.integers(3, 14))
def test_wandering_lines(seed: int, side: int, lines: int, length: int):
    laid(wandering_network(seed, side, lines, length))


@pytest.mark.parametrize(("arms", "rings", "stations"), [(4, 0, 3), (6, 1, 6), (8, 2, 9)])
def test_radial_networks(arms: int, rings: int, stations: int):
    layout = laid(radial_network(1, arms, rings, stations))
    # Radii and rings meet only at stations: nothing crosses.
    assert layout.crossings == ()


def test_two_stations():
    layout = laid(network_of({"A": (0, 0), "B": (1, 0.1)}, ["AB"]))
    (ax, ay), (bx, by) = layout.positions["A"], layout.positions["B"]
    assert ay == by
    assert bx - ax >= CLEARANCES.spacing_mm


def test_a_ring_line_of_its_own():
    places = {"A": (0, 0), "B": (2, 0), "C": (2, 2), "D": (0, 2), "E": (-1, 1)}
    layout = laid(network_of(places, ["ABCDEA"]))
    ring = shapely.polygonize([shapely.LineString(path) for path in layout.paths.values()])
    assert len(ring.geoms) == 1


def test_parts_without_a_common_station():
    places = {"A": (0, 0), "B": (1, 0), "C": (2, 0), "X": (0, 9), "Y": (1, 9)}
    layout = laid(network_of(places, ["ABC", "XY"]))
    assert layout.positions["X"][1] < layout.positions["A"][1]


def test_a_crossing_without_a_station_stays_one():
    places = {"A": (-1, -1), "B": (1, 1), "C": (-1, 1), "D": (1, -1)}
    layout = laid(network_of(places, ["AB", "CD"]))
    assert [(c.first, c.second) for c in layout.crossings] == [("A-B", "C-D")]
    first, second = (shapely.LineString(layout.paths[k]) for k in ("A-B", "C-D"))
    assert shapely.Point(layout.crossings[0].at_mm).distance(first.intersection(second)) < 1e-9


def test_a_terminal_loop():
    places = {c: (i * 0.8, 0.0) for i, c in enumerate("ABCD")}
    places |= {"E": (4.0, 0.6), "F": (4.0, -0.6)}
    layout = laid(network_of(places, ["ABCDEFD"]))
    assert set(layout.paths) == {"A-B", "B-C", "C-D", "D-E", "D-F", "E-F"}


def test_a_walk_is_drawn_like_a_link_but_short():
    places = {c: (i * 0.8, 0.0) for i, c in enumerate("ABCD")}
    places |= {c: (0.8 + (i - 1) * 0.1, 0.2 + (i - 1) * 0.9) for i, c in enumerate("UVW")}
    layout = laid(network_of(places, ["ABCD", "UVW"], [("B", "V")]))
    walk = shapely.LineString(layout.walk_paths["walk B-V"])
    assert walk.length < shapely.LineString(layout.paths["C-D"]).length * 1.5


def test_a_sheet_too_small_is_refused_with_the_size_needed():
    network = radial_network(1, 8, 2, 9)
    with pytest.raises(LayoutError, match=r"needs at least \d+ × \d+ mm"):
        lay_out(network, QUICK, CLEARANCES, [SheetFrame(60, 60, 5, 5, 55, 55)])


def test_fidelity_brings_the_drawing_nearer_to_the_ground():
    network = network_of(
        {"A": (0, 0), "B": (0.5, 0), "C": (1, 0), "D": (9, 0.1), "E": (9.5, 0)}, ["ABCDE"]
    )

    def long_share(fidelity: float) -> float:
        layout = laid(network, LayoutSettings(effort="quick", fidelity=fidelity))
        x = [layout.positions[s][0] for s in "ABCDE"]
        return (x[3] - x[2]) / (x[4] - x[0])

    assert long_share(0.0) < long_share(0.5) < long_share(1.0)


def test_the_same_network_gives_the_same_layout():
    network = wandering_network(5, 6, 6, 9)
    assert laid(network) == laid(network)


def test_planar_and_connected_as_networkx_sees_it():
    network = radial_network(3, 6, 1, 5)
    layout = laid(network)
    graph = nx.Graph((k.start, k.end) for k in network.links)
    assert nx.is_connected(graph)
    planar, _ = nx.check_planarity(graph)
    assert planar
    embedding = nx.PlanarEmbedding()
    embedding.set_data(_rotations(layout))
    embedding.check_structure()  # raises if the drawn orders are no planar embedding


def _rotations(layout: Layout) -> dict[str, list[str]]:
    around: dict[str, list[tuple[float, str]]] = {s: [] for s in layout.positions}
    for link in layout.network.links:
        path = layout.paths[link.id]
        for here, there, run in ((link.start, link.end, path), (link.end, link.start, path[::-1])):
            step = complex(run[1][0] - run[0][0], run[1][1] - run[0][1])
            around[here].append((cmath.phase(step), there))
    return {s: [there for _, there in sorted(ends)] for s, ends in around.items()}


def test_the_check_sees_what_is_wrong():
    layout = laid(radial_network(1, 6, 1, 4))
    link = layout.network.links[0]
    start, *_, end = layout.paths[link.id]
    bent = {**layout.paths, link.id: (start, (start[0] + 1.0, start[1] + 0.3), end)}
    assert any("off the 8 directions" in f for f in faults(_with_paths(layout, bent), CLEARANCES))
    missing = {k: p for k, p in layout.paths.items() if k != link.id}
    assert any("no path" in f for f in faults(_with_paths(layout, missing), CLEARANCES))
    mirrored = {s: (layout.sheet.width_mm - x, y) for s, (x, y) in layout.positions.items()}
    turned = {
        k: tuple((layout.sheet.width_mm - x, y) for x, y in path)
        for k, path in layout.paths.items()
    }
    mirror = dataclasses.replace(layout, positions=mirrored, paths=turned)
    assert any("order of links" in f for f in faults(mirror, CLEARANCES))


def test_the_check_sees_lines_that_are_too_close():
    places = {"A": (-1, 0), "B": (1, 0), "C": (-1, 1), "D": (1, 1)}
    layout = laid(network_of(places, ["AB", "CD"]))
    gap = layout.positions["A"][1] - layout.positions["C"][1]
    wide = dataclasses.replace(CLEARANCES, line_width_mm=gap)
    assert any("apart" in f for f in faults(layout, wide))


def test_the_check_sees_a_false_crossing():
    places = {"A": (-1, -1), "B": (1, -1), "C": (-1, 1), "D": (1, 1)}
    layout = laid(network_of(places, ["AB", "CD"]))
    (ax, ay), (bx, by) = layout.paths["A-B"]
    _, (_, dy) = layout.paths["C-D"]
    over = ((ax, ay), (ax, dy - 5.0), (ax + 9.0, dy - 5.0), (ax + 9.0, by), (bx, by))
    found = faults(_with_paths(layout, {**layout.paths, "A-B": over}), CLEARANCES)
    assert any("cross" in f for f in found)


def _with_paths(layout: Layout, paths: dict[str, tuple[tuple[float, float], ...]]) -> Layout:
    return dataclasses.replace(layout, paths=paths)


def test_smoothed_stations_stand_evenly_on_their_corridor():
    names = "ABCDEFGH"
    network = network_of({c: (i**1.3, 0.1 * i) for i, c in enumerate(names)}, [names])
    layout = laid(network, LayoutSettings(effort="quick", fidelity=0.0))
    lengths = [
        shapely.LineString(layout.paths[f"{a}-{b}"]).length for a, b in itertools.pairwise(names)
    ]
    assert max(lengths) - min(lengths) < 0.05
