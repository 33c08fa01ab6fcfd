"""The published multicriteria hill climb, from its formulas, as the layout's rival.

Stott, Rodgers, Martinez-Ovando and Walker (2011), IEEE TVCG 17(1):101-114, and Stott and Rodgers
(2005); formulas and move rules from memory. Every vertex in turn tries all grid points of a square
round it and takes the best; the square shrinks from sweep to sweep. A move is refused if it

1. leaves the bounding area,
2. changes on which side of a neighbor, east or west, north or south, the vertex lies,
3. makes a crossing, or puts a vertex on an edge or another vertex,
4. changes the cyclic order of edges at any vertex.

Moves of clusters and labels are left out. The published weights were not available: each criterion
is divided by its value at the start, so that all begin with the same say times a weight.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numba as nb
import numpy as np
from numpy.typing import NDArray

_Floats = NDArray[np.float64]
_Ints = NDArray[np.int64]
_Data = tuple[_Ints, _Floats, _Ints, _Ints, _Ints, _Ints]
_TERMS = 5
"""Angular resolution, edge length, balance, straightness, octilinearity; crossings are refused."""


@dataclass(frozen=True)
class Climb:
    """How the climb is done; lengths in wanted edge lengths."""

    sweeps: int = 60
    steps: int = 4
    """Grid steps in a wanted edge length."""
    radius: int = 8
    """Half the side of the first square, grid steps."""
    weights: tuple[float, float, float, float, float] = (1.0, 1.0, 1.0, 1.0, 1.0)
    """Of angular resolution, edge length, balance, straightness, octilinearity."""


@dataclass(frozen=True)
class Graph:
    """Vertices, edges with wanted lengths, and the lines that run through vertices."""

    start: _Floats
    """Shape (n, 2)."""
    edges: _Ints
    """Shape (m, 2)."""
    wanted: _Floats
    """Wanted length of each edge, shape (m,)."""
    passes: _Ints
    """Rows of vertex, neighbor before, neighbor after, count of lines; shape (k, 4)."""


def climb(graph: Graph, how: Climb) -> _Floats:
    """Improve the drawing of a graph; give the new places, shape (n, 2)."""
    points = np.ascontiguousarray(graph.start)
    around_at, around = _around(graph)
    pass_at, passes = _by_vertex(graph.passes, len(points))
    grid = 1.0 / how.steps
    data = (
        np.ascontiguousarray(graph.edges),
        np.ascontiguousarray(graph.wanted),
        around_at, around, pass_at, passes,
    )  # fmt: skip
    terms = np.zeros(_TERMS)
    everywhere = np.arange(len(points))
    _add_terms(points, everywhere, np.arange(len(graph.edges)), data, terms)
    weights = np.array(how.weights) / np.maximum(terms, 1e-3 * max(1, len(points)))
    margin = 0.1 * np.ptp(points, axis=0) + 1.0
    box = np.vstack([points.min(axis=0) - margin, points.max(axis=0) + margin])
    side = np.sign(np.round(points[graph.edges[:, 1]] - points[graph.edges[:, 0]], 9))
    points = points.copy()
    _sweep(points, (grid, how.radius), weights, (box, side), data, snap=True)
    for sweep in range(how.sweeps):
        radius = max(1, round(how.radius * (1.0 - sweep / how.sweeps)))
        moved = _sweep(points, (grid, radius), weights, (box, side), data, snap=False)
        if not moved and radius == 1:
            break
    return points


def _around(graph: Graph) -> tuple[_Ints, _Ints]:
    """Edges round each vertex, counter-clockwise at the start, as offsets and one array."""
    ends: list[list[tuple[float, int]]] = [[] for _ in graph.start]
    for k, (a, b) in enumerate(graph.edges.tolist()):
        for here, there in ((a, b), (b, a)):
            dx, dy = graph.start[there] - graph.start[here]
            ends[here].append((math.atan2(dy, dx), k))
    flat = [k for some in ends for _, k in sorted(some)]
    return np.cumsum([0, *map(len, ends)]), np.array(flat, dtype=np.int64)


def _by_vertex(passes: _Ints, count: int) -> tuple[_Ints, _Ints]:
    order = np.argsort(passes[:, 0], kind="stable")
    at = np.searchsorted(passes[order, 0], np.arange(count + 1))
    return at, np.ascontiguousarray(passes[order, 1:])


@nb.njit(cache=True)
def _other(edges: _Ints, k: int, v: int) -> int:
    return edges[k, 1] if edges[k, 0] == v else edges[k, 0]


@nb.njit(cache=True)
def _bearing(points: _Floats, a: int, b: int) -> float:
    return math.atan2(points[b, 1] - points[a, 1], points[b, 0] - points[a, 0])


@nb.njit(cache=True)
def _length(points: _Floats, edges: _Ints, k: int) -> float:
    a, b = edges[k]
    return math.hypot(points[a, 0] - points[b, 0], points[a, 1] - points[b, 1])


@nb.njit(cache=True)
def _add_terms(
    points: _Floats, vertices: _Ints, some_edges: _Ints, data: _Data, terms: _Floats
) -> None:
    """Add the five criteria of some vertices and some edges."""
    edges, wanted, around_at, around, pass_at, passes = data
    for v in vertices:
        ends = around[around_at[v] : around_at[v + 1]]
        degree = len(ends)
        if degree > 1:
            for i in range(degree):
                a = _bearing(points, v, _other(edges, ends[i], v))
                b = _bearing(points, v, _other(edges, ends[(i + 1) % degree], v))
                terms[0] += abs(2.0 * math.pi / degree - (b - a) % (2.0 * math.pi))
        if degree == 2:
            one = _length(points, edges, ends[0]) / wanted[ends[0]]
            terms[2] += abs(one - _length(points, edges, ends[1]) / wanted[ends[1]])
        for p in range(pass_at[v], pass_at[v + 1]):
            turn = _bearing(points, v, passes[p, 1]) - _bearing(points, v, passes[p, 0])
            turn = abs(turn) % (2.0 * math.pi)
            turn = min(turn, 2.0 * math.pi - turn)
            terms[3] += (math.pi - turn) * passes[p, 2]
    for k in some_edges:
        terms[1] += abs(_length(points, edges, k) / wanted[k] - 1.0)
        terms[4] += abs(math.sin(4.0 * _bearing(points, edges[k, 0], edges[k, 1])))


@nb.njit(cache=True)
def _in_order(points: _Floats, v: int, data: _Data) -> bool:
    """Whether the edges round a vertex still follow each other once round, none on another."""
    edges, _, around_at, around, _, _ = data
    ends = around[around_at[v] : around_at[v + 1]]
    if len(ends) < 2:
        return True
    total = 0.0
    for i in range(len(ends)):
        a = _bearing(points, v, _other(edges, ends[i], v))
        b = _bearing(points, v, _other(edges, ends[(i + 1) % len(ends)], v))
        gap = (b - a) % (2.0 * math.pi)
        if gap < 1e-6 or gap > 2.0 * math.pi - 1e-6:
            return False
        total += gap
    return total < 2.0 * math.pi + 1e-6


@nb.njit(cache=True)
def _side_of(p: _Floats, q: _Floats, r: _Floats) -> int:
    area = (q[0] - p[0]) * (r[1] - p[1]) - (q[1] - p[1]) * (r[0] - p[0])
    return 0 if abs(area) < 1e-9 else (1 if area > 0 else -1)


@nb.njit(cache=True)
def _within(p: _Floats, q: _Floats, r: _Floats) -> bool:
    return (
        min(p[0], q[0]) - 1e-9 <= r[0] <= max(p[0], q[0]) + 1e-9
        and min(p[1], q[1]) - 1e-9 <= r[1] <= max(p[1], q[1]) + 1e-9
    )


@nb.njit(cache=True)
def _touch(p: _Floats, q: _Floats, r: _Floats, s: _Floats) -> bool:
    """Whether two straight edges have a point in common."""
    if max(p[0], q[0]) < min(r[0], s[0]) or max(r[0], s[0]) < min(p[0], q[0]):
        return False
    if max(p[1], q[1]) < min(r[1], s[1]) or max(r[1], s[1]) < min(p[1], q[1]):
        return False
    a, b = _side_of(p, q, r), _side_of(p, q, s)
    c, d = _side_of(r, s, p), _side_of(r, s, q)
    if a * b < 0 and c * d < 0:
        return True
    return (
        (a == 0 and _within(p, q, r))
        or (b == 0 and _within(p, q, s))
        or (c == 0 and _within(r, s, p))
        or (d == 0 and _within(r, s, q))
    )


@nb.njit(cache=True)
def _allowed(points: _Floats, v: int, bounds: tuple[_Floats, _Floats], data: _Data) -> bool:
    """Whether a vertex may stand where it now stands: the four rules."""
    edges, _, around_at, around, _, _ = data
    box, side = bounds
    for axis in range(2):
        if not box[0, axis] <= points[v, axis] <= box[1, axis]:
            return False
    ends = around[around_at[v] : around_at[v + 1]]
    if not _in_order(points, v, data):
        return False
    for k in ends:
        a, b = edges[k]
        for axis in range(2):
            if (points[b, axis] - points[a, axis]) * side[k, axis] < -1e-9:
                return False
        u = _other(edges, k, v)
        if _length(points, edges, k) < 1e-6 or not _in_order(points, u, data):
            return False
    return not _crosses(points, v, ends, edges)


@nb.njit(cache=True)
def _crosses(points: _Floats, v: int, ends: _Ints, edges: _Ints) -> bool:
    """Whether an edge of a vertex touches one with which it shares no end."""
    for k in ends:
        u = _other(edges, k, v)
        for j in range(len(edges)):
            a, b = edges[j]
            if v in (a, b) or u in (a, b):
                continue
            if _touch(points[v], points[u], points[a], points[b]):
                return True
    return False


@nb.njit(cache=True)
def _sweep(
    points: _Floats,
    square: tuple[float, int],
    weights: _Floats,
    bounds: tuple[_Floats, _Floats],
    data: _Data,
    snap: bool,  # noqa: FBT001 - compiled code knows no keyword-only arguments
) -> bool:
    """Let every vertex try its square; to snap, take the nearest grid point that is allowed."""
    edges, _, around_at, around, _, _ = data
    grid, radius = square
    moved = False
    for v in range(len(points)):
        ends = around[around_at[v] : around_at[v + 1]]
        touched = np.empty(len(ends) + 1, dtype=np.int64)
        touched[0] = v
        for i in range(len(ends)):
            touched[i + 1] = _other(edges, ends[i], v)
        terms = np.zeros(len(weights))
        _add_terms(points, touched, ends, data, terms)
        best = math.inf if snap else np.sum(terms * weights) - 1e-9
        x, y = points[v]
        to_x, to_y = x, y
        middle_x, middle_y = round(x / grid), round(y / grid)
        for i in range(-radius, radius + 1):
            for j in range(-radius, radius + 1):
                points[v, 0], points[v, 1] = (middle_x + i) * grid, (middle_y + j) * grid
                if snap:
                    cost = math.hypot(points[v, 0] - x, points[v, 1] - y)
                else:
                    terms[:] = 0.0
                    _add_terms(points, touched, ends, data, terms)
                    cost = np.sum(terms * weights)
                if cost < best and _allowed(points, v, bounds, data):
                    best, to_x, to_y = cost, points[v, 0], points[v, 1]
        moved = moved or to_x != x or to_y != y
        points[v, 0], points[v, 1] = to_x, to_y
    return moved
