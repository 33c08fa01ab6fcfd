"""Names stand on lines along their runs, clear of everything else, and the check would see it."""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Mapping
from dataclasses import replace

import pytest
import shapely

from gtfs_schematic.bundles.course import flatten
from gtfs_schematic.bundles.model import BundledLayout, Corner, Stretch
from gtfs_schematic.labels.check import faults
from gtfs_schematic.labels.model import LabelSettings
from gtfs_schematic.labels.place import place_labels

OFTEN = LabelSettings(line_names_every_mm=25.0)


@pytest.fixture(scope="module")
def named(networks: Mapping[str, BundledLayout]):
    return {name: place_labels(bundled, OFTEN) for name, bundled in networks.items()}


def test_hand_drawn_networks_get_names_without_faults(named):
    for labelled in named.values():
        assert len(labelled.run_badges) >= 3
        assert faults(labelled) == ()


def test_every_name_is_its_lines_and_reads_from_the_left_or_upwards(named):
    for labelled in named.values():
        for badge in labelled.run_badges:
            assert badge.text == labelled.bundled.layout.network.line[badge.line_id].name
            assert -91.0 <= badge.angle_deg <= 89.0
            assert badge.angle_deg % 45.0 == pytest.approx(0.0, abs=1e-3)


def test_a_long_line_is_named_at_even_distances(straight: Callable[..., BundledLayout]):
    bundled = straight(["A"] * 6, (24.0, 0.0), (40.0, 70.0))
    ends = (bundled.stretches[0].corners[0], bundled.stretches[-1].corners[-1])
    links = tuple(link for stretch in bundled.stretches for link in stretch.link_ids)
    bundled = replace(bundled, stretches=(Stretch("L", links, ends),))
    labelled = place_labels(bundled, LabelSettings(line_names_every_mm=30.0))
    xs = [badge.at_mm[0] for badge in labelled.run_badges]
    gaps = [b - a for a, b in itertools.pairwise(xs)]
    assert 3 <= len(xs) <= 4
    assert all(15.0 < gap < 45.0 for gap in gaps)
    assert all(badge.angle_deg == 0.0 for badge in labelled.run_badges)


def test_no_name_stands_on_the_arc_of_a_line_that_turns_back(
    straight: Callable[..., BundledLayout],
):
    """An arc that turns by 135 degrees takes 2.4 times its radius of the straights beside it."""
    bundled = straight(["A"] * 6, (24.0, 0.0), (40.0, 70.0))
    corners = (
        Corner((60.0, 150.0), 0.0),
        Corner((160.0, 150.0), 10.0),
        Corner((90.0, 80.0), 0.0),
    )
    stretch = replace(bundled.stretches[0], corners=corners)
    bundled = replace(bundled, stretches=(stretch,))
    for every in (20.0, 25.0, 30.0, 35.0):
        labelled = place_labels(bundled, LabelSettings(line_names_every_mm=every))
        course = shapely.LineString(flatten(corners))
        assert labelled.run_badges
        for badge in labelled.run_badges:
            assert course.distance(shapely.Point(badge.at_mm)) < 0.02


def test_names_keep_off_the_names_of_stations(named):
    for labelled in named.values():
        outlines = [shapely.Polygon(label.outline_mm) for label in labelled.labels.values()]
        for badge in labelled.run_badges:
            reach = math.hypot(badge.width_mm, badge.height_mm) / 2.0
            near = shapely.Point(badge.at_mm).buffer(reach)
            inner = shapely.Point(badge.at_mm).buffer(badge.height_mm / 2.0)
            assert not any(inner.intersects(outline) for outline in outlines)
            assert near.area > inner.area


def test_none_are_set_if_none_are_wanted(networks: Mapping[str, BundledLayout]):
    never = place_labels(networks["star"], LabelSettings(line_names_every_mm=0.0))
    assert never.run_badges == ()


def test_the_check_sees_a_name_off_its_line_and_one_on_a_label(named):
    labelled = named["star"]
    badge = labelled.run_badges[0]
    off = replace(labelled, run_badges=(replace(badge, at_mm=(3.0, 3.0)),))
    assert any("lies off it" in fault for fault in faults(off))
    label = next(iter(labelled.labels.values()))
    middle = shapely.Polygon(label.outline_mm).centroid
    on = replace(labelled, run_badges=(replace(badge, at_mm=(middle.x, middle.y)),))
    assert any("covers the label" in fault for fault in faults(on))
