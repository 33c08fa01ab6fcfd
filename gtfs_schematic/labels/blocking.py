"""Whether boxes come too near to segments, for very many boxes: compiled, on a grid of cells."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numba import njit
from numpy.typing import NDArray

_CELL_MM = 6.0

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
Grid = tuple[Floats, Floats, int, int, Integers, Integers]
"""Segments, origin, columns, rows, starts and members of `Blocks`, as compiled code takes them."""


@dataclass(frozen=True)
class Blocks:
    """Segments with the distance that boxes keep from each, by the cells that they come near."""

    frame: Floats
    """Left, top, right and bottom of the room that boxes may fill."""
    segments: Floats
    """Shape (S, 5): both ends and the distance, millimetres."""
    origin: Floats
    columns: int
    rows: int
    starts: Integers
    """Where each cell's segments begin in `members`; one more than there are cells."""
    members: Integers


def blocks_of(
    shapes: Sequence[tuple[shapely.Geometry, float]], frame: tuple[float, float, float, float]
) -> Blocks:
    """Give the segments of points, lines and outlines, each with its distance.

    `frame` is the left, top, right and bottom of the room that boxes may fill.
    """
    room = np.array(frame, dtype=np.float64)
    parts = []
    for shape, reach in shapes:
        line = shape.exterior if shape.geom_type == "Polygon" else shape
        points = shapely.get_coordinates(line)
        ends = points[1:] if len(points) > 1 else points
        parts.append(np.column_stack([points[: len(ends)], ends, np.full(len(ends), reach)]))
    segments = np.concatenate(parts) if parts else np.empty((0, 5))
    if not len(segments):
        none = np.empty(0, dtype=np.int64)
        return Blocks(room, segments, np.zeros(2), 0, 0, np.zeros(1, dtype=np.int64), none)
    low = np.minimum(segments[:, :2], segments[:, 2:4]) - segments[:, 4:5]
    high = np.maximum(segments[:, :2], segments[:, 2:4]) + segments[:, 4:5]
    origin = low.min(axis=0)
    first = np.floor((low - origin) / _CELL_MM).astype(np.int64)
    last = np.floor((high - origin) / _CELL_MM).astype(np.int64)
    columns, rows = (last.max(axis=0) + 1).tolist()
    cells: list[list[int]] = [[] for _ in range(columns * rows)]
    for i, ((x0, y0), (x1, y1)) in enumerate(zip(first.tolist(), last.tolist(), strict=True)):
        for y in range(y0, y1 + 1):
            for x in range(x0, x1 + 1):
                cells[y * columns + x].append(i)
    starts = np.cumsum([0, *map(len, cells)]).astype(np.int64)
    members = np.array([i for cell in cells for i in cell], dtype=np.int64)
    return Blocks(room, segments, origin, columns, rows, starts, members)


def least_free_push(
    corners: Floats, vectors: Floats, blocks: Blocks, step_mm: float, steps: int
) -> Floats:
    """Give for each box the least push, in steps, at which it is free; infinite if there is none.

    Parameters
    ----------
    corners
        Shape (N, 4, 2), in order round the box, millimetres.
    vectors
        Shape (N, 2), the unit vectors in which the boxes may be pushed; (0, 0) for none.
    blocks
        What they must keep clear of.
    step_mm, steps
        Length and greatest count of steps.
    """
    grid = (blocks.segments, blocks.origin, blocks.columns, blocks.rows, blocks.starts)
    result: Floats = _least_free_push(
        corners, vectors, blocks.frame, (*grid, blocks.members), step_mm, steps
    )
    return result


@njit(cache=True)
def _gap(
    px: float, py: float, ax: float, ay: float, bx: float, by: float
) -> float:  # pragma: no cover - compiled
    """Give the square of the distance of a point from a segment."""
    dx, dy = bx - ax, by - ay
    square = dx * dx + dy * dy
    t = 0.0 if square == 0.0 else ((px - ax) * dx + (py - ay) * dy) / square
    t = min(1.0, max(0.0, t))
    return (ax + t * dx - px) ** 2 + (ay + t * dy - py) ** 2


@njit(cache=True)
def _within(box: Floats, x: float, y: float) -> bool:  # pragma: no cover - compiled
    """Tell whether a point lies in a convex box, whichever way round its corners go."""
    left = right = False
    for i in range(4):
        j = (i + 1) % 4
        turn = (box[j, 0] - box[i, 0]) * (y - box[i, 1])
        turn -= (box[j, 1] - box[i, 1]) * (x - box[i, 0])
        left = left or turn > 0.0
        right = right or turn < 0.0
    return not (left and right)


@njit(cache=True)
def _crosses(
    box: Floats, ax: float, ay: float, bx: float, by: float
) -> bool:  # pragma: no cover - compiled
    """Tell whether a segment crosses an edge of a box."""
    for i in range(4):
        j = (i + 1) % 4
        px, py, qx, qy = box[i, 0], box[i, 1], box[j, 0], box[j, 1]
        a = (qx - px) * (ay - py) - (qy - py) * (ax - px)
        b = (qx - px) * (by - py) - (qy - py) * (bx - px)
        p = (bx - ax) * (py - ay) - (by - ay) * (px - ax)
        q = (bx - ax) * (qy - ay) - (by - ay) * (qx - ax)
        if a * b < 0.0 and p * q < 0.0:
            return True
    return False


@njit(cache=True)
def _too_near(box: Floats, segment: Floats) -> bool:  # pragma: no cover - compiled
    ax, ay, bx, by, reach = segment[0], segment[1], segment[2], segment[3], segment[4]
    low_x, high_x = box[:, 0].min() - reach, box[:, 0].max() + reach
    low_y, high_y = box[:, 1].min() - reach, box[:, 1].max() + reach
    if max(ax, bx) < low_x or min(ax, bx) > high_x or max(ay, by) < low_y or min(ay, by) > high_y:
        return False
    if _within(box, ax, ay) or _within(box, bx, by) or _crosses(box, ax, ay, bx, by):
        return True
    square = reach * reach
    for i in range(4):
        j = (i + 1) % 4
        px, py, qx, qy = box[i, 0], box[i, 1], box[j, 0], box[j, 1]
        if _gap(px, py, ax, ay, bx, by) <= square:
            return True
        if _gap(ax, ay, px, py, qx, qy) <= square or _gap(bx, by, px, py, qx, qy) <= square:
            return True
    return False


@njit(cache=True)
def _blocked(box: Floats, frame: Floats, grid: Grid) -> bool:  # pragma: no cover - compiled
    segments, origin, columns, rows, starts, members = grid
    left, right = box[:, 0].min(), box[:, 0].max()
    top, bottom = box[:, 1].min(), box[:, 1].max()
    if left < frame[0] or top < frame[1] or right > frame[2] or bottom > frame[3]:
        return True
    x0 = max(0, math.floor((left - origin[0]) / _CELL_MM))
    x1 = min(columns - 1, math.floor((right - origin[0]) / _CELL_MM))
    y0 = max(0, math.floor((top - origin[1]) / _CELL_MM))
    y1 = min(rows - 1, math.floor((bottom - origin[1]) / _CELL_MM))
    for y in range(y0, y1 + 1):
        for x in range(x0, x1 + 1):
            cell = y * columns + x
            for k in range(starts[cell], starts[cell + 1]):
                if _too_near(box, segments[members[k]]):
                    return True
    return False


@njit(cache=True)
def _least_free_push(
    corners: Floats, vectors: Floats, frame: Floats, grid: Grid, step_mm: float, steps: int
) -> Floats:  # pragma: no cover - compiled
    found = np.full(len(corners), np.inf)
    box = np.empty((4, 2))
    for n in range(len(corners)):
        still = vectors[n, 0] == 0.0 and vectors[n, 1] == 0.0
        for step in range(1 if still else steps + 1):
            push = step * step_mm
            for i in range(4):
                box[i, 0] = corners[n, i, 0] + push * vectors[n, 0]
                box[i, 1] = corners[n, i, 1] + push * vectors[n, 1]
            if not _blocked(box, frame, grid):
                found[n] = push
                break
    return found
