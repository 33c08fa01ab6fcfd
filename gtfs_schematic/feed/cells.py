"""Single values of a table's rows, checked on the way from text to meaning."""

from __future__ import annotations

from collections.abc import Callable, Container
from dataclasses import dataclass, replace
from typing import TypeVar

from gtfs_schematic.feed.findings import Notebook
from gtfs_schematic.feed.model import Severity
from gtfs_schematic.feed.values import LONGEST_NAME, clean_name, parse_whole

T = TypeVar("T")


@dataclass(frozen=True, slots=True)
class Cell:
    """One value of a table and where it stands; `row` counts the header as row 1."""

    file: str
    row: int
    field: str
    text: str

    def found(self, notebook: Notebook, severity: Severity, message: str) -> None:
        """Note a finding about this value."""
        notebook.find(severity, self.file, message, row=self.row, field=self.field, value=self.text)


def is_usable_id(notebook: Notebook, cell: Cell, seen: Container[str]) -> bool:
    """Tell whether a row's own id can be used; an empty, second or odd one is found."""
    if not cell.text:
        cell.found(notebook, "error", "row has no id and is skipped")
        return False
    if cell.text in seen:
        cell.found(notebook, "error", "id stands in the table before; the first row counts")
        return False
    if not cell.text.isprintable():
        fault = "id holds spaces of an unusual width or invisible characters; it counts as it is"
        cell.found(notebook, "warning", fault)
    return True


def name_of(notebook: Notebook, cell: Cell) -> str:
    """Give a name that a person reads, cleaned; what had to be cleaned is found."""
    cleaned = clean_name(cell.text)
    if len(cell.text) > LONGEST_NAME and cleaned.endswith("…"):
        fault = f"text is longer than {LONGEST_NAME} characters; the rest is cut off"
        replace(cell, text=cleaned).found(notebook, "warning", fault)
    elif cleaned != cell.text:
        fault = (
            "text holds line ends, tabs, double spaces or control characters; "
            "each run of them is taken as one space"
        )
        cell.found(notebook, "info", fault)
    return cleaned


def whole_of(notebook: Notebook, cell: Cell) -> int | None:
    """Give a whole number, None if the field is empty or bad; a bad one is found."""
    return value_of(notebook, cell, parse_whole, "not a whole number; taken as empty")


def value_of(notebook: Notebook, cell: Cell, parse: Callable[[str], T], fault: str) -> T | None:
    """Give a parsed value, None if the field is empty or bad; a bad one is found as `fault`."""
    if not cell.text:
        return None
    try:
        return parse(cell.text)
    except ValueError:
        cell.found(notebook, "warning", fault)
        return None
