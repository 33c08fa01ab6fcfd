"""What lies beneath the network: water, parks and boundaries, as groups of the scene."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Literal

from gtfs_schematic.background.model import Background, BackgroundSettings, Shape
from gtfs_schematic.bundles.model import Corner
from gtfs_schematic.drawing.model import DrawingSettings, Group, PathShape
from gtfs_schematic.drawing.paths import rounded
from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.model import SheetFrame

_BOUNDARY_MM = 0.5
_BOUNDARY_DASH = (2.4, 1.2)
_EDGE_MM = 0.01


def backdrop_groups(
    background: Background, frame: SheetFrame, settings: DrawingSettings
) -> Iterator[Group]:
    """Give every shape as a group of its own, in the order in which they are painted."""
    for shape in background.shapes:
        yield Group(
            shape.kind,
            tuple(_paths(shape, background.settings, frame, settings)),
            title=shape.name or shape.kind.capitalize(),
        )


def _paths(
    shape: Shape, wanted: BackgroundSettings, frame: SheetFrame, settings: DrawingSettings
) -> Iterator[PathShape]:
    fills = {"water": settings.water, "park": settings.park, "boundary": settings.boundary}
    color = fills[shape.kind]
    if shape.surface:
        yield PathShape("".join(_closed(ring) for ring in shape.rings), fill=color)
        return
    for ring in shape.rings:
        d = rounded(ring)
        if shape.kind == "boundary":
            yield PathShape(
                d, stroke=color, stroke_width=_BOUNDARY_MM, dash=_BOUNDARY_DASH, cap="butt"
            )
        else:
            cut = _at_edge(ring[0].at_mm, frame) or _at_edge(ring[-1].at_mm, frame)
            cap: Literal["butt", "round"] = "butt" if cut else "round"
            yield PathShape(d, stroke=color, stroke_width=wanted.river_width_mm, cap=cap)


def _at_edge(point: Point, frame: SheetFrame) -> bool:
    """Tell whether a shape is cut off at a place."""
    x, y = point
    sides = (x - frame.left_mm, frame.right_mm - x, y - frame.top_mm, frame.bottom_mm - y)
    return min(sides) < _EDGE_MM


def _closed(ring: tuple[Corner, ...]) -> str:
    """Give a ring as a closed path, begun in the middle of a side so that no corner is sharp."""
    first, last = ring[0].at_mm, ring[-1].at_mm
    seam = Corner(((first[0] + last[0]) / 2.0, (first[1] + last[1]) / 2.0), 0.0)
    return rounded((seam, *ring, seam)) + "Z"
