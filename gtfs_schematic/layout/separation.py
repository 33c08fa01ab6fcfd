"""Which segments must stay apart, by how much, and along which axis."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.layout.skeleton import STEP, Skeleton

_NORMALS = np.round(STEP / np.hypot(STEP[:, :1], STEP[:, 1:]), 12)


@dataclass(frozen=True)
class Separations:
    """Pairs of segments without a common node; `axis` points from the second to the first.

    For the nodes i of segment `first` and j of `second` that face each other:
    n(axis) · (point i − point j) ≥ gap. Directions are fixed, so the facing ends stay the same.
    """

    first: NDArray[np.int64]
    second: NDArray[np.int64]
    axis: NDArray[np.int64]

    def extended(self, other: Separations) -> Separations:
        """Give both lists as one."""
        return Separations(
            np.concatenate([self.first, other.first]),
            np.concatenate([self.second, other.second]),
            np.concatenate([self.axis, other.axis]),
        )

    def only(self, some: NDArray[np.int64]) -> Separations:
        """Give some of the pairs, by number."""
        return Separations(self.first[some], self.second[some], self.axis[some])

    def facing(self, skeleton: Skeleton) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """Node of the first segment furthest back along the axis, and of the second furthest on."""
        normal = STEP[self.axis]
        ahead = (STEP[skeleton.directions[self.first]] * normal).sum(axis=1) >= 0
        behind = (STEP[skeleton.directions[self.second]] * normal).sum(axis=1) < 0
        first, second = skeleton.segments[self.first], skeleton.segments[self.second]
        return (
            np.where(ahead, first[:, 0], first[:, 1]),
            np.where(behind, second[:, 0], second[:, 1]),
        )

    def normals(self) -> NDArray[np.float64]:
        """Give the unit vectors of the axes, shape (n, 2)."""
        return np.asarray(_NORMALS[self.axis])


def near_pairs(
    skeleton: Skeleton, points: NDArray[np.float64], distance: float
) -> NDArray[np.int64]:
    """Pairs (i < j) of segments nearer than `distance` that must stay apart, shape (n, 2).

    Segments with a common node need not, nor those that would be one without the jog between.
    """
    segments = skeleton.segments
    lines = shapely.linestrings(points[segments])
    pairs = shapely.STRtree(lines).query(lines, predicate="dwithin", distance=distance).T
    pairs = pairs[pairs[:, 0] < pairs[:, 1]]
    a, b = segments[pairs[:, 0]], segments[pairs[:, 1]]
    apart = (a[:, :, None] != b[:, None, :]).all(axis=(1, 2))
    # The segments of a piece are numbered in a row, so the jog stands between their numbers.
    jog = skeleton.jogs[np.minimum(pairs[:, 0] + 1, len(segments) - 1)]
    apart &= ~(jog & (pairs[:, 1] == pairs[:, 0] + 2))
    pairs = pairs[apart]
    return np.asarray(pairs[np.lexsort((pairs[:, 1], pairs[:, 0]))], dtype=np.int64)


def separate(skeleton: Skeleton, pairs: NDArray[np.int64]) -> Separations:
    """Choose for every pair the octilinear axis along which it is furthest apart now.

    Two disjoint segments are always apart along a normal of one of them or along one of them,
    so for octilinear segments one of the eight directions serves.
    """
    ends = skeleton.points[skeleton.segments]
    along = np.einsum("mij,dj->mdi", ends, _NORMALS)
    low, high = along.min(axis=2), along.max(axis=2)
    first, second = pairs[:, 0], pairs[:, 1]
    gaps = low[first] - high[second]
    return Separations(first, second, np.argmax(np.round(gaps, 9), axis=1))
