"""The diagram's typeface, measured by shaping text with HarfBuzz.

Kerning and the standard ligatures are on, here as in the exports: PDF takes the glyphs of
`shaped`, and SVG asks for ``font-kerning: normal``, so that what is measured is what is drawn.
Scripts that the typeface lacks come from its sisters; `missing_characters` tells what none has.
"""

from __future__ import annotations

import atexit
import importlib.util
import itertools
import tempfile
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path
from typing import Any

import fontpkg_heebo
import fontpkg_noto_sans
import fontpkg_noto_sans_arabic
import fontpkg_noto_sans_khmer
import fontpkg_noto_sans_tamil
import fontpkg_noto_sans_telugu
import fontpkg_noto_sans_thai
import uharfbuzz as hb

from gtfs_schematic.labels.scripts import Run, runs_of, script_of

FAMILY = "Noto Sans"
"""The CSS family name."""
REGULAR_WEIGHT = 400.0
BOLD_WEIGHT = 700.0

_VARIABLE = (
    (FAMILY, fontpkg_noto_sans.ROOT / "files" / "NotoSans[wdth,wght].ttf"),
    ("Noto Sans Arabic", fontpkg_noto_sans_arabic.ROOT / "files" / "NotoSansArabic[wdth,wght].ttf"),
    ("Noto Sans Khmer", fontpkg_noto_sans_khmer.ROOT / "files" / "NotoSansKhmer[wdth,wght].ttf"),
    ("Noto Sans Tamil", fontpkg_noto_sans_tamil.ROOT / "files" / "NotoSansTamil[wdth,wght].ttf"),
    ("Noto Sans Telugu", fontpkg_noto_sans_telugu.ROOT / "files" / "NotoSansTelugu[wdth,wght].ttf"),
    ("Noto Sans Thai", fontpkg_noto_sans_thai.ROOT / "files" / "NotoSansThai[wdth,wght].ttf"),
    ("Heebo", fontpkg_heebo.ROOT / "files" / "Heebo[wght].ttf"),
)
"""The typeface, and its sisters in the order in which they are asked for what it lacks; each holds
all weights. Heebo is for Hebrew letters."""
_CJK = "Noto Sans CJK JP"
"""Han, Kana and Hangul: asked last, if the extra is installed, in a file per weight."""
_CJK_PACKAGES = ("noto_cjk_sans_jp_regular", "noto_cjk_sans_jp_bold")
_CJK_SCRIPTS = frozenset({"Hani", "Hira", "Kana", "Hang", "Bopo"})
FAMILIES = (*(family for family, _ in _VARIABLE), _CJK)
"""CSS family names; a font is known by its index here."""
_REGULAR_TO_BOLD = ("Regular".encode("utf-16-be"), "Bold".encode("utf-16-be"))


@dataclass(frozen=True, slots=True)
class Glyph:
    """One glyph of a shaped text; lengths in em, y up; `cluster` is an index into the text."""

    glyph_id: int
    x_advance: float
    x_offset: float
    y_offset: float
    cluster: int


@dataclass(frozen=True, slots=True)
class Shaped:
    """A run of a text in one font, its glyphs from left to right."""

    text: str
    font: int
    rtl: bool
    glyphs: tuple[Glyph, ...]
    """Their clusters are indexes into the run's own text."""


@dataclass(frozen=True, slots=True)
class Metrics:
    """Vertical measures of the typeface in em, all positive, from the baseline."""

    ascent: float
    descent: float
    cap_height: float
    x_height: float


@lru_cache(maxsize=2 * len(FAMILIES))
def font_data(*, bold: bool = False, font: int = 0) -> bytes:
    """Give the font file of one weight: as it is, or cut from the variable font in memory."""
    if font == len(_VARIABLE):
        return _cjk_files()[bold].read_bytes()
    face = hb.Face(hb.Blob.from_file_path(str(_VARIABLE[font][1])))
    wanted = hb.SubsetInput()
    wanted.keep_everything()
    weight = BOLD_WEIGHT if bold else REGULAR_WEIGHT
    for axis in face.axis_infos:
        value = weight if axis.tag == "wght" else axis.default_value
        wanted.pin_axis_location(face, axis.tag, value)
    data = bytes(hb.subset(face, wanted).blob.data)
    return _named_bold(data) if bold else data


@lru_cache(maxsize=1)
def _cjk_files() -> tuple[Path, ...]:
    """Give the files of Han, Kana and Hangul, regular and bold; none if they are not installed."""
    files: list[Path] = []
    for package in _CJK_PACKAGES:
        spec = importlib.util.find_spec(package)
        if spec is not None and spec.origin is not None:
            files += sorted(Path(spec.origin).parent.glob("*.otf"))[:1]
    return tuple(files) if len(files) == len(_CJK_PACKAGES) else ()


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


def font_path(*, bold: bool = False, font: int = 0) -> Path:
    """Give a file that holds `font_data`; it lives in a temporary folder until the program ends."""
    name = FAMILIES[font].replace(" ", "")
    path = Path(_folder().name) / f"{name}-{'Bold' if bold else 'Regular'}.ttf"
    if not path.exists():
        path.write_bytes(font_data(bold=bold, font=font))
    return path


@lru_cache(maxsize=2)
def metrics(*, bold: bool = False) -> Metrics:
    """Give the vertical measures of one weight."""
    font, em = _font(0, bold=bold), _em(0, bold=bold)
    extents = font.get_font_extents("ltr")
    return Metrics(
        ascent=extents.ascender / em,
        descent=-extents.descender / em,
        cap_height=font.get_metric_position_with_fallback(hb.OTMetricsTag.CAP_HEIGHT) / em,
        x_height=font.get_metric_position_with_fallback(hb.OTMetricsTag.X_HEIGHT) / em,
    )


@lru_cache(maxsize=65536)
def shaped(text: str, *, bold: bool = False) -> tuple[Shaped, ...]:
    """Shape a text into runs from left to right.

    Each run of one script is shaped on its own, since shaping rules belong to scripts.
    """
    found = []
    for run in runs_of(text):
        parts = [_glyphs(part, font, bold=bold) for font, part in _by_font(run, bold=bold)]
        found += parts[::-1] if run.rtl else parts
    return tuple(found)


def _by_font(run: Run, *, bold: bool) -> Iterator[tuple[int, Run]]:
    """Cut a run where another font must serve; marks and signs stay with what is before them."""
    fonts: list[int] = []
    for character in run.text:
        before = fonts[-1] if fonts else 0
        joins = not character.isalpha() and _has(before, character, bold=bold)
        fonts.append(before if joins else _font_for(character, bold=bold))
    start = 0
    for font, members in itertools.groupby(fonts):
        length = len(list(members))
        yield font, Run(run.start + start, run.text[start : start + length], run.rtl)
        start += length


def _font_for(character: str, *, bold: bool) -> int:
    """Give the first font that has a character, the typeface itself if none has."""
    return next((i for i in range(len(FAMILIES)) if _has(i, character, bold=bold)), 0)


@lru_cache(maxsize=65536)
def _has(font: int, character: str, *, bold: bool) -> bool:
    if font == len(_VARIABLE) and not _cjk_files():
        return False
    return bool(_font(font, bold=bold).get_nominal_glyph(ord(character)))


def _glyphs(run: Run, font: int, *, bold: bool) -> Shaped:
    em = _em(font, bold=bold)
    buffer = hb.Buffer()
    buffer.add_str(run.text)
    buffer.guess_segment_properties()
    buffer.direction = "rtl" if run.rtl else "ltr"
    hb.shape(_font(font, bold=bold), buffer, {"kern": True, "liga": True})
    glyphs = tuple(
        Glyph(
            glyph_id=info.codepoint,
            x_advance=position.x_advance / em,
            x_offset=position.x_offset / em,
            y_offset=position.y_offset / em,
            cluster=info.cluster,
        )
        for info, position in zip(buffer.glyph_infos, buffer.glyph_positions, strict=True)
    )
    return Shaped(run.text, font, run.rtl, glyphs)


def text_width_mm(text: str, size_mm: float, *, bold: bool = False) -> float:
    """Give the advance width of a shaped text in millimetres, `size_mm` being the em size."""
    return size_mm * sum(glyph.x_advance for run in shaped(text, bold=bold) for glyph in run.glyphs)


@lru_cache(maxsize=65536)
def ink_height(text: str, *, bold: bool = False) -> tuple[float, float]:
    """Give how far a text's ink reaches above and below the baseline, in em, at least 0."""
    top = bottom = 0.0
    for run in shaped(text, bold=bold):
        font, em = _font(run.font, bold=bold), _em(run.font, bold=bold)
        for glyph in run.glyphs:
            extents = font.get_glyph_extents(glyph.glyph_id)
            if extents is None or extents.height == 0:
                continue
            glyph_top = extents.y_bearing / em + glyph.y_offset
            top = max(top, glyph_top)
            bottom = max(bottom, -(glyph_top + extents.height / em))
    return top, bottom


def missing_characters(text: str, *, bold: bool = False) -> tuple[str, ...]:
    """Give the characters of a text that no font has, sorted, without repeats."""
    return tuple(
        sorted(
            character
            for character in set(text)
            if not character.isspace()
            and not any(_has(i, character, bold=bold) for i in range(len(FAMILIES)))
        )
    )


def advice_on(characters: Iterable[str]) -> str:
    """Say what to install for characters that no font has; "" if nothing is known to help."""
    wanted = any(script_of(character) in _CJK_SCRIPTS for character in characters)
    if wanted and not _cjk_files():
        return 'Han, Kana and Hangul need their fonts: pip install "gtfs-schematic[cjk]"'
    return ""


@lru_cache(maxsize=1)
def _folder() -> tempfile.TemporaryDirectory[str]:
    """Give the folder for font files, which is removed when the program ends."""
    folder = tempfile.TemporaryDirectory(prefix="gtfs-schematic-fonts-")
    atexit.register(folder.cleanup)
    return folder


@lru_cache(maxsize=2 * len(FAMILIES))
def _font(font: int, *, bold: bool) -> Any:  # noqa: ANN401 - the library ships no types
    """Give the shaper's font of one weight."""
    return hb.Font(hb.Face(font_data(bold=bold, font=font)))


@lru_cache(maxsize=2 * len(FAMILIES))
def _em(font: int, *, bold: bool) -> float:
    """Give the font units per em."""
    return float(_font(font, bold=bold).face.upem)
