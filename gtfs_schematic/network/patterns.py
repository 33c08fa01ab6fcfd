"""Choose which stop patterns of a line the diagram shows, and reduce them to itineraries."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, replace

from gtfs_schematic.feed.model import LeftOut, Pattern

Ids = tuple[str, ...]
Length = Callable[[str, str], float]


@dataclass(frozen=True, slots=True)
class Calling:
    """The trips of one line that call at the same stations in the same order."""

    line_id: str
    stations: Ids
    stop_ids: Ids
    """The stop at each of the stations, for cutting the shape."""
    shape_id: str | None
    departures_s: tuple[int, ...]
    """First departures of all trips, seconds after noon minus 12 h, sorted."""

    @property
    def trips(self) -> int:
        """Count of trips."""
        return len(self.departures_s)


def collapsed(ids: Iterable[str]) -> Ids:
    """Drop every id that repeats the one before it."""
    return tuple(key for key, _ in itertools.groupby(ids))


def mirrored(ids: Ids) -> Ids:
    """Give the sequence backwards."""
    return ids[::-1]


def callings_of(
    patterns: Iterable[Pattern], line_of: Mapping[str, str], site_of: Mapping[str, str]
) -> tuple[Calling, ...]:
    """Write patterns as stations, and unite those of a line that then agree.

    Stops without a site are skipped; patterns that are left with fewer than two stations vanish.
    The shape is that of the most trips.
    """
    found: dict[tuple[str, Ids], list[Pattern]] = defaultdict(list)
    for pattern in patterns:
        stations = collapsed(site_of[s] for s in pattern.stop_ids if s in site_of)
        if len(stations) > 1 and pattern.route_id in line_of:
            found[line_of[pattern.route_id], stations].append(pattern)
    callings = []
    for (line_id, stations), group in sorted(found.items()):
        group.sort(key=lambda p: (-len(p.departures_s), p.shape_id or "~", p.stop_ids))
        shaped = next((p for p in group if p.shape_id is not None), group[0])
        stops = tuple(
            next(run)
            for _, run in itertools.groupby(
                (s for s in shaped.stop_ids if s in site_of), key=lambda s: site_of[s]
            )
        )
        departures = tuple(sorted(t for p in group for t in p.departures_s))
        callings.append(Calling(line_id, stations, stops, shaped.shape_id, departures))
    return tuple(callings)


def united(callings: Iterable[Calling], line_of: Mapping[str, str]) -> tuple[Calling, ...]:
    """Give callings to wider lines, and unite those of a line that then agree.

    Parameters
    ----------
    callings
        Of all lines.
    line_of
        Per line id the id of the line that it becomes a part of.
    """
    found: dict[tuple[str, Ids], list[Calling]] = defaultdict(list)
    for calling in callings:
        found[line_of[calling.line_id], calling.stations].append(calling)
    whole = []
    for (line_id, _), parts in sorted(found.items()):
        best = max(parts, key=lambda c: (c.shape_id is not None, c.trips))
        departures = tuple(sorted(t for part in parts for t in part.departures_s))
        whole.append(replace(best, line_id=line_id, departures_s=departures))
    return tuple(whole)


def without_rare(
    callings: Sequence[Calling], min_share: float, same_way: Callable[[Ids, Ids], bool]
) -> tuple[tuple[Calling, ...], tuple[LeftOut, ...]]:
    """Leave out one line's rare patterns and list those that no kept one shows.

    A pattern counts with its mirror image. The most frequent ones stay until they make up half
    of the trips, however small their share: some lines have nothing but rare patterns.

    Parameters
    ----------
    callings
        All patterns of one line.
    min_share
        Least share of the line's trips, 0 … 1.
    same_way
        Whether the second sequence shows all of the first.
    """
    total = sum(c.trips for c in callings)
    weight: dict[Ids, int] = defaultdict(int)
    for calling in callings:
        weight[_undirected(calling.stations)] += calling.trips
    ranked = sorted(weight, key=lambda ids: (-weight[ids], -len(ids), ids))
    kept: list[Ids] = []
    covered = 0
    for ids in ranked:
        if weight[ids] >= min_share * total or 2 * covered < total:
            kept.append(ids)
        covered += weight[ids]
    left_out = []
    for ids in ranked[len(kept) :]:
        if not any(same_way(ids, k) or same_way(mirrored(ids), k) for k in kept):
            share = f"{100.0 * weight[ids] / total:.1f} %"
            name = f"{callings[0].line_id}: {ids[0]} – {ids[-1]}, {len(ids)} stations"
            reason = f"it has {weight[ids]} of the line's {total} trips ({share})"
            left_out.append(LeftOut("pattern", name, reason))
    chosen = set(kept)
    return tuple(c for c in callings if _undirected(c.stations) in chosen), tuple(left_out)


def shows(part: Ids, whole: Ids, length: Length, detour: float) -> bool:
    """Tell whether `whole` calls at all of `part` in order, without long ways round between.

    A closed sequence (a ring) may be entered anywhere.
    """
    if whole[0] == whole[-1]:
        whole = whole + whole[1:]
    starts = [i for i, station in enumerate(whole) if station == part[0]]
    return any(_follows(part, whole, i, length, detour) for i in starts)


def _follows(part: Ids, whole: Ids, at: int, length: Length, detour: float) -> bool:
    for a, b in itertools.pairwise(part):
        try:
            to = whole.index(b, at + 1)
        except ValueError:
            return False
        way = sum(length(p, q) for p, q in itertools.pairwise(whole[at : to + 1]))
        if to > at + 1 and way > detour * length(a, b):
            return False
        at = to
    return True


def itineraries_of(
    callings: Iterable[Calling], course_of: Callable[[Ids], Ids]
) -> tuple[tuple[Ids, Ids], ...]:
    """Reduce one line's patterns to (itinerary, course) pairs.

    1. An itinerary that ends by running its own beginning back ends where it turns.
    2. Of two mirror images the one with more trips stays; of rings that differ in where they
       start, too.
    3. A pattern whose course lies within another course and which calls nowhere else is dropped.
    """
    weight: dict[Ids, int] = defaultdict(int)
    for calling in callings:
        weight[unreturned(calling.stations)] += calling.trips
    ranked = sorted(weight, key=lambda ids: (-len(ids), -weight[ids], ids))
    kept: list[tuple[Ids, Ids]] = []
    for ids in ranked:
        course = course_of(ids)
        if not any(
            set(ids) <= set(other) and (_within(course, way) or _within(mirrored(course), way))
            for other, way in kept
        ):
            kept.append((ids, course))
    kept = [
        pair
        for pair in kept
        if not any(
            other is not pair
            and set(pair[0]) <= set(other[0])
            and len(other[1]) > len(pair[1])
            and (_within(pair[1], other[1]) or _within(mirrored(pair[1]), other[1]))
            for other in kept
        )
    ]
    return tuple(sorted(kept))


def unreturned(ids: Ids) -> Ids:
    """Cut the tail that runs the head back.

    A B C B A becomes A B C; A B C D B A, a loop at the end of a stem, becomes A B C D B.
    """
    alike = next(
        (i for i, (a, b) in enumerate(zip(ids, mirrored(ids), strict=True)) if a != b), len(ids)
    )
    back = min(max(alike - 1, 0), (len(ids) - 1) // 2)
    return ids[: len(ids) - back]


def one_way_links(courses: Iterable[Ids]) -> tuple[tuple[str, str], ...]:
    """Give the steps that some course makes and none makes back, sorted.

    Parameters
    ----------
    courses
        Courses of all kept patterns, both directions, as they are run.
    """
    steps = {step for course in courses for step in itertools.pairwise(course)}
    return tuple(sorted((a, b) for a, b in steps if (b, a) not in steps))


def _undirected(ids: Ids) -> Ids:
    return min(ids, mirrored(ids))


def _within(part: Ids, whole: Ids) -> bool:
    if whole[0] == whole[-1]:
        whole = whole + whole[1:]
    return any(whole[i : i + len(part)] == part for i in range(len(whole) - len(part) + 1))
