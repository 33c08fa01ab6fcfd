"""Strokes: the directions chosen are the cheapest there are, and long runs come out straight."""

from __future__ import annotations

import itertools
import math

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from gtfs_schematic.layout.plane import Part, Piece, PlaneGraph
from gtfs_schematic.layout.strokes import straightened


def _one_piece(points: list[tuple[float, float]]) -> PlaneGraph:
    """Give a plane graph of one line that passes all points; its ends come first, as vertices."""
    n = len(points)
    ordered = np.array([points[0], points[-1], *points[1:-1]])
    nodes = (0, *range(2, n), 1)
    parts = tuple(Part(f"k{i}", 1.0, forward=True) for i in range(n - 1))
    stations = tuple(f"s{i}" for i in nodes[1:-1])
    piece = Piece((0, 1), parts, stations, nodes, ("line",))
    return PlaneGraph(ordered, ("a", "z"), (piece,), ((0,), (1,)), ())


def _price(vectors: np.ndarray, choice: tuple[int, ...], strictness: float) -> float:
    """Price a choice of directions: turning off the bearings, and bends of 0, 1 and 3."""
    total = 0.0
    for (x, y), d in zip(vectors, choice, strict=True):
        off = math.atan2(y, x) - d * math.pi / 4
        total += strictness * math.hypot(x, y) * (1 - math.cos(off))
    for d, e in itertools.pairwise(choice):
        turn = min((d - e) % 8, (e - d) % 8)
        total += {0: 0.0, 1: 1.0, 2: 3.0}.get(turn, math.inf)
    return total


steps = st.tuples(
    st.floats(0.3, 3.0, allow_nan=False), st.floats(-math.pi, math.pi, allow_nan=False)
)


@settings(max_examples=30, deadline=None)
@given(st.lists(steps, min_size=2, max_size=4))
def test_no_other_choice_of_directions_is_cheaper(course: list[tuple[float, float]]) -> None:
    points = [(0.0, 0.0)]
    for length, bearing in course:
        x, y = points[-1]
        points.append((x + length * math.cos(bearing), y + length * math.sin(bearing)))
    graph = _one_piece(points)

    _, directions = straightened(graph, graph.points, fidelity=0.0)

    vectors = np.diff(points, axis=0)
    chosen = tuple(round(math.atan2(y, x) / (math.pi / 4)) % 8 for x, y in directions)
    every = itertools.product(range(8), repeat=len(vectors))
    least = min(_price(vectors, choice, 1.3) for choice in every)
    assert math.isclose(_price(vectors, chosen, 1.3), least, abs_tol=1e-6)


def test_a_wavering_course_becomes_one_straight_run() -> None:
    """A course 22 degrees off north-east at most, to and fro, is drawn without a bend."""
    bearings = np.radians([45 + off for off in (20, -20, 15, -15, 20, -20)])
    points = np.cumsum([(0.0, 0.0), *zip(np.cos(bearings), np.sin(bearings), strict=True)], axis=0)
    graph = _one_piece([(float(x), float(y)) for x, y in points])

    targets, directions = straightened(graph, graph.points, fidelity=0.35)

    assert np.allclose(directions, math.sqrt(0.5))
    course = targets[list(graph.pieces[0].nodes)]
    along, across = course.sum(axis=1), course[:, 1] - course[:, 0]
    assert np.ptp(across) < 0.2
    assert (np.diff(along) > 0).all()


def test_a_true_corner_stays() -> None:
    """Five spacings east, then five north: no run at 45 degrees takes the corner away."""
    points = [(float(i), 0.0) for i in range(6)] + [(5.0, float(i)) for i in range(1, 6)]
    graph = _one_piece(points)

    _, directions = straightened(graph, graph.points, fidelity=0.35)

    assert np.allclose(directions[:3], (1.0, 0.0))
    assert np.allclose(directions[-3:], (0.0, 1.0))
