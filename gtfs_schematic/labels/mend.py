"""Labels without a place get one by moving those in the way, which may move others in turn.

Ejection chains (Glover 1996, "Ejection chains, reference structures and alternating path methods
for traveling salesman problems", Discrete Applied Mathematics 65), of limited length: a good start
for the exact choice, which would spend most of its work on finding one.
"""

from __future__ import annotations

from gtfs_schematic.labels.choice import Choice, Problem, cheapest

_DEPTH = 4
"""How many labels one after the other may be moved for one that has no place."""
_MOST_IN_THE_WAY = 3
_TRIES = 4000
"""Moves tried for one label at most."""


def mended(problem: Problem, start: Choice) -> Choice:
    """Give a choice with as many labels placed or more, and no conflict that was not there."""
    chains = _Chains(problem, start)
    for _ in range(3):
        lost = [s for s, c in enumerate(chains.choice) if c is None]
        placed = [station for station in lost if chains.placed(station)]
        if not placed:
            break
    return tuple(chains.choice)


class _Chains:
    """A choice, changed move by move and set back where a chain ends nowhere."""

    def __init__(self, problem: Problem, start: Choice) -> None:
        self.problem = problem
        self.choice = list(start)
        self.tries = 0

    def placed(self, station: int) -> bool:
        """Find a place for a label, moving others; leave all as it was if there is none."""
        self.tries = _TRIES
        before = list(self.choice)
        if self._place(station, frozenset({station}), _DEPTH):
            return True
        self.choice = before
        return False

    def _place(self, station: int, moved: frozenset[int], depth: int) -> bool:
        """Place a label without touching those that the chain has moved already."""
        free = cheapest(self.problem, self.choice, station)
        if free is not None:
            self.choice[station] = free
            return True
        if depth == 0:
            return False
        options = []
        for candidate in self.problem.groups[station]:
            rivals = self._in_the_way(candidate)
            if len(rivals) <= _MOST_IN_THE_WAY and not moved & set(rivals):
                options.append((len(rivals), self.problem.costs[candidate], candidate, rivals))
        for _, _, candidate, rivals in sorted(options):
            if self.tries == 0:
                return False
            self.tries -= 1
            if self._pushed_aside(station, candidate, rivals, moved, depth):
                return True
        return False

    def _pushed_aside(
        self,
        station: int,
        candidate: int,
        rivals: tuple[int, ...],
        moved: frozenset[int],
        depth: int,
    ) -> bool:
        """Take a place and move all that stand in its way, or leave everything as it was."""
        before = list(self.choice)
        for rival in rivals:
            self.choice[rival] = None
        self.choice[station] = candidate
        moved = moved | set(rivals)
        if all(self._place(rival, moved, depth - 1) for rival in rivals):
            return True
        self.choice = before
        return False

    def _in_the_way(self, candidate: int) -> tuple[int, ...]:
        """Give the stations whose labels exclude a candidate, sorted."""
        station_of = self.problem.station_of
        conflicts = self.problem.conflicts[candidate]
        return tuple(sorted({station_of[c] for c in conflicts if self.choice[station_of[c]] == c}))
