"""What the layout room gives: every station and link in sheet millimetres, y down."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from pydantic import BaseModel, ConfigDict, Field, NonNegativeFloat

from gtfs_schematic.geometry import Point
from gtfs_schematic.network.model import Network

Direction = Literal["E", "NE", "N", "NW", "W", "SW", "S", "SE"]
"""Where a link leads on the sheet."""


class LayoutSettings(BaseModel):
    """How the network is placed on the sheet."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    fidelity: float = Field(default=0.35, ge=0.0, le=1.0)
    """1 keeps geography to scale, 0 spaces stations evenly."""
    effort: Literal["quick", "standard", "thorough"] = "standard"
    """How much work the improvement may do: a fixed amount, never a time."""
    pins: Mapping[str, tuple[float, float]] = Field(default_factory=dict)
    """Places that stations must keep, by station id: millimetres from the left and the top."""
    pins_from: Mapping[str, tuple[str, float | None, float | None]] = Field(default_factory=dict)
    """Places that they keep as seen from another station: its id, millimetres to the right and
    down; None leaves one open."""
    directions: Mapping[str, Direction] = Field(default_factory=dict)
    """Per link id where it is to lead from its start, N up the sheet; a strong wish."""
    straights: Mapping[str, tuple[str, ...]] = Field(default_factory=dict)
    """Per station id the lines that are to pass it straight; a strong wish."""
    angles: Literal[45, 90] = 45
    """Angle between two neighbouring directions of links, degrees."""
    north: Literal["up", "best"] = "up"
    """Whether north is up, or the ground is turned so that links lie near the directions."""
    drift_limit_m: float = Field(default=0.0, ge=0.0)
    """How far any station may be drawn from its true place, by the best fit with north up, in
    metres on the ground; 0 for no limit."""
    drift_limit_mm: float = Field(default=0.0, ge=0.0)
    """The same in millimetres on the sheet; both hold if both are set."""
    drift_limits_m: Mapping[str, NonNegativeFloat] = Field(default_factory=dict)
    """Per station id the limit in metres that it has instead; 0 for none."""


@dataclass(frozen=True, slots=True)
class Clearances:
    """The plain numbers, in millimetres, by which the layout knows what will be drawn."""

    line_width_mm: float
    line_gap_mm: float
    marker_mm: float
    """Outer diameter of a stop's marker."""
    label_height_mm: float
    """Height of one text line of a station label."""
    spacing_mm: float
    """Least distance between neighbouring stations along a link."""
    label_width_mm: Mapping[str, float]
    """Per station the width of its label on one text line."""

    def half_width_mm(self, lines: int) -> float:
        """Give half the width of so many lines side by side, or of a walk (0 lines)."""
        if lines == 0:
            return self.line_width_mm / 4.0
        pitch = self.line_width_mm + self.line_gap_mm
        return (lines * pitch - self.line_gap_mm) / 2.0


@dataclass(frozen=True, slots=True)
class SheetFrame:
    """The page and the part of it that the network may fill, millimetres, y down."""

    width_mm: float
    height_mm: float
    left_mm: float
    top_mm: float
    right_mm: float
    bottom_mm: float


@dataclass(frozen=True, slots=True)
class NameRoom:
    """Where a name stands or is to stand beside its station: room that should be left free."""

    station_id: str
    outline_mm: tuple[Point, ...]
    """Corners as seen from the station's place, millimetres, y down."""
    stands: bool
    """Whether it stands there already; otherwise it has no place yet."""


@dataclass(frozen=True, slots=True)
class Crossing:
    """Two links (or walks) that cross on the ground without a station, and on the sheet."""

    first: str
    second: str
    at_mm: Point


@dataclass(frozen=True, slots=True)
class Layout:
    """An octilinear drawing of a network; see `layout.check` for what it guarantees."""

    network: Network
    sheet: SheetFrame
    positions: Mapping[str, Point]
    """Per station and junction id its place."""
    paths: Mapping[str, tuple[Point, ...]]
    """Per link id the centre line from `start` to `end`, every bend as a sharp corner.

    At a station with more links and walks than directions some leave together: their paths lie on
    each other until they part.
    """
    walk_paths: Mapping[str, tuple[Point, ...]]
    """Per walk id the same."""
    crossings: tuple[Crossing, ...]
    rotation_deg: float = 0.0
    """Counter-clockwise turn of the ground on the sheet: so far left of the top is north."""
    angles: int = 45
    """Angle between two neighbouring directions, degrees."""
