"""State the ordering of lines as a small problem: chains, teams, and what makes them cross.

Metro-line crossing minimisation with free terminals (Bekos, Kaufmann, Potika, Symvonis 2008): every
link has one order of its lines, and at a station the ways of two lines cross if and only if they
interleave in the cyclic order of all ports. So two ways that share no link cross or not whatever
the order (*fixed*), two that share one link cross by the order in that link (*lean*), and two
that share both cross if their order flips (*twist*).
"""

from __future__ import annotations

import itertools
from collections import Counter, defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from gtfs_schematic.bundles.chains import Chain, find_branches, find_chains, find_teams
from gtfs_schematic.bundles.junction import Junction, Pass, junctions
from gtfs_schematic.layout.model import Layout

Pair = tuple[int, int, int]
"""Chain, and two teams a < b on it."""


@dataclass(frozen=True, slots=True)
class Twist:
    """Two teams a < b that go on together from one chain to another; they cross if they flip."""

    first: int
    second: int
    a: int
    b: int
    same: bool
    """Whether it is the crossing that keeps "a left of b" along both chains."""
    weight: int
    """Count of line pairs."""

    def crosses(self, first_left: bool, second_left: bool) -> bool:  # noqa: FBT001 - two truths
        """Say whether the teams cross if "a left of b" is so true on the two chains."""
        return (first_left == second_left) == self.same


@dataclass(frozen=True, slots=True)
class Seam:
    """A team of several lines that goes on from one chain to another."""

    team: int
    first: int
    second: int
    flip: bool
    """Whether its inner order, read along the chains, must flip to stay uncrossed."""


@dataclass(frozen=True, slots=True)
class Stub:
    """A team that ends at one end of a chain where the `through` teams go on."""

    chain: int
    team: int
    through: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class OrderProblem:
    """Teams on chains, with all that an order can cost."""

    teams: tuple[tuple[str, ...], ...]
    """Line ids per team, in route order."""
    chains: tuple[Chain, ...]
    leans: Mapping[Pair, tuple[int, int]]
    """Per pair the crossings if a is left of b, and those if b is left of a."""
    twists: tuple[Twist, ...]
    seams: tuple[Seam, ...]
    stubs: tuple[Stub, ...]
    fixed: int
    """Crossings that every order has."""
    wanted: Mapping[Pair, bool] = field(default_factory=dict)
    """Per pair whether a person wants a left of b."""
    kept: Mapping[Pair, tuple[int, int]] = field(default_factory=dict)
    """Per pair how many pairs of lines change places, over all links of the chain, if a is left of
    b, and how many if b is left of a."""
    inner: Mapping[tuple[int, int], int] = field(default_factory=dict)
    """Per chain and team how many more pairs of its lines stood in the team's order than not."""


@dataclass
class _Draft:
    team_of: Mapping[str, int]
    place: Mapping[str, tuple[int, bool]]
    """Per link its chain and whether that runs from `start` to `end`."""
    leans: dict[Pair, list[int]] = field(default_factory=dict)
    twists: Counter[tuple[str, str, int, int, int, int, bool]] = field(default_factory=Counter)
    seams: set[tuple[int, int, int, bool]] = field(default_factory=set)
    stubs: list[Stub] = field(default_factory=list)
    fixed: int = 0

    def outward(self, junction: Junction, link_id: str) -> tuple[int, bool]:
        """Give the chain of a link and whether the chain runs away from the station there."""
        chain, forward = self.place[link_id]
        return chain, forward == junction.leg[link_id].forward


def state_problem(
    layout: Layout,
    wanted: Mapping[str, Sequence[str]] | None = None,
    previous: Mapping[str, Sequence[str]] | None = None,
) -> OrderProblem:
    """Give the ordering problem of a layout; links of a single line do not appear in it.

    Parameters
    ----------
    layout
        With links and their lines.
    wanted
        Per link id the order that a person asks for of some of its lines, left to right.
    previous
        Per link id the order of an earlier drawing, left to right.
    """
    asked, old = wanted or {}, previous or {}
    nodes = junctions(layout)
    branches = find_branches(nodes)
    single = {line_id for lines in asked.values() for line_id in lines}
    teams = find_teams(layout, nodes, branches, single)
    single |= {line_id for team in teams if _was_parted(team, old) for line_id in team}
    teams = find_teams(layout, nodes, branches, single)
    teams = tuple(_as_before(team, old) for team in teams)
    team_of = {line_id: i for i, members in enumerate(teams) for line_id in members}
    chains = find_chains(layout, nodes, branches, team_of)
    place = {link_id: (i, fwd) for i, chain in enumerate(chains) for link_id, fwd in chain.links}
    draft = _Draft(team_of, place)
    for junction in nodes.values():
        for p, q in itertools.combinations(junction.passes, 2):
            if p.line_id != q.line_id:
                _add_crossing(draft, junction, p, q)
        _add_stubs(draft, layout, junction)
    return OrderProblem(
        teams=teams,
        chains=chains,
        leans={pair: (cost[0], cost[1]) for pair, cost in sorted(draft.leans.items())},
        twists=tuple(Twist(*key[2:], count) for key, count in sorted(draft.twists.items())),
        seams=tuple(Seam(*key) for key in sorted(draft.seams)),
        stubs=tuple(draft.stubs),
        fixed=draft.fixed,
        wanted=_wanted(draft, asked),
        kept=_kept(draft, old),
        inner=_inner(draft, teams, old),
    )


def _was_parted(team: tuple[str, ...], old: Mapping[str, Sequence[str]]) -> bool:
    """Whether another line stood between two of a team."""
    places = [[i for i, line in enumerate(order) if line in team] for order in old.values()]
    return any(found and found[-1] - found[0] >= len(found) for found in places)


def _as_before(team: tuple[str, ...], old: Mapping[str, Sequence[str]]) -> tuple[str, ...]:
    """Give a team in the order, from either side, that it had where most of it was together."""
    together = [tuple(line for line in old[key] if line in team) for key in sorted(old)]
    most = max(together, key=len, default=())
    known = most if most[:1] <= most[-1:] else most[::-1]
    return (*known, *(line for line in team if line not in known))


def _kept(draft: _Draft, old: Mapping[str, Sequence[str]]) -> dict[Pair, tuple[int, int]]:
    """Count what changes places with each order of two teams."""
    kept: dict[Pair, list[int]] = defaultdict(lambda: [0, 0])
    for link_id in sorted(set(old) & set(draft.place)):
        chain, forward = draft.place[link_id]
        lines = old[link_id] if forward else old[link_id][::-1]
        known = [draft.team_of[line_id] for line_id in lines if line_id in draft.team_of]
        for one, other in itertools.combinations(known, 2):
            if one != other:
                kept[chain, min(one, other), max(one, other)][one < other] += 1
    return {pair: (cost[0], cost[1]) for pair, cost in sorted(kept.items())}


def _inner(
    draft: _Draft, teams: tuple[tuple[str, ...], ...], old: Mapping[str, Sequence[str]]
) -> dict[tuple[int, int], int]:
    """Count how lines of one team stood along each chain."""
    inner: Counter[tuple[int, int]] = Counter()
    for link_id in sorted(set(old) & set(draft.place)):
        chain, forward = draft.place[link_id]
        lines = old[link_id] if forward else old[link_id][::-1]
        known = [line_id for line_id in lines if line_id in draft.team_of]
        for one, other in itertools.combinations(known, 2):
            team = draft.team_of[one]
            if team == draft.team_of[other]:
                rank = teams[team].index
                inner[chain, team] += 1 if rank(one) < rank(other) else -1
    return dict(sorted(inner.items()))


def _wanted(draft: _Draft, asked: Mapping[str, Sequence[str]]) -> dict[Pair, bool]:
    """Give the pairs of all wishes; of two at odds on a chain the first holds."""
    wanted: dict[Pair, bool] = {}
    for link_id in sorted(asked):
        if link_id not in draft.place:
            continue
        chain, forward = draft.place[link_id]
        lines = asked[link_id] if forward else asked[link_id][::-1]
        known = [draft.team_of[line_id] for line_id in lines if line_id in draft.team_of]
        fresh = {}
        for one, other in itertools.combinations(known, 2):
            fresh[chain, min(one, other), max(one, other)] = one < other
        if all(wanted.get(pair, left) == left for pair, left in fresh.items()):
            wanted |= fresh
    return dict(sorted(wanted.items()))


def _add_crossing(draft: _Draft, junction: Junction, p: Pass, q: Pass) -> None:
    shared = sorted({p.first, p.second} & {q.first, q.second})
    a, b = draft.team_of[p.line_id], draft.team_of[q.line_id]
    if len(shared) == 2:
        _add_twist(draft, junction, p, (min(a, b), max(a, b)))
    elif len(shared) == 1:
        link_id = shared[0]
        exits = [way.second if way.first == link_id else way.first for way in (p, q)]
        p_first = _turn(junction, link_id, exits[0]) < _turn(junction, link_id, exits[1])
        chain, away = draft.outward(junction, link_id)
        # Seen from the station, "a before b" clockwise crosses if a's exit is also before b's.
        a_left_crosses = p_first == away
        cost = draft.leans.setdefault((chain, min(a, b), max(a, b)), [0, 0])
        cost[0 if a_left_crosses == (a < b) else 1] += 1
    else:
        turns = [_turn(junction, p.first, link) for link in (p.second, q.first, q.second)]
        draft.fixed += (turns[1] < turns[0]) != (turns[2] < turns[0])


def _turn(junction: Junction, origin: str, link_id: str) -> int:
    """Count legs clockwise from one link to another."""
    return (junction.rank[link_id] - junction.rank[origin]) % len(junction.legs)


def _add_twist(draft: _Draft, junction: Junction, way: Pass, pair: tuple[int, int]) -> None:
    first, away_first = draft.outward(junction, way.first)
    second, away_second = draft.outward(junction, way.second)
    # Without a crossing the two orders, both seen from the station, are mirror images.
    same = away_first == away_second
    if first == second:
        draft.fixed += same
    elif pair[0] == pair[1]:
        draft.seams.add((pair[0], first, second, same))
    else:
        draft.twists[way.first, way.second, first, second, *pair, same] += 1


def _add_stubs(draft: _Draft, layout: Layout, junction: Junction) -> None:
    """Note where teams end in a link in which others go on; they look best outermost."""
    onward: dict[str, set[int]] = defaultdict(set)
    for way in junction.passes:
        onward[way.first].add(draft.team_of[way.line_id])
        onward[way.second].add(draft.team_of[way.line_id])
    for leg in junction.legs:
        through = tuple(sorted(onward[leg.link_id]))
        if leg.link_id not in draft.place or not through:
            continue
        teams = {draft.team_of[line_id] for line_id in layout.network.link[leg.link_id].lines}
        chain = draft.place[leg.link_id][0]
        draft.stubs.extend(Stub(chain, team, through) for team in sorted(teams.difference(through)))
