"""Reading the CSV tables of a feed strictly: all text, with row numbers, nothing guessed."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace

from gtfs_schematic.errors import FeedError
from gtfs_schematic.feed.archive import FeedFiles
from gtfs_schematic.feed.encodings import shown
from gtfs_schematic.feed.findings import Notebook
from gtfs_schematic.feed.picker import Picker

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


@dataclass(frozen=True)
class Tables:
    """The tables of one feed, to be read by `rows`."""

    files: FeedFiles
    is_utf8: Callable[[str], bool]
    """Tells whether a file is UTF-8 throughout."""
    notebook: Notebook
    legacy: str = "cp1252"
    """Codec in which text is read that is not UTF-8; see encodings.py."""

    def has(self, name: str) -> bool:
        """Tell whether the feed has a file of this name."""
        return name in self.files.names

    def without_findings(self) -> Tables:
        """Give the same tables with a notebook that nobody reads."""
        return replace(self, notebook=Notebook())

    def rows(self, name: str, columns: tuple[str, ...]) -> Iterator[Row]:
        """Stream the rows of a table; a column that the table does not have gives "".

        Rows with too few values are read with the rest empty; rows with more values than the
        header has names are skipped, because their values cannot be told apart. Text that is not
        UTF-8 is read as `Picker` says. All three are found.

        Raises
        ------
        FeedError
            Quotes that do not match; a table in UTF-16.
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

    def beginning(self, name: str) -> tuple[list[str], bool]:
        """Give the column names of a table, stripped, and whether it has any row.

        No names if the file is empty.
        """
        with (
            self.files.open(name) as raw,
            # Not to wait for the digest of a large file.
            io.TextIOWrapper(raw, "utf-8-sig", "surrogateescape", newline="") as text,
        ):
            reader = csv.reader(text, strict=True)
            header = self._header(name, reader)
            return header, any(row for _, row in self._records(name, reader, 2))

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
        header = [shown(column) for column in header]
        if header and (header[0].startswith("\ufffd") or "\0" in header[0]):
            fault = "is not UTF-8 text. Save the file as UTF-8 (it looks like UTF-16)."
            raise FeedError(fault, file=name, row=1)
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
            raise FeedError(_csv_fault(str(error)), file=name, row=number + 1) from error
        if number > MOST_ROWS:
            raise FeedError(f"has more than {MOST_ROWS:,} rows, which no feed needs.", file=name)


def _csv_fault(told: str) -> str:
    """Say for a person what the csv module says."""
    if "field limit" in told:
        return (
            f"holds a value of more than {csv.field_size_limit():,} characters; no feed needs it."
        )
    if "end of data" in told:
        told = "a quote opens here and never ends"
    return (
        f"cannot be read as CSV ({told}). A text that holds a quote needs quotes round it and its "
        "own quotes doubled."
    )
