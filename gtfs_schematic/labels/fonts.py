"""The diagram's typeface, measured by shaping text with HarfBuzz.

Kerning and the standard ligatures are on, here as in the exports: PDF takes the glyphs of
`shape`, and SVG asks for ``font-kerning: normal``, so that what is measured is what is drawn.
Right-to-left scripts are not in the typeface; `missing_characters` tells what is not.
"""

from __future__ import annotations

import atexit
import itertools
import tempfile
from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path
from typing import Any

import fontpkg_noto_sans
import uharfbuzz as hb

FAMILY = "Noto Sans"
"""The CSS family name."""
REGULAR_WEIGHT = 400.0
BOLD_WEIGHT = 700.0

_VARIABLE_FILE = fontpkg_noto_sans.ROOT / "files" / "NotoSans[wdth,wght].ttf"
_REGULAR_TO_BOLD = ("Regular".encode("utf-16-be"), "Bold".encode("utf-16-be"))
_NEUTRAL_SCRIPTS = frozenset({None, "Zyyy", "Zinh", "Zzzz"})


@dataclass(frozen=True, slots=True)
class Glyph:
    """One glyph of a shaped text; lengths in em, y up; `cluster` is an index into the text."""

    glyph_id: int
    x_advance: float
    x_offset: float
    y_offset: float
    cluster: int


@dataclass(frozen=True, slots=True)
class Metrics:
    """Vertical measures of the typeface in em, all positive, from the baseline."""

    ascent: float
    descent: float
    cap_height: float
    x_height: float


@lru_cache(maxsize=2)
def font_data(*, bold: bool = False) -> bytes:
    """Give the TrueType file of one weight, cut from the variable font in memory."""
    face = hb.Face(hb.Blob.from_file_path(str(_VARIABLE_FILE)))
    wanted = hb.SubsetInput()
    wanted.keep_everything()
    weight = BOLD_WEIGHT if bold else REGULAR_WEIGHT
    for axis in face.axis_infos:
        value = weight if axis.tag == "wght" else axis.default_value
        wanted.pin_axis_location(face, axis.tag, value)
    data = bytes(hb.subset(face, wanted).blob.data)
    return _named_bold(data) if bold else data


def _named_bold(data: bytes) -> bytes:
    """Say "Bold" where a font's names say "Regular": files that embed it take its name from there.

    Names are written over in place (OpenType specification, "name" and table directory).
    """
    font = bytearray(data)
    tables = {
        bytes(font[at : at + 4]): int.from_bytes(font[at + 8 : at + 12], "big")
        for at in range(12, 12 + 16 * int.from_bytes(font[4:6], "big"), 16)
    }
    table = tables[b"name"]
    count, storage = (int.from_bytes(font[table + i : table + i + 2], "big") for i in (2, 4))
    for record in range(table + 6, table + 6 + 12 * count, 12):
        length, offset = (int.from_bytes(font[record + i : record + i + 2], "big") for i in (8, 10))
        start = table + storage + offset
        renamed = data[start : start + length].replace(*_REGULAR_TO_BOLD)
        font[start : start + len(renamed)] = renamed
        font[record + 8 : record + 10] = len(renamed).to_bytes(2, "big")
    return bytes(font)


def font_path(*, bold: bool = False) -> Path:
    """Give a file that holds `font_data`; it lives in a temporary folder until the program ends."""
    path = Path(_folder().name) / f"NotoSans-{'Bold' if bold else 'Regular'}.ttf"
    if not path.exists():
        path.write_bytes(font_data(bold=bold))
    return path


@lru_cache(maxsize=2)
def metrics(*, bold: bool = False) -> Metrics:
    """Give the vertical measures of one weight."""
    font, em = _font(bold=bold), _em(bold=bold)
    extents = font.get_font_extents("ltr")
    return Metrics(
        ascent=extents.ascender / em,
        descent=-extents.descender / em,
        cap_height=font.get_metric_position_with_fallback(hb.OTMetricsTag.CAP_HEIGHT) / em,
        x_height=font.get_metric_position_with_fallback(hb.OTMetricsTag.X_HEIGHT) / em,
    )


@lru_cache(maxsize=65536)
def shape(text: str, *, bold: bool = False) -> tuple[Glyph, ...]:
    """Shape a text into glyphs from left to right.

    Each run of one script is shaped on its own, since shaping rules belong to scripts.
    """
    em = _em(bold=bold)
    glyphs: list[Glyph] = []
    for start, run in _script_runs(text):
        buffer = hb.Buffer()
        buffer.add_str(run)
        buffer.guess_segment_properties()
        hb.shape(_font(bold=bold), buffer, {"kern": True, "liga": True})
        glyphs += [
            Glyph(
                glyph_id=info.codepoint,
                x_advance=position.x_advance / em,
                x_offset=position.x_offset / em,
                y_offset=position.y_offset / em,
                cluster=start + info.cluster,
            )
            for info, position in zip(buffer.glyph_infos, buffer.glyph_positions, strict=True)
        ]
    return tuple(glyphs)


def text_width_mm(text: str, size_mm: float, *, bold: bool = False) -> float:
    """Give the advance width of a shaped text in millimetres, `size_mm` being the em size."""
    return size_mm * sum(glyph.x_advance for glyph in shape(text, bold=bold))


@lru_cache(maxsize=65536)
def ink_height(text: str, *, bold: bool = False) -> tuple[float, float]:
    """Give how far a text's ink reaches above and below the baseline, in em, at least 0."""
    font, em = _font(bold=bold), _em(bold=bold)
    top = bottom = 0.0
    for glyph in shape(text, bold=bold):
        extents = font.get_glyph_extents(glyph.glyph_id)
        if extents is None or extents.height == 0:
            continue
        glyph_top = extents.y_bearing / em + glyph.y_offset
        top = max(top, glyph_top)
        bottom = max(bottom, -(glyph_top + extents.height / em))
    return top, bottom


def missing_characters(text: str, *, bold: bool = False) -> tuple[str, ...]:
    """Give the characters of a text that the typeface lacks, sorted, without repeats."""
    font = _font(bold=bold)
    return tuple(
        sorted(
            character
            for character in set(text)
            if not character.isspace() and not font.get_nominal_glyph(ord(character))
        )
    )


@lru_cache(maxsize=1)
def _folder() -> tempfile.TemporaryDirectory[str]:
    """Give the folder for font files, which is removed when the program ends."""
    folder = tempfile.TemporaryDirectory(prefix="gtfs-schematic-fonts-")
    atexit.register(folder.cleanup)
    return folder


@lru_cache(maxsize=2)
def _font(*, bold: bool) -> Any:  # noqa: ANN401 - the library ships no types
    """Give the shaper's font of one weight."""
    return hb.Font(hb.Face(font_data(bold=bold)))


@lru_cache(maxsize=2)
def _em(*, bold: bool) -> float:
    """Give the font units per em."""
    return float(_font(bold=bold).face.upem)


@lru_cache(maxsize=4096)
def _script(character: str) -> str | None:
    """Give the script of a character as the shaper knows it, None if it serves any script."""
    buffer = hb.Buffer()
    buffer.add_str(character)
    buffer.guess_segment_properties()
    return None if buffer.script in _NEUTRAL_SCRIPTS else buffer.script


def _script_runs(text: str) -> Iterator[tuple[int, str]]:
    """Give (start, run) of the runs of one script; neutral characters join the run before."""
    scripts: list[str | None] = []
    current: str | None = next((s for s in map(_script, text) if s is not None), None)
    for character in text:
        current = _script(character) or current
        scripts.append(current)
    start = 0
    for _, members in itertools.groupby(scripts):
        length = len(list(members))
        yield start, text[start : start + length]
        start += length
