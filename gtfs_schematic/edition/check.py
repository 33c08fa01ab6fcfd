"""Fault an edition: ids that repeat or lead nowhere, places off the sheet, broken paths."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Iterable

from gtfs_schematic.edition.model import Edition, EditionLink, EditionWalk

_NEAR_MM = 0.01


def faults(edition: Edition) -> tuple[str, ...]:
    """List what contradicts itself in an edition; empty if nothing does."""
    stations = {station.id: station for station in edition.stations}
    places = edition.places
    lines = {line.id for line in edition.lines}
    paths: tuple[EditionLink | EditionWalk, ...] = (*edition.links, *edition.walks)
    found = [
        *_repeated("station", (station.id for station in edition.stations)),
        *_repeated("link", (joined.id for joined in (*paths, *edition.parts))),
        *_repeated("junction", [each.id for each in edition.junctions]),
        *(f"junction {j.id} is a station, too" for j in edition.junctions if j.id in stations),
        *_repeated("line", (line.id for line in edition.lines)),
    ]
    for station in edition.stations:
        if not (0 <= station.x_mm <= edition.width_mm and 0 <= station.y_mm <= edition.height_mm):
            found.append(f"station {station.id} lies off the sheet")
        if station.group not in stations:
            found.append(f"station {station.id}: group {station.group} is no station")
        found += _unknown(f"station {station.id}", "line", station.lines, lines)
    for link in (*edition.links, *edition.parts):
        found += _unknown(
            f"link {link.id}", "junction", link.via, (j.id for j in edition.junctions)
        )
        found += [
            f"link {link.id}: its path does not lead through junction {key}"
            for key in link.via
            if key in places and all(math.dist(places[key], p) > _NEAR_MM for p in link.path_mm)
        ]
        found += _unknown(f"link {link.id}", "line", link.lines, lines)
        found += _repeated(f"link {link.id}: line", link.lines)
    for line in edition.lines:
        for itinerary in line.itineraries:
            found += _unknown(f"line {line.id}", "station", itinerary, stations)
    found += _mistimed(edition)
    for joined in paths:
        missing = _unknown(f"link {joined.id}", "station", (joined.start, joined.end), stations)
        found += missing
        if not missing:
            found += _loose(joined, [places[joined.start], places[joined.end]])
    for part in edition.parts:
        missing = _unknown(f"part {part.id}", "end", (part.start, part.end), places)
        found += missing or _loose(part, [places[part.start], places[part.end]])
    return tuple(found)


def _mistimed(edition: Edition) -> list[str]:
    """Fault patterns of unknown lines or stations, or with impossible times."""
    found = []
    for i, pattern in enumerate(edition.patterns):
        where = f"pattern {i}"
        found += _unknown(where, "line", [pattern.line], (line.id for line in edition.lines))
        found += _unknown(where, "station", pattern.stations, (s.id for s in edition.stations))
        if len(pattern.times_s) != len(pattern.stations):
            found.append(f"{where}: not one time per station")
        if list(pattern.times_s) != sorted(pattern.times_s):
            found.append(f"{where}: its times run backwards")
    return found


def _loose(joined: EditionLink | EditionWalk, ends: list[tuple[float, float]]) -> list[str]:
    """Fault a path that does not begin and end at its stations."""
    if len(joined.path_mm) < 2:
        return [f"link {joined.id} has no path"]
    pairs = zip((joined.path_mm[0], joined.path_mm[-1]), ends, strict=True)
    if any(math.dist(point, end) > _NEAR_MM for point, end in pairs):
        return [f"link {joined.id}: its path does not join its stations"]
    return []


def _repeated(kind: str, ids: Iterable[str]) -> list[str]:
    return [f"{kind} {key} stands {n} times" for key, n in sorted(Counter(ids).items()) if n > 1]


def _unknown(where: str, kind: str, ids: Iterable[str], known: Iterable[str]) -> list[str]:
    return [f"{where}: {kind} {key} is unknown" for key in sorted(set(ids).difference(known))]
