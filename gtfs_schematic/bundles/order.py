"""Order the lines of every link: fewest crossings, then fewest separations, then route order."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import networkx as nx

from gtfs_schematic.bundles.exact import ComponentModel
from gtfs_schematic.bundles.greedy import (
    Orders,
    as_before,
    count_crossings,
    order_greedily,
    order_pairs,
)
from gtfs_schematic.bundles.problem import OrderProblem, state_problem
from gtfs_schematic.layout.model import Layout
from gtfs_schematic.progress import Progress, Silent

_WORK = 1.0
"""Solver's deterministic time for each of the two solves of a component (about seconds)."""
_MOST_TRIPLES = 60_000
"""Larger components keep the greedy order: their programme would not be solved anyway."""


@dataclass(frozen=True, slots=True)
class LineOrder:
    """The order of lines in every link, its crossings, and a bound that no order can beat."""

    orders: Mapping[str, tuple[str, ...]]
    """Per link id the line ids from left to right as seen going from `start` to `end`."""
    crossings: int
    crossings_bound: int


def order_lines(
    layout: Layout,
    wanted: Mapping[str, Sequence[str]] | None = None,
    previous: Mapping[str, Sequence[str]] | None = None,
    *,
    progress: Progress = Silent(),  # noqa: B008 - it has no state
) -> LineOrder:
    """Order the lines of every link of a layout.

    What a person asks for (`wanted`, see `problem.state_problem`) goes before everything else.
    Lines stand as in the `previous` drawing, per link id, wherever that costs no crossing more.

    The pairwise bound and the greedy order come first; each component of chains that depend on
    each other is then solved exactly as far as a fixed amount of work allows.
    """
    problem = state_problem(layout, wanted, previous)
    bounds, left = order_pairs(problem)
    orders = order_greedily(problem, left)
    if problem.kept:
        orders = min(
            as_before(problem, orders), orders, key=lambda each: count_crossings(problem, each)
        )
    components = _components(problem)
    progress.phase("ordering lines", len(components))
    proven = problem.fixed
    for chains in components:
        bound = sum(bounds[chain] for chain in chains)
        if _triples(problem, chains) <= _MOST_TRIPLES:
            model = ComponentModel(problem, chains, orders)
            bound = model.minimise_crossings(_WORK, bound)
            model.minimise_separations(_WORK)
            for chain in chains:
                orders[chain] = model.orders[chain]
        proven += bound
        progress.step()
    return LineOrder(_by_link(layout, problem, orders), count_crossings(problem, orders), proven)


def _components(problem: OrderProblem) -> list[list[int]]:
    """Give the chains that twists join, directly or not, as sorted lists."""
    graph: nx.Graph[int] = nx.Graph()
    graph.add_nodes_from(range(len(problem.chains)))
    graph.add_edges_from((twist.first, twist.second) for twist in problem.twists)
    return sorted(sorted(component) for component in nx.connected_components(graph))


def _triples(problem: OrderProblem, chains: list[int]) -> int:
    return sum(math.comb(len(problem.chains[chain].teams), 3) for chain in chains)


def _by_link(
    layout: Layout, problem: OrderProblem, orders: Orders
) -> Mapping[str, tuple[str, ...]]:
    inner = _inner_orders(problem)
    by_link = {link.id: link.lines for link in layout.network.links}
    for index, chain in enumerate(problem.chains):
        lines = [
            line_id
            for team in orders[index]
            for line_id in problem.teams[team][:: 1 if inner[index, team] else -1]
        ]
        for link_id, forward in chain.links:
            by_link[link_id] = tuple(lines if forward else reversed(lines))
    return by_link


def _inner_orders(problem: OrderProblem) -> dict[tuple[int, int], bool]:
    """Say for every chain and team whether the team's lines stand in route order along it.

    The answer is carried over seams, so that the lines of a team never cross, and chosen so that
    most chains read in route order.
    """
    around: dict[tuple[int, int], list[tuple[int, bool]]] = defaultdict(list)
    for seam in problem.seams:
        around[seam.first, seam.team].append((seam.second, seam.flip))
        around[seam.second, seam.team].append((seam.first, seam.flip))
    inner: dict[tuple[int, int], bool] = {}
    for index, chain in enumerate(problem.chains):
        for team in chain.teams:
            if (index, team) in inner:
                continue
            found, walk = {index: True}, [index]
            for here in walk:
                for other, flip in around[here, team]:
                    if other not in found:
                        found[other] = found[here] != flip
                        walk.append(other)
            agreed = sum(
                1 if problem.chains[i].ascending == truth else -1 for i, truth in found.items()
            )
            # What stood so before decides; where nothing did, how most chains read.
            kept = sum(
                problem.inner.get((i, team), 0) * (1 if truth else -1) for i, truth in found.items()
            )
            turned = (kept or agreed) < 0
            inner.update({(i, team): truth != turned for i, truth in found.items()})
    return inner
