"""Words of shapes: what they cross, in order and with the side."""

from __future__ import annotations

import numpy as np
import shapely
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.background.planes import Piece, planes_of
from gtfs_schematic.background.word import word_of


def piece(a, b):
    line = np.array([a, b], dtype=float)
    return Piece("link", line * 100.0, line * 10.0, 1.0)


def ring(points):
    return np.array([*points, points[0]], dtype=float)


EAST = piece((0, 0), (10, 0))


def test_the_sign_tells_the_side():
    up = word_of(np.array([(500.0, -10.0), (500.0, 10.0)]), [EAST], closed=False)
    down = word_of(np.array([(500.0, 10.0), (500.0, -10.0)]), [EAST], closed=False)
    assert [letter.piece for letter in up] == [1]
    assert [letter.piece for letter in down] == [-1]
    assert up[0].share == 0.5


def test_a_short_way_over_and_back_cancels_and_a_long_one_stays():
    short = np.array([(480.0, -10.0), (480.0, 10.0), (520.0, 10.0), (520.0, -10.0)])
    long = np.array([(100.0, -10.0), (100.0, 10.0), (900.0, 10.0), (900.0, -10.0)])
    assert word_of(short, [EAST], closed=False) == ()
    assert [letter.piece for letter in word_of(long, [EAST], closed=False)] == [1, -1]


def test_a_ring_cancels_over_its_seam_too():
    begun_above = ring(
        [(500.0, 10.0), (520.0, 10.0), (520.0, -10.0), (480.0, -10.0), (480.0, 10.0)]
    )
    assert word_of(begun_above, [EAST], closed=True) == ()


def test_round_an_end_nothing_cancels():
    round_ = ring([(990.0, 5.0), (1010.0, 5.0), (1010.0, -5.0), (990.0, -5.0)])
    assert [abs(letter.piece) for letter in word_of(round_, [EAST], closed=True)] == [1]


@given(
    corners=st.lists(
        st.tuples(st.floats(0.2, 1.0), st.floats(-0.4, 0.4), st.floats(-0.4, 0.4)),
        min_size=5,
        max_size=5,
    ),
    center=st.tuples(st.floats(-1.0, 1.0), st.floats(-1.0, 1.0)),
)
def test_a_link_is_crossed_oddly_often_where_a_ring_parts_its_ends(labelled, corners, center):
    """Parity against shapely's sides: a second way to the same."""
    planes = planes_of(labelled.bundled)
    middle, size = planes.ground.mean(axis=0), np.ptp(planes.ground, axis=0).max()
    angles = np.linspace(0.0, 2.0 * np.pi, len(corners), endpoint=False) + 0.123
    radii = np.array([r for r, _, _ in corners]) * 0.6 * size
    points = np.column_stack([radii * np.cos(angles), radii * np.sin(angles)])
    points += middle + 0.4 * size * np.array(center)
    lake = shapely.Polygon(points)
    letters = word_of(ring(points.tolist()), planes.pieces, closed=True)
    inside = dict(
        zip(planes.stations, shapely.contains_xy(lake, *planes.ground.T).tolist(), strict=True)
    )
    links = labelled.bundled.layout.network.links
    for link in links:
        count = sum(planes.pieces[abs(each.piece) - 1].owner == link.id for each in letters)
        assert count % 2 == (inside[link.start] != inside[link.end])
