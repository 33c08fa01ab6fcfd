"""Move bundles aside from the middle of their links, so that lines run straight past stations.

Were every bundle centred on its link, all its lines would jog by half a pitch wherever one joins or
leaves on one side: along a street with close stops the whole bundle would wiggle. Moved aside, the
lines that go on run on straight, and only those jog that make room for another.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Mapping

import numpy as np
import shapely
from scipy import sparse
from scipy.optimize import linprog

from gtfs_schematic.bundles.joints import is_straight
from gtfs_schematic.bundles.junction import Junction
from gtfs_schematic.bundles.slots import Slots
from gtfs_schematic.layout.model import Layout

_MOST_PITCHES = 3.0
"""No bundle is moved further from its link."""
_CORNER_SHARE = 0.25
"""Share of a link along which a bundle moved aside may take the corner at its end."""
_CENTRED = 0.05
"""What a millimetre aside costs beside a millimetre that a line has to jog."""
_LEAST_MM = 0.01


def asides(layout: Layout, nodes: Mapping[str, Junction], slots: Slots) -> Mapping[str, float]:
    """Give how far each bundle is moved to the right of its link, millimetres; only those that are.

    A linear programme: the least sum, over all lines and the stations that they pass straight, of
    how far each jogs there, and a little for being off the middle. A bundle moves into free room
    only: at most half of what it and any other that is not its neighbour have between them.
    """
    links = [link.id for link in layout.network.links]
    index = {key: i for i, key in enumerate(links)}
    rows: list[tuple[int, float, int, float, float]] = []
    for junction in nodes.values():
        for way in junction.passes:
            first, second = junction.leg[way.first], junction.leg[way.second]
            if is_straight(first, second):
                signs = [1.0 if leg.forward else -1.0 for leg in (first, second)]
                jog = slots.outward(first, way.line_id) + slots.outward(second, way.line_id)
                rows.append((index[way.first], signs[0], index[way.second], signs[1], jog))
    if not any(abs(row[4]) > _LEAST_MM for row in rows):
        return {}
    rooms = _rooms(layout, slots)
    for link_id, most in _beside_turns(nodes).items():
        rooms[link_id] = min(rooms[link_id], most)
    moved = _least_jogs(rows, np.array([rooms[key] for key in links]))
    found = np.round(moved, 4)
    return {key: float(found[i]) for key, i in index.items() if abs(found[i]) > _LEAST_MM}


def _least_jogs(rows: list[tuple[int, float, int, float, float]], most: np.ndarray) -> np.ndarray:
    """Solve the programme: unknowns are the asides, their sizes, and the jogs."""
    count, jogs = len(most), len(rows)
    a = np.array([[row[0], row[2]] for row in rows])
    signs = np.array([[row[1], row[3]] for row in rows])
    constant = np.array([row[4] for row in rows])
    line = np.arange(jogs)
    turn = sparse.coo_matrix(
        (signs.ravel(), (np.repeat(line, 2), a.ravel())), shape=(jogs, count)
    ).tocsr()
    one, none = sparse.identity(count), sparse.coo_matrix((count, jogs))
    each, empty = sparse.identity(jogs), sparse.coo_matrix((jogs, count))
    matrix = sparse.vstack(
        [
            sparse.hstack([turn, empty, -each]),
            sparse.hstack([-turn, empty, -each]),
            sparse.hstack([one, -one, none]),
            sparse.hstack([-one, -one, none]),
        ]
    ).tocsr()
    bound = np.concatenate([-constant, constant, np.zeros(2 * count)])
    cost = np.concatenate([np.zeros(count), np.full(count, _CENTRED), np.ones(jogs)])
    limits = [*((-m, m) for m in most.tolist()), *([(0.0, None)] * (count + jogs))]
    solved = linprog(cost, A_ub=matrix, b_ub=bound, bounds=limits, method="highs-ds")
    # Centred bundles are always a solution, so this one is there.
    return np.asarray(solved.x[:count])


def _beside_turns(nodes: Mapping[str, Junction]) -> dict[str, float]:
    """Give how far bundles may move that turn at an end, for the sake of the links at the turn.

    At 45 degrees a bundle moved aside takes the corner 1 / sin 45° times as far along the links.
    """
    most: dict[str, float] = {}
    for junction in nodes.values():
        for way in junction.passes:
            first, second = junction.leg[way.first], junction.leg[way.second]
            if is_straight(first, second):
                continue
            shortest = min(first.length_mm, second.length_mm)
            room = _CORNER_SHARE * shortest * math.sin(math.pi / 4.0)
            for link_id in (way.first, way.second):
                most[link_id] = min(most.get(link_id, math.inf), room)
    return most


def _rooms(layout: Layout, slots: Slots) -> dict[str, float]:
    """Give how far each bundle may move to either side."""
    network = layout.network
    pitch = slots.pitch
    half = np.array([slots.half_width(link.id) + pitch / 2.0 for link in network.links])
    lines = np.array([shapely.LineString(layout.paths[link.id]) for link in network.links])
    room = np.full(len(lines), _MOST_PITCHES * pitch)
    beside: dict[str, set[str]] = defaultdict(set)
    for link in network.links:
        beside[link.start].add(link.end)
        beside[link.end].add(link.start)
    near = {
        link.id: {link.start, link.end, *beside[link.start], *beside[link.end]}
        for link in network.links
    }
    reach = 2.0 * float(half.max()) + 2.0 * _MOST_PITCHES * pitch
    tree = shapely.STRtree(lines)
    pairs = tree.query(lines, predicate="dwithin", distance=reach).T
    for i, j in pairs[pairs[:, 0] < pairs[:, 1]].tolist():
        one, other = network.links[i], network.links[j]
        if {other.start, other.end} & near[one.id]:
            continue
        gap = float(lines[i].distance(lines[j]))
        if gap == 0.0:
            continue  # they cross
        free = max(0.0, (gap - half[i] - half[j]) / 2.0)
        room[i], room[j] = min(room[i], free), min(room[j], free)
    walks = [walk for walk in network.walks if walk.id in layout.walk_paths]
    paths = [shapely.LineString(layout.walk_paths[walk.id]) for walk in walks]
    ways = np.array(paths, dtype=object)
    for i, k in tree.query(ways, predicate="dwithin", distance=reach).T[:, ::-1].tolist():
        if {walks[k].start, walks[k].end} & near[network.links[i].id]:
            continue
        gap = float(lines[i].distance(ways[k]))
        if gap > 0.0:
            room[i] = min(room[i], max(0.0, gap - half[i] - pitch / 2.0))
    return {link.id: float(room[i]) for i, link in enumerate(network.links)}
