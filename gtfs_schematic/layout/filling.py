"""Choose the sheet for a drawing, and fill it."""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.errors import LayoutError
from gtfs_schematic.layout.fit import Sizes, pins_in_frame, wants_of
from gtfs_schematic.layout.model import SheetFrame
from gtfs_schematic.layout.settle import (
    DriftLimitsCollideError,
    NoRoomError,
    PinsCollideError,
    settle,
)
from gtfs_schematic.layout.skeleton import Skeleton, without

_ROOM = 1.1
"""Share by which a sheet should exceed the least size of the drawing, for labels and air."""
_LOOSEST = 3.0
"""A station spacing grows to at most so many times the least, however large the sheet."""
_MAGNIFIED = 1.25
"""How much a settled drawing may be enlarged as it is, whatever the spacing then becomes."""
_NO_LENGTH_MM = 0.02
_FILLINGS = 4
_FULL = 1.06
"""How often the scale is raised to fill the sheet, and when it is full: sheet over drawing."""


def first_that_holds(
    skeleton: Skeleton, sizes: Sizes, frames: Sequence[SheetFrame]
) -> tuple[Sizes, tuple[Skeleton, SheetFrame, float]]:
    """Settle with places beside other stations; without them if need be.

    Gives what was asked in the end, the skeleton with its points in millimetres, the sheet, and
    the length of a station spacing on it.
    """
    if sizes.relative:
        try:
            return sizes, _on_sheet(skeleton, sizes, frames)
        except (NoRoomError, PinsCollideError, DriftLimitsCollideError):
            sizes = dataclasses.replace(sizes, relative=())
    return sizes, _on_sheet(skeleton, sizes, frames)


def _on_sheet(
    skeleton: Skeleton, sizes: Sizes, frames: Sequence[SheetFrame]
) -> tuple[Skeleton, SheetFrame, float]:
    """Choose the sheet by the least size with some air, then fill it."""
    spacing = sizes.clearances.spacing_mm
    skeleton, points, pairs = settled(skeleton, sizes, spacing, None)
    width, height = np.ptp(points, axis=0)
    fits = [f for f in frames if inner(f)[0] >= width * _ROOM and inner(f)[1] >= height * _ROOM]
    fits = fits or [f for f in frames if inner(f)[0] >= width and inner(f)[1] >= height]
    if not fits:
        largest = frames[-1]
        raise LayoutError(
            f"The drawing needs at least {width:.0f} × {height:.0f} mm, but the largest sheet "
            f"allowed ({largest.width_mm:.0f} × {largest.height_mm:.0f} mm) leaves "
            f"{inner(largest)[0]:.0f} × {inner(largest)[1]:.0f} mm. Allow a larger sheet, "
            "smaller type or thinner lines, or draw fewer lines."
        )
    frame = _best_of_size(fits, width, height)
    box, scale = inner(frame), spacing
    sizes = dataclasses.replace(sizes, pinned=pins_in_frame(skeleton.graph, sizes.settings, frame))
    skeleton = dataclasses.replace(skeleton, points=points)
    for _ in range(_FILLINGS):
        # What has no more room in one direction still grows in the other, the less the more the
        # drawing is to be true to the ground.
        spare = np.maximum(1.0, np.asarray(box) / np.maximum(np.ptp(points, axis=0), 1e-9))
        fidelity = sizes.settings.fidelity
        grow = float(spare.min() ** fidelity * spare.max() ** (1.0 - fidelity))
        if not sizes.pinned and (grow < _FULL or scale >= _LOOSEST * spacing):
            break
        grown = min(0.98 * grow, _LOOSEST * spacing / scale)
        scale *= grown
        skeleton, points, pairs = settled(skeleton, sizes, scale, box, pairs, grown)
        skeleton = dataclasses.replace(skeleton, points=points)
    if not (sizes.pinned or sizes.relative or sizes.settings.drift_limit_mm):
        larger = _magnified(points, box, _LOOSEST * spacing / scale)
        points, scale = points * larger, scale * larger
    return dataclasses.replace(skeleton, points=points), frame, scale


def _magnified(points: NDArray[np.float64], box: tuple[float, float], most: float) -> float:
    """Give the factor by which a settled drawing is enlarged as it is, to fill its box.

    It keeps every direction and only adds to every distance, so no guarantee can suffer.
    """
    spare = np.asarray(box) / np.maximum(np.ptp(points, axis=0), 1e-9)
    return float(np.clip(spare.min(), 1.0, max(most, _MAGNIFIED)))


def _best_of_size(fits: list[SheetFrame], width: float, height: float) -> SheetFrame:
    """Of the least sheets, upright or not, the one that the drawing can fill best."""
    least = [f for f in fits if f.width_mm * f.height_mm <= fits[0].width_mm * fits[0].height_mm]
    wide, high = max(width, 1e-9), max(height, 1e-9)
    return max(least, key=lambda f: min(inner(f)[0] / wide, inner(f)[1] / high))


def inner(frame: SheetFrame) -> tuple[float, float]:
    """Give width and height of what a drawing may fill, millimetres."""
    return frame.right_mm - frame.left_mm, frame.bottom_mm - frame.top_mm


def settled(
    skeleton: Skeleton,
    sizes: Sizes,
    scale_mm: float,
    box: tuple[float, float] | None,
    pairs: NDArray[np.int64] | None = None,
    grown: float = 1.0,
) -> tuple[Skeleton, NDArray[np.float64], NDArray[np.int64] | None]:
    """Settle, then take out bends that have shrunk to nothing: the places are right without them.

    `scale_mm` is the wanted spacing, `grown` how much larger it is than before.
    """
    wants = wants_of(skeleton, sizes, scale_mm, box, grown)
    points, pairs = settle(skeleton, wants, box, pairs)
    lengths = np.hypot(*np.diff(points[skeleton.segments], axis=1)[:, 0].T)
    gone = lengths < _NO_LENGTH_MM
    if not gone.any():
        return skeleton, points, pairs
    skeleton = without(skeleton, points, gone)
    return skeleton, skeleton.points, None
