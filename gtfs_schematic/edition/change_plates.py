"""Pages of pictures for the printed change sheet: both diagrams over each other, and clippings."""

from __future__ import annotations

import io
from collections.abc import Sequence
from dataclasses import dataclass

import pikepdf

from gtfs_schematic.drawing.model import PathShape, TextShape
from gtfs_schematic.drawing.paths import circle, polyline
from gtfs_schematic.drawing.pdf import POINTS_PER_MM
from gtfs_schematic.drawing.words import run, wrap
from gtfs_schematic.edition.change_pictures import (
    NEW,
    OLD,
    Box,
    Sheets,
    box_of,
    grouped,
    links_of_edition,
)
from gtfs_schematic.edition.change_words import sentence
from gtfs_schematic.edition.changes import ChangeSheet
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.geometry import Point

_BODY, _HEADING, _LEADING = 3.2, 4.2, 1.4
_INK, _BOTH = "#1B1F24", "#9AA0A6"
_RING, _GREY = "0.816 0 0.435", "0.6 0.627 0.651"
"""Colors as the operators of a PDF have them."""
_KAPPA = 0.5523
"""Length of the handles by which four cubic curves draw a circle of radius 1."""
_GAP = 6.0
MOST_PLACES = 14
"""A change at more stations than this has no clipping of its own: the overlay shows it."""


@dataclass(frozen=True, slots=True)
class Clip:
    """A part of a diagram on a page, all in millimetres with y down."""

    after: bool
    """Whether of the later diagram."""
    box: Box
    """What of the sheet: left, top, width, height."""
    at: Box
    """Where on the page, in the same proportion."""
    rings: tuple[Point, ...] = ()
    """Middles of the rings on the page."""


@dataclass(frozen=True, slots=True)
class Plate:
    """A page of pictures."""

    shapes: tuple[PathShape | TextShape, ...]
    clips: tuple[Clip, ...] = ()


def plates(sheet: ChangeSheet, sheets: Sheets, area: Box) -> list[Plate]:
    """Give the pages: first the overlay, then the clippings, before on the left.

    Parameters
    ----------
    sheet
        What differs.
    sheets
        Both editions.
    area
        The part of a page that may be filled.
    """
    texts = {sentence(change): change.places for change in sheet.large}
    pages = [_overlay(sheets, area)]
    left, top, width, height = area
    y, shapes, clips = top, list[PathShape | TextShape](), list[Clip]()
    for things, places in grouped(texts, MOST_PLACES):
        box = box_of(sheets, places)
        if box is None:
            continue
        rows = [row for thing in things for row in wrap(f"• {thing}", width, _BODY)]
        wide = (width - _GAP) / 2.0
        high = min(wide * box[3] / box[2], height - (len(rows) + 2) * _BODY * _LEADING)
        needed = (len(rows) + 1.5) * _BODY * _LEADING + high + _GAP
        if y + needed > top + height and (shapes or clips):
            pages.append(Plate(tuple(shapes), tuple(clips)))
            y, shapes, clips = top, [], []
        for row in (*rows, ""):
            y += _BODY * _LEADING
            if row:
                shapes.append(run(row, (left, y), _BODY, _INK))
        for i, caption in enumerate(("Before", "After")):
            at = (left + i * (wide + _GAP), y, high * box[2] / box[3], high)
            shapes.append(run(caption, (at[0], y - 0.8), _BODY, _INK, bold=True))
            edition = (sheets.before, sheets.after)[i]
            clips.append(Clip(i == 1, box, at, _rings(edition, places, box, at)))
        y += high + _GAP
    return [*pages, Plate(tuple(shapes), tuple(clips))] if shapes else pages


def placed(pdf: pikepdf.Pdf, first: int, pages: Sequence[Plate], sheets: Sheets) -> None:
    """Put the clippings onto pages of a PDF, from page `first` on."""
    sources = [pikepdf.open(io.BytesIO(data)) for data in (sheets.before_pdf, sheets.after_pdf)]
    forms = [pdf.copy_foreign(source.pages[0].as_form_xobject()) for source in sources]
    trims = [[float(v) for v in source.pages[0].trimbox] for source in sources]
    for number, plate in enumerate(pages, start=first):
        page = pdf.pages[number]
        content = []
        for k, clip in enumerate(plate.clips):
            form, trim = forms[clip.after], trims[clip.after]
            name = page.add_resource(form, pikepdf.Name.XObject, pikepdf.Name(f"/Clip{k}"))
            content.append(_drawn(clip, trim, float(page.mediabox[3]), str(name)))
        if content:
            # What the page draws by itself leaves its own frame of coordinates behind.
            page.contents_add(b"q", prepend=True)
            page.contents_add("\n".join(["Q", *content]).encode())


def _drawn(clip: Clip, trim: Sequence[float], page_height: float, name: str) -> str:
    """Write the operators that draw a clipping (PDF points, y up)."""
    p = POINTS_PER_MM
    x, y, width, height = (value * p for value in clip.at)
    scale = clip.at[2] / clip.box[2]
    bottom = page_height - y - height
    dx = x - scale * (trim[0] + clip.box[0] * p)
    dy = bottom - scale * (trim[3] - (clip.box[1] + clip.box[3]) * p)
    box = f"{x:.3f} {bottom:.3f} {width:.3f} {height:.3f} re"
    radius = max(2.8, 0.022 * clip.box[2]) * scale * p
    rings = "".join(_circle(ring[0] * p, page_height - ring[1] * p, radius) for ring in clip.rings)
    return (
        f"q {box} W n {scale:.6f} 0 0 {scale:.6f} {dx:.3f} {dy:.3f} cm {name} Do Q "
        f"q {_GREY} RG 0.6 w {box} S {box} W n {_RING} RG 1.1 w {rings}Q"
    )


def _circle(x: float, y: float, radius: float) -> str:
    """Write a circle of four curves (PDF operators)."""
    k = _KAPPA * radius
    curves = "".join(
        f"{x + a * radius + b * k:.3f} {y + b * radius - a * k:.3f} "
        f"{x + a * k + b * radius:.3f} {y + b * k - a * radius:.3f} "
        f"{x + b * radius:.3f} {y - a * radius:.3f} c "
        for a, b in ((1, 0), (0, -1), (-1, 0), (0, 1))
    )
    return f"{x + radius:.3f} {y:.3f} m {curves}S "


def _frame(at: Box) -> PathShape:
    x, y, w, h = at
    corners = ((x, y), (x + w, y), (x + w, y + h), (x, y + h))
    return PathShape(polyline(corners, closed=True), stroke=_BOTH, stroke_width=0.2)


def _rings(edition: Edition, places: Sequence[str], box: Box, at: Box) -> tuple[Point, ...]:
    here = [(s.x_mm, s.y_mm) for s in edition.stations if s.id in places]
    return tuple(_there(point, box, at) for point in here)


def _there(point: Point, box: Box, at: Box) -> Point:
    scale = at[2] / box[2]
    return at[0] + (point[0] - box[0]) * scale, at[1] + (point[1] - box[1]) * scale


def _overlay(sheets: Sheets, area: Box) -> Plate:
    """Draw the links and stations of both over each other, in what is old, new, and the same."""
    before, after = sheets.before, sheets.after
    whole = (
        0.0,
        0.0,
        max(before.width_mm, after.width_mm),
        max(before.height_mm, after.height_mm),
    )
    left, top, width, height = area
    head = 3.0 * _HEADING
    scale = min(width / whole[2], (height - head) / whole[3])
    at = (left, top + head, whole[2] * scale, whole[3] * scale)
    shapes: list[PathShape | TextShape] = [
        run("Both editions over each other", (left, top + _HEADING), _HEADING, _INK, bold=True)
    ]
    x = left
    for color, text in ((OLD, "only before"), (NEW, "only after"), (_BOTH, "in both")):
        y = top + 2.2 * _HEADING
        shapes.append(PathShape(polyline(((x, y - 1.0), (x + 5.0, y - 1.0))), color, 1.0))
        word = run(text, (x + 6.0, y), _BODY, _INK)
        shapes.append(word)
        x += 6.0 + word.width + _GAP
    old, new = links_of_edition(before), links_of_edition(after)
    both = [path for path in old if path in new]
    layers = (
        (_BOTH, both),
        (OLD, [path for path in old if path not in new]),
        (NEW, [path for path in new if path not in old]),
    )
    for color, paths in layers:
        for path in paths:
            d = polyline([_there(point, whole, at) for point in path])
            shapes.append(PathShape(d, color, max(0.3, 1.2 * scale)))
    marks = [{s.id: (s.x_mm, s.y_mm) for s in edition.stations} for edition in (before, after)]
    for i, color in ((0, OLD), (1, NEW)):
        for key, point in sorted(marks[i].items()):
            if marks[1 - i].get(key) != point:
                ring = circle(_there(point, whole, at), max(0.6, 1.6 * scale))
                shapes.append(PathShape(ring, color, 0.3, fill="#FFFFFF"))
    shapes.append(_frame(at))
    return Plate(tuple(shapes))
