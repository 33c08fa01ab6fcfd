"""Octilinear courses between two places, or from one place on, in rising cost."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator
from dataclasses import dataclass

from gtfs_schematic.layout.places import Place
from gtfs_schematic.layout.snap import UNITS_PER_MM

STEPS: tuple[Place, ...] = (
    (1, 0),
    (1, -1),
    (0, -1),
    (-1, -1),
    (-1, 0),
    (-1, 1),
    (0, 1),
    (1, 1),
)
"""Steps of the eight directions, 0 east, counter-clockwise as seen on the sheet (y down)."""

_BEND = (0.0, 1.0, 2.4)
"""Price of a turn by 0, 45 and 90 degrees, in station spacings of needless length."""
_SAMPLES = 20


@dataclass(frozen=True, slots=True)
class Course:
    """An octilinear course: corners, ends included, and what it costs by itself."""

    corners: tuple[Place, ...]
    cost: float


def courses_between(
    start: Place,
    end: Place,
    leaving: tuple[int, ...],
    arriving: tuple[int, ...],
    spacing_mm: float,
) -> list[Course]:
    """Give courses with up to three bends, cheapest first.

    Parameters
    ----------
    start, end
        Fixed places.
    leaving, arriving
        Directions in which the course may leave `start`, and `end` as seen from there.
    spacing_mm
        A station spacing; lengths count in it.
    """
    stub = round(0.4 * spacing_mm * UNITS_PER_MM)
    found: dict[tuple[Place, ...], Course] = {}
    for first, last in itertools.product(leaving, arriving):
        heading = (last + 4) % 8
        for corners in itertools.chain(
            _straight(start, end, first, heading),
            _through(start, end, (first, heading), stub),
            _with_middle(start, end, first, heading, stub),
        ):
            if corners not in found:
                found[corners] = Course(corners, _cost(corners, spacing_mm))
    return sorted(found.values(), key=lambda course: (round(course.cost, 6), course.corners))


def courses_onward(
    start: Place,
    leaving: tuple[int, ...],
    length_mm: float,
    spacing_mm: float,
) -> list[Course]:
    """Give courses of about a length from a fixed place to wherever, cheapest first."""
    found: list[Course] = []
    for share, first in itertools.product((1.0, 0.85, 1.2, 0.7, 1.5), leaving):
        total = round(length_mm * share * UNITS_PER_MM)
        odd = abs(1.0 - share)
        corners = (start, _advance(start, first, total))
        found.append(Course(corners, odd + _cost(corners, spacing_mm)))
        for turn, part in itertools.product((-2, -1, 1, 2), (0.15, 0.3, 0.5, 0.7, 0.85)):
            corner = _advance(start, first, round(total * part))
            second = (first + turn) % 8
            bent = (start, corner, _advance(corner, second, total - round(total * part)))
            found.append(Course(bent, odd + _cost(bent, spacing_mm)))
            for onward in (-1, 1):
                middle = _advance(corner, second, round(total * (1.0 - part) / 2.0))
                last = (second + onward) % 8
                twice = (start, corner, middle, _advance(middle, last, round(total / 3.0)))
                found.append(Course(twice, odd + _cost(twice, spacing_mm)))
    return sorted(found, key=lambda course: (round(course.cost, 6), course.corners))


def _advance(place: Place, direction: int, length: int) -> Place:
    dx, dy = STEPS[direction]
    steps = round(length / math.hypot(dx, dy))
    return place[0] + dx * steps, place[1] + dy * steps


def _straight(start: Place, end: Place, first: int, heading: int) -> Iterator[tuple[Place, ...]]:
    dx, dy = end[0] - start[0], end[1] - start[1]
    ux, uy = STEPS[first]
    steps = max(abs(dx), abs(dy))
    if first == heading and steps > 0 and (ux * steps, uy * steps) == (dx, dy):
        yield (start, end)


def _through(
    start: Place, end: Place, directions: tuple[int, int], stub: int
) -> Iterator[tuple[Place, ...]]:
    """Courses of two segments; at most one."""
    solved = _solve(start, end, *directions)
    if solved is not None and min(solved) >= stub and _gentle(*directions):
        dx, dy = STEPS[directions[0]]
        yield (start, (start[0] + dx * solved[0], start[1] + dy * solved[0]), end)


def _with_middle(
    start: Place, end: Place, first: int, heading: int, stub: int
) -> Iterator[tuple[Place, ...]]:
    """Courses of three and four segments, with sampled lengths at the ends."""
    span = max(abs(end[0] - start[0]), abs(end[1] - start[1]), 4 * stub)
    lengths = sorted({stub + round((span - stub) * i / _SAMPLES) for i in range(_SAMPLES + 1)})
    back = STEPS[(heading + 4) % 8]
    for length in lengths:
        dx, dy = STEPS[first]
        corner = (start[0] + dx * length, start[1] + dy * length)
        for turn in (-2, -1, 1, 2):
            for rest in _through(corner, end, ((first + turn) % 8, heading), stub):
                yield (start, *rest)
        for other in lengths[::2]:
            far = (end[0] + back[0] * other, end[1] + back[1] * other)
            for turn, onward in itertools.product((-2, -1, 1, 2), repeat=2):
                second, third = (first + turn) % 8, (heading - onward) % 8
                for middle in _through(corner, far, (second, third), stub):
                    yield (start, *middle, end)


def _solve(start: Place, end: Place, a: int, b: int) -> tuple[int, int] | None:
    """Whole steps along directions a and b from start to end, if there are any."""
    (ax, ay), (bx, by) = STEPS[a], STEPS[b]
    dx, dy = end[0] - start[0], end[1] - start[1]
    det = ax * by - ay * bx
    if det == 0:
        return None
    s, t = dx * by - dy * bx, ax * dy - ay * dx
    if s % det or t % det:
        return None
    return s // det, t // det


def _gentle(a: int, b: int) -> bool:
    return min((a - b) % 8, (b - a) % 8) in (1, 2)


def _direction(a: Place, b: Place) -> int:
    sign = ((b[0] > a[0]) - (b[0] < a[0]), (b[1] > a[1]) - (b[1] < a[1]))
    return STEPS.index(sign)


def _cost(corners: tuple[Place, ...], spacing_mm: float) -> float:
    """Length beyond the straight line, and bends, in station spacings."""
    length = sum(math.dist(a, b) for a, b in itertools.pairwise(corners))
    needless = length - math.dist(corners[0], corners[-1])
    headings = [_direction(a, b) for a, b in itertools.pairwise(corners)]
    bends = sum(_BEND[min((a - b) % 8, (b - a) % 8)] for a, b in itertools.pairwise(headings))
    return needless / (spacing_mm * UNITS_PER_MM) + bends
