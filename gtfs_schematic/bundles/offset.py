"""Draw every line's own course: its parallel to each link, joined at stations, rounded."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from gtfs_schematic.bundles.joints import Knot, Shifts, joint
from gtfs_schematic.bundles.junction import Junction, Pass
from gtfs_schematic.bundles.mend import mend
from gtfs_schematic.bundles.model import Stretch
from gtfs_schematic.bundles.rounding import round_corners
from gtfs_schematic.bundles.routes import Route, cut_into_routes
from gtfs_schematic.bundles.shifts import choose_shifts
from gtfs_schematic.bundles.slots import SHIFT_SHARES, Slots, moved, right_normal, turn_angle
from gtfs_schematic.geometry import Point, distance, unit_vector
from gtfs_schematic.layout.model import Layout

_JOIN_MM = 0.1
"""How far before its own joint a branch begins at least, millimetres."""


@dataclass(frozen=True)
class _Plan:
    layout: Layout
    nodes: Mapping[str, Junction]
    slots: Slots
    shifts: Shifts


def draw_courses(
    layout: Layout, nodes: Mapping[str, Junction], slots: Slots
) -> tuple[Stretch, ...]:
    """Give the stretches of all lines, in line order."""
    plan = _Plan(layout, nodes, slots, choose_shifts(nodes, slots))
    routes = cut_into_routes(layout, nodes)
    knots = [mend(_route_knots(plan, route)) for route in routes]
    radius = slots.settings.corner_radius_mm
    return tuple(
        Stretch(route.line_id, tuple(link_id for link_id, _ in route.links), corners)
        for route, corners in zip(routes, round_corners(knots, radius), strict=True)
    )


def _route_knots(plan: _Plan, route: Route) -> list[Knot]:
    knots = _end_knots(plan, route, at_start=True)
    for i, (link_id, forward) in enumerate(route.links):
        knots += _bend_knots(plan, route.line_id, link_id, forward=forward)
        if i + 1 < len(route.links) or route.closed:
            following = route.links[(i + 1) % len(route.links)][0]
            station = _far_station(plan, link_id, forward=forward)
            knots += _pass_knots(plan, station, route.line_id, (link_id, following))
    if route.closed:
        return _closed_at_longest(knots)
    return knots + _end_knots(plan, route, at_start=False)


def _far_station(plan: _Plan, link_id: str, *, forward: bool) -> str:
    link = plan.layout.network.link[link_id]
    return link.end if forward else link.start


def _pass_knots(plan: _Plan, station: str, line_id: str, links: tuple[str, str]) -> list[Knot]:
    way = Pass(line_id, min(links), max(links))
    knots = joint(plan.nodes[station], way, plan.slots, plan.shifts)
    return list(knots) if way.first == links[0] else [knot.turned() for knot in reversed(knots)]


def _bend_knots(plan: _Plan, line_id: str, link_id: str, *, forward: bool) -> list[Knot]:
    """Give the bends inside a link: mitres of its parallel, concentric for the bundle."""
    path = plan.layout.paths[link_id]
    offset = plan.slots.offset(link_id, line_id)
    half = plan.slots.half_width(link_id)
    knots = []
    for i in range(1, len(path) - 1):
        into, out = unit_vector(path[i - 1], path[i]), unit_vector(path[i], path[i + 1])
        turn = turn_angle(into, out)
        if abs(turn) < 1e-9:
            continue
        at = moved(path[i], right_normal(into), offset)
        at = moved(at, into, -offset * math.tan(turn / 2.0))
        inner = plan.slots.inner(link_id, line_id)
        extra = half - inner if turn > 0.0 else half + inner
        knots.append(Knot(at, into, out, ("bend", link_id, str(i)), extra))
    return knots if forward else [knot.turned() for knot in reversed(knots)]


def _end_knots(plan: _Plan, route: Route, *, at_start: bool) -> list[Knot]:
    """End at a terminus on the line's own parallel, at a branch on the course of the other."""
    link_id, forward = route.links[0 if at_start else -1]
    station = _far_station(plan, link_id, forward=forward != at_start)
    junction = plan.nodes[station]
    leg = junction.leg[link_id]
    way = route.start_join if at_start else route.end_join
    if way is None:
        knots = [Knot(plan.slots.foot(junction, leg, route.line_id), out=leg.direction)]
    else:
        onto = way.second if way.first == link_id else way.first
        knots = [
            _join_point(plan, junction, way, onto),
            *_pass_knots(plan, station, route.line_id, (onto, link_id)),
        ]
    return knots if at_start else [knot.turned() for knot in reversed(knots)]


def _join_point(plan: _Plan, junction: Junction, way: Pass, onto: str) -> Knot:
    """Give where a branch ends: on the other link, beyond all that its course does near here."""
    leg = junction.leg[onto]
    foot = plan.slots.foot(junction, leg, way.line_id)
    furthest = own = 0.0
    for other in junction.passes:
        if other.line_id != way.line_id or onto not in (other.first, other.second):
            continue
        for knot in joint(junction, other, plan.slots, plan.shifts):
            along = sum((p - q) * d for p, q, d in zip(knot.at, foot, leg.direction, strict=True))
            turn = turn_angle(knot.into, knot.out) if knot.into and knot.out else 0.5
            radius = plan.slots.settings.corner_radius_mm + knot.extra_mm
            furthest = max(furthest, along + radius * math.tan(abs(turn) / 2.0))
            own = max(own, along) if other == way else own
    reach = plan.slots.reach(leg, way.line_id, SHIFT_SHARES)
    back = (-leg.direction[0], -leg.direction[1])
    # Short of its own joint it would have to run backwards; beside the other course nobody sees.
    to_mm = max(min(furthest + 0.5, reach), own + _JOIN_MM)
    return Knot(moved(foot, leg.direction, to_mm), out=back)


def _closed_at_longest(knots: list[Knot]) -> list[Knot]:
    """Begin and end a closed course in the middle of its longest straight piece."""
    count = len(knots)
    if count < 2:
        return knots
    lengths = [distance(knots[i - 1].at, knots[i].at) for i in range(count)]
    start = max(range(count), key=lambda i: (round(lengths[i], 6), -i))
    p, q = knots[start - 1].at, knots[start].at
    middle: Point = ((p[0] + q[0]) / 2.0, (p[1] + q[1]) / 2.0)
    along = unit_vector(p, q)
    return [
        Knot(middle, out=along),
        *knots[start:],
        *knots[:start],
        Knot(middle, into=along),
    ]
