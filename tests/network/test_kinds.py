"""Stops, interchanges and termini are told apart as a cartographer would."""

from __future__ import annotations

from gtfs_schematic.network.model import Network


def _kinds(network: Network) -> dict[str, str]:
    return {station.id: station.kind for station in network.stations}


def test_lines_that_run_together_make_no_interchange(town):
    network = town.row("ABCD").both("x", "A B C D").both("y", "A B C D").network()
    assert _kinds(network) == {"A": "terminus", "B": "stop", "C": "stop", "D": "terminus"}


def test_branches_crossings_and_ends_on_another_line_are_interchanges(town):
    network = (
        town.row("ABCDE")
        .stops({"F": (1800, 700), "N": (1800, 1400), "S": (2400, -700), "U": (600, 900)})
        .both("x", "A B C D E")
        .both("y", "A B C D F N")
        .both("z", "C S")
        .both("u", "B U")
        .network()
    )
    kinds = _kinds(network)
    assert kinds["D"] == "interchange"  # y branches off
    assert kinds["C"] == "interchange"  # z ends
    assert kinds["B"] == "interchange"
    assert kinds["A"] == kinds["E"] == kinds["N"] == kinds["S"] == "terminus"
    assert kinds["F"] == "stop"


def test_a_branch_of_one_line_is_no_interchange(town):
    network = (
        town.row("ABCD").stop("E", 1800, 600).both("x", "A B C D").both("x", "A B C E").network()
    )
    assert _kinds(network)["C"] == "stop"


def test_an_express_stop_on_a_trunk_is_an_interchange(town):
    network = town.row("ABCDEFG").both("local", "A B C D E F G").both("fast", "A D G").network()
    assert _kinds(network)["D"] == "interchange"
    assert _kinds(network)["C"] == "stop"


def test_passing_over_one_minor_stop_makes_no_interchange(town):
    network = town.row("ABCDE").both("x", "A B C D E").both("y", "A B D E").network()
    assert _kinds(network)["B"] == "stop"


def test_rings_and_loops_have_no_terminus_where_they_close(town):
    square = {"A": (0, 0), "B": (900, 0), "C": (900, 900), "D": (0, 900), "T": (-900, 0)}
    ring = town.stops(square).both("r", "A B C D A").network()
    assert set(_kinds(ring).values()) == {"stop"}
    stem = town.stops(square).run("r", "T A B C D A T").network()
    assert _kinds(stem) == {"T": "terminus", "A": "stop", "B": "stop", "C": "stop", "D": "stop"}


def test_passing_lines_do_not_call(town):
    network = town.row("ABCD").both("local", "A B C D").both("fast", "A D").network()
    assert network.station["B"].lines == ("local",)
    assert network.link_between[frozenset("AB")].lines == ("fast", "local")
    assert _kinds(network)["B"] == "stop"
