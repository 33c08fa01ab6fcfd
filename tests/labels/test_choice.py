"""The choice is the best there is, found a second time by trying everything."""

from __future__ import annotations

import itertools

import numpy as np
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely import affinity

from gtfs_schematic.labels.choice import UNPLACED, Choice, PairCost, Problem, greedy, solve
from gtfs_schematic.labels.problem import _near_pairs


@st.composite
def problems(draw: st.DrawFn) -> Problem:
    sizes = draw(st.lists(st.integers(0, 3), min_size=1, max_size=4))
    numbers = iter(range(sum(sizes)))
    groups = tuple(tuple(itertools.islice(numbers, size)) for size in sizes)
    count = sum(sizes)
    station_of = {c: s for s, group in enumerate(groups) for c in group}
    rivals: list[set[int]] = [set() for _ in range(count)]
    for a, b in itertools.combinations(range(count), 2):
        if station_of[a] != station_of[b] and draw(st.integers(0, 2)) == 0:
            rivals[a].add(b)
            rivals[b].add(a)
    pairs = []
    for first, second in itertools.combinations(range(len(groups)), 2):
        if draw(st.booleans()):
            ends = (*groups[first], *groups[second])
            hands = {c: draw(st.integers(-1, 1)) for c in ends}
            hand, tilt, side = (draw(st.integers(0, 40)) for _ in range(3))
            pairs.append(PairCost(first, second, hands, hand, tilt, side))
    return Problem(
        groups=groups,
        costs=tuple(draw(st.integers(0, 60)) for _ in range(count)),
        conflicts=tuple(map(frozenset, rivals)),
        sides=tuple(draw(st.integers(0, 7)) for _ in range(count)),
        tilts=tuple(draw(st.booleans()) for _ in range(count)),
        pairs=tuple(pairs),
    )


def allowed(problem: Problem, choice: Choice) -> bool:
    taken = {c for c in choice if c is not None}
    return not any(problem.conflicts[c] & taken for c in taken)


def best_of_all(problem: Problem) -> int:
    """Give the least cost over every choice without conflicts."""
    every = itertools.product(*((None, *group) for group in problem.groups))
    return min(problem.total(choice) for choice in every if allowed(problem, choice))


@settings(max_examples=60, deadline=None)
@given(problems())
def test_solve_reaches_the_best_of_all_choices(problem: Problem):
    found = solve(problem, greedy(problem))
    assert allowed(problem, found)
    assert problem.total(found) == best_of_all(problem)


@settings(max_examples=60, deadline=None)
@given(problems(), st.data())
def test_solve_leaves_the_others_alone_and_is_never_worse(problem: Problem, data: st.DataObject):
    start = greedy(problem)
    assert allowed(problem, start)
    free = data.draw(st.sets(st.integers(0, len(problem.groups) - 1)))
    found = solve(problem, start, free)
    assert allowed(problem, found)
    assert problem.total(found) <= problem.total(start)
    assert all(found[s] == start[s] for s in range(len(start)) if s not in free)


def test_a_label_gives_way_so_that_two_are_placed():
    problem = Problem(
        groups=((0, 1), (2,)),
        costs=(0, 500, 0),
        conflicts=(frozenset({2}), frozenset(), frozenset({0})),
        sides=(0, 4, 0),
        tilts=(False, False, False),
        pairs=(),
    )
    assert solve(problem, (0, None)) == (1, 2)
    assert problem.total((0, None)) == UNPLACED


@given(st.lists(st.tuples(*[st.floats(0.0, 30.0)] * 4, st.sampled_from([0.0, -45.0])), max_size=12))
def test_near_pairs_are_those_that_plain_distances_give(
    places: list[tuple[float, float, float, float, float]],
):
    boxes = np.array(
        [
            affinity.rotate(shapely.box(x, y, x + w + 0.1, y + h + 0.1), angle)
            for x, y, w, h, angle in places
        ],
        dtype=object,
    )
    first, second = _near_pairs(boxes, 0.5)
    found = set(zip(first.tolist(), second.tolist(), strict=True))
    for i, j in itertools.product(range(len(boxes)), repeat=2):
        gap = shapely.distance(boxes[i], boxes[j])
        if abs(gap - 0.5) > 1e-6:  # else rounding decides
            assert ((i, j) in found) == (gap < 0.5)
