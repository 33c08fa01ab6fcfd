"""The candidates of all stations become a choice in whole numbers."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.labels.candidates import free_candidates
from gtfs_schematic.labels.choice import PairCost, Problem
from gtfs_schematic.labels.costs import candidate_costs
from gtfs_schematic.labels.model import LabelSettings
from gtfs_schematic.labels.neighbors import HAND, SIDE, TILTED, Neighbors, hand
from gtfs_schematic.labels.obstacles import Obstacles, Shapes
from gtfs_schematic.labels.positions import Candidate
from gtfs_schematic.labels.reach import Reach
from gtfs_schematic.labels.site import OCTANTS, Site

_UNITS = 10.0
"""Whole numbers per unit of cost."""
ROW_SPACE_MM = 0.7
"""What two names above each other are kept apart more, so that they do not read as one; given up
where a name finds no place."""
BOLD_SPACE = 3.0
"""The same of bold names, in multiples."""
_PER_STATION = 120
"""Candidates kept per station in the end."""

WORD_SPACE_MM = 0.5
"""Half of what two names in one row are kept apart beyond the clearance."""


@dataclass(frozen=True, slots=True)
class Entry:
    """A candidate, its box on the sheet and its cost in whole numbers."""

    candidate: Candidate
    box: shapely.Polygon
    cost: int

    @property
    def kind(self) -> tuple[int, bool]:
        """Give the side and whether the label is tilted: all that neighbours care about."""
        return OCTANTS.index(self.candidate.side), self.candidate.angle_deg != 0.0


def entries_of(
    sites: Sequence[Site], obstacles: Obstacles, settings: LabelSettings, reach: Reach
) -> dict[str, list[Entry]]:
    """Give the free candidates per station id, the cheapest of each side and angle."""
    candidates, boxes = free_candidates(sites, obstacles, settings, reach)
    costs = np.rint(_UNITS * candidate_costs(candidates, boxes, obstacles, settings))
    found: dict[str, list[Entry]] = {site.station_id: [] for site in sites}
    kept: dict[tuple[str, tuple[int, bool]], int] = defaultdict(int)
    for i in np.argsort(costs, kind="stable")[: int(np.isfinite(costs).sum())].tolist():
        entry = Entry(candidates[i], boxes[i], int(costs[i]))
        key = (entry.candidate.site.station_id, entry.kind)
        if kept[key] < reach.kept:
            kept[key] += 1
            found[key[0]].append(entry)
    return found


def state_problem(
    groups: Sequence[Sequence[Entry]],
    neighbors: Sequence[Neighbors],
    clearances_mm: tuple[float, float],
    held: Sequence[Entry] = (),
) -> tuple[Problem, tuple[Entry, ...]]:
    """State the choice among entries, one group per station, and give the entries in its order.

    An entry is left out if a cheaper one of the same station, side and angle excludes nothing
    that it does not exclude itself; `held` entries always stay. Two entries exclude each other if
    they are nearer than the first clearance, or nearer than it and the second above each other.
    """
    entries = [entry for group in groups for entry in group]
    owner = np.repeat(np.arange(len(groups)), [len(group) for group in groups])
    conflicts = _conflicts(entries, owner, clearances_mm)
    wanted = {id(entry) for entry in held}
    stay = frozenset(i for i, entry in enumerate(entries) if id(entry) in wanted)
    kept = [
        i
        for group in _members(owner, len(groups))
        for i in _undominated(group, entries, conflicts, stay)
    ]
    number = {old: new for new, old in enumerate(kept)}
    members: list[list[int]] = [[] for _ in groups]
    for old in kept:
        members[owner[old]].append(number[old])
    left = tuple(entries[old] for old in kept)
    problem = Problem(
        groups=tuple(map(tuple, members)),
        costs=tuple(entry.cost for entry in left),
        conflicts=tuple(
            frozenset(number[c] for c in conflicts[old] if c in number) for old in kept
        ),
        sides=tuple(entry.kind[0] for entry in left),
        tilts=tuple(entry.kind[1] for entry in left),
        pairs=tuple(_pair_cost(pair, members, left) for pair in neighbors),
    )
    return problem, left


def _members(owner: NDArray[np.int64], count: int) -> list[list[int]]:
    """Give the entries of each station."""
    members: list[list[int]] = [[] for _ in range(count)]
    for i, station in enumerate(owner.tolist()):
        members[station].append(i)
    return members


def _conflicts(
    entries: Sequence[Entry], owner: NDArray[np.int64], clearances_mm: tuple[float, float]
) -> list[frozenset[int]]:
    """Give for each entry those of other stations that come too near."""
    if not entries:
        return []
    clearance, between_rows = clearances_mm
    boxes = np.array([entry.box for entry in entries], dtype=object)
    corners = shapely.get_coordinates(boxes).reshape(len(boxes), 5, 2)[:, :4]
    bold = np.array([entry.candidate.site.bold for entry in entries])
    across = between_rows / 2.0 * np.where(bold, BOLD_SPACE, 1.0)
    boxes = shapely.polygons(grown_corners(corners, WORD_SPACE_MM, across))
    first, second = _near_pairs(boxes, clearance)
    foreign = owner[first] != owner[second]
    first, second = first[foreign], second[foreign]
    order = np.argsort(first, kind="stable")
    ends = np.searchsorted(first[order], np.arange(len(entries) + 1))
    others = second[order].tolist()
    return [frozenset(others[i:j]) for i, j in itertools.pairwise(ends.tolist())]


def _near_pairs(boxes: Shapes, distance: float) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Give the pairs of boxes within a distance, both ways round, themselves included.

    Most boxes are level, so that plain differences of their sides tell; the tilted are measured.
    """
    bounds = shapely.bounds(boxes)
    left, top, right, bottom = bounds.T
    grown = shapely.box(left - distance, top - distance, right + distance, bottom + distance)
    first, second = shapely.STRtree(boxes).query(grown)
    across = np.maximum(left[first] - right[second], left[second] - right[first])
    down = np.maximum(top[first] - bottom[second], top[second] - bottom[first])
    near = np.hypot(np.maximum(across, 0.0), np.maximum(down, 0.0)) <= distance
    tilted = shapely.area(boxes) < 0.999 * (right - left) * (bottom - top)
    measured = np.flatnonzero(near & (tilted[first] | tilted[second]))
    near[measured] = shapely.dwithin(boxes[first[measured]], boxes[second[measured]], distance)
    return first[near], second[near]


def row_space(*, bold: bool) -> float:
    """Give what names are kept apart above each other beyond the clearance, millimetres."""
    return ROW_SPACE_MM * (BOLD_SPACE if bold else 1.0)


def grown_corners(
    corners: NDArray[np.float64], along_mm: float, across_mm: NDArray[np.float64] | float
) -> NDArray[np.float64]:
    """Give boxes (N, 4, 2) that reach further along and across the text."""
    along, across = corners[:, 1] - corners[:, 0], corners[:, 3] - corners[:, 0]
    along *= along_mm / np.linalg.norm(along, axis=1)[:, None]
    across *= (across_mm / np.linalg.norm(across, axis=1))[:, None]
    ends, edges = np.array([-1.0, 1.0, 1.0, -1.0]), np.array([-1.0, -1.0, 1.0, 1.0])
    moves = ends[None, :, None] * along[:, None, :] + edges[None, :, None] * across[:, None, :]
    grown: NDArray[np.float64] = corners + moves
    return grown


def _undominated(
    group: Sequence[int],
    entries: Sequence[Entry],
    conflicts: Sequence[frozenset[int]],
    stay: frozenset[int],
) -> list[int]:
    """Give the entries of a station worth choosing from, cheapest first."""
    kept: list[int] = []
    for i in sorted(group, key=lambda i: (entries[i].cost, i)):
        better = (j for j in kept if entries[j].kind == entries[i].kind)
        if i in stay or not any(conflicts[j] <= conflicts[i] for j in better):
            kept.append(i)
    return [i for rank, i in enumerate(kept) if rank < _PER_STATION or i in stay]


def _pair_cost(
    pair: Neighbors, members: Sequence[Sequence[int]], entries: Sequence[Entry]
) -> PairCost:
    """Give the cost of a pair of neighbours in whole numbers."""
    ends = ((pair.first, pair.leaving), (pair.second, pair.arriving))
    hands = {
        i: hand(direction, entries[i].candidate.side)
        for station, direction in ends
        for i in members[station]
    }
    scale = _UNITS * pair.weight
    return PairCost(
        first=pair.first,
        second=pair.second,
        hands=hands,
        hand=round(scale * HAND),
        tilt=round(scale * TILTED),
        side=round(scale * SIDE),
    )
