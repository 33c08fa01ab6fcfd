"""Cheapest octilinear path over a lattice on which other paths and vertices are obstacles.

The lattice, its bend costs and its blocked ports follow the idea of octilinear grid-graph routing
(Bast, Brosi and Storandt 2020); the search is A* (Hart, Nilsson and Raphael 1968) over nodes and
arrival directions. Costs are whole numbers, so that ties and sums are exact.
"""

from __future__ import annotations

import heapq
import math
from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from gtfs_schematic.layout.lattice import BLOCKED, DX, DY, FREE, Lattice, direction

_ROOT_2 = 1.4142135623730951


class Prices(NamedTuple):
    """What a piece pays, in the thousandths of `objective.Weights`."""

    hop: int
    """Per spacing of length."""
    bend_135: int
    bend_90: int
    near: int
    """Per node next to something else, on a lattice of one step to the spacing."""
    course: int
    """Per spacing of length at one spacing from the true course; more than in proportion
    further away."""
    claim: int
    """Per step onto the course of a piece that is not laid yet."""
    unit: int
    """Lattice steps in a spacing."""
    stride: int = 1
    """Of the eight directions only every so many-th is used."""


class Trip(NamedTuple):
    """From which vertex and node to which, at what cost of each port, and within what window."""

    source: int
    source_node: int
    target: int
    target_node: int
    source_ports: NDArray[np.int64]
    target_ports: NDArray[np.int64]
    low_x: int
    low_y: int
    high_x: int
    high_y: int


@njit(cache=True)
def _off_course(x: float, y: float, course: NDArray[np.float64]) -> float:
    """Distance of a node from a polyline, in steps."""
    best = 1e18
    for i in range(course.shape[0] - 1):
        ax, ay = course[i, 0], course[i, 1]
        dx, dy = course[i + 1, 0] - ax, course[i + 1, 1] - ay
        square = dx * dx + dy * dy
        t = 0.0 if square == 0.0 else ((x - ax) * dx + (y - ay) * dy) / square
        t = min(1.0, max(0.0, t))
        ex, ey = ax + t * dx - x, ay + t * dy - y
        best = min(best, ex * ex + ey * ey)
    return math.sqrt(best)


@njit(cache=True)
def _step_cost(
    x: int,
    y: int,
    lattice: Lattice,
    own: tuple[int, int, int],
    course: NDArray[np.float64],
    prices: Prices,
) -> int:
    """Cost of an upright step onto node (x, y); a diagonal one costs √2 times as much."""
    crowd = 0
    for d in range(8):
        i, j = x + DX[d], y + DY[d]
        if 0 <= i < lattice.width and 0 <= j < lattice.height:
            code = lattice.occupied[j * lattice.width + i]
            if code not in (FREE, own[0], own[1], own[2]):
                crowd += 1
    away = min(4.0, _off_course(float(x), float(y), course) / prices.unit)
    length = prices.hop + prices.course * away * (1.0 + 0.5 * away)
    claims = prices.claim * lattice.claims[y * lattice.width + x]
    return round(float((length + prices.near * min(crowd, 3)) / prices.unit + claims))


@njit(cache=True)
def _diagonal(cost: int) -> int:
    return (cost * 181) // 128


@njit(cache=True)
def _at_least(x: int, y: int, trip: Trip, width: int, hop: float) -> int:
    """Lower bound of the cost from (x, y) to the target: its octilinear distance."""
    dx = abs(x - trip.target_node % width)
    dy = abs(y - trip.target_node // width)
    return int(hop * (max(dx, dy) + 0.41421356 * min(dx, dy)))


@njit(cache=True)
def _open(x: int, y: int, step: int, lattice: Lattice, vertex: int) -> bool:
    """Whether a path may step onto free node (x, y); `vertex` is whose neighbours it may touch."""
    node = y * lattice.width + x
    guard = lattice.guard[node]
    if lattice.occupied[node] != FREE or guard not in (FREE, vertex):
        return False
    return _uncrossed(x, y, step, lattice)


@njit(cache=True)
def _uncrossed(x: int, y: int, step: int, lattice: Lattice) -> bool:
    """Whether no diagonal crosses the step that arrives at (x, y)."""
    if step % 2 == 0:
        return True
    corner = min(y, y - DY[step]) * lattice.width + min(x, x - DX[step])
    return bool(lattice.diagonals[corner] == FREE)


@njit(cache=True)
def _bend(turn: int, prices: Prices) -> int:
    if turn == 0:
        return 0
    return prices.bend_135 if abs(turn) == 1 else prices.bend_90


@njit(cache=True)
def _traced(
    parent: NDArray[np.int64], final: int, trip: Trip, columns: int, width: int
) -> NDArray[np.int64]:
    """Nodes from the source to the final state."""
    count = 1
    state = final
    while state >= 0:
        count += 1
        state = parent[state]
    path = np.empty(count, dtype=np.int64)
    path[0] = trip.source_node
    state = final
    for k in range(count - 1, 0, -1):
        cell = state // 8
        path[k] = (cell // columns + trip.low_y) * width + cell % columns + trip.low_x
        state = parent[state]
    return path


@njit(cache=True)
def route(  # noqa: C901, PLR0912 - one loop of a search, compiled
    lattice: Lattice, trip: Trip, course: NDArray[np.float64], prices: Prices, limit: int
) -> tuple[int, NDArray[np.int64]]:
    """Find the cheapest path of a trip.

    Parameters
    ----------
    lattice, trip
        Where, and from where to where.
    course
        The true course in lattice coordinates, shape (m, 2).
    prices
        Costs of the piece; bends include the weight of its lines.
    limit
        Paths that cost as much or more are not wanted.

    Returns
    -------
    tuple
        Total cost and the nodes from source to target; `BLOCKED` and no nodes if there is none.
    """
    width = lattice.width
    columns = trip.high_x - trip.low_x + 1
    cells = columns * (trip.high_y - trip.low_y + 1)
    best = np.full(cells * 8, BLOCKED, dtype=np.int64)
    parent = np.full(cells * 8, -1, dtype=np.int64)
    steps = np.full(cells, -1, dtype=np.int64)
    own = (trip.source, trip.target, FREE)
    hop = prices.hop / prices.unit
    heap = [(0, -1)]
    while heap:
        key, state = heapq.heappop(heap)
        if state < 0:
            # The start: leave through any port; there is no direction to bend from.
            cost, d = 0, -1
            x, y = trip.source_node % width, trip.source_node // width
        else:
            cost, d = int(best[state]), state % 8
            x, y = state // 8 % columns + trip.low_x, state // 8 // columns + trip.low_y
            if key > cost + _at_least(x, y, trip, width, hop):
                continue
            if y * width + x == trip.target_node:
                return cost, _traced(parent, state, trip, columns, width)
        beside = d >= 0 and lattice.guard[y * width + x] == trip.target
        for turn in range(-2, 3) if d >= 0 else range(8):
            e = (d + turn + 8) % 8 if d >= 0 else turn
            if e % prices.stride != 0:
                continue
            i, j = x + int(DX[e]), y + int(DY[e])
            if not (trip.low_x <= i <= trip.high_x and trip.low_y <= j <= trip.high_y):
                continue
            cell = (j - trip.low_y) * columns + i - trip.low_x
            fresh = cost + (_bend(turn, prices) if d >= 0 else trip.source_ports[e])
            if j * width + i == trip.target_node:
                if not _uncrossed(i, j, e, lattice):
                    continue
                fresh += trip.target_ports[(e + 4) % 8]
                fresh += round(hop * (_ROOT_2 if e % 2 else 1.0))
            else:
                # Beside the target only the step onto it is left; beside the source, only the
                # step from it.
                vertex = trip.source if d < 0 else trip.target
                if beside or not _open(i, j, e, lattice, vertex):
                    continue
                if steps[cell] < 0:
                    steps[cell] = _step_cost(i, j, lattice, own, course, prices)
                fresh += _diagonal(steps[cell]) if e % 2 else steps[cell]
            onward = cell * 8 + e
            if fresh < best[onward]:
                bound = fresh + _at_least(i, j, trip, width, hop)
                if bound < limit:
                    best[onward] = fresh
                    parent[onward] = state
                    heapq.heappush(heap, (int(bound), int(onward)))
    return int(BLOCKED), np.empty(0, dtype=np.int64)


@njit(cache=True)
def path_cost(
    path: NDArray[np.int64],
    own: tuple[int, int, int],
    lattice: Lattice,
    course: NDArray[np.float64],
    prices: Prices,
) -> int:
    """Cost of a laid path without its ports, as `route` counts it.

    `own` are the codes of its two vertices and of the path itself.
    """
    width = lattice.width
    total = 0
    before = -1
    for k in range(1, path.shape[0]):
        x, y = path[k] % width, path[k] // width
        d = direction(path[k - 1], path[k], width)
        if k < path.shape[0] - 1:
            cost = _step_cost(x, y, lattice, own, course, prices)
            total += _diagonal(cost) if d % 2 else cost
        else:
            total += round(prices.hop / prices.unit * (_ROOT_2 if d % 2 else 1.0))
        if before >= 0:
            turn = (d - before + 12) % 8 - 4
            total += _bend(turn, prices)
        before = d
    return total
