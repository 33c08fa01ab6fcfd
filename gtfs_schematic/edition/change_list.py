"""The change sheet as a PDF list for sign-off: A4 pages of live text, the same bytes always."""

from __future__ import annotations

import io
from collections.abc import Iterator, Sequence

import pikepdf

from gtfs_schematic.drawing.canvas import paint
from gtfs_schematic.drawing.model import Drawing, Group, PathShape, TextShape
from gtfs_schematic.drawing.pdf import POINTS_PER_MM
from gtfs_schematic.drawing.typeface import cairo
from gtfs_schematic.drawing.words import run, wrap
from gtfs_schematic.edition.change_pictures import Sheets
from gtfs_schematic.edition.change_plates import placed, plates
from gtfs_schematic.edition.change_words import (
    CAUTION,
    HEADINGS,
    SIGN_OFF,
    conclusion,
    doubts_heading,
    period,
    sentence,
    stayed,
    summary,
)
from gtfs_schematic.edition.changes import ChangeSheet

_WIDTH, _HEIGHT, _MARGIN = 210.0, 297.0, 18.0
"""ISO 216 A4, millimetres."""
_BODY, _HEADING, _TITLE = 3.2, 4.2, 5.6
"""Type sizes, millimetres; 3.2 mm are 9 points."""
_LEADING = 1.4
_INDENT = 6.0
_INK, _PAPER = "#1B1F24", "#FFFFFF"


def to_pdf(sheet: ChangeSheet, sheets: Sheets | None = None) -> bytes:
    """Write the list, and pages of pictures behind it.

    Parameters
    ----------
    sheet
        What differs.
    sheets
        Both editions with their diagrams as PDF; None where feeds alone are compared.

    Raises
    ------
    SchematicError
        If the system has no cairo library.
    """
    module = cairo()
    buffer = io.BytesIO()
    title = f"Changes: {sheet.after.title}"
    surface = module.PDFSurface(buffer, _WIDTH * POINTS_PER_MM, _HEIGHT * POINTS_PER_MM)
    surface.restrict_to_version(module.PDF_VERSION_1_5)
    surface.set_metadata(module.PDF_METADATA_CREATE_DATE, "2000-01-01T00:00:00Z")
    area = (_MARGIN, _MARGIN, _WIDTH - 2.0 * _MARGIN, _HEIGHT - 2.2 * _MARGIN)
    pictures = []
    if sheets is not None and sheets.before_pdf and sheets.after_pdf:
        pictures = plates(sheet, sheets, area)
    lists = _pages(sheet)
    groups = [*lists, *(plate.shapes for plate in pictures)]
    for page in _numbered(groups, title):
        context = module.Context(surface)
        context.scale(POINTS_PER_MM, POINTS_PER_MM)
        paint(context, page, tagged=False)
        surface.show_page()
    surface.finish()
    with pikepdf.open(io.BytesIO(buffer.getvalue())) as pdf:
        if sheets is not None and pictures:
            placed(pdf, len(lists), pictures, sheets)
        pdf.Root.Lang = pikepdf.String("en")
        for key in ("/CreationDate", "/ModDate", "/Creator"):
            if key in pdf.docinfo:
                del pdf.docinfo[key]
        pdf.docinfo["/Producer"] = pikepdf.String("gtfs-schematic")
        pdf.docinfo["/Title"] = pikepdf.String(title)
        out = io.BytesIO()
        pdf.save(out, deterministic_id=True, compress_streams=True)
    return out.getvalue()


Shapes = tuple[TextShape | PathShape, ...]
Row = tuple[str, float, bool, bool]
"""Text, size in millimetres, whether bold, and whether a box to tick stands before it."""


def _rows(sheet: ChangeSheet) -> Iterator[Row]:
    yield f"Changes: {sheet.after.title}", _TITLE, True, False
    yield f"Before: {sheet.before.title}, {period(sheet.before)}", _BODY, False, False
    yield f"After: {sheet.after.title}, {period(sheet.after)}", _BODY, False, False
    yield summary(sheet), _BODY, False, False
    for subject, heading in HEADINGS.items():
        rows = [change for change in sheet.large if change.subject == subject]
        if rows:
            yield heading, _HEADING, True, False
        yield from ((sentence(change), _BODY, False, True) for change in rows)
    yield conclusion(sheet), _BODY, True, False
    if sheet.stability:
        yield stayed(sheet.stability), _BODY, False, False
    if sheet.doubtful:
        yield doubts_heading(sheet), _HEADING, True, False
        yield from ((doubt, _BODY, False, True) for doubt in sheet.doubtful)
    if sheet.small:
        yield "Below the limits", _HEADING, True, False
        yield from ((sentence(change), _BODY, False, False) for change in sheet.small)
    yield "Sign-off", _HEADING, True, False
    for role in SIGN_OFF:
        yield f"{role}:  name {'_' * 34}  date {'_' * 16}", _BODY, False, True
    yield CAUTION, _BODY, False, False


def _pages(sheet: ChangeSheet) -> list[Shapes]:
    """Set the rows from top to bottom; a row that does not fit begins the next page."""
    pages: list[list[TextShape | PathShape]] = [[]]
    y = _MARGIN
    for text, size, bold, tick in _rows(sheet):
        left = _MARGIN + _INDENT * tick
        lines = wrap(text, _WIDTH - _MARGIN - left, size, bold=bold) or ("",)
        above = size * (1.2 if size > _BODY else 0.35)
        height = above + len(lines) * size * _LEADING
        if y + height > _HEIGHT - _MARGIN and pages[-1]:
            pages.append([])
            y = _MARGIN
        y += above
        if tick:
            pages[-1].append(_box(y + 0.15 * size, size))
        for line in lines:
            y += size * _LEADING
            pages[-1].append(run(line, (left, y - 0.35 * size), size, _INK, bold=bold))
    return [tuple(page) for page in pages]


def _numbered(pages: Sequence[Shapes], title: str) -> list[Drawing]:
    """Give the pages as drawings, with their numbers."""
    return [
        Drawing(
            _WIDTH, _HEIGHT, title, "", "en", _PAPER,
            (Group("page", (*shapes, _number(i + 1, len(pages)))),),
        )
        for i, shapes in enumerate(pages)
    ]  # fmt: skip


def _box(top: float, size: float) -> PathShape:
    side = 0.9 * size
    x, y = _MARGIN, top
    d = f"M{x:g} {y:.3f}L{x + side:g} {y:.3f}L{x + side:g} {y + side:.3f}L{x:g} {y + side:.3f}Z"
    return PathShape(d=d, fill=None, stroke=_INK, stroke_width=0.25)


def _number(page: int, whole: int) -> TextShape:
    return run(f"{page} / {whole}", (_MARGIN, _HEIGHT - 0.5 * _MARGIN), 2.6, _INK)
