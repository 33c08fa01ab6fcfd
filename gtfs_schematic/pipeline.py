"""The whole way from a feed to the files of an edition: the page to read first.

    feed -> network -> layout -> bundles -> labels -> drawing -> files
                                             |
                                             +-> edition -> drift

Each stage is a pure function from one frozen type to the next. Behind each stands its own check,
which shares no code with it: what a check faults never reaches a file.
"""

from __future__ import annotations

import os
from collections.abc import Mapping, Sequence
from dataclasses import replace
from pathlib import Path

from gtfs_schematic.background.build import lay_background
from gtfs_schematic.background.read import read_background
from gtfs_schematic.bundles import check as bundles_check
from gtfs_schematic.bundles.build import bundle
from gtfs_schematic.clearances import clearances_of
from gtfs_schematic.config import Settings, with_marks, with_wishes
from gtfs_schematic.drawing import check as drawing_check
from gtfs_schematic.drawing.compose import compose
from gtfs_schematic.drawing.marks import Marks, unshown, with_room
from gtfs_schematic.drawing.palette import recolored
from gtfs_schematic.drawing.sheet import candidate_frames
from gtfs_schematic.drawing.words import sheet_title
from gtfs_schematic.drift import check as drift_check
from gtfs_schematic.drift.measure import measure_edition
from gtfs_schematic.drift.timing import timing_of
from gtfs_schematic.edition import check as edition_check
from gtfs_schematic.edition.adjusted import Adjusted, adjusted
from gtfs_schematic.edition.adjustments import Adjustments, plain
from gtfs_schematic.edition.make import edition_of, sentence, stop_codes_of
from gtfs_schematic.edition.state import digest, state_of
from gtfs_schematic.edition.state import to_json as state_to_json
from gtfs_schematic.edition.unmet import unmet
from gtfs_schematic.edition.wishes import Wishes
from gtfs_schematic.errors import must_be_sound
from gtfs_schematic.feed import check as feed_check
from gtfs_schematic.feed.model import Timetable
from gtfs_schematic.feed.read import read_feed
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels import check as labels_check
from gtfs_schematic.labels.model import LabelledLayout
from gtfs_schematic.labels.place import place_labels
from gtfs_schematic.labels.room import name_rooms
from gtfs_schematic.layout import check as layout_check
from gtfs_schematic.layout.engine import Placement, fit, place
from gtfs_schematic.layout.model import Layout, NameRoom, SheetFrame
from gtfs_schematic.layout.refit import refit
from gtfs_schematic.network import check as network_check
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.model import Network
from gtfs_schematic.progress import Progress, Silent
from gtfs_schematic.result import Result, files_of

__all__ = ["Result", "clearances_of", "draw", "files_of", "inspect"]

ROUNDS = 3
"""How often the layout may be asked for more room before a larger sheet is tried."""

PLAIN = 2
"""In how many rounds names are set at their usual places alone, and ask for room if need be;
after these also further out, in more rows and smaller."""

LARGER_SHEETS = 1
"""How many larger sheets are tried before names are left without a place."""

StrPath = str | os.PathLike[str]


def draw(
    paths: StrPath | Sequence[StrPath],
    settings: Settings | None = None,
    *,
    adjustments: Adjustments | None = None,
    progress: Progress = Silent(),  # noqa: B008 - it has no state
) -> Result:
    """Draw feeds as one diagram.

    Parameters
    ----------
    paths
        Zip file or folder; several are drawn as one network.
    settings
        What each room is told; None for the defaults.
    adjustments
        What a person overrides.
    progress
        Who listens to what is going on.

    Raises
    ------
    SchematicError
        If the feed cannot be used, or the layout cannot meet what was asked.
    InternalFaultError
        If a stage's check faults its output: a defect of this program.
    """
    settings = settings or Settings()
    read_background(settings.background)  # what is wrong with it is told before the long work
    timetable, network = inspect(paths, settings, progress=progress)
    raw, wanted, wishes = network, settings, Wishes()
    if adjustments is not None:
        found = adjust(network, adjustments, timetable, progress)
        network, wishes = found.network, found.wishes
        wanted = with_wishes(settings, wishes.by_room())
    frames = candidate_frames(network, wanted.sheet, wanted.drawing)
    labelled = _labelled(network, wanted, frames, progress)

    result = finish(timetable, labelled, settings, progress)
    return completed(result, raw, (adjustments or Adjustments(), wishes), progress)


def completed(
    result: Result, raw: Network, said: tuple[Adjustments, Wishes], progress: Progress
) -> Result:
    """Let the edition hold its adjustments, and say which of them the drawing does not meet.

    Parameters
    ----------
    result
        What was drawn.
    raw
        Its network before any adjustment.
    said
        Adjustments, and the wishes that came of them.
    progress
        Who hears of what is not met.
    """
    adjustments, wishes = said
    missed = unmet(wishes, result.labelled)
    for each in missed:
        progress.note(sentence(each))
    kept = state_of(raw, result.timetable, result.labelled, result.drift)
    state = state_to_json(replace(kept, marks=result.marks))
    edition = replace(
        result.edition,
        adjustments=plain(adjustments),
        findings=(*result.edition.findings, *map(sentence, missed)),
        state_sha256=digest(state),
    )
    return replace(result, edition=edition, unmet=missed, state=state)


def adjust(
    network: Network, adjustments: Adjustments, timetable: Timetable, progress: Progress
) -> Adjusted:
    """Apply adjustments, check what comes of it, and say which of them apply to nothing."""
    found = adjusted(network, adjustments, timetable)
    tell_adjusted(found, progress)
    return found


def tell_adjusted(found: Adjusted, progress: Progress) -> None:
    """Check an adjusted network, and say which adjustments apply to nothing."""
    must_be_sound("adjustments", network_check.faults(found.network))
    for stale in found.stale:
        progress.note(f"an adjustment applies to nothing and is kept: {stale}")


def finish(
    timetable: Timetable,
    labelled: LabelledLayout,
    settings: Settings,
    progress: Progress,
    marks: Marks = Marks(),  # noqa: B008 - it is frozen
) -> Result:
    """Compose the sheet of a labelled layout, make its edition and measure the drift.

    Closed stations among the `marks` are struck through where there is still room.
    """
    shown = with_room(marks, labelled)
    bundled = labelled.bundled
    network = bundled.layout.network
    progress.phase("composing the sheet")
    background = lay_background(labelled, settings.background)
    marked = with_marks(settings, marks).drawing
    drawing = compose(labelled, marked, background, shown.closed)
    found = drawing_check.faults(
        drawing, network, unnamed=labelled.unplaced, said_as=labelled.abbreviated
    )
    must_be_sound("drawing", found)

    progress.phase("measuring the drift")
    timing = timing_of(timetable, network)
    codes = stop_codes_of(timetable, network)
    edition = replace(
        edition_of(labelled, sheet_title(network, settings.drawing), timing, codes),
        settings=settings.model_dump(mode="json", exclude_defaults=True),
    )
    for text in unshown(marks, shown, labelled.labels):
        progress.note(text)
        edition = replace(edition, findings=(*edition.findings, text))
    must_be_sound("edition", edition_check.faults(edition))
    drift = measure_edition(edition, settings.drift)
    must_be_sound("drift", drift_check.faults(drift))

    return Result(
        settings,
        timetable,
        network,
        bundled.layout,
        bundled,
        labelled,
        drawing,
        edition,
        drift,
        background=background,
        marks=marks,
    )


def inspect(
    paths: StrPath | Sequence[StrPath],
    settings: Settings | None = None,
    *,
    progress: Progress = Silent(),  # noqa: B008 - it has no state
) -> tuple[Timetable, Network]:
    """Read feeds and build the network that a diagram of them would show.

    Raises
    ------
    SchematicError
        If the feed cannot be used.
    """
    settings = settings or Settings()
    each = [paths] if isinstance(paths, str | os.PathLike) else paths
    timetable = read_feed([Path(path) for path in each], settings.feed, progress=progress)
    must_be_sound("feed", feed_check.faults(timetable))

    network = build_network(timetable, settings.network, progress=progress)
    must_be_sound("network", network_check.faults(network))
    return timetable, recolored(network, settings.drawing)


def _labelled(
    network: Network,
    settings: Settings,
    frames: tuple[SheetFrame, ...],
    progress: Progress,
    previous: Mapping[str, Point] | None = None,
) -> LabelledLayout:
    """Lay out, bundle and label; on a larger sheet where names find no place on a smaller."""
    placement = place(network, settings.layout, previous=previous, progress=progress)
    best = _labelled_on_sheet(placement, settings, frames, progress)
    for _ in range(LARGER_SHEETS):
        area = _area(best.bundled.layout.sheet)
        larger = tuple(frame for frame in frames if _area(frame) > area)
        if not best.unplaced or not larger:
            break
        progress.note(f"{_names(best)} found no place; trying a larger sheet")
        labelled = _labelled_on_sheet(placement, settings, larger, progress)
        best = min(best, labelled, key=_unplaced)
    return best


def labelled_anew(
    network: Network, settings: Settings, previous: Mapping[str, Point], progress: Progress
) -> LabelledLayout:
    """Lay out, bundle and label so that the drawing resembles one of before.

    `previous` are the places that it had, by station id, millimetres.
    """
    frames = candidate_frames(network, settings.sheet, settings.drawing)
    return _labelled(network, settings, frames, progress, previous)


def _labelled_on_sheet(
    placement: Placement, settings: Settings, frames: tuple[SheetFrame, ...], progress: Progress
) -> LabelledLayout:
    """Settle, bundle and label on the first sheet that holds the drawing.

    Again with room for all names where they stand or are to stand, until all have a place or the
    rounds are over.
    """
    clearances = clearances_of(placement.network, settings.bundles, settings.labels)

    def named(layout: Layout, *, widen: bool) -> LabelledLayout:
        wanted = settings.layout
        must_be_sound("layout", layout_check.faults(layout, clearances, wanted.pins, wanted))
        bundled = bundle(layout, settings.bundles, progress=progress)
        must_be_sound("bundles", bundles_check.faults(bundled))
        labelled = place_labels(bundled, settings.labels, widen=widen, progress=progress)
        must_be_sound("labels", labels_check.faults(labelled))
        return labelled

    fitted = fit(placement, clearances, frames, progress=progress)
    best = named(fitted.layout, widen=False)
    asked: tuple[NameRoom, ...] = ()
    for turn in range(1, 1 + ROUNDS):
        if not best.unplaced:
            break
        progress.note(f"{_names(best)} found no place; asking for more room")
        rooms = name_rooms(best, asked)
        asked += tuple(room for room in rooms if not room.stands)
        again = refit(fitted, rooms, progress=progress)
        labelled = named(again.layout, widen=turn >= PLAIN)
        if _unplaced(labelled) <= _unplaced(best):
            fitted, best = again, labelled
    return best


def _unplaced(labelled: LabelledLayout) -> int:
    return len(labelled.unplaced)


def _names(labelled: LabelledLayout) -> str:
    return f"{len(labelled.unplaced)} {'name' if len(labelled.unplaced) == 1 else 'names'}"


def _area(frame: SheetFrame) -> float:
    return frame.width_mm * frame.height_mm
