"""Compose the scene: the network in its frame, and title, key and notes round it."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace

from gtfs_schematic.background.model import Background
from gtfs_schematic.drawing.backdrop import backdrop_groups
from gtfs_schematic.drawing.furniture import key_group, notes_group, title_group
from gtfs_schematic.drawing.lines import line_groups, name_groups, walk_groups
from gtfs_schematic.drawing.marks import ClosedStation, closed_groups
from gtfs_schematic.drawing.model import Drawing, DrawingSettings, Group
from gtfs_schematic.drawing.north import north_groups
from gtfs_schematic.drawing.page import Page, plan_of_frame
from gtfs_schematic.drawing.register import grid_group, reference, register_group
from gtfs_schematic.drawing.stations import marker_look, station_groups
from gtfs_schematic.drawing.style import line_styles
from gtfs_schematic.drawing.words import description, sheet_title
from gtfs_schematic.labels.model import LabelledLayout
from gtfs_schematic.layout.model import Layout, SheetFrame


def compose(
    labelled: LabelledLayout,
    settings: DrawingSettings,
    background: Background | None = None,
    closed: Sequence[ClosedStation] = (),
) -> Drawing:
    """Give the whole sheet as a scene, sheet millimetres, y down.

    Parameters
    ----------
    labelled
        The network placed, its lines in order, its names placed; its sheet frame must be one that
        `candidate_frames` gave for the same network and settings.
    settings
        Colours and words.
    background
        What lies beneath the network.
    closed
        Stations that are struck through where they stood.
    """
    bundled = labelled.bundled
    layout = bundled.layout
    network = layout.network
    styles = line_styles(network, settings)
    page = plan_of_frame(network, settings, layout.sheet)
    return Drawing(
        width_mm=layout.sheet.width_mm,
        height_mm=layout.sheet.height_mm,
        title=sheet_title(network, settings),
        description=description(network),
        lang="en",
        background=settings.background,
        groups=(
            title_group(page, settings),
            *north_groups(page, layout.rotation_deg, settings),
            *_backdrop(background, layout.sheet, settings),
            *_grid(page, settings),
            Group("walks", tuple(walk_groups(layout, settings))),
            Group("lines", _remarked(line_groups(labelled, styles, settings.background), settings)),
            Group("line-names", tuple(name_groups(labelled, styles, settings.background))),
            *_closed(closed, labelled, settings),
            Group("stations", tuple(station_groups(labelled, styles, settings))),
            key_group(page, network, settings, marker_look(labelled, settings)),
            *_register(page, layout, settings),
            notes_group(page, settings),
        ),
    )


def _remarked(lines: Iterable[Group], settings: DrawingSettings) -> tuple[Group, ...]:
    """Add what the key remarks of lines to their titles."""
    remarks = settings.line_remarks
    return tuple(
        replace(group, title=f"{group.title}, {remarks[group.data['line']]}")
        if group.css_class == "line" and group.data.get("line") in remarks
        else group
        for group in lines
    )


def _closed(
    closed: Sequence[ClosedStation], labelled: LabelledLayout, settings: DrawingSettings
) -> tuple[Group, ...]:
    """Give the closed stations if there are any."""
    if not closed:
        return ()
    radius = marker_look(labelled, settings).stop_radius
    return (Group("closed-stations", tuple(closed_groups(closed, radius, settings))),)


def _backdrop(
    background: Background | None, frame: SheetFrame, settings: DrawingSettings
) -> tuple[Group, ...]:
    """Give the background if there is one."""
    if background is None or not background.shapes:
        return ()
    return (Group("background", tuple(backdrop_groups(background, frame, settings))),)


def _grid(page: Page, settings: DrawingSettings) -> tuple[Group, ...]:
    """Give the grid if there is an index."""
    return (grid_group(page.frame, page.type, settings),) if page.register else ()


def _register(page: Page, layout: Layout, settings: DrawingSettings) -> tuple[Group, ...]:
    """Give the index if one is wanted."""
    if page.register is None:
        return ()
    places = {key: reference(at, page.frame, page.type) for key, at in layout.positions.items()}
    return (register_group(page.register, page.register_at, places, page.type, settings.ink),)
