"""Refusing feeds that lack files, columns or rows that no diagram can do without."""

from __future__ import annotations

from collections.abc import Sequence

from gtfs_schematic.errors import FeedError
from gtfs_schematic.feed.archive import CORE_FILES
from gtfs_schematic.feed.tables import REQUIRED_COLUMNS, Tables

_CALENDARS = ("calendar.txt", "calendar_dates.txt")
_NEED_ROWS = ("routes.txt", "stop_times.txt", "stops.txt", "trips.txt")
_SEPARATORS = {";": "semicolons", "\t": "tabs", "|": "bars"}


def check_complete(tables: Tables) -> None:
    """Refuse a feed that lacks files, columns or rows, naming all of them.

    Raises
    ------
    FeedError
        What is missing, with the names found that differ from it by case only.
    """
    names = tables.files.names
    missing = [_lacking(name, names) for name in CORE_FILES if name not in names]
    if not any(name in names for name in _CALENDARS):
        missing.append(" or ".join(_lacking(name, names) for name in _CALENDARS))
    hints = []
    for name in sorted(REQUIRED_COLUMNS.keys() & set(names)):
        header, has_rows = tables.beginning(name)
        columns = [c for c in REQUIRED_COLUMNS[name] if c not in header]
        if columns and (header or name in CORE_FILES):
            missing.append(_columns(name, columns, header))
            hints += _separated(name, header)
        elif name in _NEED_ROWS and not has_rows:
            missing.append(f"rows in {name}: it has only a header")
    if missing:
        hints.append("Ask the feed's publisher.")
        if any("(found" in told for told in missing):
            hints.insert(0, "Names count letter by letter, capitals included.")
        raise FeedError(f"{tables.files.label} lacks {'; '.join(missing)}. {' '.join(hints)}")


def _lacking(name: str, present: Sequence[str]) -> str:
    """Give a missing name, with the one beside it that differs by case only."""
    alike = [other for other in present if other.lower() == name.lower()]
    return f"{name} (found {alike[0]!r})" if alike else name


def _columns(name: str, columns: Sequence[str], header: Sequence[str]) -> str:
    if not header:
        return f"a header in {name}: its first row is empty"
    noun = "column" if len(columns) == 1 else "columns"
    return f"{noun} {', '.join(_lacking(column, header) for column in columns)} of {name}"


def _separated(name: str, header: Sequence[str]) -> list[str]:
    """Say that a header looks as if something else than commas parts its columns."""
    found = [noun for mark, noun in _SEPARATORS.items() if len(header) == 1 and mark in header[0]]
    return [f"The columns of {name} are separated by {n}; they must be by commas." for n in found]
