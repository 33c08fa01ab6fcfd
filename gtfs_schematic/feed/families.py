"""Keeping stations and their platforms together where a coordinate is wrong."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
from pyproj import Geod

from gtfs_schematic.feed.findings import Notebook
from gtfs_schematic.feed.model import Stop

_APART_KM = 10.0
"""No platform lies this far from its station (no source); the longest are some hundred metres."""
_ENOUGH = 3
_GEOD = Geod(ellps="WGS84")


def with_families_together(
    notebook: Notebook, stops: Sequence[Stop], rows: Mapping[str, int]
) -> tuple[Stop, ...]:
    """Put stops that lie astray from the others of their station where those lie, and find them.

    A station and its stops are one family. Of three or more, those are right that lie within 10 km
    of the median place; the others are put amid them. Of two nobody can tell which one is wrong.

    Parameters
    ----------
    rows
        Per stop its row in stops.txt.
    """
    families: defaultdict[str, list[Stop]] = defaultdict(list)
    for stop in stops:
        families[stop.parent_id or stop.id].append(stop)
    moved: dict[str, Stop] = {}
    for family in families.values():
        if len(family) >= _ENOUGH:
            places = np.array([(stop.lon, stop.lat) for stop in family], dtype=np.float64)
            apart = _km_from(places, *np.median(places, axis=0).tolist()) > _APART_KM
            if apart.all():
                continue
            lon, lat = places[~apart].mean(axis=0).tolist()
            for stop, astray in zip(family, apart.tolist(), strict=True):
                if astray:
                    fault = "lies too far from the rest of its station; it is put where that lies"
                    notebook.find("error", "stops.txt", fault, row=rows[stop.id], value=stop.id)
                    moved[stop.id] = replace(stop, lon=lon, lat=lat)
    return tuple(moved.get(stop.id, stop) for stop in stops) if moved else tuple(stops)


def with_stations_in_place(
    notebook: Notebook, stops: Sequence[Stop], rows: Mapping[str, int]
) -> tuple[Stop, ...]:
    """Put stations that lie astray from all their stops amid them, and find them.

    To be asked when stops that lie astray themselves are left out.
    """
    below: defaultdict[str, list[tuple[float | None, float | None]]] = defaultdict(list)
    for stop in stops:
        if stop.parent_id is not None:
            below[stop.parent_id].append((stop.lon, stop.lat))
    settled = []
    for stop in stops:
        place = stop
        if stop.id in below:
            places = np.array(below[stop.id], dtype=np.float64)
            if _km_from(places, stop.lon, stop.lat).min() > _APART_KM:
                fault = "station lies too far from its stops to be right; it is put amid them"
                notebook.find("error", "stops.txt", fault, row=rows[stop.id], value=stop.id)
                lon, lat = places.mean(axis=0).tolist()
                place = replace(stop, lon=lon, lat=lat)
        settled.append(place)
    return tuple(settled)


def _km_from(places: np.ndarray, lon: float | None, lat: float | None) -> np.ndarray:
    """Give the geodesic distances of places, (n, 2) degrees, from one place."""
    count = len(places)
    _, _, meters = _GEOD.inv(places[:, 0], places[:, 1], np.full(count, lon), np.full(count, lat))
    return np.asarray(meters) / 1000.0
