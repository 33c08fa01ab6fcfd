"""Open dense places: a linear programme that gives every point its clearance, topology kept."""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp
import shapely
from numpy.typing import NDArray
from scipy.optimize import linprog

from gtfs_schematic.errors import InternalFaultError

_ROUNDS = 2
_MOST_REPAIRS = 30
_POSITION_WEIGHT = 0.02


def spread(
    points: NDArray[np.float64],
    segments: NDArray[np.int64],
    wanted: NDArray[np.float64],
    clearance: float,
) -> NDArray[np.float64]:
    """Move points so that each keeps `clearance` from every foreign segment.

    Parameters
    ----------
    points
        A planar straight-line drawing, shape (n, 2).
    segments
        Point indices, shape (m, 2).
    wanted
        Vector that each segment should keep, shape (m, 2).
    clearance
        Least distance, in the unit of `points`.

    Returns
    -------
    NDArray
        The moved points; the drawing is planar with the same cyclic orders.

    Notes
    -----
    A direction that separates a point from a segment now stays a linear constraint, so planarity
    needs no whole-number variables; a larger copy of the drawing meets all of them, so there
    always is a solution. Only near pairs are constrained at first; pairs that a solution brings
    too near are added until none is left. Each round takes fresh directions from the new drawing.
    """
    for _ in range(_ROUNDS):
        pairs = _near_pairs(points, segments, 1.5 * clearance)
        for _ in range(_MOST_REPAIRS):
            moved = _solve(points, segments, wanted, clearance, pairs)
            fresh = _violated(moved, segments, 0.98 * clearance) - pairs
            if not fresh:
                break
            pairs |= fresh
        else:
            raise InternalFaultError("Opening the dense places found no end.")
        points = moved
    return points


_Pairs = set[tuple[int, int]]
"""(point, segment) pairs of which the point is no end of the segment."""


def _near_pairs(
    points: NDArray[np.float64], segments: NDArray[np.int64], distance: float
) -> _Pairs:
    lines = shapely.linestrings(points[segments])
    i, k = shapely.STRtree(lines).query(
        shapely.points(points), predicate="dwithin", distance=distance
    )
    foreign = (segments[k, 0] != i) & (segments[k, 1] != i)
    return set(zip(i[foreign].tolist(), k[foreign].tolist(), strict=True))


def _violated(points: NDArray[np.float64], segments: NDArray[np.int64], clearance: float) -> _Pairs:
    """Pairs that are too near, and all pairs of two segments that cross."""
    pairs = _near_pairs(points, segments, clearance)
    lines = shapely.linestrings(points[segments])
    for j, k in zip(*shapely.STRtree(lines).query(lines, predicate="crosses"), strict=True):
        for i in segments[j]:
            if i not in segments[k]:
                pairs.add((int(i), int(k)))
    return pairs


def _solve(
    points: NDArray[np.float64],
    segments: NDArray[np.int64],
    wanted: NDArray[np.float64],
    clearance: float,
    pairs: _Pairs,
) -> NDArray[np.float64]:
    n, m = len(points), len(segments)
    rows, columns, values, right = _separators(points, segments, clearance, pairs)
    separation = sp.csr_matrix((values, (rows, columns)), shape=(len(right), 2 * n))
    k = np.arange(m)
    difference = sp.csr_matrix(
        (np.repeat([-1.0, 1.0], m), (np.tile(k, 2), segments.T.ravel())), shape=(m, n)
    )
    both = sp.block_diag([difference, difference])
    eye = sp.identity(2 * n)
    goal = np.concatenate([wanted[:, 0], wanted[:, 1]])
    home = points.T.ravel()
    none_m, none_n = sp.csr_matrix((2 * m, 2 * n)), sp.csr_matrix((2 * n, 2 * m))
    slack_m, slack_n = sp.identity(2 * m), sp.identity(2 * n)
    matrix = sp.vstack(
        [
            sp.hstack([-separation, sp.csr_matrix((len(right), 2 * m + 2 * n))]),
            sp.hstack([both, -slack_m, none_m]),
            sp.hstack([-both, -slack_m, none_m]),
            sp.hstack([eye, none_n, -slack_n]),
            sp.hstack([-eye, none_n, -slack_n]),
        ],
        format="csc",
    )
    bound = np.concatenate([-right, goal, -goal, home, -home])
    length = np.maximum(np.hypot(wanted[:, 0], wanted[:, 1]), 0.3)
    cost = np.concatenate(
        [np.zeros(2 * n), np.tile(1.0 / length, 2), np.full(2 * n, _POSITION_WEIGHT)]
    )
    limits = [(None, None)] * (2 * n) + [(0.0, None)] * (2 * m + 2 * n)
    solution = linprog(cost, A_ub=matrix, b_ub=bound, bounds=limits, method="highs-ipm")
    if not solution.success:
        raise InternalFaultError(f"Opening the dense places failed: {solution.message}")
    return np.asarray(solution.x[: 2 * n].reshape(2, n).T)


def _separators(
    points: NDArray[np.float64], segments: NDArray[np.int64], clearance: float, pairs: _Pairs
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.float64], NDArray[np.float64]]:
    """Rows n · (p − end) ≥ clearance for both ends of the segment of every pair."""
    i, k = np.array(sorted(pairs), dtype=np.int64).reshape(-1, 2).T
    a, b = points[segments[k, 0]], points[segments[k, 1]]
    along = b - a
    square = np.maximum((along**2).sum(axis=1), 1e-18)
    t = np.clip(((points[i] - a) * along).sum(axis=1) / square, 0.0, 1.0)
    normal = points[i] - (a + t[:, None] * along)
    normal /= np.maximum(np.hypot(normal[:, 0], normal[:, 1]), 1e-12)[:, None]
    n, count = len(points), len(i)
    rows, columns, values = [], [], []
    for side in range(2):
        row = np.arange(count) + side * count
        end = segments[k, side]
        rows += [row, row, row, row]
        columns += [i, end, i + n, end + n]
        values += [normal[:, 0], -normal[:, 0], normal[:, 1], -normal[:, 1]]
    right = np.full(2 * count, clearance)
    return np.concatenate(rows), np.concatenate(columns), np.concatenate(values), right
