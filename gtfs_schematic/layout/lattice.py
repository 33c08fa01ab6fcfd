"""The lattice: what stands on its nodes, and laying paths on it."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

FREE = -1
BLOCKED = np.int64(1) << 40
"""Cost of what is not allowed."""

DX = np.array([1, 1, 0, -1, -1, -1, 0, 1], dtype=np.int64)
DY = np.array([0, 1, 1, 1, 0, -1, -1, -1], dtype=np.int64)
"""Steps of the eight ports, 0 east, counter-clockwise with y north."""


class Lattice(NamedTuple):
    """What stands on the lattice; arrays hold one entry per node, row by row."""

    width: int
    height: int
    occupied: NDArray[np.int32]
    """Code of the vertex or path on the node; `FREE` where none."""
    diagonals: NDArray[np.int32]
    """Code of the path whose diagonal crosses the cell above right of the node."""
    guard: NDArray[np.int32]
    """Vertex among whose eight neighbours the node is: only its own pieces pass there."""
    claims: NDArray[np.int32]
    """Count of courses of other pieces, not laid yet, that pass the node."""


@njit(cache=True)
def direction(start: int, end: int, width: int) -> int:
    """Port through which a step from one node to a neighbour leaves."""
    dx, dy = end % width - start % width, end // width - start // width
    for d in range(8):
        if DX[d] == dx and DY[d] == dy:
            return d
    return -1


@njit(cache=True)
def mark(path: NDArray[np.int64], code: int, lattice: Lattice) -> None:
    """Lay a path on the lattice with its code, or lift it with `FREE`; ends stay as they are."""
    width = lattice.width
    for k in range(1, path.shape[0]):
        if k < path.shape[0] - 1:
            lattice.occupied[path[k]] = code
        x, y = path[k] % width, path[k] // width
        i, j = path[k - 1] % width, path[k - 1] // width
        if x != i and y != j:
            lattice.diagonals[min(y, j) * width + min(x, i)] = code


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
