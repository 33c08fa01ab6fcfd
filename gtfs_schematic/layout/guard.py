"""Distances between points and foreign segments: how far each point may move, and which way."""

from __future__ import annotations

import math

import numpy as np
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


@njit(cache=True)
def free_radii(
    points: NDArray[np.float64], segments: NDArray[np.int64]
) -> NDArray[np.float64]:  # pragma: no cover - compiled
    """Give each point its distance to the nearest foreign segment; shape (n,).

    As the end of a segment, a point takes that of the nearest foreign point to the segment, if
    it is less. The unit is that of `points`. A point is foreign to a segment of which it is no
    end.
    """
    n, m = points.shape[0], segments.shape[0]
    radii = np.full(n, np.inf)
    for k in range(m):
        a, b = segments[k, 0], segments[k, 1]
        ax, ay, bx, by = points[a, 0], points[a, 1], points[b, 0], points[b, 1]
        low_x, high_x = min(ax, bx), max(ax, bx)
        low_y, high_y = min(ay, by), max(ay, by)
        for i in range(n):
            if i in (a, b):
                continue
            px, py = points[i, 0], points[i, 1]
            # A box test first: beyond the radii known so far nothing changes.
            reach = max(radii[i], radii[a], radii[b])
            if (
                px < low_x - reach
                or px > high_x + reach
                or py < low_y - reach
                or py > high_y + reach
            ):
                continue
            qx, qy, _ = _nearest(px, py, ax, ay, bx, by)
            distance = math.hypot(px - qx, py - qy)
            radii[i] = min(radii[i], distance)
            radii[a] = min(radii[a], distance)
            radii[b] = min(radii[b], distance)
    return radii


@njit(cache=True)
def repulsion(
    points: NDArray[np.float64], segments: NDArray[np.int64], clearance: float
) -> NDArray[np.float64]:  # pragma: no cover - compiled
    """Give each point the push that opens gaps narrower than `clearance`; shape (n, 2).

    Points and the ends of the segments they are close to are pushed apart, in proportion to what
    the gap lacks.
    """
    n, m = points.shape[0], segments.shape[0]
    push = np.zeros((n, 2))
    for k in range(m):
        a, b = segments[k, 0], segments[k, 1]
        ax, ay, bx, by = points[a, 0], points[a, 1], points[b, 0], points[b, 1]
        low_x, high_x = min(ax, bx) - clearance, max(ax, bx) + clearance
        low_y, high_y = min(ay, by) - clearance, max(ay, by) + clearance
        for i in range(n):
            px, py = points[i, 0], points[i, 1]
            if px < low_x or px > high_x or py < low_y or py > high_y or i in (a, b):
                continue
            qx, qy, t = _nearest(px, py, ax, ay, bx, by)
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
