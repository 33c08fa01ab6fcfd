"""What the bundles room gives: the order of lines in every link and each line's own course."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from pydantic import BaseModel, ConfigDict, Field

from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.model import Layout


class BundleSettings(BaseModel):
    """How parallel lines are drawn side by side."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    line_width_mm: float = Field(default=1.6, gt=0.0)
    """Width of one line, millimetres."""
    line_gap_mm: float = Field(default=0.35, ge=0.0)
    """White gap between two lines of a bundle, millimetres."""
    corner_radius_mm: float = Field(default=3.0, ge=0.0)
    """Radius of the innermost line's corners, millimetres; outer ones are concentric."""
    orders: dict[str, tuple[str, ...]] = Field(default_factory=dict)
    """Per link id some of its lines, from left to right as a person wants them, seen from start
    to end; links that share one order share the wish."""


@dataclass(frozen=True, slots=True)
class Corner:
    """A vertex of a line's course: sharp position and the radius that rounds it, millimetres."""

    at_mm: Point
    radius_mm: float


@dataclass(frozen=True, slots=True)
class Stretch:
    """One unbroken drawn course of a line, from a terminus or branch to the next."""

    line_id: str
    link_ids: tuple[str, ...]
    corners: tuple[Corner, ...]
    """The first and last have radius 0."""


@dataclass(frozen=True, slots=True)
class StationSpan:
    """Where the calling lines pass a station, for the marker to cover."""

    station_id: str
    points_mm: tuple[Point, ...]
    """One point per calling line (and per side where they differ), sorted, without repeats."""


@dataclass(frozen=True, slots=True)
class OrderQuality:
    """Line crossings and separations of the order, and a bound that no order can beat."""

    crossings: int
    separations: int
    crossings_bound: int


@dataclass(frozen=True, slots=True)
class BundledLayout:
    """A layout with its lines ordered and offset."""

    layout: Layout
    settings: BundleSettings
    orders: Mapping[str, tuple[str, ...]]
    """Per link id of `forked` the lines from left to right as seen going from `start` to `end`."""
    stretches: tuple[Stretch, ...]
    spans: Mapping[str, StationSpan]
    quality: OrderQuality
    forked: Layout
    """The layout with forks where links part that left a station together; else the same. Orders
    and stretches have its links."""
    asides: Mapping[str, float] = field(default_factory=dict)
    """Per link id of `forked` how far its bundle is moved off the middle to the right, seen from
    `start` to `end`, millimetres; 0 where it does not say."""
