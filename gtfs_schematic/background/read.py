"""Read the background's files."""

from __future__ import annotations

from pathlib import Path

from gtfs_schematic.background.geojson import features_from_geojson
from gtfs_schematic.background.model import BackgroundSettings, Source
from gtfs_schematic.errors import UsageError


def read_background(settings: BackgroundSettings) -> Source:
    """Read all files that the settings name, in their order.

    Raises
    ------
    UsageError
        If one cannot be read or is no GeoJSON.
    """
    sources = []
    for name in settings.files:
        try:
            data = Path(name).read_bytes()
        except OSError as error:
            raise UsageError(
                f"{name}: cannot read the background ({error.strerror or error}). Name a GeoJSON "
                "file, or leave it out of [background] files."
            ) from error
        sources.append(features_from_geojson(data, name, settings))
    return Source(
        tuple(feature for source in sources for feature in source.features),
        tuple(left for source in sources for left in source.left_out),
    )
