"""What the drift room gives: how far and how a diagram departs from the ground."""

from __future__ import annotations

from dataclasses import dataclass


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


@dataclass(frozen=True, slots=True)
class LinkDrift:
    """Bearing and length change of one link, end to end."""

    link_id: str
    true_length_m: float
    drawn_length_mm: float
    bearing_change_deg: float
    """Drawn minus true bearing, clockwise, in (-180, 180]."""
    length_ratio: float
    """Drawn length over true length, divided by the median of that over all links."""


@dataclass(frozen=True, slots=True)
class DriftReport:
    """All measures of one edition; tuples in the order of the edition."""

    north_up: Fit
    free: Fit
    diagonal_m: float
    stations: tuple[StationDrift, ...]
    links: tuple[LinkDrift, ...]
