"""The change sheet's facts: what differs between an edition and the one after it."""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Iterator
from dataclasses import asdict, dataclass

from gtfs_schematic.edition.identity import Matches
from gtfs_schematic.edition.model import Edition, EditionLine, EditionStation

_MOVED_M = 25.0
"""A station that moved less on the ground has not moved (common practice, no source)."""
_METRES_PER_DEGREE = 111_195.0


@dataclass(frozen=True, slots=True)
class Change:
    """One thing that differs; `subject` is "line", "station" or "drawing"."""

    subject: str
    kind: str
    """new, gone, renamed, recolored, renumbered, rerouted, moved, "lines changed", "drawn anew"."""
    id: str
    name: str
    before: str = ""
    after: str = ""


@dataclass(frozen=True, slots=True)
class ChangeSheet:
    """All differences of two editions whose ids are carried over, and what to look at."""

    before_title: str
    after_title: str
    before_sha256: str
    """Hash of the earlier edition's feed; likewise of the later."""
    after_sha256: str
    changes: tuple[Change, ...]
    doubtful: tuple[str, ...]
    kept: int
    """Stations of both editions."""
    moved_on_sheet: int
    """How many of them stand elsewhere on the sheet."""


def change_sheet(before: Edition, after: Edition, matches: Matches) -> ChangeSheet:
    """Compare two editions; the later has the ids of the earlier where things are the same."""
    old = {station.id: station for station in before.stations}
    new = {station.id: station for station in after.stations}
    kept = sorted(set(old) & set(new))
    changes = [*_lines(before, after), *_stations(old, new)]
    moved = [s for s in kept if (old[s].x_mm, old[s].y_mm) != (new[s].x_mm, new[s].y_mm)]
    changes += [
        Change(
            "drawing", "drawn anew", s, new[s].name,
            f"{old[s].x_mm:g}, {old[s].y_mm:g} mm", f"{new[s].x_mm:g}, {new[s].y_mm:g} mm",
        )
        for s in moved
    ]  # fmt: skip
    return ChangeSheet(
        before.title,
        after.title,
        before.feed.sha256,
        after.feed.sha256,
        tuple(changes),
        tuple(
            f"{match.new_id} is taken for {match.old_id} ({match.confidence:.0%}): {match.reason}"
            for match in matches.doubtful
        ),
        len(kept),
        len(moved),
    )


def to_json(sheet: ChangeSheet) -> bytes:
    """Write a change sheet for machines."""
    document = {"format": "gtfs-schematic/changes", "version": 1, **asdict(sheet)}
    return (json.dumps(document, ensure_ascii=False, indent=1) + "\n").encode()


def to_csv(sheet: ChangeSheet) -> bytes:
    """Write one row a change."""
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(["subject", "kind", "id", "name", "before", "after"])
    for change in sheet.changes:
        writer.writerow(
            [change.subject, change.kind, change.id, change.name, change.before, change.after]
        )
    return text.getvalue().encode()


def _lines(before: Edition, after: Edition) -> Iterator[Change]:
    old = {line.id: line for line in before.lines}
    new = {line.id: line for line in after.lines}
    names = {s.id: s.name for s in (*before.stations, *after.stations)}
    for key in sorted(set(old) | set(new)):
        if key not in old:
            yield Change("line", "new", key, new[key].name, "", _ends(new[key], names))
        elif key not in new:
            yield Change("line", "gone", key, old[key].name, _ends(old[key], names), "")
        else:
            yield from _line(old[key], new[key], names)


def _line(old: EditionLine, new: EditionLine, names: dict[str, str]) -> Iterator[Change]:
    if old.name != new.name:
        yield Change("line", "renamed", new.id, new.name, old.name, new.name)
    if old.color != new.color:
        yield Change("line", "recolored", new.id, new.name, old.color, new.color)
    if set(old.route_ids) != set(new.route_ids):
        yield Change(
            "line", "renumbered", new.id, new.name, " ".join(old.route_ids), " ".join(new.route_ids)
        )
    called = {s for course in old.itineraries for s in course}
    calls = {s for course in new.itineraries for s in course}
    if called != calls:
        yield Change(
            "line", "rerouted", new.id, new.name,
            "no longer at " + _listed(called - calls, names) if called - calls else "",
            "now at " + _listed(calls - called, names) if calls - called else "",
        )  # fmt: skip


def _stations(old: dict[str, EditionStation], new: dict[str, EditionStation]) -> Iterator[Change]:
    for key in sorted(set(old) | set(new)):
        if key not in old:
            yield Change("station", "new", key, new[key].name, "", " ".join(new[key].lines))
        elif key not in new:
            yield Change("station", "gone", key, old[key].name, " ".join(old[key].lines), "")
        else:
            yield from _station(old[key], new[key])


def _station(old: EditionStation, new: EditionStation) -> Iterator[Change]:
    if old.name != new.name:
        yield Change("station", "renamed", new.id, new.name, old.name, new.name)
    if set(old.stop_ids) != set(new.stop_ids):
        yield Change(
            "station", "renumbered", new.id, new.name,
            " ".join(old.stop_ids), " ".join(new.stop_ids),
        )  # fmt: skip
    shrink = math.cos(math.radians(old.lat))
    away = _METRES_PER_DEGREE * math.hypot((new.lon - old.lon) * shrink, new.lat - old.lat)
    if away >= _MOVED_M:
        yield Change("station", "moved", new.id, new.name, "", f"{away:.0f} m on the ground")
    if set(old.lines) != set(new.lines):
        yield Change(
            "station", "lines changed", new.id, new.name, " ".join(old.lines), " ".join(new.lines)
        )


def _ends(line: EditionLine, names: dict[str, str]) -> str:
    first = line.itineraries[0] if line.itineraries else ()
    return f"{names[first[0]]} – {names[first[-1]]}" if first else ""


def _listed(stations: set[str], names: dict[str, str]) -> str:
    return ", ".join(sorted(names.get(s, s) for s in stations))
