"""Cheapest octilinear curve with a given word: one search per face that it passes through.

In each face every step is open that crosses nothing; the one way out is across the next piece of
the word. The best of all ways out are where the search of the next face starts, so that the places
of crossing come out of the same optimum as the curve (dynamic programming over Dijkstra 1959).
"""

from __future__ import annotations

import heapq
from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from gtfs_schematic.background.lattice import DX, DY, Lattice

Ints = NDArray[np.int64]
Floats = NDArray[np.float64]

BENDS = np.array([0.0, 7.0, 13.0])
"""Cost of going straight on, of a bend of 45 and of one of 90 degrees, in millimetres of way."""
SLANT = 9.0
"""Cost of crossing a line as slantingly as could be, likewise."""
ON_LINE_MM = 0.05
ON_LINE = 25.0
"""What a bend costs more so near to a line: a curve crosses whole bundles, not parts of them."""


NOWHERE: Ints = np.empty(0, dtype=np.int64)


class Door(NamedTuple):
    """The way out of a face."""

    number: int
    """Number of the piece and its sense; 0 for none: the curve ends in this face."""
    low: float
    high: float
    """From and to which share of the piece."""
    node: int
    way: int
    """If not negative, only the step from this node this way."""


class Starts(NamedTuple):
    """Where a search begins: nodes, the ways in which they were reached (-1: any), costs."""

    nodes: Ints
    ways: Ints
    costs: Floats


class Found(NamedTuple):
    """What a search found: ways out, and how each place was reached."""

    states: Ints
    """Per way out the state before it."""
    nodes: Ints
    ways: Ints
    costs: Floats
    best: Floats
    parents: Ints


def sweep(
    lattice: Lattice,
    cost: Floats,
    window: tuple[int, int, int, int],
    starts: Starts,
    door: Door,
    *,
    until: Ints = NOWHERE,
) -> Found:
    """Search one face.

    Parameters
    ----------
    lattice
        Steps and what they cross.
    cost
        Per node of the window, in rows, what a millimetre of way costs beside itself.
    window
        Least x, least y, greatest x, greatest y, in nodes; nothing outside is looked at.
    starts, door
        Where it begins, and where it may end.
    until
        Nodes of which the first that is reached ends the search.
    """
    ends = np.zeros(len(lattice.closed) if len(until) else 0, dtype=np.bool_)
    ends[until] = True
    return Found(
        *_sweep(
            lattice.crossed,
            lattice.share,
            lattice.slant,
            lattice.clear,
            lattice.closed,
            (lattice.width, lattice.pitch),
            cost,
            window,
            starts,
            door,
            lattice.calm * BENDS,
            (ON_LINE_MM, ON_LINE, SLANT),
            ends,
        )
    )


def trace(
    found: Found, state: int, window: tuple[int, int, int, int], width: int
) -> tuple[Ints, int]:
    """Give the nodes up to a state, and the number of the start that they come from."""
    columns = window[2] - window[0] + 1
    nodes = []
    while state >= 0:
        cell = state // 8
        nodes.append((cell // columns + window[1]) * width + cell % columns + window[0])
        state = int(found.parents[state])
    return np.array(nodes[::-1], dtype=np.int64), -2 - state


@njit(cache=True)
def _sweep(  # noqa: C901, PLR0912, PLR0913, PLR0915, PLR0917 - one loop of a search, compiled
    crossed: NDArray[np.int32],
    share: NDArray[np.float32],
    slant: NDArray[np.float32],
    clear: NDArray[np.float32],
    closed: NDArray[np.bool_],
    size: tuple[int, float],
    cost: Floats,
    window: tuple[int, int, int, int],
    starts: Starts,
    door: Door,
    bends: Floats,
    rules: tuple[float, float, float],
    ends: NDArray[np.bool_],
) -> tuple[Ints, Ints, Ints, Floats, Floats, Ints]:
    width, pitch = size
    on_line, bent, square = rules
    x0, y0, x1, y1 = window
    columns, rows = x1 - x0 + 1, y1 - y0 + 1
    best = np.full(columns * rows * 8, np.inf)
    parents = np.full(columns * rows * 8, -1, dtype=np.int64)
    heap = [(0.0, 0)]
    heap.pop()
    for i in range(starts.nodes.shape[0]):
        x, y = starts.nodes[i] % width, starts.nodes[i] // width
        if x < x0 or x > x1 or y < y0 or y > y1 or closed[starts.nodes[i]]:
            continue
        for d in range(8):
            if starts.ways[i] >= 0 and starts.ways[i] != d:
                continue
            state = ((y - y0) * columns + x - x0) * 8 + d
            if starts.costs[i] < best[state]:
                best[state] = starts.costs[i]
                parents[state] = -2 - i
                heapq.heappush(heap, (float(starts.costs[i]), int(state)))
    out_states = [0]
    out_states.pop()
    out_nodes = [0]
    out_nodes.pop()
    out_ways = [0]
    out_ways.pop()
    out_costs = [0.0]
    out_costs.pop()
    while heap:
        key, state = heapq.heappop(heap)
        if key > best[state]:
            continue
        d = state % 8
        cell = state // 8
        x, y = cell % columns + x0, cell // columns + y0
        node = y * width + x
        if ends.shape[0] > 0 and ends[node]:
            break
        first = parents[state] <= -2 and starts.ways[-2 - parents[state]] < 0
        straight = clear[node] < on_line and not first
        for turn in range(-2, 3):
            e = (d + turn + 8) % 8
            i, j = x + int(DX[e]), y + int(DY[e])
            if i < x0 or i > x1 or j < y0 or j > y1:
                continue
            there = j * width + i
            if closed[there]:
                continue
            met = crossed[node, e] if e < 4 else -crossed[there, e - 4]
            length = pitch * (1.4142135623730951 if e % 2 else 1.0)
            fresh = key + bends[abs(turn)] + length * (1.0 + cost[(j - y0) * columns + i - x0])
            if straight and turn != 0:
                fresh += bent
            if met == 0:
                onward = ((j - y0) * columns + i - x0) * 8 + e
                if fresh < best[onward]:
                    best[onward] = fresh
                    parents[onward] = state
                    heapq.heappush(heap, (float(fresh), int(onward)))
            elif met == door.number:
                if door.node >= 0 and (door.node != node or door.way != e):
                    continue
                where = share[node, e] if e < 4 else share[there, e - 4]
                off = slant[node, e] if e < 4 else slant[there, e - 4]
                if where < door.low or where > door.high:
                    continue
                out_states.append(int(state))
                out_nodes.append(int(there))
                out_ways.append(int(e))
                out_costs.append(float(fresh + square * off))
    return (
        np.array(out_states, dtype=np.int64),
        np.array(out_nodes, dtype=np.int64),
        np.array(out_ways, dtype=np.int64),
        np.array(out_costs, dtype=np.float64),
        best,
        parents,
    )
