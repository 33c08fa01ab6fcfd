"""A small bus feed of our own invention whose lines share streets, but hardly a stop."""

from __future__ import annotations

import csv
from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path

Place = tuple[float, float]

_LON, _LAT = 12.0, 45.0
_LON_M, _LAT_M = 78846.84, 111131.78
"""Metres in a degree of longitude and latitude at 45° north (WGS 84)."""

STOPS: Mapping[str, Place] = {
    "Alder": (-900, -1500), "Birch": (0, -800), "Cedar": (1200, 0), "Damson": (2400, 0),
    "Elder": (4200, -900), "Fir": (-900, 1500), "Gorse": (0, 800), "Hazel": (1700, 0),
    "Ivy": (4200, 1000), "Juniper": (1900, 1600), "Larch": (1900, 2600), "Maple": (1000, -1500),
    "Olive": (5200, 1000), "Pine": (5200, -900),
}  # fmt: skip
"""Metres east and north of the corner of the town."""

LINES: Mapping[str, tuple[str, Sequence[Place]]] = {
    "10": (
        "Alder Birch Cedar Damson Elder Pine",
        [(-900, -1500), (0, -800), (0, 0), (3000, 0), (4200, -900), (5200, -900)],
    ),
    "20": (
        "Fir Gorse Hazel Ivy Olive",
        [(-900, 1500), (0, 800), (0, 0), (3000, 0), (4200, 1000), (5200, 1000)],
    ),
    "30": (
        "Maple Juniper Larch",
        [(1000, -1500), (800, -700), (800, 0), (1900, 0), (1900, 1600), (1900, 2600)],
    ),
}
"""Per line its stops and the points of its shape; all go both ways."""


def write_feed(folder: Path, lines: Iterable[str] = LINES, aside_m: float = 0.0) -> Path:
    """Write the feed of some lines, all shapes moved north by so many metres."""
    folder.mkdir(parents=True, exist_ok=True)
    chosen = {line: LINES[line] for line in lines}
    used = [stop for stop in STOPS if any(stop in stops.split() for stops, _ in chosen.values())]
    trips, times, shapes = [], [], []
    for line, (stops, points) in chosen.items():
        for back in (False, True):
            shape = f"{line}-{back:d}"
            for i, (x, y) in enumerate(points[::-1] if back else points):
                shapes.append((shape, *_degrees(x, y + aside_m), i))
            calls = stops.split()[::-1] if back else stops.split()
            for hour in range(6, 20):
                trip = f"{shape}-{hour}"
                trips.append((line, "daily", trip, shape))
                for i, stop in enumerate(calls):
                    time = f"{hour:02d}:{3 * i:02d}:00"
                    times.append((trip, time, time, stop, i))
    _write(folder, "agency", "agency_name agency_url agency_timezone", [_AGENCY])
    _write(
        folder,
        "calendar",
        "service_id monday tuesday wednesday thursday friday saturday sunday start_date end_date",
        [("daily", *[1] * 7, "20260105", "20260628")],
    )
    places = [(stop, f"{stop} Corner", *_degrees(*STOPS[stop])[::-1]) for stop in used]
    _write(folder, "stops", "stop_id stop_name stop_lat stop_lon", places)
    _write(folder, "routes", "route_id route_short_name route_type", [(k, k, 3) for k in chosen])
    _write(folder, "trips", "route_id service_id trip_id shape_id", trips)
    _write(folder, "stop_times", "trip_id arrival_time departure_time stop_id stop_sequence", times)
    _write(folder, "shapes", "shape_id shape_pt_lon shape_pt_lat shape_pt_sequence", shapes)
    return folder


_AGENCY = ("Overland Transit", "https://overland.example", "Europe/Vienna")


def _degrees(x: float, y: float) -> Place:
    return round(_LON + x / _LON_M, 7), round(_LAT + y / _LAT_M, 7)


def _write(folder: Path, name: str, head: str, rows: Iterable[Sequence[object]]) -> None:
    with (folder / f"{name}.txt").open("w", newline="", encoding="utf-8") as file:
        writer = csv.writer(file)
        writer.writerow(head.split())
        writer.writerows(rows)
