"""Lay out a changed network on the drawing that stands: only what must move moves.

(1) Everything that the drawing has keeps its place to the hundredth of a millimetre: links of
closed stations are joined, opened stations stand on the link they divide. (2) What is new finds
its course through the gaps. (3) Where there is none it is laid as a thread, and the neighbourhood
gives way: first only the bends beside it, then the stations within one link, within two, and so
on, until all guarantees are kept. Crossings and cyclic orders are the ground's.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace

import shapely

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout import check
from gtfs_schematic.layout.draft import Draft
from gtfs_schematic.layout.keep import Standing, keep
from gtfs_schematic.layout.laying import lay_all
from gtfs_schematic.layout.model import Clearances, Layout
from gtfs_schematic.layout.strained import lift_strained
from gtfs_schematic.layout.yielding import OUTSIDE_MM, Free, give_way
from gtfs_schematic.network.model import Network
from gtfs_schematic.progress import Progress, Silent

_REACHES = (0, 1, 2, 3, 5, 8, None)
"""Links from the change within which stations may give way, in turn; None: all."""
_NEAR_MM = 0.01
FRAME = "frame"
"""Cause of moves where title, key and notes leave less room than before."""


@dataclass(frozen=True, slots=True)
class Moved:
    """A station that gave way."""

    station_id: str
    length_mm: float
    because: str
    """Link or walk that needed room, or pinned station; `FRAME`; empty where all is evened out."""


@dataclass(frozen=True, slots=True)
class Revised:
    """A revised layout, and what moved for it."""

    layout: Layout
    moved: tuple[Moved, ...]


def revise_layout(
    network: Network,
    standing: Standing,
    clearances: Clearances,
    *,
    pins: Mapping[str, Point] | None = None,
    even: float = 0.0,
    progress: Progress = Silent(),  # noqa: B008 - stateless
) -> Revised | None:
    """Lay out a network beside what a previous drawing has of it.

    Parameters
    ----------
    network
        The changed network; stations that stay have the ids that they had.
    standing
        The previous drawing.
    clearances
        What will be drawn, millimetres.
    pins
        Places that stations must get, millimetres.
    even
        From 0, only what must move moves, to 1, all links get as even as their directions allow.
    progress
        Told what is going on.

    Returns
    -------
    Revised or None
        None if the drawing that stands has no room for what is new: then it must give way.
    """
    progress.phase("revising the layout")
    draft = Draft(network, clearances, standing.frame)
    keep(draft, standing)
    lift_strained(draft)
    old = set(draft.path)
    if not lay_all(draft, progress):
        return None
    wanted = pins or {}
    for found in _drafts(draft, standing, old, wanted, even):
        turn, angles = standing.rotation_deg, standing.angles
        layout = replace(found.layout(), rotation_deg=turn, angles=angles)
        if not check.faults(layout, clearances, wanted):
            return Revised(layout, _moved(found, standing, wanted, _outside(draft)))
    return None


def _drafts(
    draft: Draft, standing: Standing, old: set[str], pins: Mapping[str, Point], even: float
) -> Iterator[Draft]:
    """Give the draft as it is if nothing lacks room, then ever wider neighbourhoods."""
    off = {s: place for s, place in pins.items() if draft.at.get(s) != place}
    outside = _outside(draft)
    if not draft.thin and not off and not outside and even == 0.0:
        yield draft
    fresh = {key for key in draft.path if key not in old or key in draft.thin}
    near = _near(draft, set(draft.thin) or fresh) | outside
    sources = {s for key in near | set(draft.thin) for s in _ends(draft, key)} | set(off)
    away = draft.hops(sources)
    most = standing.reach
    reaches = [r for r in _REACHES if most is None or (r is not None and r <= most)]
    for reach in reaches if even == 0.0 else (None,):
        stations = {s for s in draft.at if reach is None or away.get(s, reach) < reach}
        free = Free(stations, near, fresh, standing.positions, off, even)
        found = give_way(draft, free)
        if found is not None:
            yield found


def _outside(draft: Draft) -> set[str]:
    """Edges that leave the frame, which may be smaller than it was."""
    frame = draft.frame
    box = shapely.box(frame.left_mm, frame.top_mm, frame.right_mm, frame.bottom_mm)
    wide = box.buffer(OUTSIDE_MM, join_style="mitre")
    return {key for key, path in draft.path.items() if not wide.covers(shapely.LineString(path))}


def _near(draft: Draft, keys: set[str]) -> set[str]:
    """Edges with a path that come nearer to some than all of their distances allow."""
    limits = draft.clearances
    found: set[str] = set()
    ids = sorted(draft.path)
    half = [limits.half_width_mm(draft.edges[key].lines) for key in ids]
    lines = [shapely.LineString(draft.path[key]) for key in ids]
    reach = 2.0 * max(half) + 2.0 * limits.line_gap_mm
    tree = shapely.STRtree(lines)
    for key in sorted(keys & set(ids)):
        here = ids.index(key)
        for k in tree.query(lines[here], predicate="dwithin", distance=reach).tolist():
            gap = half[here] + half[k] + 2.0 * limits.line_gap_mm
            if ids[k] not in keys and lines[here].distance(lines[k]) < gap:
                found.add(ids[k])
    return found


def _ends(draft: Draft, key: str) -> tuple[str, str]:
    return draft.edges[key].start, draft.edges[key].end


def _moved(
    draft: Draft, standing: Standing, pins: Mapping[str, Point], outside: set[str]
) -> tuple[Moved, ...]:
    """Tell how far every station of the previous drawing moved, and which change is nearest."""
    causes = [(s, s) for s in sorted(pins)]
    causes += [(s, FRAME) for key in sorted(outside) for s in _ends(draft, key)]
    causes += [(s, why) for key, why in sorted(draft.thin.items()) for s in _ends(draft, key)]
    away = {source: draft.hops([source]) for source in {s for s, _ in causes}}
    found = []
    for station, place in sorted(draft.at.items()):
        length = math.dist(place, standing.positions.get(station, place))
        if length > _NEAR_MM:
            near = min(
                causes, key=lambda c: (away[c[0]].get(station, len(draft.at)), c), default=("", "")
            )
            found.append(Moved(station, round(length, 2), near[1]))
    return tuple(found)
