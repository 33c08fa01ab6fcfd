"""What makes one place for a name better than another.

The order of sides follows the habits of map lettering (right above first), turned by the way the
lines run; all weights are common practice, no source. One unit is about one label on the second
best side.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.labels.model import LabelSettings, Side
from gtfs_schematic.labels.obstacles import Obstacles, Shapes
from gtfs_schematic.labels.positions import Candidate
from gtfs_schematic.labels.reach import NEAR
from gtfs_schematic.labels.site import OCTANTS, Run

ROW = 1.5
"""Each row more than the name's length asks for, or less."""
SLIDE = 2.0
"""A slide of one width, or one row."""
DISTANCE = 2.0
"""A millimetre between label and own marker beyond the usual gap; more grow by the square too."""
SMALLER = 200.0
"""Setting a name a whole size smaller; 90 % cost a tenth of it."""
BARE = 10.0
"""Leaving out the badges."""
BENEATH = 0.6
"""Badges in a row of their own."""
AMBIGUOUS = 5.5
"""A foreign marker as near as can be; it fades to nothing at `_NEAR_MM`."""
NEARER = 6.0
"""A foreign marker as near as the own one, or nearly (`_NEARLY_MM`)."""
FOREIGN_LINE = 1.5
"""A line that does not call as near as can be; it fades to nothing at `_LINE_MM`."""
CUT_OFF = 8.0
"""A line that does not call between the label and its marker."""
NOT_ASKED = 1000.0
"""Another side, or another angle, than a person asks for."""
_NEAR_MM = 2.5
_NEARLY_MM = 0.5
_CLEARLY = 0.6
"""Share of the distance from its own marker at which a foreign one is clearly nearer."""
_OFF_MM = 2.0
"""A label further than this from its marker lies off it."""
_LINE_MM = 1.2
_ROW_MM = 24.0
"""A row longer than this is better broken."""

SIDE_COST: Mapping[Run, Mapping[Side, float]] = {
    "vertical": {"E": 0, "W": 1.5, "NE": 2, "SE": 2, "NW": 3.5, "SW": 3.5, "N": 8, "S": 8},
    "horizontal": {"N": 0, "S": 0.7, "NE": 1, "SE": 1.7, "NW": 1.8, "SW": 2.3, "E": 8, "W": 8},
    "rising": {"SE": 0, "E": 0.3, "NW": 1.2, "W": 1.5, "S": 3, "N": 3.5, "NE": 6, "SW": 6},
    "falling": {"NE": 0, "E": 0.3, "SW": 1.5, "W": 1.5, "N": 3, "S": 3.5, "NW": 6, "SE": 6},
    "end": {"E": 0, "NE": 0.4, "SE": 0.6, "W": 0.6, "N": 0.8, "S": 1, "NW": 1, "SW": 1.2},
    "node": {"NE": 0, "E": 0.3, "SE": 0.5, "NW": 0.9, "W": 1.2, "SW": 1.5, "N": 1.5, "S": 2},
}
TILT_COST: Mapping[Side, float] = {"NE": 5.0, "SW": 5.7}
"""Tilted labels stand above and begin at the marker, or below and end there; never elsewhere."""
_TILT = 6.5
"""Other sides, where a person asks for another angle."""
TILT_BOLD = 6.0
"""Names of interchanges and termini are better level."""
END_COST = (0.0, 1.0, 2.0, 5.0, 9.0)
"""At a line's end, by the angle (in 45 degrees) between the side and straight on."""
CROWDED = 1.0
"""At a junction, each line that leaves towards the label's own side."""


def candidate_costs(
    candidates: Sequence[Candidate],
    boxes: Shapes,
    obstacles: Obstacles,
    settings: LabelSettings,
) -> NDArray[np.float64]:
    """Give the cost of each candidate by itself, at least 0; infinite if it would mislead.

    A label misleads if it lies off its own marker and clearly nearer to a foreign one.
    """
    costs = np.array([own_cost(candidate, settings) for candidate in candidates])
    if not len(costs):
        return costs
    index = {station_id: i for i, station_id in enumerate(obstacles.stations)}
    own = np.array([index[candidate.site.station_id] for candidate in candidates])
    own_distance = shapely.distance(boxes, obstacles.markers[own])
    usual = settings.clearance_mm + NEAR.gap_mm
    off = np.maximum(0.0, own_distance - usual)
    costs += DISTANCE * (off + off**2 / 2.0)
    costs += _ambiguity(boxes, own, own_distance, obstacles)
    cost, cut = _foreign_lines(candidates, boxes, own, obstacles)
    costs += cost
    costs[cut & (own_distance > _OFF_MM)] = np.inf
    return costs


def side_cost(candidate: Candidate) -> float:
    """Give the cost of a candidate's side by the way the lines run at its station."""
    site, side = candidate.site, candidate.side
    cost = float(SIDE_COST[site.run][side])
    index = OCTANTS.index(side)
    if site.run == "end":
        onward = (site.directions[0] + 4) % 8
        turn = abs(index - onward) % 8
        cost += END_COST[min(turn, 8 - turn)]
    elif site.run == "node":
        cost += CROWDED * sum(direction == index for direction in site.directions)
    return cost


def own_cost(candidate: Candidate, settings: LabelSettings) -> float:
    """Give the cost that follows from the candidate alone."""
    cost = side_cost(candidate) + SLIDE * abs(candidate.slide)
    widest = max(line.width_mm for line in candidate.block.lines)
    name_width = sum(line.width_mm for line in candidate.block.lines if not line.second)
    wanted = max(1, int(np.ceil(name_width / _ROW_MM - 0.15)))
    cost += ROW * abs(candidate.rows - wanted) + 0.1 * max(0.0, widest - 1.3 * _ROW_MM)
    cost += SMALLER * (1.0 - candidate.scale)
    if candidate.angle_deg:
        cost += TILT_COST.get(candidate.side, _TILT) - side_cost(candidate)
        cost += TILT_BOLD if candidate.site.bold else 0.0
    if candidate.block.foot > candidate.block.last_baseline:
        cost += BENEATH
    if candidate.bare:
        cost += BARE
    asked = settings.sides.get(candidate.site.station_id)
    if asked is not None and candidate.side != asked:
        cost += NOT_ASKED
    angle = candidate.site.angle
    if angle is not None and candidate.angle_deg != -angle:
        cost += NOT_ASKED
    return cost


def _ambiguity(
    boxes: Shapes, own: NDArray[np.int64], own_distance: NDArray[np.float64], obstacles: Obstacles
) -> NDArray[np.float64]:
    """Give the cost of foreign markers near a label."""
    # As far as the own marker at least: one further off than a foreign one would mislead.
    reach = np.maximum(_NEAR_MM, own_distance)
    hits = obstacles.marker_tree.query(boxes, predicate="dwithin", distance=reach)
    box, marker = hits[:, own[hits[0]] != hits[1]]
    nearest = np.full(len(boxes), np.inf)
    np.minimum.at(nearest, box, shapely.distance(boxes[box], obstacles.markers[marker]))
    cost = AMBIGUOUS * np.clip(1.0 - nearest / _NEAR_MM, 0.0, 1.0)
    cost += NEARER * (nearest < own_distance + _NEARLY_MM)
    cost[(nearest < _CLEARLY * own_distance) & (own_distance > _OFF_MM)] = np.inf
    return np.asarray(cost, dtype=np.float64)


def _foreign_lines(
    candidates: Sequence[Candidate], boxes: Shapes, own: NDArray[np.int64], obstacles: Obstacles
) -> tuple[NDArray[np.float64], NDArray[np.bool_]]:
    """Give the cost of lines that do not call at the station, near or in between.

    And whether a line that does not even pass the station lies in between.
    """
    cost, far = np.zeros(len(boxes)), np.zeros(len(boxes), dtype=bool)
    if not obstacles.piece_lines:
        return cost, far
    reach = obstacles.half_width + _LINE_MM
    nearest = np.full(len(boxes), np.inf)
    box, piece = obstacles.piece_tree.query(boxes, predicate="dwithin", distance=reach)
    foreign = _not_calling(candidates, box, piece, obstacles)
    box, piece = box[foreign], piece[foreign]
    gaps = shapely.distance(boxes[box], obstacles.pieces[piece]) - obstacles.half_width
    np.minimum.at(nearest, box, gaps)
    cost += FOREIGN_LINE * np.clip(1.0 - nearest / _LINE_MM, 0.0, 1.0)
    leaders = shapely.shortest_line(boxes, obstacles.markers[own])
    box, piece = obstacles.piece_tree.query(leaders, predicate="intersects")
    cut = np.unique(box[_not_calling(candidates, box, piece, obstacles)])
    cost[cut] += CUT_OFF
    strange = [
        i
        for i, j in zip(box.tolist(), piece.tolist(), strict=True)
        if obstacles.piece_lines[j] not in candidates[i].site.passing
    ]
    far[strange] = True
    return cost, far


def _not_calling(
    candidates: Sequence[Candidate],
    box: NDArray[np.int64],
    piece: NDArray[np.int64],
    obstacles: Obstacles,
) -> NDArray[np.bool_]:
    """Tell for pairs of a candidate and a piece whether the piece's line does not call there."""
    return np.array(
        [
            obstacles.piece_lines[j] not in candidates[i].site.lines
            for i, j in zip(box.tolist(), piece.tolist(), strict=True)
        ],
        dtype=bool,
    )
