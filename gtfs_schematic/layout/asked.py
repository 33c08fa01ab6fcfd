"""What a person asks of the layout: places beside others, directions of links, straight lines."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.errors import LayoutError
from gtfs_schematic.layout.board import Board
from gtfs_schematic.layout.model import LayoutSettings
from gtfs_schematic.layout.plane import Piece, PlaneGraph
from gtfs_schematic.layout.rows import Rows
from gtfs_schematic.network.model import Network

Relative = tuple[int, int, int, float]
"""Vertex, the vertex that it is seen from, axis, and the difference in millimetres, y north."""

PORTS: Mapping[str, int] = {
    "E": 0, "NE": 1, "N": 2, "NW": 3, "W": 4, "SW": 5, "S": 6, "SE": 7,
}  # fmt: skip
_ELSEWHERE = 60_000
"""Price of a piece end that leaves otherwise than asked: ten times the sharpest bend."""
_LINES = 40
"""For how many lines one counts that is to go straight."""


def kept_stations(network: Network, settings: LayoutSettings) -> frozenset[str]:
    """Give the stations that must be vertices of their own, since something is asked of them.

    Raises
    ------
    LayoutError
        If a pin or a drift limit names a station that the network does not have.
    """
    pinned = {*settings.pins, *settings.pins_from}
    pinned |= {other for other, _, _ in settings.pins_from.values()}
    strangers = sorted(pinned - set(network.station))
    if strangers:
        raise LayoutError(
            f"Pinned stations that the network does not have: {', '.join(strangers)}. Station ids "
            "are those of edition.json."
        )
    unknown = sorted(set(settings.drift_limits_m) - set(network.station))
    if unknown:
        raise LayoutError(
            f"Drift limits for stations that the network does not have: {', '.join(unknown)}. "
            "Station ids are those of edition.json."
        )
    links = [network.link[key] for key in settings.directions if key in network.link]
    ends = {end for link in links for end in (link.start, link.end)}
    return frozenset(pinned | ends | (set(settings.straights) & set(network.station)))


def ask(board: Board, settings: LayoutSettings) -> None:
    """Put prices on what a person does not want; the board's lattice stages heed them."""
    for p, piece in enumerate(board.graph.pieces):
        for key, forward in _owners(piece):
            if key in settings.directions:
                port = PORTS[settings.directions[key]]
                for end, away in ((2 * p, forward), (2 * p + 1, not forward)):
                    costs = np.full(8, _ELSEWHERE, dtype=np.int64)
                    costs[port if away else (port + 4) % 8] = 0
                    board.bearing_costs[end] = board.bearing_costs[end] + costs
    for v, station in enumerate(board.graph.station_of):
        wanted = set(settings.straights.get(station or "", ()))
        for end in board.graph.rotation[v]:
            mine = wanted & set(board.graph.pieces[end // 2].lines)
            board.turns[end] = [
                (
                    other,
                    _LINES if mine & set(board.graph.pieces[other // 2].lines) else lines,
                    at,
                )
                for other, lines, at in board.turns[end]
            ]


def _owners(piece: Piece) -> list[tuple[str, bool]]:
    """Give links and walks that a piece is part of, if it is part of no other on its way."""
    if len(piece.parts) > 1:
        return []
    return [(piece.parts[0].owner, piece.parts[0].forward)]


def relative_pins(graph: PlaneGraph, settings: LayoutSettings) -> tuple[Relative, ...]:
    """Give the pins seen from other stations by vertices; y north."""
    vertex = {station: v for v, station in enumerate(graph.station_of) if station is not None}
    found: list[Relative] = []
    for station, (other, dx, dy) in sorted(settings.pins_from.items()):
        if dx is not None:
            found.append((vertex[station], vertex[other], 0, dx))
        if dy is not None:
            found.append((vertex[station], vertex[other], 1, -dy))
    return tuple(found)


def hold_relative(
    equal: Rows, axes: Sequence[NDArray[np.int64]], relative: Sequence[Relative]
) -> None:
    """Add the rows that keep pins as seen from other stations.

    Parameters
    ----------
    equal
        Rows of a linear programme.
    axes
        The columns of x and of y of all nodes.
    relative
        What is kept.
    """
    for v, other, axis, value in relative:
        columns = axes[axis]
        equal.add([(columns[[v]], 1.0), (columns[[other]], -1.0)], value)
