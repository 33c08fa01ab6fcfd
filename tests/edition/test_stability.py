"""What moved, turned or changed places between two editions is counted right."""

from __future__ import annotations

import itertools
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import kendalltau

from gtfs_schematic.edition.model import (
    Edition,
    EditionFeed,
    EditionLine,
    EditionLink,
    EditionStation,
)
from gtfs_schematic.edition.stability import inverted_pairs, stability_of


def edition(
    places: dict[str, tuple[float, float]],
    lines: tuple[str, ...] = ("1", "2", "3"),
    sides: str = "E",
    color: str = "#AA0000",
) -> Edition:
    """Draw stations in a row of links, all with the same lines."""
    ids = list(places)
    return Edition(
        "Row", EditionFeed("0" * 64, "", "", "", "", ""), 100.0, 100.0,
        tuple(
            EditionStation(s, s, (s,), 0.0, 0.0, x, y, "stop", lines, s, sides)
            for s, (x, y) in places.items()
        ),
        tuple(
            EditionLink(f"{a}~{b}", a, b, lines, (places[a], places[b]))
            for a, b in itertools.pairwise(ids)
        ),
        tuple(EditionLine(k, k, color, "#FFFFFF", (k,), (tuple(ids),)) for k in sorted(lines)),
    )  # fmt: skip


ROW = {"a": (10.0, 10.0), "b": (20.0, 10.0), "c": (30.0, 10.0), "d": (40.0, 10.0)}


def test_the_same_edition_is_wholly_stable():
    found = stability_of(edition(ROW), edition(ROW), ["a"])
    assert (found.kept, found.links_kept, found.orders_kept, found.labels_kept) == (4, 3, 3, 4)
    assert (found.moved, found.links_turned, found.order_inversions, found.labels_turned) == (
        0,
    ) * 4
    assert (found.colors_changed, found.farthest_links, found.tau_least) == (0, 0, 1.0)


def test_a_moved_end():
    """The last station moves 3 mm right and 4 mm down: 5 mm, and its link turns."""
    found = stability_of(edition(ROW), edition(ROW | {"d": (43.0, 14.0)}), ["a"])
    assert (found.moved, found.links_turned) == (1, 1)
    assert found.move_median_mm == found.move_largest_mm == pytest.approx(5.0)
    assert found.farthest_links == 3


def test_the_nearest_change_counts():
    moved = edition(ROW | {"c": (30.0, 12.0)})
    assert stability_of(edition(ROW), moved, ["a", "d"]).farthest_links == 1
    assert stability_of(edition(ROW), moved, ["c"]).farthest_links == 0


def test_labels_and_colors():
    found = stability_of(edition(ROW), edition(ROW, sides="W", color="#00AA00"), [])
    assert (found.labels_turned, found.colors_changed) == (4, 3)
    assert stability_of(edition(ROW), edition(ROW, sides=""), []).labels_kept == 0


def test_orders():
    found = stability_of(edition(ROW), edition(ROW, lines=("3", "2", "1")), [])
    assert (found.orders_kept, found.order_inversions, found.tau_least) == (3, 9, -1.0)


def test_gone_and_new_stations_are_not_kept():
    later = edition({k: v for k, v in ROW.items() if k != "b"} | {"e": (50.0, 10.0)})
    found = stability_of(edition(ROW), later, ["b", "e"])
    assert (found.kept, found.moved, found.links_kept) == (3, 0, 1)


@given(st.permutations("abcdefg"), st.permutations("abcdefg"))
def test_inversions_give_the_rank_correlation_of_scipy(one, other):
    place = {key: i for i, key in enumerate(other)}
    tau = kendalltau(range(7), [place[key] for key in one]).statistic
    assert 1.0 - 4.0 * inverted_pairs(one, other) / (7 * 6) == pytest.approx(tau)
    found = stability_of(
        edition(ROW, lines=tuple(one)), replace(edition(ROW, lines=tuple(other))), []
    )
    assert found.tau_least == pytest.approx(tau)
