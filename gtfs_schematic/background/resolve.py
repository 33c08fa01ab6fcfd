"""Where a curve meets itself, lay the parts that do so again, one after another."""

from __future__ import annotations

import itertools
import math
from collections import Counter, defaultdict

from gtfs_schematic.background.board import Board
from gtfs_schematic.background.legs import CORNER_MM, Arcs
from gtfs_schematic.background.route import Curve, occupy, relay

_CORNERS_MM = (CORNER_MM, 4.0 * CORNER_MM, math.inf)
"""Fewer and fewer corners of its course that a part has to pass by."""


_LONGER, _LONGER_STEPS = 1.5, 30
"""A part may become so much longer, times and steps: never the long way round something."""


def apart(board: Board, curve: Curve, arcs: Arcs) -> Arcs | None:
    """Give a curve that nowhere meets itself; None if there is no room for it.

    As few parts as can be are laid anew, or, where that does not do, all that clash.
    """
    clashes = _clashes(board, arcs)
    if not clashes:
        return arcs
    few, all_ = _fewest(clashes, arcs), {k for pair in clashes for k in pair}
    for moved in (few, all_) if few != all_ else (few,):
        laid = _laid_anew(board, curve, arcs, moved)
        if laid is not None:
            return laid
    return None


def _laid_anew(board: Board, curve: Curve, arcs: Arcs, moved: set[int]) -> Arcs | None:
    """Lay parts anew between the same places of crossing, shortest first, round what stands."""
    lattice = board.lattice
    before = lattice.crossed.copy(), lattice.closed.copy(), lattice.cost.copy()
    laid = list(arcs)
    for k, arc in enumerate(arcs):
        if k not in moved:
            occupy(board, [arc], closed=False)
    # Both ends of every part are where it crosses: they stay, and so nobody may take them.
    for k in moved:
        lattice.closed[arcs[k][[0, -1]]] = True
    for k in sorted(moved, key=lambda k: (len(arcs[k]), k)):
        lattice.closed[arcs[k][[0, -1]]] = False
        for corner_mm, stepwise in itertools.product(_CORNERS_MM, (False, True)):
            again = relay(board, curve, arcs, k, corner_mm, stepwise=stepwise)
            if again is None or len(again) > _LONGER * len(arcs[k]) + _LONGER_STEPS:
                continue
            if not _clashes(board, [again]):
                laid[k] = again
                occupy(board, [again], closed=False)
                break
    lattice.crossed[:], lattice.closed[:], lattice.cost[:] = before
    return None if _clashes(board, laid) else laid


def _fewest(clashes: set[tuple[int, int]], arcs: Arcs) -> set[int]:
    """Give parts without which nothing clashes: those in most clashes, then the shortest."""
    clashes = set(clashes)
    chosen: set[int] = set()
    while clashes:
        counts = Counter(k for pair in sorted(clashes) for k in set(pair))
        worst = min(counts, key=lambda k: (-counts[k], len(arcs[k]), k))
        chosen.add(worst)
        clashes = {pair for pair in clashes if worst not in pair}
    return chosen


def _clashes(board: Board, arcs: Arcs) -> set[tuple[int, int]]:
    """Give the pairs of parts of a curve that share a node, or whose diagonal steps cross."""
    users: dict[int, list[int]] = defaultdict(list)
    steps: dict[int, list[tuple[int, int]]] = defaultdict(list)
    width = board.lattice.width
    for k, arc in enumerate(arcs):
        for node in arc.tolist():
            users[node].append(k)
        for a, b in zip(arc[:-1].tolist(), arc[1:].tolist(), strict=True):
            if abs(b - a) in (width - 1, width + 1):
                # Twice the middle of a diagonal, as one number: two that cross share it.
                steps[a + b].append((k, abs(b - a)))
    found = {
        tuple(sorted(pair)) for each in users.values() for pair in itertools.combinations(each, 2)
    }
    for each in steps.values():
        for (j, way), (k, other) in itertools.combinations(each, 2):
            if way != other:
                found.add((min(j, k), max(j, k)))
    return found  # type: ignore[return-value]
