"""Hand-made networks on real pages, bundled and labelled in the simplest way, for drawing them."""

from __future__ import annotations

import itertools
from dataclasses import replace

from gtfs_schematic.bundles.model import (
    BundledLayout,
    BundleSettings,
    Corner,
    OrderQuality,
    StationSpan,
    Stretch,
)
from gtfs_schematic.drawing.model import DrawingSettings, SheetSettings
from gtfs_schematic.drawing.sheet import candidate_frames
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels import fonts
from gtfs_schematic.labels.model import Label, LabelledLayout, LabelSettings, TextLine
from gtfs_schematic.layout.model import Layout, SheetFrame

SETTINGS = DrawingSettings(attribution="Fahrplandaten: Verkehrsbund Wiesmarn-Mitte, frei nutzbar.")


def on_page(layout: Layout, size: str = "A3") -> Layout:
    """Move a hand-made layout into the frame of a real page."""
    return in_frame(layout, candidate_frames(layout.network, SheetSettings(size=size), SETTINGS)[0])


def in_frame(layout: Layout, frame: SheetFrame) -> Layout:
    """Move a hand-made layout into the middle of a frame."""
    xs = [x for x, _ in layout.positions.values()]
    ys = [y for _, y in layout.positions.values()]
    dx = (frame.left_mm + frame.right_mm - min(xs) - max(xs)) / 2.0
    dy = (frame.top_mm + frame.bottom_mm - min(ys) - max(ys)) / 2.0

    def moved(path: tuple[Point, ...]) -> tuple[Point, ...]:
        return tuple((x + dx, y + dy) for x, y in path)

    return replace(
        layout,
        sheet=frame,
        positions={key: (x + dx, y + dy) for key, (x, y) in layout.positions.items()},
        paths={key: moved(path) for key, path in layout.paths.items()},
        walk_paths={key: moved(path) for key, path in layout.walk_paths.items()},
        crossings=tuple(replace(each, at_mm=moved((each.at_mm,))[0]) for each in layout.crossings),
    )


def naive_bundle(layout: Layout) -> BundledLayout:
    """Draw every line on the centre line of its links, one above the other."""
    stretches = []
    for line in layout.network.lines:
        for course in line.courses:
            links = [
                layout.network.link_between[frozenset(pair)] for pair in itertools.pairwise(course)
            ]
            points: list[Point] = [layout.positions[course[0]]]
            for start, link in zip(course, links, strict=False):
                path = layout.paths[link.id]
                points += (path if link.start == start else path[::-1])[1:]
            corners = [Corner(point, 3.0) for point in points]
            corners[0], corners[-1] = Corner(points[0], 0.0), Corner(points[-1], 0.0)
            stretches.append(Stretch(line.id, tuple(link.id for link in links), tuple(corners)))
    return BundledLayout(
        layout=layout,
        settings=BundleSettings(),
        orders={link.id: link.lines for link in layout.network.links},
        stretches=tuple(stretches),
        spans={key: StationSpan(key, (at,)) for key, at in layout.positions.items()},
        quality=OrderQuality(0, 0, 0),
        forked=layout,
    )


def naive_labels(bundled: BundledLayout) -> LabelledLayout:
    """Write every name to the upper right of its station, some of them at a slant."""
    labels = {}
    for i, station in enumerate(bundled.layout.network.stations):
        x, y = bundled.layout.positions[station.id]
        bold = station.kind != "stop"
        width = fonts.text_width_mm(station.name, 3.0, bold=bold)
        line = TextLine(station.name, x + 2.0, y - 2.0, width, 3.0)
        labels[station.id] = Label(
            station_id=station.id,
            bold=bold,
            pivot_mm=(x, y),
            angle_deg=-45.0 if i % 5 == 0 else 0.0,
            side="NE",
            lines=(line,),
            outline_mm=(),
        )
    return LabelledLayout(bundled, LabelSettings(), labels, ())
