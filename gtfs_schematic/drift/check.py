"""Fault a drift report by measuring again with other means than the work does."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator, Sequence

from gtfs_schematic.drift.model import DriftReport, Itinerary, Journeys

_ROUNDING = 1e-9


def faults(report: DriftReport) -> tuple[str, ...]:
    """List what contradicts itself in a report; empty if nothing does."""
    return (
        *_fits(report),
        *_stations(report),
        *_summary(report),
        *_pairs(report),
        *(_journeys(report.journeys) if report.journeys else ()),
    )


def _fits(report: DriftReport) -> Iterator[str]:
    for name, fit in (("north-up", report.north_up), ("free", report.free)):
        if not (0.0 <= fit.residual <= 1.0 and math.isfinite(fit.scale_mm_per_km)):
            yield f"drift: the {name} fit has residual {fit.residual}"
    # The free fit has one more degree of freedom, so it can only be better.
    if report.free.residual > report.north_up.residual + _ROUNDING:
        yield "drift: the free fit is worse than the north-up fit"


def _stations(report: DriftReport) -> Iterator[str]:
    for station in report.stations:
        (u, v), (x, y) = station.drawn_mm, station.true_mm
        scale = report.north_up.scale_mm_per_km / 1000.0
        if scale and abs(math.hypot(u - x, v - y) / scale - station.displacement_m) > 0.01:
            yield f"drift: station {station.station_id}: the arrow is not the displacement"
        if not (math.isfinite(station.local_scale) and abs(station.local_rotation_deg) <= 180.0):
            yield f"drift: station {station.station_id}: no local scale or turn"
    if not all(math.isfinite(value) for point in report.warp.drawn_mm for value in point):
        yield "drift: the grid has a node nowhere"


def _summary(report: DriftReport) -> Iterator[str]:
    ratios = sorted(link.length_ratio for link in report.links if link.length_ratio is not None)
    middle = ratios[(len(ratios) - 1) // 2 : len(ratios) // 2 + 1]
    if middle and abs(sum(middle) / len(middle) - 1.0) > 1e-6:
        yield "drift: the median length ratio is not 1"
    figures = report.summary
    if not _falls((figures.bearing_over_22_5, figures.bearing_over_45, figures.bearing_over_90)):
        yield "drift: more length turns by more than a larger angle"
    shares = (
        figures.displacement_max_share,
        figures.displacement_p95_share,
        figures.displacement_median_share,
    )
    if not _falls(shares):
        yield "drift: the percentiles of displacement are not in order"
    for name in ("order_flips", "octant_agreement", "neighbor_agreement", "trustworthiness"):
        if not -_ROUNDING <= getattr(figures, name) <= 1.0 + _ROUNDING:
            yield f"drift: {name} is not between 0 and 1"


def _pairs(report: DriftReport) -> Iterator[str]:
    at = {station.station_id: station.drawn_mm for station in report.stations}
    for pair in (*report.false_neighbors, *report.hidden_walks):
        if abs(math.dist(at[pair.start], at[pair.end]) - pair.drawn_mm) > 1e-6:
            yield f"drift: pair {pair.start} {pair.end}: its drawn distance is another"
    told = report.settings
    if any(pair.true_m <= told.false_far_m for pair in report.false_neighbors):
        yield "drift: a false neighbor is near"
    if any(pair.true_m > told.hidden_near_m for pair in report.hidden_walks):
        yield "drift: a hidden walk is long"
    for routes in report.competing:
        if set(routes.first[1:-1]) & set(routes.second[1:-1]):
            yield f"drift: competing routes from {routes.first[0]} share a station"


def _journeys(journeys: Journeys) -> Iterator[str]:
    if not _falls([share for _, share in journeys.over]):
        yield "drift: more journeys are misled by a larger ratio"
    if not (journeys.median >= 1.0 and _falls((journeys.largest, journeys.p95, journeys.median))):
        yield "drift: the percentiles of planning errors are not in order"
    for journey in journeys.worst:
        where = f"drift: journey {journey.start} {journey.end}"
        seen, fast = journey.looks_shortest, journey.fastest
        if abs(seen.time_s / fast.time_s - journey.ratio) > 1e-6:
            yield f"{where}: its ratio is not that of its times"
        if seen.drawn_mm > fast.drawn_mm * (1.0 + _ROUNDING):
            yield f"{where}: the fastest way looks shorter than the one that looks shortest"
        for way in (seen, fast):
            if not _leads(way, journey.start, journey.end):
                yield f"{where}: its legs do not lead there"
            if sum(leg.wait_s + leg.time_s for leg in way.legs) > way.time_s:
                yield f"{where}: its legs take longer than it"


def _leads(way: Itinerary, start: str, end: str) -> bool:
    """Tell whether legs follow on each other from start to end."""
    ends = [(leg.stations[0], leg.stations[-1]) for leg in way.legs]
    joined = all(a[1] == b[0] for a, b in itertools.pairwise(ends))
    return bool(ends) and joined and (ends[0][0], ends[-1][1]) == (start, end)


def _falls(values: Sequence[float]) -> bool:
    return all(a >= b - _ROUNDING for a, b in itertools.pairwise(values))
