"""Every place where a name could stand, free of lines, markers and the sheet's edge."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import shapely
from numpy.typing import NDArray

from gtfs_schematic.labels.anywhere import anywhere
from gtfs_schematic.labels.blocking import least_free_push
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
    corners = np.array([candidate.corners() for candidate in raw]).reshape(-1, 4, 2)
    vectors = np.array([candidate.push for candidate in raw]).reshape(-1, 2)
    steps = round(reach.push_mm / reach.step_mm)
    first = least_free_push(corners, vectors, obstacles.blocks, reach.step_mm, steps)
    free = np.flatnonzero(np.isfinite(first))
    chosen, lengths = [free], [first[free]]
    for further in reach.further_mm:
        length = first[free] + further
        open_ones = ~obstacles.blocked(_moved(corners[free], vectors[free], length))
        chosen.append(free[open_ones])
        lengths.append(length[open_ones])
    index, length = np.concatenate(chosen), np.concatenate(lengths)
    order = np.lexsort((length, index))
    index, length = index[order], length[order]
    candidates = [raw[i].pushed(float(by)) for i, by in zip(index, length, strict=True)]
    boxes = _moved(corners[index], vectors[index], length)
    if reach.around_mm > 0.0:
        for site in sites:
            strays, places = anywhere(site, settings, reach, obstacles)
            candidates += strays
            boxes = np.concatenate([boxes, places])
    polygons: Shapes = shapely.polygons(boxes)
    return candidates, polygons


def _moved(
    corners: NDArray[np.float64], vectors: NDArray[np.float64], lengths: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Give boxes moved along their vectors."""
    moved: NDArray[np.float64] = corners + (vectors * lengths[:, None])[:, None, :]
    return moved
