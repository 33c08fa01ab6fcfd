"""Settle lengths: a linear programme in sheet millimetres, all directions and sides kept.

Directions and left/right relations are fixed, so octilinearity and planarity are linear. What is
left to choose is every length: even or true spacing, room for labels, and the sheet. The form is
that of the length stage in Nöllenburg and Wolff (2011); separators as in their planarity rule,
but fixed by the drawing at hand.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
import shapely
from numpy.typing import NDArray
from scipy.optimize import linprog

from gtfs_schematic.errors import InternalFaultError
from gtfs_schematic.layout.separation import Separations, near_pairs, separate
from gtfs_schematic.layout.skeleton import STEP, Skeleton

_MOST_REPAIRS = 20
_SLACK = 1e-4
"""Distance by which a solution may miss a clearance, millimetres."""


@dataclass(frozen=True)
class Wants:
    """What the lengths should be, millimetres; arrays per segment (m), piece (p), node (k)."""

    least: NDArray[np.float64]
    """Least length of each segment, shape (m,)."""
    piece_least: NDArray[np.float64]
    """Least length of each piece, shape (p,)."""
    piece_goal: NDArray[np.float64]
    """Wanted length of each piece, shape (p,)."""
    piece_weight: NDArray[np.float64]
    """Weight of the wanted length, shape (p,)."""
    anchors: NDArray[np.float64]
    """Wanted places of the vertices, shape (n, 2)."""
    anchor_weight: float
    half_width: NDArray[np.float64]
    """Half the width of what is drawn along each segment, shape (m,)."""
    clear: float
    """Least distance between what is drawn along two segments."""
    room: float
    """Wanted distance between them."""
    spread: float
    """Weight of the drawing's width and height."""
    jogs: NDArray[np.float64]
    """Weight of the length of each segment that is better gone, shape (m,)."""


class _Rows:
    """Sparse rows that grow in blocks."""

    def __init__(self) -> None:
        self.rows: list[NDArray[np.int64]] = []
        self.columns: list[NDArray[np.int64]] = []
        self.values: list[NDArray[np.float64]] = []
        self.right: list[NDArray[np.float64]] = []
        self.count = 0

    def add(
        self,
        terms: list[tuple[NDArray[np.int64], NDArray[np.float64] | float]],
        right: NDArray[np.float64] | float,
    ) -> None:
        """Add one row per entry of the column arrays: Σ value · x[column] ≤ or = right."""
        size = len(terms[0][0])
        row = np.arange(self.count, self.count + size)
        for columns, values in terms:
            self.rows.append(row)
            self.columns.append(np.asarray(columns, dtype=np.int64))
            self.values.append(np.broadcast_to(np.asarray(values, dtype=np.float64), size))
        self.right.append(np.broadcast_to(np.asarray(right, dtype=np.float64), size))
        self.count += size

    def matrix(self, width: int) -> tuple[sp.csc_matrix, NDArray[np.float64]]:
        """Give the matrix and the right-hand side."""
        if not self.count:
            return sp.csc_matrix((0, width)), np.zeros(0)
        entries = (
            np.concatenate(self.values),
            (np.concatenate(self.rows), np.concatenate(self.columns)),
        )
        matrix = sp.csc_matrix(entries, shape=(self.count, width))
        return matrix, np.concatenate(self.right)


def settle(
    skeleton: Skeleton,
    wants: Wants,
    box: tuple[float, float] | None,
    pairs: NDArray[np.int64] | None = None,
) -> tuple[NDArray[np.float64], NDArray[np.int64]]:
    """Solve for the nodes' places.

    Parameters
    ----------
    skeleton
        The drawing whose directions and sides are kept; any unit.
    wants
        Lengths and distances, millimetres.
    box
        Width and height that the drawing may fill, millimetres; None: as much as it needs.
    pairs
        Pairs of segments known to matter, shape (q, 2); None: those that are near.

    Returns
    -------
    tuple
        Places in millimetres, y north, the box's lower left corner at the origin, shape (k, 2);
        and the pairs of segments that mattered.

    Raises
    ------
    InternalFaultError
        If the box is too small (the caller has asked for the size first) or no end is found.
    """
    if pairs is None:
        lengths = np.hypot(*np.diff(skeleton.points[skeleton.segments], axis=1)[:, 0].T)
        pairs = near_pairs(skeleton.points, skeleton.segments, 2.0 * float(np.median(lengths)))
    apart = separate(skeleton, pairs)
    for _ in range(_MOST_REPAIRS):
        points = _solve(skeleton, wants, apart, box)
        fresh = _too_near(skeleton, wants, points, pairs)
        if not len(fresh):
            return points, pairs
        pairs = np.concatenate([pairs, fresh])
        apart = apart.extended(separate(skeleton, fresh))
    raise InternalFaultError("Settling the lengths found no end.")


def _too_near(
    skeleton: Skeleton,
    wants: Wants,
    points: NDArray[np.float64],
    known: NDArray[np.int64],
) -> NDArray[np.int64]:
    """Pairs that came too near and are not among the `known` ones."""
    half = wants.half_width
    pairs = near_pairs(points, skeleton.segments, 2.0 * float(half.max()) + wants.clear)
    lines = shapely.linestrings(points[skeleton.segments])
    gaps = shapely.distance(lines[pairs[:, 0]], lines[pairs[:, 1]])
    pairs = pairs[gaps < half[pairs[:, 0]] + half[pairs[:, 1]] + wants.clear - _SLACK]
    count = len(skeleton.segments)
    return pairs[~np.isin(pairs @ [count, 1], known @ [count, 1])]


def _solve(
    skeleton: Skeleton, wants: Wants, apart: Separations, box: tuple[float, float] | None
) -> NDArray[np.float64]:
    k, n = len(skeleton.points), skeleton.graph.n_vertices
    a, b = skeleton.segments.T
    pieces = len(skeleton.courses)
    steps = STEP[skeleton.directions]
    euclid = np.hypot(steps[:, 0], steps[:, 1])
    # Columns: x, y of nodes; slack of piece lengths; displacement; lack of room; width, height.
    size = 2 * k + pieces + 2 * n + len(apart.first) + 2
    slack = np.arange(2 * k, 2 * k + pieces)
    away = np.arange(2 * k + pieces, 2 * k + pieces + 2 * n)
    lack = np.arange(2 * k + pieces + 2 * n, size - 2)
    width = np.array([size - 2, size - 1])
    equal, most = _Rows(), _Rows()

    level = steps[:, 1] == 0
    upright = steps[:, 0] == 0
    slope = ~(level | upright)
    equal.add([(b[level] + k, 1.0), (a[level] + k, -1.0)], 0.0)
    equal.add([(b[upright], 1.0), (a[upright], -1.0)], 0.0)
    sign = (steps[:, 0] * steps[:, 1])[slope].astype(np.float64)
    equal.add(
        [
            (b[slope] + k, 1.0),
            (a[slope] + k, -1.0),
            (b[slope], -sign),
            (a[slope], sign),
        ],
        0.0,
    )
    # Length along the axis that the segment runs on, as a pair of columns.
    axis = np.where(upright, k, 0)
    forward = np.where(upright, steps[:, 1], steps[:, 0]).astype(np.float64)
    most.add([(b + axis, -forward), (a + axis, forward)], -wants.least / euclid)

    owner = skeleton.piece_of
    length = sp.csr_matrix(
        (
            np.concatenate([forward * euclid, -forward * euclid]),
            (np.concatenate([owner, owner]), np.concatenate([b + axis, a + axis])),
        ),
        shape=(pieces, size),
    )
    eye = sp.csr_matrix((np.ones(pieces), (np.arange(pieces), slack)), shape=(pieces, size))
    blocks = [-length, length - eye, -length - eye]
    rights = [-wants.piece_least, wants.piece_goal, -wants.piece_goal]

    v = np.arange(n)
    for shift in (0, 1):
        goal = wants.anchors[:, shift]
        most.add([(v + shift * k, 1.0), (away[shift * n : (shift + 1) * n], -1.0)], goal)
        most.add([(v + shift * k, -1.0), (away[shift * n : (shift + 1) * n], -1.0)], -goal)

    normal = apart.normals()
    gap = wants.half_width[apart.first] + wants.half_width[apart.second]
    i, j = apart.facing(skeleton)
    terms = [
        (i, -normal[:, 0]),
        (j, normal[:, 0]),
        (i + k, -normal[:, 1]),
        (j + k, normal[:, 1]),
    ]
    most.add(terms, -(gap + wants.clear))
    most.add([*terms, (lack, -1.0)], -(gap + wants.room))

    nodes = np.arange(k)
    for shift in (0, 1):
        most.add([(nodes + shift * k, 1.0), (np.full(k, width[shift]), -1.0)], 0.0)

    cost = np.zeros(size)
    cost[slack] = wants.piece_weight
    cost[away] = wants.anchor_weight
    cost[lack] = 0.6
    cost[width] = wants.spread
    np.add.at(cost, b + axis, wants.jogs * forward)
    np.add.at(cost, a + axis, -wants.jogs * forward)
    bounds = np.zeros((size, 2))
    bounds[:, 1] = np.inf
    if box is not None:
        bounds[width, 1] = box
    upper, right = most.matrix(size)
    matrix, zero = equal.matrix(size)
    solution = linprog(
        cost,
        A_ub=sp.vstack([upper, *blocks], format="csc"),
        b_ub=np.concatenate([right, *rights]),
        A_eq=matrix if matrix.shape[0] else None,
        b_eq=zero if matrix.shape[0] else None,
        bounds=bounds,
        method="highs-ipm",
    )
    if not solution.success:
        raise InternalFaultError(f"Settling the lengths failed: {solution.message}")
    return np.asarray(solution.x[: 2 * k].reshape(2, k).T)
