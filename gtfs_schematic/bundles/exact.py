"""Order lines exactly: fewest crossings first, then fewest separations, proven by CP-SAT.

The integer programme orders pairs by binaries and keeps them transitive (after Asquith,
Gudmundsson, Merrick 2008; separations after Bast, Brosi, Storandt 2018). Work limits are counted
in the solver's deterministic time, never by the clock.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

from gtfs_schematic.bundles.greedy import Orders, left_of
from gtfs_schematic.bundles.problem import OrderProblem, Pair, Twist
from gtfs_schematic.lazily import lazily

if TYPE_CHECKING:
    from ortools.sat.python import cp_model
else:
    # Its import takes longer than most commands.
    cp_model = lazily("ortools.sat.python.cp_model")

_KEPT = 50_000
"""A pair of lines changes places with an earlier drawing: the dearest after a crossing."""
_SEPARATION = 10_000
"""Two neighbours part."""
_SANDWICH = 1000
"""A line that ends stands between one that goes on and the bundle's edge."""
_SWAP = 100
"""A crossing inside a bundle; where lines part anyway it shows less."""
_ROUTE_ORDER = 1
"""Two teams out of route order on one chain."""


class ComponentModel:
    """The integer programme of chains that depend on each other."""

    def __init__(self, problem: OrderProblem, chains: Sequence[int], start: Orders) -> None:
        self.problem = problem
        self.chains = tuple(chains)
        self.orders = {chain: list(start[chain]) for chain in chains}
        self.twists = tuple(twist for twist in problem.twists if twist.first in self.orders)
        self.model = cp_model.CpModel()
        self.left: dict[Pair, cp_model.IntVar] = {}
        for chain in self.chains:
            self._add_order(chain)
        for pair, left in problem.wanted.items():
            if pair in self.left:
                self.model.add(self.left[pair] == left)
        self.swaps = [self._differ(twist, "swap") for twist in self.twists]
        self.crossings = sum(
            (twist.weight * swap for twist, swap in zip(self.twists, self.swaps, strict=True)),
            start=cp_model.LinearExpr.constant(0),
        ) + sum(
            if_right + (if_left - if_right) * self.left[pair]
            for pair, (if_left, if_right) in problem.leans.items()
            if pair in self.left
        )

    def minimise_crossings(self, work: float, bound: int) -> int:
        """Minimise crossings, keep the best order found, and give a bound at least as good."""
        self.model.add(self.crossings >= bound)
        self.model.minimize(self.crossings)
        start = {chain: list(order) for chain, order in self.orders.items()}
        solver, found = self._solve(work)
        if not found:
            return bound
        if self.problem.kept and self._count(start) <= round(solver.objective_value):
            # As good, and as it stood: the second solve may not get back there.
            self.orders = start
        self.model.add(self.crossings <= round(solver.objective_value))
        return max(bound, math.ceil(solver.best_objective_bound - 1e-6))

    def minimise_separations(self, work: float) -> None:
        """Keep the crossings, and minimise what else looks unquiet."""
        apart = self._separations()
        self.model.minimize(
            _KEPT * self._exchanged()
            + _SEPARATION * sum(apart)
            + _SANDWICH * sum(self._sandwiches())
            + _SWAP * sum(self.swaps)
            + _ROUTE_ORDER
            * sum(
                1 - var if self.problem.chains[pair[0]].ascending else var
                for pair, var in self.left.items()
            )
        )
        self._solve(work)

    def _solve(self, work: float) -> tuple[cp_model.CpSolver, bool]:
        solver = cp_model.CpSolver()
        solver.parameters.num_workers = 1
        solver.parameters.random_seed = 1
        # Transitive orders have a strong linear relaxation; leaving it out costs the proof.
        solver.parameters.linearization_level = 2
        solver.parameters.max_deterministic_time = work
        self.model.clear_hints()  # type: ignore[no-untyped-call]
        for (chain, a, b), var in self.left.items():
            self.model.add_hint(var, left_of(self.orders, (chain, a, b)))
        status = solver.solve(self.model)
        if status not in (cp_model.OPTIMAL, cp_model.FEASIBLE):
            return solver, False
        for chain in self.chains:
            teams = self.problem.chains[chain].teams
            rank = {
                team: sum(
                    not solver.boolean_value(self._is_left(chain, team, other))
                    for other in teams
                    if other != team
                )
                for team in teams
            }
            self.orders[chain] = sorted(teams, key=rank.__getitem__)
        return solver, True

    def _is_left(self, chain: int, a: int, b: int) -> cp_model.BoolVarT:
        return self.left[chain, a, b] if a < b else ~self.left[chain, b, a]

    def _add_order(self, chain: int) -> None:
        teams = self.problem.chains[chain].teams
        for a, b in itertools.combinations(teams, 2):
            self.left[chain, a, b] = self.model.new_bool_var(f"left {chain} {a} {b}")
        for a, b, c in itertools.combinations(teams, 3):
            ab, bc, ac = self.left[chain, a, b], self.left[chain, b, c], self.left[chain, a, c]
            self.model.add_bool_or(~ab, ~bc, ac)
            self.model.add_bool_or(ab, bc, ~ac)

    def _differ(self, twist: Twist, name: str) -> cp_model.IntVar:
        """Give a binary that is 1 if the twist crosses."""
        swap = self.model.new_bool_var(f"{name} {twist.first} {twist.second} {twist.a} {twist.b}")
        first = self.left[twist.first, twist.a, twist.b]
        second = self.left[twist.second, twist.a, twist.b]
        for p, q in ((first, second), (~first, ~second)):
            self.model.add_bool_or(~p, ~q if twist.same else q, swap)
        return swap

    def _count(self, orders: dict[int, list[int]]) -> int:
        """Count the crossings of orders of the component's chains."""
        leans = sum(
            cost[0] if left_of(orders, pair) else cost[1]
            for pair, cost in self.problem.leans.items()
            if pair[0] in orders
        )
        return leans + sum(
            twist.weight
            * twist.crosses(
                left_of(orders, (twist.first, twist.a, twist.b)),
                left_of(orders, (twist.second, twist.a, twist.b)),
            )
            for twist in self.twists
        )

    def _exchanged(self) -> cp_model.LinearExpr:
        """Count the pairs of lines that change places with an earlier drawing."""
        costs = (
            if_right + (if_left - if_right) * self.left[pair]
            for pair, (if_left, if_right) in self.problem.kept.items()
            if pair in self.left
        )
        return sum(costs, start=cp_model.LinearExpr.constant(0))

    def _separations(self) -> list[cp_model.IntVar]:
        """Give binaries that are 1 if the teams of a twist are neighbours on one side only."""
        beside: dict[Pair, cp_model.IntVar] = {}
        for chain in sorted({c for twist in self.twists for c in (twist.first, twist.second)}):
            beside.update(self._neighbors(chain))
        apart = []
        for twist in self.twists:
            var = self.model.new_bool_var("apart")
            first = beside[twist.first, twist.a, twist.b]
            second = beside[twist.second, twist.a, twist.b]
            self.model.add_bool_or(~first, second, var)
            self.model.add_bool_or(first, ~second, var)
            apart.append(var)
        return apart

    def _neighbors(self, chain: int) -> dict[Pair, cp_model.IntVar]:
        """Give binaries that are 1 for just those pairs that are neighbours on the chain."""
        teams = self.problem.chains[chain].teams
        rank = {
            team: sum(self._is_left(chain, other, team) for other in teams if other != team)
            for team in teams
        }
        beside = {}
        for a, b in itertools.combinations(teams, 2):
            var = self.model.new_bool_var(f"beside {chain} {a} {b}")
            self.model.add(rank[a] - rank[b] <= 1).only_enforce_if(var)
            self.model.add(rank[b] - rank[a] <= 1).only_enforce_if(var)
            beside[chain, a, b] = var
        # No more than these pairs can be neighbours, so all that are must be marked.
        self.model.add(sum(beside.values()) == len(teams) - 1)
        return beside

    def _sandwiches(self) -> list[cp_model.IntVar]:
        """Give binaries for the lines that an ending line would cross to get outermost."""
        crossed = []
        for stub in self.problem.stubs:
            if stub.chain not in self.orders:
                continue
            to_left = self.model.new_bool_var("to the left")
            for team in stub.through:
                var = self.model.new_bool_var("crossed")
                is_left = self._is_left(stub.chain, stub.team, team)
                self.model.add_bool_or(~to_left, is_left, var)
                self.model.add_bool_or(to_left, ~is_left, var)
                crossed.append(var)
        return crossed
