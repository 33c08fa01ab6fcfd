"""The SVG looks in a real browser as the PDF does: Debian's Chromium, without a network."""

from __future__ import annotations

import io
import os
import shutil
from dataclasses import replace
from pathlib import Path
from xml.etree import ElementTree as ET

import cairocffi
import drawn_networks
import drawn_sheets
import numpy as np
import pypdfium2
import pytest
from playwright.sync_api import sync_playwright

from gtfs_schematic.drawing.compose import compose
from gtfs_schematic.drawing.model import Drawing
from gtfs_schematic.drawing.pdf import to_pdf
from gtfs_schematic.drawing.svg import to_svg
from gtfs_schematic.labels import fonts

PIXELS_PER_MM = 96.0 / 25.4
"""A CSS pixel is 1/96 inch."""
NS = "{http://www.w3.org/2000/svg}"


@pytest.fixture(scope="module")
def drawing() -> Drawing:
    layout = drawn_networks.ribbon()
    stations = layout.network.stations
    names = (
        "محطة الرملة",
        "สถานีกลาง",
        "هلال 12 Port",
        "நகரம்",
        "Gare هلال",
        "תל אביב",
        "大崎 서울역",
    )
    renamed = (replace(s, name=name) for s, name in zip(stations, names, strict=False))
    network = replace(layout.network, stations=(*renamed, *stations[len(names) :]))
    layout = drawn_sheets.on_page(replace(layout, network=network), "A4")
    return compose(
        drawn_sheets.naive_labels(drawn_sheets.naive_bundle(layout)), drawn_sheets.SETTINGS
    )


@pytest.fixture(scope="module")
def page(drawing: Drawing, tmp_path_factory):
    """Open the SVG in a page that has the typeface; skip without Chromium, but not in CI."""
    program = shutil.which("chromium")
    if program is None:
        reason = "no chromium on this machine (Debian and Ubuntu: apt install chromium)"
        if os.environ.get("CI"):
            pytest.fail(reason)
        pytest.skip(reason)
    folder = tmp_path_factory.mktemp("page")
    faces = "".join(
        f"@font-face {{ font-family: '{family}'; font-weight: {weight}; "
        f"src: url('{fonts.font_path(bold=bold, font=i).as_uri()}'); }}"
        for i, family in enumerate(fonts.FAMILIES)
        for weight, bold in ((400, False), (700, True))
    )
    svg = to_svg(drawing).decode().split("?>", 1)[1]
    file: Path = folder / "page.html"
    file.write_text(
        f"<!DOCTYPE html><meta charset=utf-8><style>{faces} * {{ margin: 0 }} "
        f"svg {{ display: block }}</style>{svg}",
        "utf-8",
    )
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(
            executable_path=program,
            args=["--no-sandbox", "--allow-file-access-from-files", "--force-color-profile=srgb"],
        )
        context = browser.new_context(
            offline=True,
            device_scale_factor=2,
            viewport={
                "width": round(drawing.width_mm * PIXELS_PER_MM),
                "height": round(drawing.height_mm * PIXELS_PER_MM),
            },
        )
        opened = context.new_page()
        opened.goto(file.as_uri())
        opened.evaluate("document.fonts.ready")
        yield opened
        browser.close()


def blurred(image: np.ndarray, side: int = 6) -> np.ndarray:
    """Give the mean of squares of pixels, so that hinting and antialiasing do not count."""
    height, width = (length // side * side for length in image.shape[:2])
    squares = image[:height, :width].reshape(height // side, side, width // side, side, 3)
    return squares.mean(axis=(1, 3))


def test_the_screenshot_is_the_print(page, drawing: Drawing):
    surface = cairocffi.ImageSurface.create_from_png(io.BytesIO(page.screenshot()))
    size = (surface.get_height(), surface.get_stride() // 4, 4)
    shot = np.frombuffer(surface.get_data(), dtype=np.uint8).reshape(size)
    shot = shot[:, : surface.get_width(), 2::-1].astype(float)
    scale = 2.0 * 96.0 / 72.0  # two pixels to the CSS pixel; a point is 1/72 inch
    with pypdfium2.PdfDocument(to_pdf(drawing)) as document:
        printed = document[0].render(scale=scale, rev_byteorder=True).to_numpy()[..., :3]
        printed = printed.astype(float)
    height, width = np.minimum(shot.shape[:2], printed.shape[:2])
    one, other = blurred(shot[:height, :width]), blurred(printed[:height, :width])
    difference = np.abs(one - other).max(axis=2)
    assert difference.mean() < 0.8
    assert (difference > 48.0).mean() < 0.002
    # The bound means something: the sheet moved by one millimetre breaks it.
    moved = np.roll(one, round(PIXELS_PER_MM * 2 / 6), axis=1)
    assert np.abs(moved - other).max(axis=2).mean() > 1.6


def test_every_text_is_as_wide_in_the_browser_as_measured(page, drawing: Drawing):
    widths = page.evaluate(
        """() => [...document.querySelectorAll('text')].map(text => {
            text.removeAttribute('textLength');
            return [text.textContent, text.getComputedTextLength()];
        })"""
    )
    root = ET.fromstring(to_svg(drawing))
    measured = [(text.text, float(text.get("textLength", "0"))) for text in root.iter(f"{NS}text")]
    assert [text for text, _ in widths] == [text for text, _ in measured]
    for (text, drawn), (_, wanted) in zip(widths, measured, strict=True):
        assert drawn == pytest.approx(wanted, rel=0.01, abs=0.02), text


def test_every_line_and_station_can_be_hovered(page, drawing: Drawing):
    for kind in ("line", "station"):
        titles = page.evaluate(
            f"() => [...document.querySelectorAll('g.{kind} > title')].map(t => t.textContent)"
        )
        assert titles
        assert all(titles)
