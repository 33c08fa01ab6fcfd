"""Runs come in the order in which they are seen, as the worked rules of the Unicode annex say."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.labels.scripts import is_rtl, runs_of

# Hebrew letters stand for capitals, as in the examples of Unicode Standard Annex 9.
ALEF, BET, GIMEL = "\u05d0", "\u05d1", "\u05d2"
WORD = ALEF + BET + GIMEL


def seen(text: str) -> str:
    """Give the characters from left to right."""
    return "".join(run.text[::-1] if run.rtl else run.text for run in runs_of(text))


@pytest.mark.parametrize(
    ("text", "wanted"),
    [
        ("car", "car"),
        (WORD, WORD[::-1]),
        (f"car {WORD} bus", f"car {WORD[::-1]} bus"),
        (f"{WORD} car {WORD}", f"{WORD[::-1]} car {WORD[::-1]}"),
        (f"{WORD} 12", f"12 {WORD[::-1]}"),
        (f"{WORD} 12 car", f"car 12 {WORD[::-1]}"),
        (f"{WORD} car 12", f"car 12 {WORD[::-1]}"),
        (f"{WORD} - {WORD}", f"{WORD[::-1]} - {WORD[::-1]}"),
        (f"car {WORD} {WORD}", f"car {WORD[::-1]} {WORD[::-1]}"),
    ],
)
def test_names_are_seen_as_they_are_read(text: str, wanted: str):
    assert seen(text) == wanted


def test_the_first_letter_gives_the_direction():
    assert is_rtl(f"12 {WORD} car")
    assert not is_rtl(f"12 car {WORD}")
    assert not is_rtl("12 (–)")


@given(st.text(max_size=20))
def test_nothing_is_lost_or_told_twice(text: str):
    places = sorted(i for run in runs_of(text) for i in range(run.start, run.start + len(run.text)))
    assert places == list(range(len(text)))
    assert all(text[run.start : run.start + len(run.text)] == run.text for run in runs_of(text))
