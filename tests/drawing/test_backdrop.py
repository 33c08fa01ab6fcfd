"""What lies beneath the network is painted first, in its own colours, and says what it is."""

from __future__ import annotations

import io
import xml.etree.ElementTree as ET

import cairocffi
import drawn_networks
import drawn_sheets
import numpy as np
import pytest
import shapely

from gtfs_schematic.background.model import Background, BackgroundSettings, Shape
from gtfs_schematic.bundles.model import Corner
from gtfs_schematic.drawing.check import faults
from gtfs_schematic.drawing.compose import compose
from gtfs_schematic.drawing.contrast import contrast_ratio
from gtfs_schematic.drawing.model import DrawingSettings
from gtfs_schematic.drawing.png import to_png
from gtfs_schematic.drawing.svg import to_svg
from gtfs_schematic.labels.model import LabelledLayout

SETTINGS = DrawingSettings(water="#0000FF", park="#00FF00", boundary="#FF00FF")
NOWHERE = shapely.Polygon()


def ring(x: float, y: float, side: float, *, back: bool = False) -> tuple[Corner, ...]:
    points = [(x, y), (x + side, y), (x + side, y + side), (x, y + side)]
    return tuple(Corner(point, 2.0) for point in (points[::-1] if back else points))


@pytest.fixture(scope="module")
def labelled() -> LabelledLayout:
    layout = drawn_sheets.on_page(drawn_networks.star(), "A4")
    return drawn_sheets.naive_labels(drawn_sheets.naive_bundle(layout))


@pytest.fixture(scope="module")
def background(labelled: LabelledLayout) -> Background:
    frame = labelled.bundled.layout.sheet
    x, y = frame.left_mm, frame.top_mm
    lake = Shape(
        "water",
        "Deep & <wide>",
        (ring(x, y, 20.0), ring(x + 5.0, y + 5.0, 10.0, back=True)),
        surface=True,
        on_ground=NOWHERE,
    )
    park = Shape("park", "", (ring(x + 25.0, y, 10.0),), surface=True, on_ground=NOWHERE)
    river = tuple(Corner(point, 0.0) for point in ((x + 5.0, y + 30.0), (x + 20.0, y + 30.0)))
    line = tuple(Corner(point, 0.0) for point in ((x, y + 34.0), (x + 20.0, y + 34.0)))
    return Background(
        BackgroundSettings(river_width_mm=4.0),
        (
            park,
            lake,
            Shape("water", "Stream", (river,), surface=False, on_ground=NOWHERE),
            Shape("boundary", "Town", (line,), surface=False, on_ground=NOWHERE),
        ),
    )


def test_it_lies_beneath_everything_but_the_paper(labelled, background):
    drawing = compose(labelled, SETTINGS, background)
    kinds = [group.css_class for group in drawing.groups]
    assert kinds.index("background") < min(map(kinds.index, ("walks", "lines", "stations")))
    assert "background" not in {g.css_class for g in compose(labelled, SETTINGS).groups}
    assert faults(drawing, labelled.bundled.layout.network) == ()


def test_every_shape_has_a_title_and_names_are_inert(labelled, background):
    root = ET.fromstring(to_svg(compose(labelled, SETTINGS, background)))
    space = {"s": "http://www.w3.org/2000/svg"}
    group = root.find(".//s:g[@class='background']", space)
    titles = [each.findtext("s:title", namespaces=space) for each in group.findall("s:g", space)]
    assert titles == ["Park", "Deep & <wide>", "Stream", "Town"]
    widths = [path.get("stroke-width") for path in group.iter("{http://www.w3.org/2000/svg}path")]
    assert widths[2] == "4"


def test_holes_are_left_out_of_the_picture(labelled, background):
    """Read from the pixels of the picture: the lake is blue, its island white."""
    frame = labelled.bundled.layout.sheet
    image = to_png(compose(labelled, SETTINGS, background), dpi=254.0)  # ten pixels to the mm
    surface = cairocffi.ImageSurface.create_from_png(io.BytesIO(image))
    pixels = np.frombuffer(surface.get_data(), np.uint8).reshape(surface.get_height(), -1, 4)

    def at(dx: float, dy: float) -> tuple[int, ...]:
        row, column = round((frame.top_mm + dy) * 10.0), round((frame.left_mm + dx) * 10.0)
        return tuple(int(v) for v in pixels[row, column, 2::-1])

    assert at(2.5, 10.0) == (0, 0, 255)
    assert at(10.0, 10.0) == (255, 255, 255)
    assert at(30.0, 5.0) == (0, 255, 0)
    assert at(10.0, 31.5) == (0, 0, 255)
    # A river that ends inside the frame ends round.
    assert at(21.5, 30.0) == (0, 0, 255)


@pytest.mark.parametrize("paper", ["#FFFFFF", "#14181D"])
def test_water_and_parks_stand_back(paper):
    """Names stay readable on them: over 7:1 for the ink of either sheet, WCAG 2.2's best level."""
    dark = DrawingSettings(
        background=paper, ink="#F1F3F5", water="#1C3040", park="#1D2F22", boundary="#66707A"
    )
    settings = DrawingSettings() if paper == "#FFFFFF" else dark
    for color in (settings.water, settings.park):
        assert contrast_ratio(settings.ink, color) > 7.0
        assert contrast_ratio(color, settings.background) < 1.5
