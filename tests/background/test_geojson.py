"""Backgrounds are read from GeoJSON, and what is wrong is said with the feature's number."""

from __future__ import annotations

import json

import pytest
import shapely

from gtfs_schematic.background.geojson import features_from_geojson
from gtfs_schematic.background.model import BackgroundSettings
from gtfs_schematic.background.read import read_background
from gtfs_schematic.demo.water import background
from gtfs_schematic.errors import UsageError

RING = [[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 0.0]]


def feature(kind: object, geometry: object, **properties: object) -> dict[str, object]:
    return {
        "type": "Feature",
        "properties": {"kind": kind, **properties},
        "geometry": geometry,
    }


def collection(*features: object) -> bytes:
    return json.dumps({"type": "FeatureCollection", "features": features}).encode()


def read(data: bytes, **settings: object):
    return features_from_geojson(data, "w.json", BackgroundSettings(**settings))


def test_every_geometry_of_lines_and_surfaces_is_read():
    geometries = {
        "Polygon": [RING],
        "MultiPolygon": [[RING], [[[x + 5.0, y] for x, y in RING]]],
        "LineString": RING[:3],
        "MultiLineString": [RING[:2], RING[1:3]],
    }
    found = read(
        collection(*(feature("park", {"type": t, "coordinates": c}) for t, c in geometries.items()))
    )
    assert [f.geometry.geom_type for f in found.features] == list(geometries)
    for each, coordinates in zip(found.features, geometries.values(), strict=True):
        if each.geometry.geom_type == "LineString":
            assert [list(p) for p in each.geometry.coords] == coordinates
    assert found.features[1].geometry.area == pytest.approx(2 * 0.5)
    assert not found.left_out


def test_the_demos_water_is_water():
    found = read(background())
    assert {f.kind for f in found.features} == {"water"}
    assert {f.name for f in found.features} == {"Sethrå", "Lóm Ovředa"}
    assert all(f.geometry.is_valid for f in found.features)


def test_a_byte_order_mark_heights_and_a_lone_feature_are_accepted():
    alone = feature("water", {"type": "LineString", "coordinates": [[0, 0, 7.5], [1, 1, 8]]})
    found = read(b"\xef\xbb\xbf" + json.dumps(alone).encode())
    assert found.features[0].geometry.equals(shapely.LineString([(0, 0), (1, 1)]))


def test_another_property_and_other_words_can_be_told():
    data = collection(
        feature(None, {"type": "Polygon", "coordinates": [RING]}, natural="bay"),
        feature("water", {"type": "Polygon", "coordinates": [RING]}),
    )
    found = read(data, property="natural", kinds={"bay": "water"})
    assert [f.source for f in found.features] == ["w.json, feature 1"]
    (left,) = found.left_out
    assert "feature 2" in left.what
    assert "'natural'" in left.reason


@pytest.mark.parametrize(
    ("kind", "geometry", "why"),
    [
        ("volcano", {"type": "Polygon", "coordinates": [RING]}, "volcano"),
        ("water", None, "no geometry"),
        ("water", {"type": "Point", "coordinates": [0, 0]}, "Point"),
        (None, {"type": "Polygon", "coordinates": [RING]}, "no property"),
    ],
)
def test_what_is_no_background_is_listed(kind, geometry, why):
    found = read(collection(feature(kind, geometry, name="Here")))
    assert not found.features
    (left,) = found.left_out
    assert left.what == "Here (w.json, feature 1)"
    assert why in left.reason


@pytest.mark.parametrize(
    ("geometry", "says"),
    [
        ({"type": "Blob", "coordinates": []}, "Blob"),
        ([1, 2], "None"),
        ({"type": "Polygon"}, "coordinates"),
        ({"type": "Polygon", "coordinates": []}, "list of rings"),
        ({"type": "Polygon", "coordinates": [RING[:3]]}, "fewer than 4"),
        ({"type": "Polygon", "coordinates": [[*RING[:3], [9.0, 9.0]]]}, "not closed"),
        ({"type": "LineString", "coordinates": [[0, 0]]}, "fewer than 2"),
        ({"type": "LineString", "coordinates": [[0, 0], [1]]}, "no position"),
        ({"type": "LineString", "coordinates": [[0, 0], ["1", "2"]]}, "no position"),
        ({"type": "LineString", "coordinates": [[0, 0], [True, 2]]}, "no position"),
        ({"type": "LineString", "coordinates": [[0, 0], [583960.0, 4507523.0]]}, "WGS 84"),
        ({"type": "MultiLineString", "coordinates": [[[0, 0]]]}, "fewer than 2"),
    ],
)
def test_a_wrong_geometry_is_refused_with_its_number(geometry, says):
    good = feature("water", {"type": "Polygon", "coordinates": [RING]})
    with pytest.raises(UsageError, match=r"w\.json, feature 2") as caught:
        read(collection(good, feature("water", geometry)))
    assert says in str(caught.value)


@pytest.mark.parametrize(
    ("data", "says"),
    [
        (b"<kml/>", "no JSON"),
        (b"\xff\xfe", "no JSON"),
        (b"[]", "no GeoJSON"),
        (b'{"type": "Topology"}', "'Topology'"),
        (b'{"type": "FeatureCollection"}', "FeatureCollection"),
        (b'{"type": "FeatureCollection", "features": [3]}', "feature 1"),
        (b"[" * 100_000, "no JSON"),
    ],
)
def test_what_is_no_geojson_is_refused(data, says):
    with pytest.raises(UsageError, match=r"w\.json") as caught:
        read(data)
    assert says in str(caught.value)


def test_a_surface_that_crosses_itself_is_made_whole():
    bow = [[0, 0], [1, 1], [1, 0], [0, 1], [0, 0]]
    found = read(collection(feature("park", {"type": "Polygon", "coordinates": [bow]})))
    assert found.features[0].geometry.is_valid
    assert found.features[0].geometry.area == pytest.approx(0.5)


def test_files_are_read_in_order_and_a_missing_one_is_named(tmp_path):
    for name in ("a", "b"):
        data = collection(feature("park", {"type": "Polygon", "coordinates": [RING]}, name=name))
        (tmp_path / name).write_bytes(data)
    found = read_background(BackgroundSettings(files=(str(tmp_path / "b"), str(tmp_path / "a"))))
    assert [f.name for f in found.features] == ["b", "a"]
    with pytest.raises(UsageError, match=r"gone\.geojson"):
        read_background(BackgroundSettings(files=(str(tmp_path / "gone.geojson"),)))
