"""The sentences of a change sheet, for the page and the printed list."""

from __future__ import annotations

from collections.abc import Mapping

from gtfs_schematic.edition.changes import COMPARED, ChangeSheet, Side
from gtfs_schematic.edition.differences import Change
from gtfs_schematic.edition.stability import Stability

HEADINGS: Mapping[str, str] = {
    "line": "Lines",
    "station": "Stations",
    "walk": "Walks",
    "drawing": "Stations that stand elsewhere on the sheet",
}
KINDS: Mapping[str, str] = {
    "new": "new",
    "gone": "gone",
    "merged": "merged into another",
    "split": "split off",
    "renamed": "renamed",
    "long name": "long name",
    "second name": "name in the second language",
    "recolored": "recolored",
    "renumbered": "renumbered",
    "stops": "stops come or gone",
    "codes": "stop codes",
    "routes": "routes come or gone",
    "mode": "mode",
    "extended": "extended",
    "shortened": "shortened",
    "rerouted": "rerouted",
    "calls": "calls",
    "way": "passes other stations",
    "retimed": "retimed",
    "service": "days or hours of service",
    "moved": "moved",
    "lines": "lines that call",
    "step-free": "step-free access",
    "time": "time on foot",
    "drawn anew": "drawn elsewhere",
}
SIGN_OFF = ("Planning", "Customer information", "Accessibility", "Approved for print")


CAUTION = (
    "Schematic diagrams, not to scale. This sheet compares what two feeds say; the operator's own "
    "publications hold."
)


def sentence(change: Change) -> str:
    """Write a change in one line."""
    texts = ", now ".join(text for text in (change.before, change.after) if text)
    head = f"{change.subject} {change.name} ({change.id}), {KINDS[change.kind]}"
    return f"{head[0].upper()}{head[1:]}{f': {texts}' if texts else ''}"


def period(side: Side) -> str:
    """Say for when a side holds."""
    dates = " to ".join(date for date in (side.start_date, side.end_date) if date)
    return f"{dates or 'no dates given'} (service of {side.service_date})"


def summary(sheet: ChangeSheet) -> str:
    """Say how much differs."""
    changes = len(sheet.large)
    told = f"{changes} {'change' if changes == 1 else 'changes'}" if changes else "No change"
    drawn = f", {sheet.moved_on_sheet} of them elsewhere on the sheet" * bool(sheet.moved_on_sheet)
    return f"{told}; {sheet.kept} stations in both{drawn}."


def conclusion(sheet: ChangeSheet) -> str:
    """Say whether anything else changed, and what that means."""
    limits = sheet.limits
    if sheet.small:
        count = len(sheet.small)
        less = (
            f"{count} further {'difference stays' if count == 1 else 'differences stay'} below the "
            f"limits ({limits.moved_m:g} m on the ground, {100 * limits.retimed_share:g} % of "
            "trips, headway or length of the day) and stand at the end. Nothing else changed"
        )
    else:
        less = "Nothing else changed"
    unknown = f" Not compared: {'; '.join(sheet.not_compared)}." if sheet.not_compared else ""
    return f"{less}, comparing {COMPARED}.{unknown}"


def doubts_heading(sheet: ChangeSheet) -> str:
    """Head the list of matches to look at."""
    return f"Matches to look at ({len(sheet.doubtful)})"


def stayed(found: Stability) -> str:
    """Say what of the drawing stayed as it was."""
    moved = f"{found.moved} of {found.kept} stations moved"
    if found.moved:
        moved += (
            f" (median {found.move_median_mm:.1f} mm, most {found.move_largest_mm:.1f} mm, "
            f"as far as {found.farthest_links} links from a change)"
        )
    return (
        f"On the sheet {moved}, {found.links_turned} of {found.links_kept} links turned, "
        f"{found.labels_turned} of {found.labels_kept} names stand on another side, "
        f"{found.order_inversions} pairs of lines changed places in {found.orders_kept} bundles, "
        f"{found.colors_changed} lines changed color."
    )
