"""The lattice of the sheet: which step crosses which piece, what is closed, what a node costs."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numba import njit
from numpy.typing import NDArray
from scipy import sparse

Floats = NDArray[np.float64]
Ints = NDArray[np.int32]

DX = np.array([1, 1, 0, -1, -1, -1, 0, 1], dtype=np.int64)
DY = np.array([0, 1, 1, 1, 0, -1, -1, -1], dtype=np.int64)
"""Steps of the eight directions, 0 east, counter-clockwise with y up."""
SEVERAL = 1 << 30
"""A step that crosses more than one piece, or an end of one: nobody takes it."""
FAR = 9.0
"""Clearances are known up to so many millimetres."""


@dataclass
class Lattice:
    """Nodes in rows from the lower left, `pitch` millimetres apart; y up.

    A step is known by its lower node and one of the directions 0 … 3; `crossed` holds the number of
    the piece it crosses, negative from left to right, and `share` how far along the piece.
    """

    origin: tuple[float, float]
    pitch: float
    width: int
    height: int
    crossed: Ints
    share: NDArray[np.float32]
    slant: NDArray[np.float32]
    """How far from square a step crosses, 0 … 1."""
    clear: NDArray[np.float32]
    """Per node the distance to the nearest line's edge, millimetres; negative on it."""
    closed: NDArray[np.bool_]
    cost: NDArray[np.float32]
    calm: float = 1.0
    """How much more bends cost than on a common sheet: on a larger one steps are larger, too."""

    def at(self, nodes: NDArray[np.int64]) -> Floats:
        """Give the places of nodes, millimetres, y up, shape (n, 2)."""
        y, x = np.divmod(nodes, self.width)
        return np.column_stack([x, y]) * self.pitch + self.origin

    def steps(self, points: Floats) -> Floats:
        """Give places in steps from the first node."""
        return np.asarray((points - self.origin) / self.pitch)

    def node(self, point: Floats) -> int:
        """Give the nearest node."""
        x, y = np.rint(self.steps(point))
        x, y = min(max(x, 0), self.width - 1), min(max(y, 0), self.height - 1)
        return int(y) * self.width + int(x)


def blank(low: Floats, high: Floats, pitch: float) -> Lattice:
    """Give an empty lattice over a box.

    It stands off whole hundredths of a millimetre, where stations and bends are, so that no node
    lies on a line.
    """
    width, height = (math.ceil(side / pitch) + 1 for side in (high - low).tolist())
    n = width * height
    return Lattice(
        (float(np.floor(low[0]) + 0.00317), float(np.floor(low[1]) + 0.00571)),
        pitch,
        width,
        height,
        np.zeros((n, 4), dtype=np.int32),
        np.zeros((n, 4), dtype=np.float32),
        np.zeros((n, 4), dtype=np.float32),
        np.full(n, FAR, dtype=np.float32),
        np.zeros(n, dtype=np.bool_),
        np.zeros(n, dtype=np.float32),
    )


def lay(lattice: Lattice, number: int, line: Floats, half_mm: float | None) -> None:
    """Lay a piece; `half_mm` is half its drawn width, None for one that is not drawn."""
    steps = lattice.steps(line)
    lengths = np.hypot(*np.diff(steps, axis=0).T)
    along = np.concatenate([[0.0], np.cumsum(lengths)]) / max(float(lengths.sum()), 1e-9)
    for k in range(len(steps) - 1):
        ends = np.array([along[k], along[k + 1]])
        _cross(lattice.crossed, lattice.share, lattice.slant, lattice.width, number,
               steps[k], steps[k + 1], ends)  # fmt: skip
        if half_mm is not None:
            reach = (FAR + half_mm) / lattice.pitch
            _clear(lattice.clear, lattice.width, steps[k], steps[k + 1], lattice.pitch, half_mm,
                   reach)  # fmt: skip


def lift(lattice: Lattice, number: int) -> None:
    """Take up a piece that crosses nothing else."""
    lattice.crossed[np.abs(lattice.crossed) == number] = 0


def faces(lattice: Lattice) -> Ints:
    """Give the number of every node's connected part of the lattice, -1 where it is closed."""
    n = lattice.width * lattice.height
    open_ = ~lattice.closed
    nodes = np.arange(n)
    pairs = []
    for d in (0, 2):
        step = int(DY[d]) * lattice.width + int(DX[d])
        inside = (nodes % lattice.width + DX[d] < lattice.width) & (nodes + step < n)
        a = nodes[inside & open_ & (lattice.crossed[:, d] == 0)]
        pairs.append(np.stack([a, a + step])[:, open_[a + step]])
    a, b = np.concatenate(pairs, axis=1)
    graph = sparse.coo_matrix((np.ones(len(a), dtype=np.int8), (a, b)), shape=(n, n))
    labels: Ints = sparse.csgraph.connected_components(graph, directed=False)[1].astype(np.int32)
    labels[lattice.closed] = -1
    return labels


@njit(cache=True)
def _cross(  # noqa: PLR0913, PLR0917 - compiled
    crossed: Ints,
    share: NDArray[np.float32],
    slant: NDArray[np.float32],
    width: int,
    number: int,
    p: Floats,
    q: Floats,
    ends: Floats,
) -> None:
    """Mark the steps that a segment crosses."""
    height = crossed.shape[0] // width
    ux, uy = q[0] - p[0], q[1] - p[1]
    length = math.sqrt(ux * ux + uy * uy)
    x0, x1 = int(min(p[0], q[0])) - 2, int(max(p[0], q[0])) + 2
    y0, y1 = int(min(p[1], q[1])) - 2, int(max(p[1], q[1])) + 2
    for y in range(max(0, y0), min(height - 1, y1) + 1):
        for x in range(max(0, x0), min(width - 1, x1) + 1):
            # Far from the segment's line there is nothing to test.
            if length > 0.0 and abs((x - p[0]) * uy - (y - p[1]) * ux) > 2.0 * length:
                continue
            for d in range(4):
                vx, vy = float(DX[d]), float(DY[d])
                turn = ux * vy - uy * vx
                if turn == 0.0:
                    continue
                wx, wy = x - p[0], y - p[1]
                s = (wx * vy - wy * vx) / turn
                t = (wx * uy - wy * ux) / turn
                if s < 0.0 or s > 1.0 or t < 0.0 or t > 1.0:
                    continue
                node = y * width + x
                if crossed[node, d] != 0:
                    crossed[node, d] = SEVERAL
                else:
                    crossed[node, d] = number if turn > 0.0 else -number
                    share[node, d] = ends[0] + s * (ends[1] - ends[0])
                    square = abs(turn) / (length * math.sqrt(vx * vx + vy * vy))
                    slant[node, d] = 1.0 - square


@njit(cache=True)
def _clear(  # noqa: PLR0913, PLR0917 - compiled
    clear: NDArray[np.float32],
    width: int,
    p: Floats,
    q: Floats,
    pitch: float,
    half: float,
    reach: float,
) -> None:
    """Lower the clearances near a segment."""
    height = clear.shape[0] // width
    ux, uy = q[0] - p[0], q[1] - p[1]
    square = ux * ux + uy * uy
    x0, x1 = int(min(p[0], q[0]) - reach), int(max(p[0], q[0]) + reach) + 1
    y0, y1 = int(min(p[1], q[1]) - reach), int(max(p[1], q[1]) + reach) + 1
    for y in range(max(0, y0), min(height - 1, y1) + 1):
        for x in range(max(0, x0), min(width - 1, x1) + 1):
            t = 0.0 if square == 0.0 else ((x - p[0]) * ux + (y - p[1]) * uy) / square
            t = min(1.0, max(0.0, t))
            dx, dy = p[0] + t * ux - x, p[1] + t * uy - y
            away = math.sqrt(dx * dx + dy * dy) * pitch - half
            clear[y * width + x] = min(clear[y * width + x], away)
