"""Stations as groups of the scene: marker, name, and the badges of the lines that end there."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace

from gtfs_schematic.drawing.contrast import mix
from gtfs_schematic.drawing.course import across
from gtfs_schematic.drawing.markers import STEP_FREE_COLORS, MarkerLook, marker, step_free_sign
from gtfs_schematic.drawing.model import DrawingSettings, Group, PathShape, TextShape
from gtfs_schematic.drawing.paths import turned
from gtfs_schematic.drawing.style import LineStyle, badge_tile
from gtfs_schematic.drawing.words import station_title
from gtfs_schematic.labels import fonts
from gtfs_schematic.labels.model import Badge, Label, LabelledLayout
from gtfs_schematic.network.model import Station

_STOP_SHARE = 0.92
"""A stop's marker is a little smaller than what the labels keep clear of."""


def marker_look(labelled: LabelledLayout, settings: DrawingSettings) -> MarkerLook:
    """Give the markers' sizes and colours."""
    bundle = labelled.bundled.settings
    return MarkerLook(
        stop_radius=labelled.settings.marker_radius_mm * _STOP_SHARE,
        large_radius=labelled.settings.interchange_radius_mm,
        pitch=bundle.line_width_mm + bundle.line_gap_mm,
        ink=settings.ink,
        paper=settings.background,
    )


def station_groups(
    labelled: LabelledLayout, styles: Mapping[str, LineStyle], settings: DrawingSettings
) -> Iterator[Group]:
    """Give every station of the network, in its order."""
    network = labelled.bundled.layout.network
    look = marker_look(labelled, settings)
    for station in network.stations:
        children: list[PathShape | TextShape | Group] = [*_marker(labelled, station, look)]
        label = labelled.labels.get(station.id)
        if label is not None:
            children += _name(label, settings, network.info.lang)
            if settings.show_step_free and station.boarding == "yes":
                children += _step_free(label)
            for badge in label.badges:
                color = network.line[badge.line_id].text_color
                children.append(_badge(badge, label, styles[badge.line_id], color))
        yield Group(
            "station",
            tuple(children),
            data={"station": station.id, "kind": station.kind},
            title=", ".join(
                part
                for part in (
                    station_title(station, network),
                    labelled.settings.remarks.get(station.id),
                )
                if part
            ),
        )


def _marker(labelled: LabelledLayout, station: Station, look: MarkerLook) -> tuple[PathShape, ...]:
    span = labelled.bundled.spans.get(station.id)
    points = span.points_mm if span else ()
    points = points or (labelled.bundled.layout.positions[station.id],)
    return marker(station.kind, points, across(labelled.bundled, station.lines, points[0]), look)


def _name(label: Label, settings: DrawingSettings, lang: str) -> Iterator[TextShape]:
    pale = mix(settings.ink, settings.background, 0.25)
    for line in label.lines:
        yield TextShape(
            text=line.text,
            x=line.x_mm,
            y=line.y_mm,
            size=line.size_mm,
            fill=pale if line.second else settings.ink,
            width=line.width_mm,
            bold=label.bold and not line.second,
            angle_deg=label.angle_deg,
            pivot=label.pivot_mm,
            css_class="station-name-second" if line.second else "station-name",
            lang="" if line.second or lang in ("en", "mul") else lang,
        )


def _badge(badge: Badge, label: Label, style: LineStyle, color: str) -> Group:
    x, y = badge.x_mm, badge.y_mm
    tile = badge_tile((x, y, x + badge.width_mm, y + badge.height_mm), style)
    text = TextShape(
        text=badge.text,
        x=badge.text_x_mm,
        y=badge.text_y_mm,
        size=badge.size_mm,
        fill=color,
        width=fonts.text_width_mm(badge.text, badge.size_mm, bold=True),
        bold=True,
        angle_deg=label.angle_deg,
        pivot=label.pivot_mm,
        css_class="badge-name",
    )
    turned_tile = replace(tile, d=turned(tile.d, label.angle_deg, label.pivot_mm))
    return Group("badge", (turned_tile, text), data={"for-line": badge.line_id})


def _step_free(label: Label) -> Iterator[PathShape]:
    """Give the step-free sign behind the last line of a name."""
    line = label.lines[-1]
    size = 0.8 * line.size_mm
    corner = (line.x_mm + line.width_mm + 0.25 * line.size_mm, line.y_mm - 0.76 * line.size_mm)
    for shape in step_free_sign(*corner, size, STEP_FREE_COLORS):
        yield replace(shape, d=turned(shape.d, label.angle_deg, label.pivot_mm))
