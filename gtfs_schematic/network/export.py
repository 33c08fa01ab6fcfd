"""Write a network as GeoJSON, for looking at it over a map, and as GraphML, for graph programs."""

from __future__ import annotations

import io
import json
import re

import geopandas as gpd
import networkx as nx
import shapely
from pyproj import Geod

from gtfs_schematic.network.model import Link, Network, Walk

_DEGREES = 1e-6
"""Six decimals, about 10 cm on the ground: finer than any feed's stops."""
_NO_CHAR = re.compile("[^\t\n\r\x20-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")


def to_geojson(network: Network) -> bytes:
    """Give one FeatureCollection of links, walks, stations and junctions (RFC 7946).

    Coordinates are lon and lat in degrees (WGS 84). Every feature has the property `layer`:
    "link", "walk", "station" or "junction"; features are sorted by layer, then id. Same network,
    same bytes.
    """
    features = [
        feature
        for layer in (
            links_layer(network),
            walks_layer(network),
            stations_layer(network),
            junctions_layer(network),
        )
        if len(layer)
        for feature in json.loads(layer.to_json(drop_id=True))["features"]
    ]
    collection = {"type": "FeatureCollection", "features": features}
    return (json.dumps(collection, ensure_ascii=False, separators=(",", ":")) + "\n").encode()


def to_graphml(network: Network) -> bytes:
    """Give the network as a graph (GraphML, 2002).

    Nodes are stations and junctions, with lon and lat in degrees (WGS 84); edges are links and
    walks, with the attribute `layer`: "link" or "walk", and their length on the ground. Same
    network, same bytes.
    """
    graph = nx.Graph()
    geod = Geod(ellps="WGS84")
    for station in network.stations:
        graph.add_node(
            _xml(station.id),
            name=_xml(station.name),
            lon=station.lon,
            lat=station.lat,
            kind=station.kind,
            group=_xml(station.group),
            lines=_names(network, station.lines),
            stop_ids=_xml(" ".join(station.stop_ids)),
        )
    for junction in network.junctions:
        graph.add_node(_xml(junction.id), lon=junction.lon, lat=junction.lat, kind="junction")
    places = _places(network)
    edges: tuple[Link | Walk, ...] = (*network.links, *network.walks)
    for edge in edges:
        lons, lats = zip(places[edge.start], places[edge.end], strict=True)
        length = geod.line_length(lons, lats)
        lines: tuple[str, ...] = edge.lines if isinstance(edge, Link) else ()
        graph.add_edge(
            _xml(edge.start),
            _xml(edge.end),
            id=_xml(edge.id),
            layer="link" if lines else "walk",
            lines=_names(network, lines),
            color=network.line[lines[0]].color if lines else "",
            length_m=round(length, 1),
        )
    stream = io.BytesIO()
    nx.write_graphml_xml(graph, stream, encoding="utf-8", prettyprint=True)
    return stream.getvalue()


def _names(network: Network, lines: tuple[str, ...]) -> str:
    return _xml(" ".join(network.line[line_id].name for line_id in lines))


def _xml(text: str) -> str:
    """Replace what XML 1.0 (production 2, Char) does not allow in a document."""
    return _NO_CHAR.sub("\N{REPLACEMENT CHARACTER}", text)


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
    """Give the links as straight lines from end to end, one row each."""
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
    places = _places(network)
    return _frame(
        rows, [shapely.LineString([places[k.start], places[k.end]]) for k in network.links]
    )


def walks_layer(network: Network) -> gpd.GeoDataFrame:
    """Give the walks as straight lines from station to station, one row each."""
    rows = [
        {"layer": "walk", "id": walk.id, "from": walk.start, "to": walk.end}
        for walk in network.walks
    ]
    places = _places(network)
    return _frame(
        rows, [shapely.LineString([places[w.start], places[w.end]]) for w in network.walks]
    )


def junctions_layer(network: Network) -> gpd.GeoDataFrame:
    """Give the junctions as points, one row each."""
    rows = [{"layer": "junction", "id": junction.id} for junction in network.junctions]
    return _frame(rows, [shapely.Point(j.lon, j.lat) for j in network.junctions])


def _places(network: Network) -> dict[str, tuple[float, float]]:
    """Give lon and lat of all ends of links and walks."""
    places = {station.id: (station.lon, station.lat) for station in network.stations}
    return places | {j.id: (j.lon, j.lat) for j in network.junctions}


def _frame(rows: list[dict[str, str]], shapes: list[shapely.Geometry]) -> gpd.GeoDataFrame:
    grid = [shapely.set_precision(shape, _DEGREES, mode="pointwise") for shape in shapes]
    return gpd.GeoDataFrame(rows, geometry=grid, crs="EPSG:4326")
