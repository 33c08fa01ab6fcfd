"""The search in one face finds what a search of another library finds."""

from __future__ import annotations

import itertools
import math

import networkx as nx
import numpy as np
import pytest

from gtfs_schematic.background.lattice import DX, DY, blank, faces, lay
from gtfs_schematic.background.search import BENDS, Door, Starts, sweep, trace

SIDE = 9


def lattice_with(walls, closed=()):
    lattice = blank(np.zeros(2), np.full(2, SIDE - 1.0), 1.0)
    for number, wall in enumerate(walls, start=1):
        lay(lattice, number, np.array(wall, dtype=float), 0.2)
    lattice.closed[list(closed)] = True
    return lattice


def crosses(lattice, node, way):
    there = node + int(DY[way]) * lattice.width + int(DX[way])
    return lattice.crossed[node, way] if way < 4 else -lattice.crossed[there, way - 4]


def graph_of(lattice):
    """Give all moves between (node, way) as a graph of its own."""
    graph = nx.DiGraph()
    w, h = lattice.width, lattice.height
    for node, way in itertools.product(range(w * h), range(8)):
        x, y = node % w, node // w
        for turn in range(-2, 3):
            onward = (way + turn) % 8
            i, j = x + int(DX[onward]), y + int(DY[onward])
            if not (0 <= i < w and 0 <= j < h) or lattice.closed[j * w + i]:
                continue
            if crosses(lattice, node, onward) != 0:
                continue
            cost = BENDS[abs(turn)] + math.hypot(DX[onward], DY[onward])
            if turn and lattice.clear[node] < 0.05:
                cost += 25.0
            graph.add_edge((node, way), (j * w + i, onward), cost=float(cost))
    return graph


@pytest.mark.parametrize(
    ("walls", "closed"),
    [
        ([], ()),
        ([[(4.5, -1.0), (4.5, 6.2)]], ()),
        ([[(2.5, -1.0), (2.5, 6.2)], [(5.4, 1.7), (5.4, 20.0)]], (30, 31, 40)),
    ],
)
def test_costs_are_those_of_dijkstra_by_networkx(walls, closed):
    lattice = lattice_with(walls, closed)
    window = (0, 0, lattice.width - 1, lattice.height - 1)
    starts = Starts(np.array([0]), np.array([0]), np.zeros(1))
    cost = np.zeros(lattice.width * lattice.height)
    found = sweep(lattice, cost, window, starts, Door(0, 0.0, 1.0, -1, -1))
    graph = graph_of(lattice)
    wanted = nx.single_source_dijkstra_path_length(graph, (0, 0), weight="cost")
    best = {
        (state // 8, state % 8): value
        for state, value in enumerate(found.best.tolist())
        if math.isfinite(value)
    }
    assert best.keys() == wanted.keys()
    for state, value in best.items():
        assert value == pytest.approx(wanted[state])


def test_the_way_out_is_over_the_door_in_its_sense_and_within_its_slot():
    lattice = lattice_with([[(4.5, -1.0), (4.5, 20.0)]])
    window = (0, 0, lattice.width - 1, lattice.height - 1)
    starts = Starts(np.array([0]), np.array([-1]), np.zeros(1))
    cost = np.zeros(lattice.width * lattice.height)
    # Eastward over a wall that runs north: from its left to its right.
    found = sweep(lattice, cost, window, starts, Door(-1, 0.25, 0.4, -1, -1))
    assert len(found.states)
    ends = lattice.at(found.nodes)
    assert (ends[:, 0] > 4.5).all()
    crossings = 21.0 * np.array([0.25, 0.4]) - 1.0
    assert (ends[:, 1] > crossings[0] - 1.0).all()
    assert (ends[:, 1] < crossings[1] + 1.0).all()
    assert not len(sweep(lattice, cost, window, starts, Door(1, 0.0, 1.0, -1, -1)).states)
    nodes, start = trace(found, int(found.states[0]), window, lattice.width)
    assert (nodes[0], start) == (0, 0)
    assert (lattice.at(nodes)[:, 0] < 4.5).all()


def test_faces_are_what_walls_part():
    lattice = lattice_with([[(4.5, -1.0), (4.5, 20.0)], [(-1.0, 3.4), (4.5, 3.4)]])
    labels = faces(lattice)
    at = lattice.at(np.arange(len(labels)))
    side = np.where(at[:, 0] > 4.5, 0, np.where(at[:, 1] > 3.4, 1, 2))
    assert len(set(zip(side.tolist(), labels.tolist(), strict=True))) == 3
