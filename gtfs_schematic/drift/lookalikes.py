"""Pairs of stations that look close and are far, or look far and are a short walk apart."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from gtfs_schematic.drift.model import DriftSettings, MisleadingPair
from gtfs_schematic.drift.placed import Diagram, PlacedLink
from gtfs_schematic.drift.rides import departures_of, typical_length

Plane = NDArray[np.complex128]
Pairs = tuple[MisleadingPair, ...]


@dataclass(frozen=True, slots=True)
class Places:
    """True places in local metres and drawn ones in sheet units, both y up, as in the diagram."""

    ground: Plane
    sheet: Plane
    scale: float
    """Sheet units per metre that is typical for the drawing's links."""


def false_neighbors(diagram: Diagram, places: Places, settings: DriftSettings) -> Pairs:
    """List pairs that are drawn within a short step and lie a long way apart.

    Notes
    -----
    A pair counts if it is drawn no further apart than `false_near_links` typical links, lies
    further apart than `false_far_m`, and is drawn closer than the scale of the typical link
    says by `misleading_factor` or more. Pairs joined by a link or a walk do not count: there the
    diagram says how one gets across. Most departures first.
    """
    typical = typical_length(diagram.links)
    joined = _joined([*diagram.links, *diagram.walks])
    found = []
    for a, b in _within(places.sheet, settings.false_near_links * typical):
        ids = frozenset((diagram.stations[a].id, diagram.stations[b].id))
        true, drawn = _apart(places, a, b)
        looks = drawn / places.scale
        if (
            ids not in joined
            and true > settings.false_far_m
            and true >= settings.misleading_factor * looks
        ):
            found.append((a, b))
    return _told(diagram, places, found)


def hidden_walks(diagram: Diagram, places: Places, settings: DriftSettings) -> Pairs:
    """List pairs that lie a short walk apart and are drawn as if they did not.

    Notes
    -----
    A pair counts if it lies no further apart than `hidden_near_m` in a straight line, is drawn
    further apart than `hidden_far_links` typical links, and further than the scale of the typical
    link says by `misleading_factor` or more. Stations joined by a walk do not count: the diagram
    tells them. Most departures first.
    """
    typical = typical_length(diagram.links)
    told = _joined(diagram.walks)
    found = []
    for a, b in _within(places.ground, settings.hidden_near_m):
        ids = frozenset((diagram.stations[a].id, diagram.stations[b].id))
        true, drawn = _apart(places, a, b)
        far = settings.hidden_far_links * typical
        if (
            ids not in told
            and drawn > far
            and drawn >= settings.misleading_factor * places.scale * true
        ):
            found.append((a, b))
    return _told(diagram, places, found)


def _within(points: Plane, distance: float) -> list[tuple[int, int]]:
    """Give the pairs no further apart than a distance, sorted."""
    tree = cKDTree(np.column_stack([points.real, points.imag]))
    pairs = tree.query_pairs(distance, output_type="ndarray")
    return sorted((int(min(a, b)), int(max(a, b))) for a, b in pairs)


def _apart(places: Places, a: int, b: int) -> tuple[float, float]:
    return (
        float(abs(places.ground[a] - places.ground[b])),
        float(abs(places.sheet[a] - places.sheet[b])),
    )


def _joined(edges: Sequence[PlacedLink]) -> set[frozenset[str]]:
    return {frozenset((edge.start, edge.end)) for edge in edges}


def _told(diagram: Diagram, places: Places, found: Sequence[tuple[int, int]]) -> Pairs:
    """Write pairs, those with most departures first, then those that are off the most."""
    counts = departures_of(diagram.patterns)
    typical = typical_length(diagram.links) or 1.0
    pairs = []
    for a, b in found:
        ids = (diagram.stations[a].id, diagram.stations[b].id)
        true, drawn = _apart(places, a, b)
        departures = sum(counts.get(key, 0) for key in ids) if diagram.patterns else None
        pairs.append(MisleadingPair(*ids, true, drawn, drawn / typical, departures))
    pairs.sort(key=lambda p: (-(p.departures or 0), -abs(_off(p, places.scale)), p.start, p.end))
    return tuple(pairs)


def _off(pair: MisleadingPair, scale: float) -> float:
    """Give the logarithm of how far the scale between two stations is off."""
    return float(np.log(max(pair.drawn_mm, 1e-9) / max(scale * pair.true_m, 1e-9)))
