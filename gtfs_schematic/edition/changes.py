"""The change sheet's facts: what differs between an edition, or a feed, and the one after it."""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Iterator, Mapping
from dataclasses import asdict, dataclass, replace

from gtfs_schematic.edition import changes_check
from gtfs_schematic.edition.differences import Change, ChangeLimits
from gtfs_schematic.edition.identity import Matches
from gtfs_schematic.edition.line_changes import line_changes
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.edition.roster import Roster, roster_of_edition
from gtfs_schematic.edition.stability import Stability, stability_of
from gtfs_schematic.edition.station_changes import station_changes, walk_changes
from gtfs_schematic.errors import must_be_sound

COMPARED = (
    "names, stops and their codes, places, access and calling lines of stations; names, colors, "
    "routes, courses and times of lines; walks"
)
"""What "nothing else" means."""

_SEEN = frozenset(
    {"new", "gone", "merged", "split", "extended", "shortened", "rerouted", "calls", "way"}
)
"""Changes of a line that the drawing must follow."""


@dataclass(frozen=True, slots=True)
class Side:
    """The earlier or the later of what is compared."""

    title: str
    sha256: str
    """Of the feed."""
    start_date: str
    end_date: str
    service_date: str


@dataclass(frozen=True, slots=True)
class Moved:
    """A station that stands elsewhere on the sheet."""

    station: str
    name: str
    mm: float
    because: str
    """Empty where nobody knows, as when two editions are compared."""


@dataclass(frozen=True, slots=True)
class ChangeSheet:
    """All differences of two rosters in which the same ids are the same things."""

    before: Side
    after: Side
    limits: ChangeLimits
    changes: tuple[Change, ...]
    """Of lines, stations and walks; and of the drawing, where two are compared."""
    doubtful: tuple[str, ...]
    """Matches that a person should look at."""
    not_compared: tuple[str, ...]
    """What the earlier edition does not say."""
    kept: int
    """Stations of both."""
    moved_on_sheet: int
    """How many of them stand elsewhere on the sheet."""
    stability: Stability | None = None
    """What of the drawing stayed; None where feeds alone are compared."""
    moved: tuple[Moved, ...] = ()
    """Stations of both that stand elsewhere on the sheet, how far, and because of what."""

    @property
    def large(self) -> tuple[Change, ...]:
        """The changes that do not stay below the limits."""
        return tuple(change for change in self.changes if not change.small)

    @property
    def small(self) -> tuple[Change, ...]:
        """The changes that do."""
        return tuple(change for change in self.changes if change.small)


def change_sheet(
    before: Edition,
    after: Edition,
    matches: Matches,
    limits: ChangeLimits | None = None,
    *,
    moved: Mapping[str, str] | None = None,
) -> ChangeSheet:
    """Compare two editions; the later has the ids of the earlier where things are the same.

    Parameters
    ----------
    before, after
        The editions.
    matches
        By the ids of the later edition (`carry.carried_matches`).
    limits
        What is small.
    moved
        Per station that had to move the reason, where that is known.
    """
    sheet = roster_changes(roster_of_edition(before), roster_of_edition(after), matches, limits)
    gone = tuple(_moved(before, after, moved or {}))
    drawn = tuple(_drawn(before, after, {each.station: each for each in gone}))
    touched = {s for c in sheet.large if c.kind in _SEEN or c.subject != "line" for s in c.places}
    return replace(
        sheet,
        changes=(*sheet.changes, *drawn),
        moved_on_sheet=len(drawn),
        stability=stability_of(before, after, touched),
        moved=gone,
    )


def roster_changes(
    old: Roster, new: Roster, matches: Matches, limits: ChangeLimits | None = None
) -> ChangeSheet:
    """Compare two rosters in which the same ids are the same things.

    Raises
    ------
    InternalFaultError
        If the sheet does not tell everything that differs: a defect of this program.
    """
    limits = limits or ChangeLimits()
    stations = {m.old_id: m.new_id for m in matches.merged_stations}
    stations |= {m.new_id: m.old_id for m in matches.split_stations}
    lines = {m.old_id: m.new_id for m in matches.merged_lines}
    lines |= {m.new_id: m.old_id for m in matches.split_lines}
    changes = (
        *line_changes((old, new), lines, stations, limits),
        *station_changes(old, new, stations, limits),
        *walk_changes(old, new),
    )
    must_be_sound("change sheet", changes_check.faults(changes, old, new, stations))
    service = any(not line.mode for line in old.lines)
    return ChangeSheet(
        _side(old),
        _side(new),
        limits,
        changes,
        tuple(_doubts(old, new, matches)),
        ("modes, long names and times of lines, which the earlier edition does not hold",)
        if service
        else (),
        len(set(old.station) & set(new.station)),
        0,
    )


def to_json(sheet: ChangeSheet) -> bytes:
    """Write a change sheet as the schema `changes.schema.json` says."""
    document = {
        "format": "gtfs-schematic/changes",
        "version": 1,
        **asdict(sheet),
        "nothing_else_changed": not sheet.small and not sheet.not_compared,
        "compared": COMPARED,
    }
    return (json.dumps(document, ensure_ascii=False, indent=1) + "\n").encode()


def to_csv(sheet: ChangeSheet) -> bytes:
    """Write one row a change."""
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(["subject", "kind", "id", "name", "before", "after", "small", "stations"])
    for c in sheet.changes:
        small = "yes" if c.small else ""
        writer.writerow(
            [c.subject, c.kind, c.id, c.name, c.before, c.after, small, " ".join(c.places)]
        )
    return text.getvalue().encode()


def _side(roster: Roster) -> Side:
    return Side(
        roster.title, roster.sha256, roster.start_date, roster.end_date, roster.service_date
    )


def _doubts(old: Roster, new: Roster, matches: Matches) -> Iterator[str]:
    names = [
        {s.id: s.name for s in roster.stations} | {k.id: k.name for k in roster.lines}
        for roster in (old, new)
    ]
    parts = {*matches.merged_stations, *matches.split_stations}
    parts |= {*matches.merged_lines, *matches.split_lines}
    for match in matches.doubtful:
        verb = "has become part of, or been part of," if match in parts else "is now"
        yield (
            f"{names[0].get(match.old_id, match.old_id)} ({match.old_id}) {verb} "
            f"{names[1].get(match.new_id, match.new_id)} ({match.new_id}), {match.confidence:.0%} "
            f"sure: {match.reason}"
        )
    yield from matches.unknown


def _moved(before: Edition, after: Edition, why: Mapping[str, str]) -> Iterator[Moved]:
    """Give the stations of both that stand elsewhere on the sheet."""
    old = {s.id: s for s in before.stations}
    for s in after.stations:
        was = old.get(s.id)
        if was is not None and (was.x_mm, was.y_mm) != (s.x_mm, s.y_mm):
            length = math.dist((was.x_mm, was.y_mm), (s.x_mm, s.y_mm))
            yield Moved(s.id, s.name, round(length, 2), why.get(s.id, ""))


def _drawn(before: Edition, after: Edition, moved: Mapping[str, Moved]) -> Iterator[Change]:
    """Tell which stations of both stand elsewhere on the sheet."""
    old = {s.id: s for s in before.stations}
    for s in after.stations:
        if s.id in moved:
            there, here = (f"{each.x_mm:g}, {each.y_mm:g} mm" for each in (old[s.id], s))
            why = f": {moved[s.id].because}" * bool(moved[s.id].because)
            yield Change("drawing", "drawn anew", s.id, s.name, there, here + why, (s.id,))
