"""A drawing as one page of PDF: exact size, live text, embedded typeface, the same bytes always."""

from __future__ import annotations

import io
import re

import pikepdf

from gtfs_schematic.drawing.canvas import paint
from gtfs_schematic.drawing.model import Drawing
from gtfs_schematic.drawing.typeface import cairo

POINTS_PER_MM = 72.0 / 25.4
_PRODUCER = "gtfs-schematic"
_LIGATURES = {"FB00": "ff", "FB01": "fi", "FB02": "fl", "FB03": "ffi", "FB04": "ffl"}


def to_pdf(drawing: Drawing) -> bytes:
    """Give a drawing as a PDF file.

    The page is exactly the sheet, in points of 1/72 inch, and is its own trim box. Text is drawn
    glyph by glyph as HarfBuzz shaped it, with its characters kept, so it can be searched and
    copied. No date stands in the file, so that the same drawing gives the same bytes.

    Raises
    ------
    SchematicError
        If the system has no cairo library.
    """
    module = cairo()
    buffer = io.BytesIO()
    size = (drawing.width_mm * POINTS_PER_MM, drawing.height_mm * POINTS_PER_MM)
    surface = module.PDFSurface(buffer, *size)
    surface.restrict_to_version(module.PDF_VERSION_1_5)
    surface.set_metadata(module.PDF_METADATA_TITLE, drawing.title)
    surface.set_metadata(module.PDF_METADATA_CREATE_DATE, "2000-01-01T00:00:00Z")
    context = module.Context(surface)
    context.scale(POINTS_PER_MM, POINTS_PER_MM)
    paint(context, drawing, tagged=True)
    surface.finish()
    return _finished(buffer.getvalue(), drawing)


def _finished(data: bytes, drawing: Drawing) -> bytes:
    """Add what cairo does not write: language, boxes, XMP, plain letters for ligatures."""
    with pikepdf.open(io.BytesIO(data)) as pdf:
        page = pdf.pages[0]
        width, height = (
            round(length * POINTS_PER_MM, 4) for length in (drawing.width_mm, drawing.height_mm)
        )
        for box in ("MediaBox", "CropBox", "BleedBox", "TrimBox"):
            page[f"/{box}"] = pikepdf.Array([0, 0, width, height])
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
        out = io.BytesIO()
        pdf.save(out, deterministic_id=True, compress_streams=True)
    return out.getvalue()


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
