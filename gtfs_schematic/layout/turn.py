"""Turn the ground so that most of what is drawn lies near the directions of the diagram.

To choose a rotation before the drawing follows Nickel and Nöllenburg (2019), "Data-Driven
Multilinear Metro Maps"; the squared angle, weighted by length, is common practice, no source.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.layout.plane import PlaneGraph

_WORTH = 0.8
"""Turned only if the angles get better than by this factor: north up is a good of its own."""
_WALK_SHARE = 0.2


def best_turn(graph: PlaneGraph, fidelity: float, step_deg: float) -> float:
    """Give the turn of the ground that suits directions `step_deg` apart best.

    Parameters
    ----------
    graph
        Plane graph on the ground, y north.
    fidelity
        How far links will be drawn to scale rather than evenly: their weight.
    step_deg
        Angle between neighbouring directions of the diagram.

    Returns
    -------
    float
        Whole degrees counter-clockwise, no more than half a step; 0 if no turn is worth it.
    """
    turns = range(-math.floor(step_deg / 2.0), math.floor(step_deg / 2.0) + 1)
    costs = {turn: _cost(graph, fidelity, step_deg, float(turn)) for turn in turns}
    best = min(turns, key=lambda turn: (costs[turn], abs(turn), turn))
    return float(best) if costs[best] < _WORTH * costs[0] else 0.0


def turned(graph: PlaneGraph, turn_deg: float) -> PlaneGraph:
    """Give the plane graph with its ground turned counter-clockwise about its middle."""
    if turn_deg == 0.0:
        return graph
    angle = math.radians(turn_deg)
    turn = np.array([[math.cos(angle), math.sin(angle)], [-math.sin(angle), math.cos(angle)]])
    return replace(graph, points=np.round(graph.points @ turn, 4))


def _cost(graph: PlaneGraph, fidelity: float, step_deg: float, turn_deg: float) -> float:
    """Sum of squared angles to the nearest direction, by the lengths that will be drawn."""
    a, b = graph.segments.T
    dx, dy = (graph.points[b] - graph.points[a]).T
    off = np.degrees(np.arctan2(dy, dx)) + turn_deg
    off -= step_deg * np.round(off / step_deg)
    return round(float(np.sum(_lengths(graph, fidelity) * off**2)), 6)


def _lengths(graph: PlaneGraph, fidelity: float) -> NDArray[np.float64]:
    """Length of every segment as it will be drawn, in station spacings."""
    a, b = graph.segments.T
    true = np.hypot(*(graph.points[b] - graph.points[a]).T)
    even = graph.segment_shares
    spacing = max(float(np.median(true / even)), 1e-9) if len(true) else 1.0
    walk = np.repeat(
        [piece.is_walk for piece in graph.pieces], [len(p.parts) for p in graph.pieces]
    )
    blend = (true / spacing) ** fidelity * even ** (1.0 - fidelity)
    return np.asarray(np.where(walk, _WALK_SHARE, 1.0) * blend)
