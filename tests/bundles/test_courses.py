"""Lines run beside their centre lines, keep clear of each other, and bend round one centre."""

from __future__ import annotations

import itertools
import math
import os
import subprocess
import sys
from pathlib import Path

import drawn_networks
import numpy as np
import pytest
import shapely
from drawn_networks import Sketch, drawn
from hypothesis import given, settings
from hypothesis import strategies as st

from gtfs_schematic.bundles.build import bundle
from gtfs_schematic.bundles.check import faults
from gtfs_schematic.bundles.course import flatten
from gtfs_schematic.bundles.model import BundledLayout, BundleSettings, Stretch

SETTINGS = BundleSettings()
PITCH = SETTINGS.line_width_mm + SETTINGS.line_gap_mm


def _course(stretch: Stretch) -> shapely.LineString:
    return shapely.LineString(flatten(stretch.corners))


def _stretch(bundled: BundledLayout, line_id: str, link_id: str) -> Stretch:
    (found,) = (s for s in bundled.stretches if s.line_id == line_id and link_id in s.link_ids)
    return found


@pytest.mark.parametrize("name", sorted(drawn_networks.ALL))
def test_hand_drawn_networks_have_no_fault(name):
    assert faults(bundle(drawn_networks.ALL[name](), SETTINGS)) == ()


@given(
    name=st.sampled_from(sorted(drawn_networks.ALL)),
    width=st.floats(0.4, 2.2),
    gap=st.floats(0.0, 0.6),
    radius=st.floats(0.0, 6.0),
)
@settings(max_examples=40, deadline=None)
def test_no_fault_whatever_the_style(name, width, gap, radius):
    style = BundleSettings(line_width_mm=width, line_gap_mm=gap, corner_radius_mm=radius)
    assert faults(bundle(drawn_networks.ALL[name](), style)) == ()


def test_bends_inside_a_link_are_concentric():
    bundled = bundle(drawn_networks.ribbon(), SETTINGS)
    # The link from m4 (110, 40) bends at (110, 30), turning right by 90 degrees.
    centers, radii = [], []
    for line_id in bundled.orders["m4-m5"]:
        corner = min(
            _stretch(bundled, line_id, "m4-m5").corners,
            key=lambda c: math.hypot(c.at_mm[0] - 110.0, c.at_mm[1] - 30.0),
        )
        centers.append((corner.at_mm[0] + corner.radius_mm, corner.at_mm[1] + corner.radius_mm))
        radii.append(corner.radius_mm)
    assert np.ptp(centers, axis=0) == pytest.approx(0.0, abs=1e-9)
    assert min(radii) == pytest.approx(SETTINGS.corner_radius_mm)
    assert np.diff(sorted(radii)) == pytest.approx(PITCH)


@pytest.mark.parametrize("link_id", ["m1-m2", "m2-m3", "m3-m4", "m4-m5", "m5-m6", "m6-m7"])
def test_neighbours_keep_clear_all_along(link_id):
    bundled = bundle(drawn_networks.ribbon(), SETTINGS)
    layout = bundled.layout
    order = bundled.orders[link_id]
    body = shapely.LineString(layout.paths[link_id]).buffer(2.5 * PITCH, cap_style="flat")
    for a, b in itertools.pairwise(order):
        first, second = (_course(_stretch(bundled, m, link_id)) for m in (a, b))
        points = shapely.points(shapely.get_coordinates((first & body).segmentize(0.3)))
        # An oblique piece brings the lines nearer by the cosine of its angle, 22 degrees.
        assert shapely.distance(points, second).min() >= 0.92 * PITCH


def test_ring_is_one_closed_stretch():
    bundled = bundle(drawn_networks.ring(), SETTINGS)
    (stretch,) = (s for s in bundled.stretches if s.line_id == "R")
    assert stretch.corners[0].at_mm == stretch.corners[-1].at_mm
    assert len(stretch.link_ids) == 12
    assert shapely.LinearRing(flatten(stretch.corners)[:-1]).is_simple


def test_branch_ends_on_the_course_that_goes_on():
    bundled = bundle(drawn_networks.star(), SETTINGS)
    through = _stretch(bundled, "B", "kiefer-lohe")
    branch = _stretch(bundled, "B", "kiefer-moor")
    assert "juli-kiefer" in through.link_ids
    assert branch.link_ids == ("kiefer-moor",)
    ends = [shapely.Point(branch.corners[i].at_mm) for i in (0, -1)]
    away = sorted(_course(through).distance(end) for end in ends)
    assert away[0] == pytest.approx(0.0, abs=1e-9)
    assert away[1] == pytest.approx(20.0)


def test_terminal_loop_passes_its_far_end():
    places = {
        "p": (20.0, 50.0, "P"),
        "q": (60.0, 50.0, "Q"),
        "r": (90.0, 20.0, "R"),
        "s": (130.0, 20.0, "S"),
        "t": (100.0, 50.0, "T"),
    }
    loop = drawn(Sketch(places, {"L": ("#000000", ("p q r s", "s t q p"))}))
    bundled = bundle(loop, SETTINGS)
    assert faults(bundled) == ()
    together = [s for s in bundled.stretches if {"r-s", "s-t"} <= set(s.link_ids)]
    assert len(together) == 1


def test_lines_shift_aside_where_a_neighbour_ends():
    bundled = bundle(drawn_networks.ribbon(), SETTINGS)
    assert "4" in bundled.orders["m4-m5"]
    assert "4" not in bundled.orders["m5-m6"]
    station = bundled.layout.positions["m5"]
    (end,) = (s for s in bundled.stretches if s.line_id == "4")
    tip = min((end.corners[0].at_mm, end.corners[-1].at_mm), key=lambda p: math.dist(p, station))
    assert math.dist(tip, station) == pytest.approx(0.5 * PITCH)
    assert tip in [pytest.approx(p, abs=1e-6) for p in bundled.spans["m5"].points_mm]


def test_span_crosses_the_bundle_in_a_row():
    bundled = bundle(drawn_networks.star(), SETTINGS)
    points = np.array(bundled.spans["markt"].points_mm)
    assert points[:, 0] == pytest.approx(85.0)
    assert points[:, 1] == pytest.approx([75.0 - PITCH, 75.0, 75.0 + PITCH])


def test_span_leaves_out_lines_that_only_pass():
    bundled = bundle(drawn_networks.ribbon(), SETTINGS)
    assert len(bundled.spans["m4"].points_mm) == 3
    assert len(bundled.spans["m5"].points_mm) == 4


@pytest.mark.parametrize("turn", [45, 90, 135])
def test_sharp_turns_and_short_links_neither_spike_nor_turn_back(turn):
    angle = math.radians(turn)
    places = {
        "p": (50.0, 50.0, "P"),
        "q": (56.0, 50.0, "Q"),
        "r": (56.0 + 7.0 * math.cos(angle), 50.0 + 7.0 * math.sin(angle), "R"),
        "s": (63.0 + 7.0 * math.cos(angle), 50.0 + 7.0 * math.sin(angle), "S"),
    }
    courses = dict.fromkeys("ABCDE", ("#000000", ("p q r s",)))
    bundled = bundle(drawn(Sketch(places, courses)), SETTINGS)
    assert faults(bundled) == ()
    for stretch in bundled.stretches:
        course = _course(stretch)
        assert course.is_simple
        assert course.length < 45.0


def test_same_bytes_under_any_hash_seed():
    code = (
        "import sys; sys.path.insert(0, 'tests')\n"
        "import drawn_networks\n"
        "from gtfs_schematic.bundles.build import bundle\n"
        "from gtfs_schematic.bundles.model import BundleSettings\n"
        "for name in sorted(drawn_networks.ALL):\n"
        "    b = bundle(drawn_networks.ALL[name](), BundleSettings())\n"
        "    print(b.orders, b.stretches, b.spans, b.quality)\n"
    )
    outputs = {
        subprocess.run(
            [sys.executable, "-c", code],
            env={**os.environ, "PYTHONHASHSEED": seed},
            cwd=Path(__file__).parents[2],
            capture_output=True,
            check=True,
        ).stdout
        for seed in ("0", "1", "77")
    }
    assert len(outputs) == 1
    assert len(outputs.pop()) > 1000
