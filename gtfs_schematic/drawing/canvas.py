"""Painting a scene on a cairo surface: what the PDF and PNG exports share."""

from __future__ import annotations

import math
from typing import Any

from gtfs_schematic.drawing.model import Drawing, Group, PathShape, TextShape
from gtfs_schematic.drawing.paths import commands
from gtfs_schematic.drawing.typeface import cairo, font_face
from gtfs_schematic.labels import fonts

_TAGS = {
    "sheet-title": "H1",
    "key-heading": "H2",
    "sheet-subtitle": "P",
    "key-row": "P",
    "index-row": "P",
    "station": "P",
    "note": "P",
    "lines": "Figure",
}
"""Structure types of ISO 32000 for the groups that hold words, and for the diagram, by class."""


def paint(
    context: Any,  # noqa: ANN401 - untyped library
    drawing: Drawing,
    *,
    tagged: bool,
    bleed_mm: float = 0.0,
) -> None:
    """Paint a drawing on a context whose unit is the millimetre, y down.

    The background reaches `bleed_mm` beyond the sheet on all sides.

    `tagged` adds the structure that lets a reading aid find heading, key, stations and notes.
    """
    module = cairo()
    options = module.FontOptions()
    options.set_hint_style(module.HINT_STYLE_NONE)
    options.set_hint_metrics(module.HINT_METRICS_OFF)
    options.set_antialias(module.ANTIALIAS_GRAY)
    context.set_font_options(options)
    context.set_line_join(module.LINE_JOIN_ROUND)
    context.set_source_rgb(*_rgb(drawing.background))
    context.rectangle(
        -bleed_mm,
        -bleed_mm,
        drawing.width_mm + 2.0 * bleed_mm,
        drawing.height_mm + 2.0 * bleed_mm,
    )
    context.fill()
    if tagged:
        context.tag_begin("Document")
    for group in drawing.groups:
        _group(context, group, tagged=tagged)
    if tagged:
        context.tag_end("Document")


def _group(context: Any, group: Group, *, tagged: bool) -> None:  # noqa: ANN401
    tag = _TAGS.get(group.css_class) if tagged else None
    if tag:
        context.tag_begin(tag)
    for child in group.children:
        if isinstance(child, Group):
            _group(context, child, tagged=tagged and not tag)
        elif isinstance(child, PathShape):
            _path(context, child)
        else:
            _text(context, child)
    if tag:
        context.tag_end(tag)


def _path(context: Any, shape: PathShape) -> None:  # noqa: ANN401
    context.new_path()
    for letter, values in commands(shape.d):
        match letter:
            case "M":
                context.move_to(*values)
            case "L":
                context.line_to(*values)
            case "C":
                context.curve_to(*values)
            case _:
                context.close_path()
    if shape.fill is not None:
        context.set_source_rgb(*_rgb(shape.fill))
        context.fill_preserve()
    if shape.stroke is not None and shape.stroke_width > 0.0:
        module = cairo()
        context.set_source_rgb(*_rgb(shape.stroke))
        context.set_line_width(shape.stroke_width)
        context.set_line_cap(
            module.LINE_CAP_ROUND if shape.cap == "round" else module.LINE_CAP_BUTT
        )
        context.set_dash(list(shape.dash))
        context.stroke_preserve()
    context.new_path()


def _text(context: Any, shape: TextShape) -> None:  # noqa: ANN401
    context.save()
    if shape.angle_deg:
        context.translate(*shape.pivot)
        context.rotate(math.radians(shape.angle_deg))
        context.translate(-shape.pivot[0], -shape.pivot[1])
    context.set_font_size(shape.size)
    context.set_source_rgb(*_rgb(shape.fill))
    x = shape.x
    for run in fonts.shaped(shape.text, bold=shape.bold):
        glyphs = []
        for glyph in run.glyphs:
            at = (x + glyph.x_offset * shape.size, shape.y - glyph.y_offset * shape.size)
            glyphs.append((glyph.glyph_id, *at))
            x += glyph.x_advance * shape.size
        context.set_font_face(font_face(run.font, bold=shape.bold))
        backward = cairo().TEXT_CLUSTER_FLAG_BACKWARD if run.rtl else 0
        context.show_text_glyphs(run.text, glyphs, _clusters(run), backward)
    context.restore()


def _clusters(run: fonts.Shaped) -> list[tuple[int, int]]:
    """Give cairo's clusters in the order of the text: bytes of it, and glyphs that go with them."""
    starts = sorted({glyph.cluster for glyph in run.glyphs})
    counts = [sum(glyph.cluster == start for glyph in run.glyphs) for start in starts]
    ends = [*starts[1:], len(run.text)]
    return [
        (len(run.text[start:end].encode()), count)
        for start, end, count in zip(starts, ends, counts, strict=True)
    ]


def _rgb(color: str) -> tuple[float, float, float]:
    red, green, blue = (int(color[i : i + 2], 16) / 255.0 for i in (1, 3, 5))
    return red, green, blue
