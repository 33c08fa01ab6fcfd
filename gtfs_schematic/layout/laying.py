"""Lay what is new: through a gap where there is one, else where least must give way."""

from __future__ import annotations

import math

import shapely

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.detour import Course, courses_between, courses_onward
from gtfs_schematic.layout.draft import Draft
from gtfs_schematic.layout.fine_lattice import Errand
from gtfs_schematic.layout.obstacles import Chain
from gtfs_schematic.layout.places import place_of, point_of
from gtfs_schematic.layout.thread import thread
from gtfs_schematic.progress import Progress


def lay_all(draft: Draft, progress: Progress, *, lifting: bool = True) -> bool:
    """Give everything without a place one; False if something cannot have any.

    `lifting`, edges that stand may be laid anew so that others get a direction of their own.
    """
    waiting = draft.chains()
    while waiting:
        ready = [c for c in waiting if draft.fixed_ends(c)]
        if not ready:
            station = waiting[0].stations[0]
            draft.at[station] = draft.expected(station)
            continue
        # Chains with two fixed ends have the least choice.
        chain = min(ready, key=lambda c: (-draft.fixed_ends(c), len(c.stations), c.stations))
        laid = _through_gap(draft, chain) or _threaded(draft, chain)
        if not laid and not (lifting and _with_port(draft, chain, progress)):
            return False
        waiting = draft.chains()
        progress.step()
    return True


def _directed(draft: Draft, chain: Chain) -> Chain:
    """Let the chain begin at a station with a place."""
    if chain.stations[0] in draft.at:
        return chain
    return Chain(chain.stations[::-1], chain.edges[::-1])


def _through_gap(draft: Draft, chain: Chain) -> bool:
    """Lay a chain along the cheapest simple course that keeps all distances."""
    chain = _directed(draft, chain)
    first, last = chain.stations[0], chain.stations[-1]
    start = place_of(draft.at[first])
    leaving = draft.ports(first, chain.edges[0])
    spacing = draft.spacing()
    expected = shapely.LineString([draft.expected(s) for s in chain.stations])
    if last in draft.at:
        arriving = draft.ports(last, chain.edges[-1])
        courses = courses_between(start, place_of(draft.at[last]), leaving, arriving, spacing)
    else:
        courses = courses_onward(start, leaving, len(chain.edges) * spacing, spacing)
    ranked = sorted(courses, key=lambda c: (_rank(c, expected, spacing), c.corners))
    obstacles = draft.obstacles(chain)
    for course in ranked:
        path = tuple(point_of(corner) for corner in course.corners)
        stops = obstacles.stations_along(path, len(chain.edges))
        if stops is not None and obstacles.allow(course):
            draft.lay(chain, path, stops)
            return True
    return False


def _rank(course: Course, expected: shapely.LineString, spacing: float) -> float:
    """Cost of a course with its distance from where the ground wants it."""
    points = shapely.points([point_of(corner) for corner in course.corners])
    away = float(shapely.distance(points, expected).mean())
    end = math.dist(point_of(course.corners[-1]), expected.coords[-1])
    return round(course.cost + (away + end) / spacing * 0.5, 6)


def _threaded(draft: Draft, chain: Chain) -> bool:
    """Lay a chain as a thread, for which others must give way."""
    chain = _directed(draft, chain)
    first, last = chain.stations[0], chain.stations[-1]
    fixed = last in draft.at
    places = [draft.expected(s) for s in chain.stations]
    leaving = draft.ports(first, chain.edges[0])
    arriving = draft.ports(last, chain.edges[-1]) if fixed else None
    if not leaving or arriving == ():
        return False
    ends: tuple[Point, ...] = (places[0], places[-1]) if fixed else (places[0],)
    expected = shapely.LineString(places)
    errand = Errand(places[0], leaving, places[-1], arriving, expected, draft.spacing(), ends)
    obstacles = draft.obstacles(chain)
    path = thread(obstacles, errand)
    if path is None:
        return False
    stops = obstacles.stations_along(path, len(chain.edges), thin=True)
    if stops is None:
        return False
    draft.lay_thread(chain, path, stops)
    draft.thin.update((edge.id, chain.edges[0].id) for edge in chain.edges)
    return True


def _with_port(draft: Draft, chain: Chain, progress: Progress) -> bool:
    """Lay a chain at whose end no direction is free, or none that leads on.

    Edges beside it there are laid anew: only as many as must, and few where others may help.
    """
    ends = ((chain.stations[0], chain.edges[0]), (chain.stations[-1], chain.edges[-1]))
    for station, edge in ends:
        if station not in draft.at:
            continue
        beside = draft.beside(station, edge)
        most = 2 if draft.ports(station, edge) else len(beside)
        for lifted in (beside[:1], beside[1:2], *(beside[:k] for k in range(2, most + 1))):
            trial = draft.copy()
            for other in lifted:
                del trial.path[other.id]
                trial.thin[other.id] = edge.id
            if trial.ports(station, edge) and lay_all(trial, progress, lifting=False):
                draft.at, draft.path, draft.thin = trial.at, trial.path, trial.thin
                return True
    return False
