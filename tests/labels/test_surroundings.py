"""What labels keep clear of, and what they know of their station, by second methods."""

from __future__ import annotations

import math
import random
from collections.abc import Mapping
from dataclasses import replace

import drawn_networks
import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.bundles.model import BundledLayout, Corner, Stretch
from gtfs_schematic.labels.badges import line_ends
from gtfs_schematic.labels.model import LabelSettings
from gtfs_schematic.labels.neighbors import hand
from gtfs_schematic.labels.obstacles import course, obstacles_of
from gtfs_schematic.labels.site import sites_of


def bent(*points: tuple[float, float], radius: float) -> Stretch:
    corners = [Corner(point, radius) for point in points]
    corners[0], corners[-1] = replace(corners[0], radius_mm=0.0), replace(corners[-1], radius_mm=0)
    return Stretch("L", ("l",), tuple(corners))


def test_a_right_angle_is_rounded_by_a_quarter_circle():
    points = course(bent((0.0, 0.0), (10.0, 0.0), (10.0, 10.0), radius=3.0))
    assert all(math.dist(p, (7.0, 3.0)) == pytest.approx(3.0) for p in points[1:-1])
    length = shapely.LineString(points).length
    assert length == pytest.approx(14.0 + math.pi * 3.0 / 2.0, rel=2e-3)


@given(st.sampled_from([45, 90, 135]), st.booleans(), st.floats(0.5, 4.0))
def test_arcs_touch_both_legs(turn: int, left: bool, radius: float):  # noqa: FBT001
    angle = math.radians(-turn if left else turn)
    end = (40.0 + 40.0 * math.cos(angle), 40.0 * math.sin(angle))
    line = shapely.LineString(course(bent((0.0, 0.0), (40.0, 0.0), end, radius=radius)))
    sharp = shapely.LineString([(0.0, 0.0), (40.0, 0.0), end])
    # the arc's length and its greatest distance from the corner, in closed form
    half = math.radians(turn) / 2.0
    expected = sharp.length - 2.0 * radius * math.tan(half) + 2.0 * radius * half
    assert line.length == pytest.approx(expected, rel=1e-3)
    assert line.distance(shapely.Point(40.0, 0.0)) == pytest.approx(
        radius * (1.0 / math.cos(half) - 1.0), abs=0.01 * radius
    )


@pytest.mark.parametrize("name", ["star", "ring", "walk_and_crossing"])
def test_blocked_boxes_are_those_near_drawn_things(
    networks: Mapping[str, BundledLayout], name: str
):
    rng = random.Random(name)  # noqa: S311 - places to try, no secrets
    bundled = networks[name]
    obstacles = obstacles_of(bundled, LabelSettings())
    boxes = []
    for _ in range(300):
        x, y = rng.uniform(0.0, 200.0), rng.uniform(0.0, 140.0)
        boxes.append(shapely.box(x, y, x + rng.uniform(1.0, 20.0), y + rng.uniform(1.0, 6.0)))
    expected = [is_near(bundled, box) for box in boxes]
    corners = shapely.get_coordinates(boxes).reshape(-1, 5, 2)[:, :4]
    assert obstacles.blocked(corners).tolist() == expected
    assert 30 < sum(expected) < 270


def is_near(bundled: BundledLayout, box: shapely.Polygon) -> bool:
    """Tell by plain distances whether a box leaves the frame or is too near to a drawn thing."""
    wanted = LabelSettings()
    half = bundled.settings.line_width_mm / 2.0
    lines = [shapely.LineString(course(s)).distance(box) - half for s in bundled.stretches]
    walks = [
        shapely.LineString(path).distance(box) - 0.5 for path in bundled.layout.walk_paths.values()
    ]
    markers = []
    for station in bundled.layout.network.stations:
        radius = wanted.interchange_radius_mm
        if station.kind == "stop":
            radius = wanted.marker_radius_mm
        hull = shapely.MultiPoint(bundled.spans[station.id].points_mm).convex_hull
        markers.append(hull.distance(box) - radius)
    sheet = bundled.layout.sheet
    frame = shapely.box(sheet.left_mm, sheet.top_mm, sheet.right_mm, sheet.bottom_mm)
    return min([*lines, *walks, *markers]) <= wanted.clearance_mm or not frame.covers(box)


def test_sites_know_how_the_lines_run(networks: Mapping[str, BundledLayout]):
    runs = {site.station_id: site.run for site in sites_of(networks["star"], LabelSettings())}
    assert runs["eich"] == "horizontal"
    assert runs["quell"] == "vertical"
    assert runs["gries"] == "rising"
    assert runs["birke"] == "falling"
    assert runs["otter"] == "end"
    assert runs["west"] == "node"


def test_a_ring_line_is_named_once():
    ends = line_ends(drawn_networks.ring().network)
    assert [station for station, badges in ends.items() if ("R", "R") in badges] == ["r01"]
    assert ends["x1"] == ends["x7"] == (("X", "X"),)


def test_hands_are_seen_along_the_line():
    assert hand((1.0, 0.0), "N") == hand((1.0, 0.0), "NW") == -1
    assert hand((1.0, 0.0), "S") == 1
    assert hand((0.0, -1.0), "E") == 1  # going up the sheet
    assert hand((1.0, 0.0), "E") == hand((1.0, 0.0), "W") == 0
