"""The positions round a marker where its station's name is tried, before anything is in the way."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace

from gtfs_schematic.geometry import Point
from gtfs_schematic.labels.blocks import (
    Align,
    BadgePlace,
    Block,
    Wording,
    set_block,
    type_size_mm,
)
from gtfs_schematic.labels.breaks import break_name
from gtfs_schematic.labels.model import LabelSettings, Side
from gtfs_schematic.labels.reach import NEAR, Reach
from gtfs_schematic.labels.site import OCTANTS, Site, side_vector

TILT_DEG = -45.0
"""The one angle of tilted labels: reading upwards to the right."""
BADGE_SIZE = 0.78
"""Type size of badges in sizes of stop names."""
_AFTER_MOST = 3
"""How many badges may stand behind a name on its own row."""

_RIGHT_CORNERS: tuple[tuple[Side, Side], ...] = (
    ("NE", "NE"),
    ("SE", "SE"),
    ("NE", "N"),
    ("SE", "S"),
)
"""(side, push): pushed straight, the text begins at the marker's edge."""
_LEFT_CORNERS: tuple[tuple[Side, Side], ...] = (
    ("NW", "NW"),
    ("SW", "SW"),
    ("NW", "N"),
    ("SW", "S"),
)
_ABOVE_BELOW: tuple[Side, ...] = ("N", "S")
_TILTS: tuple[tuple[Side, Side, Align], ...] = (("NE", "N", "left"), ("SW", "S", "right"))
"""(side, push, alignment): begun above the marker, or ended below it."""


@dataclass(frozen=True, slots=True)
class Candidate:
    """One place for one label; `origin` is where the block's own (0, 0) comes before rotation."""

    site: Site
    block: Block
    side: Side
    origin: Point
    pivot: Point
    push: Point
    """Unit vector in which it may be pushed from the marker."""
    angle_deg: float
    rows: int
    slide: float
    scale: float
    bare: bool
    """Whether badges that belong to the label were left out."""

    def pushed(self, length_mm: float) -> Candidate:
        """Give the candidate moved along its push direction."""
        dx, dy = self.push[0] * length_mm, self.push[1] * length_mm
        return replace(
            self,
            origin=(self.origin[0] + dx, self.origin[1] + dy),
            pivot=(self.pivot[0] + dx, self.pivot[1] + dy),
        )

    def corners(self) -> tuple[Point, Point, Point, Point]:
        """Give the four corners of the box of all ink on the sheet."""
        (x, y), block = self.origin, self.block
        top, bottom = y + block.ink_top, y + block.ink_bottom
        right = x + block.width
        return (
            self._turned((x, top)),
            self._turned((right, top)),
            self._turned((right, bottom)),
            self._turned((x, bottom)),
        )

    def _turned(self, point: Point) -> Point:
        """Give a point rotated clockwise about the pivot."""
        if self.angle_deg == 0.0:
            return point
        angle = math.radians(self.angle_deg)
        cosine, sine = math.cos(angle), math.sin(angle)
        dx, dy = point[0] - self.pivot[0], point[1] - self.pivot[1]
        return (
            self.pivot[0] + dx * cosine - dy * sine,
            self.pivot[1] + dx * sine + dy * cosine,
        )


@dataclass(frozen=True, slots=True)
class _Spot:
    """Where the origin of a block comes for one side."""

    side: Side
    x: float
    y: float
    push: Side
    slide: float = 0.0


def positions(site: Site, settings: LabelSettings, reach: Reach = NEAR) -> Iterator[Candidate]:
    """Give every position of a station's name: sides, rows, alignments, slides, tilts."""
    for scale in reach.scales:
        for wording in wordings(site, settings, reach, scale):
            rows = len(wording.rows)
            bare = bool(site.badges) and wording.badge_place == "none"
            gap = settings.clearance_mm + reach.gap_mm
            for align, spots_of in _SPOTS.items():
                block = set_block(wording, align)
                for spot in spots_of(site, block, gap, reach.slides):
                    if OCTANTS.index(spot.push) in site.directions:
                        continue  # a line leaves this way
                    origin, push = (spot.x, spot.y), side_vector(spot.push)
                    yield Candidate(
                        site, block, spot.side, origin, origin, push,
                        0.0, rows, spot.slide, scale, bare,
                    )  # fmt: skip
            if rows <= 2 and wording.badge_place != "beneath":
                yield from _tilted(site, wording, gap, scale, bare=bare)
            if site.angle:
                yield from _turned(site, wording, gap, scale, bare=bare)


def wordings(site: Site, settings: LabelSettings, reach: Reach, scale: float) -> Iterator[Wording]:
    """Give the ways to break a name and to place its badges."""
    places: tuple[BadgePlace, ...] = ("none",)
    if site.badges:
        places = ("beneath", "after") if len(site.badges) <= _AFTER_MOST else ("beneath",)
        places = (*places, "none") if reach.drop_badges else places
    counts = range(1, reach.rows + 1)
    breaks = [site.rows] if site.rows else [break_name(site.name, count) for count in counts]
    for rows in breaks:
        if rows is None:
            continue
        for place in places:
            yield Wording(
                rows=rows,
                second=site.second_name,
                badges=site.badges,
                bold=site.bold,
                size_mm=scale * type_size_mm(settings, bold=site.bold),
                badge_size_mm=BADGE_SIZE * type_size_mm(settings, bold=False),
                badge_place=place,
                leading=settings.leading,
            )


def _left_set_spots(
    site: Site, block: Block, gap: float, slides: tuple[float, ...]
) -> Iterator[_Spot]:
    """Give positions to the right of the marker, and above and below from its left edge."""
    yield from _level_spots(site, block, gap, slides, "E")
    for side, push in _RIGHT_CORNERS:
        yield _corner_spot(site, block, gap, side, push)


def _right_set_spots(
    site: Site, block: Block, gap: float, slides: tuple[float, ...]
) -> Iterator[_Spot]:
    """Give positions to the left of the marker, and above and below up to its right edge."""
    yield from _level_spots(site, block, gap, slides, "W")
    for side, push in _LEFT_CORNERS:
        yield _corner_spot(site, block, gap, side, push)


def _level_spots(
    site: Site, block: Block, gap: float, slides: tuple[float, ...], side: Side
) -> Iterator[_Spot]:
    """Give positions straight to the right or left, centred, slid, or with an outer row level."""
    px, py = site.support(side)
    x = px + site.radius + gap if side == "E" else px - site.radius - gap - block.width
    for slide in slides:
        yield _Spot(side, x, py - block.middle + 2.0 * slide * -block.cap_top, side, slide)
    if block.foot > 0.0:
        first = py - block.cap_top / 2.0
        yield _Spot(side, x, first, side, 0.2)
        yield _Spot(side, x, first - block.last_baseline, side, 0.2)


def _corner_spot(site: Site, block: Block, gap: float, side: Side, push: Side) -> _Spot:
    """Give a diagonal position; if pushed straight, the text begins at the marker's edge."""
    diagonal = push == side
    px, py = site.support(side if diagonal else push)
    reach = site.radius + gap
    step = reach * math.sqrt(0.5)
    edge = step if diagonal else -site.radius
    x = px + edge if "E" in side else px - edge - block.width
    rise = step if diagonal else reach
    if "N" in side:
        return _Spot(side, x, py - rise - block.foot - block.descent, push)
    return _Spot(side, x, py + rise - block.cap_top, push)


def _centered_spots(
    site: Site, block: Block, gap: float, slides: tuple[float, ...]
) -> Iterator[_Spot]:
    """Give positions straight above and below, centred or slid along."""
    reach = site.radius + gap
    for side in _ABOVE_BELOW:
        px, py = site.support(side)
        y = py - reach - block.foot - block.descent if side == "N" else py + reach - block.cap_top
        for slide in slides:
            x = px - block.width / 2.0 + slide * block.width
            yield _Spot(side, x, y, side, slide)


_SPOTS: dict[Align, Callable[[Site, Block, float, tuple[float, ...]], Iterator[_Spot]]] = {
    "left": _left_set_spots,
    "right": _right_set_spots,
    "center": _centered_spots,
}


def _tilted(
    site: Site, wording: Wording, gap: float, scale: float, *, bare: bool
) -> Iterator[Candidate]:
    """Give tilted positions where the lines run level: begun above, or ended below the marker."""
    if not site.directions or not set(site.directions) <= {0, 4}:
        return
    rows = len(wording.rows)
    reach = site.radius + gap
    for side, push, align in _TILTS:
        block = set_block(wording, align)
        px, py = site.support(push)
        vector = side_vector(push)
        pivot = (px, py + vector[1] * reach)
        x = pivot[0] if side == "NE" else pivot[0] - block.width
        origin = (x, pivot[1] - block.middle)
        yield Candidate(site, block, side, origin, pivot, vector, TILT_DEG, rows, 0.0, scale, bare)


def _turned(
    site: Site, wording: Wording, gap: float, scale: float, *, bare: bool
) -> Iterator[Candidate]:
    """Give positions at the angle that a person asks for: begun at the marker, or ended there."""
    angle = -float(site.angle or 0)
    reach = site.radius + gap
    onward = round(angle / 45.0) % 8
    aligns: tuple[tuple[int, Align], ...] = ((onward, "left"), ((onward + 4) % 8, "right"))
    for octant, align in aligns:
        block = set_block(wording, align)
        for push in (octant, (octant - 1) % 8, (octant + 1) % 8):
            if push in site.directions:
                continue  # a line leaves this way
            px, py = site.support(OCTANTS[push])
            vector = side_vector(OCTANTS[push])
            pivot = (px + vector[0] * reach, py + vector[1] * reach)
            x = pivot[0] if align == "left" else pivot[0] - block.width
            yield Candidate(
                site, block, OCTANTS[octant], (x, pivot[1] - block.middle), pivot, vector,
                angle, len(wording.rows), 0.0, scale, bare,
            )  # fmt: skip
