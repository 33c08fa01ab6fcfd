"""Measure how much of a diagram stayed as it was from one edition to the next."""

from __future__ import annotations

import itertools
import math
from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass
from statistics import median

import networkx as nx

from gtfs_schematic.edition.model import Edition, EditionLink, EditionStation
from gtfs_schematic.geometry import Point

_NEAR_MM = 0.01
"""Coordinates are rounded finer than that; nobody sees less."""
_TURN_DEG = 1.0


@dataclass(frozen=True, slots=True)
class Stability:
    """What the stations, links and lines of both editions did on the sheet."""

    kept: int
    """Stations of both."""
    moved: int
    move_median_mm: float
    """Over the stations that moved; 0 if none did."""
    move_largest_mm: float
    links_kept: int
    links_turned: int
    """Links that leave one of their stations in another direction."""
    orders_kept: int
    """Links of both that carry the same lines, at least two."""
    order_inversions: int
    """Pairs of lines that changed places, over all of these."""
    tau_least: float
    """Least rank correlation of two orders of one link (Kendall 1938); 1 if none differs."""
    labels_kept: int
    labels_turned: int
    """Stations of both whose name stands on another side."""
    colors_changed: int
    """Lines of both with another color; riders know them by it."""
    farthest_links: int
    """How many links lie between a change and the farthest station that moved; 0 if none did."""


def stability_of(before: Edition, after: Edition, changed: Collection[str]) -> Stability:
    """Compare two editions in which the same ids are the same things.

    Parameters
    ----------
    before, after
        The editions.
    changed
        Ids of the stations at which the feed changed (`Change.places`).

    Notes
    -----
    After the measures that Bridgeman and Tamassia (2000) gather for the difference of drawings:
    positions, directions and orders.
    """
    old = {s.id: s for s in before.stations}
    new = {s.id: s for s in after.stations}
    kept = sorted(set(old) & set(new))
    moves = {
        key: length
        for key in kept
        if (length := math.dist(_at(old[key]), _at(new[key]))) > _NEAR_MM
    }
    pairs = list(_links_of_both(before, after))
    orders = [
        (a.lines, b.lines) for a, b in pairs if len(a.lines) > 1 and set(a.lines) == set(b.lines)
    ]
    inversions = [inverted_pairs(a, b) for a, b in orders]
    taus = [
        1.0 - 4.0 * count / (len(a) * (len(a) - 1))
        for count, (a, _) in zip(inversions, orders, strict=True)
    ]
    named = [key for key in kept if old[key].label_side and new[key].label_side]
    colors = {line.id: line.color.upper() for line in before.lines}
    return Stability(
        kept=len(kept),
        moved=len(moves),
        move_median_mm=median(moves.values()) if moves else 0.0,
        move_largest_mm=max(moves.values(), default=0.0),
        links_kept=len(pairs),
        links_turned=sum(_turned(a.path_mm, b.path_mm) for a, b in pairs),
        orders_kept=len(orders),
        order_inversions=sum(inversions),
        tau_least=min(taus, default=1.0),
        labels_kept=len(named),
        labels_turned=sum(old[key].label_side != new[key].label_side for key in named),
        colors_changed=sum(
            colors.get(k.id, k.color.upper()) != k.color.upper() for k in after.lines
        ),
        farthest_links=_farthest(before, after, changed, moves),
    )


def inverted_pairs(one: Sequence[str], other: Sequence[str]) -> int:
    """Count the pairs that stand the other way round in the other order (Kendall 1938)."""
    place = {key: i for i, key in enumerate(other)}
    return sum(place[a] > place[b] for a, b in itertools.combinations(one, 2))


def _at(station: EditionStation) -> Point:
    return station.x_mm, station.y_mm


def _links_of_both(before: Edition, after: Edition) -> Iterator[tuple[EditionLink, EditionLink]]:
    """Pair links by their ends; ids of stations are stable, so both run the same way."""
    old = {(link.start, link.end): link for link in before.links}
    for link in after.links:
        if (link.start, link.end) in old:
            yield old[link.start, link.end], link


def _turned(one: Sequence[Point], other: Sequence[Point]) -> bool:
    """Whether a path leaves its start or its end in another direction."""
    return any(
        abs((_bearing(a) - _bearing(b) + 180.0) % 360.0 - 180.0) > _TURN_DEG
        for a, b in ((one[:2], other[:2]), (one[:-3:-1], other[:-3:-1]))
    )


def _bearing(ends: Sequence[Point]) -> float:
    (x, y), (u, v) = ends
    return math.degrees(math.atan2(v - y, u - x))


def _farthest(
    before: Edition, after: Edition, changed: Collection[str], moves: Mapping[str, float]
) -> int:
    """Count links from the changes to the farthest station that moved, over both networks."""
    graph = nx.Graph()
    for edition in (before, after):
        graph.add_nodes_from(s.id for s in edition.stations)
        graph.add_edges_from((link.start, link.end) for link in edition.links)
        graph.add_edges_from((walk.start, walk.end) for walk in edition.walks)
    sources = [key for key in sorted(changed) if key in graph]
    if not sources or not moves:
        return 0
    away = nx.multi_source_dijkstra_path_length(graph, set(sources), weight=None)
    # What no way joins to any change is further than all that is joined.
    return int(max(away.get(key, len(graph)) for key in moves))
