"""Strokes: what the eye follows as one run, and the direction that each part of it should have."""

from __future__ import annotations

import math

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray
from scipy.sparse.linalg import spsolve

from gtfs_schematic.layout.plane import PlaneGraph

_SHARPEST = math.radians(50.0)
"""A line that turns more sharply at a vertex on the ground begins a new stroke."""
_BENDS = (0.0, 1.0, 3.0)
"""Prices of a change of direction by 0, 45 and 90 degrees; sharper ones are not made."""
_STRICTNESS = 1.3
"""Price of one spacing of length along which a stroke runs at a right angle to its bearing, at
fidelity 0."""
_ALONG = 0.15
"""Weight of keeping the length of a segment against keeping its direction."""
_PULL = 0.002
"""Weight of staying in place against the direction of a segment of one line and one spacing."""
_MOST_LINES = 5
_WALK = 0.4
"""A walk counts as so many lines."""

_COMPASS = np.arange(8) * (math.pi / 4.0)


def straightened(
    graph: PlaneGraph, points: NDArray[np.float64], fidelity: float, stride: int = 1
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Turn every stroke, as a whole, into few straight runs in the eight directions.

    What runs beside each other on the ground turns the same way, so that long courses come out
    straight together, which one vertex moving alone could not bring about.

    Parameters
    ----------
    graph
        Plane graph.
    points
        Its points, shape (n, 2), station spacings, y north.
    fidelity
        The closer to 1, the more turns a stroke makes to keep to its true bearings.
    stride
        Of the eight directions only every so many-th is used.

    Returns
    -------
    targets
        Wished places of the points, shape (n, 2); they need not be planar.
    directions
        Unit vector of each segment, shape (m, 2).

    Notes
    -----
    A stroke is a maximal chain of edges in good continuation, as in Thomson and Richardson (1999),
    "The 'good continuation' principle of perceptual organization applied to the generalization of
    road networks" (from memory). The directions of a stroke are the exact least of the turning
    off its bearings and of its bends, by dynamic programming; the places are least squares.
    """
    directions = np.zeros((len(graph.segments), 2))
    strictness = _STRICTNESS / max(1.0 - fidelity, 1e-6)
    counts = _lines(graph)
    for segments, ahead in _strokes(graph, points):
        start, end = graph.segments[segments].T
        vectors = (points[end] - points[start]) * ahead[:, None]
        lines = counts[segments]
        chosen = _COMPASS[_directions(vectors, lines, strictness, stride)]
        units = np.column_stack([np.cos(chosen), np.sin(chosen)])
        directions[segments] = np.round(units * ahead[:, None], 12)
    return _places(graph, points, directions), directions


def _strokes(
    graph: PlaneGraph, points: NDArray[np.float64]
) -> list[tuple[NDArray[np.int64], NDArray[np.float64]]]:
    """Chain segments to strokes: their indices in order, and 1 if met from their start, else -1."""
    onward = _continuations(graph, points)
    ends = range(2 * len(graph.pieces))
    first = np.cumsum([0, *(len(piece.parts) for piece in graph.pieces)])
    done: set[int] = set()
    strokes = []
    for end in (*(end for end in ends if end not in onward), *ends):
        segments: list[int] = []
        ahead: list[float] = []
        there: int | None = end
        while there is not None and there // 2 not in done:
            p = there // 2
            done.add(p)
            run = range(first[p], first[p + 1])
            segments += run if there % 2 == 0 else reversed(run)
            ahead += [1.0 - 2.0 * (there % 2)] * len(run)
            there = onward.get(there ^ 1)
        if segments:
            strokes.append((np.array(segments), np.array(ahead)))
    return strokes


def _continuations(graph: PlaneGraph, points: NDArray[np.float64]) -> dict[int, int]:
    """Pair the piece ends at which a stroke runs on: most lines first, then the straightest."""
    bearing = {}
    for p, piece in enumerate(graph.pieces):
        for i, (a, b) in enumerate((piece.nodes[:2], piece.nodes[:-3:-1])):
            x, y = points[b] - points[a]
            bearing[2 * p + i] = math.atan2(y, x)
    options = []
    for _, a, b, lines in graph.through:
        turn = abs((bearing[a] - bearing[b]) % math.tau - math.pi)
        if turn <= _SHARPEST:
            options.append((-lines, round(turn, 6), a, b))
    onward: dict[int, int] = {}
    for _, _, a, b in sorted(options):
        if a not in onward and b not in onward and a != b:
            onward[a], onward[b] = b, a
    return onward


def _lines(graph: PlaneGraph) -> NDArray[np.float64]:
    """Count of lines on each segment, at most so many that a bend is one bend to the eye."""
    return np.concatenate(
        [
            np.full(len(p.parts), float(min(len(p.lines), _MOST_LINES)) or _WALK)
            for p in graph.pieces
        ]
    )


def _directions(
    vectors: NDArray[np.float64], lines: NDArray[np.float64], strictness: float, stride: int
) -> NDArray[np.int64]:
    """Choose one of the eight directions, or every other, for each vector of a stroke."""
    length = np.hypot(vectors[:, 0], vectors[:, 1])
    bearing = np.arctan2(vectors[:, 1], vectors[:, 0])
    off = 1.0 - np.cos(bearing[:, None] - _COMPASS)
    prices = np.round(strictness * (lines * length)[:, None] * off, 9)
    prices[:, np.arange(8) % stride != 0] = np.inf
    steps = np.abs(np.arange(8)[:, None] - np.arange(8))
    bends = np.array([*_BENDS, np.inf, np.inf])[np.minimum(steps, 8 - steps)]
    least = prices[0]
    came_from = []
    for k in range(1, len(vectors)):
        ways = least[:, None] + bends * min(lines[k - 1], lines[k])
        came_from.append(ways.argmin(axis=0))
        least = ways.min(axis=0) + prices[k]
    chosen = [int(least.argmin())]
    for back in reversed(came_from):
        chosen.append(int(back[chosen[-1]]))
    return np.array(chosen[::-1])


def _places(
    graph: PlaneGraph, points: NDArray[np.float64], directions: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Least squares: every segment along its direction, about as long as it is."""
    a, b = graph.segments.T
    m, n = len(a), len(points)
    length = np.maximum(np.hypot(*(points[b] - points[a]).T), 0.2)
    weight = np.sqrt(_lines(graph) / length)
    ux, uy = directions.T * weight
    difference = sp.csr_matrix(
        (np.repeat([-1.0, 1.0], m), (np.tile(np.arange(m), 2), np.concatenate([a, b]))),
        shape=(m, n),
    )
    across = sp.hstack([sp.diags(-uy) @ difference, sp.diags(ux) @ difference])
    along = _ALONG * sp.hstack([sp.diags(ux) @ difference, sp.diags(uy) @ difference])
    normal = across.T @ across + along.T @ along + _PULL * sp.identity(2 * n)
    right = along.T @ (_ALONG * weight * length) + _PULL * points.T.ravel()
    solution = np.asarray(spsolve(normal.tocsc(), right))
    return np.round(solution.reshape(2, n).T, 6)
