"""Redraw an edition without its feed, after a person adjusted it: only what that touches."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from gtfs_schematic.background.model import Background
from gtfs_schematic.config import Settings, settings_of, with_marks, with_wishes
from gtfs_schematic.drawing import check as drawing_check
from gtfs_schematic.drawing.compose import compose
from gtfs_schematic.drawing.listing import to_text
from gtfs_schematic.drawing.marks import unshown, with_room
from gtfs_schematic.drawing.model import Drawing
from gtfs_schematic.drawing.pdf import to_pdf
from gtfs_schematic.drawing.svg import to_svg
from gtfs_schematic.drawing.words import sheet_title
from gtfs_schematic.drift.limits import judge, limits_of
from gtfs_schematic.drift.model import DriftReport
from gtfs_schematic.drift.page import to_html
from gtfs_schematic.drift.report import to_csv
from gtfs_schematic.drift.report import to_json as drift_to_json
from gtfs_schematic.drift.timing import Timing, timing_of
from gtfs_schematic.edition import check as edition_check
from gtfs_schematic.edition.adjusted import Adjusted, adjusted
from gtfs_schematic.edition.adjustments import Adjustments, adjustments_of, plain
from gtfs_schematic.edition.make import edition_of, sentence, stop_codes_of
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.edition.save import to_json as edition_to_json
from gtfs_schematic.edition.state import State, digest, drawn_of, labelled_of, layout_of
from gtfs_schematic.edition.state import to_json as state_to_json
from gtfs_schematic.edition.unmet import unmet
from gtfs_schematic.errors import must_be_sound
from gtfs_schematic.feed.model import Finding
from gtfs_schematic.labels.model import LabelledLayout
from gtfs_schematic.lazily import lazily
from gtfs_schematic.network import check as network_check
from gtfs_schematic.network.model import Network
from gtfs_schematic.progress import Progress, Silent

if TYPE_CHECKING:
    from gtfs_schematic import replacing
    from gtfs_schematic.background import build as backdrop
    from gtfs_schematic.drawing import png
    from gtfs_schematic.drift import measure
else:
    # What most adjustments do not need is loaded when it is.
    replacing = lazily("gtfs_schematic.replacing")
    backdrop = lazily("gtfs_schematic.background.build")
    measure = lazily("gtfs_schematic.drift.measure")
    png = lazily("gtfs_schematic.drawing.png")


@dataclass(frozen=True, slots=True)
class Redrawn:
    """An edition after an adjustment."""

    edition: Edition
    settings: Settings
    drawing: Drawing
    labelled: LabelledLayout
    drift: DriftReport
    state: bytes
    moved: tuple[str, ...]
    """Ids of the stations that stand elsewhere on the sheet now."""
    renamed: tuple[str, ...]
    """Ids of the stations whose names stand elsewhere, or say something else."""
    unmet: tuple[Finding, ...]
    stale: tuple[str, ...]

    def revising(self, sha256: str) -> Redrawn:
        """Give it as an edition of its own, that revises the one with this hash."""
        return replace(self, edition=replace(self.edition, previous=sha256))

    @property
    def network(self) -> Network:
        """The network that is drawn."""
        return self.labelled.bundled.layout.network


def adjust_edition(
    before: Edition,
    state: State,
    adjustments: Adjustments,
    *,
    progress: Progress = Silent(),  # noqa: B008 - it has no state
) -> Redrawn:
    """Redraw an edition under other adjustments.

    What an adjustment does not touch stays: lines keep their courses where no station moves, and
    names their places where nothing comes near.

    Parameters
    ----------
    before
        The edition.
    state
        What is kept beside it.
    adjustments
        All that hold from now on, in place of those of the edition.
    progress
        Who listens to what is going on.

    Raises
    ------
    UsageError
        If two adjustments contradict each other; names both.
    LayoutError
        If the drawing that stands has no room for what is asked.
    """
    settings = settings_of(before.settings, "settings of the edition")
    old = adjusted(
        state.network, adjustments_of(before.adjustments, "the edition"), state.timetable
    )
    new = adjusted(state.network, adjustments, state.timetable)
    marked = with_marks(settings, state.marks).drawing
    must_be_sound("adjustments", network_check.faults(new.network))
    same = _shape(old.network) == _shape(new.network)
    labelled = _labelled(before, state, (old, new), settings, progress)

    progress.phase("composing the sheet")
    background = Background()
    if settings.background.files:
        background = backdrop.lay_background(labelled, settings.background)
    shown = with_room(state.marks, labelled)
    drawing = compose(labelled, marked, background, shown.closed)
    found = drawing_check.faults(
        drawing, new.network, unnamed=labelled.unplaced, said_as=labelled.abbreviated
    )
    must_be_sound("drawing", found)
    missed = unmet(new.wishes, labelled)
    edition = _edition(before, state, labelled, settings, same=same)
    edition = replace(
        edition,
        adjustments=plain(adjustments),
        findings=(
            *edition.findings,
            *unshown(state.marks, shown, labelled.labels),
            *map(sentence, missed),
        ),
    )
    must_be_sound("edition", edition_check.faults(edition))
    drift = _drift(before, edition, state, settings)
    if before.drifts:
        last = replace(before.drifts[-1], residual=round(drift.north_up.residual, 6))
        edition = replace(edition, drifts=(*before.drifts[:-1], last))
    data = state_to_json(replace(state, drawn=drawn_of(labelled), drift=drift))
    return Redrawn(
        replace(edition, state_sha256=digest(data)), settings, drawing, labelled, drift, data,
        _elsewhere(before, edition), _renamed(state, labelled), missed, new.stale,
    )  # fmt: skip


def files_of_redrawn(redrawn: Redrawn) -> dict[str, bytes]:
    """Give the files of the edition by name, as `pipeline.files_of` does."""
    settings, edition, drift = redrawn.settings, redrawn.edition, redrawn.drift
    judged = judge(drift, limits_of(settings.drift))
    dpi = settings.sheet.png_dpi
    image = {"diagram.png": png.to_png(redrawn.drawing, dpi=dpi)} if dpi else {}
    return image | {
        "diagram.svg": to_svg(redrawn.drawing),
        "diagram.pdf": to_pdf(redrawn.drawing, bleed_mm=settings.sheet.bleed_mm),
        "diagram.txt": to_text(redrawn.network, settings.drawing),
        "edition.json": edition_to_json(edition),
        "state.json": redrawn.state,
        "drift.json": drift_to_json(drift, judged),
        "drift.csv": to_csv(drift),
        "drift.html": to_html(drift, edition, title=edition.title, limits=judged),
    }


def _shape(network: Network) -> tuple[object, ...]:
    """Give what of a network its drawing depends on, beside names and colors."""
    return (
        tuple((s.id, s.kind, s.lines, s.lon, s.lat) for s in network.stations),
        network.links,
        network.walks,
        tuple((k.id, k.courses) for k in network.lines),
    )


def _labelled(
    before: Edition,
    state: State,
    steps: tuple[Adjusted, Adjusted],
    settings: Settings,
    progress: Progress,
) -> LabelledLayout:
    """Redraw places, bundles and names as far as they are touched."""
    old, new = steps
    wanted = with_marks(with_wishes(settings, new.wishes.by_room()), state.marks)
    same = _shape(old.network) == _shape(new.network)
    layout = layout_of(before, state.drawn, new.network)
    rooms = [each.wishes.by_room() for each in steps]
    moving = not same or rooms[0]["layout"] != rooms[1]["layout"]
    if moving:
        layout = replacing.replaced(layout, (old.network, new), wanted, progress)
    standing = labelled_of(layout, state.drawn, wanted.bundles, wanted.labels)
    if moving or rooms[0]["bundles"] != rooms[1]["bundles"]:
        progress.phase("ordering lines")
        standing = replacing.rebundled(standing, state.drawn.orders)
    if (
        moving
        or standing.bundled.stretches != state.drawn.stretches
        or rooms[0]["labels"] != rooms[1]["labels"]
        or _words(old.network) != _words(new.network)
    ):
        progress.phase("placing names")
        drawn_anew = standing.bundled.stretches != state.drawn.stretches
        freed = _reworded(rooms[0]["labels"], rooms[1]["labels"])
        standing = replacing.relabelled(standing, before, freed, badges_anew=drawn_anew)
    return standing


def _reworded(
    old: Mapping[str, Mapping[str, object]], new: Mapping[str, Mapping[str, object]]
) -> set[str]:
    """Give the stations about whose labels a person now says something else, or nothing."""
    return {
        key
        for name in old
        for key in {*old[name], *new[name]}
        if old[name].get(key) != new[name].get(key)
    }


def _words(network: Network) -> tuple[object, ...]:
    """Give what labels say."""
    stations = tuple((s.id, s.name, s.second_name, s.kind) for s in network.stations)
    return stations, tuple((k.id, k.name) for k in network.lines)


def _edition(
    before: Edition, state: State, labelled: LabelledLayout, settings: Settings, *, same: bool
) -> Edition:
    """Make the edition; where lines call as they did, they are timed as they were."""
    network = labelled.bundled.layout.network
    if same:
        changes = {s.id: s.change_s for s in before.stations if s.change_s is not None}
        timing = Timing(before.patterns, changes)
    else:
        timing = timing_of(state.timetable, network)
    codes = stop_codes_of(state.timetable, network)
    edition = edition_of(labelled, sheet_title(network, settings.drawing), timing, codes)
    return replace(edition, settings=before.settings, previous=before.previous)


def _drift(before: Edition, edition: Edition, state: State, settings: Settings) -> DriftReport:
    """Measure the drift, unless nothing moved: then only names are others."""

    def measured(each: Edition) -> tuple[object, ...]:
        stations = [(s.id, s.x_mm, s.y_mm, s.lon, s.lat, s.stop_ids) for s in each.stations]
        lines = [(k.id, k.itineraries) for k in each.lines]
        return stations, each.links, each.walks, each.patterns, lines

    if measured(before) != measured(edition):
        return measure.measure_edition(edition, settings.drift)
    names = {s.id: s.name for s in edition.stations}
    stations = tuple(replace(s, name=names[s.station_id]) for s in state.drift.stations)
    return replace(state.drift, stations=stations, settings=settings.drift)


def _elsewhere(before: Edition, after: Edition) -> tuple[str, ...]:
    old = {s.id: (s.x_mm, s.y_mm) for s in before.stations}
    return tuple(s.id for s in after.stations if s.id in old and old[s.id] != (s.x_mm, s.y_mm))


def _renamed(state: State, labelled: LabelledLayout) -> tuple[str, ...]:
    old: Mapping[str, object] = state.drawn.labels
    return tuple(key for key, label in labelled.labels.items() if old.get(key) != label)
