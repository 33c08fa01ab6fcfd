"""The printed change sheet shows both diagrams: clippings are just what the diagrams have there."""

from __future__ import annotations

import io
from pathlib import Path

import numpy as np
import pypdfium2
import pytest
from pypdf import PdfReader

from gtfs_schematic import pipeline
from gtfs_schematic.adjusting import adjust_edition, files_of_redrawn
from gtfs_schematic.comparison import Issue, compare, files_of_comparison
from gtfs_schematic.edition.adjustments import adjustments_of
from gtfs_schematic.edition.change_list import to_pdf
from gtfs_schematic.edition.change_pictures import Sheets
from gtfs_schematic.edition.change_plates import Plate, plates
from gtfs_schematic.edition.changes import ChangeSheet
from gtfs_schematic.edition.roster import roster_of_edition
from gtfs_schematic.edition.state import from_json

QUICK = pipeline.Settings.model_validate(
    {"layout": {"effort": "quick"}, "sheet": {"bleed_mm": 3.0}}
)
AREA = (18.0, 18.0, 174.0, 257.4)
"""A4 within its margins, millimetres."""


@pytest.fixture(scope="module")
def compared() -> tuple[ChangeSheet, Sheets, bytes]:
    drawn = pipeline.draw(Path(__file__).parents[2] / "data" / "before.zip", QUICK)
    said = adjustments_of(
        {"stations": {"183": {"name": "Elsewhere"}}, "lines": {"rx": {"hide": True}}}, "test"
    )
    redrawn = adjust_edition(drawn.edition, from_json(drawn.state, drawn.edition), said)
    old, new = pipeline.files_of(drawn), files_of_redrawn(redrawn)
    issues = [
        Issue(name, roster_of_edition(edition), edition, files["diagram.svg"], files["diagram.pdf"])
        for name, edition, files in (
            ("old", drawn.edition, old),
            ("new", redrawn.edition, new),
        )
    ]
    sheet = compare(issues[0], issues[1])
    sheets = Sheets(
        drawn.edition, old["diagram.svg"], redrawn.edition, new["diagram.svg"],
        old["diagram.pdf"], new["diagram.pdf"],
    )  # fmt: skip
    return sheet, sheets, files_of_comparison(sheet, issues[0], issues[1])["changes.pdf"]


def picture(data: bytes, page: int, scale: float) -> np.ndarray:
    rendered = pypdfium2.PdfDocument(data)[page].render(scale=scale)
    return rendered.to_numpy()[..., :3].astype(float)


def cut(
    image: np.ndarray, box: tuple[float, ...], per_mm: float, offset: float = 0.0
) -> np.ndarray:
    left, top, width, height = (round(v * per_mm) for v in box)
    shift = round(offset * per_mm)
    return image[top + shift : top + shift + height, left + shift : left + shift + width]


def pages_of(compared: tuple[ChangeSheet, Sheets, bytes]) -> list[Plate]:
    sheet, sheets, _ = compared
    return plates(sheet, sheets, AREA)


def test_each_clipping_is_what_the_diagram_has_there(compared):
    _, sheets, printed = compared
    found = pages_of(compared)
    first = len(PdfReader(io.BytesIO(printed)).pages) - len(found)
    seen = 0
    for number, plate in enumerate(found, start=first):
        for clip in plate.clips:
            scale = 4.0
            here = cut(picture(printed, number, scale), clip.at, scale * 72 / 25.4)
            there_scale = scale * clip.at[2] / clip.box[2]
            source = sheets.after_pdf if clip.after else sheets.before_pdf
            trim = PdfReader(io.BytesIO(source)).pages[0].trimbox
            around = float(trim[0]) * 25.4 / 72
            image = picture(source, 0, there_scale)
            there = cut(image, clip.box, there_scale * 72 / 25.4, around)
            height, width = (
                min(a, b) for a, b in zip(here.shape[:2], there.shape[:2], strict=True)
            )
            inside = np.s_[6 : height - 6, 6 : width - 6]
            away = np.abs(here[:height, :width] - there[:height, :width])[inside].mean(axis=2)
            # Rings and the hair's breadth of another rasterisation differ; but a little aside
            # nearly everything that is not white would.
            aside = np.abs(here[:height, 12:width] - there[:height, : width - 12]).mean(axis=2)
            assert (away > 60).mean() < 0.5 * (aside > 60).mean()
            assert (away > 60).mean() < 0.12
            assert (here.std(axis=(0, 1)) > 5).all()
            seen += 1
    assert seen >= 2
    assert seen % 2 == 0


def test_the_pages_say_what_is_to_be_seen_and_nothing_overlaps(compared):
    sheet, _, printed = compared
    text = "".join(page.extract_text() for page in PdfReader(io.BytesIO(printed)).pages)
    assert "Both editions over each other" in text
    assert "Elsewhere" in text
    assert any(change.kind == "gone" for change in sheet.changes)
    for plate in pages_of(compared):
        boxes = [clip.at for clip in plate.clips]
        for x, y, w, h in boxes:
            assert AREA[0] - 0.01 <= x <= x + w <= AREA[0] + AREA[2] + 0.01
            assert AREA[1] <= y <= y + h <= AREA[1] + AREA[3]
        for i, a in enumerate(boxes):
            for b in boxes[i + 1 :]:
                apart = (a[0] + a[2] <= b[0] or b[0] + b[2] <= a[0]) or (
                    a[1] + a[3] <= b[1] or b[1] + b[3] <= a[1]
                )
                assert apart


def test_the_same_bytes_always_and_none_without_diagrams(compared):
    sheet, sheets, printed = compared
    assert to_pdf(sheet, sheets) == printed
    plain = to_pdf(sheet)
    assert len(PdfReader(io.BytesIO(plain)).pages) < len(PdfReader(io.BytesIO(printed)).pages)
