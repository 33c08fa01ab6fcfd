"""Fault a change sheet that does not tell everything that differs, or tells what does not."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Mapping
from typing import Any

from gtfs_schematic.edition.differences import Change
from gtfs_schematic.edition.roster import Roster

_FIELDS: dict[tuple[str, str], tuple[str, ...]] = {
    ("station", "renamed"): ("name",),
    ("station", "second name"): ("second_name",),
    ("station", "stops"): ("stop_ids",),
    ("station", "renumbered"): ("stop_ids",),
    ("station", "codes"): ("stop_codes",),
    ("station", "step-free"): ("boarding",),
    ("station", "moved"): ("place",),
    ("station", "lines"): ("lines",),
    ("walk", "time"): ("time",),
    ("line", "renamed"): ("name",),
    ("line", "long name"): ("long_name",),
    ("line", "recolored"): ("colors",),
    ("line", "renumbered"): ("route_ids",),
    ("line", "routes"): ("route_ids",),
    ("line", "mode"): ("mode",),
    ("line", "service"): ("service",),
    ("line", "retimed"): ("times",),
    ("line", "way"): ("links",),
    **{
        ("line", kind): ("courses", "links")
        for kind in ("extended", "shortened", "rerouted", "calls")
    },
}
"""Which fields each kind of change tells of."""
_WHOLE = frozenset({"new", "gone", "merged", "split"})
_NEAR_DEGREES = 1e-5
"""About a metre: closer places may or may not be told."""

Facts = dict[tuple[str, str], dict[str, Any]]


def faults(
    changes: Iterable[Change], old: Roster, new: Roster, parts: Mapping[str, str]
) -> tuple[str, ...]:
    """List differences that no change tells, and changes that tell of none.

    Parameters
    ----------
    changes
        Of lines, stations and walks.
    old, new
        Rosters in which the same ids are the same things.
    parts
        Per station that became part of another, or was, the whole: courses through the one and
        through the other are the same.
    """
    before, after = _facts(old, parts), _facts(new, parts)
    told = {
        (c.subject, _key(c), f) for c in changes for f in _FIELDS.get((c.subject, c.kind), ("",))
    }
    differs = set(_differing(before, after))
    return (
        *(f"untold: {' '.join(item)}" for item in sorted(differs - told)),
        *(
            f"told, but the same: {' '.join(item)}"
            for item in sorted(told - differs)
            if item[2] not in ("place", "links", "courses")
        ),
    )


def _key(change: Change) -> str:
    return " ".join(sorted(change.places)) if change.subject == "walk" else change.id


def _differing(before: Facts, after: Facts) -> Iterator[tuple[str, str, str]]:
    for key in sorted(set(before) | set(after)):
        if key not in before or key not in after:
            yield (*key, "")
            continue
        for field, value in before[key].items():
            other = after[key][field]
            if field == "place":
                if math.dist(value, other) > _NEAR_DEGREES:
                    yield (*key, field)
            elif value is not None and other is not None and value != other:
                yield (*key, field)


def _facts(roster: Roster, parts: Mapping[str, str]) -> Facts:
    """Give everything that is compared, so that equal things are equal values."""
    facts: Facts = {}
    for s in roster.stations:
        facts["station", s.id] = {
            "name": s.name,
            "second_name": s.second_name,
            "stop_ids": frozenset(s.stop_ids),
            "stop_codes": frozenset(s.stop_codes),
            "boarding": s.boarding,
            "place": (s.lon, s.lat),
            "lines": frozenset(s.lines),
        }
    for a, b, seconds in roster.walks:
        facts["walk", " ".join(sorted((a, b)))] = {"time": seconds or 0}
    links: dict[str, set[frozenset[str]]] = {line.id: set() for line in roster.lines}
    for a, b, lines in roster.links:
        for line_id in lines:
            links[line_id].add(frozenset((parts.get(a, a), parts.get(b, b))))
    for k in roster.lines:
        known = k.mode != ""
        facts["line", k.id] = {
            "name": k.name,
            "long_name": k.long_name if known else None,
            "colors": (k.color.upper(), k.text_color.upper()),
            "route_ids": frozenset(k.route_ids),
            "mode": k.mode if known else None,
            "courses": {_either_way([parts.get(s, s) for s in i]) for i in k.itineraries},
            "links": links[k.id],
            "service": k.service if known else None,
            "times": (k.trips, k.first_departure_s, k.last_departure_s, k.headway_s)
            if known
            else None,
        }
    return facts


def _either_way(course: list[str]) -> frozenset[tuple[str, ...]]:
    """Give a course and its mirror, without a station repeated at once."""
    once = [s for i, s in enumerate(course) if i == 0 or s != course[i - 1]]
    return frozenset((tuple(once), tuple(reversed(once))))
