"""Where geography wants every point: evenly spaced, in straight runs, the topology not lost."""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray
from scipy.sparse.linalg import spsolve

from gtfs_schematic.layout.guard import free_radii, near_pairs, repulsion
from gtfs_schematic.layout.plane import PlaneGraph
from gtfs_schematic.layout.spread import spread
from gtfs_schematic.layout.strokes import straightened

_PULL_TO_GROUND = 0.004
"""Weight of staying at the true place against one link's wanted vector; small, so that dense
centres open, but enough to hold far parts of the network where they belong."""

_STEPS = 160
_STILL = 1e-3
"""Steps of a guarded move, and the longest move, in station spacings, at which it has ended."""

_REACH = 2.0
_SKIN = 1.0
"""Distance up to which links are in a point's way, and what is added to find them less often."""

_WANTED_CLEARANCE = 0.9
"""Distance, in station spacings, that a point wants from links that are not its own."""

_THIN = 0.1
"""Free radius, in station spacings, below which moves get shorter than PrEd allows."""

_LEAST_CLEARANCE = 0.75
"""Distance that it gets at least."""

_SHORTEST = 0.02
"""Length, in station spacings, below which a segment counts no more for being short."""

_TRUE = 0.95
"""Fidelity from which on the ground itself is wanted, wherever it runs."""


def anchor_points(graph: PlaneGraph, fidelity: float, stride: int = 1) -> NDArray[np.float64]:
    """Move the points of a plane graph towards even spacing and straight runs, topology kept.

    Parameters
    ----------
    graph
        Plane graph in local metres.
    fidelity
        1 keeps the ground to scale, 0 gives every link the same length at its true bearing.
    stride
        Of the eight directions only every so many-th will be drawn.

    Returns
    -------
    NDArray
        Points in station spacings (one is the median length of a link), y north, shape (n, 2).

    Notes
    -----
    Least squares for the targets; then the move rule of PrEd (Bertault 2000) as refined in
    ImPrEd (Simonetto, Archambault, Auber and Bourqui 2011): no point moves further than 0.45 of
    its distance to the nearest foreign segment, nor does that segment's end.
    """
    ground, lengths = _in_spacings(graph)
    vectors = _wanted_vectors(graph, ground, lengths, fidelity)
    targets = _targets(graph, ground, lengths, vectors, fidelity)
    moved = guarded_move(graph, ground, targets)
    if fidelity < _TRUE:
        targets, directions = straightened(graph, moved, fidelity, stride)
        moved = guarded_move(graph, moved, targets)
        vectors = directions * np.hypot(vectors[:, 0], vectors[:, 1])[:, None]
    return np.round(spread(moved, graph.segments, vectors, _LEAST_CLEARANCE), 6)


def true_points(graph: PlaneGraph, fidelity: float) -> NDArray[np.float64]:
    """Give where geography wants the points, whatever that does to the topology.

    As `anchor_points`: station spacings, y north, shape (n, 2).
    """
    ground, lengths = _in_spacings(graph)
    vectors = _wanted_vectors(graph, ground, lengths, fidelity)
    return _targets(graph, ground, lengths, vectors, fidelity)


def _in_spacings(
    graph: PlaneGraph,
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Centre and scale the ground so that a typical link has length 1; and segment lengths."""
    a, b = graph.segments.T
    lengths = np.hypot(*(graph.points[a] - graph.points[b]).T)
    spacing = float(np.median(lengths / graph.segment_shares)) if len(lengths) else 1.0
    ground = (graph.points - graph.points.mean(axis=0)) / max(spacing, 1e-9)
    return np.round(ground, 9), np.round(np.maximum(lengths / max(spacing, 1e-9), 1e-6), 9)


def _wanted_vectors(
    graph: PlaneGraph,
    ground: NDArray[np.float64],
    lengths: NDArray[np.float64],
    fidelity: float,
) -> NDArray[np.float64]:
    """Vector that each segment should have: true bearing, a blend of true and even length."""
    a, b = graph.segments.T
    wanted = lengths**fidelity * graph.segment_shares ** (1.0 - fidelity)
    vectors = (ground[b] - ground[a]) / lengths[:, None] * wanted[:, None]
    return np.asarray(np.round(vectors, 9))


def _targets(
    graph: PlaneGraph,
    ground: NDArray[np.float64],
    lengths: NDArray[np.float64],
    vectors: NDArray[np.float64],
    fidelity: float,
) -> NDArray[np.float64]:
    """Solve for points whose segments come near their wanted vectors, with a pull to the ground."""
    a, b = graph.segments.T
    m, n = len(a), len(ground)
    wanted = np.hypot(vectors[:, 0], vectors[:, 1])
    weights = 1.0 / np.maximum(wanted, _SHORTEST)
    rows = np.repeat(np.arange(m), 2)
    columns = np.column_stack([a, b]).ravel()
    values = np.column_stack([-weights, weights]).ravel()
    difference = sp.csr_matrix((values, (rows, columns)), shape=(m, n))
    pull = _PULL_TO_GROUND + 10.0 * fidelity**4
    scale = float(np.sum(wanted * lengths) / np.sum(lengths * lengths)) if m else 1.0
    normal = (difference.T @ difference + pull * sp.identity(n)).tocsc()
    right = difference.T @ (vectors * weights[:, None]) + pull * scale * ground
    return np.round(np.asarray(spsolve(normal, right)).reshape(n, 2), 6)


def guarded_move(
    graph: PlaneGraph, start: NDArray[np.float64], targets: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Walk from `start` to `targets`; give way, but never cross, where links come near."""
    points: NDArray[np.float64] = np.ascontiguousarray(start)
    segments = np.ascontiguousarray(graph.segments)
    if not len(segments):
        return points
    # Start at the targets' scale, so that the first steps are not all spent on shrinking.
    points = points * (np.ptp(targets, axis=0).max() / max(np.ptp(points, axis=0).max(), 1e-9))
    points = np.round(points + targets.mean(axis=0) - points.mean(axis=0), 9)
    pairs, moved = near_pairs(points, segments, _REACH + _SKIN), 0.0
    for _ in range(_STEPS):
        if moved > _SKIN / 2.0:
            pairs, moved = near_pairs(points, segments, _REACH + _SKIN), 0.0
        radii = free_radii(points, segments, pairs, _REACH)
        # Thin gaps shrink ever more slowly, so that many steps do not grind them to nothing.
        radii *= 0.45 * np.minimum(1.0, radii / _THIN)
        push = repulsion(points, segments, pairs, _WANTED_CLEARANCE)
        move = 0.2 * (targets - points) + 0.6 * push
        length = np.hypot(move[:, 0], move[:, 1])
        factor = np.minimum(1.0, radii / np.maximum(length, 1e-12))
        points = np.round(points + move * factor[:, None], 9)
        longest = float((length * factor).max())
        moved += longest
        if longest < _STILL:
            break
    return points
