"""Picking the columns asked for out of the rows of a table, as clean text."""

from __future__ import annotations

import re
from operator import itemgetter
from typing import TYPE_CHECKING

from gtfs_schematic.feed.encodings import escaped, is_damaged_utf8, readable, shown
from gtfs_schematic.feed.model import Severity
from gtfs_schematic.feed.values import has_controls

if TYPE_CHECKING:
    from gtfs_schematic.feed.tables import Tables

_IS_ID = re.compile("(?<!trans)_id$|^parent_station$")
"""Columns whose text tells things apart, whatever it is."""


class Picker:
    """Picks the columns asked for out of a table's rows.

    Text that is not UTF-8 is read in the code that was common for the feed's language, unless most
    of the file is UTF-8 beyond ASCII: then it is damage, and U+FFFD stands for it. An id need not
    look right, but must read the same in all tables: it is read in that code in any case.

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
        self._columns, self._wanted = columns, frozenset(columns)
        self._whole, self._first = list(header), "".join(header[:1])
        self._suspect = not tables.is_utf8(name)
        self._legacy = tables.legacy
        if self._suspect:
            with tables.files.open(name) as raw:
                self._damaged = is_damaged_utf8(raw)
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
        if row and row[0].strip() == self._first and [*map(str.strip, row)] == self._whole:
            fault = "the header stands here once more; the row is skipped"
            self._notebook.find("warning", self._name, fault, row=number)
            return None
        row.append("")
        texts = tuple(map(str.strip, self._pick(row)))
        return texts if "".join(texts).isprintable() else self._visible(number, texts)

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
        extra = ",".join(map(shown, values[width:]))
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
        """Read the texts that are not UTF-8, and find them."""
        return [
            value if _is_text(value) else self._read(number, column, value.strip())
            for column, value in zip(self._header, values, strict=True)
        ]

    def _read(self, number: int, column: str, text: str) -> str:
        """Read one text that is not UTF-8, and find it."""
        is_id = _IS_ID.search(column) is not None
        legacy = readable(text, self._legacy) if is_id or not self._damaged else None
        if legacy is not None:
            code = self._legacy.removeprefix("cp")
            message = (
                f"text is not UTF-8; it is read as Windows code page {code}: check its letters"
            )
        elif is_id:
            message = "id is not UTF-8; it is kept with escapes for the bytes that are not"
        else:
            message = "text is not UTF-8; U+FFFD stands for what cannot be read"
        severity: Severity = "warning" if column in self._wanted else "info"
        self._notebook.find(
            severity, self._name, message, row=number, field=column, value=escaped(text)
        )
        if legacy is not None:
            return legacy
        return escaped(text) if is_id else shown(text)

    def _visible(self, number: int, texts: tuple[str, ...]) -> tuple[str, ...]:
        """Put escapes for control characters in ids, which no file that we write could hold."""
        seen = list(texts)
        for n, (column, text) in enumerate(zip(self._columns, texts, strict=True)):
            if _IS_ID.search(column) and has_controls(text):
                seen[n] = text.encode("unicode_escape").decode("ascii")
                message = "id holds control characters; escapes stand for them"
                self._notebook.find(
                    "warning", self._name, message, row=number, field=column, value=seen[n]
                )
        return tuple(seen)


def _pick_one(place: int) -> itemgetter[slice]:
    """Pick one value as a list of one, so that one column reads as several do."""
    return itemgetter(slice(place, place + 1 or None))


def _is_text(value: str) -> bool:
    """Tell whether a value was UTF-8: bytes that were not are lone surrogates now."""
    if value.isascii():
        return True
    try:
        value.encode()
    except UnicodeEncodeError:
        return False
    return True
