"""Distances between points and foreign segments: how far each point may move, and which way."""

from __future__ import annotations

import math

import numpy as np
import shapely
from numba import njit
from numpy.typing import NDArray


@njit(cache=True)
def _nearest(
    px: float, py: float, ax: float, ay: float, bx: float, by: float
) -> tuple[float, float, float]:  # pragma: no cover - compiled
    """Nearest point of segment ab to p, and its parameter."""
    dx, dy = bx - ax, by - ay
    square = dx * dx + dy * dy
    t = 0.0 if square == 0.0 else ((px - ax) * dx + (py - ay) * dy) / square
    t = min(1.0, max(0.0, t))
    return ax + t * dx, ay + t * dy, t


def near_pairs(
    points: NDArray[np.float64], segments: NDArray[np.int64], reach: float
) -> NDArray[np.int64]:
    """Give (point, segment) pairs nearer than `reach`, shape (n, 2), sorted.

    Only points that are no end of the segment: those are foreign to it.
    """
    lines = shapely.linestrings(points[segments])
    i, k = shapely.STRtree(lines).query(shapely.points(points), predicate="dwithin", distance=reach)
    foreign = (segments[k, 0] != i) & (segments[k, 1] != i)
    i, k = i[foreign], k[foreign]
    order = np.lexsort((i, k))
    return np.ascontiguousarray(np.column_stack([i[order], k[order]]).astype(np.int64))


@njit(cache=True)
def free_radii(
    points: NDArray[np.float64],
    segments: NDArray[np.int64],
    pairs: NDArray[np.int64],
    most: float,
) -> NDArray[np.float64]:  # pragma: no cover - compiled
    """Give each point its distance to the nearest foreign segment, at most `most`; shape (n,).

    As the end of a segment, a point takes that of the nearest foreign point to the segment, if
    it is less. The unit is that of `points`; only `pairs` are looked at.
    """
    radii = np.full(points.shape[0], most)
    for j in range(pairs.shape[0]):
        i, k = pairs[j, 0], pairs[j, 1]
        a, b = segments[k, 0], segments[k, 1]
        px, py = points[i, 0], points[i, 1]
        qx, qy, _ = _nearest(px, py, points[a, 0], points[a, 1], points[b, 0], points[b, 1])
        distance = math.hypot(px - qx, py - qy)
        radii[i] = min(radii[i], distance)
        radii[a] = min(radii[a], distance)
        radii[b] = min(radii[b], distance)
    return radii


@njit(cache=True)
def repulsion(
    points: NDArray[np.float64],
    segments: NDArray[np.int64],
    pairs: NDArray[np.int64],
    clearance: float,
) -> NDArray[np.float64]:  # pragma: no cover - compiled
    """Give each point the push that opens gaps narrower than `clearance`; shape (n, 2).

    Points and the ends of the segments they are close to are pushed apart, in proportion to what
    the gap lacks; only `pairs` are looked at.
    """
    push = np.zeros((points.shape[0], 2))
    for j in range(pairs.shape[0]):
        i, k = pairs[j, 0], pairs[j, 1]
        a, b = segments[k, 0], segments[k, 1]
        px, py = points[i, 0], points[i, 1]
        qx, qy, t = _nearest(px, py, points[a, 0], points[a, 1], points[b, 0], points[b, 1])
        distance = math.hypot(px - qx, py - qy)
        if 0.0 < distance < clearance:
            lack = 0.5 * (clearance - distance) / distance
            fx, fy = (px - qx) * lack, (py - qy) * lack
            push[i, 0] += fx
            push[i, 1] += fy
            push[a, 0] -= fx * (1.0 - t)
            push[a, 1] -= fy * (1.0 - t)
            push[b, 0] -= fx * t
            push[b, 1] -= fy * t
    return push
