"""Settles a layout again on its sheet, with room for names beside their stations."""

from __future__ import annotations

import dataclasses

from gtfs_schematic.layout.engine import Fitted, on_paper
from gtfs_schematic.layout.filling import inner, settled
from gtfs_schematic.layout.fit import part_wants
from gtfs_schematic.layout.model import NameRoom
from gtfs_schematic.layout.restore import restore
from gtfs_schematic.layout.settle import NoRoomError
from gtfs_schematic.layout.snap import snap
from gtfs_schematic.progress import Progress, Silent


def refit(
    fitted: Fitted,
    names: tuple[NameRoom, ...],
    *,
    progress: Progress = Silent(),  # noqa: B008 - stateless
) -> Fitted:
    """Settle a layout again, with room for names.

    Parameters
    ----------
    fitted
        What `fit` or `refit` gave.
    names
        Where names stand or are to stand; given as far as the sheet and the other lengths allow.
    progress
        Told what is going on.

    Returns
    -------
    Fitted
        Its layout keeps every guarantee of `layout.check`.
    """
    progress.phase("settling lengths")
    layout, scale = fitted.layout, fitted.scale_mm
    asked = dataclasses.replace(fitted.sizes, names=names)
    try:
        skeleton, points, _ = settled(fitted.skeleton, asked, scale, inner(layout.sheet))
    except NoRoomError:
        return fitted  # by a hair: what stood on the sheet was rounded
    skeleton = dataclasses.replace(skeleton, points=points)
    pinned = frozenset(asked.pinned)
    places = on_paper(
        snap(skeleton, points, pinned, asked.relative), layout.sheet, centred=not pinned
    )
    wants = part_wants(skeleton.graph, asked)
    again = restore(layout.network, skeleton, places, layout.sheet, wants)
    moved = dataclasses.replace(
        layout,
        positions=again.positions,
        paths=again.paths,
        walk_paths=again.walk_paths,
        crossings=again.crossings,
    )
    return Fitted(moved, fitted.sizes, skeleton, scale)
