"""Make vertices of the smoothed stations on a drawing whose directions are chosen."""

from __future__ import annotations

import itertools

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.layout.plane import Piece, PlaneGraph
from gtfs_schematic.layout.skeleton import Skeleton, build

_OFF_BEND = 0.2
"""Share of a part's length that its station keeps from a bend."""


def at_stations(skeleton: Skeleton) -> Skeleton:
    """Cut every piece at its stations, so that each of them has a place of its own.

    A station stands where its share of the piece ends, a little off bends; it may move along
    its segment, but never past a bend.
    """
    graph, firsts = _cut(skeleton.graph)
    routes: list[NDArray[np.float64]] = []
    places = np.zeros((graph.n_vertices, 2))
    places[: skeleton.graph.n_vertices] = skeleton.points[: skeleton.graph.n_vertices]
    for p, piece in enumerate(skeleton.graph.pieces):
        corners = skeleton.points[skeleton.polyline(p)]
        runs = _runs(corners, np.array([part.share for part in piece.parts]))
        for i in range(len(piece.stations)):
            places[graph.pieces[firsts[p] + i].ends[1]] = runs[i][-1]
        routes += runs
    return build(graph, places, routes)


def _cut(graph: PlaneGraph) -> tuple[PlaneGraph, list[int]]:
    """Give the graph with all points as vertices, and each old piece's first new one."""
    names: dict[int, str] = {}
    pieces: list[Piece] = []
    firsts: list[int] = []
    new_end: dict[int, int] = {}
    inner: list[tuple[int, int]] = []
    for p, piece in enumerate(graph.pieces):
        names.update(zip(piece.nodes[1:-1], piece.stations, strict=True))
        first, last = len(pieces), len(pieces) + len(piece.parts) - 1
        firsts.append(first)
        for i, part in enumerate(piece.parts):
            ends = (piece.nodes[i], piece.nodes[i + 1])
            pieces.append(Piece(ends, (part,), (), ends, piece.lines, piece.others))
        new_end[2 * p], new_end[2 * p + 1] = 2 * first, 2 * last + 1
        inner += [(2 * q + 1, 2 * q + 2) for q in range(first, last)]
    rotation = {v: tuple(new_end[end] for end in around) for v, around in enumerate(graph.rotation)}
    through = [(v, new_end[a], new_end[b], count) for v, a, b, count in graph.through]
    for a, b in inner:
        v = pieces[a // 2].ends[1]
        rotation[v] = (a, b)
        through.append((v, a, b, len(pieces[a // 2].lines)))
    order = range(len(graph.points))
    stations = tuple(names[v] for v in order[graph.n_vertices :])
    cut = PlaneGraph(
        points=graph.points,
        station_of=graph.station_of + stations,
        pieces=tuple(pieces),
        rotation=tuple(rotation[v] for v in order),
        through=tuple(sorted(through)),
        forks=graph.forks,
        junctions=graph.junctions,
    )
    return cut, firsts


def _runs(corners: NDArray[np.float64], shares: NDArray[np.float64]) -> list[NDArray[np.float64]]:
    """Cut a polyline into runs by shares of its length."""
    ends = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(corners, axis=0).T))])
    stops = np.cumsum(shares)[:-1] / shares.sum() * ends[-1]
    off = _OFF_BEND * float((shares / shares.sum()).min()) * ends[-1]
    for bend in ends[1:-1]:
        near = np.abs(stops - bend) < off
        stops = np.where(near, np.where(stops < bend, bend - off, bend + off), stops)
    stops = np.concatenate([[0.0], np.sort(stops), [ends[-1]]])
    runs = []
    for a, b in itertools.pairwise(stops):
        inside = corners[(ends > a + 1e-9) & (ends < b - 1e-9)]
        tips = [[np.interp(t, ends, corners[:, axis]) for axis in (0, 1)] for t in (a, b)]
        runs.append(np.vstack([tips[:1], inside, tips[1:]]))
    return runs
