"""Read GeoJSON (RFC 7946): strict about what is wrong, lenient about what is not asked for."""

from __future__ import annotations

import json
import math
from collections.abc import Iterator, Mapping
from typing import Any, get_args

import shapely
from shapely.geometry.base import BaseGeometry

from gtfs_schematic.background.model import BackgroundSettings, Feature, Kind, LeftOut, Source
from gtfs_schematic.errors import UsageError

_DEPTHS = {"LineString": 0, "MultiLineString": 1, "Polygon": 1, "MultiPolygon": 2}
"""How deep the lines of positions lie in a geometry's coordinates."""
_OTHERS = {"Point", "MultiPoint", "GeometryCollection"}
_LEAST_RING = 4
"""Positions of a linear ring, the last of which repeats the first (RFC 7946, 3.1.6)."""

Position = tuple[float, float]


def features_from_geojson(data: bytes, name: str, settings: BackgroundSettings) -> Source:
    """Read the surfaces and courses of a file.

    Parameters
    ----------
    data
        The file.
    name
        What to call it in an error.
    settings
        Which property tells a feature's kind, and what its values mean.

    Raises
    ------
    UsageError
        If the file is no GeoJSON; names the feature, counted from 1, and what to do.
    """
    found: list[Feature] = []
    left_out: list[LeftOut] = []
    for number, feature in enumerate(_features(data, name), start=1):
        source = f"{name}, feature {number}"
        kind, why = _kind(feature, source, settings)
        if kind is None:
            left_out.append(LeftOut(_called(feature, source), why))
            continue
        geometry = feature.get("geometry")
        if geometry is None:
            left_out.append(LeftOut(_called(feature, source), "it has no geometry"))
        elif isinstance(geometry, Mapping) and geometry.get("type") in _OTHERS:
            why = f"it is a {geometry['type']}; lines and polygons are drawn"
            left_out.append(LeftOut(_called(feature, source), why))
        else:
            shape = _geometry(geometry, source)
            found.append(Feature(kind, _name(feature), source, shape))
    return Source(tuple(found), tuple(left_out))


def _features(data: bytes, name: str) -> list[Mapping[str, Any]]:
    """Give the features of a FeatureCollection, or the one of a file that is a Feature."""
    try:
        document = json.loads(data.decode("utf-8-sig"))
    except (ValueError, RecursionError) as error:
        raise UsageError(
            f"{name}: no JSON in UTF-8 ({error}). Export the background as GeoJSON."
        ) from error
    kind = document.get("type") if isinstance(document, Mapping) else None
    if kind == "Feature":
        return [document]
    features = document.get("features") if isinstance(document, Mapping) else None
    if kind != "FeatureCollection" or not isinstance(features, list):
        raise UsageError(
            f"{name}: no GeoJSON FeatureCollection (its type is {kind!r}). Export the background "
            "as a FeatureCollection of polygons and lines (RFC 7946)."
        )
    for number, feature in enumerate(features, start=1):
        if not isinstance(feature, Mapping) or feature.get("type") != "Feature":
            raise UsageError(
                f"{name}, feature {number}: not of type Feature. Every member of features must be "
                'an object with "type": "Feature".'
            )
    return features


def _kind(
    feature: Mapping[str, Any], source: str, settings: BackgroundSettings
) -> tuple[Kind | None, str]:
    """Give what a feature is drawn as, or why that cannot be told."""
    properties = feature.get("properties") or {}
    if not isinstance(properties, Mapping):
        raise UsageError(f'{source}: "properties" must be an object or null.')
    value = properties.get(settings.property)
    if value in get_args(Kind):
        return value, ""
    if isinstance(value, str) and value in settings.kinds:
        return settings.kinds[value], ""
    if value is None:
        return None, f"it has no property {settings.property!r} (see [background] property)"
    return None, f"its {settings.property} is {value!r} (add it to [background.kinds] to draw it)"


def _name(feature: Mapping[str, Any]) -> str:
    name = (feature.get("properties") or {}).get("name")
    return " ".join(name.split()) if isinstance(name, str) else ""


def _called(feature: Mapping[str, Any], source: str) -> str:
    name = _name(feature)
    return f"{name} ({source})" if name else source


def _geometry(geometry: object, source: str) -> BaseGeometry:
    """Make a geometry of a feature's member."""
    kind = geometry.get("type") if isinstance(geometry, Mapping) else None
    if kind not in _DEPTHS or not isinstance(geometry, Mapping):
        raise UsageError(
            f"{source}: its geometry is of type {kind!r}. Use one of {', '.join(_DEPTHS)}."
        )
    rings = kind in ("Polygon", "MultiPolygon")
    coordinates = geometry.get("coordinates")
    if not isinstance(coordinates, list):
        raise UsageError(f'{source}: its geometry has no "coordinates".')
    if kind == "MultiPolygon":
        parts = [_polygon(part, source) for part in coordinates]
        return shapely.union_all([shapely.make_valid(part) for part in parts])
    if rings:
        return shapely.make_valid(_polygon(coordinates, source))
    if kind == "LineString":
        return shapely.LineString(_line(coordinates, source, 2))
    return shapely.MultiLineString([_line(part, source, 2) for part in coordinates])


def _polygon(coordinates: object, source: str) -> BaseGeometry:
    if not isinstance(coordinates, list) or not coordinates:
        raise UsageError(f"{source}: a polygon must be a list of rings, the outer one first.")
    rings = [_line(ring, source, _LEAST_RING) for ring in coordinates]
    for ring in rings:
        if ring[0] != ring[-1]:
            raise UsageError(
                f"{source}: a ring is not closed. Repeat its first position as its last."
            )
    return shapely.Polygon(rings[0], rings[1:])


def _line(coordinates: object, source: str, least: int) -> list[Position]:
    if not isinstance(coordinates, list) or len(coordinates) < least:
        raise UsageError(f"{source}: a line or ring has fewer than {least} positions.")
    return list(_positions(coordinates, source))


def _positions(coordinates: list[object], source: str) -> Iterator[Position]:
    for position in coordinates:
        numbers = position[:2] if isinstance(position, list) else []
        if len(numbers) != 2 or not all(_is_number(number) for number in numbers):
            raise UsageError(
                f"{source}: {json.dumps(position)[:60]} is no position. Give [longitude, latitude]."
            )
        lon, lat = (float(number) for number in numbers)
        if not (-180.0 <= lon <= 180.0 and -90.0 <= lat <= 90.0):
            raise UsageError(
                f"{source}: [{lon:g}, {lat:g}] is no place on Earth. Give longitude and latitude "
                "in degrees, in this order, WGS 84; reproject files in metres first."
            )
        yield lon, lat


def _is_number(value: object) -> bool:
    whole = isinstance(value, int | float) and not isinstance(value, bool)
    return whole and math.isfinite(float(value))  # type: ignore[arg-type]
