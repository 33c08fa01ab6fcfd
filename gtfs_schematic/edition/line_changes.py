"""What became of the lines between two rosters with the same ids for the same things."""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from difflib import SequenceMatcher

from gtfs_schematic.edition.differences import Change, ChangeLimits, Kind, clock, listed
from gtfs_schematic.edition.roster import Roster, RosterLine

Course = tuple[str, ...]

_SAME_COURSE = 0.3
"""Less alike, two courses are not the old and the new of one."""


def line_changes(
    rosters: tuple[Roster, Roster],
    parts: Mapping[str, str],
    station_parts: Mapping[str, str],
    limits: ChangeLimits,
) -> Iterator[Change]:
    """Compare lines.

    Parameters
    ----------
    rosters
        The earlier and the later.
    parts, station_parts
        Of lines and of stations; see `station_changes.station_changes`. A line that calls at the
        whole now instead of the part has not changed its course.
    limits
        What is small.
    """
    old, new = rosters
    names = {s.id: s.name for s in (*old.stations, *new.stations)}
    for key in sorted(set(old.line) | set(new.line)):
        before, after = old.line.get(key), new.line.get(key)
        if before is None and after is not None:
            kind: Kind = "split" if key in parts else "new"
            was = old.line[parts[key]].name if key in parts else ""
            yield Change("line", kind, key, after.name, was, _ends(after, names), _calls(after))
        elif before is not None and after is None:
            kind = "merged" if key in parts else "gone"
            now = new.line[parts[key]].name if key in parts else ""
            yield Change("line", kind, key, before.name, _ends(before, names), now, _calls(before))
        elif before is not None and after is not None:
            yield from _named(before, after)
            yield from _Courses((before, after), rosters, station_parts).changes(names)
            if before.mode and after.mode:
                yield from _timed(before, after, limits)


def _named(old: RosterLine, new: RosterLine) -> Iterator[Change]:
    places = _calls(new)

    def change(kind: Kind, before: str, after: str) -> Change:
        return Change("line", kind, new.id, new.name, before, after, places)

    if old.name != new.name:
        yield change("renamed", old.name, new.name)
    if old.long_name != new.long_name and old.mode:
        yield change("long name", old.long_name, new.long_name)
    if (old.color.upper(), old.text_color.upper()) != (new.color.upper(), new.text_color.upper()):
        before, after = (f"{k.color} with {k.text_color} letters" for k in (old, new))
        yield change("recolored", before, after)
    if set(old.route_ids) != set(new.route_ids):
        kind: Kind = "routes" if set(old.route_ids) & set(new.route_ids) else "renumbered"
        yield change(kind, " ".join(old.route_ids), " ".join(new.route_ids))
    if old.mode != new.mode and old.mode and new.mode:
        yield change("mode", old.mode, new.mode)


@dataclass
class _Told:
    """Stations that a line gained and lost, by where."""

    ended: list[tuple[str, str]] = field(default_factory=list)
    """(terminus before, terminus after) of extensions; likewise of cuts."""
    cut: list[tuple[str, str]] = field(default_factory=list)
    gained: list[str] = field(default_factory=list)
    lost: list[str] = field(default_factory=list)
    called: list[str] = field(default_factory=list)
    dropped: list[str] = field(default_factory=list)
    added: list[str] = field(default_factory=list)
    removed: list[str] = field(default_factory=list)
    variants: list[tuple[str, str]] = field(default_factory=list)


class _Courses:
    """The itineraries of a line before and after."""

    def __init__(
        self,
        lines: tuple[RosterLine, RosterLine],
        rosters: tuple[Roster, Roster],
        parts: Mapping[str, str],
    ) -> None:
        self.line, self.before = lines[1], rosters[0]
        self.old, self.new = (
            sorted({_canonical(_whole(i, parts)) for i in line.itineraries}) for line in lines
        )
        self.links = [
            {frozenset(parts.get(s, s) for s in link) for link in roster.links_of[line.id]}
            for line, roster in zip(lines, rosters, strict=True)
        ]

    def changes(self, names: Mapping[str, str]) -> Iterator[Change]:
        """Tell how the line's course differs."""
        if self.old == self.new:
            if self.links[0] != self.links[1]:
                yield self._way(names)
            return
        told = self._compared(names)

        def change(kind: Kind, texts: tuple[str, str], places: Sequence[str]) -> Change:
            line = self.line
            before, after = texts
            each = tuple(dict.fromkeys(places))
            return Change("line", kind, line.id, line.name, before, after, each)

        if told.gained:
            texts = _terminus(told.ended, names, f"gains {listed(told.gained, names)}")
            yield change("extended", texts, [*told.gained, *itertools.chain(*told.ended)])
        if told.lost:
            texts = _terminus(told.cut, names, f"loses {listed(told.lost, names)}")
            yield change("shortened", texts, [*told.lost, *itertools.chain(*told.cut)])
        if told.added or told.removed or told.variants:
            before = f"by way of {listed(told.removed, names)}" if told.removed else ""
            after = f"by way of {listed(told.added, names)}" if told.added else ""
            before = "; ".join(t for t in (before, *(v for v, _ in told.variants)) if t)
            after = "; ".join(t for t in (after, *(v for _, v in told.variants)) if t)
            yield change("rerouted", (before, after), [*told.added, *told.removed])
        if told.called or told.dropped:
            before = f"no longer calls at {listed(told.dropped, names)}" if told.dropped else ""
            after = f"now calls at {listed(told.called, names)}" if told.called else ""
            yield change("calls", (before, after), [*told.called, *told.dropped])

    def _way(self, names: Mapping[str, str]) -> Change:
        """Tell that the calls are the same, but other stations are passed between them."""
        gone, come = self.links[0] - self.links[1], self.links[1] - self.links[0]
        before, after = (
            "; ".join(sorted(" – ".join(sorted(names[s] for s in link)) for link in links))
            for links in (gone, come)
        )
        places = tuple(sorted({s for link in (*gone, *come) for s in link}))
        return Change("line", "way", self.line.id, self.line.name, before, after, places)

    def _compared(self, names: Mapping[str, str]) -> _Told:
        told = _Told()
        old = [i for i in self.old if i not in self.new]
        new = [i for i in self.new if i not in self.old]
        for a, b in _paired(old, new):
            if a is not None and b is not None:
                self._one(a, b, told)
            else:
                told.variants.append((_name(a, names), _name(b, names)))
        if told == _Told():
            # The same stations in another order, or only the pairing of branches.
            before, after = ("; ".join(listed(i, names) for i in some) for some in (old, new))
            told.variants.append((before, after))
        return told

    def _one(self, old: Course, new: Course, told: _Told) -> None:
        """Tell one course's difference, end by end and piece by piece."""
        matcher = SequenceMatcher(None, old, new, autojunk=False)
        for tag, i1, i2, j1, j2 in matcher.get_opcodes():
            gone, come = old[i1:i2], new[j1:j2]
            at_end = i1 == 0 or i2 == len(old)
            last = (old[0], new[0]) if i1 == 0 else (old[-1], new[-1])
            if tag == "insert" and at_end:
                told.gained.extend(come)
                told.ended.append(last)
            elif tag == "delete" and at_end:
                told.lost.extend(gone)
                told.cut.append(last)
            elif tag == "insert":
                for s in come:
                    (told.added if s in self.before.station else told.called).append(s)
            elif tag == "delete":
                told.dropped.extend(gone)
            elif tag == "replace":
                told.removed.extend(gone)
                told.added.extend(come)


def _name(course: Course | None, names: Mapping[str, str]) -> str:
    return f"{names[course[0]]} – {names[course[-1]]}" if course else ""


def _terminus(
    ends: Sequence[tuple[str, str]], names: Mapping[str, str], what: str
) -> tuple[str, str]:
    """Write where a line ended and where it ends, and what lies between."""
    was, now = (", ".join(dict.fromkeys(names[pair[i]] for pair in ends)) for i in (0, 1))
    return f"ends at {was}", f"ends at {now}; {what}"


def _paired(
    old: Sequence[Course], new: Sequence[Course]
) -> Iterator[tuple[Course | None, Course | None]]:
    """Pair courses, the most alike first, the new one turned as the old one runs."""
    ranked = sorted(
        (-_alike(a, turned), a, b, turned)
        for a, b in itertools.product(old, new)
        for turned in {b, b[::-1]}
    )
    done_old: set[Course] = set()
    done_new: set[Course] = set()
    for unlike, a, b, turned in ranked:
        if -unlike >= _SAME_COURSE and a not in done_old and b not in done_new:
            done_old.add(a)
            done_new.add(b)
            yield a, turned
    yield from ((a, None) for a in old if a not in done_old)
    yield from ((None, b) for b in new if b not in done_new)


def _alike(a: Course, b: Course) -> float:
    return SequenceMatcher(None, a, b, autojunk=False).ratio()


def _timed(old: RosterLine, new: RosterLine, limits: ChangeLimits) -> Iterator[Change]:
    if old.service != new.service:
        yield Change("line", "service", new.id, new.name, old.service, new.service, _calls(new))
    times = [(k.trips, k.first_departure_s, k.last_departure_s, k.headway_s) for k in (old, new)]
    if times[0] == times[1]:
        return
    pairs = (
        (old.trips, new.trips),
        (_span(old), _span(new)),
        (old.headway_s or 0, new.headway_s or 0),
    )
    large = any(abs(a - b) > limits.retimed_share * max(a, b) for a, b in pairs)
    before, after = _timetable(old), _timetable(new)
    yield Change("line", "retimed", new.id, new.name, before, after, _calls(new), not large)


def _span(line: RosterLine) -> int:
    return (line.last_departure_s or 0) - (line.first_departure_s or 0)


def _timetable(line: RosterLine) -> str:
    every = f", every {line.headway_s / 60:.3g} min" if line.headway_s else ""
    hours = f"{clock(line.first_departure_s)} to {clock(line.last_departure_s)}"
    return f"{line.trips} trips, {hours}{every}"


def _whole(course: Course, parts: Mapping[str, str]) -> Course:
    """Let stations that became part of another, or were, stand for the whole."""
    wholes = (parts.get(s, s) for s in course)
    return tuple(s for s, _ in itertools.groupby(wholes))


def _canonical(course: Course) -> Course:
    """Give a course in the direction that sorts first: both directions are one line."""
    return min(course, course[::-1])


def _calls(line: RosterLine) -> tuple[str, ...]:
    return tuple(dict.fromkeys(s for course in line.itineraries for s in course))


def _ends(line: RosterLine, names: Mapping[str, str]) -> str:
    return _name(max(line.itineraries, key=len, default=None), names)
