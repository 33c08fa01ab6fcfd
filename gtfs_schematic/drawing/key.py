"""The key: what it lists, how its rows measure, and how they flow into columns."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from gtfs_schematic.drawing.model import DrawingSettings
from gtfs_schematic.drawing.style import LEADING, TypeScale, dashed_services, weight
from gtfs_schematic.drawing.words import (
    MODE_NAMES,
    SERVICE_NOTES,
    how_often,
    line_course,
    line_title,
    natural,
    sentence,
    wrap,
)
from gtfs_schematic.labels import fonts
from gtfs_schematic.network.model import Line, Network

SIGNS = {
    "stop": "Stop",
    "interchange": "Interchange",
    "terminus": "Terminus",
    "walk": "Walk between stations",
    "one-way": "Runs in this direction only",
    "peak": "Line runs in peak hours only",
    "night": "Line runs at night only",
    "some-days": "Line does not run every day",
    "step-free": "Step-free according to the feed",
    "closed": "Closed station",
}
"""Every sign that a sheet may need, in the order of the key."""
_MOST_TEXT = 16.0
"""Widest text of a row before it wraps, in type sizes."""
_MOST_NAME = 5.5
"""Widest line name that stands in a badge, in type sizes; longer ones stand in the text."""
_PADDING = 0.45
_SAMPLE = 2.6
_GAP = 0.7
_COLUMN_GAP = 2.2


@dataclass(frozen=True, slots=True)
class KeyRow:
    """One row: a heading, a line, or a sign; `height` in millimetres with the space below."""

    kind: Literal["heading", "line", "sign"]
    id: str
    name: str
    """What stands in the badge; empty: no badge."""
    bold_text: tuple[str, ...]
    """Lines of a heading, or of a line's name that does not fit a badge; before the text."""
    text: tuple[str, ...]
    height: float


@dataclass(frozen=True, slots=True)
class PlacedRow:
    """A row and its upper left corner within the key, millimetres."""

    row: KeyRow
    x: float
    y: float


@dataclass(frozen=True, slots=True)
class Key:
    """The key with its rows placed; all lengths in millimetres."""

    rows: tuple[PlacedRow, ...]
    width: float
    height: float
    badge_width: float
    columns: int


def key_beside(network: Network, settings: DrawingSettings, type_: TypeScale, height: float) -> Key:
    """Give the key as a block no higher than `height`, with as many columns as that takes."""
    rows = key_rows(network, settings, type_)
    return _placed(rows, _flow(rows, height), type_)


def key_below(network: Network, settings: DrawingSettings, type_: TypeScale, width: float) -> Key:
    """Give the key as a block no wider than `width`, as low as that allows."""
    rows = key_rows(network, settings, type_)
    pitch = _column_width(rows, type_) + _COLUMN_GAP * type_.body
    most = max(1, int((width + _COLUMN_GAP * type_.body + 1e-9) // pitch))
    limit = sum(row.height for row in rows) / most
    while len(_flow(rows, limit)) > most:
        limit += 0.25 * type_.body
    return _placed(rows, _flow(rows, limit), type_)


def key_rows(network: Network, settings: DrawingSettings, type_: TypeScale) -> tuple[KeyRow, ...]:
    """List the rows of the key: lines by mode and name, then the signs that the sheet uses."""
    lines = sorted(
        network.lines, key=lambda line: (weight(line.mode), line.mode, natural(line.name), line.id)
    )
    modes = list(dict.fromkeys(line.mode for line in lines))
    rows = []
    for mode in modes:
        rows.append(_heading(MODE_NAMES.get(mode, mode) if len(modes) > 1 else "Lines", type_))
        rows += [_line_row(line, network, settings, type_) for line in lines if line.mode == mode]
    signs = used_signs(network, settings)
    if signs:
        rows.append(_heading("Signs", type_))
        rows += [_sign_row(sign, type_) for sign in signs]
    return tuple(rows)


def used_signs(network: Network, settings: DrawingSettings) -> tuple[str, ...]:
    """Give the names of the signs that this network needs, in the order of `SIGNS`."""
    used: set[str] = {station.kind for station in network.stations}
    used |= {line.service for line in network.lines if line.mode != "ferry"} & dashed_services(
        network
    )
    if network.walks:
        used.add("walk")
    if any(line.one_way_links for line in network.lines):
        used.add("one-way")
    if settings.show_step_free and any(s.boarding == "yes" for s in network.stations):
        used.add("step-free")
    if settings.closed_sign:
        used.add("closed")
    return tuple(sign for sign in SIGNS if sign in used)


def badge_fits(name: str) -> bool:
    """Say whether a line's name is short enough for a badge."""
    return fonts.text_width_mm(name, 1.0, bold=True) <= _MOST_NAME


def text_offset(key: Key, type_: TypeScale) -> float:
    """Give how far right of a row's corner its text begins, millimetres."""
    return sample_offset(key, type_) + (_SAMPLE + _GAP) * type_.body


def sample_offset(key: Key, type_: TypeScale) -> float:
    """Give how far right of a row's corner its piece of line begins, millimetres."""
    return key.badge_width + 0.5 * _GAP * type_.body if key.badge_width else 0.0


def sample_length(type_: TypeScale) -> float:
    """Give the length of a row's piece of line, millimetres."""
    return _SAMPLE * type_.body


def badge_height(type_: TypeScale) -> float:
    """Give the height of a badge in the key, millimetres."""
    return 1.35 * type_.body


def badge_text_width(name: str, type_: TypeScale) -> float:
    """Give the width of a line's name in its badge, millimetres."""
    return fonts.text_width_mm(name, type_.body, bold=True)


def _heading(text: str, type_: TypeScale) -> KeyRow:
    return KeyRow("heading", text, "", (text,), (), 2.0 * type_.body)


def _line_row(line: Line, network: Network, settings: DrawingSettings, type_: TypeScale) -> KeyRow:
    in_badge = badge_fits(line.name)
    title = line_title(line, network)
    if not in_badge and title == line.name:
        title = line_course(line, network)
    often = how_often(line) if settings.show_headways else ""
    remark = settings.line_remarks.get(line.id, "")
    words = sentence((title, remark, SERVICE_NOTES[line.service], often))
    text = wrap(words, _MOST_TEXT * type_.body, type_.body)
    bold = () if in_badge else wrap(line.name, _MOST_TEXT * type_.body, type_.body, bold=True)
    return KeyRow(
        kind="line",
        id=line.id,
        name=line.name if in_badge else "",
        bold_text=bold,
        text=text,
        height=_row_height(len(bold) + len(text), type_),
    )


def _sign_row(sign: str, type_: TypeScale) -> KeyRow:
    text = wrap(SIGNS[sign], _MOST_TEXT * type_.body, type_.body)
    return KeyRow("sign", sign, "", (), text, _row_height(len(text), type_))


def _row_height(lines: int, type_: TypeScale) -> float:
    return max(badge_height(type_), lines * LEADING * type_.body) + 0.55 * type_.body


def _badge_width(rows: Sequence[KeyRow], type_: TypeScale) -> float:
    widths = [badge_text_width(row.name, type_) for row in rows if row.name]
    return max(*widths, type_.body) + 2.0 * _PADDING * type_.body if widths else 0.0


def _column_width(rows: Sequence[KeyRow], type_: TypeScale) -> float:
    texts = [
        fonts.text_width_mm(text, type_.body, bold=bold)
        for row in rows
        for texts, bold in ((row.bold_text, True), (row.text, False))
        for text in texts
    ]
    badge = _badge_width(rows, type_)
    before = badge + (0.5 * _GAP if badge else 0.0) * type_.body + (_SAMPLE + _GAP) * type_.body
    return before + math.ceil(max(texts, default=0.0))


def _flow(rows: Sequence[KeyRow], limit: float) -> list[list[tuple[KeyRow, float]]]:
    """Fill columns no higher than `limit` in order, each row with its height in the column.

    A heading never stands last in a column, and where a section goes on in the next column, its
    rows begin as far down as under a heading, so that they stand level with their neighbours.
    """
    columns: list[list[tuple[KeyRow, float]]] = [[]]
    used = 0.0
    for i, row in enumerate(rows):
        lead = _lead(row) if columns[-1] else 0.0
        needed = lead + row.height
        if row.kind == "heading" and i + 1 < len(rows):
            needed += rows[i + 1].height
        alone = not columns[-1] or columns[-1][-1][0].kind == "heading"
        if not alone and used + needed > limit + 1e-9:
            columns.append([])
            used = 0.0 if row.kind == "heading" else rows[0].height
            lead = 0.0
        columns[-1].append((row, used + lead))
        used += lead + row.height
    return columns


def _lead(row: KeyRow) -> float:
    """Give the white above a row that is not the first of its column."""
    return 0.4 * row.height if row.kind == "heading" else 0.0


def _placed(
    rows: Sequence[KeyRow], columns: list[list[tuple[KeyRow, float]]], type_: TypeScale
) -> Key:
    column_width = _column_width(rows, type_)
    pitch = column_width + _COLUMN_GAP * type_.body
    return Key(
        rows=tuple(
            PlacedRow(row, i * pitch, y) for i, column in enumerate(columns) for row, y in column
        ),
        width=(len(columns) - 1) * pitch + column_width,
        height=max(column[-1][1] + column[-1][0].height for column in columns),
        badge_width=_badge_width(rows, type_),
        columns=len(columns),
    )
