"""A drawing as SVG: millimetres, live text, hooks for the web, the same bytes always."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator
from xml.sax.saxutils import escape, quoteattr

from gtfs_schematic.drawing.model import Drawing, Group, PathShape, TextShape
from gtfs_schematic.drawing.paths import number
from gtfs_schematic.labels import fonts
from gtfs_schematic.labels.scripts import is_rtl

_NOT_XML = re.compile("[^\t\n\r\x20-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")
"""Characters that XML 1.0 forbids even when escaped."""
_STEERS = re.compile("[\u061c\u200e\u200f\u202a-\u202e\u2066-\u2069]")
"""Marks that turn the direction of text (Unicode Standard Annex 9): in a name they do harm only."""


def to_svg(drawing: Drawing) -> bytes:
    """Give a drawing as a stand-alone SVG file in UTF-8; user units are millimetres.

    Every run of text has its own ``<text>`` with a computed start, so that no viewer's idea of
    anchoring matters, and its measured ``textLength``, so that it keeps its place where another
    typeface stands in.
    """
    width, height = number(drawing.width_mm), number(drawing.height_mm)
    root = _attributes(
        [
            ("xmlns", "http://www.w3.org/2000/svg"),
            ("width", f"{width}mm"),
            ("height", f"{height}mm"),
            ("viewBox", f"0 0 {width} {height}"),
            ("role", "img"),
            ("aria-labelledby", "diagram-title diagram-desc"),
            ("lang", drawing.lang),
            ("xml:lang", drawing.lang),
            ("font-family", ", ".join([*(f"'{name}'" for name in fonts.FAMILIES), "sans-serif"])),
            ("stroke-linejoin", "round"),
            ("style", "font-kerning: normal"),
        ]
    )
    lines = [
        '<?xml version="1.0" encoding="UTF-8"?>',
        f"<svg{root}>",
        f'<title id="diagram-title">{_text(drawing.title)}</title>',
        f'<desc id="diagram-desc">{_text(drawing.description)}</desc>',
        f'<rect class="background" width="{width}" height="{height}" fill="{drawing.background}"/>',
    ]
    for group in drawing.groups:
        lines += _group(group)
    return ("\n".join([*lines, "</svg>"]) + "\n").encode()


def _group(group: Group) -> Iterator[str]:
    data = [(f"data-{key}", group.data[key]) for key in sorted(group.data)]
    yield f"<g{_attributes([('class', group.css_class), *data])}>"
    if group.title:
        yield f"<title>{_text(group.title)}</title>"
    for child in group.children:
        if isinstance(child, Group):
            yield from _group(child)
        elif isinstance(child, PathShape):
            yield _path(child)
        else:
            yield _run(child)
    yield "</g>"


def _path(shape: PathShape) -> str:
    attributes = [("d", shape.d), ("fill", shape.fill or "none")]
    if shape.stroke is not None and shape.stroke_width > 0.0:
        attributes += [("stroke", shape.stroke), ("stroke-width", number(shape.stroke_width))]
        if shape.cap != "butt":
            attributes.append(("stroke-linecap", shape.cap))
        if shape.dash:
            attributes.append(("stroke-dasharray", " ".join(map(number, shape.dash))))
    return f"<path{_attributes(attributes)}/>"


def _run(shape: TextShape) -> str:
    attributes = [("class", shape.css_class)] if shape.css_class else []
    attributes += [
        ("x", number(shape.x)),
        ("y", number(shape.y)),
        ("font-size", number(shape.size)),
        ("fill", shape.fill),
    ]
    if shape.bold:
        attributes.append(("font-weight", "700"))
    if shape.width > 0.0:
        attributes += [
            ("textLength", number(shape.width)),
            ("lengthAdjust", "spacingAndGlyphs"),
        ]
    if is_rtl(shape.text):  # its end is on the left, where x is
        attributes += [("direction", "rtl"), ("text-anchor", "end")]
    if shape.angle_deg:
        turn = (shape.angle_deg, *shape.pivot)
        attributes.append(("transform", f"rotate({' '.join(map(number, turn))})"))
    if shape.lang:
        attributes += [("lang", shape.lang), ("xml:lang", shape.lang)]
    return f"<text{_attributes(attributes)}>{_text(shape.text)}</text>"


def _attributes(pairs: Iterable[tuple[str, str]]) -> str:
    return "".join(f" {name}={quoteattr(_clean(value))}" for name, value in pairs)


def _text(text: str) -> str:
    return escape(_clean(text))


def _clean(text: str) -> str:
    return _NOT_XML.sub("\ufffd", _STEERS.sub("", text))
