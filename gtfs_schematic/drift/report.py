"""Write a drift report as JSON and CSV."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Sequence
from dataclasses import asdict
from typing import Any

from gtfs_schematic.drift.limits import LimitResult
from gtfs_schematic.drift.model import CAUTION, DriftReport, Fit

FORMAT = "gtfs-schematic/drift"

_COLUMNS = (
    "kind",
    "id",
    "name",
    "displacement_m",
    "direction_deg",
    "displacement_share",
    "true_length_m",
    "drawn_length_mm",
    "bearing_change_deg",
    "length_ratio",
)


def to_json(report: DriftReport, limits: Sequence[LimitResult] = ()) -> bytes:
    """Write a report, and what became of its limits, as the schema `drift.schema.json` says."""
    north_up = _fit(report.north_up)
    del north_up["rotation_deg"]
    document = {
        "format": FORMAT,
        "version": 1,
        "caution": CAUTION,
        "fit": {"north_up": north_up, "free": _fit(report.free)},
        "diagonal_m": round(report.diagonal_m, 1),
        "summary": {key: _plain(value, 6) for key, value in asdict(report.summary).items()},
        "stations": _stations(report),
        "links": _links(report),
        "limits": [
            {
                "limit": str(result.limit),
                "measure": result.limit.measure,
                "value": result.limit.value,
                "measured": _plain(result.measured, 6),
                "exceeded": result.exceeded,
            }
            for result in limits
        ],
    }
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


def _fit(fit: Fit) -> dict[str, float]:
    return {
        "scale_mm_per_km": _plain(fit.scale_mm_per_km, 6),
        "rotation_deg": _plain(fit.rotation_deg, 4),
        "residual": _plain(fit.residual, 6),
    }


def _stations(report: DriftReport) -> list[dict[str, Any]]:
    return [
        {
            "id": station.station_id,
            "name": station.name,
            "displacement_m": _plain(station.displacement_m, 1),
            "direction_deg": _plain(station.direction_deg, 1) % 360.0,
            "displacement_share": _plain(station.displacement_share, 6),
        }
        for station in report.stations
    ]


def _links(report: DriftReport) -> list[dict[str, Any]]:
    return [
        {
            "id": link.link_id,
            "true_length_m": _plain(link.true_length_m, 1),
            "drawn_length_mm": _plain(link.drawn_length_mm, 3),
            "bearing_change_deg": _maybe(link.bearing_change_deg, 2),
            "length_ratio": _maybe(link.length_ratio, 4),
        }
        for link in report.links
    ]


def _plain(value: float, digits: int) -> float:
    """Round for writing; no negative zero, so that equal figures have equal bytes."""
    return round(value, digits) + 0.0


def _maybe(value: float | None, digits: int) -> float | None:
    return None if value is None else _plain(value, digits)
