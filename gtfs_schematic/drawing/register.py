"""The index of stations: every name with the square of the grid in which it stands."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from gtfs_schematic.drawing.contrast import mix
from gtfs_schematic.drawing.model import DrawingSettings, Group, PathShape, TextShape
from gtfs_schematic.drawing.paths import polyline
from gtfs_schematic.drawing.style import LEADING, TypeScale, quiet
from gtfs_schematic.drawing.words import alphabetical, run
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels import fonts
from gtfs_schematic.layout.model import SheetFrame
from gtfs_schematic.network.model import Network

HEADING = "Stations"
_SQUARE = 21.0
"""Side of a square of the grid, about, in type sizes."""
_MOST = 26
_REFERENCE = 3.2
"""Room for a reference, in type sizes."""
_GAP = 1.6


@dataclass(frozen=True, slots=True)
class Register:
    """The index as a block: the names in columns, all lengths in millimetres."""

    columns: tuple[tuple[tuple[str, str], ...], ...]
    """Per column the (station id, name) of its rows."""
    pitch: float
    width: float
    """Of a column without the gap beside it."""
    height: float


def register_of(network: Network, type_: TypeScale, width: float) -> Register:
    """Give the index in as many columns as fit `width`, as low as that allows."""
    rows = [
        (station.id, station.name)
        for station in sorted(network.stations, key=lambda s: (alphabetical(s.name), s.id))
    ]
    widest = max((fonts.text_width_mm(name, type_.body) for _, name in rows), default=0.0)
    column = widest + _REFERENCE * type_.body
    gap = _GAP * type_.body
    count = max(1, min(len(rows), int((width + gap) / (column + gap))))
    each = math.ceil(len(rows) / count)
    columns = tuple(tuple(rows[i : i + each]) for i in range(0, len(rows), each))
    pitch = (width + gap) / count
    height = (each * LEADING + 2.2) * type_.body
    return Register(columns, pitch, min(column, pitch - gap), height)


def squares(frame: SheetFrame, type_: TypeScale) -> tuple[int, int]:
    """Give how many columns and rows the grid has."""
    side = _SQUARE * type_.body
    across = round((frame.right_mm - frame.left_mm) / side)
    down = round((frame.bottom_mm - frame.top_mm) / side)
    return min(_MOST, max(2, across)), min(_MOST, max(2, down))


def reference(at: Point, frame: SheetFrame, type_: TypeScale) -> str:
    """Give the square of a place, such as "C4": columns are letters, rows are numbers."""
    columns, rows = squares(frame, type_)
    across = (at[0] - frame.left_mm) / (frame.right_mm - frame.left_mm)
    down = (at[1] - frame.top_mm) / (frame.bottom_mm - frame.top_mm)
    column = min(columns - 1, max(0, int(across * columns)))
    row = min(rows - 1, max(0, int(down * rows)))
    return f"{chr(ord('A') + column)}{row + 1}"


def grid_group(frame: SheetFrame, type_: TypeScale, settings: DrawingSettings) -> Group:
    """Give the grid: faint lines, letters above, numbers at the left, both in the margin."""
    columns, rows = squares(frame, type_)
    size, pale = 0.9 * type_.body, mix(settings.ink, settings.background, 0.88)
    xs = [
        frame.left_mm + (frame.right_mm - frame.left_mm) * i / columns for i in range(columns + 1)
    ]
    ys = [frame.top_mm + (frame.bottom_mm - frame.top_mm) * i / rows for i in range(rows + 1)]
    lines = [((x, ys[0]), (x, ys[-1])) for x in xs] + [((xs[0], y), (xs[-1], y)) for y in ys]
    shapes: list[PathShape | TextShape] = [
        PathShape(polyline(ends), stroke=pale, stroke_width=0.15, cap="butt") for ends in lines
    ]
    for i in range(columns):
        letter = chr(ord("A") + i)
        half = fonts.text_width_mm(letter, size, bold=True) / 2.0
        at = ((xs[i] + xs[i + 1]) / 2.0 - half, ys[0] - 0.35 * size)
        shapes.append(run(letter, at, size, quiet(settings), bold=True))
    for i in range(rows):
        number = str(i + 1)
        wide = fonts.text_width_mm(number, size, bold=True)
        at = (xs[0] - 0.4 * size - wide, (ys[i] + ys[i + 1]) / 2.0 + 0.36 * size)
        shapes.append(run(number, at, size, quiet(settings), bold=True))
    return Group("grid", tuple(shapes))


def register_group(
    register: Register, corner: Point, places: Mapping[str, str], type_: TypeScale, ink: str
) -> Group:
    """Give the index with its references, `places`, by station id."""
    return Group("index", tuple(_rows(register, corner, places, type_, ink)), title="Index")


def _rows(
    register: Register, corner: Point, places: Mapping[str, str], type_: TypeScale, ink: str
) -> Iterator[Group]:
    left, top = corner
    body = type_.body
    heading = run(HEADING, (left, top + body), 1.1 * body, ink, bold=True)
    yield Group("key-heading", (heading,))
    for i, column in enumerate(register.columns):
        x = left + i * register.pitch
        for k, (key, name) in enumerate(column):
            y = top + (2.0 + 0.9 + k * LEADING) * body
            place = places[key]
            right = x + register.width - fonts.text_width_mm(place, body)
            texts = (run(name, (x, y), body, ink), run(place, (right, y), body, ink))
            yield Group("index-row", texts, data={"for-station": key})
