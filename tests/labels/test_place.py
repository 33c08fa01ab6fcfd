"""Labels stand free, on the sides that lettering prefers, whatever the order of the input."""

from __future__ import annotations

import random
from collections.abc import Callable, Mapping
from dataclasses import replace

import pytest
import shapely
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from gtfs_schematic.bundles.model import BundledLayout
from gtfs_schematic.labels.check import faults
from gtfs_schematic.labels.fonts import text_width_mm
from gtfs_schematic.labels.model import LabelledLayout, LabelSettings
from gtfs_schematic.labels.obstacles import obstacles_of
from gtfs_schematic.labels.place import place_labels
from gtfs_schematic.labels.problem import entries_of
from gtfs_schematic.labels.reach import ANYWHERE
from gtfs_schematic.labels.room import name_rooms
from gtfs_schematic.labels.site import sites_of

NAMES = ("ribbon", "ring", "star", "walk_and_crossing")
Straight = Callable[..., BundledLayout]


@pytest.fixture(scope="module")
def placed(networks: Mapping[str, BundledLayout]) -> dict[str, LabelledLayout]:
    return {name: place_labels(networks[name], LabelSettings()) for name in networks}


@pytest.mark.parametrize("name", NAMES)
def test_every_station_of_the_hand_drawn_networks_gets_a_sound_label(
    placed: dict[str, LabelledLayout], name: str
):
    labelled = placed[name]
    assert labelled.unplaced == ()
    assert [room.station_id for room in name_rooms(labelled)] == sorted(labelled.labels)
    assert all(room.stands for room in name_rooms(labelled))
    assert set(labelled.labels) == set(labelled.bundled.layout.positions)
    assert faults(labelled) == ()


@pytest.mark.parametrize("name", NAMES)
def test_shapely_finds_no_overlap(placed: dict[str, LabelledLayout], name: str):
    labelled = placed[name]
    boxes = shapely.polygons([labelled.labels[key].outline_mm for key in sorted(labelled.labels)])
    assert shapely.union_all(boxes).area == pytest.approx(float(shapely.area(boxes).sum()))
    width = labelled.bundled.settings.line_width_mm
    for path in labelled.bundled.layout.paths.values():
        drawn = shapely.LineString(path).buffer(width / 2.0)
        hit = boxes[shapely.intersects(boxes, drawn)]
        # the sharp centre line may cut a corner that the drawn line rounds off
        assert all(shapely.area(shapely.intersection(box, drawn)) < 0.5 for box in hit)


@pytest.mark.parametrize("name", NAMES)
def test_rows_have_the_width_of_the_typeface(placed: dict[str, LabelledLayout], name: str):
    for label in placed[name].labels.values():
        for row in label.lines:
            bold = label.bold and not row.second
            width = text_width_mm(row.text, row.size_mm, bold=bold)
            assert row.width_mm == pytest.approx(width)


def test_termini_carry_badges_of_the_lines_that_end(placed: dict[str, LabelledLayout]):
    star = placed["star"].labels
    assert {key: [b.text for b in label.badges] for key, label in star.items() if label.badges} == {
        "amsel": ["A"],
        "iller": ["A"],
        "dorn": ["B"],
        "lohe": ["B"],
        "moor": ["B"],
        "furt": ["C"],
        "otter": ["C"],
        "pappel": ["D"],
        "sand": ["D"],
    }
    assert [b.text for b in placed["ribbon"].labels["b1"].badges] == ["2", "4"]


def test_badges_can_be_left_out(networks: Mapping[str, BundledLayout]):
    labelled = place_labels(networks["star"], LabelSettings(line_badges=False))
    assert not any(label.badges for label in labelled.labels.values())


def test_names_stand_to_the_right_of_a_vertical_line(straight: Straight):
    labelled = place_labels(straight(["Amsel", "Birke", "Dorn", "Eiche"], (0.0, 15.0)), _plain())
    assert [labelled.labels[f"s{i:02d}"].side for i in (1, 2)] == ["E", "E"]


def test_names_stay_on_one_side_of_a_level_line(straight: Straight):
    labelled = place_labels(straight(["Amsel", "Birke", "Dorn", "Eiche"], (22.0, 0.0)), _plain())
    assert {labelled.labels[f"s{i:02d}"].side for i in (1, 2)} == {"N"}
    rows = [labelled.labels[f"s{i:02d}"].lines[0].y_mm for i in (1, 2)]
    assert rows[0] == pytest.approx(rows[1])


def test_crowded_names_on_a_level_line_are_tilted_at_one_angle(straight: Straight):
    names = [f"Unterer Grundweg {n}" for n in "ABCDEFGHIJKLMN"]
    labelled = place_labels(straight(names, (6.5, 0.0)), _plain())
    assert labelled.unplaced == ()
    assert faults(labelled) == ()
    assert {label.angle_deg for label in labelled.labels.values()} <= {0.0, -45.0}
    assert sum(label.angle_deg != 0.0 for label in labelled.labels.values()) >= 8


def test_a_person_may_ask_for_a_side(straight: Straight):
    bundled = straight(["Amsel", "Birke", "Dorn"], (0.0, 15.0))
    labelled = place_labels(bundled, LabelSettings(sides={"s01": "W"}))
    assert labelled.labels["s01"].side == "W"
    assert faults(labelled) == ()


def test_a_name_without_any_room_is_listed_and_asks_for_none(straight: Straight):
    long_name = "Weitläufigkeitsbeschreibungsanstalt" * 4
    labelled = place_labels(straight(["Amsel", long_name, "Dorn"], (0.0, 15.0)), LabelSettings())
    assert labelled.unplaced == ("s01",)
    assert faults(labelled) == ()
    assert [room.station_id for room in name_rooms(labelled)] == ["s00", "s02"]


def test_a_crowded_name_asks_for_the_room_beside_its_own_line(straight: Straight):
    names = [f"Unterer Grundweg {n}" for n in "ABCDEFGH"]
    labelled = place_labels(straight(names * 3, (0.0, 1.0)), _plain(), widen=False)
    asked = {room.station_id: room for room in name_rooms(labelled) if not room.stands}
    assert sorted(asked) == sorted(labelled.unplaced)
    assert asked
    half = labelled.bundled.settings.line_width_mm / 2.0
    for room in asked.values():
        assert shapely.Polygon(room.outline_mm).distance(shapely.Point(0.0, 0.0)) < 6.0
        assert min(abs(x) for x, _ in room.outline_mm) > half
    before = tuple(asked.values())
    again = {r.station_id: r for r in name_rooms(labelled, before) if not r.stands}
    assert any(again[key].outline_mm != asked[key].outline_mm for key in asked)


def test_second_names_stand_beneath_in_a_smaller_size(straight: Straight):
    bundled = straight(["Amselgrund", "Birkenhain", "Dornau"], (0.0, 15.0))
    network = bundled.layout.network
    stations = tuple(replace(s, second_name="Άνω Πόλη") for s in network.stations)
    layout = replace(bundled.layout, network=replace(network, stations=stations))
    labelled = place_labels(replace(bundled, layout=layout), LabelSettings())
    assert faults(labelled) == ()
    for label in labelled.labels.values():
        first, second = label.lines
        assert (first.second, second.second) == (False, True)
        assert second.text == "Άνω Πόλη"
        assert second.y_mm > first.y_mm
        assert second.size_mm == pytest.approx(0.75 * first.size_mm)


@settings(
    max_examples=8, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
@given(st.randoms(use_true_random=False), st.sampled_from(["star", "walk_and_crossing"]))
def test_the_order_of_the_input_does_not_matter(
    networks: Mapping[str, BundledLayout],
    placed: dict[str, LabelledLayout],
    rng: random.Random,
    name: str,
):
    bundled = networks[name]
    network = bundled.layout.network
    shuffled = replace(
        network,
        stations=tuple(rng.sample(network.stations, len(network.stations))),
        links=tuple(rng.sample(network.links, len(network.links))),
        lines=tuple(rng.sample(network.lines, len(network.lines))),
    )
    layout = replace(bundled.layout, network=shuffled)
    again = place_labels(replace(bundled, layout=layout), LabelSettings())
    assert again.labels == placed[name].labels


@pytest.mark.parametrize("name", NAMES)
def test_no_line_that_only_goes_by_parts_a_far_name_from_its_marker(
    networks: Mapping[str, BundledLayout], name: str
):
    bundled, wanted = networks[name], LabelSettings()
    obstacles = obstacles_of(bundled, wanted)
    outlines = dict(zip(obstacles.stations, obstacles.markers, strict=True))
    for site in sites_of(bundled, wanted):
        strange = [
            piece
            for piece, line in zip(obstacles.pieces, obstacles.piece_lines, strict=True)
            if not any(
                line in link.lines and site.station_id in (link.start, link.end)
                for link in bundled.layout.network.links
            )
        ]
        lines = shapely.union_all(strange)
        for entry in entries_of([site], obstacles, wanted, ANYWHERE)[site.station_id]:
            leader = shapely.shortest_line(entry.box, outlines[site.station_id])
            assert leader.length <= 2.0 or not leader.intersects(lines), site.station_id


def _plain() -> LabelSettings:
    return LabelSettings(line_badges=False)


@pytest.mark.parametrize("name", NAMES)
def test_no_place_far_from_its_marker_is_clearly_nearer_to_another(
    networks: Mapping[str, BundledLayout], name: str
):
    bundled, wanted = networks[name], LabelSettings()
    obstacles = obstacles_of(bundled, wanted)
    entries = entries_of(sites_of(bundled, wanted), obstacles, wanted, ANYWHERE)
    outlines = dict(zip(obstacles.stations, obstacles.markers, strict=True))
    far = 0
    for key, found in entries.items():
        foreign = shapely.union_all([shape for other, shape in outlines.items() if other != key])
        for entry in found:
            own = entry.box.distance(outlines[key])
            if own > 2.0:
                far += 1
                assert entry.box.distance(foreign) >= 0.6 * own - 1e-6, key
    assert far > 20
