"""Local search on the lattice: every accepted step is cheaper and keeps every guarantee."""

from __future__ import annotations

import numpy as np

from gtfs_schematic.layout.board import Board
from gtfs_schematic.layout.lattice import BLOCKED, DX, DY, encloses
from gtfs_schematic.progress import Progress

_MARGIN = 2.0
_LONGEST_ROW = 16
_FURTHEST_ALIGNMENT = 6
"""Spacings by which a row may be moved at once to stand in line with a neighbour."""


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
                gain += _move(board, [v], _around(max(1, reach * board.unit // 4)))
        for row in _rows(board):
            for reach in (2, 1):
                gain += _move(board, row, _around(max(1, reach * board.unit // 4)))
            gain += _move(board, row, _aligning(board, row))
        progress.step()
        if gain == 0:
            break


def tidy(board: Board, progress: Progress) -> None:
    """Do the part of the same work that gains most: once over what bends, then rows into line."""
    progress.phase("improving", 1)
    for p in range(len(board.paths)):
        if _bends(board, p):
            _reroute(board, p)
    for v in range(board.n):
        if any(_bends(board, end // 2, end) for end in board.graph.rotation[v]):
            for reach in (3, 1):
                _move(board, [v], _around(max(1, reach * board.unit // 4)))
    for row in _rows(board):
        _move(board, row, _aligning(board, row))
    progress.step()


def _bends(board: Board, p: int, end: int | None = None) -> bool:
    """Whether a piece bends, or its lines do at one of its ends."""
    path = board.paths[p]
    if path is None or not board.graph.pieces[p].lines:
        return False
    steps = np.diff(board.xy(path), axis=0)
    return bool((steps != steps[0]).any()) or (
        end is not None
        and any(abs(board.ports[end] - board.ports[other]) != 4 for other, _, _ in board.turns[end])
    )


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


def _around(step: int) -> list[tuple[int, int]]:
    """Shifts by `step` in the eight directions."""
    return [(step * int(dx), step * int(dy)) for dx, dy in zip(DX, DY, strict=True)]


def _move(board: Board, block: list[int], shifts: list[tuple[int, int]]) -> int:
    """Move a block of vertices by the best of the shifts; returns the gain."""
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
    for dx, dy in shifts:
        shift = dy * board.width + dx
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
        # A shift past the side of the lattice comes out far away on another row.
        wrapped = abs(x - node % board.width) > board.width // 2
        if wrapped or not board.acceptable(there):
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
        if encloses(ring, stay):
            return True
    return False


def _rows(board: Board) -> list[list[int]]:
    """Blocks of vertices that stand on one straight course, to be moved together."""
    follow: dict[int, int] = {}
    for p, path in enumerate(board.paths):
        if path is None or not board.graph.pieces[p].lines:
            continue
        steps = np.diff(board.xy(path), axis=0)
        if (steps == steps[0]).all():
            follow[2 * p], follow[2 * p + 1] = 2 * p + 1, 2 * p
    rows: set[tuple[int, ...]] = set()
    for end in sorted(follow):
        row = _run(board, follow, end)
        if 2 <= len(row) <= _LONGEST_ROW:
            rows.add(tuple(row) if row[0] < row[-1] else tuple(reversed(row)))
    return [list(row) for row in sorted(rows)]


def _run(board: Board, follow: dict[int, int], end: int) -> list[int]:
    """Vertices met when walking straight on from a piece end."""
    row = [board.position[end][0]]
    while end in follow and len(row) <= _LONGEST_ROW:
        far = follow[end]
        row.append(board.position[far][0])
        onward = [other for other, _, _ in board.turns[far] if _straight(board, far, other)]
        if not onward or row[-1] in row[:-1]:
            break
        end = onward[0]
    return row


def _straight(board: Board, a: int, b: int) -> bool:
    return abs(board.ports[a] - board.ports[b]) == 4


def _aligning(board: Board, row: list[int]) -> list[tuple[int, int]]:
    """Shifts that put a row into line with a vertex to which its lines run on."""
    places = board.xy(board.place[[row[0], row[-1]]]).astype(int).tolist()
    (ax, ay), (bx, by) = places
    ux, uy = np.sign(bx - ax), np.sign(by - ay)
    shifts: set[tuple[int, int]] = set()
    for v in (row[0], row[-1]):
        for end in board.graph.rotation[v]:
            p = end // 2
            a, b = board.graph.pieces[p].ends
            other = b if end % 2 == 0 else a
            if other in row or not board.graph.pieces[p].lines:
                continue
            x, y = (int(c) for c in board.xy(board.place[[other]])[0])
            # How far the other vertex is off the row's straight line, across it.
            off = int(ux * (y - ay) - uy * (x - ax))
            if off and abs(off) <= _FURTHEST_ALIGNMENT * board.unit:
                options = [(0, off * ux)] if ux else []
                options += [(-off * uy, 0)] if uy else []
                shifts.update((int(dx), int(dy)) for dx, dy in options)
    return sorted(shifts)
