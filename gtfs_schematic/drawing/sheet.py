"""Which pages come into question for a network, and how much of each the network may fill."""

from __future__ import annotations

import math

from gtfs_schematic.drawing.model import SHEET_SIZES, DrawingSettings, SheetSettings
from gtfs_schematic.drawing.page import Place, plan_page
from gtfs_schematic.drawing.style import type_scale
from gtfs_schematic.errors import UsageError
from gtfs_schematic.layout.model import SheetFrame
from gtfs_schematic.network.model import Network

_AUTO = ("A4", "A3", "A2", "A1", "A0", "2A0", "4A0")
_MARGIN_MM = 10.0
"""White margin on A4; it grows with the type."""
_SQUARE = 1.2
"""Networks no more oblong than this may stand on a sheet of either orientation."""
_LEAST_SHARE = 0.3
"""A page on which title, key and notes leave less than this for the network is too small."""
_LEAST_SIDE_MM = 40.0
_PLACES: tuple[Place, ...] = ("beside", "below")


def candidate_frames(
    network: Network, sheet: SheetSettings, drawing: DrawingSettings
) -> tuple[SheetFrame, ...]:
    """Give the pages to try, the smallest first, each with the part that the network may fill.

    A page comes twice, with the key beside and below, where both leave enough room: which is
    better depends on the shape of the drawing, which nobody knows yet. The likelier comes first.

    Raises
    ------
    UsageError
        If a page was asked for on which title, key and notes leave no room for a network.
    """
    shape = _extent(network)
    sizes = _sizes(sheet, shape)
    usable = [frame for size in sizes for frame in _usable_frames(network, sheet, drawing, size)]
    if not usable:
        width, height = sizes[-1]
        raise UsageError(
            f"A sheet of {width:g} by {height:g} mm is too small for this network's title, key of "
            f"{len(network.lines)} lines and notes: choose a larger size, a smaller margin, or "
            "fewer lines."
        )
    good = tuple(frame for frame in usable if _share(frame) >= _LEAST_SHARE)
    return good or (usable[-1],)


def _sizes(sheet: SheetSettings, shape: tuple[float, float]) -> tuple[tuple[float, float], ...]:
    """Give (width, height) of the pages to try, millimetres, the smallest first."""
    names = _AUTO if sheet.size == "auto" else (sheet.size,)
    sizes: list[tuple[float, float]] = []
    for name in names:
        if name in SHEET_SIZES:
            short, long = map(float, SHEET_SIZES[name])
            both = {"portrait": (short, long), "landscape": (long, short)}
            sizes += [both[way] for way in _orientations(sheet, shape)]
        else:
            width, height = map(float, name.split("x"))
            if sheet.orientation != "auto":
                short, long = sorted((width, height))
                width, height = (short, long) if sheet.orientation == "portrait" else (long, short)
            sizes.append((width, height))
    return tuple(sizes)


def _orientations(sheet: SheetSettings, shape: tuple[float, float]) -> tuple[str, ...]:
    """Give the orientations to try, the one that suits the network better first."""
    if sheet.orientation != "auto":
        return (sheet.orientation,)
    ratio = shape[0] / shape[1]
    if ratio > _SQUARE:
        return ("landscape",)
    if ratio < 1.0 / _SQUARE:
        return ("portrait",)
    return ("landscape", "portrait") if ratio >= 1.0 else ("portrait", "landscape")


def _usable_frames(
    network: Network, sheet: SheetSettings, drawing: DrawingSettings, size: tuple[float, float]
) -> list[SheetFrame]:
    """Give the frames of a page that are large enough to hold a network, the likelier first."""
    shape = _extent(network)
    margin = _MARGIN_MM * type_scale(*size).scale if sheet.margin_mm == "auto" else sheet.margin_mm
    frames = [plan_page(network, drawing, size, margin, place).frame for place in _PLACES]
    usable = [frame for frame in frames if min(_sides(frame)) >= _LEAST_SIDE_MM]
    return sorted(usable, key=lambda frame: -_scale(frame, shape))


def _sides(frame: SheetFrame) -> tuple[float, float]:
    return frame.right_mm - frame.left_mm, frame.bottom_mm - frame.top_mm


def _scale(frame: SheetFrame, shape: tuple[float, float]) -> float:
    width, height = _sides(frame)
    return min(width / shape[0], height / shape[1])


def _share(frame: SheetFrame) -> float:
    width, height = _sides(frame)
    return width * height / (frame.width_mm * frame.height_mm)


def _extent(network: Network) -> tuple[float, float]:
    """Guess the drawing's width and height from the ground, in no unit; never nought.

    Schematic drawings are less oblong than the ground, since their long tails are shortened: the
    guess is the root of the ground's proportion (common practice, no source).

    A degree of longitude is a degree of latitude times the cosine of the latitude, on a sphere:
    near enough for choosing between upright and oblong.
    """
    lons = [station.lon for station in network.stations] or [0.0]
    lats = [station.lat for station in network.stations] or [0.0]
    middle = (min(lats) + max(lats)) / 2.0
    width = (max(lons) - min(lons)) * math.cos(math.radians(middle))
    height = max(lats) - min(lats)
    least = max(width, height, 1e-6) / 10.0
    return math.sqrt(max(width, least)), math.sqrt(max(height, least))
