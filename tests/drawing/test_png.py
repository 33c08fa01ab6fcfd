"""The PNG shows what the SVG says, by the judgement of another renderer."""

from __future__ import annotations

import io
from dataclasses import replace

import cairocffi
import cairosvg
import numpy as np
import pytest
from numpy.typing import NDArray

from gtfs_schematic.drawing.model import Drawing, Group, TextShape
from gtfs_schematic.drawing.png import to_png
from gtfs_schematic.drawing.svg import to_svg
from gtfs_schematic.errors import UsageError
from gtfs_schematic.labels import fonts


def pixels(data: bytes) -> NDArray[np.float64]:
    """Give the mean of the color channels, shape (height, width), 0 to 255."""
    surface = cairocffi.ImageSurface.create_from_png(io.BytesIO(data))
    flat = np.frombuffer(surface.get_data(), dtype=np.uint8)
    rows = flat.reshape(surface.get_height(), surface.get_stride())
    colors = rows[:, : 4 * surface.get_width()].reshape(len(rows), -1, 4)[..., :3]
    return np.asarray(colors.mean(axis=2), dtype=float)


def wordless(group: Group) -> Group:
    children = [
        wordless(child) if isinstance(child, Group) else child
        for child in group.children
        if not isinstance(child, TextShape)
    ]
    return replace(group, children=tuple(children))


def test_shapes_agree_with_another_reading_of_the_svg(drawing: Drawing):
    bare = replace(drawing, groups=tuple(map(wordless, drawing.groups)))
    ours = pixels(to_png(bare, dpi=96))
    theirs = pixels(cairosvg.svg2png(to_svg(bare), output_width=ours.shape[1]))
    height = min(len(ours), len(theirs))
    assert abs(len(ours) - len(theirs)) <= 1
    assert np.abs(ours[:height] - theirs[:height]).mean() < 1.0
    assert (ours < 200).mean() > 0.005


def test_the_typeface_is_really_used():
    """Ink ends where the typeface says that the text ends."""
    text, size = "Hamburgefonstiv", 20.0
    width = fonts.text_width_mm(text, size)
    run = TextShape(text, 10.0, 40.0, size, "#000000", width)
    drawing = Drawing(200.0, 60.0, "t", "d", "en", "#FFFFFF", (Group("words", (run,)),))
    columns = np.flatnonzero((pixels(to_png(drawing, dpi=254)) < 128).any(axis=0)) / 10.0
    assert columns.min() == pytest.approx(10.0, abs=0.12 * size)
    assert columns.max() == pytest.approx(10.0 + width, abs=0.05 * size)


def test_the_image_has_the_asked_for_resolution(drawing: Drawing):
    image = pixels(to_png(drawing, dpi=50.8))
    assert image.shape == (round(drawing.height_mm * 2), round(drawing.width_mm * 2))


@pytest.mark.parametrize("dpi", [0.0, -10.0, 100000.0])
def test_an_impossible_resolution_is_refused(drawing: Drawing, dpi: float):
    with pytest.raises(UsageError, match="pixels"):
        to_png(drawing, dpi=dpi)
