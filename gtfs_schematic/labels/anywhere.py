"""Any free place round a marker at all, for a name that finds none of the usual ones."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.labels.blocks import Align, Block, set_block
from gtfs_schematic.labels.model import LabelSettings, Side
from gtfs_schematic.labels.obstacles import Obstacles
from gtfs_schematic.labels.positions import Candidate, wordings
from gtfs_schematic.labels.reach import Reach
from gtfs_schematic.labels.site import OCTANTS, Site

_ALIGNS: tuple[Align, ...] = ("left", "center", "right")
_LATTICE = np.linspace(-1.0, 1.0, 37)
_ASTRAY = 4.0
"""The slide that a place off the usual ones counts as."""
_STILL = (0.0, 0.0)

Floats = NDArray[np.float64]


def anywhere(
    site: Site, settings: LabelSettings, reach: Reach, obstacles: Obstacles
) -> tuple[list[Candidate], Floats]:
    """Give the free places of a lattice whose box reaches to within a distance of the marker.

    Returns
    -------
    The candidates, not pushed, and the corners of their boxes, shape (N, 4, 2).
    """
    return around(site, settings, reach, lambda corners: ~obstacles.blocked(corners))


def around(
    site: Site,
    settings: LabelSettings,
    reach: Reach,
    is_wanted: Callable[[Floats], NDArray[np.bool_]],
) -> tuple[list[Candidate], Floats]:
    """Give the wanted places of the lattice, told by their corners; as `anywhere` does."""
    candidates: list[Candidate] = []
    boxes: list[Floats] = [np.empty((0, 4, 2))]
    for scale in reach.scales:
        for wording in wordings(site, settings, reach, scale):
            bare = bool(site.badges) and wording.badge_place == "none"
            for align in _ALIGNS:
                block = set_block(wording, align)
                origins, octants = _lattice(site, block, align, reach.around_mm)
                corners = _corners(origins, block)
                wanted = np.flatnonzero(is_wanted(corners))
                boxes.append(corners[wanted])
                for i in wanted.tolist():
                    at = (float(origins[i, 0]), float(origins[i, 1]))
                    side: Side = OCTANTS[int(octants[i])]
                    candidate = Candidate(
                        site, block, side, at, at, _STILL,
                        0.0, len(wording.rows), _ASTRAY, scale, bare,
                    )  # fmt: skip
                    candidates.append(candidate)
    return candidates, np.concatenate(boxes)


def _lattice(site: Site, block: Block, align: Align, around: float) -> tuple[Floats, Floats]:
    """Give the origins whose text begins or ends towards the marker, and the side of each."""
    height = block.ink_bottom - block.ink_top
    rows, columns = (axis.ravel() for axis in np.meshgrid(_LATTICE, _LATTICE, indexing="ij"))
    right = columns * (block.width / 2.0 + around)
    down = rows * (height / 2.0 + around)
    x = site.at[0] + right - block.width / 2.0
    y = site.at[1] + down - height / 2.0 - block.ink_top
    octants = np.rint(np.degrees(np.arctan2(down, right)) / 45.0) % 8.0
    level = octants % 4.0 == 2.0
    if align == "center":
        fits = level
    else:
        fits = ~level & ((right >= 0.0) if align == "left" else (right <= 0.0))
    return np.column_stack([x, y])[fits], octants[fits]


def _corners(origins: Floats, block: Block) -> Floats:
    x, y = origins[:, 0], origins[:, 1]
    left, right = x, x + block.width
    top, bottom = y + block.ink_top, y + block.ink_bottom
    corners: Floats = np.stack(
        [
            np.column_stack([left, top]),
            np.column_stack([right, top]),
            np.column_stack([right, bottom]),
            np.column_stack([left, bottom]),
        ],
        axis=1,
    )
    return corners
