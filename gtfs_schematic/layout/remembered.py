"""Let a drawing that is laid out anew resemble the one before: its places become the anchors."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray
from scipy.sparse.linalg import spsolve

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.anchors import guarded_move
from gtfs_schematic.layout.plane import PlaneGraph
from gtfs_schematic.layout.spread import spread

_LEAST_CLEARANCE = 0.75
"""Distance, in station spacings, that a point gets from links that are not its own."""
_HOLD = 100.0
"""Weight of an old place against one link that wants to be as long as it would be anew."""


def remembered(
    graph: PlaneGraph, anchors: NDArray[np.float64], previous: Mapping[str, Point]
) -> NDArray[np.float64]:
    """Move anchors to where an earlier drawing had their stations, topology kept.

    Parameters
    ----------
    graph
        Plane graph of the network.
    anchors
        Where its points would go without memory, in station spacings, y north, shape (n, 2).
    previous
        Places of stations in the earlier drawing, millimetres, y down.

    Returns
    -------
    NDArray
        Anchors, shape (n, 2). What is new goes with its neighbours.

    Notes
    -----
    The cost of Brandes and Wagner (1997): that of a static drawing, plus how far each vertex is
    from where it was. `Weights.previous` prices the second part on the lattice.
    """
    known = [
        (i, previous[station])
        for i, station in enumerate(_stations(graph))
        if station is not None and station in previous
    ]
    if len(known) < 2:
        return anchors
    index = np.array([i for i, _ in known])
    old = np.array([(x, -y) for _, (x, y) in known])
    # The scale that suits the anchors, and their middle.
    g, w = old - old.mean(axis=0), anchors[index] - anchors[index].mean(axis=0)
    scale = float((g * w).sum()) / max(float((g * g).sum()), 1e-9)
    if scale <= 0.0:
        return anchors
    goal = anchors[index].mean(axis=0) + scale * g
    a, b = graph.segments.T
    m, n = len(a), len(anchors)
    values = np.column_stack([-np.ones(m), np.ones(m)]).ravel()
    rows, columns = np.repeat(np.arange(m), 2), np.column_stack([a, b]).ravel()
    difference = sp.csr_matrix((values, (rows, columns)), shape=(m, n))
    hold = np.zeros(n)
    hold[index] = _HOLD
    pull = np.zeros((n, 2))
    pull[index] = _HOLD * goal
    normal = difference.T @ difference + sp.diags(hold + 1e-6)
    right = difference.T @ (anchors[b] - anchors[a]) + pull + 1e-6 * anchors
    targets = np.round(np.asarray(spsolve(normal.tocsc(), right)).reshape(n, 2), 6)
    moved = guarded_move(graph, anchors, targets)
    vectors = np.round(targets[b] - targets[a], 9)
    return np.round(spread(moved, graph.segments, vectors, _LEAST_CLEARANCE), 6)


def _stations(graph: PlaneGraph) -> list[str | None]:
    """Station of every point, None for crossings."""
    found: list[str | None] = [*graph.station_of]
    found += [None] * (len(graph.points) - len(found))
    for piece in graph.pieces:
        for node, station in zip(piece.nodes[1:-1], piece.stations, strict=True):
            found[node] = station
    return found
