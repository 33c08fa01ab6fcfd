"""Marks of what a revision changed: words at what is new, and closed stations struck through."""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace

import shapely

from gtfs_schematic.drawing.contrast import mix
from gtfs_schematic.drawing.model import DrawingSettings, Group, PathShape, TextShape
from gtfs_schematic.drawing.paths import circle, polyline, turned
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels.model import Label, LabelledLayout

_PALE = 0.35
_STROKE_MM = 0.3
_STRIKE = 0.28
"""Height of the stroke through a name, in sizes of its type."""


@dataclass(frozen=True, slots=True)
class ClosedStation:
    """A station that no line calls at any more, where it stood."""

    id: str
    name: str
    at_mm: Point
    until: str
    """From this date on, as YYYY-MM-DD, it is not drawn any more."""
    label: Label | None = None
    """Its name as it stood; None where it had no place."""


@dataclass(frozen=True, slots=True)
class Marks:
    """What is marked on one sheet; nothing in a drawing that revises none."""

    stations: Mapping[str, str] = field(default_factory=dict)
    """Per station id the words at its name."""
    lines: Mapping[str, str] = field(default_factory=dict)
    """Per line id the words in the key."""
    closed: tuple[ClosedStation, ...] = ()
    closed_sign: bool = False
    """Whether the key explains the sign of closed stations."""


def words_of(text: str, start: str) -> str:
    """Give the words at what is new: the setting's, with the edition's first day."""
    return text.replace("{date}", start)


def last_day(until: str, start: str) -> str:
    """Give the date from which on closed stations are not drawn: as set, or days from the start.

    Empty if neither says when.
    """
    if not until or not until.isdigit():
        return until
    if not start:
        return ""
    return (dt.date.fromisoformat(start) + dt.timedelta(days=int(until))).isoformat()


def still_closed(
    closed: Sequence[ClosedStation], drawn: Mapping[str, object], start: str
) -> tuple[ClosedStation, ...]:
    """Give those that are not open again and whose time is not over, sorted by id."""
    kept = {each.id: each for each in closed if each.id not in drawn and start < each.until}
    return tuple(kept[key] for key in sorted(kept))


def with_room(marks: Marks, labelled: LabelledLayout) -> Marks:
    """Leave out names of closed stations where something else stands now, and places likewise."""
    bundled = labelled.bundled
    sheet = bundled.layout.sheet
    frame = shapely.box(sheet.left_mm, sheet.top_mm, sheet.right_mm, sheet.bottom_mm)
    radius = labelled.settings.marker_radius_mm
    lines = [shapely.LineString([c.at_mm for c in s.corners]) for s in bundled.stretches]
    inked = shapely.union_all(
        [
            *(line.buffer(bundled.settings.line_width_mm / 2.0) for line in lines),
            *(shapely.Point(at).buffer(radius) for at in bundled.layout.positions.values()),
        ]
    )
    texts = shapely.union_all([shapely.Polygon(la.outline_mm) for la in labelled.labels.values()])
    markers = shapely.MultiPoint(list(bundled.layout.positions.values()))
    found = []
    for each in marks.closed:
        spot = shapely.Point(each.at_mm)
        dot = spot.buffer(radius)
        if spot.distance(markers) < 2.0 * radius or dot.intersects(texts) or not frame.covers(dot):
            continue
        label = each.label
        if label is not None:
            box = shapely.Polygon(label.outline_mm)
            if box.intersects(inked) or box.intersects(texts) or not frame.covers(box):
                label = None
        found.append(replace(each, label=label))
    return replace(marks, closed=tuple(found))


def unshown(wanted: Marks, shown: Marks, labels: Mapping[str, Label]) -> tuple[str, ...]:
    """Say which closed stations found their place taken, and which names stand without their mark.

    `labels` are the names as they are drawn, by station id.
    """
    ids = {each.id for each in shown.closed}
    taken = tuple(
        f"note: closed station {each.name} ({each.id}) is not shown: its place is taken"
        for each in wanted.closed
        if each.id not in ids
    )
    bare = tuple(
        f"note: station {key}: no room for {text!r} at its name; its title in the SVG says it"
        for key, text in sorted(wanted.stations.items())
        if key not in labels or text not in " ".join(row.text for row in labels[key].lines)
    )
    return taken + bare


def closed_groups(
    closed: Sequence[ClosedStation], radius: float, settings: DrawingSettings
) -> Iterator[Group]:
    """Draw closed stations: a crossed-out dot, and the name struck through."""
    pale = mix(settings.ink, settings.background, _PALE)
    for each in closed:
        children: list[PathShape | TextShape] = [*closed_sign(each.at_mm, radius, settings)]
        label = each.label
        for row in label.lines if label is not None else ():
            if label is None or row.second:
                continue
            children.append(
                TextShape(
                    row.text, row.x_mm, row.y_mm, row.size_mm, pale, row.width_mm,
                    bold=label.bold, angle_deg=label.angle_deg, pivot=label.pivot_mm,
                    css_class="closed-name",
                )
            )  # fmt: skip
            y = row.y_mm - _STRIKE * row.size_mm
            stroke = polyline(((row.x_mm, y), (row.x_mm + row.width_mm, y)))
            d = turned(stroke, label.angle_deg, label.pivot_mm)
            children.append(PathShape(d, stroke=pale, stroke_width=_STROKE_MM))
        yield Group(
            "closed-station",
            tuple(children),
            data={"closed": each.id},
            title=f"{each.name}, closed; marked before {each.until}",
        )


def closed_sign(at: Point, radius: float, settings: DrawingSettings) -> tuple[PathShape, ...]:
    """Give the sign of a closed station: a pale dot, crossed out."""
    pale = mix(settings.ink, settings.background, _PALE)
    (x, y), r = at, radius * 0.8
    dot = PathShape(circle(at, radius), fill=settings.background, stroke=pale, stroke_width=0.2)
    strokes = (((x - r, y - r), (x + r, y + r)), ((x - r, y + r), (x + r, y - r)))
    return (
        dot,
        *(PathShape(polyline(each), stroke=pale, stroke_width=_STROKE_MM) for each in strokes),
    )
