"""Choose where lines change slots on straight passes, so that they keep clear of others."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Iterator, Mapping

import shapely

from gtfs_schematic.bundles.joints import Shift, Shifts, is_straight, joint, slot_change
from gtfs_schematic.bundles.junction import Junction, Leg, Pass
from gtfs_schematic.bundles.slots import SHIFT_SHARES, Slots, moved
from gtfs_schematic.geometry import Point

_LENGTHS = (4.0, 2.5, 1.5)
"""Lengths of the oblique piece to try, in multiples of the largest change of slot; gaps between
lines that shift together narrow by the cosine of its angle, so the longest that fits is best."""
_STARTS = (0.0, 0.5, 1.0, 1.5, 2.0, 3.0)
"""Distances from the station to try, in multiples of the lines' pitch."""
_CLEAR = 0.95
"""Lines nearer than this share of the pitch are taken for overlapping."""
_DELAY_COST = 0.1
"""Overlap that a shift may cost rather than move one millimetre away from the station."""
_WIDE_COST = 0.6
"""Overlap, millimetres, that a shift may cost rather than stand on the wider link."""
_VIEW = 9.0
"""How far from the station lines are compared, in multiples of the pitch."""


def choose_shifts(nodes: Mapping[str, Junction], slots: Slots) -> Shifts:
    """Give the shift of every straight pass on which a line changes its slot.

    All lines of a pass shift over the same length, so that their order and clearance carry over.
    Candidates near the station, on the narrower link first, are drawn, and the one that runs
    least alongside the station's other lines is kept.
    """
    chosen: dict[tuple[str, str, str], Shift] = {}
    for junction in nodes.values():
        groups = _changing(junction, slots)
        for (first, second), lines in groups.items():
            options = _options(junction, (first, second), lines, slots)
            chosen[junction.station_id, first, second] = next(options)
        for (first, second), lines in groups.items():
            options = _options(junction, (first, second), lines, slots)
            chosen[junction.station_id, first, second] = min(
                options,
                key=lambda shift: _cost(junction, (first, second), shift, slots, chosen),
            )
    return chosen


def _changing(junction: Junction, slots: Slots) -> dict[tuple[str, str], list[str]]:
    groups: dict[tuple[str, str], list[str]] = defaultdict(list)
    for way in junction.passes:
        first, second = junction.leg[way.first], junction.leg[way.second]
        if is_straight(first, second) and slot_change(first, second, way.line_id, slots):
            groups[way.first, way.second].append(way.line_id)
    return groups


def _options(
    junction: Junction, links: tuple[str, str], lines: list[str], slots: Slots
) -> Iterator[Shift]:
    first, second = (junction.leg[link_id] for link_id in links)
    change = max(abs(slot_change(first, second, line, slots)) for line in lines)
    room = {
        leg.link_id: min(slots.reach(leg, line, SHIFT_SHARES) for line in lines)
        for leg in (first, second)
    }
    legs = sorted((first, second), key=lambda leg: (slots.half_width(leg.link_id), leg.link_id))
    fits = False
    for leg, start, factor in itertools.product(legs, _STARTS, _LENGTHS):
        shift = Shift(leg.link_id, start * slots.pitch, factor * change)
        if shift.start_mm + shift.length_mm <= room[leg.link_id]:
            fits = True
            yield shift
    if not fits:
        widest = max(room, key=lambda link_id: (room[link_id], link_id))
        yield Shift(widest, 0.0, room[widest])


def _cost(
    junction: Junction, links: tuple[str, str], shift: Shift, slots: Slots, chosen: Shifts
) -> tuple[float, float, str]:
    trial = {**chosen, (junction.station_id, *links): shift}
    own: list[tuple[str, list[Point]]] = []
    others: list[tuple[str, list[Point]]] = []
    for way in junction.passes:
        course = _local_course(junction, way, slots, trial)
        (own if (way.first, way.second) == links else others).append((way.line_id, course))
    passing = {(way.line_id, link) for way in junction.passes for link in (way.first, way.second)}
    for leg in junction.legs:
        for line_id in slots.orders[leg.link_id]:
            if (line_id, leg.link_id) not in passing:
                foot = slots.foot(junction, leg, line_id)
                others.append((line_id, [foot, _outer(junction, leg, line_id, slots)]))
    overlap = 0.0
    for line_id, course in own:
        near = [shapely.LineString(c) for other, c in others if other != line_id]
        if near:
            zone = shapely.union_all(shapely.buffer(near, _CLEAR * slots.pitch, quad_segs=4))
            overlap += shapely.LineString(course).intersection(zone).length
    widths = [slots.half_width(link_id) for link_id in links]
    wide = slots.half_width(shift.link_id) > min(widths)
    cost = overlap + _DELAY_COST * shift.start_mm + _WIDE_COST * wide
    return (round(cost, 6), -shift.length_mm, shift.link_id)


def _local_course(junction: Junction, way: Pass, slots: Slots, shifts: Shifts) -> list[Point]:
    first, second = junction.leg[way.first], junction.leg[way.second]
    return [
        _outer(junction, first, way.line_id, slots),
        *(knot.at for knot in joint(junction, way, slots, shifts)),
        _outer(junction, second, way.line_id, slots),
    ]


def _outer(junction: Junction, leg: Leg, line_id: str, slots: Slots) -> Point:
    length = min(leg.length_mm, _VIEW * slots.pitch)
    return moved(slots.foot(junction, leg, line_id), leg.direction, length)
