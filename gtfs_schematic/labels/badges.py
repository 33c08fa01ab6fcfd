"""Which lines end at which station, for the badges beside its name."""

from __future__ import annotations

import itertools
from collections import defaultdict

from gtfs_schematic.network.model import Line, Network

LONGEST_BADGE = 14
"""Characters; a line with a longer name gets no badge, the key names it."""


def line_ends(network: Network) -> dict[str, tuple[tuple[str, str], ...]]:
    """Give per station id the (line id, name) of the lines that end there.

    A line ends where one of its itineraries does and no other link carries it on. One that ends
    nowhere (a ring) is named once, where its first itinerary begins.
    """
    ends: dict[str, list[tuple[str, str]]] = defaultdict(list)
    for line in sorted(network.lines, key=lambda line: line.id):
        name = line.name.strip()
        if not name or len(name) > LONGEST_BADGE:
            continue
        for station_id in _ends(line):
            ends[station_id].append((line.id, name))
    return {station_id: tuple(ends[station_id]) for station_id in sorted(ends)}


def _ends(line: Line) -> list[str]:
    """Give the ids of the stations where a line ends, sorted."""
    neighbours: dict[str, set[str]] = defaultdict(set)
    for course in line.courses:
        for a, b in itertools.pairwise(course):
            neighbours[a].add(b)
            neighbours[b].add(a)
    outer = {itinerary[i] for itinerary in line.itineraries if itinerary for i in (0, -1)}
    ends = sorted(station for station in outer if len(neighbours[station]) <= 1)
    if not ends and line.itineraries:
        return [line.itineraries[0][0]]
    return ends
