"""Compare two editions, two feeds, or one of each, without drawing anything."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from gtfs_schematic.config import Settings
from gtfs_schematic.edition.carry import carried_matches, carried_roster
from gtfs_schematic.edition.change_list import to_pdf
from gtfs_schematic.edition.change_page import to_html
from gtfs_schematic.edition.change_pictures import Sheets
from gtfs_schematic.edition.changes import ChangeSheet, roster_changes, to_csv, to_json
from gtfs_schematic.edition.folder import EDITION_FILE, load_edition
from gtfs_schematic.edition.identity import match_rosters
from gtfs_schematic.edition.make import stop_codes_of
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.edition.roster import Roster, roster_of_edition, roster_of_network
from gtfs_schematic.pipeline import inspect
from gtfs_schematic.progress import Progress, Silent


@dataclass(frozen=True, slots=True)
class Issue:
    """One side of a comparison."""

    name: str
    roster: Roster
    edition: Edition | None = None
    diagram: bytes | None = None
    """The edition's diagram as SVG, where it stands beside it."""
    pdf: bytes = b""
    """The same as PDF."""


def load_issue(
    path: Path,
    settings: Settings,
    *,
    progress: Progress = Silent(),  # noqa: B008 - it has no state
) -> Issue:
    """Read an edition from its folder or file, or the network of a feed.

    Raises
    ------
    SchematicError
        If it can be read as neither.
    """
    if path.name == EDITION_FILE or (path / EDITION_FILE).is_file():
        edition = load_edition(path)
        folder = path if path.is_dir() else path.parent
        file = folder / "diagram.svg"
        diagram = file.read_bytes() if file.is_file() else None
        file = folder / "diagram.pdf"
        pdf = file.read_bytes() if file.is_file() else b""
        return Issue(str(path), roster_of_edition(edition), edition, diagram, pdf)
    timetable, network = inspect(path, settings, progress=progress)
    return Issue(str(path), roster_of_network(network, stop_codes_of(timetable, network)))


def compare(before: Issue, after: Issue) -> ChangeSheet:
    """Tell what differs; the ids are those of the earlier where things are the same."""
    found = match_rosters(before.roster, after.roster)
    carried = carried_roster(after.roster, before.roster, found)
    matches = carried_matches(after.roster, before.roster, found)
    return roster_changes(before.roster, carried, matches)


def files_of_comparison(sheet: ChangeSheet, before: Issue, after: Issue) -> dict[str, bytes]:
    """Give the files of the change sheet by name, with pictures where both have been drawn."""
    sheets = None
    if before.edition and after.edition and before.diagram and after.diagram:
        sheets = Sheets(
            before.edition, before.diagram, after.edition, after.diagram, before.pdf, after.pdf
        )
    return {
        "changes.json": to_json(sheet),
        "changes.csv": to_csv(sheet),
        "changes.html": to_html(sheet, sheets),
        "changes.pdf": to_pdf(sheet, sheets),
    }
