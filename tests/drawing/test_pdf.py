"""The PDF, read back with pypdf: exact page, searchable names, embedded typeface, no surprises."""

from __future__ import annotations

import io
import re
from collections.abc import Iterator
from typing import Any

import pypdf
import pytest

from gtfs_schematic.drawing.model import SHEET_SIZES, Drawing, Group, TextShape
from gtfs_schematic.drawing.pdf import to_pdf
from gtfs_schematic.labels import fonts
from gtfs_schematic.labels.model import LabelledLayout


@pytest.fixture(scope="session")
def reader(drawing: Drawing) -> pypdf.PdfReader:
    """Give the PDF of each hand-made network, read by another library."""
    return pypdf.PdfReader(io.BytesIO(to_pdf(drawing)))


def embedded_fonts(page: Any) -> list[Any]:  # noqa: ANN401 - pypdf's objects
    found = []
    for reference in page["/Resources"]["/Font"].values():
        font = reference.get_object()
        holder = font["/DescendantFonts"][0].get_object() if "/DescendantFonts" in font else font
        found.append((font["/BaseFont"], holder["/FontDescriptor"].get_object()))
    return found


def dense(text: str) -> str:
    return re.sub(r"\s+", "", text)


def test_the_page_is_a3_to_the_point_in_every_box(reader: pypdf.PdfReader):
    (page,) = reader.pages
    # A point is 1/72 inch, an inch 25.4 mm by definition.
    expected = sorted(side / 25.4 * 72.0 for side in SHEET_SIZES["A3"])
    for box in (page.mediabox, page.trimbox, page.bleedbox, page.cropbox):
        assert sorted((float(box.width), float(box.height))) == pytest.approx(expected, abs=0.001)


def test_every_station_name_can_be_found(reader: pypdf.PdfReader, labelled: LabelledLayout):
    text = dense(reader.pages[0].extract_text())
    for station in labelled.bundled.layout.network.stations:
        assert dense(station.name) in text


def test_title_dates_and_cautions_can_be_found(reader: pypdf.PdfReader):
    text = dense(reader.pages[0].extract_text())
    for words in (
        "Verkehrsbund Wiesmarn-Mitte",
        "2026-03-01/2026-06-30",
        "not to scale",
        "frei nutzbar",
    ):
        assert dense(words) in text


def test_every_font_is_an_embedded_subset_of_the_typeface(reader: pypdf.PdfReader):
    embedded = embedded_fonts(reader.pages[0])
    assert embedded
    for name, descriptor in embedded:
        assert re.fullmatch(r"/[A-Z]{6}\+NotoSans.*", name)
        assert "/FontFile2" in descriptor or "/FontFile3" in descriptor
        assert descriptor["/FontFamily"] == fonts.FAMILY


def test_language_title_and_structure_are_stated(reader: pypdf.PdfReader, drawing: Drawing):
    catalog = reader.trailer["/Root"]
    assert catalog["/Lang"] == "en"
    assert catalog["/MarkInfo"]["/Marked"]
    assert catalog["/ViewerPreferences"]["/DisplayDocTitle"]
    assert reader.metadata is not None
    assert reader.metadata.title == drawing.title
    assert reader.metadata.creation_date is None
    assert reader.xmp_metadata is not None
    assert reader.xmp_metadata.dc_title["x-default"] == drawing.title


def test_the_structure_begins_with_the_title(reader: pypdf.PdfReader):
    catalog = reader.trailer["/Root"]
    document = catalog["/StructTreeRoot"]["/K"][0].get_object()
    kinds = [child.get_object()["/S"] for child in document["/K"]]
    assert document["/S"] == "/Document"
    assert kinds[0] == "/H1"
    assert set(kinds) <= {"/H1", "/H2", "/P", "/Figure"}


def test_the_same_drawing_gives_the_same_bytes(drawing: Drawing):
    assert to_pdf(drawing) == to_pdf(drawing)


def small(*texts: str) -> Drawing:
    """Give a sheet with a few words."""
    runs = tuple(
        TextShape(text, 10.0, 20.0 + 10.0 * i, 5.0, "#000000", 0.0) for i, text in enumerate(texts)
    )
    return Drawing(148.0, 105.0, "Words", "Words", "en", "#FFFFFF", (Group("words", runs),))


@pytest.mark.parametrize(
    "text",
    [
        "Affenfels",
        "Schifflände",
        "Fluß am Hof",
        "Ελληνικό",
        "Жуковка",
        "Ōsaki Nguyễn",
        "大崎",
        "みなとみらい",
        "서울역",
    ],
)
def test_ligatures_and_other_alphabets_read_back_letter_by_letter(text: str):
    page = pypdf.PdfReader(io.BytesIO(to_pdf(small(text)))).pages[0]
    assert page.extract_text().strip() == text


def test_text_stands_where_it_should():
    places: list[tuple[float, float]] = []

    def visit(text: str, matrix: Any, text_matrix: Any, *_: Any) -> None:  # noqa: ANN401
        if text.strip():
            x = text_matrix[4] * matrix[0] + text_matrix[5] * matrix[2] + matrix[4]
            y = text_matrix[4] * matrix[1] + text_matrix[5] * matrix[3] + matrix[5]
            places.append((x / 72.0 * 25.4, 105.0 - y / 72.0 * 25.4))

    pypdf.PdfReader(io.BytesIO(to_pdf(small("Eins", "Zwei")))).pages[0].extract_text(
        visitor_text=visit
    )
    assert [p == pytest.approx((10.0, y), abs=0.01) for p, y in zip(places, (20, 30), strict=True)]
    assert places[0] == pytest.approx((10.0, 20.0), abs=0.01)
    assert places[1] == pytest.approx((10.0, 30.0), abs=0.01)


def test_the_diagram_has_its_alternative_text(reader: pypdf.PdfReader, drawing: Drawing):
    def elements(item: Any) -> Iterator[Any]:  # noqa: ANN401 - pypdf's objects
        item = item.get_object()
        if isinstance(item, pypdf.generic.DictionaryObject):
            yield item
            kids = item.get("/K")
            kids = kids if isinstance(kids, list) else [kids] if kids is not None else []
            for kid in kids:
                yield from elements(kid)

    root = reader.trailer["/Root"]["/StructTreeRoot"]
    figures = [item for item in elements(root) if item.get("/S") == "/Figure"]
    assert [figure["/Alt"] for figure in figures] == [drawing.description]


def test_both_weights_go_by_their_names(reader: pypdf.PdfReader):
    names = {name.split("+")[1] for name, _ in embedded_fonts(reader.pages[0])}
    assert names == {"NotoSans-Regular", "NotoSans-Bold"}


def test_a_bleed_enlarges_the_page_round_the_sheet(drawing: Drawing):
    page = pypdf.PdfReader(io.BytesIO(to_pdf(drawing, bleed_mm=3.0))).pages[0]
    point = 72.0 / 25.4
    trim, bleed, media = page.trimbox, page.bleedbox, page.mediabox
    assert float(trim.width) == pytest.approx(drawing.width_mm * point, abs=0.01)
    assert float(trim.height) == pytest.approx(drawing.height_mm * point, abs=0.01)
    for near, far in (("left", "right"), ("bottom", "top")):
        for inner, outer, least in ((trim, bleed, 3.0), (bleed, media, 4.0)):
            assert float(getattr(inner, near)) - float(getattr(outer, near)) >= least * point - 0.01
            assert float(getattr(outer, far)) - float(getattr(inner, far)) >= least * point - 0.01


def test_crop_marks_are_drawn_outside_of_the_bleed_only(drawing: Drawing):
    reader = pypdf.PdfReader(io.BytesIO(to_pdf(drawing, bleed_mm=3.0)))
    page = reader.pages[0]
    content = pypdf.generic.ContentStream(page.get_contents(), reader).operations
    last = max(i for i, (_, operator) in enumerate(content) if operator == b"S")
    marks = []
    while content[last - 1][1] in (b"m", b"l"):
        last -= 1
        marks.append(tuple(map(float, content[last][0])))
    assert len(marks) == 16  # two hairlines at each corner, each from here to there
    # Cairo's unit is the point with y down from the upper edge of the page.
    bleed, height = page.bleedbox, float(page.mediabox.height)
    for x, y in marks:
        level = height - y
        inside = bleed.left + 0.01 < x < bleed.right - 0.01
        assert not (inside and bleed.bottom + 0.01 < level < bleed.top - 0.01)
