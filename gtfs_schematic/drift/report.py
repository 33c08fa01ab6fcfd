"""Write a drift report as JSON and CSV."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Sequence
from typing import Any

from gtfs_schematic.drift.figures import FIGURES
from gtfs_schematic.drift.limits import LimitResult
from gtfs_schematic.drift.model import (
    CAUTION,
    CompetingRoutes,
    DriftReport,
    Fit,
    Itinerary,
    Journeys,
    MisleadingPair,
)

Row = dict[str, Any]

FORMAT = "gtfs-schematic/drift"

_COLUMNS = (
    "kind",
    "id",
    "name",
    "displacement_m",
    "direction_deg",
    "displacement_share",
    "local_scale",
    "local_rotation_deg",
    "from",
    "to",
    "true_length_m",
    "drawn_length_mm",
    "bearing_change_deg",
    "length_ratio",
)


def to_json(
    report: DriftReport,
    limits: Sequence[LimitResult] = (),
    beside: tuple[str, DriftReport] | None = None,
) -> bytes:
    """Write a report, and what became of its limits, as the schema `drift.schema.json` says.

    Parameters
    ----------
    report
        What was measured.
    limits
        What became of the limits that the user set.
    beside
        Title and report of another drawing of the same network.
    """
    north_up = _fit(report.north_up)
    del north_up["rotation_deg"]
    document = {
        "format": FORMAT,
        "version": 1,
        "caution": CAUTION,
        "fit": {"north_up": north_up, "free": _fit(report.free)},
        "diagonal_m": round(report.diagonal_m, 1),
        "typical_link_mm": _plain(report.typical_link_mm, 4),
        "figures": _figures(report),
        "settings": report.settings.model_dump(mode="json", exclude={"limits"}),
        "stations": _stations(report),
        "links": _links(report),
        "false_neighbors": [_pair(pair) for pair in report.false_neighbors],
        "hidden_walks": [_pair(pair) for pair in report.hidden_walks],
        "competing_routes": [_routes(routes) for routes in report.competing],
        "journeys": None if report.journeys is None else _journeys(report.journeys),
        "limits": [_limit(result) for result in limits],
    }
    if beside is not None:
        document["beside"] = {"title": beside[0], "figures": _figures(beside[1])}
    return (json.dumps(document, ensure_ascii=False, indent=1, allow_nan=False) + "\n").encode()


def to_csv(report: DriftReport) -> bytes:
    """Write one row per station, then one per link (RFC 4180, UTF-8)."""
    out = io.StringIO(newline="")
    writer = csv.DictWriter(out, _COLUMNS, restval="")
    writer.writeheader()
    for row in _stations(report):
        writer.writerow({"kind": "station", **row})
    for row in _links(report):
        writer.writerow({"kind": "link", **row})
    return out.getvalue().encode()


def _figures(report: DriftReport) -> Row:
    return {figure.name: _maybe(figure.read(report), 6) for figure in FIGURES}


def _fit(fit: Fit) -> Row:
    return {
        "scale_mm_per_km": _plain(fit.scale_mm_per_km, 6),
        "rotation_deg": _plain(fit.rotation_deg, 4),
        "residual": _plain(fit.residual, 6),
    }


def _limit(result: LimitResult) -> Row:
    return {
        "limit": str(result.limit),
        "measure": result.limit.measure,
        "value": result.limit.value,
        "measured": _plain(result.measured, 6),
        "exceeded": result.exceeded,
    }


def _stations(report: DriftReport) -> list[Row]:
    return [
        {
            "id": station.station_id,
            "name": station.name,
            "displacement_m": _plain(station.displacement_m, 1),
            "direction_deg": _plain(station.direction_deg, 1) % 360.0,
            "displacement_share": _plain(station.displacement_share, 6),
            "local_scale": _plain(station.local_scale, 4),
            "local_rotation_deg": _plain(station.local_rotation_deg, 2),
        }
        for station in report.stations
    ]


def _links(report: DriftReport) -> list[Row]:
    return [
        {
            "id": link.link_id,
            "from": link.start,
            "to": link.end,
            "true_length_m": _plain(link.true_length_m, 1),
            "drawn_length_mm": _plain(link.drawn_length_mm, 3),
            "bearing_change_deg": _maybe(link.bearing_change_deg, 2),
            "length_ratio": _maybe(link.length_ratio, 4),
        }
        for link in report.links
    ]


def _pair(pair: MisleadingPair) -> Row:
    return {
        "from": pair.start,
        "to": pair.end,
        "true_m": _plain(pair.true_m, 1),
        "drawn_mm": _plain(pair.drawn_mm, 3),
        "drawn_links": _plain(pair.drawn_links, 3),
        "departures": pair.departures,
    }


def _routes(routes: CompetingRoutes) -> Row:
    return {
        "first": list(routes.first),
        "second": list(routes.second),
        "true_m": [_plain(value, 1) for value in routes.true_m],
        "drawn_mm": [_plain(value, 3) for value in routes.drawn_mm],
        "difference": _plain(routes.difference, 4),
    }


def _journeys(journeys: Journeys) -> Row:
    return {
        "pairs": journeys.pairs,
        "unreached": journeys.unreached,
        "origins": journeys.origins,
        "mean": _plain(journeys.mean, 6),
        "median": _plain(journeys.median, 6),
        "p95": _plain(journeys.p95, 6),
        "largest": _plain(journeys.largest, 6),
        "over": [{"ratio": ratio, "share": _plain(share, 6)} for ratio, share in journeys.over],
        "worst": [
            {
                "from": journey.start,
                "to": journey.end,
                "ratio": _plain(journey.ratio, 4),
                "looks_shortest": _itinerary(journey.looks_shortest),
                "fastest": _itinerary(journey.fastest),
            }
            for journey in journeys.worst
        ],
    }


def _itinerary(itinerary: Itinerary) -> Row:
    return {
        "time_s": itinerary.time_s,
        "drawn_mm": _plain(itinerary.drawn_mm, 3),
        "legs": [
            {
                "line": leg.line or None,
                "stations": list(leg.stations),
                "wait_s": leg.wait_s,
                "time_s": leg.time_s,
            }
            for leg in itinerary.legs
        ],
    }


def _plain(value: float, digits: int) -> float:
    """Round for writing; no negative zero, so that equal figures have equal bytes."""
    return round(value, digits) + 0.0


def _maybe(value: float | None, digits: int) -> float | None:
    return None if value is None else _plain(value, digits)
