"""What is kept beside an edition so that it can be redrawn without its feed: `state.json`."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cache

from pydantic import TypeAdapter, ValidationError

from gtfs_schematic.bundles.forks import with_forks
from gtfs_schematic.bundles.model import (
    BundledLayout,
    BundleSettings,
    OrderQuality,
    StationSpan,
    Stretch,
)
from gtfs_schematic.drawing.marks import Marks
from gtfs_schematic.drift.model import DriftReport
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.errors import EditionError
from gtfs_schematic.feed.model import Pattern, Stop, Timetable, Transfer
from gtfs_schematic.labels.model import Label, LabelledLayout, LabelSettings, RunBadge
from gtfs_schematic.layout.model import Crossing, Layout, SheetFrame
from gtfs_schematic.network.model import Network

FORMAT = "gtfs-schematic/state"


@dataclass(frozen=True, slots=True)
class Drawn:
    """What of a labelled layout its edition does not say."""

    sheet: SheetFrame
    crossings: tuple[Crossing, ...]
    orders: Mapping[str, tuple[str, ...]]
    stretches: tuple[Stretch, ...]
    spans: Mapping[str, StationSpan]
    quality: OrderQuality
    labels: Mapping[str, Label]
    unplaced: tuple[str, ...]
    abbreviated: Mapping[str, str]
    run_badges: tuple[RunBadge, ...]


@dataclass(frozen=True, slots=True)
class State:
    """The network before any adjustment, with its timetable, and how it was drawn.

    Ids of stations and lines are those of the edition; those of stops and routes are the feed's.
    """

    network: Network
    stops: tuple[Stop, ...]
    patterns: tuple[Pattern, ...]
    transfers: tuple[Transfer, ...]
    operating_days: Mapping[str, tuple[int, ...]]
    """Per route id the weekdays on which it runs, sorted."""
    drawn: Drawn
    drift: DriftReport
    marks: Marks = field(default_factory=Marks)
    """What a revision marked on the sheet."""
    format: str = FORMAT
    version: int = 1

    @property
    def timetable(self) -> Timetable:
        """The timetable, as far as a network of it needs to be made anew: without shapes."""
        return Timetable(
            info=self.network.info,
            agencies=(),
            stops=self.stops,
            routes=(),
            patterns=self.patterns,
            transfers=self.transfers,
            operating_days={key: frozenset(days) for key, days in self.operating_days.items()},
        )


def state_of(
    network: Network, timetable: Timetable, labelled: LabelledLayout, drift: DriftReport
) -> State:
    """Gather the state of a drawing.

    Parameters
    ----------
    network
        Before any adjustment, with the ids of the edition.
    timetable
        What it was built from.
    labelled
        What was drawn.
    drift
        What was measured.
    """
    drawn = {station for s in network.stations for station in s.stop_ids}
    routes = {route for line in network.lines for route in line.route_ids}
    return State(
        network,
        tuple(stop for stop in timetable.stops if stop.id in drawn),
        tuple(pattern for pattern in timetable.patterns if pattern.route_id in routes),
        tuple(t for t in timetable.transfers if {t.from_stop_id, t.to_stop_id} <= drawn),
        {
            key: tuple(sorted(timetable.operating_days[key]))
            for key in sorted(timetable.operating_days)
        },
        drawn_of(labelled),
        drift,
    )


def drawn_of(labelled: LabelledLayout) -> Drawn:
    """Gather what of a labelled layout its edition does not say."""
    bundled = labelled.bundled
    return Drawn(
        bundled.layout.sheet, bundled.layout.crossings, bundled.orders, bundled.stretches,
        bundled.spans, bundled.quality, labelled.labels, labelled.unplaced,
        labelled.abbreviated, labelled.run_badges,
    )  # fmt: skip


def layout_of(edition: Edition, drawn: Drawn, network: Network) -> Layout:
    """Give the layout of an edition, for its own network."""
    return Layout(
        network,
        drawn.sheet,
        edition.places,
        {k.id: k.path_mm for k in edition.drawn},
        {w.id: w.path_mm for w in edition.walks},
        drawn.crossings,
        edition.rotation_deg,
        edition.angles,
    )


def labelled_of(
    layout: Layout, drawn: Drawn, bundles: BundleSettings, labels: LabelSettings
) -> LabelledLayout:
    """Give the labelled layout that was drawn, for `layout_of` its edition."""
    bundled = BundledLayout(
        layout, bundles, drawn.orders, drawn.stretches, drawn.spans, drawn.quality,
        with_forks(layout),
    )  # fmt: skip
    return LabelledLayout(
        bundled, labels, drawn.labels, drawn.unplaced, drawn.abbreviated,
        drawn.run_badges,
    )  # fmt: skip


def to_json(state: State) -> bytes:
    """Write a state: UTF-8, the same bytes for the same state."""
    return _adapter().dump_json(state) + b"\n"


def from_json(data: bytes, edition: Edition) -> State:
    """Read the state that belongs to an edition.

    Raises
    ------
    EditionError
        If it is none, or another edition's.
    """
    if edition.state_sha256 != digest(data):
        raise EditionError(
            "state.json: not the one that edition.json was written with. Was one of them "
            "edited or copied alone? Draw the edition again."
        )
    try:
        state = _adapter().validate_json(data)
    except ValidationError as error:
        first = error.errors()[0]
        place = ".".join(str(part) for part in first["loc"])
        raise EditionError(f"state.json: {place}: {first['msg']}. Draw it again.") from error
    if state.format != FORMAT or state.version != 1:
        raise EditionError(
            f"state.json: version {state.version!r}, but this program reads version 1. Update "
            "the program, or draw the edition again."
        )
    return state


def digest(data: bytes) -> str:
    """Give the SHA-256 by which an edition names its state."""
    return hashlib.sha256(data).hexdigest()


@cache
def _adapter() -> TypeAdapter[State]:
    return TypeAdapter(State)
