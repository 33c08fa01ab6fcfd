"""A course as thin as a thread: the cheapest way over a fine lattice past all that stands.

Where no gap is wide enough for a new course, this finds the way on which least must give way. It
crosses what the ground makes it cross, in the ground's order, and nothing else. Its corners lie on
a lattice; only directions and sides count, `layout.yielding` finds the lengths.
"""

from __future__ import annotations

import heapq
import math
from typing import NamedTuple

import numpy as np
import shapely
from numba import njit
from numpy.typing import NDArray

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.fine_lattice import (
    BLOCKED,
    DX,
    DY,
    MAYBE,
    NEVER,
    SPACING,
    Errand,
    FineLattice,
)
from gtfs_schematic.layout.obstacles import Obstacles

_BENDS = (0, 1000, 2400)
"""Prices of turns by 0, 45 and 90 degrees."""
_UNSURE = 900
"""Price of a crossing that the ground has or has not."""
_TURN = 300
"""Price of leaving a station 45 degrees off the best free direction."""
_MARGINS = (4.0, 14.0)
"""Spacings round the errand within which a way is looked for, in turn."""
_ROOT_2 = math.sqrt(2.0)


class _Field(NamedTuple):
    """The lattice as the search sees it."""

    width: int
    hop: int
    """Price of a step along an axis."""
    cost: NDArray[np.int64]
    """What a step onto each node costs beside."""
    blocked: NDArray[np.bool_]
    code: NDArray[np.int64]
    """Per step to the east, north-east, north and north-west what it crosses."""
    crossed: NDArray[np.int64]
    """What must be crossed, in that order."""


class _Trip(NamedTuple):
    """From where to where, with prices of directions and of ends."""

    start: int
    leaving: NDArray[np.int64]
    ending: NDArray[np.int64]
    arriving: NDArray[np.int64]


def thread(obstacles: Obstacles, errand: Errand) -> tuple[Point, ...] | None:
    """Find the course on which least must give way; None if there is no way at all.

    Returns
    -------
    tuple or None
        Corners in millimetres; the first is the start, the last the end if that is fixed.
    """
    for margin in _MARGINS:
        lattice = FineLattice.round_about(errand, obstacles.frame, margin)
        lattice.mark(obstacles, errand)
        nodes = _search(*_problem(lattice, obstacles, errand))
        if len(nodes):
            return _corners(lattice, nodes, errand)
    return None


def _problem(lattice: FineLattice, obstacles: Obstacles, errand: Errand) -> tuple[_Field, _Trip]:
    """State the search on a marked lattice."""
    start, target = lattice.node(errand.start), lattice.node(errand.end)
    if errand.arriving is None:
        ending, arriving = lattice.ending(errand), np.zeros(8, dtype=np.int64)
    else:
        ending, arriving = np.full(len(lattice.cost), NEVER), _turns(errand.arriving)
        ending[target] = 0
        lattice.blocked[target] = False
    lattice.blocked[start] = False
    crossed = np.array([k for k, _ in obstacles.events], dtype=np.int64)
    hop = round(lattice.step / errand.spacing_mm * SPACING)
    field = _Field(lattice.width, hop, lattice.cost, lattice.blocked, lattice.code, crossed)
    return field, _Trip(start, _turns(errand.leaving), ending, arriving)


def _turns(directions: tuple[int, ...]) -> NDArray[np.int64]:
    """Price of each of the eight directions, of which the first listed is best."""
    prices = np.full(8, NEVER)
    prices[list(directions)] = _TURN * np.arange(len(directions))
    return prices


def _corners(
    lattice: FineLattice, nodes: NDArray[np.int64], errand: Errand
) -> tuple[Point, ...] | None:
    x, y = nodes % lattice.width, nodes // lattice.width
    steps = np.column_stack([np.diff(x), np.diff(y)])
    turns = np.flatnonzero((steps[1:] != steps[:-1]).any(axis=1)) + 1
    at = [lattice.point(int(nodes[k])) for k in turns]
    last = errand.end if errand.arriving is not None else lattice.point(int(nodes[-1]))
    corners = (errand.start, *at, last)
    return corners if shapely.LineString(corners).is_simple else None


@njit(cache=True)
def _search(  # noqa: C901 - one loop that calls little, for speed
    field: _Field, trip: _Trip
) -> NDArray[np.int64]:  # pragma: no cover - compiled
    """Cheapest path over nodes, arrival directions and crossings so far (Dijkstra 1959)."""
    size, every = field.cost.shape[0], field.crossed.shape[0]
    best = np.full(size * 8 * (every + 1), NEVER)
    parent = np.full(size * 8 * (every + 1), -1, dtype=np.int64)
    heap = [(np.int64(0), np.int64(-1))]
    heap.pop()
    for d in range(8):
        if trip.leaving[d] < NEVER:
            # The start counts as arrived at in the direction in which it is left.
            state = np.int64(trip.start * 8 + d)
            best[state] = trip.leaving[d]
            heapq.heappush(heap, (np.int64(trip.leaving[d]), state))
    found, least = np.int64(-1), np.int64(NEVER)
    while heap:
        spent, state = heapq.heappop(heap)
        if spent >= least:
            break
        if spent > best[state]:
            continue
        cell, heading = state // 8, state % 8
        node, count = cell % size, cell // size
        if count == every and node != trip.start and trip.ending[node] < NEVER:
            total = spent + trip.ending[node] + trip.arriving[(heading + 4) % 8]
            if total < least:
                found, least = state, total
        for turn in range(-2, 3):
            if node == trip.start and turn != 0:
                continue
            e = int((heading + turn) % 8)
            there, seen, price = _step(field, node, e, count)
            if there < 0:
                continue
            fresh = spent + _BENDS[abs(turn)] + price
            onward = (seen * size + there) * 8 + e
            if fresh < best[onward]:
                best[onward] = fresh
                parent[onward] = state
                heapq.heappush(heap, (np.int64(fresh), np.int64(onward)))
    path = [np.int64(-1)]
    path.pop()
    while found >= 0:
        path.append((found // 8) % size)
        found = parent[found]
    return np.array(path[::-1], dtype=np.int64)


@njit(cache=True)
def _step(
    field: _Field, node: int, e: int, count: int
) -> tuple[int, int, int]:  # pragma: no cover - compiled
    """Node that a step leads to (−1: it is not allowed), crossings then, and its price."""
    width, size = field.width, field.cost.shape[0]
    x, y = node % width + DX[e], node // width + DY[e]
    there = y * width + x
    if x < 0 or x >= width or y < 0 or there >= size or field.blocked[there]:
        return -1, count, 0
    price = round((field.hop + field.cost[there]) * (_ROOT_2 if e % 2 else 1.0))
    met = field.code[e, node] if e < 4 else field.code[e - 4, there]
    if met == BLOCKED:
        return -1, count, 0
    if met == MAYBE:
        return there, count, price + _UNSURE
    if met >= 0:
        if count == field.crossed.shape[0] or met != field.crossed[count]:
            return -1, count, 0
        return there, count + 1, price
    return there, count, price
