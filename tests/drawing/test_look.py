"""Markers, strokes and arrowheads stand where the network says."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace

import drawn_networks
import drawn_sheets
import pytest

from gtfs_schematic.bundles.model import StationSpan
from gtfs_schematic.drawing.compose import compose
from gtfs_schematic.drawing.contrast import contrast_ratio
from gtfs_schematic.drawing.key import used_signs
from gtfs_schematic.drawing.markers import MarkerLook, marker, spanning_edges
from gtfs_schematic.drawing.model import DrawingSettings, Group, PathShape
from gtfs_schematic.drawing.paths import commands
from gtfs_schematic.drawing.style import line_styles
from gtfs_schematic.labels.model import LabelledLayout, RunBadge

LOOK = MarkerLook(1.2, 1.9, 1.95, "#111111", "#FFFFFF")


def reach(shapes: tuple[PathShape, ...]) -> tuple[float, float, float, float]:
    """Give left, top, right and bottom of what shapes cover, round ends and widths included."""
    boxes = []
    for shape in shapes:
        half = shape.stroke_width / 2.0 if shape.stroke else 0.0
        for _, values in commands(shape.d):
            for x, y in zip(values[::2], values[1::2], strict=True):
                boxes.append((x - half, y - half, x + half, y + half))
    left, top, right, bottom = zip(*boxes, strict=True)
    return min(left), min(top), max(right), max(bottom)


@pytest.mark.parametrize("kind", ["stop", "interchange", "terminus"])
def test_a_marker_covers_its_lines_and_stays_within_its_radius(kind: str):
    points = ((10.0, 20.0), (10.0, 21.95), (10.0, 23.9))
    radius = LOOK.stop_radius if kind == "stop" else LOOK.large_radius
    left, top, right, bottom = reach(marker(kind, points, (0.0, 1.0), LOOK))  # type: ignore[arg-type]
    assert left >= 10.0 - radius - 1e-6
    assert right <= 10.0 + radius + 1e-6
    assert top < 20.0 - 0.8
    assert bottom > 23.9 + 0.8
    assert top >= 20.0 - radius - 0.8 * LOOK.large_radius


def test_a_stop_has_a_thin_neck_where_a_line_passes():
    whole = marker("stop", ((0.0, 0.0), (0.0, 1.95)), (0.0, 1.0), LOOK)
    parted = marker("stop", ((0.0, 0.0), (0.0, 3.9)), (0.0, 1.0), LOOK)
    assert len(whole) == 2
    neck = parted[0]
    assert neck.stroke == LOOK.ink
    assert neck.stroke_width < LOOK.stop_radius


def test_spanning_edges_join_all_points_by_the_shortest_way():
    points = ((0.0, 0.0), (5.0, 0.0), (1.0, 0.0), (5.0, 2.0))
    edges = spanning_edges(points)
    assert len(edges) == 3
    assert sum(math.dist(*edge) for edge in edges) == pytest.approx(1.0 + 4.0 + 2.0)


def test_the_bar_of_a_terminus_lies_across_its_line():
    layout = drawn_sheets.on_page(drawn_networks.star())
    labelled = drawn_sheets.naive_labels(drawn_sheets.naive_bundle(layout))
    group = station(compose_groups(labelled), "iller")
    (_, first), (_, last) = commands(next(c.d for c in group.children if isinstance(c, PathShape)))
    bar = (last[0] - first[0], last[1] - first[1])
    # Line A comes to Illerquelle at a slant of 45 degrees, up and to the right.
    assert bar[0] == pytest.approx(bar[1], abs=0.002)
    assert math.hypot(*bar) > 2.0


def compose_groups(labelled: LabelledLayout) -> tuple[Group, ...]:
    return compose(labelled, DrawingSettings()).groups


def station(groups: tuple[Group, ...], station_id: str) -> Group:
    (stations,) = (group for group in groups if group.css_class == "stations")
    return next(
        child
        for child in stations.children
        if isinstance(child, Group) and child.data["station"] == station_id
    )


def test_an_arrowhead_points_along_the_only_direction():
    layout = drawn_sheets.on_page(drawn_networks.star())
    lines = tuple(
        replace(line, one_way_links=(("reh", "rathaus"),)) if line.id == "D" else line
        for line in layout.network.lines
    )
    layout = replace(layout, network=replace(layout.network, lines=lines))
    labelled = drawn_sheets.naive_labels(drawn_sheets.naive_bundle(layout))
    (drawn,) = (group for group in compose_groups(labelled) if group.css_class == "lines")
    (marks,) = (c for c in drawn.children if isinstance(c, Group) and c.css_class == "direction")
    assert marks.data == {"for-line": "D"}
    (head,) = marks.children
    assert isinstance(head, PathShape)
    (_, first), (_, tip), (_, last) = commands(head.d)
    # From Rehwiese up to Rathaus: the tip is above the wings, on the line between them.
    assert tip[1] < first[1] == pytest.approx(last[1])
    assert tip[0] == pytest.approx(layout.positions["reh"][0], abs=0.002)
    assert layout.positions["rathaus"][1] < tip[1] < layout.positions["reh"][1]


def one_way(links: tuple[tuple[str, str], ...]) -> LabelledLayout:
    """Give line D of the star, labelled, in one direction on some links."""
    layout = drawn_sheets.on_page(drawn_networks.star())
    lines = tuple(
        replace(line, one_way_links=links) if line.id == "D" else line
        for line in layout.network.lines
    )
    layout = replace(layout, network=replace(layout.network, lines=lines))
    return drawn_sheets.naive_labels(drawn_sheets.naive_bundle(layout))


def arrowheads(labelled: LabelledLayout) -> list[tuple[float, float]]:
    """Give the tips of all arrowheads."""
    (drawn,) = (group for group in compose_groups(labelled) if group.css_class == "lines")
    heads = [
        head
        for child in drawn.children
        if isinstance(child, Group) and child.css_class == "direction"
        for head in child.children
        if isinstance(head, PathShape)
    ]
    return [tuple(commands(head.d))[1][1] for head in heads]


def test_arrowheads_in_one_direction_do_not_crowd():
    # Five stations on 80 mm, every link in one direction: not an arrowhead on each.
    down = ("pappel", "quell", "rathaus", "reh", "sand")
    tips = arrowheads(one_way(tuple(itertools.pairwise(down))))
    assert 2 <= len(tips) <= 3
    assert all(math.dist(a, b) >= 29.0 for a, b in itertools.combinations(tips, 2))
    there_and_back = (("pappel", "quell"), ("reh", "rathaus"))
    assert len(arrowheads(one_way(there_and_back))) == 2


def test_a_name_on_a_line_does_not_cover_its_arrowhead():
    labelled = one_way((("reh", "rathaus"),))
    (tip,) = arrowheads(labelled)
    badge = RunBadge("D", "D", (tip[0], tip[1] + 0.3), 2.4, 2.4, 2.2, 0.0)
    (moved,) = arrowheads(replace(labelled, run_badges=(badge,)))
    assert moved[0] == pytest.approx(tip[0], abs=0.01)
    assert abs(moved[1] - badge.at_mm[1]) > 1.2


def test_modes_and_services_differ_without_color():
    network = drawn_networks.ribbon().network
    changes = [{}, {"mode": "bus"}, {"mode": "ferry"}, {"service": "night"}]
    lines = tuple(replace(line, **c) for line, c in zip(network.lines, changes, strict=True))
    styles = line_styles(replace(network, lines=lines), DrawingSettings())
    looks = {(style.width, style.dash, style.beads) for style in styles.values()}
    assert len(looks) == 4
    plain = line_styles(network, DrawingSettings())
    assert {(style.width, style.dash) for style in plain.values()} == {(1.0, ())}


def test_what_most_lines_have_in_common_is_not_dashed():
    network = drawn_networks.ribbon().network
    lines = tuple(replace(line, service="some-days") for line in network.lines[:3])
    network = replace(network, lines=(*lines, network.lines[3]))
    assert {style.dash for style in line_styles(network, DrawingSettings()).values()} == {()}
    assert "some-days" not in used_signs(network, DrawingSettings())


def test_a_pale_line_gets_an_edge_that_shows_and_keeps_its_color():
    network = drawn_networks.ribbon().network
    pale = (replace(network.lines[0], color="#FFE45C"), *network.lines[1:])
    styles = line_styles(replace(network, lines=pale), DrawingSettings())
    assert styles["1"].color == "#FFE45C"
    assert contrast_ratio(styles["1"].edge, "#FFFFFF") >= 3.0
    assert styles["2"].edge == ""


def test_a_line_that_crosses_another_lies_on_a_casing():
    layout = drawn_sheets.on_page(drawn_networks.walk_and_crossing())
    (lines,) = (
        group
        for group in compose_groups(drawn_sheets.naive_labels(drawn_sheets.naive_bundle(layout)))
        if group.css_class == "lines"
    )
    kinds = [child.css_class for child in lines.children if isinstance(child, Group)]
    assert kinds == ["casing", "line"] * 3
    for casing, line in zip(lines.children[::2], lines.children[1::2], strict=True):
        assert isinstance(casing, Group)
        assert isinstance(line, Group)
        assert isinstance(casing.children[0], PathShape)
        assert isinstance(line.children[0], PathShape)
        assert casing.children[0].stroke_width > line.children[0].stroke_width
        assert casing.children[0].d == line.children[0].d


def test_a_span_is_covered_from_end_to_end():
    layout = drawn_sheets.on_page(drawn_networks.ring())
    bundled = drawn_sheets.naive_bundle(layout)
    x, y = layout.positions["r02"]
    spans = {**bundled.spans, "r02": StationSpan("r02", ((x, y - 1.0), (x, y + 1.0)))}
    labelled = drawn_sheets.naive_labels(replace(bundled, spans=spans))
    group = station(compose_groups(labelled), "r02")
    shapes = tuple(c for c in group.children if isinstance(c, PathShape))
    _, top, _, bottom = reach(shapes)
    assert top < y - 1.0
    assert bottom > y + 1.0
