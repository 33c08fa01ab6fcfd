"""Cheapest octilinear path over a lattice on which other paths and vertices are obstacles.

The lattice, its bend costs and its blocked ports follow the idea of octilinear grid-graph routing
(Bast, Brosi and Storandt 2020); costs are whole numbers, so that ties and sums are exact.
"""

from __future__ import annotations

import heapq
import math

import numpy as np
from numba import njit
from numpy.typing import NDArray

FREE = -1
BLOCKED = np.int64(1) << 40
"""Cost of what is not allowed."""

DX = np.array([1, 1, 0, -1, -1, -1, 0, 1], dtype=np.int64)
DY = np.array([0, 1, 1, 1, 0, -1, -1, -1], dtype=np.int64)
"""Steps of the eight ports, 0 east, counter-clockwise with y north."""

HOP, BEND_135, BEND_90, NEAR, COURSE, UNIT, CLAIM = range(7)
"""Places of the parameters in the `costs` array: per spacing of length; per bend; per node next
to something else; per spacing of length and spacing of distance from the true course; lattice
steps in a spacing; per step onto the course of a piece that is not laid yet."""


@njit(cache=True)
def _course_distance(x: float, y: float, course: NDArray[np.float64]) -> float:
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
    diagonal: int,
    occupied: NDArray[np.int32],
    width: int,
    height: int,
    codes: tuple[int, int, int],
    claims: NDArray[np.int32],
    course: NDArray[np.float64],
    costs: NDArray[np.int64],
) -> int:
    """Cost of a step onto node (x, y): its length, its neighbours, its distance from course."""
    unit = costs[5]
    length = 1.4142135623730951 if diagonal else 1.0
    crowd = 0
    for d in range(8):
        i, j = x + DX[d], y + DY[d]
        if 0 <= i < width and 0 <= j < height:
            code = occupied[j * width + i]
            if code != -1 and code != codes[0] and code != codes[1] and code != codes[2]:
                crowd += 1
    away = _course_distance(float(x), float(y), course) / unit
    cost = (costs[0] + costs[4] * min(away, 4.0) * (1.0 + 0.5 * min(away, 4.0))) * length / unit
    cost += costs[3] * min(crowd, 3) / unit + costs[6] * claims[y * width + x]
    return int(round(cost))


@njit(cache=True)
def route(
    occupied: NDArray[np.int32],
    diagonals: NDArray[np.int32],
    guard: NDArray[np.int32],
    claims: NDArray[np.int32],
    shape: tuple[int, int],
    window: tuple[int, int, int, int],
    source: tuple[int, int],
    target: tuple[int, int],
    source_ports: NDArray[np.int64],
    target_ports: NDArray[np.int64],
    goals: NDArray[np.int64],
    course: NDArray[np.float64],
    costs: NDArray[np.int64],
) -> tuple[int, NDArray[np.int64]]:
    """Find the cheapest path from vertex `source` to vertex `target`, or to the best goal.

    Parameters
    ----------
    occupied, diagonals, guard
        Per node: the code of what stands there; the path whose diagonal crosses the cell above
        right of it; the vertex whose eight neighbours it is among. -1 where nothing.
    claims
        Per node the count of courses of other pieces, not laid yet, that pass it.
    shape, window
        (width, height) of the lattice; (x0, y0, x1, y1) that the path may use, inclusive.
    source, target
        (vertex, node) of the ends; target (-1, -1): any node whose `goals` is below BLOCKED.
    source_ports, target_ports
        Cost of leaving or entering through each port; BLOCKED where not allowed.
    goals
        Per node of the window (row by row) the cost of ending there; empty with a target.
    course
        The true course in lattice coordinates, shape (m, 2).
    costs
        See the places above; the two bend costs include the weight of the piece.

    Returns
    -------
    tuple
        Total cost and the nodes from source to end; BLOCKED and no nodes if there is no path.
    """
    width, height = shape
    x0, y0, x1, y1 = window
    w = x1 - x0 + 1
    size = w * (y1 - y0 + 1) * 8
    best = np.full(size, BLOCKED, dtype=np.int64)
    parent = np.full(size, -1, dtype=np.int64)
    steps = np.full(size // 8, -1, dtype=np.int64)
    codes = (source[0], target[0], -2)
    unit = costs[5]
    hop = costs[0] / unit
    free_target = target[0] < 0
    tx, ty = target[1] % width, target[1] // width
    sx, sy = source[1] % width, source[1] // width
    heap = [(np.int64(0), np.int64(-1))]
    heap.pop()
    for d in range(8):
        if source_ports[d] >= BLOCKED:
            continue
        x, y = sx + DX[d], sy + DY[d]
        if x < x0 or x > x1 or y < y0 or y > y1:
            continue
        node = y * width + x
        if occupied[node] != -1 or (guard[node] != source[0] and guard[node] != -1):
            continue
        if d % 2 == 1 and diagonals[min(y, sy) * width + min(x, sx)] != -1:
            continue
        cost = source_ports[d] + _step_cost(
            x, y, d % 2, occupied, width, height, codes, claims, course, costs
        )
        state = ((y - y0) * w + (x - x0)) * 8 + d
        best[state] = cost
        h = 0
        if not free_target:
            ax, ay = abs(x - tx), abs(y - ty)
            h = int(hop * (max(ax, ay) + 0.41421356 * min(ax, ay)))
        heapq.heappush(heap, (np.int64(cost + h), np.int64(state)))
    final, final_cost = np.int64(-1), BLOCKED
    while heap:
        key, state = heapq.heappop(heap)
        if key >= final_cost:
            break
        cost = best[state]
        d = state % 8
        cell = state // 8
        x, y = cell % w + x0, cell // w + y0
        if not free_target:
            ax, ay = abs(x - tx), abs(y - ty)
            if key > cost + int(hop * (max(ax, ay) + 0.41421356 * min(ax, ay))):
                continue
        elif key > cost:
            continue
        node = y * width + x
        if free_target:
            total = cost + goals[cell]
            if goals[cell] < BLOCKED and total + target_ports[(d + 4) % 8] < final_cost:
                final, final_cost = state, total + target_ports[(d + 4) % 8]
        elif node == target[1]:
            final, final_cost = state, cost
            break
        at_target = (not free_target) and guard[node] == target[0]
        for turn in range(-2, 3):
            e = (d + turn + 8) % 8
            i, j = x + DX[e], y + DY[e]
            if i < x0 or i > x1 or j < y0 or j > y1:
                continue
            there = j * width + i
            arrives = (not free_target) and there == target[1]
            if arrives:
                if target_ports[(e + 4) % 8] >= BLOCKED:
                    continue
            else:
                if at_target or occupied[there] != -1:
                    continue
                if guard[there] != -1 and (free_target or guard[there] != target[0]):
                    continue
            if e % 2 == 1 and diagonals[min(y, j) * width + min(x, i)] != -1:
                continue
            fresh = cost
            if turn == 1 or turn == -1:
                fresh += costs[1]
            elif turn != 0:
                fresh += costs[2]
            spot = (j - y0) * w + (i - x0)
            if arrives:
                fresh += target_ports[(e + 4) % 8] + int(
                    round(hop * (1.4142135623730951 if e % 2 else 1.0))
                )
            else:
                # The cost of a node is asked for up to eight times: keep both kinds of step.
                if steps[spot] < 0:
                    steps[spot] = _step_cost(
                        i, j, 0, occupied, width, height, codes, claims, course, costs
                    )
                fresh += steps[spot] if e % 2 == 0 else (steps[spot] * 181) // 128
            onward = spot * 8 + e
            if fresh < best[onward]:
                best[onward] = fresh
                parent[onward] = state
                h = 0
                if not free_target:
                    ax, ay = abs(i - tx), abs(j - ty)
                    h = int(hop * (max(ax, ay) + 0.41421356 * min(ax, ay)))
                heapq.heappush(heap, (np.int64(fresh + h), np.int64(onward)))
    if final < 0:
        return BLOCKED, np.empty(0, dtype=np.int64)
    count = 0
    state = final
    while state >= 0:
        count += 1
        state = parent[state]
    path = np.empty(count + 1, dtype=np.int64)
    path[0] = source[1]
    state = final
    for k in range(count, 0, -1):
        cell = state // 8
        path[k] = (cell // w + y0) * width + cell % w + x0
        state = parent[state]
    return final_cost, path


@njit(cache=True)
def path_cost(
    path: NDArray[np.int64],
    code: int,
    ends: tuple[int, int],
    occupied: NDArray[np.int32],
    claims: NDArray[np.int32],
    shape: tuple[int, int],
    course: NDArray[np.float64],
    costs: NDArray[np.int64],
) -> int:
    """Cost of a laid path without its ports: length, bends, crowding, distance from course."""
    width, height = shape
    total = 0
    before = -1
    for k in range(1, path.shape[0]):
        x, y = path[k] % width, path[k] // width
        dx, dy = x - path[k - 1] % width, y - path[k - 1] // width
        d = 0
        for e in range(8):
            if DX[e] == dx and DY[e] == dy:
                d = e
        if k < path.shape[0] - 1:
            total += _step_cost(
                x,
                y,
                d % 2,
                occupied,
                width,
                height,
                (code, ends[0], ends[1]),
                claims,
                course,
                costs,
            )
        else:
            total += int(round(costs[0] / costs[5] * (1.4142135623730951 if d % 2 else 1.0)))
        if before >= 0:
            turn = min((d - before + 8) % 8, (before - d + 8) % 8)
            if turn == 1:
                total += costs[1]
            elif turn >= 2:
                total += costs[2]
        before = d
    return total


@njit(cache=True)
def mark(
    path: NDArray[np.int64],
    code: int,
    occupied: NDArray[np.int32],
    diagonals: NDArray[np.int32],
    width: int,
) -> None:
    """Lay a path on the lattice with its code, or lift it with code -1; ends stay as they are."""
    for k in range(1, path.shape[0]):
        if k < path.shape[0] - 1:
            occupied[path[k]] = code
        x, y = path[k] % width, path[k] // width
        i, j = path[k - 1] % width, path[k - 1] // width
        if x != i and y != j:
            diagonals[min(y, j) * width + min(x, i)] = code


@njit(cache=True)
def encloses(ring: NDArray[np.float64], points: NDArray[np.float64]) -> bool:
    """Say whether any of `points`, shape (n, 2), lies strictly inside the closed polygon `ring`.

    Even-odd rule; a point that is a corner of the ring counts as outside.
    """
    n = ring.shape[0]
    for k in range(points.shape[0]):
        px, py = points[k, 0], points[k, 1]
        inside = False
        on_ring = False
        for i in range(n):
            j = i + 1 if i + 1 < n else 0
            ax, ay, bx, by = ring[i, 0], ring[i, 1], ring[j, 0], ring[j, 1]
            if ax == px and ay == py:
                on_ring = True
                break
            if (ay > py) != (by > py) and px < (bx - ax) * (py - ay) / (by - ay) + ax:
                inside = not inside
        if inside and not on_ring:
            return True
    return False
