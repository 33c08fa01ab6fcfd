"""Reading the CSV tables of a feed strictly: all text, with row numbers, nothing guessed."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from operator import itemgetter

from gtfs_schematic.errors import FeedError
from gtfs_schematic.feed.archive import FeedFiles
from gtfs_schematic.feed.findings import Notebook

Row = tuple[int, tuple[str, ...]]
"""Row number (the header is row 1) and the stripped texts of the columns asked for."""

REQUIRED_COLUMNS: dict[str, tuple[str, ...]] = {
    "agency.txt": ("agency_name", "agency_url", "agency_timezone"),
    "routes.txt": ("route_id", "route_type"),
    "stop_times.txt": ("trip_id", "arrival_time", "departure_time", "stop_id", "stop_sequence"),
    "stops.txt": ("stop_id", "stop_name", "stop_lat", "stop_lon"),
    "trips.txt": ("route_id", "service_id", "trip_id"),
    "calendar.txt": (
        "service_id",
        "monday",
        "tuesday",
        "wednesday",
        "thursday",
        "friday",
        "saturday",
        "sunday",
        "start_date",
        "end_date",
    ),
    "calendar_dates.txt": ("service_id", "date", "exception_type"),
    "frequencies.txt": ("trip_id", "start_time", "end_time", "headway_secs"),
    "shapes.txt": ("shape_id", "shape_pt_lat", "shape_pt_lon", "shape_pt_sequence"),
    "transfers.txt": (),
    "translations.txt": (),
    "attributions.txt": ("organization_name",),
    "feed_info.txt": (),
}
"""Columns without which a table cannot be used (GTFS Schedule reference, "Field Definitions")."""

_NEEDED = ("agency.txt", "routes.txt", "stop_times.txt", "stops.txt", "trips.txt")
_CALENDARS = ("calendar.txt", "calendar_dates.txt")


@dataclass(frozen=True)
class Tables:
    """The tables of one feed, to be read by `rows`."""

    files: FeedFiles
    not_utf8: frozenset[str]
    notebook: Notebook

    def has(self, name: str) -> bool:
        """Tell whether the feed has a file of this name."""
        return name in self.files.names

    def rows(self, name: str, columns: tuple[str, ...]) -> Iterator[Row]:
        """Stream the rows of a table; a column that the table does not have gives "".

        Rows with too few values are read with the rest empty; rows with more values than the
        header has names are skipped, because their values cannot be told apart. Both are found.

        Raises
        ------
        FeedError
            Text in a wanted column that is not UTF-8, or quotes that do not match.
        """
        if not self.has(name):
            return
        with self._reader(name) as reader:
            header = self._header(name, reader)
            width = len(header)
            places = [header.index(column) if column in header else -1 for column in columns]
            # A place of -1 picks the empty text that is appended to every row.
            pick = itemgetter(*places) if len(places) > 1 else _pick_one(places[0])
            suspect = name in self.not_utf8
            for number, row in self._records(name, reader):
                values = row
                if len(values) != width:
                    if not values:
                        continue
                    fitted = self._fit(name, number, values, header)
                    if fitted is None:
                        continue
                    values = fitted
                values.append("")
                texts = tuple(map(str.strip, pick(values)))
                if suspect:
                    _refuse_bad_text(name, number, columns, texts)
                yield number, texts

    def header(self, name: str) -> list[str]:
        """Give the column names of a table, stripped; empty if the file is empty."""
        with self._reader(name) as reader:
            return self._header(name, reader)

    def _header(self, name: str, reader: Iterator[list[str]]) -> list[str]:
        try:
            header = [column.strip() for column in next(reader, [])]
        except csv.Error as error:
            raise FeedError(f"cannot be read as CSV ({error}).", file=name, row=1) from error
        if name in self.not_utf8:
            _refuse_bad_text(name, 1, header, header)
        doubled = sorted({c for c in header if c and header.count(c) > 1})
        if doubled:
            raise FeedError(
                "stands twice in the header, so it is not clear which column holds. "
                "Remove one of them.",
                file=name,
                row=1,
                field=doubled[0],
            )
        return header

    @contextmanager
    def _reader(self, name: str) -> Iterator[Iterator[list[str]]]:
        # Bad bytes survive decoding as lone surrogates, so that they can be located.
        errors = "surrogateescape" if name in self.not_utf8 else "strict"
        with self.files.open(name) as raw:
            text = io.TextIOWrapper(raw, encoding="utf-8-sig", errors=errors, newline="")
            yield csv.reader(text, strict=True)

    def _records(self, name: str, reader: Iterator[list[str]]) -> Iterator[tuple[int, list[str]]]:
        number = 1
        try:
            for number, row in enumerate(reader, start=2):
                yield number, row
        except csv.Error as error:
            raise FeedError(
                f"cannot be read as CSV ({error}). A text that holds a quote needs quotes round "
                "it and its own quotes doubled.",
                file=name,
                row=number + 1,
            ) from error

    def _fit(
        self, name: str, number: int, values: list[str], header: list[str]
    ) -> list[str] | None:
        """Bring a ragged row to the header's width; None if that would be guessing."""
        width = len(header)
        if len(values) < width:
            if not any(map(str.strip, values)):
                return None
            self.notebook.find(
                "warning",
                name,
                "row has fewer values than the header has names; the rest is taken as empty",
                row=number,
                field=header[len(values)],
            )
            return values + [""] * (width - len(values))
        extra = ",".join(values[width:])
        if extra.strip(", "):
            self.notebook.find(
                "error",
                name,
                "row has more values than the header has names and is skipped; "
                "a text that holds a comma needs quotes",
                row=number,
                value=extra,
            )
            return None
        self.notebook.find(
            "info", name, "row ends in commas that the header does not have", row=number
        )
        return values[:width]


def check_tables(tables: Tables) -> None:
    """Refuse a feed that lacks files or columns no diagram can do without, naming all of them.

    Raises
    ------
    FeedError
        What is missing, with the names found that differ from it by case only.
    """
    names = tables.files.names
    missing = [_lacking(name, names) for name in _NEEDED if name not in names]
    if not any(name in names for name in _CALENDARS):
        missing.append(" or ".join(_lacking(name, names) for name in _CALENDARS))
    for name, columns in REQUIRED_COLUMNS.items():
        if name not in names:
            continue
        header = tables.header(name)
        if header or name in _NEEDED:
            missing += [
                f"column {_lacking(column, tuple(header))} of {name}"
                for column in columns
                if column not in header
            ]
    if missing:
        raise FeedError(
            f"{tables.files.label} lacks {'; '.join(missing)}. "
            "Names count letter by letter, capitals included; ask the feed's publisher."
        )


def _lacking(name: str, present: tuple[str, ...]) -> str:
    """Give a missing name, with the one beside it that differs by case only."""
    alike = [other for other in present if other.lower() == name.lower()]
    return f"{name} (found {alike[0]!r})" if alike else name


def _pick_one(place: int) -> itemgetter[slice]:
    """Pick one value as a list of one, so that one column reads as several do."""
    return itemgetter(slice(place, place + 1 or None))


def _refuse_bad_text(name: str, number: int, columns: Sequence[str], texts: Sequence[str]) -> None:
    for column, text in zip(columns, texts, strict=True):
        if text.isascii():
            continue
        raw = text.encode("utf-8", "surrogateescape")
        shown = raw.decode("utf-8", "replace")
        if shown != text:
            raise FeedError(
                "is not UTF-8 text. Save the file as UTF-8 (it may be in a Windows or Latin code).",
                file=name,
                row=number,
                field=column.encode("utf-8", "surrogateescape").decode("utf-8", "replace"),
                value=shown,
            )
