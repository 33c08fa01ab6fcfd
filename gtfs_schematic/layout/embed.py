"""First octilinear drawing: every vertex on the lattice, every piece along its true course."""

from __future__ import annotations

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.errors import LayoutError
from gtfs_schematic.layout.board import Board
from gtfs_schematic.layout.lattice import BLOCKED, encloses
from gtfs_schematic.layout.plane import PlaneGraph

_MARGINS = (1.0, 3.0, 8.0)
_CLAIM_STEPS = 0.75


def check_degrees(graph: PlaneGraph) -> None:
    """Refuse a vertex with more pieces than there are directions.

    Raises
    ------
    LayoutError
        Naming the station.
    """
    for v, around in enumerate(graph.rotation):
        if len(around) > 8:
            raise LayoutError(
                f"{graph.station_of[v]}: {len(around)} corridors meet at one station, more than "
                "the eight directions of the diagram. Leave out a line or split the station."
            )


def embed(board: Board) -> int | None:
    """Stand every vertex near its anchor and lay every piece in the homotopy of its course.

    Gives None when done, else the piece that found no way: a finer lattice will have one, since
    in the limit a staircase follows any course.
    """
    if not _stand(board):
        return 0
    courses = [_true_course(board, p) for p in range(len(board.paths))]
    claims = [_claimed(board, course) for course in courses]
    for nodes in claims:
        board.lattice.claims[nodes] += 1
    for p in sorted(range(len(board.paths)), key=lambda p: _freedom(board, p)):
        board.lattice.claims[claims[p]] -= 1
        if not _insert(board, p, courses[p]):
            return p
    return None


def _freedom(board: Board, p: int) -> tuple[float, int, int]:
    piece = board.graph.pieces[p]
    return (round(min(piece.spans, 6.0)), -len(piece.lines), p)


def _stand(board: Board) -> bool:
    """Stand each vertex on the nearest acceptable node, busiest first."""
    around = board.graph.rotation
    for v in sorted(range(board.n), key=lambda v: (-len(around[v]), v)):
        x, y = board.anchors[v] * board.unit
        near = [
            (i, j)
            for i in range(round(x) - 3, round(x) + 4)
            for j in range(round(y) - 3, round(y) + 4)
        ]
        near.sort(key=lambda ij: ((ij[0] - x) ** 2 + (ij[1] - y) ** 2, ij))
        for i, j in near:
            if board.acceptable(j * board.width + i):
                board.put(v, j * board.width + i)
                break
        else:
            return False
    return True


def _true_course(board: Board, p: int) -> NDArray[np.float64]:
    """Course of a piece in lattice coordinates, its ends where the vertices stand."""
    piece = board.graph.pieces[p]
    course: NDArray[np.float64] = board.anchors[list(piece.nodes)] * board.unit
    ends = board.xy(board.place[list(piece.ends)])
    course[0], course[-1] = ends
    return course


def _claimed(board: Board, course: NDArray[np.float64]) -> NDArray[np.int64]:
    """Nodes that a course passes within a step, but for those near its ends."""
    line = shapely.LineString(course)
    x0, y0, x1, y1 = (int(side) for side in line.bounds)
    grid = np.meshgrid(np.arange(x0 - 1, x1 + 3), np.arange(y0 - 1, y1 + 3))
    x, y = (axis.ravel() for axis in grid)
    near = shapely.dwithin(line, shapely.points(x, y), _CLAIM_STEPS)
    for end in (course[0], course[-1]):
        near &= np.maximum(abs(x - end[0]), abs(y - end[1])) > 1.5
    return np.asarray(y[near] * board.width + x[near])


def _insert(board: Board, p: int, course: NDArray[np.float64]) -> bool:
    """Lay piece `p` so that no vertex lies between its path and its course."""
    vertices = board.xy(board.place)
    for margin in _MARGINS:
        cost, path = board.route(p, margin)
        if cost >= BLOCKED or len(np.unique(path)) != len(path):
            continue
        ring = np.concatenate([board.xy(path), course[::-1]])
        if not encloses(ring, vertices):
            board.lay(p, path)
            return True
    return False
