"""The choice of one place per label: exact on what it is given, on whole numbers alone.

Each station takes one of its candidates or none; candidates in conflict exclude each other;
neighbours pay for changes of hand, angle and side. Solved with CP-SAT on one worker with a fixed
seed and a limit of work, so that the same problem always gets the same answer.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

from gtfs_schematic.lazily import lazily

if TYPE_CHECKING:
    from ortools.sat.python import cp_model
else:
    # Its import takes longer than most commands.
    cp_model = lazily("ortools.sat.python.cp_model")


UNPLACED = 100_000
"""Cost of a station without a label."""

Choice = tuple[int | None, ...]
"""Per station the chosen candidate, None for no label."""


@dataclass(frozen=True, slots=True)
class PairCost:
    """What two neighbours pay: `hand` where theirs are opposite, and so on."""

    first: int
    second: int
    hands: dict[int, int]
    """Per candidate of either station -1, 0 or 1 as seen along the link."""
    hand: int
    tilt: int
    side: int


@dataclass(frozen=True)
class Problem:
    """The choice in whole numbers; candidates are indexes, stations are indexes of `groups`."""

    groups: tuple[tuple[int, ...], ...]
    costs: tuple[int, ...]
    conflicts: tuple[frozenset[int], ...]
    """Per candidate those of other stations that it excludes; mutual."""
    sides: tuple[int, ...]
    tilts: tuple[bool, ...]
    pairs: tuple[PairCost, ...]

    @cached_property
    def station_of(self) -> dict[int, int]:
        """Give the station of every candidate."""
        return {c: s for s, group in enumerate(self.groups) for c in group}

    @cached_property
    def pairs_of(self) -> tuple[tuple[PairCost, ...], ...]:
        """Give per station the pairs that it is part of."""
        lists: list[list[PairCost]] = [[] for _ in self.groups]
        for pair in self.pairs:
            lists[pair.first].append(pair)
            if pair.second != pair.first:
                lists[pair.second].append(pair)
        return tuple(map(tuple, lists))

    def pair_cost(self, pair: PairCost, first: int | None, second: int | None) -> int:
        """Give what two neighbours pay for their candidates."""
        if first is None or second is None:
            return 0
        cost = pair.hand if pair.hands[first] * pair.hands[second] < 0 else 0
        cost += pair.tilt if self.tilts[first] != self.tilts[second] else 0
        return cost + (pair.side if self.sides[first] != self.sides[second] else 0)

    def total(self, choice: Choice) -> int:
        """Give the cost of a choice."""
        own = sum(UNPLACED if c is None else self.costs[c] for c in choice)
        return own + sum(
            self.pair_cost(pair, choice[pair.first], choice[pair.second]) for pair in self.pairs
        )


def greedy(problem: Problem, sweeps: int = 6) -> Choice:
    """Choose station by station what is cheapest beside the others, the tightest first."""
    choice: list[int | None] = [None] * len(problem.groups)
    order = sorted(range(len(problem.groups)), key=lambda s: (len(problem.groups[s]), s))
    for _ in range(sweeps):
        before = tuple(choice)
        for station in order:
            choice[station] = cheapest(problem, choice, station)
        if tuple(choice) == before:
            break
    return tuple(choice)


def cheapest(problem: Problem, choice: Sequence[int | None], station: int) -> int | None:
    """Give the candidate of one station that costs least beside the others' present ones."""
    best, best_cost = None, UNPLACED
    for candidate in problem.groups[station]:
        if any(choice[problem.station_of[c]] == c for c in problem.conflicts[candidate]):
            continue
        cost = problem.costs[candidate] + sum(
            _pair_cost_at(problem, pair, choice, station, candidate)
            for pair in problem.pairs_of[station]
        )
        if cost < best_cost:
            best, best_cost = candidate, cost
    return best


def _pair_cost_at(
    problem: Problem, pair: PairCost, choice: Sequence[int | None], station: int, candidate: int
) -> int:
    """Give what a pair pays if one of its stations takes a candidate."""
    if pair.first == station:
        return problem.pair_cost(pair, candidate, choice[pair.second])
    return problem.pair_cost(pair, choice[pair.first], candidate)


def solve(
    problem: Problem, start: Choice, free: Iterable[int] | None = None, work: float = 4.0
) -> Choice:
    """Choose anew for the free stations (all by default) beside the others; never worse.

    Parameters
    ----------
    problem
        The whole problem.
    start
        A choice without conflicts.
    free
        Stations that may change.
    work
        Limit in CP-SAT's deterministic seconds.
    """
    stations = sorted(set(range(len(problem.groups)) if free is None else free))
    model = _Model(problem, start, stations)
    solver = cp_model.CpSolver()
    solver.parameters.num_workers = 1
    solver.parameters.random_seed = 1
    solver.parameters.max_deterministic_time = work
    solver.parameters.linearization_level = 2  # the whole relaxation: it is nearly tight here
    status = solver.solve(model.model)
    if status not in (cp_model.OPTIMAL, cp_model.FEASIBLE):
        return start
    chosen = list(start)
    for station in stations:
        chosen[station] = next(
            (c for c in model.candidates_of(station) if solver.value(model.taken[c])), None
        )
    found = tuple(chosen)
    return found if problem.total(found) < problem.total(start) else start


class _Model:
    """The choice for some stations as a CP-SAT model; the others stay as they are."""

    def __init__(self, problem: Problem, start: Choice, stations: Sequence[int]) -> None:
        self.problem, self.start = problem, start
        self.free = frozenset(stations)
        self.model = cp_model.CpModel()
        self.cost: list[cp_model.LinearExprT] = []
        self.taken: dict[int, cp_model.IntVar] = {}
        self.unplaced: dict[int, cp_model.IntVar] = {}
        for station in stations:
            self._add_station(station)
        for station in stations:
            self._add_conflicts(station)
        for pair in problem.pairs:
            if {pair.first, pair.second} <= self.free:
                self._add_pair(pair)
        self.model.minimize(cp_model.LinearExpr.sum(self.cost))

    def _add_station(self, station: int) -> None:
        """Add a station's candidates that the fixed labels leave, with their own costs."""
        problem, start = self.problem, self.start
        fixed_pairs = [
            pair for pair in problem.pairs_of[station] if not {pair.first, pair.second} <= self.free
        ]
        for candidate in problem.groups[station]:
            rivals = (
                c
                for c in problem.conflicts[candidate]
                if (s := problem.station_of[c]) not in self.free and start[s] == c
            )
            if any(True for _ in rivals):
                continue
            variable = self.model.new_bool_var("")
            self.taken[candidate] = variable
            cost = problem.costs[candidate] + sum(
                _pair_cost_at(problem, pair, start, station, candidate) for pair in fixed_pairs
            )
            self.cost.append(cost * variable)
            self.model.add_hint(variable, start[station] == candidate)
        none = self.model.new_bool_var("")
        self.unplaced[station] = none
        self.cost.append(UNPLACED * none)
        self.model.add_hint(none, start[station] is None)
        self.model.add_exactly_one([none, *(self.taken[c] for c in self.candidates_of(station))])

    def candidates_of(self, station: int) -> list[int]:
        """Give those of a station's candidates that the fixed labels leave."""
        return [c for c in self.problem.groups[station] if c in self.taken]

    def _add_conflicts(self, station: int) -> None:
        """Forbid a candidate together with those of a later station that it excludes."""
        for candidate in self.candidates_of(station):
            against: dict[int, list[cp_model.IntVar]] = defaultdict(list)
            for other in sorted(self.problem.conflicts[candidate]):
                rival = self.problem.station_of[other]
                if rival > station and other in self.taken:
                    against[rival].append(self.taken[other])
            for rival in sorted(against):
                self.model.add_at_most_one([self.taken[candidate], *against[rival]])

    def _add_pair(self, pair: PairCost) -> None:
        """Let two neighbours pay for opposite hands, unlike angles and unlike sides."""
        problem = self.problem
        self._add_opposites(pair, pair.hands, pair.hand)
        ends = (*problem.groups[pair.first], *problem.groups[pair.second])
        tilts = {c: 1 if problem.tilts[c] else -1 for c in ends}
        self._add_opposites(pair, tilts, pair.tilt)
        if pair.side == 0:
            return
        unlike = self.model.new_bool_var("")
        self.cost.append(pair.side * unlike)
        for side in sorted({problem.sides[c] for c in problem.groups[pair.first]}):
            here = [
                self.taken[c] for c in self.candidates_of(pair.first) if problem.sides[c] == side
            ]
            there = [
                self.taken[c] for c in self.candidates_of(pair.second) if problem.sides[c] == side
            ]
            none = self.unplaced[pair.second]
            self.model.add(sum(here) <= sum(there) + none + unlike)

    def _add_opposites(self, pair: PairCost, signs: Mapping[int, int], cost: int) -> None:
        """Charge a cost if the chosen candidates' signs are opposite."""
        if cost == 0:
            return
        opposite = self.model.new_bool_var("")
        self.cost.append(cost * opposite)
        for way in (-1, 1):
            here = [self.taken[c] for c in self.candidates_of(pair.first) if signs[c] == way]
            there = [self.taken[c] for c in self.candidates_of(pair.second) if signs[c] == -way]
            if here and there:
                self.model.add(sum(here) + sum(there) <= 1 + opposite)
