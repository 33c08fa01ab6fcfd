"""Networks are written as RFC 7946 and GraphML ask for, and read back by others."""

from __future__ import annotations

import io
import json

import geopandas as gpd
import networkx as nx
import pytest

from gtfs_schematic.network.export import links_layer, stations_layer, to_geojson, to_graphml


def test_the_file_is_a_feature_collection_of_all_layers(busy_town):
    network = busy_town.network()
    found = json.loads(to_geojson(network))
    assert found["type"] == "FeatureCollection"
    # RFC 7946, section 4: the reference system is always WGS 84, and no member says so.
    assert "crs" not in found
    layers = [feature["properties"]["layer"] for feature in found["features"]]
    assert layers.count("link") == len(network.links)
    assert layers.count("walk") == len(network.walks)
    assert layers.count("station") == len(network.stations)
    kinds = {f["properties"]["layer"]: f["geometry"]["type"] for f in found["features"]}
    assert kinds == {"link": "LineString", "walk": "LineString", "station": "Point"}


def test_coordinates_are_lon_lat_to_six_decimals(busy_town):
    network = busy_town.network()
    for feature in json.loads(to_geojson(network))["features"]:
        if feature["properties"]["layer"] == "station":
            station = network.station[feature["properties"]["id"]]
            assert feature["geometry"]["coordinates"] == [
                pytest.approx(station.lon, abs=6e-7),
                pytest.approx(station.lat, abs=6e-7),
            ]
            assert all(len(repr(c).split(".")[1]) <= 6 for c in feature["geometry"]["coordinates"])


def test_links_end_at_their_stations(busy_town):
    network = busy_town.network()
    read = gpd.read_file(io.BytesIO(to_geojson(network)))
    places = {row.id: row.geometry for row in read[read.layer == "station"].itertuples()}
    for link in read[read.layer == "link"].to_dict("records"):
        assert list(link["geometry"].coords) == [
            places[link["from"]].coords[0],
            places[link["to"]].coords[0],
        ]


def test_same_network_same_bytes(busy_town, town):
    network = busy_town.network()
    assert to_geojson(network) == to_geojson(busy_town.network())
    assert to_geojson(network) != to_geojson(town.row("AB").both("r", "A B").network())


def test_layers_know_their_reference_system(busy_town):
    network = busy_town.network()
    for layer in (links_layer(network), stations_layer(network)):
        assert layer.crs.to_epsg() == 4326


def test_graphml_reads_back_as_the_same_graph(busy_town):
    network = busy_town.network()
    graph = nx.read_graphml(io.BytesIO(to_graphml(network)))
    assert set(graph.nodes) == set(network.station)
    for layer, edges in (("link", network.links), ("walk", network.walks)):
        read = {frozenset((a, b)) for a, b, found in graph.edges(data="layer") if found == layer}
        assert read == {frozenset((edge.start, edge.end)) for edge in edges}
    assert graph.nodes["A"]["name"] == network.station["A"].name
    # Stops of the row are 600 m apart on the flat ground of the test.
    assert graph.edges["B", "C"]["length_m"] == pytest.approx(600.0, rel=0.01)
    assert set(graph.edges["B", "C"]["lines"].split()) >= {"red", "blue", "fast"}
    assert to_graphml(network) == to_graphml(busy_town.network())


def test_graphml_survives_what_xml_forbids(town):
    network = town.stop("A", 0, name="A\x0b<&>\ufffe").stop("B", 600).both("r", "A B").network()
    graph = nx.read_graphml(io.BytesIO(to_graphml(network)))
    assert graph.nodes["A"]["name"] == "A\N{REPLACEMENT CHARACTER}<&>\N{REPLACEMENT CHARACTER}"
