"""Paths are written so that they can be read back, and corners are round."""

from __future__ import annotations

import math
import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.bundles.model import Corner
from gtfs_schematic.drawing.paths import circle, commands, number, polyline, rounded, turned

LENGTHS = st.floats(-5000.0, 5000.0)


@given(LENGTHS)
def test_numbers_read_back_within_half_a_thousandth(value: float):
    text = number(value)
    assert re.fullmatch(r"-?\d+(\.\d{0,2}[1-9])?", text)
    assert text != "-0"
    assert float(text) == pytest.approx(value, abs=0.00051)


@given(st.lists(st.tuples(LENGTHS, LENGTHS), min_size=2, max_size=8))
def test_a_polyline_reads_back(points: list[tuple[float, float]]):
    read = [values for letter, values in commands(polyline(points)) if letter in "ML"]
    assert read == [pytest.approx(point, abs=0.00051) for point in points]


def curve_points(d: str) -> list[tuple[float, float]]:
    """Sample the cubics of a path by Bernstein's formula, apart from the code under test."""
    at, sampled = (0.0, 0.0), []
    for letter, values in commands(d):
        if letter == "C":
            x1, y1, x2, y2, x3, y3 = values
            for i in range(21):
                t = i / 20.0
                a, b, c, e = (1 - t) ** 3, 3 * t * (1 - t) ** 2, 3 * t * t * (1 - t), t**3
                sampled.append(
                    (
                        a * at[0] + b * x1 + c * x2 + e * x3,
                        a * at[1] + b * y1 + c * y2 + e * y3,
                    )
                )
        if values:
            at = values[-2:]
    return sampled


@pytest.mark.parametrize("turn_deg", [45.0, 90.0, 135.0])
def test_a_corner_is_an_arc_of_its_radius(turn_deg: float):
    turn, radius = math.radians(turn_deg), 3.0
    out = (20.0 + 30.0 * math.cos(turn), 10.0 + 30.0 * math.sin(turn))
    corners = [Corner((0.0, 10.0), 0.0), Corner((20.0, 10.0), radius), Corner(out, 0.0)]
    # The centre lies square to the first leg, where the arc begins.
    center = (20.0 - radius * math.tan(turn / 2.0), 10.0 + radius)
    sampled = curve_points(rounded(corners))
    assert sampled
    for point in sampled:
        # One cubic is 0.03 % off at 90 degrees and 0.3 % at 135; 0.5 thousandths for rounding.
        off = 0.0004 if turn_deg <= 90.0 else 0.003
        assert math.dist(point, center) == pytest.approx(radius, abs=radius * off + 0.001)


def test_corners_too_close_for_their_radii_shrink_and_stay_between_the_ends():
    corners = [
        Corner((0.0, 0.0), 0.0),
        Corner((10.0, 0.0), 9.0),
        Corner((10.0, 4.0), 9.0),
        Corner((20.0, 4.0), 0.0),
    ]
    ys = [y for _, y in curve_points(rounded(corners))]
    assert min(ys) >= -0.001
    assert max(ys) <= 4.001
    halves = [y for _, y in curve_points(rounded(corners))]
    assert halves[20] == pytest.approx(halves[21], abs=0.002)


def test_a_straight_vertex_stays_on_the_line():
    d = rounded([Corner((0.0, 0.0), 0.0), Corner((5.0, 0.0), 3.0), Corner((9.0, 0.0), 0.0)])
    assert "C" not in d


def test_a_circle_is_round():
    for point in curve_points(circle((7.0, -2.0), 1.3)):
        assert math.dist(point, (7.0, -2.0)) == pytest.approx(1.3, abs=0.002)


@given(st.floats(-180.0, 180.0))
def test_turning_keeps_distances_from_the_pivot(angle: float):
    points = [(3.0, 4.0), (-20.0, 7.5)]
    read = [values for _, values in commands(turned(polyline(points), angle, (1.0, 1.0)))]
    for before, after in zip(points, read, strict=True):
        assert math.dist(after, (1.0, 1.0)) == pytest.approx(math.dist(before, (1, 1)), abs=0.002)


def test_turning_is_clockwise_on_the_sheet():
    (_, first), (_, second) = commands(turned("M0,0L1,0", 90.0, (0.0, 0.0)))
    assert first == (0.0, 0.0)
    assert second == (0.0, 1.0)
