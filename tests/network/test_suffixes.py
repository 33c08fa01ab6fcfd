"""Endings of names that tell parts of a station apart are learned from the feed at hand."""

from __future__ import annotations

import itertools

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.feed.model import FeedSettings
from gtfs_schematic.feed.read import read_feed
from gtfs_schematic.network.suffixes import Called, Endings, learned_endings, shared_name

BASES = ("Oulm", "Vendrick Locks", "Tamselby", "Am Wehr")


def _learned(endings, gap_m=30.0, *, follows=False, one_line=True, bases=BASES) -> Endings:
    """Learn from stops of every base with every ending, `gap_m` apart."""
    stops = [
        Called(
            f"{base}{n}",
            base + ending,
            (5000.0 * i + gap_m * n, 0.0),
            frozenset([base if one_line else f"{base}{n}"]),
        )
        for i, base in enumerate(bases)
        for n, ending in enumerate(endings)
    ]
    return learned_endings(stops, lambda _a, _b: follows, 150.0)


@pytest.mark.parametrize(
    ("endings", "one", "other"),
    [
        ((" Gleis 1", " Gleis 2"), "Quarry Gleis 7", "Quarry Gleis 12"),
        (("_1", "_2"), "Quarry_1", "Quarry_3"),
        (("", " (retning nord)"), "Quarry", "Quarry (retning nord)"),
        ((" / perron A", " / perron B"), "Quarry / perron C", "Quarry / perron B"),
        ((" heen", " terug"), "Quarry heen", "Quarry terug"),
    ],
)
def test_endings_in_any_language_are_learned(endings, one, other):
    assert not Endings().alike(one, other)
    learned = _learned(endings)
    assert learned.alike(one, other)
    assert learned.alike(other, one)
    assert not learned.alike(one, other.replace("Quarry", "Mill"))


def test_two_examples_teach_nothing():
    assert _learned((" heen", " terug"), bases=BASES[:2]).learned == frozenset()


def test_stops_in_a_row_or_far_apart_teach_nothing():
    assert _learned((" North", " South"), follows=True).learned == frozenset()
    assert _learned((" North", " South"), gap_m=900.0).learned == frozenset()


def test_words_need_a_line_in_common_and_stands_do_not():
    assert _learned((" Road", " Street"), one_line=False).learned == frozenset()
    assert _learned((" stand 1", " stand 2"), one_line=False).alike(
        "Quarry stand 3", "Quarry stand 4"
    )


def test_names_that_are_nothing_but_numbers_have_no_endings():
    assert _learned((" 12", " 14"), bases=("1", "2", "3", "4")).learned == frozenset()


def test_shared_names_end_with_whole_words():
    assert shared_name(["Mill Lane A12", "Mill Lane A13"]) == "Mill Lane"
    assert shared_name(["Mill Lane (1)", "Mill Lane (2)", "MILL LANE"]) == "Mill Lane"
    assert shared_name(["Locks (upper) 1", "Locks (upper) 2"]) == "Locks (upper)"
    assert shared_name(["Oak / Elm", "Elm / Oak"]) == ""
    assert shared_name(["Millfield", "Mill"]) == ""


@given(st.lists(st.text(alphabet="ab 1(_é", max_size=12), min_size=1, max_size=4))
def test_a_shared_name_begins_the_first_name(names):
    shared = shared_name(names)
    assert names[0].startswith(shared)


def test_parents_of_a_real_feed_are_recovered_from_names_and_places(script, nyc_subway_feed):
    """The truth is the feed's own parent_station."""
    timetable = read_feed([nyc_subway_feed], FeedSettings())
    parents = {s.parent_id for s in timetable.stops} - {None}
    assert len(parents) > 80
    for score in script("station_recovery").recovery(timetable):
        assert score.f1 >= 0.99
    platforms = [s for s in timetable.stops if s.parent_id]
    assert sum(a.parent_id == b.parent_id for a, b in itertools.combinations(platforms, 2)) > 80
