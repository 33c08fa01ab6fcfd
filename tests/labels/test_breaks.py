"""Names break where a reader expects it, into rows of even width."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.labels.breaks import break_name, most_rows
from gtfs_schematic.labels.fonts import text_width_mm


@pytest.mark.parametrize(
    ("name", "rows"),
    [
        ("Moorende Gewerbepark", ("Moorende", "Gewerbepark")),
        ("Universität und Botanischer Garten", ("Universität", "und Botanischer Garten")),
        ("Kirchgrund (Unterdorf)", ("Kirchgrund", "(Unterdorf)")),
        ("Obertor/Mühlgasse", ("Obertor/", "Mühlgasse")),
        ("Hohenau-Siedlung", ("Hohenau-", "Siedlung")),
        ("Quellgasse - Ostseite", ("Quellgasse -", "Ostseite")),
        ("Άγιος Ελευθέριος", ("Άγιος", "Ελευθέριος")),
    ],
)
def test_breaks_at_spaces_hyphens_slashes_and_before_brackets(name: str, rows: tuple[str, ...]):
    assert break_name(name, 2) == rows


@pytest.mark.parametrize("name", ["Furt", "Alt\N{NO-BREAK SPACE}Hohenau", "Am Gehölz", "Seestraße"])
def test_some_names_do_not_break(name: str):
    assert break_name(name, 1) == (name,)
    assert break_name(name, 2) is None


def test_no_row_ends_with_a_short_word_that_belongs_to_the_next():
    broken = break_name("Haus der Gärtner an der Lohe", 2)
    assert broken is not None
    assert broken[0].rsplit(" ", maxsplit=1)[-1] not in {"der", "an"}


WORDS = st.lists(
    st.text(st.sampled_from("abcdeÄß"), min_size=1, max_size=9), min_size=1, max_size=6
)


@given(WORDS, st.integers(1, 4))
def test_rows_hold_the_name_and_nothing_else(words: list[str], rows: int):
    broken = break_name(" ".join(words), rows)
    if broken is not None:
        assert len(broken) == rows <= most_rows(" ".join(words))
        assert " ".join(broken) == " ".join(words)


@given(st.lists(st.text("ABCDEFG", min_size=4, max_size=9), min_size=2, max_size=5))
def test_long_words_on_two_rows_are_as_even_as_can_be(words: list[str]):
    broken = break_name(" ".join(words), 2)
    assert broken is not None
    every = [(" ".join(words[:i]), " ".join(words[i:])) for i in range(1, len(words))]
    best = min(max(text_width_mm(a, 1.0), text_width_mm(b, 1.0)) for a, b in every)
    assert max(text_width_mm(row, 1.0) for row in broken) == pytest.approx(best)
