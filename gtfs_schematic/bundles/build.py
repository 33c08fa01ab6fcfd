"""Order the lines of a layout and draw each one's own course."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from gtfs_schematic.bundles.aside import asides
from gtfs_schematic.bundles.check import count_order
from gtfs_schematic.bundles.forks import with_forks, without_crossings
from gtfs_schematic.bundles.junction import junctions
from gtfs_schematic.bundles.model import BundledLayout, BundleSettings, OrderQuality
from gtfs_schematic.bundles.offset import draw_courses
from gtfs_schematic.bundles.order import order_lines
from gtfs_schematic.bundles.slots import Slots
from gtfs_schematic.bundles.spans import find_spans
from gtfs_schematic.layout.model import Layout
from gtfs_schematic.progress import Progress, Silent


def bundle(
    layout: Layout,
    settings: BundleSettings,
    *,
    previous: Mapping[str, Sequence[str]] | None = None,
    progress: Progress = Silent(),  # noqa: B008 - it has no state
) -> BundledLayout:
    """Give a layout with its lines ordered, offset, and rounded at corners.

    Parameters
    ----------
    layout
        An octilinear layout; sheet millimetres, y down.
    settings
        Width and gap of lines, radius of corners, millimetres.
    previous
        Per link id the order of lines in an earlier drawing, left to right: kept wherever that
        costs no crossing more.
    progress
        Who is told about the components that are ordered.
    """
    forked = with_forks(layout)
    found = order_lines(forked, settings.orders, previous, progress=progress)
    orders = without_crossings(layout, forked, found.orders)
    nodes = junctions(forked)
    moved = asides(forked, nodes, Slots(orders, settings))
    slots = Slots(orders, settings, moved)
    progress.phase("drawing lines side by side")
    stretches = draw_courses(forked, nodes, slots)
    crossings, separations = count_order(forked, orders)
    return BundledLayout(
        layout=layout,
        settings=settings,
        orders=orders,
        stretches=stretches,
        spans=find_spans(forked, nodes, slots, stretches),
        quality=OrderQuality(crossings, separations, found.crossings_bound),
        forked=forked,
        asides=moved,
    )
