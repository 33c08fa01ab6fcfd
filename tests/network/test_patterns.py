"""Patterns are reduced to the itineraries that a diagram must show."""

from __future__ import annotations

from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.network.model import Network
from gtfs_schematic.network.patterns import one_way_links, unreturned


def _itineraries(network: Network) -> list[str]:
    return [" ".join(itinerary) for itinerary in network.lines[0].itineraries]


def test_mirror_images_are_one_itinerary(town):
    network = town.row("ABC").run("r", "C B A", trips=60).run("r", "A B C", trips=30).network()
    assert _itineraries(network) == ["C B A"]
    assert network.lines[0].trips == 90
    assert network.lines[0].one_way_links == ()


def test_short_workings_are_no_itineraries_of_their_own(town):
    network = town.row("ABCDE").both("r", "A B C D E").both("r", "B C D").network()
    assert _itineraries(network) == ["A B C D E"]
    assert network.left_out == ()


def test_branches_stay(town):
    network = (
        town.row("ABCD").stop("E", 1200, 600).both("r", "A B C D").both("r", "A B C E").network()
    )
    assert _itineraries(network) == ["A B C D", "A B C E"]


def test_an_express_of_the_same_line_is_shown_by_the_local(town):
    network = town.row("ABCDE").both("r", "A B C D E").both("r", "A C E").network()
    assert _itineraries(network) == ["A B C D E"]


def test_rare_patterns_are_left_out_and_listed(town):
    network = (
        town.row("ABCD")
        .stop("E", 1200, 600)
        .both("r", "A B C D", trips=100)
        .both("r", "A B C E", trips=3)
        .network()
    )
    assert _itineraries(network) == ["A B C D"]
    kinds = {out.kind: out for out in network.left_out}
    assert "6 of the line's 206 trips (2.9 %)" in kinds["pattern"].reason
    assert kinds["station"].id == "E"


def test_rare_patterns_that_another_shows_are_not_listed(town):
    network = (
        town.row("ABCDE")
        .both("r", "A B C D E", trips=100)
        .run("r", "D C B", trips=1)
        .run("r", "A C E", trips=1)
        .network()
    )
    assert _itineraries(network) == ["A B C D E"]
    assert network.left_out == ()


def test_a_line_of_rare_patterns_only_is_still_drawn(town):
    ids = "ABCDEFGHIJ"
    written = town.stops({s: (600 * i, 0) for i, s in enumerate(ids)})
    for i in range(9):
        written = written.run("r", list(ids[i : i + 2]), trips=1)
    network = written.network(min_pattern_share=0.2)
    # Half of the trips at least must be shown, however rare each pattern is.
    assert 5 <= len(network.lines[0].itineraries) < 9


def test_rings_that_start_elsewhere_are_one(town):
    square = {"A": (0, 0), "B": (900, 0), "C": (900, 900), "D": (0, 900)}
    network = (
        town.stops(square).run("r", "A B C D A", trips=50).run("r", "C B A D C", trips=40).network()
    )
    assert _itineraries(network) == ["A B C D A"]
    assert network.lines[0].one_way_links == ()
    assert len(network.links) == 4


def test_one_way_loops_come_from_stop_order(town):
    network = (
        town.row("AB")
        .stops({"C": (1200, 500), "D": (1800, 0), "E": (1200, -500)})
        .run("r", "A B C D E B A")
        .network()
    )
    assert _itineraries(network) == ["A B C D E B"]
    assert network.lines[0].one_way_links == (("B", "C"), ("C", "D"), ("D", "E"), ("E", "B"))


def test_stations_called_at_twice_in_a_row_collapse(town):
    network = (
        town.stop("A", 0)
        .stop("A2", 20, name="A Place")
        .stop("B", 800)
        .both("r", "A A2 B")
        .network()
    )
    assert _itineraries(network) == ["A B"]


@pytest.mark.parametrize(
    ("run", "kept"),
    [
        ("ABCBA", "ABC"),
        ("ABCDBA", "ABCDB"),
        ("ABCDA", "ABCDA"),
        ("ABA", "AB"),
        ("ABCD", "ABCD"),
        ("ABCDEFDCBA", "ABCDEFD"),
    ],
)
def test_tails_that_run_back_are_cut(run, kept):
    assert "".join(unreturned(tuple(run))) == kept


walks = st.lists(st.sampled_from("ABCDE"), min_size=2, max_size=9).map(
    lambda ids: tuple(a for a, b in zip(ids, [None, *ids], strict=False) if a != b)
)


@given(walks.filter(lambda ids: len(ids) > 1))
def test_cutting_a_tail_loses_no_link(ids):
    def links(run: tuple[str, ...]) -> set[frozenset[str]]:
        return {frozenset(step) for step in pairwise(run)}

    assert links(unreturned(ids)) == links(ids)


@given(st.lists(walks, max_size=5))
def test_one_way_links_are_those_without_a_way_back(runs):
    steps = [step for run in runs for step in pairwise(run)]
    expected = sorted({(a, b) for a, b in steps if steps.count((b, a)) == 0})
    assert list(one_way_links(runs)) == expected
