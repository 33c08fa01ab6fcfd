"""Lines, their casings and arrowheads, and walks, as groups of the scene."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace

from gtfs_schematic.bundles.model import Corner
from gtfs_schematic.drawing.course import on_line, straight_middle
from gtfs_schematic.drawing.markers import chevron, walk_shapes
from gtfs_schematic.drawing.model import DrawingSettings, Group, PathShape, TextShape
from gtfs_schematic.drawing.paths import rounded, turned
from gtfs_schematic.drawing.style import (
    WALK_WIDTH_MM,
    LineStyle,
    badge_tile,
    line_stroke,
    quiet,
    under_strokes,
    weight,
)
from gtfs_schematic.drawing.words import line_course, walk_title
from gtfs_schematic.geometry import Point, distance
from gtfs_schematic.labels import fonts
from gtfs_schematic.labels.model import LabelledLayout, RunBadge
from gtfs_schematic.layout.model import Layout
from gtfs_schematic.network.model import Line

_WALK_CORNER_MM = 2.0
_ARROWS_MM = 30.0
"""Arrowheads of one line in one direction keep this apart."""
_SAME_WAY = 0.7
_AIR_MM = 1.2
"""From a name on the line to an arrowhead."""


def walk_groups(layout: Layout, settings: DrawingSettings) -> Iterator[Group]:
    """Give the connectors of all walks that the layout drew."""
    for walk in layout.network.walks:
        path = layout.walk_paths.get(walk.id)
        if path is not None:
            d = rounded([Corner(point, _WALK_CORNER_MM) for point in path])
            shapes = walk_shapes(d, quiet(settings), settings.background, WALK_WIDTH_MM)
            title = walk_title(walk, layout.network)
            yield Group("walk", shapes, data={"walk": walk.id}, title=title)


def line_groups(
    labelled: LabelledLayout, styles: Mapping[str, LineStyle], background: str
) -> Iterator[Group]:
    """Give the lines, the lightest first, each on a casing in the colour of the paper.

    The casing is as wide as the gap between neighbours, so it parts lines that cross without
    touching those alongside; it lies under all stretches of its line, so that branches join.
    Arrowheads come right after their line, so that lines which cross above hide them too.
    """
    bundled = labelled.bundled
    full, gap = bundled.settings.line_width_mm, bundled.settings.line_gap_mm
    halo = 0.95 * gap if gap else 0.15 * full
    network = bundled.layout.network
    for line in sorted(network.lines, key=_paint_order):
        style = styles[line.id]
        paths = [rounded(s.corners) for s in bundled.stretches if s.line_id == line.id]
        wide = style.width * full + 2.0 * halo
        casing = [PathShape(d, stroke=background, stroke_width=wide, cap="butt") for d in paths]
        under = [shape for d in paths for shape in under_strokes(d, style, full)]
        yield Group("casing", (*casing, *under))
        yield Group(
            "line",
            tuple(line_stroke(d, style, full) for d in paths),
            data={"line": line.id},
            title=f"Line {line.name}: {line_course(line, network)}",
        )
        marks = tuple(_direction_marks(labelled, line, style.width * full))
        if marks:
            yield Group("direction", marks, data={"for-line": line.id})


def name_groups(
    labelled: LabelledLayout, styles: Mapping[str, LineStyle], background: str
) -> Iterator[Group]:
    """Give the names that stand on the lines along their runs, each edged in the paper's colour."""
    network = labelled.bundled.layout.network
    edge = max(0.15, 0.8 * labelled.bundled.settings.line_gap_mm)
    for badge in labelled.run_badges:
        (x, y), w, h = badge.at_mm, badge.width_mm / 2.0, badge.height_mm / 2.0
        tile = badge_tile((x - w, y - h, x + w, y + h), styles[badge.line_id])
        d = turned(tile.d, badge.angle_deg, badge.at_mm)
        cap = fonts.metrics(bold=True).cap_height * badge.size_mm
        width = fonts.text_width_mm(badge.text, badge.size_mm, bold=True)
        text = TextShape(
            text=badge.text,
            x=x - width / 2.0,
            y=y + cap / 2.0,
            size=badge.size_mm,
            fill=network.line[badge.line_id].text_color,
            width=width,
            bold=True,
            angle_deg=badge.angle_deg,
            pivot=badge.at_mm,
            css_class="badge-name",
        )
        halo = PathShape(d, stroke=background, stroke_width=edge)
        shapes = (halo, replace(tile, d=d), text)
        yield Group("badge", shapes, data={"for-line": badge.line_id})


def _direction_marks(labelled: LabelledLayout, line: Line, width: float) -> Iterator[PathShape]:
    """Give arrowheads where a line runs in one direction only, not too near to each other."""
    bundled = labelled.bundled
    layout = bundled.layout
    badges = [badge for badge in labelled.run_badges if badge.line_id == line.id]
    drawn: list[tuple[Point, Point]] = []
    for start, end in line.one_way_links:
        link = layout.network.link_between.get(frozenset((start, end)))
        if link is None or link.id not in layout.paths:
            continue
        path = layout.paths[link.id]
        found = on_line(
            bundled, line.id, *straight_middle(path if link.start == start else path[::-1])
        )
        if found is None or any(_repeats(found, other) for other in drawn):
            continue
        drawn.append(found)
        at, way = found
        yield chevron(_beside(badges, at, way), way, 0.34 * width, line.text_color)


def _beside(badges: Sequence[RunBadge], at: Point, way: Point) -> Point:
    """Give a place on a line, moved on to where no name on the line covers it."""
    for badge in badges:
        reach = badge.width_mm / 2.0 + _AIR_MM
        if distance(at, badge.at_mm) < reach:
            return (badge.at_mm[0] + reach * way[0], badge.at_mm[1] + reach * way[1])
    return at


def _repeats(one: tuple[Point, Point], other: tuple[Point, Point]) -> bool:
    """Tell whether an arrowhead would say again what one near by says already."""
    same_way = one[1][0] * other[1][0] + one[1][1] * other[1][1] > _SAME_WAY
    return same_way and distance(one[0], other[0]) < _ARROWS_MM


def _paint_order(line: Line) -> tuple[int, int, str]:
    """Put the weightiest and busiest lines on top; ties by id."""
    return (-weight(line.mode), line.trips, line.id)
