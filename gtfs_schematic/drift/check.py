"""Fault a drift report by measuring again with other means than the work does."""

from __future__ import annotations

import math

from gtfs_schematic.drift.model import DriftReport


def faults(report: DriftReport) -> tuple[str, ...]:
    """List what contradicts itself in a report; empty if nothing does."""
    found = []
    for name, fit in (("north-up", report.north_up), ("free", report.free)):
        if not (0.0 <= fit.residual <= 1.0 and math.isfinite(fit.scale_mm_per_km)):
            found.append(f"drift: the {name} fit has residual {fit.residual}")
    # The free fit has one more degree of freedom, so it can only be better.
    if report.free.residual > report.north_up.residual + 1e-9:
        found.append("drift: the free fit is worse than the north-up fit")
    for station in report.stations:
        (u, v), (x, y) = station.drawn_mm, station.true_mm
        scale = report.north_up.scale_mm_per_km / 1000.0
        if scale and abs(math.hypot(u - x, v - y) / scale - station.displacement_m) > 0.01:
            found.append(f"drift: station {station.station_id}: the arrow is not the displacement")
    ratios = sorted(link.length_ratio for link in report.links if link.length_ratio is not None)
    middle = ratios[(len(ratios) - 1) // 2 : len(ratios) // 2 + 1]
    if middle and abs(sum(middle) / len(middle) - 1.0) > 1e-6:
        found.append("drift: the median length ratio is not 1")
    return tuple(found)
