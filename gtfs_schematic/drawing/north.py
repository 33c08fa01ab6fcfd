"""An arrow that says where north is, on sheets on which it is not straight up."""

from __future__ import annotations

import math

from gtfs_schematic.drawing.model import DrawingSettings, Group, PathShape
from gtfs_schematic.drawing.page import Page
from gtfs_schematic.drawing.paths import polyline
from gtfs_schematic.drawing.style import quiet
from gtfs_schematic.drawing.words import run
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels import fonts

_LENGTH = 2.2
_HEAD = 0.55
_WIDE = 0.28
"""Length of the arrow, of its head, and half the head's width, in type sizes of the subtitle."""


def north_groups(page: Page, rotation_deg: float, settings: DrawingSettings) -> tuple[Group, ...]:
    """Give the arrow with its N at the upper right of the sheet; none if north is up.

    `rotation_deg` is the counter-clockwise turn of the ground.
    """
    if rotation_deg == 0.0:
        return ()
    middle, size = _site(page)
    angle = math.radians(rotation_deg)
    # North as it lies on the sheet, y down, and the direction to its right.
    ahead, right = (-math.sin(angle), -math.cos(angle)), (math.cos(angle), -math.sin(angle))

    def at(along: float, across: float) -> Point:
        return (
            middle[0] + size * (along * ahead[0] + across * right[0]),
            middle[1] + size * (along * ahead[1] + across * right[1]),
        )

    tip, neck = _LENGTH / 2.0, _LENGTH / 2.0 - _HEAD
    color = quiet(settings)
    shaft = PathShape(polyline([at(-tip, 0.0), at(neck, 0.0)]), stroke=color, stroke_width=0.3)
    head = PathShape(
        polyline([at(tip, 0.0), at(neck, -_WIDE), at(neck, _WIDE)], closed=True), fill=color
    )
    foot = at(tip + 0.6, 0.0)
    high = 0.9 * size * fonts.metrics(bold=True).cap_height
    wide = run("N", foot, 0.9 * size, color, bold=True).width
    start = (foot[0] - wide / 2.0, foot[1] + high / 2.0)
    letter = run("N", start, 0.9 * size, color, bold=True)
    side = "left" if rotation_deg > 0.0 else "right"
    title = f"North is {abs(rotation_deg):g}° to the {side} of the top"
    return (Group("north", (shaft, head, letter), title=title),)


def _site(page: Page) -> tuple[Point, float]:
    """Give the middle of the arrow and its type size: beside the title, or else in the margin."""
    frame, size = page.frame, page.type.subtitle
    margin = frame.left_mm
    reach = (_LENGTH / 2.0 + 1.0) * size
    left = frame.width_mm - margin - 2.0 * reach
    ends = [
        run(text, block.at, type_, "", bold=bold).width + margin
        for block, type_, bold in (
            (page.title, page.type.title, True),
            (page.subtitle, page.type.subtitle, False),
        )
        for text in block.lines
    ]
    if max(ends, default=0.0) < left - size:
        return (frame.width_mm - margin - reach, margin + reach), size
    size *= min(1.0, 0.5 * margin / reach)
    return (frame.width_mm - margin / 2.0, margin + reach), size
