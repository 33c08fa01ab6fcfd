"""How lines and words look: strokes by mode and service, tints, type sizes.

The signs are the project's own. Dashes for limited service: common practice, no source.
"""

from __future__ import annotations

import math
from collections import Counter
from dataclasses import dataclass, replace
from typing import Literal

from gtfs_schematic.drawing.contrast import GRAPHIC_MINIMUM, contrast_ratio, mix
from gtfs_schematic.drawing.model import DrawingSettings, PathShape
from gtfs_schematic.drawing.paths import rounded_rectangle
from gtfs_schematic.network.model import Line, Network, ServicePattern

MM_PER_POINT = 25.4 / 72.0
LEADING = 1.3
"""Distance of baselines in the key and the notes, in type sizes."""
RAILS = ("metro", "rail", "monorail")
TRAMS = ("tram", "cable", "funicular", "aerial")
_WIDTH_STEPS = (1.0, 0.8, 0.62)
"""Width of the weightiest class of modes present, of the next, and of the third."""
_DASHES: dict[str, tuple[float, ...]] = {
    "all-day": (),
    "peak": (4.6, 0.9),
    "night": (3.2, 0.8, 0.8, 0.8),
    "some-days": (2.0, 0.9),
}
"""In line widths, with butt ends."""
_BEADS = (0.0, 1.5)
EDGE_MM = 0.2
_BODY_PT = 8.0
WALK_WIDTH_MM = 1.3


@dataclass(frozen=True, slots=True)
class LineStyle:
    """How one line is stroked; widths and dashes in units of the full line width."""

    color: str
    width: float
    dash: tuple[float, ...]
    beads: bool
    """Round beads on a thin string: a line on water."""
    under: str
    """Colour of the thin or pale stroke that holds dashes and beads together."""
    edge: str
    """Colour of a hairline on both sides where the line itself is too pale, "" for none."""


def line_styles(network: Network, settings: DrawingSettings) -> dict[str, LineStyle]:
    """Give the style of every line, by id."""
    present = sorted({weight(line.mode) for line in network.lines if line.mode != "ferry"})
    dashed = dashed_services(network)
    return {line.id: _style(line, present, dashed, settings) for line in network.lines}


def dashed_services(network: Network) -> frozenset[ServicePattern]:
    """Give the limited services that are drawn in dashes.

    What more than half of the lines have in common is no exception, and dashes all over a sheet
    would only be noise: such lines are drawn whole, and the key says of each when it runs.
    """
    counts = Counter(line.service for line in network.lines)
    return frozenset(
        service
        for service, count in counts.items()
        if service != "all-day" and 2 * count <= len(network.lines)
    )


def weight(mode: str) -> int:
    """Give the class of a mode: 0 railways, 1 trams and their like, 2 roads, 3 water."""
    if mode in RAILS:
        return 0
    if mode in TRAMS:
        return 1
    return 3 if mode == "ferry" else 2


def _style(
    line: Line,
    present: list[int],
    dashed: frozenset[ServicePattern],
    settings: DrawingSettings,
) -> LineStyle:
    ferry = line.mode == "ferry"
    dash = _DASHES[line.service] if line.service in dashed else ()
    return LineStyle(
        color=line.color,
        width=_WIDTH_STEPS[0 if ferry else present.index(weight(line.mode))],
        dash=_BEADS if ferry else dash,
        beads=ferry,
        under=line.color if ferry else mix(line.color, settings.background, 0.68),
        edge=_edge(line.color, settings),
    )


def _edge(color: str, settings: DrawingSettings) -> str:
    """Give the line's color, with as much ink as makes it show on the sheet; "" if it shows."""
    if contrast_ratio(color, settings.background) >= GRAPHIC_MINIMUM:
        return ""
    darker = (mix(color, settings.ink, tenths / 10.0) for tenths in range(1, 10))
    fitting = (c for c in darker if contrast_ratio(c, settings.background) >= GRAPHIC_MINIMUM)
    return next(fitting, settings.ink)


def service_style(sign: str, style: LineStyle) -> LineStyle:
    """Give a style with the dashes of the service pattern that a sign is named for."""
    return replace(style, dash=_DASHES[sign])


def under_strokes(d: str, style: LineStyle, full_mm: float) -> tuple[PathShape, ...]:
    """Give what lies below a line's own stroke: a hairline edge, and what holds dashes together."""
    wide = style.width * full_mm
    shapes = []
    if style.edge:
        edge = wide * (0.75 if style.beads else 1.0)
        cap: Literal["round", "butt"] = "round" if style.beads else "butt"
        dash = tuple(part * full_mm for part in style.dash) if style.beads else ()
        shapes.append(PathShape(d, stroke=style.edge, stroke_width=edge, cap=cap, dash=dash))
    if style.dash:
        thin = wide * 0.3 if style.beads else wide
        if style.edge and not style.beads:
            thin -= 2.0 * EDGE_MM
        shapes.append(PathShape(d, stroke=style.under, stroke_width=thin, cap="butt"))
    return tuple(shapes)


def line_stroke(d: str, style: LineStyle, full_mm: float) -> PathShape:
    """Give a line's own stroke along a path; `full_mm` is the full line width."""
    wide = style.width * full_mm * (0.75 if style.beads else 1.0)
    if style.edge:
        wide = max(wide - 2.0 * EDGE_MM, 0.5 * wide)
    return PathShape(
        d,
        stroke=style.color,
        stroke_width=wide,
        dash=tuple(part * full_mm for part in style.dash),
        cap="round" if style.beads else "butt",
    )


def badge_tile(box: tuple[float, float, float, float], style: LineStyle) -> PathShape:
    """Give the tile of a line's badge for a box (left, top, right, bottom), edged if it is pale."""
    return PathShape(
        rounded_rectangle(box, 0.28 * (box[3] - box[1])),
        fill=style.color,
        stroke=style.edge or None,
        stroke_width=EDGE_MM if style.edge else 0.0,
    )


def quiet(settings: DrawingSettings) -> str:
    """Give the colour of words and lines that should stand back; over 4.5:1 with the defaults."""
    return mix(settings.ink, settings.background, 0.3)


@dataclass(frozen=True, slots=True)
class TypeScale:
    """Type sizes of a sheet's furniture, millimetres: they grow more slowly than the sheet.

    The smallest is 8 pt on A4, the least for printed timetables in the UK's code (DPTAC).
    """

    title: float
    subtitle: float
    body: float
    scale: float
    """How much larger than on A4 the body is."""


def type_scale(width_mm: float, height_mm: float, body_pt: float = 8.0) -> TypeScale:
    """Give the type sizes for a page; A4 has a short side of 210 mm.

    `body_pt` is the body's size on A4; from 8 points on it grows with larger sheets, and one above
    is large enough until that growth reaches it.
    """
    share = min(width_mm, height_mm) / 210.0
    scale = max(1.0, math.sqrt(share))
    body = max(body_pt, min(body_pt, _BODY_PT) * scale)
    return TypeScale(
        title=max(14.0, 19.0 * share**0.75, 1.5 * body) * MM_PER_POINT,
        subtitle=1.125 * body * MM_PER_POINT,
        body=body * MM_PER_POINT,
        scale=scale,
    )
