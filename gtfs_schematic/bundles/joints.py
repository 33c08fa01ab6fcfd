"""The joint of a line at a station: where its parallel to one link becomes that to the next."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace

from gtfs_schematic.bundles.junction import Junction, Leg, Pass
from gtfs_schematic.bundles.slots import JOINT_SHARES, Slots, moved, turn_angle
from gtfs_schematic.geometry import Point

STRAIGHT = math.radians(20.0)
"""A pass that turns less is straight: a change of slot needs an oblique piece."""
_SAME_MM = 1e-6

Group = tuple[str, str, str]
"""Knots of one bend of a bundle, whose arcs are concentric: (station or link, …)."""


@dataclass(frozen=True, slots=True)
class Knot:
    """A corner in the making."""

    at: Point
    into: Point | None = None
    """Unit vector in which the course should come, None if free."""
    out: Point | None = None
    """Unit vector in which the course should go on, None if free."""
    group: Group | None = None
    extra_mm: float = 0.0
    """How much larger the radius is than that of the group's innermost line."""

    def turned(self) -> Knot:
        """Give the same knot for a course that runs the other way."""
        return replace(self, into=_minus(self.out), out=_minus(self.into))


@dataclass(frozen=True, slots=True)
class Shift:
    """Where the lines of a straight pass change slots: on one link, from `start_mm` on."""

    link_id: str
    start_mm: float
    length_mm: float


Shifts = Mapping[tuple[str, str, str], Shift]
"""By station and the two links of a pass."""


def joint(junction: Junction, way: Pass, slots: Slots, shifts: Shifts) -> tuple[Knot, ...]:
    """Give the knots of a line's pass, in order from its first link to its second."""
    first, second = junction.leg[way.first], junction.leg[way.second]
    if is_straight(first, second):
        return _shifted(junction, way, slots, shifts)
    return _mitre(junction, way, slots)


def is_straight(first: Leg, second: Leg) -> bool:
    """Say whether going from one leg to the other is no turn to speak of."""
    return abs(turn_angle(_back(first), second.direction)) < STRAIGHT


def slot_change(first: Leg, second: Leg, line_id: str, slots: Slots) -> float:
    """Give how far to the right a line must move on a straight pass."""
    return slots.outward(second, line_id) + slots.outward(first, line_id)


def _shifted(junction: Junction, way: Pass, slots: Slots, shifts: Shifts) -> tuple[Knot, ...]:
    first, second = junction.leg[way.first], junction.leg[way.second]
    if abs(slot_change(first, second, way.line_id, slots)) < _SAME_MM:
        turn = turn_angle(_back(first), second.direction)
        if abs(turn) < 1e-9:
            return ()
        return (Knot(slots.foot(junction, first, way.line_id), _back(first), second.direction),)
    shift = shifts[junction.station_id, way.first, way.second]
    near, far = (first, second) if shift.link_id == way.second else (second, first)
    begin = Knot(
        moved(slots.foot(junction, near, way.line_id), near.direction, -shift.start_mm),
        into=_back(near),
    )
    finish = Knot(
        moved(
            slots.foot(junction, far, way.line_id),
            far.direction,
            shift.start_mm + shift.length_mm,
        ),
        out=far.direction,
    )
    return (begin, finish) if far is second else (finish.turned(), begin.turned())


def _mitre(junction: Junction, way: Pass, slots: Slots) -> tuple[Knot, ...]:
    """Let the two parallels meet; where one runs past the station and too far out, cut across.

    On the inside of a turn the parallels meet before the station, and cannot meet elsewhere.
    """
    first, second = junction.leg[way.first], junction.leg[way.second]
    p, q = (slots.foot(junction, leg, way.line_id) for leg in (first, second))
    d, e = first.direction, second.direction
    det = d[0] * e[1] - d[1] * e[0]
    gap = (q[0] - p[0], q[1] - p[1])
    along_first = (gap[0] * e[1] - gap[1] * e[0]) / det
    along_second = (gap[0] * d[1] - gap[1] * d[0]) / det
    most_first = slots.reach(first, way.line_id, JOINT_SHARES)
    most_second = slots.reach(second, way.line_id, JOINT_SHARES)
    into, out = _back(first), second.direction
    inside = along_first > 0.0 and along_second > 0.0
    if inside or (along_first <= most_first and along_second <= most_second):
        extra = _extra(junction, way, slots)
        group = (junction.station_id, way.first, way.second)
        return (Knot(moved(p, d, along_first), into, out, group, extra),)
    if along_second > most_second:
        b = most_second
        a = _early(moved(q, e, b), p, d)
    else:
        a = most_first
        b = _early(moved(p, d, a), q, e)
    return (Knot(moved(p, d, a), into=into), Knot(moved(q, e, b), out=out))


def _early(target: Point, foot: Point, direction: Point) -> float:
    """Give where to leave a parallel so as to reach a point beside it at a steep angle."""
    dx, dy = target[0] - foot[0], target[1] - foot[1]
    along = dx * direction[0] + dy * direction[1]
    beside = abs(dx * direction[1] - dy * direction[0])
    return along + 0.5 * beside


def _extra(junction: Junction, way: Pass, slots: Slots) -> float:
    """Give how much further out a line runs than the innermost of those with the same pass."""
    first, second = junction.leg[way.first], junction.leg[way.second]
    side = 1.0 if turn_angle(_back(first), second.direction) > 0.0 else -1.0
    lines = [
        other.line_id
        for other in junction.passes
        if (other.first, other.second) == (way.first, way.second)
    ]
    inner_first = max(-side * slots.outward(first, line) for line in lines)
    inner_second = max(side * slots.outward(second, line) for line in lines)
    return min(
        inner_first + side * slots.outward(first, way.line_id),
        inner_second - side * slots.outward(second, way.line_id),
    )


def _back(leg: Leg) -> Point:
    return (-leg.direction[0], -leg.direction[1])


def _minus(vector: Point | None) -> Point | None:
    return None if vector is None else (-vector[0], -vector[1])
