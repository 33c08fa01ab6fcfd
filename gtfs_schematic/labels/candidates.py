"""Every place where a name could stand, free of lines, markers and the sheet's edge."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.labels.model import LabelSettings
from gtfs_schematic.labels.obstacles import Obstacles, Shapes
from gtfs_schematic.labels.positions import Candidate, positions
from gtfs_schematic.labels.reach import NEAR, Reach
from gtfs_schematic.labels.site import Site


def free_candidates(
    sites: Sequence[Site], obstacles: Obstacles, settings: LabelSettings, reach: Reach = NEAR
) -> tuple[list[Candidate], Shapes]:
    """Give all free candidates of some stations, and their boxes as polygons, in step.

    Each position is pushed away from the marker by the least distance (in steps) at
    which it is free; positions that are free nowhere are left out.
    """
    raw = [candidate for site in sites for candidate in positions(site, settings, reach)]
    if not raw:
        return [], np.empty(0, dtype=object)
    corners = np.array([candidate.corners() for candidate in raw])
    vectors = np.array([candidate.push for candidate in raw])
    first = _first_free(corners, vectors, obstacles, reach)
    free = np.flatnonzero(np.isfinite(first))
    chosen, lengths = [free], [first[free]]
    for further in reach.further_mm:
        boxes = _boxes(corners[free], vectors[free], first[free] + further)
        also = free[~obstacles.blocked(boxes)]
        chosen.append(also)
        lengths.append(first[also] + further)
    index, length = np.concatenate(chosen), np.concatenate(lengths)
    order = np.lexsort((length, index))
    index, length = index[order], length[order]
    candidates = [raw[i].pushed(float(by)) for i, by in zip(index, length, strict=True)]
    return candidates, _boxes(corners[index], vectors[index], length)


def _boxes(
    corners: NDArray[np.float64], vectors: NDArray[np.float64], lengths: NDArray[np.float64]
) -> Shapes:
    """Give boxes moved along their vectors, as polygons."""
    boxes: Shapes = shapely.polygons(corners + (vectors * lengths[:, None])[:, None, :])
    return boxes


def _first_free(
    corners: NDArray[np.float64],
    vectors: NDArray[np.float64],
    obstacles: Obstacles,
    reach: Reach,
) -> NDArray[np.float64]:
    """Give for each box the least push at which it is free, infinite if there is none."""
    first = np.full(len(corners), np.inf)
    waiting = np.arange(len(corners))
    for step in range(round(reach.push_mm / reach.step_mm) + 1):
        length = step * reach.step_mm
        boxes = _boxes(corners[waiting], vectors[waiting], np.full(len(waiting), length))
        free = ~obstacles.blocked(boxes)
        first[waiting[free]] = length
        waiting = waiting[~free]
        if step == 0:  # the rest cannot be moved
            waiting = waiting[np.any(vectors[waiting] != 0.0, axis=1)]
    return first
