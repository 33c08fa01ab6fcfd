"""Reading the CSV tables of a feed strictly: all text, with row numbers, nothing guessed."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
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
    "networks.txt": (),
    "route_networks.txt": (),
    "transfers.txt": (),
    "translations.txt": (),
    "attributions.txt": ("organization_name",),
    "feed_info.txt": (),
}
"""Columns without which a table cannot be used (GTFS Schedule reference, "Field Definitions")."""

MOST_ROWS = 500_000_000
"""Some ten times the stop_times.txt of the largest countries; more is a fault or an attack."""

_MUST_BE_RIGHT = re.compile("_id$|name$|^translation$|^parent_station$|^field_value$|^organization")
"""Columns whose text tells things apart or stands on the diagram."""

_NEEDED = ("agency.txt", "routes.txt", "stop_times.txt", "stops.txt", "trips.txt")
_CALENDARS = ("calendar.txt", "calendar_dates.txt")


@dataclass(frozen=True)
class Tables:
    """The tables of one feed, to be read by `rows`."""

    files: FeedFiles
    is_utf8: Callable[[str], bool]
    """Tells whether a file is UTF-8 throughout."""
    notebook: Notebook

    def has(self, name: str) -> bool:
        """Tell whether the feed has a file of this name."""
        return name in self.files.names

    def without_findings(self) -> Tables:
        """Give the same tables with a notebook that nobody reads."""
        return replace(self, notebook=Notebook())

    def rows(self, name: str, columns: tuple[str, ...]) -> Iterator[Row]:
        """Stream the rows of a table; a column that the table does not have gives "".

        Rows with too few values are read with the rest empty; rows with more values than the
        header has names are skipped, because their values cannot be told apart. Both are found.

        Raises
        ------
        FeedError
            Text in a wanted column that is not UTF-8, or quotes that do not match.
        """
        if self.has(name):
            with self.files.open(name) as raw:
                yield from self.rows_from(raw, name, columns)

    def rows_from(
        self,
        raw: io.BufferedReader,
        name: str,
        columns: tuple[str, ...],
        behind: tuple[int, list[str]] | None = None,
    ) -> Iterator[Row]:
        """Stream the rows of a table, or of its end.

        Parameters
        ----------
        raw
            The table's bytes.
        behind
            If `raw` has the end of the table only: the number of its first row, and the header.
        """
        mark = "utf-8" if behind else "utf-8-sig"
        with io.TextIOWrapper(raw, mark, self._errors(name), newline="") as text:
            reader = csv.reader(text, strict=True)
            first, header = behind or (2, self._header(name, reader))
            picker = Picker(self, name, tuple(header), columns)
            for number, values in self._records(name, reader, first):
                texts = picker.texts(number, values)
                if texts is not None:
                    yield number, texts

    def header(self, name: str) -> list[str]:
        """Give the column names of a table, stripped; empty if the file is empty."""
        with (
            self.files.open(name) as raw,
            # Not to wait for the digest of a large file.
            io.TextIOWrapper(raw, "utf-8-sig", "surrogateescape", newline="") as text,
        ):
            return self._header(name, csv.reader(text, strict=True))

    def header_of(self, name: str, line: bytes) -> list[str]:
        """Give the column names that a table's first line holds."""
        return self._header(
            name, csv.reader([line.decode("utf-8", self._errors(name))], strict=True)
        )

    def values(self, name: str, number: int, line: bytes) -> list[str]:
        """Give the values of one row that is known to end with its line."""
        reader = csv.reader([line.decode("utf-8", self._errors(name))], strict=True)
        return next((row for _, row in self._records(name, reader, number)), [])

    def _errors(self, name: str) -> str:
        # Bad bytes survive decoding as lone surrogates, so that they can be located.
        return "strict" if self.is_utf8(name) else "surrogateescape"

    def _header(self, name: str, reader: Iterator[list[str]]) -> list[str]:
        try:
            header = [column.strip() for column in next(reader, [])]
        except csv.Error as error:
            raise FeedError(f"cannot be read as CSV ({error}).", file=name, row=1) from error
        header = [_shown(column) for column in header]
        if header and header[0].startswith("\ufffd"):
            raise FeedError(
                "is not UTF-8 text. Save the file as UTF-8 (it looks like UTF-16).",
                file=name,
                row=1,
                field=header[0],
            )
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

    def _records(
        self, name: str, reader: Iterator[list[str]], first: int
    ) -> Iterator[tuple[int, list[str]]]:
        number = first - 1
        try:
            for number, row in enumerate(reader, start=first):
                yield number, row
        except csv.Error as error:
            raise FeedError(
                f"cannot be read as CSV ({error}). A text that holds a quote needs quotes round "
                "it and its own quotes doubled.",
                file=name,
                row=number + 1,
            ) from error
        if number > MOST_ROWS:
            raise FeedError(f"has more than {MOST_ROWS:,} rows, which no feed needs.", file=name)


class Picker:
    """Picks the columns asked for out of a table's rows.

    Parameters
    ----------
    tables
        For findings.
    name, header
        Of the table.
    columns
        What to pick; a column that the table does not have gives "".
    """

    def __init__(
        self, tables: Tables, name: str, header: tuple[str, ...], columns: tuple[str, ...]
    ) -> None:
        self._notebook, self._name, self._header = tables.notebook, name, header
        places = [header.index(column) if column in header else -1 for column in columns]
        # A place of -1 picks the empty text that is appended to every row.
        self._pick = itemgetter(*places) if len(places) > 1 else _pick_one(places[0])
        self._wanted = frozenset(columns)
        self._suspect = not tables.is_utf8(name)
        if self._suspect:
            for column in header:
                if "\ufffd" in column:
                    fault = "column name is not UTF-8; the column is not used"
                    self._notebook.find("warning", name, fault, row=1, field=column)

    def texts(self, number: int, values: list[str]) -> tuple[str, ...] | None:
        """Give the stripped texts of a row; None if the row is blank or cannot be told apart."""
        row = values
        if len(row) != len(self._header):
            if not row:
                return None
            fitted = self._fit(number, row)
            if fitted is None:
                return None
            row = fitted
        if self._suspect:
            row = self._readable(number, row)
        row.append("")
        return tuple(map(str.strip, self._pick(row)))

    def _fit(self, number: int, values: list[str]) -> list[str] | None:
        """Bring a ragged row to the header's width; None if that would be guessing."""
        width = len(self._header)
        if len(values) < width:
            if not any(map(str.strip, values)):
                return None
            self._notebook.find(
                "warning",
                self._name,
                "row has fewer values than the header has names; the rest is taken as empty",
                row=number,
                field=self._header[len(values)],
            )
            return values + [""] * (width - len(values))
        extra = ",".join(map(_shown, values[width:]))
        if extra.strip(", "):
            self._notebook.find(
                "error",
                self._name,
                "row has more values than the header has names and is skipped; "
                "a text that holds a comma needs quotes",
                row=number,
                value=extra,
            )
            return None
        self._notebook.find(
            "info", self._name, "row ends in commas that the header does not have", row=number
        )
        return values[:width]

    def _readable(self, number: int, values: list[str]) -> list[str]:
        """Find text that is not UTF-8 and put U+FFFD for it; refuse it in ids and names."""
        shown = list(map(_shown, values))
        for column, before, after in zip(self._header, values, shown, strict=True):
            if before == after:
                continue
            if column in self._wanted and _MUST_BE_RIGHT.search(column):
                raise FeedError(
                    "is not UTF-8 text. Save the file as UTF-8 (it may be in a Windows or Latin "
                    "code).",
                    file=self._name,
                    row=number,
                    field=column,
                    value=after.strip(),
                )
            self._notebook.find(
                "warning",
                self._name,
                "text is not UTF-8; U+FFFD stands for what cannot be read",
                row=number,
                field=column,
                value=after.strip(),
            )
        return shown


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


def _shown(text: str) -> str:
    """Give a text with U+FFFD for bytes that are not UTF-8."""
    if text.isascii():
        return text
    return text.encode("utf-8", "surrogateescape").decode("utf-8", "replace")
