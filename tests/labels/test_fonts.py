"""The typeface is measured as fontTools reads it, and as HarfBuzz shapes it."""

from __future__ import annotations

import io

import pytest
from fontTools.pens.boundsPen import BoundsPen
from fontTools.ttLib import TTFont
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.labels import fonts

WEIGHTS = pytest.mark.parametrize("bold", [False, True])
NO_PAIRS = "Hornlinde"
"""A word without a kerned pair or ligature in this typeface."""


def open_font(*, bold: bool) -> TTFont:
    return TTFont(io.BytesIO(fonts.font_data(bold=bold)))


def glyphs(text: str) -> list[fonts.Glyph]:
    """Give all glyphs of a text from left to right."""
    return [glyph for run in fonts.shaped(text) for glyph in run.glyphs]


def unkerned_advance(text: str, *, bold: bool) -> float:
    """Sum the advances of the horizontal metrics table, in em: no kerning, no ligatures."""
    font = open_font(bold=bold)
    characters, widths = font.getBestCmap(), font["hmtx"].metrics
    return sum(widths[characters[ord(c)]][0] for c in text) / font["head"].unitsPerEm


@WEIGHTS
def test_width_without_kerned_pairs_is_the_sum_of_the_metrics_table(bold: bool):  # noqa: FBT001
    expected = 10.0 * unkerned_advance(NO_PAIRS, bold=bold)
    assert fonts.text_width_mm(NO_PAIRS, 10.0, bold=bold) == pytest.approx(expected, abs=1e-9)


@WEIGHTS
def test_kerning_draws_pairs_together(bold: bool):  # noqa: FBT001
    assert fonts.text_width_mm("AVATAR", 1.0, bold=bold) < unkerned_advance("AVATAR", bold=bold)


def test_bold_is_a_weight_of_its_own():
    assert unkerned_advance(NO_PAIRS, bold=True) > 1.03 * unkerned_advance(NO_PAIRS, bold=False)
    for bold in (False, True):
        assert "fvar" not in open_font(bold=bold)


@WEIGHTS
def test_metrics_agree_with_the_font_tables(bold: bool):  # noqa: FBT001
    font = open_font(bold=bold)
    em = font["head"].unitsPerEm
    measured = fonts.metrics(bold=bold)
    assert measured.ascent * em == pytest.approx(font["hhea"].ascent)
    assert measured.descent * em == pytest.approx(-font["hhea"].descent)
    assert measured.cap_height * em == pytest.approx(font["OS/2"].sCapHeight)
    assert measured.x_height * em == pytest.approx(font["OS/2"].sxHeight)


@pytest.mark.parametrize("character", ["H", "g", "Å", "ж", "-"])
def test_ink_agrees_with_the_outlines(character: str):
    font = open_font(bold=False)
    glyphs, em = font.getGlyphSet(), font["head"].unitsPerEm
    pen = BoundsPen(glyphs)
    glyphs[font.getBestCmap()[ord(character)]].draw(pen)
    _, low, _, high = pen.bounds
    top, bottom = fonts.ink_height(character)
    assert top * em == pytest.approx(max(high, 0.0), abs=1.0)
    assert bottom * em == pytest.approx(max(-low, 0.0), abs=1.0)


def test_names_beyond_latin_are_covered_and_others_reported():
    for name in (
        "Żółta Góra",
        "Άγιος Ελευθέριος",
        "Щёлково",
        "हिन्दी",
        "محطة الرملة",
        "สถานีกลาง",
        "நகரம்",
        "תל אביב–השלום ת״א",
        "東京駅",
        "みなとみらい",
        "서울역",
        "臺北車站",
    ):
        assert fonts.missing_characters(name) == ()
        assert all(glyph.glyph_id != 0 for glyph in glyphs(name))
    assert fonts.missing_characters("አዲ Port አ") == ("አ", "ዲ")
    assert glyphs("አ")[0].glyph_id == 0
    assert fonts.advice_on("አ") == ""


def test_without_the_extra_it_is_said_what_to_install(monkeypatch):
    """As on a machine where the large fonts are not installed."""
    forget = (fonts._has, fonts.shaped, fonts._cjk_files)
    monkeypatch.setattr(fonts, "_CJK_PACKAGES", ("no_such_fonts",))
    for each in forget:
        each.cache_clear()
    try:
        assert fonts.missing_characters("東 Port 京東") == ("京", "東")
        assert glyphs("東")[0].glyph_id == 0
        for text in ("東", "ひ", "カ", "역"):
            assert "[cjk]" in fonts.advice_on(text)
        assert fonts.advice_on("ж") == ""
    finally:
        monkeypatch.undo()
        for each in forget:
            each.cache_clear()


@WEIGHTS
@pytest.mark.parametrize("name", ["東京駅", "みなとみらい", "서울역", "תל אביב"])
def test_other_letters_are_as_wide_as_their_fonts_tables_say(name: str, bold: bool):  # noqa: FBT001
    """A second reading of the same files: fontTools' metrics table, no kerning in these names."""
    (run,) = fonts.shaped(name, bold=bold)
    font = TTFont(io.BytesIO(fonts.font_data(bold=bold, font=run.font)))
    characters, widths = font.getBestCmap(), font["hmtx"].metrics
    expected = sum(widths[characters[ord(c)]][0] for c in name) / font["head"].unitsPerEm
    assert fonts.text_width_mm(name, 10.0, bold=bold) == pytest.approx(10.0 * expected, rel=0.02)


def test_hebrew_runs_from_the_right():
    (run,) = fonts.shaped("תל אביב")
    assert run.rtl
    assert [glyph.cluster for glyph in run.glyphs] == list(range(6, -1, -1))


def test_devanagari_is_shaped_also_after_latin():
    alone = [glyph.glyph_id for glyph in glyphs("हिन्दी")]
    mixed = [glyph.glyph_id for glyph in glyphs("Hin हिन्दी")]
    assert len(alone) < len("हिन्दी")  # half forms join
    assert mixed[-len(alone) :] == alone


@given(st.text(st.sampled_from("AVTofi żЯ-'1بجไทยக"), max_size=12))
def test_clusters_cover_the_text_in_order(text: str):
    runs = fonts.shaped(text)
    assert sorted("".join(run.text for run in runs)) == sorted(text)
    for run in runs:
        clusters = [glyph.cluster for glyph in run.glyphs]
        assert clusters == sorted(clusters, reverse=run.rtl)
        assert min(clusters) == 0
        assert set(clusters) <= set(range(len(run.text)))


def test_arabic_letters_join_and_run_from_the_right():
    (run,) = fonts.shaped("بحر")
    assert run.rtl
    assert fonts.FAMILIES[run.font] == "Noto Sans Arabic"
    apart = [fonts.shaped(letter)[0].glyphs[0].glyph_id for letter in "بحر"]
    assert [glyph.glyph_id for glyph in run.glyphs][::-1] != apart  # initial, medial, final forms


def test_a_mark_stays_with_its_letter():
    for text in ("ก่อน", "محمّد"):
        assert len({run.font for run in fonts.shaped(text)}) == 1
    (thai,) = fonts.shaped("ก่")
    assert [glyph.cluster for glyph in thai.glyphs] == [0, 0]


def test_font_file_holds_the_measured_font():
    for bold in (False, True):
        assert fonts.font_path(bold=bold).read_bytes() == fonts.font_data(bold=bold)
