"""Asks the layout for room round the stations whose names found no place."""

from __future__ import annotations

from gtfs_schematic.geometry import polyline_length
from gtfs_schematic.labels.blocks import type_size_mm
from gtfs_schematic.labels.breaks import break_name
from gtfs_schematic.labels.fonts import text_width_mm
from gtfs_schematic.labels.model import LabelledLayout, LabelSettings
from gtfs_schematic.layout.model import RoomRequest
from gtfs_schematic.network.model import Station

_GROWTH = 1.6
"""Length asked for in present lengths: a step, since the layout is asked again if need be."""
_MOST_MM = 60.0


def room_requests(labelled: LabelledLayout) -> tuple[RoomRequest, ...]:
    """Give a request for every station without a label, sorted by station id.

    The length is an estimate (common practice, no source): 1.6 times what the shortest link has
    now, and at least what half of the name on two rows takes beside the marker.
    """
    layout = labelled.bundled.layout
    requests = []
    for station_id in sorted(labelled.unplaced):
        lengths = [
            polyline_length(layout.paths[link.id])
            for link in layout.network.links
            if station_id in (link.start, link.end)
        ]
        half = _half_width(layout.network.station[station_id], labelled.settings)
        length = max(_GROWTH * min(lengths, default=0.0), half)
        requests.append(RoomRequest(station_id, min(length, _MOST_MM)))
    return tuple(requests)


def _half_width(station: Station, settings: LabelSettings) -> float:
    """Give half the width of a name on up to two rows, with marker and clearances."""
    bold = station.kind != "stop"
    name = station.name.strip() or station.id
    rows = break_name(name, 2) or (name,)
    size = type_size_mm(settings, bold=bold)
    width = max(text_width_mm(row, size, bold=bold) for row in rows)
    radius = settings.interchange_radius_mm if bold else settings.marker_radius_mm
    return width / 2.0 + radius + 2.0 * settings.clearance_mm
