"""Write a network as GeoJSON, for looking at it over a map."""

from __future__ import annotations

import json

import geopandas as gpd
import shapely

from gtfs_schematic.network.model import Network

_DEGREES = 1e-6
"""Six decimals, about 10 cm on the ground: finer than any feed's stops."""


def to_geojson(network: Network) -> bytes:
    """Give one FeatureCollection of links, walks and stations (RFC 7946).

    Coordinates are lon and lat in degrees (WGS 84). Every feature has the property `layer`:
    "link", "walk" or "station"; features are sorted by layer, then id. Same network, same bytes.
    """
    features = [
        feature
        for layer in (links_layer(network), walks_layer(network), stations_layer(network))
        if len(layer)
        for feature in json.loads(layer.to_json(drop_id=True))["features"]
    ]
    collection = {"type": "FeatureCollection", "features": features}
    return (json.dumps(collection, ensure_ascii=False, separators=(",", ":")) + "\n").encode()


def stations_layer(network: Network) -> gpd.GeoDataFrame:
    """Give the stations as points, one row each."""
    rows = [
        {
            "layer": "station",
            "id": station.id,
            "name": station.name,
            "kind": station.kind,
            "group": station.group,
            "lines": " ".join(station.lines),
            "stop_ids": " ".join(station.stop_ids),
            "merge_reason": station.merge_reason,
        }
        for station in network.stations
    ]
    points = [shapely.Point(station.lon, station.lat) for station in network.stations]
    return _frame(rows, points)


def links_layer(network: Network) -> gpd.GeoDataFrame:
    """Give the links as straight lines from station to station, one row each."""
    rows = [
        {
            "layer": "link",
            "id": link.id,
            "from": link.start,
            "to": link.end,
            "lines": " ".join(network.line[line_id].name for line_id in link.lines),
            "color": network.line[link.lines[0]].color,
        }
        for link in network.links
    ]
    return _frame(rows, [_between(network, link.start, link.end) for link in network.links])


def walks_layer(network: Network) -> gpd.GeoDataFrame:
    """Give the walks as straight lines from station to station, one row each."""
    rows = [
        {"layer": "walk", "id": walk.id, "from": walk.start, "to": walk.end}
        for walk in network.walks
    ]
    return _frame(rows, [_between(network, walk.start, walk.end) for walk in network.walks])


def _between(network: Network, start: str, end: str) -> shapely.LineString:
    ends = (network.station[start], network.station[end])
    return shapely.LineString([(station.lon, station.lat) for station in ends])


def _frame(rows: list[dict[str, str]], shapes: list[shapely.Geometry]) -> gpd.GeoDataFrame:
    grid = [shapely.set_precision(shape, _DEGREES, mode="pointwise") for shape in shapes]
    return gpd.GeoDataFrame(rows, geometry=grid, crs="EPSG:4326")
