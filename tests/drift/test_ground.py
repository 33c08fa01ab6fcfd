"""Both projections agree with published geodesy and with geodesics."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pyproj import Geod

from gtfs_schematic.drift.ground import local_metres
from gtfs_schematic.layout.ground import project


def degrees(sign: int, d: int, m: int, s: float) -> float:
    return sign * (d + m / 60 + s / 3600)


FLINDERS_PEAK = (degrees(1, 144, 25, 29.52440), degrees(-1, 37, 57, 3.72030))
BUNINYONG = (degrees(1, 143, 55, 35.38390), degrees(-1, 37, 39, 10.15610))


def layout_plane(lonlat):
    points = project(lonlat)
    return points[:, 0] + 1j * points[:, 1]


@pytest.mark.parametrize("plane", [local_metres, layout_plane], ids=["drift", "layout"])
def test_flinders_peak_to_buninyong(plane):
    """Worked example of the Geocentric Datum of Australia technical manual (values from memory).

    54 972.271 m at 306°52'05.37". Both ends lie 27 km from the centre, so the line passes through
    it and the azimuthal equidistant projection keeps its length. The bearing at the centre is the
    mean of the azimuth and the reversed back azimuth, up to the curvature of the meridians.
    """
    a, b = plane([FLINDERS_PEAK, BUNINYONG])
    assert abs(b - a) == pytest.approx(54_972.271, abs=0.02)
    there = degrees(1, 306, 52, 5.37)
    back = degrees(1, 127, 10, 25.07) + 180.0
    bearing = math.degrees(math.atan2((b - a).real, (b - a).imag)) % 360.0
    assert bearing == pytest.approx((there + back) / 2, abs=0.01)


def test_pyproj_agrees_with_the_manual():
    there, back, length = Geod(ellps="GRS80").inv(*FLINDERS_PEAK, *BUNINYONG)
    assert length == pytest.approx(54_972.271, abs=1e-3)
    assert there % 360 == pytest.approx(degrees(1, 306, 52, 5.37), abs=0.01 / 3600 * 2)
    assert back % 360 == pytest.approx(degrees(1, 127, 10, 25.07), abs=0.01 / 3600 * 2)


@pytest.mark.parametrize("plane", [local_metres, layout_plane], ids=["drift", "layout"])
@given(
    st.floats(-170, 170),
    st.floats(-65, 65),
    st.lists(
        st.tuples(st.floats(-0.3, 0.3), st.floats(-0.3, 0.3)), min_size=3, max_size=6, unique=True
    ),
)
def test_distances_in_a_region_are_geodesic(plane, lon, lat, offsets):
    """Within 60 km all distances are true to one in ten thousand."""
    lonlat = [(lon + dx, lat + dy) for dx, dy in offsets]
    points = plane(lonlat)
    i, j = np.triu_indices(len(points), 1)
    ends = np.array(lonlat)
    true = Geod(ellps="WGS84").inv(ends[i, 0], ends[i, 1], ends[j, 0], ends[j, 1])[2]
    assert np.abs(points[i] - points[j]) == pytest.approx(true, rel=1e-4, abs=0.01)
