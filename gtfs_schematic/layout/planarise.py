"""Turn a network into its plane graph: crossings that the ground has become vertices."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Collection, Iterator

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.layout.ground import project
from gtfs_schematic.layout.plane import Part, Piece, PlaneGraph
from gtfs_schematic.network.model import Corridor, Network

_TOGETHER_M = 2.0
_ASIDE_M = 6.0
_LEAST_SHARE = 0.5
"""Share of a spacing that each part of a crossed link gets: crossings need room, too."""
_JUNCTION_SHARE = 0.6
"""Share of a spacing that a link gets at a junction: no marker and no name stands there."""


def planarise(network: Network, keep: Collection[str] = ()) -> PlaneGraph:
    """Draw the network with straight links on the ground and put vertices where they cross.

    Vertices are the stations and junctions at which corridors or walks end, and the crossings. A
    corridor that would join two vertices a second time, or a vertex to itself, keeps stations as
    vertices until the graph is simple where it can be; so do the stations to `keep`.
    """
    ids = [node.id for node in network.nodes]
    index = {node_id: i for i, node_id in enumerate(ids)}
    points = _general_position(
        project([(node.lon, node.lat) for node in network.nodes]),
        np.array([(index[k.start], index[k.end]) for k in network.links], dtype=np.int64),
    )
    chains = _chains(network)
    edges = [(index[a], index[b], owner) for a, b, owner, _ in _owners(network)]
    cuts, extra = _crossings(points, edges)
    points = np.vstack([points, extra]) if len(extra) else points
    kept = {end for chain in chains for end in (chain.station_ids[0], chain.station_ids[-1])}
    kept.update(keep)
    while True:
        pieces_raw = _split_chains(network, chains, kept, cuts, index)
        breakers = _loop_breakers(pieces_raw) - kept
        if not breakers:
            break
        kept |= breakers
    return _assemble(network, points, ids, kept, len(extra), pieces_raw)


def _owners(network: Network) -> list[tuple[str, str, str, tuple[str, ...]]]:
    links = [(link.start, link.end, link.id, link.lines) for link in network.links]
    return links + [(walk.start, walk.end, walk.id, ()) for walk in network.walks]


def _chains(network: Network) -> list[Corridor]:
    """All corridors, and each walk as a corridor without lines."""
    walks = [Corridor(w.id, (w.start, w.end), (w.id,), ()) for w in network.walks]
    return [*network.corridors, *walks]


def _general_position(points: NDArray[np.float64], links: NDArray[np.int64]) -> NDArray[np.float64]:
    """Move stations by a few metres so that none lies on another or on a foreign link.

    Without this a touch would be neither a crossing nor its absence. The golden angle gives each
    station a direction of its own.
    """
    points = points.copy()
    golden = math.pi * (3.0 - math.sqrt(5.0))
    for attempt in range(12):
        tree = shapely.STRtree(shapely.linestrings(points[links]))
        dots = shapely.points(points)
        touching: set[int] = set()
        for i, k in zip(*tree.query(dots, predicate="dwithin", distance=_TOGETHER_M), strict=True):
            if i not in links[k]:
                touching.add(int(i))
        near = shapely.STRtree(dots).query(dots, predicate="dwithin", distance=_TOGETHER_M)
        touching.update(int(max(i, j)) for i, j in zip(*near, strict=True) if i != j)
        if not touching:
            break
        for i in sorted(touching):
            angle = golden * (i + 7 * attempt)
            points[i] += _ASIDE_M * np.array([math.cos(angle), math.sin(angle)])
    return points


def _crossings(
    points: NDArray[np.float64], edges: list[tuple[int, int, str]]
) -> tuple[dict[str, list[tuple[float, int]]], NDArray[np.float64]]:
    """Find proper crossings; give per owner (parameter along it, point index), and the points."""
    ends = np.array([(a, b) for a, b, _ in edges], dtype=np.int64)
    lines = shapely.linestrings(points[ends])
    pairs = shapely.STRtree(lines).query(lines, predicate="intersects")
    cuts: dict[str, list[tuple[float, int]]] = defaultdict(list)
    extra: list[NDArray[np.float64]] = []
    for i, j in sorted({(int(i), int(j)) for i, j in pairs.T if i < j}):
        if set(ends[i]) & set(ends[j]):
            continue
        p, q = points[ends[i][0]], points[ends[j][0]]
        u, v = points[ends[i][1]] - p, points[ends[j][1]] - q
        det = u[0] * v[1] - u[1] * v[0]
        if det == 0.0:
            continue
        w = q - p
        s = (w[0] * v[1] - w[1] * v[0]) / det
        t = (w[0] * u[1] - w[1] * u[0]) / det
        node = len(points) + len(extra)
        extra.append(p + s * u)
        cuts[edges[i][2]].append((float(s), node))
        cuts[edges[j][2]].append((float(t), node))
    for stops in cuts.values():
        stops.sort()
    return cuts, np.array(extra).reshape(-1, 2)


_RawPiece = tuple[tuple[int, ...], tuple[Part, ...], tuple[str, ...], tuple[str, ...]]


def _loop_breakers(pieces: list[_RawPiece]) -> set[str]:
    """Stations to keep as vertices: two on a piece that is a loop, one on a doubled piece."""
    breakers: set[str] = set()
    seen: set[frozenset[int]] = set()
    for nodes, _, stations, _ in sorted(pieces, key=lambda piece: (len(piece[2]), piece[0])):
        ends = frozenset((nodes[0], nodes[-1]))
        if len(ends) == 1 and stations:
            breakers.update((stations[len(stations) // 3], stations[2 * len(stations) // 3]))
        elif ends in seen and stations:
            breakers.add(stations[len(stations) // 2])
        seen.add(ends)
    return breakers


def _split_chains(
    network: Network,
    chains: list[Corridor],
    kept: set[str],
    cuts: dict[str, list[tuple[float, int]]],
    index: dict[str, int],
) -> list[_RawPiece]:
    """Cut every chain at kept stations and crossings."""
    starts = {owner: a for a, _, owner, _ in _owners(network)}
    pieces: list[_RawPiece] = []
    for chain in chains:
        nodes = [index[chain.station_ids[0]]]
        parts: list[Part] = []
        stations: list[str] = []

        def close(
            nodes: list[int], parts: list[Part], stations: list[str], chain: Corridor = chain
        ) -> None:
            pieces.append((tuple(nodes), tuple(parts), tuple(stations), chain.lines))

        for i, owner in enumerate(chain.link_ids):
            forward = starts[owner] == chain.station_ids[i]
            stops = cuts.get(owner, [])
            share = max(1.0 / (len(stops) + 1), _LEAST_SHARE) if stops else 1.0
            if not network.junction.keys().isdisjoint(chain.station_ids[i : i + 2]):
                share *= _JUNCTION_SHARE
            for _, node in stops if forward else reversed(stops):
                close([*nodes, node], [*parts, Part(owner, share, forward)], stations)
                nodes, parts, stations = [node], [], []
            parts.append(Part(owner, share, forward))
            station = chain.station_ids[i + 1]
            nodes.append(index[station])
            if station in kept:
                close(nodes, parts, stations)
                nodes, parts, stations = [index[station]], [], []
            else:
                stations.append(station)
    return pieces


def _assemble(
    network: Network,
    points: NDArray[np.float64],
    ids: list[str],
    kept: set[str],
    n_crossings: int,
    raw: list[_RawPiece],
) -> PlaneGraph:
    """Renumber points so that vertices come first; find rotation and through pairs."""
    n = len(ids)
    vertices = [i for i in range(n) if ids[i] in kept] + list(range(n, n + n_crossings))
    order = vertices + [i for i in range(n) if ids[i] not in kept]
    new = {old: i for i, old in enumerate(order)}
    points = points[order]
    pieces = tuple(
        Piece(
            ends=(new[nodes[0]], new[nodes[-1]]),
            parts=parts,
            stations=stations,
            nodes=tuple(new[node] for node in nodes),
            lines=lines,
        )
        for nodes, parts, stations, lines in raw
    )
    station_of = tuple(ids[i] if i < n else None for i in vertices)
    rotation = _rotation(points, pieces, len(vertices))
    return PlaneGraph(
        points=points,
        station_of=station_of,
        pieces=pieces,
        rotation=rotation,
        through=_through(network, pieces, station_of),
        junctions=frozenset(network.junction),
    )


def _rotation(
    points: NDArray[np.float64], pieces: tuple[Piece, ...], n_vertices: int
) -> tuple[tuple[int, ...], ...]:
    around: list[list[tuple[float, int]]] = [[] for _ in range(n_vertices)]
    for p, piece in enumerate(pieces):
        for i, (v, w) in enumerate((piece.nodes[:2], piece.nodes[:-3:-1])):
            dx, dy = points[w] - points[v]
            around[v].append((math.atan2(dy, dx), 2 * p + i))
    return tuple(tuple(end for _, end in sorted(ends)) for ends in around)


def _through(
    network: Network, pieces: tuple[Piece, ...], station_of: tuple[str | None, ...]
) -> tuple[tuple[int, int, int, int], ...]:
    """Count, per vertex and pair of piece ends, the lines that run from one to the other."""
    end_at: dict[tuple[str, str], int] = {}
    crossing_ends: dict[tuple[int, str], list[int]] = defaultdict(list)
    vertex_of = {s: v for v, s in enumerate(station_of) if s is not None}
    for p, piece in enumerate(pieces):
        for i, part in ((0, piece.parts[0]), (1, piece.parts[-1])):
            v = piece.ends[i]
            station = station_of[v]
            if station is None:
                crossing_ends[v, part.owner].append(2 * p + i)
            else:
                end_at[station, part.owner] = 2 * p + i
    counts: dict[tuple[int, int, int], int] = defaultdict(int)
    for a, b, c in _passes(network):
        if b not in vertex_of:
            continue
        first = end_at[b, network.link_between[frozenset((a, b))].id]
        second = end_at[b, network.link_between[frozenset((b, c))].id]
        if first != second:
            low, high = sorted((first, second))
            counts[vertex_of[b], low, high] += 1
    for (v, owner), ends in crossing_ends.items():
        low, high = sorted(ends)
        counts[v, low, high] += len(network.link[owner].lines) if owner in network.link else 1
    return tuple((v, a, b, count) for (v, a, b), count in sorted(counts.items()))


def _passes(network: Network) -> Iterator[tuple[str, str, str]]:
    """Per line every (station before, station, station after) once, whatever the direction."""
    for line in network.lines:
        seen: set[tuple[str, frozenset[str]]] = set()
        for course in line.courses:
            for a, b, c in zip(course, course[1:], course[2:], strict=False):
                if (b, frozenset((a, c))) not in seen:
                    seen.add((b, frozenset((a, c))))
                    yield a, b, c
