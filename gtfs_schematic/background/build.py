"""The whole way of a background: read it, carry it, and leave out what the check faults."""

from __future__ import annotations

from gtfs_schematic.background.carry import carry
from gtfs_schematic.background.check import without_faulty
from gtfs_schematic.background.model import Background, BackgroundSettings
from gtfs_schematic.background.read import read_background
from gtfs_schematic.labels.model import LabelledLayout


def lay_background(labelled: LabelledLayout, settings: BackgroundSettings) -> Background:
    """Give all that is to lie beneath a labelled network.

    Raises
    ------
    UsageError
        If a file cannot be read or is no GeoJSON.
    """
    carried = carry(labelled, read_background(settings), settings)
    return without_faulty(carried, labelled.bundled.layout)
