"""A drawing as pixels, painted by the same hand as the PDF."""

from __future__ import annotations

import io

from gtfs_schematic.drawing.canvas import paint
from gtfs_schematic.drawing.model import Drawing
from gtfs_schematic.drawing.typeface import cairo
from gtfs_schematic.errors import UsageError

_MOST_PIXELS = 30000
"""Cairo's image surfaces end at 32767 pixels a side."""


def to_png(drawing: Drawing, *, dpi: float) -> bytes:
    """Give a drawing as a PNG image of `dpi` pixels to the inch.

    Raises
    ------
    UsageError
        If the image would have no pixel, or more than an image can hold.
    SchematicError
        If the system has no cairo library.
    """
    scale = dpi / 25.4
    width, height = round(drawing.width_mm * scale), round(drawing.height_mm * scale)
    if not 1 <= min(width, height) <= max(width, height) <= _MOST_PIXELS:
        raise UsageError(
            f"{dpi:g} dpi make an image of {width} by {height} pixels: give a resolution that "
            f"makes from 1 to {_MOST_PIXELS} a side."
        )
    module = cairo()
    surface = module.ImageSurface(module.FORMAT_RGB24, width, height)
    context = module.Context(surface)
    context.scale(width / drawing.width_mm, height / drawing.height_mm)
    paint(context, drawing, tagged=False)
    surface.flush()
    out = io.BytesIO()
    surface.write_to_png(out)
    return out.getvalue()
