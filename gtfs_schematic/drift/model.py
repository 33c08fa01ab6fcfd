"""What the drift room takes and gives: how far and how a diagram departs from the ground."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

from gtfs_schematic.geometry import Point

CAUTION = (
    "A schematic diagram is not to scale. These figures compare it with straight lines between "
    "the feed's coordinates; they say nothing about walking routes, step-free access or safety."
)


class PlacedStation(Protocol):
    """A drawn station; lon and lat in degrees (WGS 84), sheet place in millimetres, y down."""

    @property
    def id(self) -> str:
        """Id of the station, unique in the diagram."""

    @property
    def name(self) -> str:
        """Name as a rider reads it."""

    @property
    def lon(self) -> float:
        """Longitude in degrees."""

    @property
    def lat(self) -> float:
        """Latitude in degrees."""

    @property
    def x_mm(self) -> float:
        """Place on the sheet, millimetres from its left edge."""

    @property
    def y_mm(self) -> float:
        """Place on the sheet, millimetres from its top edge."""


class PlacedLink(Protocol):
    """A drawn link between two stations, by their ids."""

    @property
    def id(self) -> str:
        """Id of the link, unique in the diagram."""

    @property
    def start(self) -> str:
        """Id of the first station."""

    @property
    def end(self) -> str:
        """Id of the second station."""


class PlacedDiagram(Protocol):
    """Anything that holds drawn stations and links; an edition does."""

    @property
    def stations(self) -> Sequence[PlacedStation]:
        """All drawn stations."""

    @property
    def links(self) -> Sequence[PlacedLink]:
        """All drawn links."""


@dataclass(frozen=True, slots=True)
class Fit:
    """Best similarity from ground (local metres, y up) to sheet (millimetres, y up)."""

    scale_mm_per_km: float
    rotation_deg: float
    """Counter-clockwise turn of the drawing against the ground; 0 where north is kept up."""
    residual: float
    """0 for a true-to-scale map, 1 for no likeness."""


@dataclass(frozen=True, slots=True)
class StationDrift:
    """Displacement of one station after the north-up fit."""

    station_id: str
    name: str
    displacement_m: float
    direction_deg: float
    """Compass direction of the displacement, from the true place to the drawn one."""
    displacement_share: float
    """Displacement over the diagonal of the network's bounding box on the ground."""
    drawn_mm: Point
    """Where the station is drawn, sheet millimetres, y down."""
    true_mm: Point
    """Where the north-up fit puts its true place, sheet millimetres, y down."""


@dataclass(frozen=True, slots=True)
class LinkDrift:
    """Bearing and length change of one link, end to end.

    Both changes are None for a link whose ends share a place on the ground or on the sheet.
    """

    link_id: str
    true_length_m: float
    drawn_length_mm: float
    bearing_change_deg: float | None
    """Drawn minus true bearing, clockwise, in (-180, 180]."""
    length_ratio: float | None
    """Drawn length over true length, divided by the median of that over all links."""


@dataclass(frozen=True, slots=True)
class DriftSummary:
    """The whole diagram in a few figures."""

    displacement_median_share: float
    displacement_max_share: float
    bearing_mean_deg: float
    """Mean size of the bearing change, weighted by true length."""
    bearing_p95_deg: float
    """95th percentile of the size of the bearing change, every link alike."""
    bearing_over_22_5: float
    """Share of the true length whose bearing changes by more than 22.5 degrees."""
    bearing_over_45: float
    bearing_over_90: float
    log_length_sd: float
    """Standard deviation of the natural logarithm of the length ratio; 0 for a true scale."""
    order_flips: float
    """Share of (pair of stations, axis) whose order is turned round; ties are left out."""
    distance_correlation: float
    """Pearson's correlation of true and drawn distance over all pairs of stations."""


@dataclass(frozen=True, slots=True)
class DriftReport:
    """All measures of one edition; tuples in the order of the edition."""

    north_up: Fit
    free: Fit
    diagonal_m: float
    stations: tuple[StationDrift, ...]
    links: tuple[LinkDrift, ...]
    summary: DriftSummary
