"""Bridges that make every face simple: between parts of the network, and out of the sheet.

A part of the network that hangs together with no other is an island in a face, and the whole is one
in the plane; a word would not tell on which side of it a shore passes. A bridge from a station to
another, or to beyond everything, laid alike on both planes, counts in words like a link.
"""

from __future__ import annotations

import itertools
import math
from collections import defaultdict

import networkx as nx
import numpy as np
import shapely
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from gtfs_schematic.background.board import Board, nodes_of, window_of
from gtfs_schematic.background.lattice import lay
from gtfs_schematic.background.planes import Piece
from gtfs_schematic.background.search import Door, Starts, sweep, trace

Floats = NDArray[np.float64]

FAR = 3.0
"""How far bridges run out on the ground, in sizes of the network."""
_TRIED = 60
_ROUND_MM = 4.0
_ASIDE = 0.02
"""Bridges lie this share of a step beside the lattice's nodes."""
_OUT = ((0, 1), (0, -1), (1, 0), (-1, 0))


def add_bridges(board: Board) -> None:
    """Lay the bridges; one that finds no way is left away, and the check stands behind."""
    for a, b in _links_of_parts(board):
        _add(board, a, board.planes.ground[b], b)
    size = float(np.ptp(board.planes.ground, axis=0).max())
    for way in _OUT:
        v = int(np.argmax(board.planes.ground @ np.array(way)))
        _add(board, v, board.planes.ground[v] + FAR * size * np.array(way), None)


def _links_of_parts(board: Board) -> list[tuple[int, int]]:
    """Give, per part of the network but the largest, its nearest pair of stations in sight."""
    planes = board.planes
    index = {key: i for i, key in enumerate(planes.stations)}
    graph = nx.Graph()
    graph.add_nodes_from(range(len(planes.stations)))
    owners: dict[str, list[int]] = defaultdict(list)
    at: dict[bytes, int] = {}
    for piece in planes.pieces:
        owners[piece.owner] += [index[end] for end in piece.ends if end]
        for end in (0, -1):
            # Links that cross hang together at the crossing.
            point = np.round(piece.sheet[end], 2).tobytes()
            anchor = at.setdefault(point, len(at))
            graph.add_edge(("at", anchor), ("owner", piece.owner))
    for owner, ends in owners.items():
        graph.add_edges_from((end, ("owner", owner)) for end in ends)
    parts = [
        sorted(n for n in part if isinstance(n, int)) for part in nx.connected_components(graph)
    ]
    parts = sorted((part for part in parts if part), key=lambda part: (-len(part), part))
    walls = shapely.STRtree(shapely.linestrings([piece.ground for piece in planes.pieces]))
    return [pair for part in parts[1:] if (pair := _in_sight(board, part, walls)) is not None]


def _in_sight(board: Board, part: list[int], walls: shapely.STRtree) -> tuple[int, int] | None:
    ground = board.planes.ground
    others = np.setdiff1d(np.arange(len(ground)), part)
    if len(others) == 0:
        return None
    tree = cKDTree(ground[others])
    k = min(8, len(others))
    away, near = tree.query(ground[part], k=list(range(1, k + 1)))
    pairs = sorted(
        (float(away[i, j]), part[i], int(others[near[i, j]]))
        for i, j in itertools.product(range(len(part)), range(k))
    )
    for length, a, b in pairs[:_TRIED]:
        if length == 0.0:
            continue
        inner = ground[a] + np.array([[0.001], [0.999]]) * (ground[b] - ground[a])
        if len(walls.query(shapely.LineString(inner), predicate="intersects")) == 0:
            return a, b
    return None


def _add(board: Board, v: int, target: Floats, w: int | None) -> None:
    """Lay a bridge from station `v` to station `w`, or to far beyond the sheet."""
    planes, lattice = board.planes, board.lattice
    course = np.array([planes.ground[v], target])
    begin = _beside(board, v, course)
    if begin is None:
        return
    window = (0, 0, lattice.width - 1, lattice.height - 1)
    starts = Starts(begin, np.full(len(begin), -1), np.zeros(len(begin)))
    cost = np.zeros(lattice.width * lattice.height)
    goals = _outer(board, course) if w is None else _beside(board, w, course[::-1])
    if goals is None:
        return
    found = sweep(lattice, cost, window, starts, Door(0, 0.0, 1.0, -1, -1), until=goals)
    best = found.best.reshape(-1, 8)[goals]
    if not np.isfinite(best).any():
        return
    i, way = np.unravel_index(int(np.argmin(best)), best.shape)
    nodes, _ = trace(found, int(goals[i]) * 8 + int(way), window, lattice.width)
    path = lattice.at(nodes) + _ASIDE * lattice.pitch * np.array([1.0, 0.6])
    last = planes.sheet[w] if w is not None else path[-1] + 3.0 * (path[-1] - planes.sheet[v])
    if w is None:
        out = np.sign(course[1] - course[0]) * (np.abs(course[1] - course[0]) > 1e-6)
        last = path[-1] + 5.0 * lattice.pitch * out
    line = np.vstack([planes.sheet[v], path, last])
    ends = (planes.stations[v], planes.stations[w] if w is not None else "")
    planes.pieces.append(Piece(f"bridge {len(planes.pieces)}", course, line, 0.0, ends))
    lay(lattice, len(planes.pieces), line, None)


def _outer(board: Board, course: Floats) -> NDArray[np.int64]:
    """Give the nodes at the edge to which a bridge runs out."""
    w, h = board.lattice.width - 1, board.lattice.height - 1
    dx, dy = course[1] - course[0]
    if abs(dx) > abs(dy):
        x = w if dx > 0 else 0
        return nodes_of(board.lattice, (x, 0, x, h))
    y = h if dy > 0 else 0
    return nodes_of(board.lattice, (0, y, w, y))


def _beside(board: Board, v: int, course: Floats) -> NDArray[np.int64] | None:
    """Give the open nodes round a station in that corner in which a course leaves it."""
    planes, lattice = board.planes, board.lattice
    key = planes.stations[v]
    around = []
    for piece in planes.pieces:
        for end, step in ((0, 1), (-1, -1)):
            if piece.ends[end] == key:
                g, s = (line[end + step] - line[end] for line in (piece.ground, piece.sheet))
                around.append((math.atan2(g[1], g[0]), math.atan2(s[1], s[0])))
    around.sort()
    way = course[1] - course[0]
    turn = math.atan2(way[1], way[0])
    after = next((k for k, (g, _) in enumerate(around) if g > turn), 0)
    reach = float(np.abs(planes.markers[v] - planes.sheet[v]).max()) + _ROUND_MM
    nodes = nodes_of(lattice, window_of(lattice, planes.sheet[v][None, :], reach))
    nodes = nodes[~lattice.closed[nodes]]
    if around:
        low, high = around[after - 1][1], around[after][1]
        arc = (high - low) % math.tau or math.tau
        off = lattice.at(nodes) - planes.sheet[v]
        angles = (np.arctan2(off[:, 1], off[:, 0]) - low) % math.tau
        nodes = nodes[(angles > 0.02) & (angles < arc - 0.02)]
    return _seen(board, v, nodes)


def _seen(board: Board, v: int, nodes: NDArray[np.int64]) -> NDArray[np.int64] | None:
    """Keep the nodes that are seen from a station over no line."""
    if len(nodes) == 0:
        return None
    here, places = board.planes.sheet[v], board.lattice.at(nodes)
    rays = np.stack([here + 0.01 * (places - here), places], axis=1)
    walls = shapely.STRtree([shapely.LineString(piece.sheet) for piece in board.planes.pieces])
    hidden = walls.query(shapely.linestrings(rays), predicate="intersects")[0]
    kept = np.setdiff1d(np.arange(len(nodes)), hidden)
    return nodes[kept] if len(kept) else None
