"""Order lines pair by pair: a lower bound for crossings, and a good order to start from."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping

from gtfs_schematic.bundles.problem import OrderProblem, Pair, Twist

Orders = list[list[int]]
"""Per chain its teams from left to right along the chain."""

_KEPT = 20
"""What a pair of lines costs that changes places with an earlier drawing."""
_CROSSING = 100_000
"""What a crossing costs beside a pair out of route order on one chain, which costs 1."""
_WISH = 10**12
"""What it costs to stand otherwise than a person asks."""
_MAX_SWEEPS = 25


def left_of(orders: Orders | Mapping[int, list[int]], pair: Pair) -> bool:
    """Say whether team a is left of team b on the pair's chain."""
    chain, a, b = pair
    return orders[chain].index(a) < orders[chain].index(b)


def count_crossings(problem: OrderProblem, orders: Orders) -> int:
    """Count the crossings of an order, those included that every order has."""
    leans = sum(
        cost[0] if left_of(orders, pair) else cost[1] for pair, cost in problem.leans.items()
    )
    twists = sum(
        twist.weight
        for twist in problem.twists
        if twist.crosses(
            left_of(orders, (twist.first, twist.a, twist.b)),
            left_of(orders, (twist.second, twist.a, twist.b)),
        )
    )
    return problem.fixed + leans + twists


def order_pairs(problem: OrderProblem) -> tuple[dict[int, int], dict[Pair, bool]]:
    """Order every two teams as if they were alone.

    Two teams meet on chains that their twists join; one tree of twists through them is solved
    exactly by dynamic programming. The sum over all pairs is a bound that no order can beat,
    since one order must serve all pairs at once (for lines that end at distinct stations of
    degree one it is the optimum).

    Returns
    -------
    tuple[dict[int, int], dict[Pair, bool]]
        Per chain the crossings that pairs met from there on cannot avoid: with those fixed they
        sum to the bound. And whether a is left of b, for every pair.
    """
    twists: dict[tuple[int, int], list[Twist]] = defaultdict(list)
    for twist in problem.twists:
        twists[twist.a, twist.b].append(twist)
    homes: dict[tuple[int, int], list[int]] = defaultdict(list)
    for index, chain in enumerate(problem.chains):
        for i, a in enumerate(chain.teams):
            for b in chain.teams[i + 1 :]:
                homes[a, b].append(index)
    bounds = dict.fromkeys(range(len(problem.chains)), 0)
    left: dict[Pair, bool] = {}
    for (a, b), places in sorted(homes.items()):
        costs, truth = _order_pair(problem, (a, b), places, twists[a, b])
        for root, cost in costs.items():
            bounds[root] += cost
        left.update({(place, a, b): is_left for place, is_left in truth.items()})
    return bounds, left


def _own_cost(problem: OrderProblem, pair: Pair) -> tuple[int, int]:
    """Cost on the chain alone if a is left of b, and if it is not."""
    if_left, if_right = problem.leans.get(pair, (0, 0))
    ascending = problem.chains[pair[0]].ascending
    wanted = problem.wanted.get(pair)
    moved_left, moved_right = problem.kept.get(pair, (0, 0))
    return (
        if_left * _CROSSING + (not ascending) + _KEPT * moved_left + _WISH * (wanted is False),
        if_right * _CROSSING + ascending + _KEPT * moved_right + _WISH * (wanted is True),
    )


def _order_pair(
    problem: OrderProblem, pair: tuple[int, int], chains: list[int], twists: list[Twist]
) -> tuple[dict[int, int], dict[int, bool]]:
    around: dict[int, list[tuple[int, Twist]]] = defaultdict(list)
    for twist in twists:
        around[twist.first].append((twist.second, twist))
        around[twist.second].append((twist.first, twist))
    totals, truth = dict[int, int](), dict[int, bool]()
    up: dict[int, tuple[int, Twist] | None] = {}
    for root in chains:
        if root in up:
            continue
        up[root] = None
        walk = [root]
        for chain in walk:
            for other, twist in around[chain]:
                if other not in up:
                    up[other] = (chain, twist)
                    walk.append(other)
        cost = {chain: list(_own_cost(problem, (chain, *pair))) for chain in walk}
        for chain in reversed(walk[1:]):
            parent, twist = up[chain] or (root, twists[0])
            for i in (0, 1):
                cost[parent][i] += min(_step(twist, i, k) + cost[chain][k] for k in (0, 1))
        truth[root] = cost[root][0] <= cost[root][1]
        totals[root] = min(cost[root]) // _CROSSING
        for chain in walk[1:]:
            parent, twist = up[chain] or (root, twists[0])
            i = 0 if truth[parent] else 1
            steps = [_step(twist, i, k) + cost[chain][k] for k in (0, 1)]
            truth[chain] = steps[0] <= steps[1]
    return totals, truth


def _step(twist: Twist, i: int, k: int) -> int:
    return _CROSSING * twist.weight * twist.crosses(i == 0, k == 0)


def order_greedily(problem: OrderProblem, left: Mapping[Pair, bool]) -> Orders:
    """Give an order for every chain: by pairs won, then one team moved at a time while it helps."""
    orders: Orders = []
    for index, chain in enumerate(problem.chains):
        wins = dict.fromkeys(chain.teams, 0)
        for i, a in enumerate(chain.teams):
            for b in chain.teams[i + 1 :]:
                wins[a if left[index, a, b] else b] += 1
        step = 1 if chain.ascending else -1
        orders.append(sorted(chain.teams, key=lambda team: (-wins[team], step * team)))
    _improve(problem, orders)
    return orders


def _improve(problem: OrderProblem, orders: Orders) -> None:
    touching: dict[Pair, list[Twist]] = defaultdict(list)
    for twist in problem.twists:
        touching[twist.first, twist.a, twist.b].append(twist)
        touching[twist.second, twist.a, twist.b].append(twist)
    for _ in range(_MAX_SWEEPS):
        better = False
        for index, chain in enumerate(problem.chains):
            gain = {
                (a, b): _gain_if_left(problem, orders, touching, (index, a, b))
                for i, a in enumerate(chain.teams)
                for b in chain.teams[i + 1 :]
            }
            for team in chain.teams:
                better |= _reinsert(orders[index], team, gain)
        if not better:
            return


def _gain_if_left(
    problem: OrderProblem, orders: Orders, touching: Mapping[Pair, list[Twist]], pair: Pair
) -> int:
    """Give the cost of "b left of a" less that of "a left of b", all other chains as they are."""
    if_left, if_right = _own_cost(problem, pair)
    for twist in touching.get(pair, ()):
        other = twist.second if twist.first == pair[0] else twist.first
        there = left_of(orders, (other, *pair[1:]))
        if_left += _CROSSING * twist.weight * twist.crosses(there, second_left=True)
        if_right += _CROSSING * twist.weight * twist.crosses(there, second_left=False)
    return if_right - if_left


def _reinsert(order: list[int], team: int, gain: Mapping[tuple[int, int], int]) -> bool:
    """Move a team to its cheapest place among the others; say whether it moved to a cheaper one."""
    start = order.index(team)
    rest = order[:start] + order[start + 1 :]
    # Moving the team right past another one: what "other left of team" gains.
    cost, costs = 0, [0]
    for other in rest:
        low, high = min(team, other), max(team, other)
        cost += gain[low, high] if team == low else -gain[low, high]
        costs.append(cost)
    best = min(range(len(costs)), key=lambda i: (costs[i], abs(i - start)))
    if costs[best] >= costs[start]:
        return False
    order[:] = [*rest[:best], team, *rest[best:]]
    return True


def as_before(problem: OrderProblem, orders: Orders) -> Orders:
    """Give orders in which teams stand as in the earlier drawing, where that knew them."""
    found: Orders = []
    for index, order in enumerate(orders):
        wins = dict.fromkeys(order, 0)
        for i, a in enumerate(order):
            for b in order[i + 1 :]:
                low, high = min(a, b), max(a, b)
                if_left, if_right = problem.kept.get((index, low, high), (0, 0))
                low_wins = if_left < if_right if if_left != if_right else low == a
                wins[low if low_wins else high] += 1
        found.append(sorted(order, key=lambda team: (-wins[team], order.index(team))))
    return found
