"""Search a curve leg by leg: from each crossing to the next, and by spots that it must not miss.

A search drawn to a course only by the distance from it would cut off a bay whose mouth is narrow:
so the far corners of the course, after Douglas and Peucker (1973), are spots to pass by, as near as
the face allows.
"""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.background.board import Board, Window, explore, nodes_of, window_of
from gtfs_schematic.background.search import Door, Found, Starts, trace

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Arcs = list[Ints]
"""Per face the nodes of a curve in it."""

_MARGINS_MM = (12.0, 40.0, 1e4)
CORNER_MM = 12.0
"""Corners of a course that stand out further are passed by."""
_SPOT_MM = 4.0
"""A curve passes by a spot no further than this beyond the nearest way."""
_CLOSE_MM = 0.5
"""So near to a spot no nearer way is looked for."""
_MISSED_MM = 25.0
"""A spot that no way comes nearer to is none."""
_BESIDE = 1.0
"""What passing by a spot costs per millimetre of distance."""
_FREE = np.zeros(1)
_NO_DOOR = Door(0, 0.0, 1.0, -1, -1)


@dataclass(frozen=True)
class _Ends:
    """Where a leg may end: states of its search, and the nodes, ways and costs of going on."""

    states: Ints
    onward: Starts


@dataclass(frozen=True)
class _Leg:
    found: Found
    window: Window
    ends: _Ends
    last: bool
    """Whether the leg ends at a crossing, not at a spot."""


def search(
    board: Board,
    starts: Starts,
    faces: Sequence[tuple[Floats, Door | Starts]],
    *,
    corner_mm: float = CORNER_MM,
) -> Arcs | None:
    """Search the best curve through some faces; None if there is none.

    Parameters
    ----------
    board
        Where it is searched.
    starts
        Where it begins.
    faces
        Per face the course (millimetres, y up, close points) and the way out: a door, or, in the
        last face, the nodes where the curve may end and what that costs.
    corner_mm
        It has to pass by corners of its course that stand out so far.
    """
    legs: list[_Leg] = []
    for course, out in faces:
        parts = _parts(course, board.lattice.calm * corner_mm)
        waiting: list[Floats] = []
        for k, part in enumerate(parts):
            whole = np.vstack([*waiting, part])
            last = k == len(parts) - 1
            leg = _leg(board, whole, starts, out) if last else _by_spot(board, whole, starts)
            if leg is None and last:
                return None
            if leg is None:
                waiting.append(part)
                continue
            waiting = []
            legs.append(leg)
            starts = leg.ends.onward
    return _traced(board, legs)


def search_stepwise(
    board: Board, starts: Starts, course: Floats, out: Door | Starts, corner_mm: float
) -> Ints | None:
    """Search through one face, spot after spot, each leg round those before it."""
    closed = board.lattice.closed
    before = closed.copy()
    legs: list[Ints] = []
    *parts, rest = _parts(course, board.lattice.calm * corner_mm)
    for part in parts:
        leg = _by_spot(board, part, starts)
        if leg is None:
            continue
        nodes = _traced(board, [replace(leg, last=True)])[0]
        if len(nodes) < 2:
            continue
        closed[nodes[:-1]] = True
        legs.append(nodes[:-1])
        starts = Starts(nodes[-1:], leg.ends.onward.ways[[np.argmin(leg.ends.onward.costs)]], _FREE)
    leg = _leg(board, rest, starts, out)
    if leg is not None:
        legs.append(_traced(board, [leg])[0])
    closed[:] = before
    return np.concatenate(legs) if leg is not None else None


def _traced(board: Board, legs: Sequence[_Leg]) -> Arcs:
    ends = legs[-1].ends
    state = int(ends.states[np.argmin(ends.onward.costs)])
    arcs: Arcs = []
    for k in range(len(legs) - 1, -1, -1):
        nodes, start = trace(legs[k].found, state, legs[k].window, board.lattice.width)
        if legs[k].last:
            arcs.append(nodes)
        else:
            # The leg after it began on the spot itself.
            arcs[-1] = np.concatenate([nodes, arcs[-1][1:]])
        if k:
            state = int(legs[k - 1].ends.states[start])
    return arcs[::-1]


def _parts(course: Floats, corner_mm: float) -> list[Floats]:
    """Cut a course at its far corners."""
    plain = shapely.LineString(course).simplify(corner_mm, preserve_topology=False)
    corners = np.asarray(plain.coords)
    cuts = [0]
    for corner in corners[1:-1]:
        rest = course[cuts[-1] :]
        cuts.append(cuts[-1] + int(np.argmin(np.abs(rest - corner).sum(axis=1))))
    cuts.append(len(course) - 1)
    return [course[a : b + 1] for a, b in itertools.pairwise(cuts)]


def _leg(board: Board, course: Floats, starts: Starts, out: Door | Starts) -> _Leg | None:
    """Search the last leg of a face, in a window that grows until there is a way out."""
    lattice = board.lattice
    places = [course, _likeliest(board, starts)]
    door = out if isinstance(out, Door) else _NO_DOOR
    if isinstance(out, Starts):
        places.append(_likeliest(board, out))
    elif out.node >= 0:
        places.append(lattice.at(np.array([out.node])))
    elif abs(out.number) <= len(board.planes.pieces):
        line = shapely.LineString(board.planes.pieces[abs(out.number) - 1].sheet)
        middle = line.interpolate((out.low + out.high) / 2.0, normalized=True)
        places.append(np.array(middle.coords))
    points = np.vstack(places)
    for margin in _MARGINS_MM:
        window = window_of(lattice, points, margin)
        found = explore(board, window, course, starts, door)
        ends = (
            _Ends(found.states, Starts(found.nodes, found.ways, found.costs))
            if isinstance(out, Door)
            else _at_goals(board, found, window, out)
        )
        if len(ends.states):
            return _Leg(found, window, ends, last=True)
    return None


def _by_spot(board: Board, course: Floats, starts: Starts) -> _Leg | None:
    """Search a leg that passes by the end of its course; None if nothing comes near."""
    lattice = board.lattice
    points = np.vstack([course, _likeliest(board, starts)])
    window = window_of(lattice, points, _MARGINS_MM[0])
    near = nodes_of(lattice, window_of(lattice, course[-1:], _CLOSE_MM))
    found = explore(board, window, course, starts, _NO_DOOR, until=near)
    reached = np.flatnonzero(np.isfinite(found.best))
    if len(reached) == 0:
        return None
    nodes = _nodes(lattice.width, window, reached)
    away = np.hypot(*(lattice.at(nodes) - course[-1]).T)
    nearest = float(away.min())
    if nearest > _MISSED_MM:
        return None
    near = away <= nearest + _SPOT_MM
    states, nodes = reached[near], nodes[near]
    costs = found.best[states] + _BESIDE * (away[near] - nearest)
    return _Leg(found, window, _Ends(states, Starts(nodes, states % 8, costs)), last=False)


def _at_goals(board: Board, found: Found, window: Window, goals: Starts) -> _Ends:
    """Give the states in which an open curve may end."""
    x0, y0, x1, y1 = window
    y, x = np.divmod(goals.nodes, board.lattice.width)
    inside = (x >= x0) & (x <= x1) & (y >= y0) & (y <= y1)
    cells = (y[inside] - y0) * (x1 - x0 + 1) + x[inside] - x0
    states = (cells[:, None] * 8 + np.arange(8)).ravel()
    costs = found.best[states] + np.repeat(goals.costs[inside], 8)
    states, costs = states[np.isfinite(costs)], costs[np.isfinite(costs)]
    nodes = _nodes(board.lattice.width, window, states)
    return _Ends(states, Starts(nodes, states % 8, costs))


def _nodes(width: int, window: Window, states: Ints) -> Ints:
    x0, y0, x1, _ = window
    rows, columns = np.divmod(states // 8, x1 - x0 + 1)
    return np.asarray((rows + y0) * width + columns + x0)


def _likeliest(board: Board, starts: Starts) -> Floats:
    """Give the places of the cheapest starts."""
    return board.lattice.at(starts.nodes[np.argsort(starts.costs, kind="stable")[:8]])
