"""Expresses run over the local track, and lines in one street share their links."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import pytest

from gtfs_schematic.network.model import Network

if TYPE_CHECKING:
    from conftest import Town


def _pairs(network: Network) -> dict[tuple[str, str], tuple[str, ...]]:
    return {(link.start, link.end): link.lines for link in network.links}


def _course(network: Network, line_id: str) -> str:
    course = network.line[line_id].courses[0]
    return " ".join(node for node in course if node in network.station)


def test_an_express_runs_over_the_local_track(town):
    network = town.row("ABCDE").both("local", "A B C D E").both("fast", "A C E").network()
    assert _course(network, "fast") == "A B C D E"
    assert network.line["fast"].itineraries == (("A", "C", "E"),)
    assert set(_pairs(network).values()) == {("fast", "local")}
    assert network.station["B"].lines == ("local",)


def test_a_long_way_round_is_no_local_track(town):
    places = {"A": (0, 0), "B": (600, 700), "C": (1200, 0)}
    network = town.stops(places).both("local", "A B C").both("fast", "A C").network()
    # 1844 m against 1200 m: more than a quarter longer.
    assert _pairs(network)["A", "C"] == ("fast",)
    wide = town.stops(places).both("local", "A B C").both("fast", "A C").network(express_detour=1.6)
    assert ("A", "C") not in _pairs(wide)


def test_expresses_of_expresses_end_on_the_local_track(town):
    network = (
        town.row("ABCDEFGHI")
        .both("local", "A B C D E F G H I")
        .both("fast", "A C E G I")
        .both("faster", "A E I")
        .network()
    )
    assert _course(network, "faster") == "A B C D E F G H I"
    assert len(network.links) == 8


def test_ferries_do_not_run_on_tram_tracks(town):
    network = (
        town.row("ABC")
        .route("tram", mode="tram")
        .route("boat", mode="ferry")
        .both("tram", "A B C")
        .both("boat", "A C")
        .network()
    )
    assert _pairs(network)["A", "C"] == ("boat",)


def test_without_a_shape_the_local_track_is_one_lines(town):
    places = {"A": (0, 0), "B": (600, 250), "C": (1200, 0)}
    network = (
        town.stops(places).both("one", "A B").both("other", "B C").both("fast", "A C").network()
    )
    assert _pairs(network)["A", "C"] == ("fast",)


def test_skip_stop_service_with_shapes_runs_over_both(town):
    track = [(0, 0), (600, 150), (1200, 0), (1800, 150), (2400, 0)]
    network = (
        town.stops(dict(zip("ABCDE", track, strict=True)))
        .shape("out", track)
        .shape("back", track[::-1])
        .run("j", "A B C E", shape="out")
        .run("j", "E C B A", shape="back")
        .run("z", "A C D E", shape="out")
        .run("z", "E D C A", shape="back")
        .network()
    )
    assert _course(network, "j") == _course(network, "z") == "A B C D E"


def test_a_bus_whose_shape_takes_another_street_is_left_there(town):
    def written(shape: list[tuple[float, float]]) -> Network:
        return (
            town.row("ABC")
            .route("local", mode="bus")
            .route("fast", mode="bus")
            .shape("s", shape)
            .both("local", "A B C")
            .run("fast", "A C", shape="s")
            .network()
        )

    same = written([(0, 0), (600, 10), (1200, 0)])
    other = written([(0, 0), (50, 300), (1150, 300), (1200, 0)])
    assert _course(same, "fast") == "A B C"
    assert _pairs(other)["A", "C"] == ("fast",)


def test_shapes_that_miss_their_stops_are_not_trusted(town):
    network = (
        town.row("ABC")
        .shape("wrong", [(0, 5000), (1200, 5000)])
        .both("local", "A B C")
        .run("fast", "A C", shape="wrong")
        .network()
    )
    assert _course(network, "fast") == "A B C"


def test_trams_in_one_street_with_different_stops_share_links(town):
    network = (
        town.row(["A1", "A2", "A3"], gap_m=500)
        .row(["B1", "B2", "B3"], gap_m=500, x=250, y=8)
        .route("a", mode="tram")
        .route("b", mode="tram")
        .both("a", "A1 A2 A3")
        .both("b", "B1 B2 B3")
        .network()
    )
    assert _course(network, "a") == "A1 B1 A2 B2 A3"
    assert _course(network, "b") == "B1 A2 B2 A3 B3"
    assert _pairs(network) == {
        ("A1", "B1"): ("a",),
        ("A2", "B1"): ("a", "b"),
        ("A2", "B2"): ("a", "b"),
        ("A3", "B2"): ("a", "b"),
        ("A3", "B3"): ("b",),
    }
    assert network.station["B1"].lines == ("b",)


def test_alongside_zero_draws_them_apart(town):
    written = (
        town.row(["A1", "A2", "A3"], gap_m=500)
        .row(["B1", "B2", "B3"], gap_m=500, x=250, y=8)
        .route("a", mode="tram")
        .route("b", mode="tram")
        .both("a", "A1 A2 A3")
        .both("b", "B1 B2 B3")
    )
    network = written.network(alongside_m=0.0)
    assert _course(network, "a") == "A1 A2 A3"
    assert len(network.links) == 4


def _two_trams(
    town: Town, stops: dict[str, tuple[float, float]], first: str, second: str, mode: str = "tram"
) -> Network:
    return (
        town.stops(stops)
        .route("a", mode=mode)
        .route("b", mode=mode)
        .both("a", first)
        .both("b", second)
        .network()
    )


def test_a_crossing_is_not_running_alongside(town):
    # b's stop B2 stands right on a's street, where b crosses it at 90 and at 40 degrees.
    for lean in (0, 950):
        stops = {
            "A1": (-500, 0),
            "A2": (500, 0),
            "A3": (1500, 0),
            "B1": (-lean, -800),
            "B2": (0, 0),
            "B3": (lean, 800),
        }
        network = _two_trams(town, stops, "A1 A2 A3", "B1 B2 B3")
        assert _course(network, "a") == "A1 A2 A3"


def test_the_next_street_is_not_alongside(town):
    stops = {"A1": (0, 0), "A2": (500, 0), "A3": (1000, 0)}
    stops |= {"B1": (250, 100), "B2": (750, 100), "B3": (1250, 100)}
    network = _two_trams(town, stops, "A1 A2 A3", "B1 B2 B3")
    assert len(network.links) == 4


def test_metros_under_one_avenue_share_links_only_between_common_stations(town):
    stops = {"A": (0, 0), "C": (1200, 0), "B": (600, 5), "E": (2400, -300), "F": (1800, 400)}
    apart = _two_trams(town, stops, "A C E", "A B F", mode="metro")
    assert _course(apart, "a") == "A C E"
    joined = _two_trams(town, stops, "A C E", "A B C F", mode="metro")
    assert _course(joined, "a") == "A B C E"


def test_lines_between_the_same_stations_share_one_link(town):
    network = town.row("AB").both("x", "A B").both("y", "B A").network()
    assert _pairs(network) == {("A", "B"): ("x", "y")}


def test_ids_with_the_joining_mark_stay_apart(town):
    places = {"a~b": (0, 0), "c": (600, 0), "a": (0, 900), "b~c": (600, 900)}
    network = town.stops(places).both("x", ["a~b", "c"]).both("y", ["a", "b~c"]).network()
    assert len({link.id for link in network.links}) == 2


def test_an_express_without_a_shape_leaves_the_local_track_where_it_leads_away(town):
    def written(y: float) -> Network:
        return (
            town.row("ABCDEF")
            .stop("Z", 6000, y)
            .both("local", "A B C D E F")
            .both("fast", "A Z")
            .network()
        )

    near = written(400)
    assert _course(near, "fast") == "A B C D E F Z"
    assert near.line["fast"].itineraries == (("A", "Z"),)
    # At 45 degrees the local track leads elsewhere from the first station on.
    assert _course(written(6000), "fast") == "A Z"


def test_what_only_begins_beside_the_local_track_is_no_express_of_it(town):
    network = (
        town.row("ABC").stop("Z", 3000, -1500).both("local", "A B C").both("fast", "A Z").network()
    )
    assert _course(network, "fast") == "A Z"


def _streets(town: Town, lean: tuple[float, float], **settings: float) -> Network:
    """Line a along a street; line b crosses or follows it, with a stop where they meet."""
    dx, dy = lean
    written = town.stops({"A1": (-900, 0), "A2": (900, 0), "B0": (0, 0)})
    written = written.stops({"B1": (-900 * dx, -900 * dy), "B2": (900 * dx, 900 * dy)})
    return (
        written.route("a", mode="bus")
        .route("b", mode="bus")
        .shape("sa", [(-900, 0), (900, 0)])
        .shape("sb", [(-900 * dx, -900 * dy), (900 * dx, 900 * dy)])
        .run("a", "A1 A2", shape="sa")
        .run("b", "B1 B0 B2", shape="sb")
        .network(**settings)
    )


@pytest.mark.parametrize("alongside_m", [30.0, 60.0, 200.0])
@pytest.mark.parametrize("alongside_min_m", [0.0, 300.0])
def test_perpendicular_streets_never_merge(town, alongside_m, alongside_min_m):
    network = _streets(town, (0.0, 1.0), alongside_m=alongside_m, alongside_min_m=alongside_min_m)
    assert _course(network, "a") == "A1 A2"


def test_the_angle_decides_between_crossing_and_running_along(town):
    # At 10 degrees two streets stay within 60 m of each other for 2 · 60 / sin 10° = 691 m.
    lean = (math.cos(math.radians(10.0)), math.sin(math.radians(10.0)))
    assert _course(_streets(town, lean), "a") == "A1 B0 A2"
    assert _course(_streets(town, lean, alongside_deg=5.0), "a") == "A1 A2"
    assert _course(_streets(town, lean, alongside_min_m=800.0), "a") == "A1 A2"


def test_opposite_one_way_streets_are_one_bundle_if_close(town):
    def written(gap: float) -> Network:
        return (
            town.stops({"A": (-900, 0), "Z": (1900, 0)})
            .stops({"e1": (0, 0), "e2": (1000, 0), "w1": (400, gap), "w2": (1400, gap)})
            .route("9", mode="bus")
            .shape("out", [(-900, 0), (1900, 0)])
            .shape("back", [(1900, 0), (1800, gap), (-800, gap), (-900, 0)])
            .run("9", "A e1 e2 Z", shape="out")
            .run("9", "Z w2 w1 A", shape="back")
            .network()
        )

    close = written(50)
    assert set(_course(close, "9").split()) == {"A", "e1", "w1", "e2", "w2", "Z"}
    assert len(close.links) == 5
    assert not close.line["9"].one_way_links
    assert len(written(200).links) == 6


def test_a_dual_carriageway_is_one_street_for_all_who_use_it(town):
    """Stops of one line 64 m off the other carriageway, and a third line beyond that one."""
    network = (
        town.stops({"A": (0, 0), "Z": (3000, 0), "s": (1500, 64)})
        .stops({"B": (0, 60), "Y": (3000, 60), "C": (0, 0.5), "X": (3000, -20)})
        .route("1", mode="bus")
        .route("2", mode="bus")
        .shape("s1", [(0, 0), (3000, 0)])
        .shape("s2", [(0, 58), (3000, 58)])
        .run("1", "A Z", shape="s1")
        .run("2", "B s Y", shape="s2")
        .network(merge_hub_m=0.0)
    )
    assert _course(network, "1") == "A s Z"


def test_a_stop_of_the_way_back_is_passed_at_the_end_of_a_spur(town):
    """The bus turns back at T and calls at different stops on the way; both ways are one street."""
    network = (
        town.stops({"A": (0, 0), "p": (500, 0), "T": (1000, 0), "q": (300, 0), "B": (-800, 500)})
        .stops({"C": (-800, 0)})
        .route("1", mode="bus")
        .route("2", mode="bus")
        .run("1", "A p T q B")
        .run("2", "C q p T")
        .network()
    )
    assert ("T", "p") in {(a, b) for a, b in _pairs(network)} | {(b, a) for a, b in _pairs(network)}
    assert ("T", "q") not in {(max(p), min(p)) for p in _pairs(network)}
    assert ("T", "q") not in _pairs(network)
