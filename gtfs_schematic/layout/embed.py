"""First octilinear drawing: every vertex on the lattice, every piece along its true course."""

from __future__ import annotations

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.layout.board import Board
from gtfs_schematic.layout.lattice import BLOCKED, FREE, encloses

_MARGINS = (1.0, 3.0, 8.0)
_CLAIM_STEPS = 0.75
_MOST_TRIES = 6
"""How often all is laid anew, in another order, before a finer lattice is tried."""
_MOST_BARS = 12
_BEYOND_STEPS = 3.0
_BAR = np.iinfo(np.int32).max
"""Code of a node that is barred for one piece for a while."""


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
    walled_in: list[int] = []
    for _ in range(_MOST_TRIES):
        # What was walled in goes first the next time, the last one before all others.
        order = sorted(range(len(board.paths)), key=lambda p: _freedom(board, p))
        order.sort(key=lambda p: -walled_in.index(p) if p in walled_in else 1)
        laid: list[int] = []
        for p in order:
            board.lattice.claims[claims[p]] -= 1
            laid.append(p)
            if not _insert(board, p, courses[p]):
                break
        else:
            return None
        for p in laid:
            board.lattice.claims[claims[p]] += 1
            if p != laid[-1]:
                board.lift(p)
        walled_in = [p for p in walled_in if p != laid[-1]] + [laid[-1]]
    return walled_in[-1]


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
    x, y = _near(board, shapely.LineString(course))
    far = np.ones(len(x), dtype=bool)
    for end in (course[0], course[-1]):
        far &= np.maximum(abs(x - end[0]), abs(y - end[1])) > 1.5
    return np.asarray(y[far] * board.width + x[far])


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
    return _insert_between(board, p, course)


def _insert_between(board: Board, p: int, course: NDArray[np.float64]) -> bool:
    """Lay piece `p` past vertices on the side of its course, by bars on their far sides."""
    bars = np.zeros(0, dtype=np.int64)
    laid = False
    for _ in range(_MOST_BARS):
        cost, path = board.route(p, _MARGINS[-1])
        if cost >= BLOCKED or len(np.unique(path)) != len(path):
            break
        ring = np.concatenate([board.xy(path), course[::-1]])
        wrong = [xy for xy in board.xy(board.place) if encloses(ring, xy[None, :])]
        if not wrong:
            laid = True
            break
        fresh = np.unique(np.concatenate([_bar(board, xy, course, ring) for xy in wrong]))
        fresh = fresh[board.lattice.occupied[fresh] == FREE]
        if not len(fresh):
            break
        board.lattice.occupied[fresh] = _BAR
        bars = np.concatenate([bars, fresh])
    board.lattice.occupied[bars] = FREE
    if laid:
        board.lay(p, path)
    return laid


def _bar(
    board: Board,
    vertex: NDArray[np.float64],
    course: NDArray[np.float64],
    ring: NDArray[np.float64],
) -> NDArray[np.int64]:
    """Nodes from a vertex on, away from a course, to beyond a path that went round the vertex."""
    line = shapely.LineString(course)
    foot = line.interpolate(line.project(shapely.Point(vertex)))
    away = vertex - [foot.x, foot.y]
    length = float(np.hypot(*away))
    if length < 1e-9:
        return np.zeros(0, dtype=np.int64)
    away = away / length
    reach = float(np.hypot(*np.ptp(ring, axis=0)))
    beyond = shapely.LineString([vertex, vertex + reach * away]).intersection(
        shapely.LineString(ring)
    )
    reach = float(shapely.Point(vertex).hausdorff_distance(beyond)) if not beyond.is_empty else 0.0
    bar = shapely.LineString([vertex, vertex + (reach + _BEYOND_STEPS) * away])
    x, y = _near(board, bar)
    return np.asarray(y * board.width + x)


def _near(board: Board, line: shapely.LineString) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Coordinates of the nodes that a line passes within a step."""
    x0, y0, x1, y1 = (int(side) for side in line.bounds)
    grid = np.meshgrid(
        np.arange(max(0, x0 - 1), min(board.width, x1 + 3)),
        np.arange(max(0, y0 - 1), min(board.height, y1 + 3)),
    )
    x, y = (axis.ravel() for axis in grid)
    near = shapely.dwithin(line, shapely.points(x, y), _CLAIM_STEPS)
    return x[near], y[near]
