"""The change sheet as one printable page for sign-off: lists, both diagrams, and a checklist."""

from __future__ import annotations

import base64
from html import escape

from gtfs_schematic.edition.changes import Change, ChangeSheet
from gtfs_schematic.edition.model import Edition

_STYLE = """
body { font: 11pt/1.4 'Noto Sans', sans-serif; color: #1b1f24; margin: 2rem; }
h1 { font-size: 1.6rem } h2 { font-size: 1.15rem; margin-top: 2rem }
table { border-collapse: collapse; width: 100% }
th, td { text-align: left; vertical-align: top; padding: .25rem .6rem .25rem 0;
  border-bottom: 1px solid #cfd4da }
.pair { display: grid; grid-template-columns: 1fr 1fr; gap: 1rem }
figure { margin: 0; position: relative } figcaption { font-weight: bold }
figure svg { position: absolute; left: 0; bottom: 0; width: 100% } figure img { width: 100% }
.box { display: inline-block; width: .9em; height: .9em; border: 1px solid #1b1f24 }
.line { display: inline-block; min-width: 12em; border-bottom: 1px solid #1b1f24 }
@media print { body { margin: 1cm } tr { break-inside: avoid } }
"""

_HEADINGS = {
    "line": "Lines",
    "station": "Stations",
    "drawing": "Stations that stand elsewhere on the sheet",
}


def to_html(
    sheet: ChangeSheet, before: tuple[Edition, bytes], after: tuple[Edition, bytes]
) -> bytes:
    """Write the change sheet as a page.

    Parameters
    ----------
    sheet
        What differs.
    before, after
        Each edition and its diagram as SVG.
    """
    touched = {change.id for change in sheet.changes if change.subject != "line"}
    parts = [
        "<!DOCTYPE html>",
        (
            f'<html lang="en"><head><meta charset="utf-8"><title>Changes: {escape(after[0].title)}'
            f"</title><style>{_STYLE}</style></head><body>"
        ),
        f"<h1>Changes: {escape(sheet.before_title)} → {escape(sheet.after_title)}</h1>",
        f"<p>{_period(before[0])} → {_period(after[0])}. {_summary(sheet)}</p>",
        *(_table(sheet, subject) for subject in _HEADINGS),
        _doubts(sheet),
        '<h2>Both diagrams</h2><p>Rings mark the stations named above.</p><div class="pair">',
        _figure("Before", *before, touched),
        _figure("After", *after, touched),
        "</div>",
        _checklist(),
        (
            "<p>Schematic diagrams, not to scale. This page compares what two feeds say; the "
            "operator's own publications hold.</p></body></html>"
        ),
    ]
    return ("\n".join(parts) + "\n").encode()


def _period(edition: Edition) -> str:
    return escape(f"{edition.feed.start_date}/{edition.feed.end_date}")


def _summary(sheet: ChangeSheet) -> str:
    if not sheet.changes:
        return f"Nothing changed: all {sheet.kept} stations and all lines are as before."
    return (
        f"{len(sheet.changes)} changes. Of {sheet.kept} stations that stay, "
        f"{sheet.moved_on_sheet} stand elsewhere on the sheet. Nothing else that is compared "
        "(names, places, colors, ids, calls of stations and lines) changed."
    )


def _table(sheet: ChangeSheet, subject: str) -> str:
    rows = [change for change in sheet.changes if change.subject == subject]
    if not rows:
        return ""
    body = "".join(_row(change) for change in rows)
    return (
        f"<h2>{_HEADINGS[subject]}</h2><table><thead><tr><th>What</th><th>Name</th><th>Id</th>"
        f"<th>Before</th><th>After</th><th>Checked</th></tr></thead><tbody>{body}</tbody></table>"
    )


def _row(change: Change) -> str:
    cells = (change.kind, change.name, change.id, change.before, change.after)
    texts = "".join(f"<td>{escape(cell)}</td>" for cell in cells)
    return f'<tr>{texts}<td><span class="box"></span></td></tr>'


def _doubts(sheet: ChangeSheet) -> str:
    if not sheet.doubtful:
        return ""
    items = "".join(f"<li>{escape(doubt)}</li>" for doubt in sheet.doubtful)
    return f"<h2>Matches to look at</h2><ul>{items}</ul>"


def _figure(caption: str, edition: Edition, svg: bytes, touched: set[str]) -> str:
    """Show a diagram as an image, with rings over the stations that a change concerns."""
    rings = "".join(
        f'<circle cx="{s.x_mm:g}" cy="{s.y_mm:g}" r="5"/>'
        for s in edition.stations
        if s.id in touched
    )
    size = f"0 0 {edition.width_mm:g} {edition.height_mm:g}"
    source = base64.b64encode(svg).decode()
    return (
        f"<figure><figcaption>{caption}</figcaption>"
        f'<img alt="{escape(edition.title)}" src="data:image/svg+xml;base64,{source}">'
        f'<svg viewBox="{size}" aria-hidden="true"><g fill="none" stroke="#d0006f" '
        f'stroke-width="1">{rings}</g></svg></figure>'
    )


def _checklist() -> str:
    roles = ("Planning", "Customer information", "Accessibility", "Approved for print")
    rows = "".join(
        f'<tr><td><span class="box"></span> {role}</td><td>Name <span class="line"></span></td>'
        '<td>Date <span class="line"></span></td></tr>'
        for role in roles
    )
    return f"<h2>Sign-off</h2><table><tbody>{rows}</tbody></table>"
