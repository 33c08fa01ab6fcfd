"""What a good placement costs: the one place for the terms that the lattice stages minimise."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.layout.lattice import BLOCKED


@dataclass(frozen=True, slots=True)
class Weights:
    """Prices in thousandths of one station spacing of needless length.

    The terms are those of Nöllenburg and Wolff (2011): bends on lines, relative position (here
    distance from the true course and anchor), total length. 135 degrees is cheaper than 90 as in
    Bast, Brosi and Storandt (2020).
    """

    length: int = 500
    """Per spacing of drawn length."""
    bends: tuple[int, int, int, int] = (0, 900, 2200, 6000)
    """Per line that turns at a vertex by 0, 45, 90, 135 degrees (angle 180, 135, 90, 45)."""
    piece_bends: tuple[int, int] = (900, 2600)
    """Per line that turns on a piece between vertices by 45 or 90 degrees."""
    most_lines: int = 5
    """Lines beyond this count no more: a bend of a wide bundle is one bend to the eye."""
    walk_share: float = 0.4
    """Share of all prices that a walk pays."""
    crossing_bend: int = 2
    """How many lines a crossing counts for at least: crossings are passed straight."""
    near: int = 260
    """Per lattice node next to something else, for a lattice of one step per spacing."""
    course: int = 260
    """Per spacing of drawn length at one spacing from the true course."""
    claim: int = 4000
    """Per lattice step onto the course of a piece that is not laid yet."""
    anchor: int = 120
    """Per square spacing between a vertex and its anchor."""
    previous: int = 600
    """The same where the anchor is the vertex's place in the drawing before."""
    port: tuple[int, int, int, int, int] = (0, 150, 900, 2500, 4000)
    """Per piece end leaving at 0, 45, 90, 135, 180 degrees from its true bearing."""


def port_bearing_costs(bearing: float, weights: Weights) -> NDArray[np.int64]:
    """Cost of each of the eight ports for a piece whose true bearing (radians, ccw) is given."""
    costs = np.empty(8, dtype=np.int64)
    for port in range(8):
        turn = abs((port * np.pi / 4 - bearing + np.pi) % (2 * np.pi) - np.pi) / (np.pi / 4)
        low = min(int(turn), 3)
        share = turn - low
        costs[port] = round(weights.port[low] * (1 - share) + weights.port[low + 1] * share)
    return costs


@cache
def turn_costs(port: int, lines: int, weights: Weights) -> NDArray[np.int64]:
    """Cost of `lines` lines that pass a vertex from `port` to each of the eight; read-only."""
    costs = np.empty(8, dtype=np.int64)
    for other in range(8):
        between = min(abs(port - other), 8 - abs(port - other))
        costs[other] = BLOCKED if between == 0 else weights.bends[4 - between] * lines
    costs.setflags(write=False)
    return costs
