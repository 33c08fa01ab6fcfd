"""Shapes are carried soundly, or left out and listed."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace

import numpy as np
import pytest
import shapely
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from gtfs_schematic.background.board import board_of
from gtfs_schematic.background.build import lay_background
from gtfs_schematic.background.calm import calmed
from gtfs_schematic.background.carry import carry
from gtfs_schematic.background.check import faults, without_faulty
from gtfs_schematic.background.field import Field
from gtfs_schematic.background.model import BackgroundSettings, Feature, Source
from gtfs_schematic.background.planes import planes_of
from gtfs_schematic.bundles.model import Corner

SETTINGS = BackgroundSettings()


def carried(labelled, *features: Feature):
    return carry(labelled, Source(tuple(features)), SETTINGS)


def middle_of(labelled, station):
    return labelled.bundled.layout.positions[station]


def test_nothing_gives_nothing(star):
    assert lay_background(star, SETTINGS).shapes == ()


@settings(
    max_examples=12, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
@given(
    radii=st.lists(st.floats(6.0, 60.0), min_size=6, max_size=10),
    center=st.tuples(st.floats(-50.0, 50.0), st.floats(-40.0, 40.0)),
)
def test_any_lake_is_carried_soundly_or_listed(labelled, sketch, radii, center):
    frame = labelled.bundled.layout.sheet
    x, y = (frame.left_mm + frame.right_mm) / 2.0, (frame.top_mm + frame.bottom_mm) / 2.0
    turn = math.tau / len(radii)
    corners = [
        (
            x + center[0] + r * math.cos(0.1 + i * turn),
            y + center[1] + r * math.sin(0.1 + i * turn),
        )
        for i, r in enumerate(radii)
    ]
    background = carried(labelled, sketch.lake(labelled, corners))
    assert faults(background, labelled.bundled.layout) == ()
    assert len(background.shapes) + len(background.left_out) >= 1


def test_a_lake_lies_where_it_lies_on_the_ground(star, sketch):
    """Hand-made grounds are nearly to scale, so a lake far from all lines stays what it is."""
    frame = star.bundled.layout.sheet
    xs, ys = zip(*star.bundled.layout.positions.values(), strict=True)
    corner = (min(xs) - 25.0, min(ys) - 5.0)
    assert corner[0] > frame.left_mm + 10.0
    wanted = shapely.Polygon(sketch.box(corner, 24.0, 18.0))
    (shape,) = carried(star, sketch.lake(star, sketch.box(corner, 24.0, 18.0))).shapes
    both = shape.drawn.intersection(wanted).area / shape.drawn.union(wanted).area
    assert both > 0.7
    assert len(shape.rings[0]) <= 8


def test_a_lake_round_a_station_holds_it_and_no_other(labelled, sketch):
    layout = labelled.bundled.layout
    places = {key: shapely.Point(at) for key, at in layout.positions.items()}
    key = min(places)
    apart = min(places[key].distance(other) for k, other in places.items() if k != key)
    lake = sketch.lake(labelled, sketch.box(layout.positions[key], apart, apart))
    (shape,) = carried(labelled, lake).shapes
    held = {k for k, place in places.items() if shape.drawn.contains(place)}
    assert held == {key}


def test_a_river_between_two_stations_crosses_their_link_once(star, sketch):
    layout = star.bundled.layout
    link = layout.network.links[0]
    (ax, ay), (bx, by) = (layout.positions[end] for end in (link.start, link.end))
    mx, my = (ax + bx) / 2.0, (ay + by) / 2.0
    length = math.hypot(bx - ax, by - ay)
    nx, ny = 0.8 * (ay - by) / length, 0.8 * (bx - ax) / length
    points = [(mx + t * nx, my + t * ny) for t in (-9.0, -3.0, 3.0, 9.0)]
    (shape,) = carried(star, sketch.river(star, points)).shapes
    met = {
        key: len(shapely.get_parts(shape.drawn.intersection(shapely.LineString(path))))
        for key, path in layout.paths.items()
        if shape.drawn.intersects(shapely.LineString(path))
    }
    assert met == {link.id: 1}


def test_an_island_in_a_lake_stays_dry(star, sketch):
    layout = star.bundled.layout
    xs, ys = zip(*layout.positions.values(), strict=True)
    center = ((min(xs) + max(xs)) / 2.0, (min(ys) + max(ys)) / 2.0)
    around = sketch.lake(star, sketch.box(center, 2.0 * np.ptp(xs) + 40.0, 2.0 * np.ptp(ys) + 40.0))
    island = sketch.on_ground(star, sketch.box(center, np.ptp(xs) + 30.0, np.ptp(ys) + 30.0))
    sea = replace(around, geometry=around.geometry.difference(shapely.Polygon(island)))
    (shape,) = carried(star, sea).shapes
    assert not shapely.intersects(
        shape.drawn, shapely.points(list(layout.positions.values()))
    ).any()
    assert shape.drawn.area > 100.0


def test_surfaces_that_touch_become_one_and_tiny_ones_are_listed(star, sketch):
    layout = star.bundled.layout
    xs, ys = zip(*layout.positions.values(), strict=True)
    x, y = min(xs) - 25.0, min(ys) - 5.0
    halves = [sketch.lake(star, sketch.box((x + d, y), 12.0, 18.0)) for d in (-6.0, 5.99)]
    pond = sketch.lake(star, sketch.box((x, y + 40.0), 2.0, 2.0))
    background = carried(star, *halves, replace(pond, name="Pond"))
    assert len(background.shapes) == 1
    assert [left.what for left in background.left_out] == ["Pond"]
    assert "too small" in background.left_out[0].reason


def test_slivers_are_taken_off_where_nothing_hangs_on_them(star):
    board = board_of(star)
    xs, ys = zip(*star.bundled.layout.positions.values(), strict=True)
    x, y = min(xs) - 30.0, -min(ys)
    pond = shapely.box(x, y, x + 12.0, y + 12.0)
    spike = shapely.box(x + 5.0, y + 12.0, x + 6.0, y + 25.0)
    slit = shapely.box(x + 9.0, y + 4.0, x + 12.0, y + 4.5)
    found = calmed(board, pond.union(spike).difference(slit))
    assert found.symmetric_difference(pond).area < 0.05
    strait = shapely.box(x + 12.0, y + 2.0, x + 18.0, y + 3.0)
    waters = shapely.union_all([pond, strait, shapely.box(x + 18.0, y, x + 30.0, y + 12.0)])
    assert calmed(board, waters).symmetric_difference(waters).area < 0.05
    (link, *_) = star.bundled.layout.paths.values()
    a, b = link[0], link[1]
    over = shapely.LineString([(a[0], -a[1]), (b[0], -b[1])]).interpolate(0.5, normalized=True)
    bridge = shapely.LineString([over, (over.x + 9.0, over.y + 9.0)]).buffer(
        0.5, cap_style="square"
    )
    assert calmed(board, bridge).area == pytest.approx(bridge.area, rel=0.05)


def test_a_river_that_ends_in_a_lake_reaches_it(star, sketch):
    layout = star.bundled.layout
    xs, ys = zip(*layout.positions.values(), strict=True)
    x, y = min(xs) - 25.0, min(ys) - 5.0
    lake = sketch.lake(star, sketch.box((x, y), 24.0, 18.0))
    river = sketch.river(star, [(x, y + 60.0), (x, y)])
    water = {shape.name: shape.drawn for shape in carried(star, lake, river).shapes}
    assert water["River"].intersects(water["Lake"])


def test_a_brook_too_short_to_show_is_listed(star, sketch):
    layout = star.bundled.layout
    xs, ys = zip(*layout.positions.values(), strict=True)
    x, y = (min(xs) + max(xs)) / 2.0, (min(ys) + max(ys)) / 2.0 + 7.0
    background = carried(star, sketch.river(star, [(x, y), (x + 0.5, y)]))
    assert background.shapes == ()
    assert "too small" in background.left_out[0].reason


def test_parks_lie_below_water_below_boundaries(star, sketch):
    layout = star.bundled.layout
    xs, ys = zip(*layout.positions.values(), strict=True)
    here = sketch.box((min(xs) - 25.0, min(ys) - 5.0), 24.0, 18.0)
    features = [sketch.lake(star, here, kind) for kind in ("boundary", "water", "park")]
    shapes = carried(star, *features).shapes
    assert [shape.kind for shape in shapes] == ["park", "water", "boundary"]
    assert [shape.surface for shape in shapes] == [True, True, False]


def test_the_same_input_gives_the_same_shapes(star, sketch):
    lake = sketch.lake(
        star, sketch.box(middle_of(star, min(star.bundled.layout.positions)), 30, 30)
    )
    assert carried(star, lake) == carried(star, lake)


def test_the_field_takes_stations_where_they_are(labelled):
    planes = planes_of(labelled.bundled)
    field = Field(planes)
    off = np.hypot(*(field(planes.ground) - planes.sheet).T)
    links = [np.hypot(*np.diff(p.sheet, axis=0).T).sum() for p in planes.pieces]
    assert off.max() < 0.2 * np.median(links)


def test_the_field_of_a_true_map_is_that_map(star):
    planes = planes_of(star.bundled)
    matrix = np.array([[0.011, 0.003], [-0.003, 0.011]])
    planes.sheet = planes.ground @ matrix
    planes.pieces = [replace(p, sheet=p.ground @ matrix) for p in planes.pieces]
    places = planes.ground.mean(axis=0) + np.array([[0.0, 0.0], [9e4, -4e4], [100.0, 2000.0]])
    assert Field(planes)(places) == pytest.approx(places @ matrix, rel=1e-3, abs=0.05)


@pytest.fixture(scope="module")
def held(star, sketch):
    key = min(star.bundled.layout.positions)
    return key, carried(star, sketch.lake(star, sketch.box(middle_of(star, key), 12.0, 12.0)))


def changed(background, **fields: object):
    return replace(background, shapes=(replace(background.shapes[0], **fields),))


def moved(background, dx, dy):
    rings = tuple(
        tuple(Corner((c.at_mm[0] + dx, c.at_mm[1] + dy), c.radius_mm) for c in ring)
        for ring in background.shapes[0].rings
    )
    return changed(background, rings=rings)


def test_the_check_faults_what_is_wrong(star, held):
    key, background = held
    layout = star.bundled.layout
    assert faults(background, layout) == ()
    aside = faults(moved(background, 30.0, 17.0), layout)
    assert any(key in fault and "out of" in fault for fault in aside)
    assert any("crosses" in fault for fault in aside)
    assert any("frame" in fault for fault in faults(moved(background, 900.0, 0.0), layout))
    first, *rest = background.shapes[0].rings[0]
    bent = (Corner((first.at_mm[0] + 0.9, first.at_mm[1] + 0.2), 0.0), *rest)
    assert any("eight" in each for each in faults(changed(background, rings=(bent,)), layout))
    twice = replace(background, shapes=background.shapes * 2)
    assert any("over each other" in fault for fault in faults(twice, layout))


def test_what_the_check_faults_is_left_out_and_listed(star, held):
    _, background = held
    kept = without_faulty(moved(background, 30.0, 17.0), star.bundled.layout)
    assert kept.shapes == ()
    assert "soundly" in kept.left_out[0].reason
    assert without_faulty(background, star.bundled.layout) == background


def test_holes_run_the_other_way_round(star, sketch):
    layout = star.bundled.layout
    xs, ys = zip(*layout.positions.values(), strict=True)
    center = ((min(xs) + max(xs)) / 2.0, (min(ys) + max(ys)) / 2.0)
    outer = sketch.lake(star, sketch.box(center, np.ptp(xs) + 60.0, np.ptp(ys) + 60.0))
    inner = sketch.on_ground(star, sketch.box(center, np.ptp(xs) + 30.0, np.ptp(ys) + 30.0))
    moat = replace(outer, geometry=outer.geometry.difference(shapely.Polygon(inner)))
    shapes = carried(star, moat).shapes
    assert len(shapes) == 1
    turns = [shapely.LinearRing([c.at_mm for c in ring]).is_ccw for ring in shapes[0].rings]
    assert set(itertools.pairwise(turns)) <= {(True, False), (False, True), (False, False)}
    assert len(set(turns)) == 2
