"""The next service change: redraw an edition from a new feed, moving only what must move."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from gtfs_schematic.config import Settings, settings_of
from gtfs_schematic.drawing.sheet import candidate_frames
from gtfs_schematic.edition.carry import carried_matches, with_carried_ids
from gtfs_schematic.edition.change_list import to_pdf
from gtfs_schematic.edition.change_page import to_html
from gtfs_schematic.edition.change_pictures import Sheets
from gtfs_schematic.edition.changes import ChangeSheet, change_sheet, to_csv, to_json
from gtfs_schematic.edition.identity import Matches, match_edition
from gtfs_schematic.edition.make import stop_codes_of
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.layout.model import Layout, SheetFrame
from gtfs_schematic.layout.revise import revise_layout
from gtfs_schematic.network.model import Network
from gtfs_schematic.pipeline import (
    Result,
    StrPath,
    clearances_of,
    files_of,
    finish,
    inspect,
    labelled_from,
)
from gtfs_schematic.progress import Progress, Silent


@dataclass(frozen=True, slots=True)
class Revision:
    """A new edition, and how it follows from the one before."""

    result: Result
    matches: Matches
    """By the ids of the new edition."""
    sheet: ChangeSheet
    anew: bool
    """Whether what is new found no room, so that the whole diagram was laid out anew."""


def revise(
    before: Edition,
    paths: StrPath | Sequence[StrPath],
    settings: Settings | None = None,
    *,
    sha256: str = "",
    progress: Progress = Silent(),  # noqa: B008 - it has no state
) -> Revision:
    """Draw feeds as the edition after another.

    Stations and lines that both have keep their ids, and everything that stands keeps its place;
    see `layout.revise`.

    Parameters
    ----------
    before
        The edition that is replaced.
    paths
        The new feed; several are drawn as one network.
    settings
        What each room is told; None for what the edition was drawn with.
    sha256
        Of the earlier edition's file, for the new one to name.
    progress
        Who listens to what is going on.

    Raises
    ------
    SchematicError
        If the feed cannot be used, or the layout cannot meet what was asked.
    """
    if settings is None:
        settings = settings_of(before.settings, "settings of the edition")
    timetable, network = inspect(paths, settings, progress=progress)
    found = match_edition(before, network, stop_codes_of(timetable, network))
    matches = carried_matches(network, before, found)
    network = with_carried_ids(network, before, found)
    layout = _layout(before, network, settings, progress)
    if layout is None:
        progress.note("what is new finds no room beside what stands; laying out anew")
    labelled = labelled_from(layout, network, settings, _sides(before), progress)
    result = finish(timetable, labelled, settings, progress)
    result = replace(result, edition=replace(result.edition, previous=sha256))
    sheet = change_sheet(before, result.edition, matches)
    return Revision(result, matches, sheet, layout is None)


def files_of_revision(
    revision: Revision, before: Edition, diagram_before: bytes
) -> dict[str, bytes]:
    """Give the files of the new edition and of its change sheet by name."""
    files = files_of(revision.result)
    sheets = Sheets(before, diagram_before, revision.result.edition, files["diagram.svg"])
    return files | {
        "changes.json": to_json(revision.sheet),
        "changes.csv": to_csv(revision.sheet),
        "changes.html": to_html(revision.sheet, sheets),
        "changes.pdf": to_pdf(revision.sheet),
    }


def _layout(
    before: Edition, network: Network, settings: Settings, progress: Progress
) -> Layout | None:
    """Lay the network out beside what stands, on the same sheet; None if there is no room."""
    positions = {s.id: (s.x_mm, s.y_mm) for s in before.stations}
    paths = {link.id: link.path_mm for link in before.links}
    paths |= {walk.id: walk.path_mm for walk in before.walks}
    clearances = clearances_of(network, settings.bundles, settings.labels)
    for frame in _frames(before, network, settings):
        layout = revise_layout(network, positions, paths, clearances, frame, progress=progress)
        if layout is not None:
            return layout
    return None


def _frames(before: Edition, network: Network, settings: Settings) -> list[SheetFrame]:
    """Frames of the edition's sheet in which everything that stands has its place."""
    size = f"{before.width_mm:g}x{before.height_mm:g}"
    sheet = settings.sheet.model_copy(update={"size": size, "orientation": "auto"})
    x = [x for link in before.links for x, _ in link.path_mm]
    y = [y for link in before.links for _, y in link.path_mm]
    return [
        frame
        for frame in candidate_frames(network, sheet, settings.drawing)
        if frame.left_mm <= min(x) + 0.01
        and max(x) - 0.01 <= frame.right_mm
        and frame.top_mm <= min(y) + 0.01
        and max(y) - 0.01 <= frame.bottom_mm
    ]


def _sides(before: Edition) -> dict[str, str]:
    return {s.id: s.label_side for s in before.stations if s.label_side}
