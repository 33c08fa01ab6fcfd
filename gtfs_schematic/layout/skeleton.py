"""The octilinear drawing as directions: straight segments between vertices and bends."""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.layout.board import Board
from gtfs_schematic.layout.plane import PlaneGraph

STEP = np.array(
    [[1, 0], [1, 1], [0, 1], [-1, 1], [-1, 0], [-1, -1], [0, -1], [1, -1]], dtype=np.int64
)
"""Steps of the eight directions, 0 east, counter-clockwise with y north."""


@dataclass(frozen=True)
class Skeleton:
    """Nodes and segments of an octilinear drawing; y north.

    The first nodes are the graph's vertices, then come bends. Segment k runs from
    ``segments[k, 0]`` to ``segments[k, 1]`` in direction ``directions[k]`` and belongs to the
    piece whose `courses` entry holds it; courses go from a piece's first end to its second.
    """

    graph: PlaneGraph
    points: NDArray[np.float64]
    segments: NDArray[np.int64]
    directions: NDArray[np.int64]
    courses: tuple[tuple[int, ...], ...]

    @property
    def piece_of(self) -> NDArray[np.int64]:
        """Piece of every segment, shape (m,)."""
        owner = np.empty(len(self.segments), dtype=np.int64)
        for p, course in enumerate(self.courses):
            owner[list(course)] = p
        return owner

    @cached_property
    def jogs(self) -> NDArray[np.bool_]:
        """Which segments lie between two of one direction of their piece, shape (m,).

        Without length such a segment would be no bend at all.
        """
        jog = np.zeros(len(self.segments), dtype=bool)
        for course in self.courses:
            for before, k, after in zip(course, course[1:], course[2:], strict=False):
                jog[k] = self.directions[before] == self.directions[after]
        return jog

    def polyline(self, piece: int) -> list[int]:
        """Nodes of a piece in order."""
        course = self.courses[piece]
        return [int(self.segments[course[0], 0]), *(int(self.segments[k, 1]) for k in course)]


def skeleton_of(board: Board) -> Skeleton:
    """Read the drawing off the lattice, in station spacings."""
    routes = []
    for path in board.paths:
        if path is None:
            raise ValueError("A piece is not laid.")
        routes.append(board.xy(path))
    return build(board.graph, board.xy(board.place), routes, 1.0 / board.unit)


def build(
    graph: PlaneGraph,
    places: NDArray[np.float64],
    routes: list[NDArray[np.float64]],
    scale: float = 1.0,
) -> Skeleton:
    """Make a skeleton of vertex places and one octilinear route per piece.

    Points of a route where it goes straight on, or stands still, are dropped.
    """
    points = [tuple(place) for place in places]
    segments: list[tuple[int, int]] = []
    directions: list[int] = []
    courses: list[tuple[int, ...]] = []
    for piece, route in zip(graph.pieces, routes, strict=True):
        runs = _runs(route)
        nodes = [piece.ends[0]]
        for _, end in runs[:-1]:
            nodes.append(len(points))
            points.append(tuple(end))
        nodes.append(piece.ends[1])
        first = len(segments)
        segments += list(itertools.pairwise(nodes))
        directions += [direction for direction, _ in runs]
        courses.append(tuple(range(first, len(segments))))
    return Skeleton(
        graph,
        np.array(points, dtype=np.float64) * scale,
        np.array(segments, dtype=np.int64).reshape(-1, 2),
        np.array(directions, dtype=np.int64),
        tuple(courses),
    )


def without(skeleton: Skeleton, points: NDArray[np.float64], gone: NDArray[np.bool_]) -> Skeleton:
    """Drop segments without length; their neighbours run on as one."""
    routes = []
    for p in range(len(skeleton.courses)):
        course = skeleton.courses[p]
        route = [points[skeleton.segments[course[0], 0]]]
        for k in course:
            step = points[skeleton.segments[k, 1]] - points[skeleton.segments[k, 0]]
            route.append(route[-1] if gone[k] else route[-1] + step)
        routes.append(np.array(route))
    return build(skeleton.graph, points[: skeleton.graph.n_vertices], routes)


def _runs(route: NDArray[np.float64]) -> list[tuple[int, NDArray[np.float64]]]:
    """Straight runs of a route: (direction, end)."""
    runs: list[tuple[int, NDArray[np.float64]]] = []
    for a, b in itertools.pairwise(route):
        step = b - a
        if not step.any():
            continue
        direction = round(float(np.arctan2(step[1], step[0])) / (math.pi / 4)) % 8
        if runs and runs[-1][0] == direction:
            runs[-1] = (direction, b)
        else:
            runs.append((direction, b))
    return runs
