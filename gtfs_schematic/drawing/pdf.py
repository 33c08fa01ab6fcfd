"""A drawing as one page of PDF: exact size, live text, embedded typeface, the same bytes always."""

from __future__ import annotations

import io
import re
from typing import Any

import pikepdf

from gtfs_schematic.drawing.canvas import paint
from gtfs_schematic.drawing.model import Drawing
from gtfs_schematic.drawing.typeface import cairo

POINTS_PER_MM = 72.0 / 25.4
_PRODUCER = "gtfs-schematic"
_MARKS_MM = 5.0
"""Length of crop marks; they begin where the bleed ends."""
_LIGATURES = {"FB00": "ff", "FB01": "fi", "FB02": "fl", "FB03": "ffi", "FB04": "ffl"}


def to_pdf(drawing: Drawing, *, bleed_mm: float = 0.0) -> bytes:
    """Give a drawing as a PDF file.

    The page is exactly the sheet, in points of 1/72 inch, and is its own trim box. With a bleed
    the page is larger by it and by room for crop marks, and the trim box is the sheet. Text is
    drawn glyph by glyph as HarfBuzz shaped it, with its characters kept, so it can be searched and
    copied. No date stands in the file, so that the same drawing gives the same bytes.

    Raises
    ------
    SchematicError
        If the system has no cairo library.
    """
    module = cairo()
    buffer = io.BytesIO()
    around = bleed_mm + _MARKS_MM if bleed_mm else 0.0
    size = [(side + 2.0 * around) * POINTS_PER_MM for side in (drawing.width_mm, drawing.height_mm)]
    surface = module.PDFSurface(buffer, *size)
    surface.restrict_to_version(module.PDF_VERSION_1_5)
    surface.set_metadata(module.PDF_METADATA_TITLE, drawing.title)
    surface.set_metadata(module.PDF_METADATA_CREATE_DATE, "2000-01-01T00:00:00Z")
    context = module.Context(surface)
    context.scale(POINTS_PER_MM, POINTS_PER_MM)
    context.translate(around, around)
    paint(context, drawing, tagged=True, bleed_mm=bleed_mm)
    if bleed_mm:
        _crop_marks(context, drawing, bleed_mm)
    surface.finish()
    return _finished(buffer.getvalue(), drawing, bleed_mm)


def _crop_marks(context: Any, drawing: Drawing, bleed_mm: float) -> None:  # noqa: ANN401 - untyped library
    """Mark at each corner where to cut, outside of the bleed, in black hairlines."""
    context.set_source_rgb(0.0, 0.0, 0.0)
    context.set_line_width(0.25 / POINTS_PER_MM)
    context.set_dash([])
    end = bleed_mm + _MARKS_MM
    for x, out_x in ((0.0, -1.0), (drawing.width_mm, 1.0)):
        for y, out_y in ((0.0, -1.0), (drawing.height_mm, 1.0)):
            context.move_to(x + out_x * bleed_mm, y)
            context.line_to(x + out_x * end, y)
            context.move_to(x, y + out_y * bleed_mm)
            context.line_to(x, y + out_y * end)
    context.stroke()


def _finished(data: bytes, drawing: Drawing, bleed_mm: float) -> bytes:
    """Add what cairo does not write: language, boxes, XMP, text for ligatures and the diagram."""
    with pikepdf.open(io.BytesIO(data)) as pdf:
        page = pdf.pages[0]
        for box, beyond in _boxes(bleed_mm).items():
            page[box] = pikepdf.Array(_corners(drawing, bleed_mm, beyond))
        pdf.Root.Lang = pikepdf.String(drawing.lang)
        pdf.Root.MarkInfo = pikepdf.Dictionary(Marked=True)
        pdf.Root.ViewerPreferences = pikepdf.Dictionary(DisplayDocTitle=True)
        for key in ("/CreationDate", "/ModDate", "/Creator"):
            if key in pdf.docinfo:
                del pdf.docinfo[key]
        pdf.docinfo["/Producer"] = pikepdf.String(_PRODUCER)
        with pdf.open_metadata(set_pikepdf_as_editor=False, update_docinfo=False) as metadata:
            metadata["dc:title"] = drawing.title
            metadata["dc:description"] = drawing.description
            metadata["dc:language"] = [drawing.lang]
            metadata["pdf:Producer"] = _PRODUCER
        _spell_ligatures(pdf)
        for item in pdf.objects:
            if isinstance(item, pikepdf.Dictionary) and item.get("/S") == "/Figure":
                item.Alt = pikepdf.String(drawing.description)
        out = io.BytesIO()
        pdf.save(out, deterministic_id=True, compress_streams=True)
    return out.getvalue()


def _boxes(bleed_mm: float) -> dict[str, float]:
    """Give how far each of the page's boxes reaches beyond the sheet (ISO 32000-1, 14.11.2)."""
    around = bleed_mm + _MARKS_MM if bleed_mm else 0.0
    return {"/MediaBox": around, "/CropBox": around, "/BleedBox": bleed_mm, "/TrimBox": 0.0}


def _corners(drawing: Drawing, bleed_mm: float, beyond: float) -> list[float]:
    """Give a box in points from the page's lower left corner: left, bottom, right, top."""
    start = (bleed_mm + _MARKS_MM if bleed_mm else 0.0) - beyond
    ends = [start + side + 2.0 * beyond for side in (drawing.width_mm, drawing.height_mm)]
    return [round(length * POINTS_PER_MM, 4) for length in (start, start, *ends)]


def _spell_ligatures(pdf: pikepdf.Pdf) -> None:
    """Let a ligature's glyph stand for its letters, as a reader would type them in a search."""
    for item in pdf.objects:
        if not isinstance(item, pikepdf.Dictionary) or "/ToUnicode" not in item:
            continue
        table = item.ToUnicode.read_bytes().decode("ascii")
        spelled = re.sub(
            r"(?<=> <)(FB0[0-4])(?=>)",
            lambda found: _LIGATURES[found[1].upper()].encode("utf-16-be").hex(),
            table,
            flags=re.IGNORECASE,
        )
        if spelled != table:
            item.ToUnicode.write(spelled.encode("ascii"))
