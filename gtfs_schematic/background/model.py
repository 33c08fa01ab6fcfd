"""What the background room gives: water, parks and boundaries, and what it left out."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

import shapely
from pydantic import BaseModel, ConfigDict, Field
from shapely.geometry.base import BaseGeometry

from gtfs_schematic.bundles.model import Corner

Kind = Literal["water", "park", "boundary"]

_KINDS: Mapping[str, Kind] = {
    "sea": "water",
    "lake": "water",
    "river": "water",
    "canal": "water",
    "forest": "park",
    "garden": "park",
    "border": "boundary",
}


class BackgroundSettings(BaseModel):
    """What is drawn beneath the network."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    files: tuple[str, ...] = ()
    """GeoJSON files (RFC 7946) of water, parks and boundaries."""
    property: str = "kind"
    """The property of a feature that says what it is."""
    kinds: Mapping[str, Kind] = Field(default_factory=lambda: dict(_KINDS))
    """Per value of that property what it is drawn as; water, park and boundary are themselves."""
    river_width_mm: float = Field(default=3.0, gt=0.0)
    """Width of water that is given as a line, millimetres."""


@dataclass(frozen=True, slots=True)
class Feature:
    """One feature of a file; longitude and latitude in degrees (WGS 84)."""

    kind: Kind
    name: str
    source: str
    """Where it stands: file and number."""
    geometry: BaseGeometry
    """A Polygon, MultiPolygon, LineString or MultiLineString."""


@dataclass(frozen=True, slots=True)
class LeftOut:
    """A feature, or a part of one, that is not drawn."""

    what: str
    reason: str


@dataclass(frozen=True, slots=True)
class Source:
    """The features to draw, and those of the files that cannot be."""

    features: tuple[Feature, ...] = ()
    left_out: tuple[LeftOut, ...] = ()


@dataclass(frozen=True, slots=True)
class Shape:
    """A surface or course on the sheet, millimetres, y down."""

    kind: Kind
    name: str
    rings: tuple[tuple[Corner, ...], ...]
    """Of a surface its outlines without the repeated corner, holes after what they are cut from;
    of a course the one line."""
    surface: bool
    on_ground: BaseGeometry
    """What it shows: a Polygon or LineString, degrees."""

    @property
    def drawn(self) -> BaseGeometry:
        """The shape with sharp corners, millimetres, y down."""
        lines = [[corner.at_mm for corner in ring] for ring in self.rings]
        if not self.surface:
            return shapely.MultiLineString(lines)
        # Holes lie inside outlines: what an even number of rings surrounds is not part of it.
        whole: BaseGeometry = shapely.Polygon()
        for line in lines:
            whole = whole.symmetric_difference(shapely.Polygon(line))
        return whole


@dataclass(frozen=True, slots=True)
class Background:
    """All that lies beneath the network."""

    settings: BackgroundSettings = field(default_factory=BackgroundSettings)
    shapes: tuple[Shape, ...] = ()
    """In the order in which they are painted: parks, water, boundaries."""
    left_out: tuple[LeftOut, ...] = ()
