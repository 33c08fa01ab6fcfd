"""The plain numbers by which the layout knows what will be drawn."""

from __future__ import annotations

from gtfs_schematic.bundles.model import BundleSettings
from gtfs_schematic.labels.fonts import text_width_mm
from gtfs_schematic.labels.model import LabelSettings
from gtfs_schematic.layout.model import Clearances
from gtfs_schematic.network.model import Network

MM_PER_PT = 25.4 / 72.0


def clearances_of(network: Network, bundles: BundleSettings, labels: LabelSettings) -> Clearances:
    """Give the plain numbers by which the layout knows what will be drawn.

    Neighbouring stations keep so far apart that a name fits between their names on one side, and
    that two large markers do not touch.
    """
    height = labels.size_pt * labels.leading * MM_PER_PT
    large = 2.0 * labels.interchange_radius_mm
    widths = {}
    for station in network.stations:
        plain = station.kind == "stop"
        size = (labels.size_pt if plain else labels.interchange_size_pt) * MM_PER_PT
        widths[station.id] = text_width_mm(station.name, size, bold=not plain)
    return Clearances(
        line_width_mm=bundles.line_width_mm,
        line_gap_mm=bundles.line_gap_mm,
        marker_mm=2.0 * labels.marker_radius_mm,
        label_height_mm=height,
        spacing_mm=max(height + 2.0 * labels.clearance_mm, large + bundles.line_width_mm),
        label_width_mm=widths,
    )
