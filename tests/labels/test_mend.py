"""Labels that find no place move others aside, one after the other."""

from __future__ import annotations

import itertools

from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.labels.choice import Choice, Problem, greedy
from gtfs_schematic.labels.mend import mended


def problem(groups: list[list[int]], pairs: list[tuple[int, int]]) -> Problem:
    """Give a choice without neighbours; `pairs` exclude each other."""
    count = sum(map(len, groups))
    conflicts: list[set[int]] = [set() for _ in range(count)]
    for a, b in pairs:
        conflicts[a].add(b)
        conflicts[b].add(a)
    return Problem(
        groups=tuple(map(tuple, groups)),
        costs=tuple(c % 5 for c in range(count)),
        conflicts=tuple(map(frozenset, conflicts)),
        sides=(0,) * count,
        tilts=(False,) * count,
        pairs=(),
    )


def test_a_chain_of_three_makes_room():
    # Each station's first place is the last place of the station before; only the last is free.
    chain = problem([[0], [1, 2], [3, 4], [5, 6]], [(0, 1), (2, 3), (4, 5)])
    assert mended(chain, (None, 1, 3, 5)) == (0, 2, 4, 6)


def test_what_cannot_be_placed_leaves_all_as_it_was():
    stuck = problem([[0], [1]], [(0, 1)])
    assert mended(stuck, (None, 1)) == (None, 1)


@given(st.data())
def test_never_fewer_and_never_in_conflict(data: st.DataObject):
    sizes = data.draw(st.lists(st.integers(1, 4), min_size=1, max_size=7))
    ends = list(itertools.accumulate(sizes, initial=0))
    groups = [list(range(a, b)) for a, b in itertools.pairwise(ends)]
    owner = {c: s for s, group in enumerate(groups) for c in group}
    foreign = [(a, b) for a, b in itertools.combinations(owner, 2) if owner[a] != owner[b]]
    pairs = [pair for pair in foreign if data.draw(st.booleans())]
    whole = problem(groups, pairs)
    start = greedy(whole)
    found: Choice = mended(whole, start)
    taken = {c for c in found if c is not None}
    assert not any(a in taken and b in taken for a, b in pairs)
    assert sum(c is None for c in found) <= sum(c is None for c in start)
    assert all(c is None or c in group for c, group in zip(found, groups, strict=True))
