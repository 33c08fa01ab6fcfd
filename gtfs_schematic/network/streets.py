"""Lay hops into one graph of streets, so that those which run together use the same edges."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Iterable, Iterator, Mapping, Sequence
from collections.abc import Set as AbstractSet
from dataclasses import dataclass, field

import numpy as np

from gtfs_schematic.geometry import Point, distance
from gtfs_schematic.network.links import Pair
from gtfs_schematic.network.sharing import Sharing, Street, Stretch
from gtfs_schematic.network.tracks import Course

_SNAP = 1.5
"""Where a hop joins or leaves an edge within so many `near_m` of its end, it does so at the end."""
_END_M = 40.0
"""A stretch that begins this near to the end of a hop begins at its station, metres."""
_KERB = 2.0
"""A street passes a station within so many `near_m` of its place."""
_CELL_M = 400.0
"""Edges are looked up by squares of this size."""

Interval = tuple[float, float]


@dataclass
class StreetGraph:
    """Stations and junctions joined by streets; it grows hop by hop."""

    at: Mapping[str, Point]
    """Places of the stations, local metres."""
    barred: Mapping[Pair, AbstractSet[str]]
    """Per hop the stations that it may not pass."""
    sharing: Sharing
    junctions: dict[str, Point] = field(default_factory=dict)
    """Places of the junctions; their ids sort in the order in which they were found."""
    chains: dict[Pair, list[str]] = field(default_factory=dict)
    """Per hop its nodes, from the lesser station id to the greater."""
    _edges: dict[Pair, Street] = field(default_factory=dict)
    """From the lesser id to the greater."""
    _cells: dict[tuple[int, int], set[Pair]] = field(default_factory=lambda: defaultdict(set))
    _users: dict[Pair, set[Pair]] = field(default_factory=lambda: defaultdict(set))
    """Per edge the hops that use it."""
    _count: int = 0

    def lay(self, hop: Pair, course: Course) -> None:
        """Lay a hop: along edges that run in its street, and along new edges for the rest."""
        laying = _Laying(hop, Street.of(course))
        shared = {edge: self._shared(laying, edge) for edge in self._near(laying.street)}
        free = _long_runs(itertools.chain.from_iterable(shared.values()), self.sharing.least_m)
        while (choice := _longest(shared, free, self.sharing.near_m)) is not None:
            edge, stretch = choice
            free = list(_without(free, (stretch.start, stretch.end)))
            ends = self._ends(laying, edge, stretch)
            if ends is None:
                continue
            first, last = ends
            laying.pieces.append((first.own, last.own, [first.node, last.node]))
            inner = sorted((end.other, end.node) for end in ends if end.node not in edge)
            if inner:
                del shared[edge]
                for part in self._split(edge, inner, laying):
                    shared[part] = self._shared(laying, part)
        self._close(laying)

    def _shared(self, laying: _Laying, edge: Pair) -> list[Stretch]:
        return self.sharing.stretches(laying.street, self._edges[edge])

    def _near(self, street: Street) -> list[Pair]:
        """Edges that come into the squares about a street."""
        found: set[Pair] = set()
        for cell in _cells(street, 1):
            found |= self._cells.get(cell, set())
        return sorted(edge for edge in found if edge in self._edges)

    def _ends(self, laying: _Laying, edge: Pair, stretch: Stretch) -> tuple[_Cut, _Cut] | None:
        """Give the nodes at which a hop joins and leaves an edge; None if it should not."""
        first = self._node(laying, edge, stretch)
        last = self._node(laying, edge, stretch.reversed())
        if first is None or last is None or first.node == last.node:
            return None
        kept = first.own < last.own and (first.other < last.other) == (
            stretch.other_start < stretch.other_end
        )
        at_nodes = {first.node, last.node} <= {*edge, *laying.hop}
        if not kept or (abs(first.other - last.other) < self.sharing.near_m and not at_nodes):
            return None
        return first, last

    def _node(self, laying: _Laying, edge: Pair, stretch: Stretch) -> _Cut | None:
        """Give the node at the start of a stretch: one that is there, or a new junction.

        None if the hop or the edge would pass a station that it may not pass.
        """
        street, (own, other) = self._edges[edge], (stretch.start, stretch.other_start)
        ends = ((own, laying.hop[0]), (laying.street.length - own, laying.hop[1]))
        mine = next((station for gap, station in ends if gap <= _END_M), None)
        to_end, end = min((other, edge[0]), (street.length - other, edge[1]))
        snap = _SNAP * self.sharing.near_m
        if mine in edge:
            return _Cut(own, other, mine)
        if to_end <= snap and (end in self.junctions or (mine is None and end in laying.hop)):
            return _Cut(own, other, end)
        if to_end <= snap and mine is None and self._may_be_passed(laying, end, own):
            return _Cut(own, other, end)
        if to_end > snap and mine is not None:
            return _Cut(own, other, mine) if self._may_pass(edge, mine) else None
        if to_end <= snap:
            # Two stations side by side: the street is shared from a little further on.
            own, other = stretch.inward(snap)
        return self._new(laying, street, own, other)

    def _new(self, laying: _Laying, street: Street, own: float, other: float) -> _Cut:
        node = f"~{self._count:06d}"
        self._count += 1
        p, q = laying.street.place(own), street.place(other)
        self.junctions[node] = ((p[0] + q[0]) / 2.0, (p[1] + q[1]) / 2.0)
        return _Cut(own, other, node)

    def _may_be_passed(self, laying: _Laying, station: str, own: float) -> bool:
        """Whether a hop may pass a station that stands beside it."""
        beside = distance(self.at[station], laying.street.place(own))
        return (
            station not in self.barred.get(laying.hop, ()) and beside <= _KERB * self.sharing.near_m
        )

    def _may_pass(self, edge: Pair, station: str) -> bool:
        """Whether everything on an edge may pass a station that stands beside it."""
        gap, _ = self._edges[edge].tree.query(self.at[station])
        return bool(gap <= _KERB * self.sharing.near_m) and not any(
            station in self.barred.get(hop, ()) or station in self.chains[hop]
            for hop in self._users[edge]
        )

    def _split(self, edge: Pair, inner: list[tuple[float, str]], laying: _Laying) -> list[Pair]:
        """Put nodes on an edge, and on every chain that uses it; give the edges that it becomes."""
        street = self._edges.pop(edge)
        stops = [(0.0, edge[0]), *inner, (street.length, edge[1])]
        nodes = [node for _, node in stops]
        for chain in (*(self.chains[hop] for hop in self._users[edge]), *laying.chains()):
            _refine(chain, nodes)
        parts = []
        for (low, p), (high, q) in itertools.pairwise(stops):
            part = (min(p, q), max(p, q))
            piece = street.between(low, high) if p < q else street.between(high, low)
            self._add(part, piece, self._users[edge])
            parts.append(part)
        del self._users[edge]
        return parts

    def _add(self, edge: Pair, street: Street, users: Iterable[Pair]) -> None:
        self._users[edge].update(users)
        if edge not in self._edges:
            self._edges[edge] = street
            for cell in _cells(street, 0):
                self._cells[cell].add(edge)

    def _close(self, laying: _Laying) -> None:
        """Join the pieces of a hop by new edges, and take out what runs in a circle."""
        hop, street = laying.hop, laying.street
        chain, gaps = [hop[0]], {}
        at = 0.0
        for start, end, nodes in sorted(laying.pieces):
            gaps[chain[-1], nodes[0]] = (at, start)
            chain += nodes if nodes[0] != chain[-1] else nodes[1:]
            at = end
        gaps[chain[-1], hop[1]] = (at, street.length)
        chain += [hop[1]] if chain[-1] != hop[1] else []
        chain = without_circles(chain)
        self.chains[hop] = chain
        for p, q in itertools.pairwise(chain):
            low, high = gaps.get((p, q), (0.0, street.length))
            if high - low < 1.0:
                piece = Street(np.array([self._place(p), self._place(q)]))
            else:
                piece = street.between(low, high)
            self._add(
                (min(p, q), max(p, q)), piece if p < q else Street(piece.points[::-1]), (hop,)
            )

    def _place(self, node: str) -> Point:
        return self.junctions[node] if node in self.junctions else self.at[node]


@dataclass(frozen=True, slots=True)
class _Cut:
    """Where a hop joins or leaves an edge: how far along either, and the node there."""

    own: float
    other: float
    node: str


@dataclass
class _Laying:
    """A hop that is being laid."""

    hop: Pair
    street: Street
    pieces: list[tuple[float, float, list[str]]] = field(default_factory=list)
    """What it shares: from and to how far along it, and the nodes there."""

    def chains(self) -> list[list[str]]:
        """Give the nodes of all pieces, to be refined."""
        return [nodes for _, _, nodes in self.pieces]


def without_circles(chain: Iterable[str]) -> list[str]:
    """Take out what leads back to a node that the chain has passed."""
    kept: list[str] = []
    for node in chain:
        if node in kept:
            del kept[kept.index(node) :]
        kept.append(node)
    return kept


def _refine(chain: list[str], nodes: Sequence[str]) -> None:
    """Put nodes into a chain, in place, where it steps from the first of them to the last."""
    for i in range(len(chain) - 1, 0, -1):
        step = (chain[i - 1], chain[i])
        if step == (nodes[0], nodes[-1]):
            chain[i:i] = nodes[1:-1]
        elif step == (nodes[-1], nodes[0]):
            chain[i:i] = nodes[-2:0:-1]


def _cells(street: Street, around: int) -> set[tuple[int, int]]:
    squares = {(int(x), int(y)) for x, y in np.floor(street.points / _CELL_M)}
    shifts = range(-around, around + 1)
    return {(x + i, y + j) for x, y in squares for i in shifts for j in shifts}


def _long_runs(stretches: Iterable[Stretch], least_m: float) -> list[Interval]:
    """Unite stretches that touch, and keep what is long enough."""
    runs: list[Interval] = []
    for stretch in sorted(stretches, key=lambda s: (s.start, s.end)):
        if runs and stretch.start <= runs[-1][1] + _END_M:
            runs[-1] = (runs[-1][0], max(runs[-1][1], stretch.end))
        else:
            runs.append((stretch.start, stretch.end))
    return [(start, end) for start, end in runs if end - start >= least_m]


def _longest(
    shared: Mapping[Pair, Sequence[Stretch]], free: Sequence[Interval], least_m: float
) -> tuple[Pair, Stretch] | None:
    """Give the longest part of a stretch that lies in what is still free, and its edge."""
    parts = [
        (edge, part)
        for edge, stretches in shared.items()
        for stretch in stretches
        for interval in free
        if (part := _clipped(stretch, interval)).length >= least_m
    ]
    return min(parts, key=lambda found: (-found[1].length, found[1].start, found[0]), default=None)


def _clipped(stretch: Stretch, interval: Interval) -> Stretch:
    start, end = max(stretch.start, interval[0]), min(stretch.end, interval[1])
    own = (stretch.start, stretch.end)
    other = (stretch.other_start, stretch.other_end)
    low, high = np.interp([start, end], own, other)
    return Stretch(start, end, float(low), float(high))


def _without(free: Iterable[Interval], taken: Interval) -> Iterator[Interval]:
    for start, end in free:
        if taken[0] > start:
            yield start, min(end, taken[0])
        if taken[1] < end:
            yield max(start, taken[1]), end
