"""A drawing that is laid out anew with memory resembles the one before more than without."""

from __future__ import annotations

import numpy as np
import pytest
from generated_networks import network_of, radial_network
from scipy.spatial import procrustes

from gtfs_schematic.layout.anchors import anchor_points
from gtfs_schematic.layout.check import faults
from gtfs_schematic.layout.engine import fit_sheet, lay_out, place
from gtfs_schematic.layout.model import Clearances, Layout, LayoutSettings, SheetFrame
from gtfs_schematic.layout.planarise import planarise
from gtfs_schematic.layout.remembered import remembered

CLEARANCES = Clearances(1.6, 0.35, 2.6, 3.2, 5.5, {})
FRAME = SheetFrame(594.0, 420.0, 12.0, 30.0, 582.0, 390.0)
SETTINGS = LayoutSettings(effort="quick")


def unlike(old: Layout, new: Layout) -> float:
    """Give what no shift, turn or scale makes alike, by scipy."""
    both = sorted(set(old.positions) & set(new.positions))
    places = [np.array([each.positions[s] for s in both]) for each in (old, new)]
    return float(procrustes(*places)[2])


@pytest.mark.parametrize("seed", range(3))
def test_a_drawing_with_memory_is_more_like_the_one_before(seed: int):
    base = radial_network(seed, 8, 1, 5)
    # The drawing before was even; the next one is asked to be true to the ground.
    old = lay_out(base, LayoutSettings(effort="quick", fidelity=0.0), CLEARANCES, [FRAME])
    courses = [line.courses[0] for line in base.lines]
    places = {s.id: (s.lon / 0.009, s.lat / 0.009) for s in base.stations}
    network = network_of(places, [*courses, ["A0N05", "A2N05"]])
    told = LayoutSettings(effort="quick", fidelity=0.8)
    plain = fit_sheet(place(network, told), CLEARANCES, [FRAME])
    memory = fit_sheet(place(network, told, previous=old.positions), CLEARANCES, [FRAME])
    assert faults(memory, CLEARANCES) == ()
    assert unlike(old, memory) < unlike(old, plain)


def test_without_memory_anchors_stay():
    graph = planarise(radial_network(0, 6, 1, 4))
    anchors = anchor_points(graph, 0.35)
    assert np.array_equal(remembered(graph, anchors, {}), anchors)


def test_anchors_go_to_where_the_stations_were():
    graph = planarise(radial_network(1, 6, 1, 4))
    anchors = anchor_points(graph, 0.35)
    others = anchor_points(graph, 0.9)
    stations = [s for s in graph.station_of if s is not None]
    at = {
        s: (10.0 * float(x), -10.0 * float(y))
        for s, (x, y) in zip(graph.station_of, others, strict=False)
        if s is not None
    }
    found = remembered(graph, anchors, at)
    index = [graph.station_of.index(s) for s in stations]
    before, after = (procrustes(others[index], each[index])[2] for each in (anchors, found))
    assert after < before / 2.0
