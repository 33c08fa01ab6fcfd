"""Where each line runs beside its link's centre line, and how far from a station it may turn."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field

from gtfs_schematic.bundles.junction import Junction, Leg
from gtfs_schematic.bundles.model import BundleSettings
from gtfs_schematic.geometry import Point

SHIFT_SHARES = (0.48, 0.75)
"""Share of a straight link, or of the way to its bend, within which lines may change slots."""
JOINT_SHARES = (0.85, 0.9)
"""The same for the corner in which a line turns from one link into another."""


def right_normal(direction: Point) -> Point:
    """Give the unit normal to the right of a direction as seen on the sheet (y points down)."""
    return (-direction[1], direction[0])


def moved(p: Point, direction: Point, length: float) -> Point:
    """Give the point that lies `length` from `p` in a direction."""
    return (p[0] + length * direction[0], p[1] + length * direction[1])


def turn_angle(into: Point, out: Point) -> float:
    """Give the angle by which a course turns, radians, positive to the right on the sheet."""
    return math.atan2(
        into[0] * out[1] - into[1] * out[0],
        into[0] * out[0] + into[1] * out[1],
    )


@dataclass(frozen=True)
class Slots:
    """Offsets of lines from centre lines, millimetres, positive to the right.

    With k lines of width w and gap g, line i of the order (0 leftmost) has the offset
    (i − (k − 1) / 2) (w + g), and the bundle's aside beside.
    """

    orders: Mapping[str, tuple[str, ...]]
    settings: BundleSettings
    asides: Mapping[str, float] = field(default_factory=dict)
    """Per link id how far its bundle is moved to the right, seen from start to end."""

    @property
    def pitch(self) -> float:
        """Distance of neighbouring lines' centres."""
        return self.settings.line_width_mm + self.settings.line_gap_mm

    def offset(self, link_id: str, line_id: str) -> float:
        """Offset as seen going from the link's start to its end."""
        return self.inner(link_id, line_id) + self.asides.get(link_id, 0.0)

    def inner(self, link_id: str, line_id: str) -> float:
        """Offset from the middle of the bundle, likewise."""
        order = self.orders[link_id]
        return (order.index(line_id) - (len(order) - 1) / 2.0) * self.pitch

    def half_width(self, link_id: str) -> float:
        """Offset of the outermost line from the middle of the bundle."""
        return (len(self.orders[link_id]) - 1) / 2.0 * self.pitch

    def outward(self, leg: Leg, line_id: str) -> float:
        """Offset as seen leaving the station."""
        offset = self.offset(leg.link_id, line_id)
        return offset if leg.forward else -offset

    def foot(self, junction: Junction, leg: Leg, line_id: str) -> Point:
        """Give the point at which the line's own parallel to the leg passes the station."""
        return moved(junction.at_mm, right_normal(leg.direction), self.outward(leg, line_id))

    def reach(self, leg: Leg, line_id: str, shares: tuple[float, float]) -> float:
        """Length along the leg, from the line's foot, that a joint may use."""
        if leg.bend is None:
            return shares[0] * leg.length_mm
        turn = turn_angle(leg.direction, leg.bend)
        bend_at = leg.length_mm - self.outward(leg, line_id) * math.tan(turn / 2.0)
        return max(0.2 * leg.length_mm, shares[1] * bend_at)
