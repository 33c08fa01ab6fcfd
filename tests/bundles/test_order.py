"""The order of lines has as few crossings as brute force finds, and says so."""

from __future__ import annotations

import math

import drawn_networks
import pytest
from drawn_networks import Sketch, drawn
from hypothesis import given, settings
from hypothesis import strategies as st

from gtfs_schematic.bundles.greedy import count_crossings, order_greedily, order_pairs
from gtfs_schematic.bundles.order import order_lines
from gtfs_schematic.bundles.problem import state_problem
from gtfs_schematic.layout.model import Layout

# Values worked out by hand for two to four lines through stations u, v, w (free terminals).
_BY_HAND = {
    "I1a": 0,
    "I1b": 1,
    "I2": 6,
    "I3": 0,
    "I4": 0,
    "I5": 0,
    "I6": 1,
    "I7": 0,
    "I8": 0,
    "I9": 2,
}


@pytest.mark.parametrize("name", sorted(_BY_HAND))
def test_cases_worked_out_by_hand(name, case, brute_force):
    layout = case[name]
    force = brute_force(layout)
    found = order_lines(layout)
    fewest, fewest_apart = force.best()
    assert fewest == _BY_HAND[name]
    assert found.crossings == found.crossings_bound == force.crossings(found.orders) == fewest
    assert force.separations(found.orders) == fewest_apart


def test_middle_line_that_ends_is_not_forced_out(case):
    assert order_lines(case["I3"]).orders["u-v"] == ("A", "C", "B")


def test_line_that_begins_is_outermost(case, brute_force):
    layout = case["I5"]
    force = brute_force(layout)
    states = [o for o in force.all_orders() if force.crossings(o) == 0]
    assert len(states) == 6
    assert len([o for o in states if force.separations(o) == 0]) == 4
    assert order_lines(layout).orders["v-w"].index("C") in (0, 2)


@pytest.mark.parametrize("count", [2, 3, 5, 8])
def test_reversed_fans_cross_once_per_pair(count):
    places = {"u": (100.0, 100.0, "U"), "v": (150.0, 100.0, "V")}
    courses = {}
    for i in range(count):
        places[f"a{i}"] = (60.0, 60.0 + 10.0 * i, "A")
        places[f"b{i}"] = (190.0, 60.0 + 10.0 * i, "B")
        courses[f"L{i}"] = ("#000000", (f"a{i} u v b{count - 1 - i}",))
    found = order_lines(drawn(Sketch(places, courses)))
    assert found.crossings == found.crossings_bound == math.comb(count, 2)


def test_free_lines_stand_in_route_order():
    places = {"p": (20.0, 50.0, "P"), "q": (60.0, 50.0, "Q"), "r": (60.0, 90.0, "R")}
    courses = {str(k): ("#000000", ("p q r",)) for k in range(1, 7)}
    orders = order_lines(drawn(Sketch(places, courses))).orders
    assert list(orders["p-q"]) == sorted(courses)
    assert orders["q-r"] == orders["p-q"]


def test_closed_ring_with_three_lines_has_no_crossing():
    ring = {f"r{i}": (50 + 30 * math.cos(i), 50 + 30 * math.sin(i), "R") for i in range(6)}
    course = "r0 r1 r2 r3 r4 r5 r0"
    courses = dict.fromkeys("ABC", ("#000000", (course,)))
    found = order_lines(drawn(Sketch(ring, courses)))
    assert found.crossings == found.crossings_bound == 0


def test_two_lines_that_branch_alike_cross_once(brute_force):
    places = {"u": (20.0, 50.0, "U"), "v": (60.0, 50.0, "V")}
    places |= {"n": (90.0, 20.0, "N"), "s": (90.0, 80.0, "S")}
    courses = dict.fromkeys("AB", ("#000000", ("u v n", "u v s")))
    layout = drawn(Sketch(places, courses))
    found = order_lines(layout)
    assert found.crossings == found.crossings_bound == brute_force(layout).best()[0] == 1


@pytest.mark.parametrize("name", sorted(drawn_networks.ALL))
def test_hand_drawn_networks_reach_their_bound(name, brute_force):
    layout = drawn_networks.ALL[name]()
    found = order_lines(layout)
    assert found.crossings == found.crossings_bound
    assert found.crossings == brute_force(layout).crossings(found.orders)


@st.composite
def tree_networks(draw, *, leaf_ends):
    """Draw lines along a small tree; with `leaf_ends` each ends at two leaves of its own.

    Without, an end is a leaf of its own or an inner station, as it comes.
    """
    size = draw(st.integers(2, 5))
    parents = [draw(st.integers(max(0, i - 2), i - 1)) for i in range(1, size)]
    edges = [(i + 1, parent) for i, parent in enumerate(parents)]
    ends = []
    for _ in range(draw(st.integers(2, 4))):
        pair = [draw(st.integers(0, size // 2)), draw(st.integers(size // 2, size - 1))]
        for i in (0, 1):
            if leaf_ends or pair[0] == pair[1] or draw(st.booleans()):
                leaf = len(edges) + 1
                edges.append((leaf, pair[i]))
                pair[i] = leaf
        ends.append(tuple(pair))
    around: dict[int, list[int]] = {}
    for a, b in edges:
        around.setdefault(a, []).append(b)
        around.setdefault(b, []).append(a)

    def path(a: int, b: int, back: int = -1) -> list[int]:
        if a == b:
            return [a]
        for c in around[a]:
            if c != back and (rest := path(c, b, a)):
                return [a, *rest]
        return []

    turn = draw(st.permutations(range(len(around))))
    places = {
        f"s{v:02}": (60 + 50 * math.cos(2.4 * turn[v] + 0.1 * v), 60 + 9.0 * turn[v], f"S{v}")
        for v in around
    }
    courses = {
        f"L{i}": ("#000000", (" ".join(f"s{v:02}" for v in path(*pair)),))
        for i, pair in enumerate(ends)
    }
    used = {word for _, (text,) in courses.values() for word in text.split()}
    return drawn(Sketch({k: p for k, p in places.items() if k in used}, courses))


def _states(layout: Layout) -> int:
    return math.prod(math.factorial(len(link.lines)) for link in layout.network.links)


@given(layout=tree_networks(leaf_ends=False).filter(lambda k: _states(k) <= 1500))
@settings(max_examples=80, deadline=None)
def test_as_few_crossings_and_separations_as_brute_force(layout, brute_force):
    force = brute_force(layout)
    found = order_lines(layout)
    fewest, fewest_apart = force.best()
    assert found.crossings == found.crossings_bound == force.crossings(found.orders) == fewest
    assert force.separations(found.orders) == fewest_apart


@given(
    layout=tree_networks(leaf_ends=False).filter(lambda k: _states(k) <= 1500),
    number=st.integers(0, 1499),
)
@settings(max_examples=80, deadline=None)
def test_an_order_that_stood_stays_unless_that_costs_a_crossing(layout, number, brute_force):
    force = brute_force(layout)
    every = list(force.all_orders())
    link = max(layout.network.links, key=lambda k: len(k.lines))
    before = order_lines(layout, {link.id: every[number % len(every)][link.id]})
    found = order_lines(layout, previous=before.orders)
    assert found.crossings == force.crossings(found.orders) == force.best()[0]
    if force.crossings(before.orders) == force.best()[0]:
        assert found.orders == before.orders


@given(layout=tree_networks(leaf_ends=True).filter(lambda k: _states(k) <= 1500))
@settings(max_examples=80, deadline=None)
def test_pairwise_sum_is_the_optimum_for_distinct_leaf_ends(layout, brute_force):
    problem = state_problem(layout)
    costs, left = order_pairs(problem)
    fewest = min(brute_force(layout).crossings(o) for o in brute_force(layout).all_orders())
    assert problem.fixed + sum(costs.values()) == fewest
    assert order_lines(layout).crossings == fewest
    assert count_crossings(problem, order_greedily(problem, left)) >= fewest


@given(layout=tree_networks(leaf_ends=True))
@settings(max_examples=30, deadline=None)
def test_greedy_order_lies_between_bound_and_exact_count_holds(layout, brute_force):
    problem = state_problem(layout)
    found = order_lines(layout)
    assert brute_force(layout).crossings(found.orders) == found.crossings
    assert found.crossings <= count_crossings(
        problem, order_greedily(problem, order_pairs(problem)[1])
    )
    assert all(sorted(found.orders[link.id]) == list(link.lines) for link in layout.network.links)
