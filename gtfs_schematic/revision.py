"""The next service change: redraw an edition from a new feed, moving only what must move."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

from gtfs_schematic.config import Settings, settings_of, with_wishes
from gtfs_schematic.drawing.sheet import candidate_frames
from gtfs_schematic.edition.adjustments import Adjustments, adjustments_of
from gtfs_schematic.edition.change_list import to_pdf
from gtfs_schematic.edition.change_page import to_html
from gtfs_schematic.edition.change_pictures import Sheets
from gtfs_schematic.edition.changes import ChangeSheet, change_sheet, to_csv, to_json
from gtfs_schematic.edition.folder import Beside
from gtfs_schematic.edition.identity import Matches
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.edition.succession import succeed
from gtfs_schematic.feed.model import Timetable
from gtfs_schematic.layout.keep import Standing
from gtfs_schematic.layout.model import SheetFrame
from gtfs_schematic.layout.revise import Revised, revise_layout
from gtfs_schematic.network.model import Network
from gtfs_schematic.pipeline import (
    Result,
    StrPath,
    clearances_of,
    completed,
    files_of,
    finish,
    inspect,
    labelled_from,
    tell_adjusted,
)
from gtfs_schematic.progress import Progress, Silent

_MOST_OUTSIDE_MM = 15.0
"""What stands further outside its frame than this is laid out anew, not pushed in."""


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
    beside: Beside = Beside(),  # noqa: B008 - it has no state of its own
    adjustments: Adjustments | None = None,
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
    beside
        What its folder says of the earlier edition (`folder.load_beside`).
    adjustments
        What a person overrides, by ids of the edition; None for what holds in it.
    progress
        Who listens to what is going on.

    Raises
    ------
    SchematicError
        If the feed cannot be used, or the layout cannot meet what was asked.
    """
    settings = settings or settings_of(before.settings, "settings of the edition")
    read = inspect(paths, settings, progress=progress)
    told = Told(settings, adjustments, beside)
    return revise_network(before, read, told, progress=progress)


@dataclass(frozen=True, slots=True)
class Told:
    """What a revision is told beside edition and feed; see `revise`."""

    settings: Settings
    adjustments: Adjustments | None = None
    beside: Beside = field(default_factory=Beside)


def revise_network(
    before: Edition,
    read: tuple[Timetable, Network],
    told: Told,
    *,
    progress: Progress = Silent(),  # noqa: B008 - it has no state
) -> Revision:
    """Draw a timetable and its network as the edition after another, as `revise` does."""
    timetable, settings = read[0], told.settings
    adjustments = told.adjustments
    if adjustments is None:
        adjustments = adjustments_of(before.adjustments, "adjustments of the edition")
    done = succeed(before, told.beside.state, read, adjustments)
    network, wishes = done.adjusted.network, done.adjusted.wishes
    tell_adjusted(done.adjusted, progress)
    wanted = with_wishes(settings, wishes.by_room())
    revised = _layout(before, network, wanted, progress)
    if revised is None:
        progress.note("what is new finds no room beside what stands; laying out anew")
    layout = None if revised is None else revised.layout
    labelled = labelled_from(layout, network, wanted, _sides(before), progress)
    result = finish(timetable, labelled, settings, progress)
    result = completed(result, done.raw, (done.adjustments, wishes), progress)
    result = replace(result, edition=replace(result.edition, previous=told.beside.sha256))
    sheet = change_sheet(before, result.edition, done.matches)
    return Revision(result, done.matches, sheet, layout is None)


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
) -> Revised | None:
    """Lay the network out beside what stands, on the same sheet; None if there is no room."""
    positions = before.places
    paths = {link.id: link.path_mm for link in before.drawn}
    paths |= {walk.id: walk.path_mm for walk in before.walks}
    clearances = clearances_of(network, settings.bundles, settings.labels)
    for frame in _frames(before, network, settings):
        standing = Standing(positions, paths, frame, rotation_deg=before.rotation_deg)
        pins = settings.layout.pins
        found = revise_layout(network, standing, clearances, pins=pins, progress=progress)
        if found is not None:
            return found
    return None


def _frames(before: Edition, network: Network, settings: Settings) -> list[SheetFrame]:
    """Frames of the edition's sheet, that first from which what stands sticks out least."""
    size = f"{before.width_mm:g}x{before.height_mm:g}"
    sheet = settings.sheet.model_copy(update={"size": size, "orientation": "auto"})
    x = [x for link in before.links for x, _ in link.path_mm]
    y = [y for link in before.links for _, y in link.path_mm]

    def outside(frame: SheetFrame) -> float:
        beside = (frame.left_mm - min(x), max(x) - frame.right_mm)
        over = (frame.top_mm - min(y), max(y) - frame.bottom_mm)
        return round(max(0.0, *beside, *over), 1)

    frames = candidate_frames(network, sheet, settings.drawing)
    return sorted((f for f in frames if outside(f) <= _MOST_OUTSIDE_MM), key=outside)


def _sides(before: Edition) -> dict[str, str]:
    return {s.id: s.label_side for s in before.stations if s.label_side}
