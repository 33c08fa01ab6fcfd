"""Variables of the programme that settles lengths, and the rows for directions and lengths."""

from __future__ import annotations

import itertools
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from gtfs_schematic.layout.rows import Rows
from gtfs_schematic.layout.skeleton import STEP, Skeleton


@dataclass(frozen=True)
class Runs:
    """The segments: their ends, steps, the axis they are measured along, and their piece."""

    start: NDArray[np.int64]
    end: NDArray[np.int64]
    steps: NDArray[np.int64]
    upright: NDArray[np.bool_]
    forward: NDArray[np.float64]
    """+1 or −1 by which the measured coordinate grows along the segment."""
    stretch: NDArray[np.float64]
    """Length per unit of the measured coordinate: 1 or √2."""
    piece: NDArray[np.int64]

    @staticmethod
    def of(skeleton: Skeleton) -> Runs:
        """Read the segments of a skeleton."""
        start, end = skeleton.segments.T
        steps = STEP[skeleton.directions]
        upright = steps[:, 0] == 0
        forward = np.where(upright, steps[:, 1], steps[:, 0]).astype(np.float64)
        stretch = np.hypot(steps[:, 0], steps[:, 1])
        return Runs(start, end, steps, upright, forward, stretch, skeleton.piece_of)


@dataclass(frozen=True)
class Columns:
    """Places of the variables: all at least 0."""

    x: NDArray[np.int64]
    y: NDArray[np.int64]
    slack: NDArray[np.int64]
    """Per grade and piece, a part of how far the length is from the wanted one."""
    away: NDArray[np.int64]
    """Per grade, axis and vertex a part of how far it is from its anchor, shape (grades, 2, n)."""
    lack: NDArray[np.int64]
    """Per separated pair, what is lacking of the wanted room."""
    extent: NDArray[np.int64]
    """Width and height of the drawing."""
    fit: NDArray[np.int64]
    """Scale of the drawing, millimetres to the kilometre, and where it has the ground's middle."""
    excess: NDArray[np.int64]
    """Per drift limit, by how much it is missed, millimetres."""
    crowd: NDArray[np.int64]
    """Per distance that a name keeps, what is lacking of it."""
    count: int

    @staticmethod
    def of(
        skeleton: Skeleton, grades: tuple[int, int], pairs: int, limits: int, names: int = 0
    ) -> Columns:
        """Give every variable its place; without `limits` on the drift there is no fit.

        `grades` are those of lengths and of distances from anchors.
        """
        k, n, p = len(skeleton.points), skeleton.graph.n_vertices, len(skeleton.courses)
        sizes = [k, k, grades[0] * p, grades[1] * 2 * n, pairs, 2, 3 if limits else 0, limits]
        sizes.append(names)
        ends = np.cumsum([0, *sizes])
        x, y, slack, away, lack, extent, fit, excess, crowd = (
            np.arange(a, b) for a, b in itertools.pairwise(ends.tolist())
        )
        slack, away = slack.reshape(-1, p), away.reshape(-1, 2, n)
        return Columns(x, y, slack, away, lack, extent, fit, excess, crowd, int(ends[-1]))

    def along(self, runs: Runs, nodes: NDArray[np.int64]) -> NDArray[np.int64]:
        """Give the column that measures each segment at one of its ends."""
        return np.where(runs.upright, self.y[nodes], self.x[nodes])


def keep_directions(equal: Rows, runs: Runs, columns: Columns) -> None:
    """Hold every segment to its direction."""
    x, y = columns.x, columns.y
    for kept, nodes in ((runs.steps[:, 1] == 0, y), (runs.upright, x)):
        equal.add([(nodes[runs.end[kept]], 1.0), (nodes[runs.start[kept]], -1.0)], 0.0)
    slope = (runs.steps != 0).all(axis=1)
    a, b = runs.start[slope], runs.end[slope]
    sign = (runs.steps[slope, 0] * runs.steps[slope, 1]).astype(np.float64)
    equal.add([(y[b], 1.0), (y[a], -1.0), (x[b], -sign), (x[a], sign)], 0.0)


def bound_lengths(most: Rows, runs: Runs, columns: Columns, least: NDArray[np.float64]) -> None:
    """Hold every segment to its least length, shape (m,)."""
    a, b = columns.along(runs, runs.start), columns.along(runs, runs.end)
    most.add([(b, -runs.forward), (a, runs.forward)], -least / runs.stretch)


def piece_lengths(
    runs: Runs, columns: Columns, least: NDArray[np.float64], goal: NDArray[np.float64]
) -> tuple[list[sp.csr_matrix], list[NDArray[np.float64]]]:
    """Give matrix blocks and right-hand sides for least and wanted lengths of whole pieces."""
    grades, pieces = columns.slack.shape
    shape = (pieces, columns.count)
    a, b = columns.along(runs, runs.start), columns.along(runs, runs.end)
    value = runs.forward * runs.stretch
    entries = (np.concatenate([runs.piece, runs.piece]), np.concatenate([b, a]))
    length = sp.csr_matrix((np.concatenate([value, -value]), entries), shape=shape)
    rows = np.tile(np.arange(pieces), grades)
    slack = sp.csr_matrix((np.ones(len(rows)), (rows, columns.slack.ravel())), shape=shape)
    return [-length, length - slack, -length - slack], [-least, goal, -goal]
