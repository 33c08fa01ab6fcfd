"""Cells, rows and frames of the drift page's tables."""

from __future__ import annotations

import json
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from html import escape


@dataclass(frozen=True, slots=True)
class Column:
    """A column: its head, whether of numbers, which way it sorts first; wide ones never sort."""

    head: str
    numbers: bool = False
    falling: bool = False
    wide: bool = False


@dataclass(frozen=True, slots=True)
class Shown:
    """What a row shows on the picture, and what is said of it."""

    name: str
    stations: Sequence[str]
    ways: Sequence[Sequence[str]] = ()
    say: str = ""
    key: str = ""


def table(
    key: str, title: str, columns: Sequence[Column], rows: Sequence[str], *, about: str
) -> str:
    """Wrap rows in a part of the page that opens; the first column is sorted as it stands."""
    heads = "".join(
        f'<th scope="col"{" class=n" if column.numbers else ""}'
        f' data-first="{"descending" if column.falling else "ascending"}">'
        f"{_head(column)}</th>"
        for column in columns
    )
    count = f"{len(rows)}" if rows else "none"
    search = (
        f'<p><label>Find <input type="search" data-filters="{key}"></label></p>'
        if len(rows) > 12
        else ""
    )
    body = (
        f'<div class="scroll" tabindex="0" role="region" aria-label="{escape(title)}">'
        f'<table id="{key}"><thead><tr>{heads}</tr></thead><tbody>{"".join(rows)}</tbody>'
        "</table></div>"
        if rows
        else ""
    )
    return (
        f"<details{' open' if key == 'journeys' and rows else ''}><summary>{escape(title)} "
        f'<span>({count})</span></summary><p class="soft">{escape(about)}</p>{search}{body}'
        "</details>"
    )


def _head(column: Column) -> str:
    text = escape(column.head)
    return text if column.wide else f'<button type="button">{text}</button>'


def row(shown: Shown, cells: Iterable[str]) -> str:
    """Write a row: a button with its name that marks it on the picture, and its other cells."""
    key = f' id="{shown.key}"' if shown.key else ""
    return (
        f'<tr{key} data-stations="{_json(shown.stations)}" data-ways="{_json(shown.ways)}" '
        f'data-say="{escape(shown.say)}"><td><button type="button" class="show">'
        f"{escape(shown.name)}</button></td>{''.join(cells)}</tr>"
    )


def _json(value: object) -> str:
    return escape(json.dumps(value, ensure_ascii=False))


def number(value: float | None, digits: int, text: str | None = None) -> str:
    """Write a cell that is sorted by its number; unknown ones sort below all."""
    if value is None:
        return '<td class="n" data-v="-1e9">–</td>'
    return f'<td class="n" data-v="{value:.6g}">{text or f"{value + 0.0:.{digits}f}"}</td>'


def size(value: float | None, digits: int) -> str:
    """Write a signed cell that is sorted by its size."""
    if value is None:
        return number(None, digits)
    return number(abs(value), digits, f"{value + 0.0:+.{digits}f}")
