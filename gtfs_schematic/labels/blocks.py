"""A station's name is set as a block of rows, with the second name and badges beneath."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import Literal

from gtfs_schematic.geometry import Point
from gtfs_schematic.labels.breaks import break_name
from gtfs_schematic.labels.fonts import ink_height, metrics, text_width_mm
from gtfs_schematic.labels.model import Badge, LabelSettings, TextLine

Align = Literal["left", "center", "right"]
BadgePlace = Literal["none", "beneath", "after"]

MM_PER_POINT = 25.4 / 72.0
SECOND_SIZE = 0.75
"""Size of the second name in sizes of the first."""
DESCENT = 0.22
"""Room kept under a baseline, in sizes: the descenders of the typeface, rounded down."""
_BADGE_PAD_X = 0.22
_BADGE_PAD_Y = 0.17
_BADGE_GAP = 0.3
_BADGES_PER_ROW = 4
_BADGE_ROW_MM = 26.0
_ALIGN_SHARE: dict[Align, float] = {"left": 0.0, "center": 0.5, "right": 1.0}


@dataclass(frozen=True, slots=True)
class Wording:
    """What a label says: rows of the name, second name, (line id, text) of its badges."""

    rows: tuple[str, ...]
    second: str
    badges: tuple[tuple[str, str], ...]
    bold: bool
    size_mm: float
    """Type size of the name as drawn."""
    badge_size_mm: float
    badge_place: BadgePlace
    leading: float


@dataclass(frozen=True, slots=True)
class Block:
    """A set label in its own millimetres: first baseline at y = 0, left edge at x = 0, y down."""

    lines: tuple[TextLine, ...]
    badges: tuple[Badge, ...]
    width: float
    cap_top: float
    """Height of the first row's capitals: the y by which rows are lined up."""
    foot: float
    """The last baseline, or the lower edge of the badges: its counterpart."""
    last_baseline: float
    ink_top: float
    ink_bottom: float

    @property
    def middle(self) -> float:
        """Give the y of the optical middle."""
        return (self.cap_top + self.foot) / 2.0

    @property
    def descent(self) -> float:
        """Give the room kept under the foot: always the same, so that baselines line up."""
        return 0.0 if self.foot > self.last_baseline else DESCENT * self.lines[-1].size_mm

    def moved(self, by: Point) -> tuple[tuple[TextLine, ...], tuple[Badge, ...]]:
        """Give rows and badges with the block's origin at a point of the sheet."""
        dx, dy = by
        lines = tuple(replace(r, x_mm=r.x_mm + dx, y_mm=r.y_mm + dy) for r in self.lines)
        return lines, tuple(_shifted(badge, dx, dy) for badge in self.badges)


def type_size_mm(settings: LabelSettings, *, bold: bool) -> float:
    """Give the type size of a name in millimetres."""
    return MM_PER_POINT * (settings.interchange_size_pt if bold else settings.size_pt)


@lru_cache(maxsize=65536)
def set_block(wording: Wording, align: Align) -> Block:
    """Set a label's rows, second name and badges."""
    share, cap = _ALIGN_SHARE[align], metrics(bold=wording.bold).cap_height
    lines = _name_lines(wording)
    last = lines[-1]
    shapes = _badge_rows(wording) if wording.badge_place != "none" and wording.badges else []
    trailing = shapes[0] if wording.badge_place == "after" and shapes else []
    beneath = shapes if wording.badge_place == "beneath" else []
    widths = [line.width_mm for line in lines]
    widths[-1] += _row_width(trailing) + (0.35 * last.size_mm if trailing else 0.0)
    width = max([*widths, *map(_row_width, beneath)])
    starts = [share * (width - w) for w in widths]
    tail = starts[-1] + widths[-1] - _row_width(trailing)
    badges = [_level_with(badge, tail, last, cap) for badge in trailing]
    y = last.y_mm + (DESCENT + 0.12) * last.size_mm
    for row in beneath:
        badges += [_shifted(badge, share * (width - _row_width(row)), y) for badge in row]
        y += row[0].height_mm + 0.2 * wording.badge_size_mm
    ink_top, ink_bottom = _ink(lines, badges, wording)
    return Block(
        lines=tuple(replace(line, x_mm=x) for line, x in zip(lines, starts, strict=True)),
        badges=tuple(badges),
        width=width,
        cap_top=-cap * lines[0].size_mm,
        foot=badges[-1].y_mm + badges[-1].height_mm if beneath else last.y_mm,
        last_baseline=last.y_mm,
        ink_top=ink_top,
        ink_bottom=ink_bottom,
    )


def _ink(
    lines: Sequence[TextLine], badges: Sequence[Badge], wording: Wording
) -> tuple[float, float]:
    """Give the uppermost and lowest y of rows and badges, capitals and descenders at least."""
    cap = metrics(bold=wording.bold).cap_height
    tops, bottoms = [badge.y_mm for badge in badges], [b.y_mm + b.height_mm for b in badges]
    for line in lines:
        above, below = ink_height(line.text, bold=wording.bold and not line.second)
        tops.append(line.y_mm - max(above, cap) * line.size_mm)
        bottoms.append(line.y_mm + max(below, DESCENT) * line.size_mm)
    return min(tops), max(bottoms)


def _name_lines(wording: Wording) -> list[TextLine]:
    """Set the rows of both names, one under the other, all starting at x = 0."""
    size = wording.size_mm
    lines = [
        TextLine(
            row, 0.0, i * wording.leading * size, text_width_mm(row, size, bold=wording.bold), size
        )
        for i, row in enumerate(wording.rows)
    ]
    if not wording.second:
        return lines
    y, small = lines[-1].y_mm, SECOND_SIZE * size
    count = len(wording.rows) if text_width_mm(wording.second, small) > _widest(lines) else 1
    second_rows = break_name(wording.second, count) or (wording.second,)
    for i, row in enumerate(second_rows):
        y += (wording.leading if i else wording.leading + 0.1) * small
        lines.append(TextLine(row, 0.0, y, text_width_mm(row, small), small, second=True))
    return lines


def _widest(lines: Sequence[TextLine]) -> float:
    """Give the width of the widest row."""
    return max(line.width_mm for line in lines)


def badge_height(size: float) -> float:
    """Give the height of a badge for its type size, millimetres."""
    return (metrics(bold=True).cap_height + 2.0 * _BADGE_PAD_Y) * size


def badge_width(text: str, size: float) -> float:
    """Give the width of a badge, at least its height."""
    return max(badge_height(size), text_width_mm(text, size, bold=True) + 2.0 * _BADGE_PAD_X * size)


def _badge_rows(wording: Wording) -> list[list[Badge]]:
    """Set the badges in rows, each row starting at x = 0, y = 0."""
    size = wording.badge_size_mm
    cap = metrics(bold=True).cap_height * size
    height = badge_height(size)
    limit = max(_BADGE_ROW_MM, text_width_mm(wording.rows[0], wording.size_mm, bold=wording.bold))
    rows: list[list[Badge]] = [[]]
    x = 0.0
    for line_id, text in wording.badges:
        text_width = text_width_mm(text, size, bold=True)
        width = badge_width(text, size)
        full = len(rows[-1]) == _BADGES_PER_ROW and wording.badge_place != "after"
        if rows[-1] and (full or x + width > limit) and wording.badge_place != "after":
            rows.append([])
            x = 0.0
        text_x = x + (width - text_width) / 2.0
        text_y = (height + cap) / 2.0
        rows[-1].append(Badge(line_id, text, x, 0.0, width, height, text_x, text_y, size))
        x += width + _BADGE_GAP * size
    return rows


def _row_width(row: Sequence[Badge]) -> float:
    """Give the width of a row of badges."""
    return row[-1].x_mm + row[-1].width_mm if row else 0.0


def _shifted(badge: Badge, dx: float, dy: float) -> Badge:
    """Give a badge moved."""
    return replace(
        badge,
        x_mm=badge.x_mm + dx,
        y_mm=badge.y_mm + dy,
        text_x_mm=badge.text_x_mm + dx,
        text_y_mm=badge.text_y_mm + dy,
    )


def _level_with(badge: Badge, x: float, line: TextLine, cap: float) -> Badge:
    """Give a badge moved behind a row, its middle at the middle of the row's capitals."""
    return _shifted(badge, x, line.y_mm - (cap * line.size_mm + badge.height_mm) / 2.0)
