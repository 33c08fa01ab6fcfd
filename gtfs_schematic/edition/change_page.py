"""The change sheet as one printable page for sign-off: lists, both diagrams, and a checklist."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from html import escape

from gtfs_schematic.edition.change_pictures import (
    Sheets,
    clippings,
    definitions,
    grouped,
    overlay,
)
from gtfs_schematic.edition.change_plates import MOST_PLACES
from gtfs_schematic.edition.change_words import (
    CAUTION,
    HEADINGS,
    KINDS,
    SIGN_OFF,
    conclusion,
    doubts_heading,
    period,
    sentence,
    stayed,
    summary,
)
from gtfs_schematic.edition.changes import ChangeSheet
from gtfs_schematic.edition.differences import Change

_STYLE = """
body { font: 11pt/1.4 'Noto Sans', sans-serif; color: #1b1f24; margin: 2rem auto;
  max-width: 72rem; padding: 0 1rem }
h1 { font-size: 1.6rem } h2 { font-size: 1.15rem; margin-top: 2rem } h3 { font-size: 1rem }
table { border-collapse: collapse; width: 100% }
th, td { text-align: left; vertical-align: top; padding: .25rem .6rem .25rem 0;
  border-bottom: 1px solid #cfd4da; overflow-wrap: anywhere }
td:last-child, th:last-child { text-align: center; white-space: nowrap }
.pair { display: grid; grid-template-columns: 1fr 1fr; gap: 1rem; break-inside: avoid }
figure { margin: 0 } figcaption { font-weight: bold }
figure svg, .overlay { display: block; width: 100%; height: auto; border: 1px solid #cfd4da;
  overflow: hidden; background: #fff }
.store { position: absolute }
.ring { fill: none; stroke: #d0006f }
.box { display: inline-block; width: .9em; height: .9em; border: 1px solid #1b1f24 }
.fill { display: inline-block; min-width: 12em; border-bottom: 1px solid #1b1f24 }
.verdict { border-left: .3rem solid #1b1f24; padding: .2rem .8rem }
@media print { body { margin: 0; max-width: none } tr, section.place { break-inside: avoid } }
"""


def to_html(sheet: ChangeSheet, sheets: Sheets | None = None) -> bytes:
    """Write the change sheet as a page that needs nothing else.

    Parameters
    ----------
    sheet
        What differs.
    sheets
        Both editions with their diagrams; None where feeds alone are compared.
    """
    title = f"Changes: {sheet.after.title}"
    parts = [
        "<!DOCTYPE html>",
        '<html lang="en"><head><meta charset="utf-8">',
        '<meta name="viewport" content="width=device-width,initial-scale=1">',
        f'<title>{escape(title)}</title><link rel="icon" href="data:,">',
        f"<style>{_STYLE}</style></head><body>",
        f"<h1>Changes: {escape(sheet.before.title)} → {escape(sheet.after.title)}</h1>",
        f"<p>{escape(period(sheet.before))} → {escape(period(sheet.after))}.",
        f"{escape(summary(sheet))}</p>",
        *(_table(sheet.large, subject) for subject in HEADINGS),
        f'<p class="verdict">{escape(conclusion(sheet))}</p>',
        f"<p>{escape(stayed(sheet.stability))}</p>" if sheet.stability else "",
        _doubts(sheet),
        *(_pictures(sheet, sheets) if sheets is not None else ()),
        _small(sheet),
        _checklist(),
        f"<p>{escape(CAUTION)}</p></body></html>",
    ]
    return ("\n".join(part for part in parts if part) + "\n").encode()


def _table(changes: Sequence[Change], subject: str) -> str:
    rows = [change for change in changes if change.subject == subject]
    if not rows:
        return ""
    body = "".join(map(_row, rows))
    return (
        f"<h2>{HEADINGS[subject]}</h2><table><thead><tr><th>What</th><th>Name</th><th>Id</th>"
        f"<th>Before</th><th>After</th><th>Checked</th></tr></thead><tbody>{body}</tbody></table>"
    )


def _row(change: Change) -> str:
    cells = (KINDS[change.kind], change.name, change.id, change.before, change.after)
    texts = "".join(f"<td>{escape(cell)}</td>" for cell in cells)
    return f'<tr>{texts}<td><span class="box"></span></td></tr>'


def _doubts(sheet: ChangeSheet) -> str:
    if not sheet.doubtful:
        return ""
    items = "".join(f"<li>{escape(doubt)}</li>" for doubt in sheet.doubtful)
    return f"<h2>{escape(doubts_heading(sheet))}</h2><ul>{items}</ul>"


def _pictures(sheet: ChangeSheet, sheets: Sheets) -> Iterator[str]:
    yield definitions(sheets)
    yield "<h2>Both editions over each other</h2>"
    yield overlay(sheets)
    texts = {sentence(change): change.places for change in sheet.large}
    groups = grouped(texts, MOST_PLACES)
    if groups:
        yield "<h2>Where it is to be seen</h2><p>Rings mark the stations that are meant.</p>"
    for things, places in groups:
        told = "".join(f"<li>{escape(thing)}</li>" for thing in things)
        pair = clippings(sheets, places)
        yield f'<section class="place"><ul>{told}</ul>{pair}</section>'


def _small(sheet: ChangeSheet) -> str:
    if not sheet.small:
        return ""
    items = "".join(f"<li>{escape(sentence(change))}</li>" for change in sheet.small)
    return f"<h2>Below the limits</h2><ul>{items}</ul>"


def _checklist() -> str:
    rows = "".join(
        f'<tr><td><span class="box"></span> {role}</td><td>Name <span class="fill"></span></td>'
        '<td>Date <span class="fill"></span></td></tr>'
        for role in SIGN_OFF
    )
    return f"<h2>Sign-off</h2><table><tbody>{rows}</tbody></table>"
