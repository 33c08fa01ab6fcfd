"""First octilinear drawing: the plane graph grows onto the lattice, piece by piece.

Growing keeps what is drawn connected and in the ground's cyclic order, so the drawing always has
the ground's topology; where a piece finds no way, the lattice is halved and it does.
"""

from __future__ import annotations

import numpy as np

from gtfs_schematic.errors import LayoutError
from gtfs_schematic.layout.board import Board
from gtfs_schematic.layout.router import BLOCKED
from gtfs_schematic.progress import Progress

_MARGINS = (2.0, 6.0, 1e6)
_REACH = 1.6
_MOST_NODES = 6_000_000


def embed(board: Board, progress: Progress) -> None:
    """Put every vertex and piece of the board's graph onto its lattice.

    Raises
    ------
    LayoutError
        If a vertex has more pieces than there are directions, or the lattice grew too fine.
    """
    pieces = board.graph.pieces
    for v, around in enumerate(board.graph.rotation):
        if len(around) > 8:
            raise LayoutError(
                f"{board.graph.station_of[v]}: {len(around)} corridors meet at one station, more "
                "than the eight directions of the diagram. Leave out a line or split the station."
            )
    progress.phase("placing", len(pieces))
    waiting = set(range(len(pieces)))
    while True:
        ready = [p for p in waiting if any(board.place[v] >= 0 for v in pieces[p].ends)]
        if ready:
            p = min(ready, key=lambda p: _urgency(board, p))
            _insert(board, p)
            waiting.discard(p)
            progress.step()
            continue
        seeds = [v for v in range(board.n) if board.place[v] < 0]
        if not seeds:
            return
        _seed(board, max(seeds, key=lambda v: (_weight(board, v), -v)))


def _weight(board: Board, v: int) -> int:
    return sum(len(board.graph.pieces[end // 2].lines) for end in board.graph.rotation[v])


def _urgency(board: Board, p: int) -> tuple[int, int, float, int]:
    """Pieces that close a ring first, then busy ones, then short ones, then by number."""
    piece = board.graph.pieces[p]
    open_ends = sum(board.place[v] < 0 for v in piece.ends)
    return (open_ends, -min(len(piece.lines), 3), piece.spans, p)


def _seed(board: Board, v: int) -> None:
    """Stand the first vertex of a component on the acceptable node nearest to its anchor."""
    x, y = board.anchors[v] * board.unit
    nodes = np.arange(board.width * board.height)
    away = (nodes % board.width - x) ** 2 + (nodes // board.width - y) ** 2
    for node in np.argsort(away, kind="stable"):
        if board.acceptable(int(node)):
            board.put(v, int(node))
            return
    raise LayoutError("There is no room for all parts of the network: the lattice is full.")


def _insert(board: Board, p: int) -> None:
    """Lay piece `p`, refining the lattice until there is a way."""
    while True:
        if all(board.place[v] >= 0 for v in board.graph.pieces[p].ends):
            for margin in _MARGINS:
                cost, path = board.route(p, margin)
                if cost < BLOCKED and _simple(path):
                    board.lay(p, path)
                    return
        else:
            for factor, margin in zip((1.0, 2.0, 6.0), _MARGINS, strict=True):
                cost, path, new = board.route_to_new(p, _REACH * factor, margin)
                if cost < BLOCKED and _simple(path):
                    a, _ = board.graph.pieces[p].ends
                    board.put(new, int(path[0] if new == a else path[-1]))
                    board.lay(p, path)
                    return
        if 4 * board.width * board.height > _MOST_NODES:
            names = [board.graph.station_of[v] or "a crossing" for v in board.graph.pieces[p].ends]
            raise LayoutError(
                f"Between {names[0]} and {names[1]} the network is too dense to be drawn without "
                "new crossings. Draw fewer lines or modes at once."
            )
        board.refine()


def _simple(path: np.ndarray) -> bool:
    return len(np.unique(path)) == len(path) and len(path) >= 2
