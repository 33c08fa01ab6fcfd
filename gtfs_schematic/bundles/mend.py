"""Mend courses whose corners lie too close: no piece may run backwards, no corner twice."""

from __future__ import annotations

import math
from dataclasses import replace

from gtfs_schematic.bundles.joints import Knot
from gtfs_schematic.bundles.slots import turn_angle
from gtfs_schematic.geometry import Point, distance, unit_vector

_SAME_MM = 1e-6
_SPIKE = math.radians(150.0)
"""No octilinear course turns so sharply."""
_BESIDE = 3.0
"""A new corner may lie this many times further away than the two that it replaces."""


def mend(knots: list[Knot]) -> list[Knot]:
    """Give the knots without repeats, and with every backward piece replaced by one corner.

    On a link too short for its bundle the joints of both ends may overlap, so that the parallel
    between them would run backwards; the parallels before and after then meet directly.
    """
    knots = _without_repeats(knots)
    while True:
        for i in range(len(knots) - 1):
            if _is_backward(knots[i], knots[i + 1]):
                knots = _without_repeats(_merged(knots, i))
                break
        else:
            return _without_spikes(knots)


def _without_spikes(knots: list[Knot]) -> list[Knot]:
    """Leave out corners at which the course would all but turn back on itself."""
    kept = list(knots)
    i = 1
    while i < len(kept) - 1:
        into = unit_vector(kept[i - 1].at, kept[i].at)
        out = unit_vector(kept[i].at, kept[i + 1].at)
        if abs(turn_angle(into, out)) > _SPIKE:
            del kept[i]
            i = max(1, i - 1)
        else:
            i += 1
    return _without_repeats(kept)


def _without_repeats(knots: list[Knot]) -> list[Knot]:
    kept = [knots[0]]
    for knot in knots[1:]:
        if distance(kept[-1].at, knot.at) > _SAME_MM:
            kept.append(knot)
        else:
            kept[-1] = replace(knot, into=kept[-1].into, group=None, extra_mm=0.0)
    return kept


def _is_backward(a: Knot, b: Knot) -> bool:
    if a.out is None or b.into is None:
        return False
    along = (b.at[0] - a.at[0]) * a.out[0] + (b.at[1] - a.at[1]) * a.out[1]
    return along < -_SAME_MM


def _merged(knots: list[Knot], i: int) -> list[Knot]:
    a, b = knots[i], knots[i + 1]
    first, last = i == 0, i + 2 == len(knots)
    if first or last:
        # An end stays where it is.
        end = replace(a, out=b.out) if first else replace(b, into=a.into)
        return [*knots[:i], end, *knots[i + 2 :]]
    at = _meeting(a, b)
    if at is None or distance(at, a.at) > _BESIDE * max(distance(a.at, b.at), 1.0):
        at = ((a.at[0] + b.at[0]) / 2.0, (a.at[1] + b.at[1]) / 2.0)
    return [*knots[:i], Knot(at, a.into, b.out), *knots[i + 2 :]]


def _meeting(a: Knot, b: Knot) -> Point | None:
    """Give where the course into `a` would meet the course out of `b`."""
    if a.into is None or b.out is None:
        return None
    det = a.into[0] * b.out[1] - a.into[1] * b.out[0]
    if abs(det) < 1e-6:
        return None
    gap = (b.at[0] - a.at[0], b.at[1] - a.at[1])
    t = (gap[0] * b.out[1] - gap[1] * b.out[0]) / det
    return (a.at[0] + t * a.into[0], a.at[1] + t * a.into[1])
