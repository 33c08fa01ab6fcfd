"""Local search on the lattice: every accepted step is cheaper and keeps every guarantee."""

from __future__ import annotations

import numpy as np

from gtfs_schematic.layout import router
from gtfs_schematic.layout.board import Board
from gtfs_schematic.layout.router import BLOCKED, DX, DY
from gtfs_schematic.progress import Progress

_MARGIN = 2.0


def improve(board: Board, sweeps: int, progress: Progress) -> None:
    """Re-route pieces and move vertices, alone and in rows, until nothing gains.

    At most `sweeps` rounds: a fixed amount of work, never a time.
    """
    progress.phase("improving", sweeps)
    for sweep in range(sweeps):
        gain = sum(_reroute(board, p) for p in range(len(board.paths)))
        reaches = (4, 2, 1) if sweep % 2 == 0 else (3, 1)
        for v in range(board.n):
            for reach in reaches:
                gain += _move(board, [v], max(1, reach * board.unit // 4))
        for row in _rows(board):
            for reach in (2, 1):
                gain += _move(board, row, max(1, reach * board.unit // 4))
        progress.step()
        if gain == 0:
            break


def _reroute(board: Board, p: int) -> int:
    """Give one piece its cheapest path past all others; returns the gain."""
    before = board.cost([p], [])
    old = board.lift(p)
    cost, path = board.route(p, _MARGIN)
    if cost >= BLOCKED or np.array_equal(path, old) or _sweeps_over(board, [(p, old, path)], []):
        board.lay(p, old)
        return 0
    board.lay(p, path)
    after = board.cost([p], [])
    if after < before:
        return before - after
    board.lift(p)
    board.lay(p, old)
    return 0


def _move(board: Board, block: list[int], step: int) -> int:
    """Move a block of vertices by `step` in the best of eight directions; returns the gain."""
    pieces = sorted({end // 2 for v in block for end in board.graph.rotation[v]})
    if not pieces:
        return 0
    before = best_cost = board.cost(pieces, block)
    places = {v: int(board.place[v]) for v in block}
    old = {p: board.lift(p) for p in pieces}
    best: dict[int, np.ndarray] | None = None
    best_shift = 0
    for v in block:
        board.take(v)
    for d in range(8):
        shift = step * (int(DY[d]) * board.width + int(DX[d]))
        found = _try(board, places, shift, pieces, best_cost)
        if found is None:
            continue
        cost, paths = found
        if cost < best_cost and not _sweeps_over(
            board, [(p, old[p], paths[p]) for p in pieces], block
        ):
            best, best_cost, best_shift = paths, cost, shift
    for v in block:
        board.put(v, places[v] + (best_shift if best is not None else 0))
    for p in pieces:
        board.lay(p, best[p] if best is not None else old[p])
    return before - best_cost if best is not None else 0


def _try(
    board: Board, places: dict[int, int], shift: int, pieces: list[int], limit: int
) -> tuple[int, dict[int, np.ndarray]] | None:
    """Try the block at a shifted place; leaves the board as it was, with the block lifted."""
    put: list[int] = []
    laid: list[int] = []
    result = None
    spent = 0
    for v, node in places.items():
        there = node + shift
        x = there % board.width
        if abs(x - node % board.width) > 8 * board.unit or not board.acceptable(there):
            break
        board.put(v, there)
        put.append(v)
        spent += board.anchor_cost(v, there)
    else:
        for p in pieces:
            cost, path = board.route(p, _MARGIN, limit - spent)
            if cost >= BLOCKED:
                break
            spent += cost
            board.lay(p, path)
            laid.append(p)
        else:
            paths = {p: board.paths[p] for p in pieces}
            result = (board.cost(pieces, list(places)), paths)
    for p in laid:
        board.lift(p)
    for v in put:
        board.take(v)
    return result  # type: ignore[return-value]


def _sweeps_over(
    board: Board, changes: list[tuple[int, np.ndarray, np.ndarray]], block: list[int]
) -> bool:
    """Say whether a change would carry a path over a vertex that stays: topology lost."""
    stay = board.xy(np.array([n for v, n in enumerate(board.place) if n >= 0 and v not in block]))
    for _, old, new in changes:
        ring = board.xy(np.concatenate([old, new[::-1]]))
        if router.encloses(ring, stay):
            return True
    return False


def _rows(board: Board) -> list[list[int]]:
    """Blocks of vertices that stand on one straight course, to be moved together."""
    follow: dict[int, int] = {}
    for p, path in enumerate(board.paths):
        if path is None or not board.graph.pieces[p].lines:
            continue
        steps = np.diff(np.column_stack([path % board.width, path // board.width]), axis=0)
        if (steps == steps[0]).all():
            follow[2 * p], follow[2 * p + 1] = 2 * p + 1, 2 * p
    rows: set[tuple[int, ...]] = set()
    for end in follow:
        row = _run(board, follow, end)
        if 2 <= len(row) <= 12:
            rows.add(tuple(sorted(set(row))))
    return [list(row) for row in sorted(rows)]


def _run(board: Board, follow: dict[int, int], end: int) -> list[int]:
    """Vertices met when walking straight on from a piece end, through both directions."""
    row = [board.position[end][0]]
    while end in follow and len(row) < 13:
        far = follow[end]
        row.append(board.position[far][0])
        onward = [other for other, _, _ in board.turns[far] if _straight(board, far, other)]
        if not onward:
            break
        end = onward[0]
    return row


def _straight(board: Board, a: int, b: int) -> bool:
    return abs(board.ports[a] - board.ports[b]) == 4
