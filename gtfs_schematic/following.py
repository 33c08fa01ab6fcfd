"""Bundle and label a layout that follows an edition: orders and names stay as they were."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from gtfs_schematic.bundles import check as bundles_check
from gtfs_schematic.bundles.build import bundle
from gtfs_schematic.bundles.model import BundledLayout
from gtfs_schematic.config import Settings
from gtfs_schematic.edition.model import Edition, EditionStation
from gtfs_schematic.errors import must_be_sound
from gtfs_schematic.geometry import Point
from gtfs_schematic.labels import check as labels_check
from gtfs_schematic.labels.beside import place_beside
from gtfs_schematic.labels.model import Label, LabelledLayout, LabelSettings
from gtfs_schematic.labels.place import place_labels
from gtfs_schematic.layout.model import Layout
from gtfs_schematic.network.model import Network
from gtfs_schematic.progress import Progress


def labelled_after(
    layout: Layout,
    settings: Settings,
    before: Edition,
    labels: Mapping[str, Label] | None,
    progress: Progress,
) -> LabelledLayout:
    """Bundle and label a layout after an edition.

    Lines of a link keep their order wherever that costs no crossing. A name stays where it was,
    or goes with its station, if it is free there and the same lines call; others find a place
    beside, on their side of before if they can.

    Parameters
    ----------
    layout
        A revised layout.
    settings
        What each room is told.
    before
        The edition, by whose ids the layout's stations and lines go.
    labels
        Names as the edition had them; None: only their sides are known.
    progress
        Who listens.
    """
    bundled = bundle(
        layout, settings.bundles, previous=orders_of(before, layout.network), progress=progress
    )
    must_be_sound("bundles", bundles_check.faults(bundled))
    sides = {
        s.id: s.label_side for s in before.stations if s.label_side and s.id in layout.positions
    }
    asked = LabelSettings.model_validate(
        settings.labels.model_dump() | {"sides": sides | settings.labels.sides}
    )
    if labels is None:
        labelled = _fallen(bundled, settings.labels, asked, progress)
    else:
        progress.phase("placing names")
        labelled = place_beside(bundled, asked, carried(labels, before, layout))
        if labelled.unplaced:
            anew = place_labels(bundled, asked, progress=progress)
            labelled = min(labelled, anew, key=lambda found: len(found.unplaced))
    labelled = replace(labelled, settings=settings.labels)
    must_be_sound("labels", labels_check.faults(labelled))
    return labelled


def orders_of(before: Edition, network: Network) -> dict[str, tuple[str, ...]]:
    """Give the order that lines had in each link of a network, left to right from its start."""
    old = {(k.start, k.end): k.lines for k in before.drawn}
    old |= {(k.end, k.start): k.lines[::-1] for k in before.drawn}
    return {k.id: old[k.start, k.end] for k in network.links if (k.start, k.end) in old}


def carried(labels: Mapping[str, Label], before: Edition, layout: Layout) -> dict[str, Label]:
    """Give the labels of stations at which the same lines call, moved with them."""
    network = layout.network
    found = {}
    for station in before.stations:
        here = layout.positions.get(station.id)
        if here is None or station.id not in labels or not _alike(station, network):
            continue
        dx, dy = here[0] - station.x_mm, here[1] - station.y_mm
        found[station.id] = shifted(labels[station.id], (dx, dy))
    return found


def _alike(station: EditionStation, network: Network) -> bool:
    now = network.station[station.id]
    return len(now.lines) == len(station.lines) and now.kind == station.kind


def shifted(label: Label, by: Point) -> Label:
    """Give a label moved on the sheet, millimetres."""
    dx, dy = by
    if (dx, dy) == (0.0, 0.0):
        return label

    def point(at: Point) -> Point:
        return at[0] + dx, at[1] + dy

    return replace(
        label,
        pivot_mm=point(label.pivot_mm),
        lines=tuple(replace(r, x_mm=r.x_mm + dx, y_mm=r.y_mm + dy) for r in label.lines),
        outline_mm=tuple(map(point, label.outline_mm)),
        badges=tuple(
            replace(
                b,
                x_mm=b.x_mm + dx,
                y_mm=b.y_mm + dy,
                text_x_mm=b.text_x_mm + dx,
                text_y_mm=b.text_y_mm + dy,
            )
            for b in label.badges
        ),
    )


def _fallen(
    bundled: BundledLayout, plain: LabelSettings, asked: LabelSettings, progress: Progress
) -> LabelledLayout:
    """Place names anew: without any wish they fall as they did if nothing near them changed."""
    labelled = place_labels(bundled, plain, progress=progress)
    kept = {key: side for key, side in asked.sides.items() if key in labelled.labels}
    if {key: labelled.labels[key].side for key in kept} != kept:
        labelled = place_labels(bundled, asked, progress=progress)
    return labelled
