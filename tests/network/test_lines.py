"""Routes become the lines that a rider sees."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

if TYPE_CHECKING:
    from conftest import Town


def test_routes_of_one_short_name_that_meet_are_one_line(town):
    network = (
        town.row("ABCD")
        .route("2-east", short_name="2", color="#AA2222")
        .route("2-west", short_name="2", color="#AA2222")
        .both("2-east", "B C D")
        .both("2-west", "A B")
        .network()
    )
    (line,) = network.lines
    assert line.id == "2-east"
    assert line.name == "2"
    assert line.route_ids == ("2-east", "2-west")


def test_shuttles_of_one_short_name_that_never_meet_are_two_lines(town):
    network = (
        town.row("ABCD")
        .route("s1", short_name="S")
        .route("s2", short_name="S")
        .both("s1", "A B")
        .both("s2", "C D")
        .network()
    )
    assert [line.name for line in network.lines] == ["S", "S"]


def test_agencies_and_modes_keep_lines_apart(town):
    network = (
        town.row("ABC")
        .route("a", short_name="1")
        .route("b", short_name="1", agency_id="other")
        .route("c", short_name="1", mode="bus")
        .both("a", "A B C")
        .both("b", "A B C")
        .both("c", "A B C")
        .network()
    )
    assert len(network.lines) == 3
    assert network.links[0].lines == ("a", "b", "c")


@pytest.mark.parametrize(
    ("names", "colors", "lines"),
    [
        (("Up", "Down"), ("#AA2222", "#AA2222"), 1),
        (("Up", "Down"), ("#AA2222", "#2222AA"), 2),
        (("Up", "Down"), (None, None), 2),
        (("7 North", "7 South"), (None, None), 1),
        (("", ""), (None, None), 1),
    ],
)
def test_directions_that_are_routes_of_their_own(town, names, colors, lines):
    network = (
        town.row("ABCDE")
        .route("x", short_name=names[0], color=colors[0])
        .route("y", short_name=names[1], color=colors[1])
        .run("x", "A B C D E")
        .run("y", "E D C B A")
        .network()
    )
    assert len(network.lines) == lines
    if lines == 1:
        assert network.lines[0].itineraries == (("A", "B", "C", "D", "E"),)
        assert network.lines[0].one_way_links == ()


def test_lines_run_both_ways_each_stay_two(town):
    network = (
        town.row("ABC")
        .route("6", color="#116611")
        .route("6X", color="#116611")
        .both("6", "A B C")
        .both("6X", "A B C")
        .network()
    )
    assert [line.id for line in network.lines] == ["6", "6X"]


def test_names_fall_back_to_what_there_is(town):
    network = (
        town.row("ABC")
        .route("r1", short_name="", long_name="Harbour Line")
        .route("r2", short_name="")
        .both("r1", "A B")
        .both("r2", "B C")
        .network()
    )
    assert [line.name for line in network.lines] == ["Harbour Line", "r2"]


def test_the_feeds_order_is_kept(town):
    network = town.row("AB").route("r", sort_order=7).both("r", "A B").network()
    assert network.lines[0].sort_order == 7


def _trunk(town: Town) -> Town:
    """Two branches of a trunk in one color, a third line that meets them, one far away."""
    told = {"color": "#AA0000"}
    return (
        town.row("ABCDE")
        .stops({"X": (1800, 900), "Y": (9000, 9000), "Z": (9900, 9000)})
        .route("1", **told)
        .route("2", **told)
        .route("3", color="#00AA00")
        .route("4", **told)
        .both("1", "A B C D")
        .both("2", "A B C X")
        .both("3", "C E")
        .both("4", "Y Z")
    )


def test_trunks_are_grouped_by_color_if_wished(town):
    written = _trunk(town)
    assert len(written.network().lines) == 4
    lines = {line.id: line for line in written.network(group_lines="color").lines}
    # The fourth has the color but meets none of the others.
    assert set(lines) == {"1", "3", "4"}
    assert lines["1"].route_ids == ("1", "2")
    assert lines["1"].name == "1 / 2"
    assert set(lines["1"].itineraries) == {("A", "B", "C", "D"), ("A", "B", "C", "X")}
    assert lines["1"].trips == 160


def test_a_branch_is_not_rare_among_the_trips_of_its_trunk(town):
    written = _trunk(town).both("1", "A B C D", trips=2000)
    line = written.network(group_lines="color").line["1"]
    assert any("X" in itinerary for itinerary in line.itineraries)


def test_networks_group_nothing_where_the_feed_has_none(town):
    written = _trunk(town)
    assert written.network(group_lines="network") == written.network()
