"""The next service change: redraw an edition from a new feed, moving only what must move."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

from gtfs_schematic.clearances import clearances_of
from gtfs_schematic.config import Settings, settings_of, with_marks, with_values, with_wishes
from gtfs_schematic.drawing.sheet import candidate_frames
from gtfs_schematic.drift.measure import measure_edition
from gtfs_schematic.edition.adjustments import Adjustments, adjustments_of
from gtfs_schematic.edition.because import because
from gtfs_schematic.edition.change_list import to_pdf
from gtfs_schematic.edition.change_page import to_html
from gtfs_schematic.edition.change_pictures import Sheets
from gtfs_schematic.edition.changes import ChangeSheet, change_sheet, to_csv, to_json
from gtfs_schematic.edition.folder import Beside
from gtfs_schematic.edition.identity import Matches
from gtfs_schematic.edition.marking import marks_after
from gtfs_schematic.edition.model import Edition, EditionDrift
from gtfs_schematic.edition.ratchet import drifts_after
from gtfs_schematic.edition.succession import succeed
from gtfs_schematic.feed.model import Timetable
from gtfs_schematic.following import labelled_after
from gtfs_schematic.layout import check as layout_check
from gtfs_schematic.layout.keep import Standing
from gtfs_schematic.layout.model import SheetFrame
from gtfs_schematic.layout.revise import Revised, revise_layout
from gtfs_schematic.network.model import Network
from gtfs_schematic.pipeline import (
    Result,
    StrPath,
    completed,
    files_of,
    finish,
    inspect,
    labelled_anew,
    tell_adjusted,
)
from gtfs_schematic.progress import Progress, Silent

_MOST_OUTSIDE_MM = 15.0
"""What stands further outside its frame than this is laid out anew, not pushed in."""
_KEY_SHARES = (1.0, 0.95, 0.9, 0.85)
"""Shares of its type size that the key may take, if with more lines it leaves too little room."""
_MOST_FRAMES = 2


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
    marks = marks_after(before, told.beside.state, done, settings.drawing)
    wanted = with_marks(with_wishes(settings, wishes.by_room()), marks)
    revised, body_pt = _layout(before, network, wanted, progress)
    if body_pt < settings.drawing.body_size_pt:
        progress.note(f"the key holds all lines at {body_pt:g} points, on the same sheet")
        settings = with_values(settings, {"drawing.body_size_pt": body_pt}, "type of the key")
    if revised is None:
        progress.note("what is new finds no room beside what stands; laying out anew")
        labelled = labelled_anew(network, wanted, before.places, progress)
    else:
        labels = told.beside.state.drawn.labels if told.beside.state is not None else None
        labelled = labelled_after(revised.layout, wanted, before, labels, progress)
    result = finish(timetable, labelled, settings, progress, marks)
    result = completed(result, done.raw, (done.adjustments, wishes), progress)
    result = replace(result, edition=replace(result.edition, previous=told.beside.sha256))
    anew = revised is None
    result = replace(result, edition=_with_drifts(before, result, told, anew=anew))
    why = because(revised, network)
    sheet = change_sheet(before, result.edition, done.matches, moved=why)
    return Revision(result, done.matches, sheet, anew)


def files_of_revision(
    revision: Revision, before: Edition, diagram_before: bytes, pdf_before: bytes = b""
) -> dict[str, bytes]:
    """Give the files of the new edition and of its change sheet by name.

    Parameters
    ----------
    revision
        What was drawn.
    before
        The edition before.
    diagram_before, pdf_before
        Its diagram as SVG, and as PDF for the pictures of the printed sheet.
    """
    files = files_of(revision.result)
    sheets = Sheets(
        before,
        diagram_before,
        revision.result.edition,
        files["diagram.svg"],
        pdf_before,
        files["diagram.pdf"],
    )
    return files | {
        "changes.json": to_json(revision.sheet),
        "changes.csv": to_csv(revision.sheet),
        "changes.html": to_html(revision.sheet, sheets),
        "changes.pdf": to_pdf(revision.sheet, sheets),
    }


def _with_drifts(before: Edition, result: Result, told: Told, *, anew: bool) -> Edition:
    """Give the new edition with its drift after that of the editions before."""
    if before.drifts:
        residual = before.drifts[-1].residual
    elif told.beside.state is not None:
        residual = told.beside.state.drift.north_up.residual
    else:
        residual = measure_edition(before, result.settings.drift).north_up.residual
    was = EditionDrift(told.beside.sha256, before.feed.service_date, round(residual, 6))
    now = round(result.drift.north_up.residual, 6)
    this = EditionDrift("", result.edition.feed.service_date, now)
    return replace(result.edition, drifts=drifts_after(before, was, this, anew=anew))


def _layout(
    before: Edition, network: Network, settings: Settings, progress: Progress
) -> tuple[Revised | None, float]:
    """Lay the network out beside what stands, on the same sheet; None if there is no room.

    Also gives the type size of the key with which there is.
    """
    positions = before.places
    paths = {link.id: link.path_mm for link in before.drawn}
    paths |= {walk.id: walk.path_mm for walk in before.walks}
    clearances = clearances_of(network, settings.bundles, settings.labels)
    for body_pt, frame in _frames(before, network, settings)[:_MOST_FRAMES]:
        turn, angles = before.rotation_deg, settings.layout.angles
        standing = Standing(positions, paths, frame, rotation_deg=turn, angles=angles)
        pins = settings.layout.pins
        found = revise_layout(
            network,
            standing,
            clearances,
            pins=pins,
            even=settings.revision.relax,
            progress=progress,
        )
        if found is not None and layout_check.drifted_too_far(found.layout, settings.layout):
            progress.note("stations would drift beyond their limits")
            break
        if found is not None:
            return found, body_pt
    return None, settings.drawing.body_size_pt


def _frames(
    before: Edition, network: Network, settings: Settings
) -> list[tuple[float, SheetFrame]]:
    """Frames of the edition's sheet, each with the type size of the key that leaves it.

    First those from which nothing of what stands sticks out, the largest type before; then those
    from which least does.
    """
    size = f"{before.width_mm:g}x{before.height_mm:g}"
    sheet = settings.sheet.model_copy(update={"size": size, "orientation": "auto"})
    x = [x for link in before.links for x, _ in link.path_mm]
    y = [y for link in before.links for _, y in link.path_mm]
    found: list[tuple[float, float, int, SheetFrame]] = []
    for share in _KEY_SHARES:
        body_pt = round(settings.drawing.body_size_pt * share, 2)
        drawing = settings.drawing.model_copy(update={"body_size_pt": body_pt})
        for frame in candidate_frames(network, sheet, drawing):
            beside = (frame.left_mm - min(x), max(x) - frame.right_mm)
            over = (frame.top_mm - min(y), max(y) - frame.bottom_mm)
            outside = round(max(0.0, *beside, *over), 1)
            if outside <= _MOST_OUTSIDE_MM:
                found.append((outside, -body_pt, len(found), frame))
    return [(-size, frame) for _, size, _, frame in sorted(found, key=lambda each: each[:3])]
