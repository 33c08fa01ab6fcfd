"""Find where lines on one street join and part between stations."""

from __future__ import annotations

import itertools
from collections import Counter, defaultdict
from collections.abc import Callable, Container, Iterable, Mapping, Sequence
from dataclasses import dataclass

from gtfs_schematic.geometry import Point, distance
from gtfs_schematic.network.ground import Ground
from gtfs_schematic.network.hops import street_hops
from gtfs_schematic.network.links import Expansion, Pair
from gtfs_schematic.network.model import Junction, NetworkSettings
from gtfs_schematic.network.patterns import Ids
from gtfs_schematic.network.sharing import Sharing
from gtfs_schematic.network.streets import StreetGraph, without_circles
from gtfs_schematic.network.tracks import Track, length_of

_MERGE = 2.5
"""Junctions that a link of less than so many `alongside_m` joins become one: the corners of one
crossroads."""


@dataclass(frozen=True)
class Junctions:
    """Which hops share streets, and where they join and part."""

    places: Mapping[str, Point]
    """Per junction its place, local metres."""
    over: Mapping[Pair, Ids]
    """Per hop that shares a street its nodes, stations and junctions, from the lesser station id
    to the greater."""


def junctions_of(
    tracks: Sequence[Track],
    expansion: Expansion,
    way_of: Mapping[str, str],
    at: Mapping[str, Point],
    settings: NetworkSettings,
) -> Junctions:
    """Lay all hops on streets into one graph, the longest first, and find its junctions.

    Two hops share a street where their courses are no further apart than `alongside_m` and turned
    by no more than `alongside_deg`, either way round, for at least `alongside_min_m` (the tests of
    samples in Bast, Brosi and Storandt 2018). A hop may pass a station there, unless a pattern on
    the hop calls at it right before or after.

    Parameters
    ----------
    tracks
        All kept patterns.
    expansion
        Which steps run over further stations.
    way_of
        Per line id the kind of way that it runs on.
    at
        Places of the stations, local metres.
    settings
        For the tolerances.
    """
    hops = street_hops(tracks, expansion, way_of, at)
    graph = StreetGraph(at, _barred(tracks, expansion), Sharing.by(settings))
    for hop in sorted(hops, key=lambda hop: (-length_of(hops[hop]), hop)):
        graph.lay(hop, hops[hop])
    draft = _Draft(graph.chains, dict(graph.junctions))
    draft.tidy(_MERGE * settings.alongside_m)
    return Junctions(draft.places, draft.over())


def _barred(tracks: Iterable[Track], expansion: Expansion) -> dict[Pair, set[str]]:
    """Per hop the stations that a pattern on it calls at, or passes, right before or after."""
    barred: dict[Pair, set[str]] = defaultdict(set)
    for track in tracks:
        ids = track.calling.stations
        ways = [expansion.way(a, b) for a, b in itertools.pairwise(ids)]
        for i, way in enumerate(ways):
            about = set(itertools.chain.from_iterable(ways[max(0, i - 1) : i + 2]))
            for a, b in itertools.pairwise(way):
                barred[min(a, b), max(a, b)] |= about - {a, b}
    return barred


def named_junctions(
    places: Mapping[str, Point], ground: Ground, stations: Container[str]
) -> dict[str, Junction]:
    """Give junctions ids that say where they are, so that they keep them from feed to feed.

    Parameters
    ----------
    places
        Per junction its place, local metres.
    ground
        For degrees.
    stations
        Ids that are taken.
    """
    named: dict[str, Junction] = {}
    taken: set[str] = set()
    degrees = ground.degrees([places[key] for key in sorted(places)])
    for key, (lon, lat) in zip(sorted(places), degrees, strict=True):
        name = f"@{lon:.5f},{lat:.5f}"
        while name in stations or name in taken:
            name += "@"
        taken.add(name)
        named[key] = Junction(name, round(float(lon), 7), round(float(lat), 7))
    return named


@dataclass
class _Draft:
    """Chains of nodes that become what all hops agree on."""

    chains: dict[Pair, list[str]]
    places: dict[str, Point]

    def tidy(self, near_m: float) -> None:
        """Leave one way from station to station, and no junction where nothing joins or parts."""
        while self._merged(near_m) or self._agreed() or self._without_idle():
            pass
        used = {node for chain in self.chains.values() for node in chain}
        self.places = {node: at for node, at in sorted(self.places.items()) if node in used}

    def over(self) -> dict[Pair, Ids]:
        """Give the nodes of every hop that has more than its ends, and of every part of one."""
        parts = {
            (part[0], part[-1]): part
            for chain in self.chains.values()
            for part in self._parts(chain)
        }
        known = {hop: tuple(chain) for hop, chain in self.chains.items()}
        known |= {
            (p, q) if p < q else (q, p): part if p < q else part[::-1]
            for (p, q), part in parts.items()
        }
        return {hop: way for hop, way in sorted(known.items()) if len(way) > 2}

    def _parts(self, chain: Sequence[str]) -> list[Ids]:
        """Cut a chain at the stations on it."""
        cuts = [i for i, node in enumerate(chain) if node not in self.places]
        return [tuple(chain[i : j + 1]) for i, j in itertools.pairwise(cuts)]

    def _agreed(self) -> bool:
        """Give every two stations one way between them: their own, or that of most hops."""
        count: dict[Pair, Counter[Ids]] = defaultdict(Counter)
        for chain in self.chains.values():
            for part in self._parts(chain):
                way = part if part[0] < part[-1] else part[::-1]
                count[way[0], way[-1]][way] += 1
        best = {
            pair: tuple(self.chains[pair])
            if pair in self.chains
            else min(ways, key=lambda way: (-ways[way], len(way), way))
            for pair, ways in count.items()
        }
        return self._rewritten(
            lambda chain: [
                chain[0],
                *(
                    node
                    for part in self._parts(chain)
                    for node in (
                        best[part[0], part[-1]]
                        if part[0] < part[-1]
                        else best[part[-1], part[0]][::-1]
                    )[1:]
                ),
            ]
        )

    def _without_idle(self) -> bool:
        """Take out the junctions at which fewer than three edges meet."""
        around = self._around()
        idle = {node for node in self.places if len(around[node]) < 3}
        return self._rewritten(lambda chain: [node for node in chain if node not in idle])

    def _merged(self, near_m: float) -> bool:
        """Make one of junctions that an edge joins and that are close to each other."""
        for node, others in sorted(self._around().items()):
            for other in sorted(others):
                if node < other and node in self.places and other in self.places:
                    p, q = self.places[node], self.places[other]
                    if distance(p, q) < near_m:
                        self.places[node] = ((p[0] + q[0]) / 2.0, (p[1] + q[1]) / 2.0)
                        return self._renamed(other, node)
        return False

    def _renamed(self, old: str, new: str) -> bool:
        return self._rewritten(lambda chain: [new if key == old else key for key in chain])

    def _around(self) -> dict[str, set[str]]:
        around: dict[str, set[str]] = defaultdict(set)
        for chain in self.chains.values():
            for p, q in itertools.pairwise(chain):
                around[p].add(q)
                around[q].add(p)
        return around

    def _rewritten(self, rule: Callable[[Sequence[str]], Iterable[str]]) -> bool:
        """Change all chains by a rule; whether that changed anything."""
        fresh = {hop: without_circles(rule(chain)) for hop, chain in self.chains.items()}
        changed = fresh != self.chains
        self.chains = fresh
        return changed
