"""What the labels room gives: a place for every station's name."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

from pydantic import BaseModel, ConfigDict, Field

from gtfs_schematic.bundles.model import BundledLayout
from gtfs_schematic.geometry import Point

Side = Literal["E", "NE", "N", "NW", "W", "SW", "S", "SE"]
"""Where a label lies, as seen from its marker."""


class LabelSettings(BaseModel):
    """How station names are set."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    size_pt: float = Field(default=8.0, gt=0.0)
    """Type size of stop names, points (1 pt = 25.4/72 mm)."""
    interchange_size_pt: float = Field(default=9.5, gt=0.0)
    """Type size of interchange and terminus names, points."""
    leading: float = Field(default=1.15, ge=1.0)
    """Distance of baselines in multiples of the type size."""
    clearance_mm: float = Field(default=0.5, ge=0.0)
    """Least distance between a label and lines, markers or other labels, millimetres."""
    marker_radius_mm: float = Field(default=1.3, gt=0.0)
    """Outer radius of a marker round the points it covers, millimetres."""
    interchange_radius_mm: float = Field(default=1.9, gt=0.0)
    """The same for interchanges and termini."""
    line_badges: bool = True
    """Whether a line's name stands in a small badge at its termini's names."""
    line_names_every_mm: float = Field(default=90.0, ge=0.0)
    """Along a line its name stands on it about this often, millimetres; 0 for never."""
    abbreviations: dict[str, str] = Field(default_factory=dict)
    """Short forms of words, tried for names that find no place otherwise."""
    sides: dict[str, Side] = Field(default_factory=dict)
    """Per station id the side that a person asks for; kept wherever it is free."""
    angles: dict[str, Literal[-45, 0, 45, 90]] = Field(default_factory=dict)
    """Per station id the degrees by which its name is to rise to the right; likewise."""
    short_names: dict[str, str] = Field(default_factory=dict)
    """Per station id what its label says instead of the name."""
    rows: dict[str, tuple[str, ...]] = Field(default_factory=dict)
    """Per station id what its label says, row by row."""
    remarks: dict[str, str] = Field(default_factory=dict)
    """Per station id words in small type below the name, behind the name in another language."""


@dataclass(frozen=True, slots=True)
class TextLine:
    """One line of text: baseline start before rotation about the label's pivot, millimetres."""

    text: str
    x_mm: float
    y_mm: float
    width_mm: float
    size_mm: float
    second: bool = False
    """Whether this line is the name in the second language."""


@dataclass(frozen=True, slots=True)
class Badge:
    """A line's name on its colour, beside a terminus's name: a box with rounded corners.

    All in millimetres before rotation about the label's pivot: `x_mm` and `y_mm` are the box's
    upper left corner, `text_x_mm` and `text_y_mm` the start of the baseline; the text is bold.
    """

    line_id: str
    text: str
    x_mm: float
    y_mm: float
    width_mm: float
    height_mm: float
    text_x_mm: float
    text_y_mm: float
    size_mm: float


@dataclass(frozen=True, slots=True)
class Label:
    """A placed station name; its lines are rotated by `angle_deg` (clockwise) about the pivot."""

    station_id: str
    bold: bool
    pivot_mm: Point
    angle_deg: float
    side: Side
    lines: tuple[TextLine, ...]
    outline_mm: tuple[Point, ...]
    """The four corners of the box that text and badges fill, after rotation."""
    badges: tuple[Badge, ...] = ()
    """Badges of the lines that end here, sorted by line id; rotated with the text."""


@dataclass(frozen=True, slots=True)
class RunBadge:
    """A line's name on the line itself, along a run; rotated by `angle_deg` about its middle."""

    line_id: str
    text: str
    at_mm: Point
    """The middle of the box, millimetres."""
    width_mm: float
    height_mm: float
    size_mm: float
    """Type size; the text is bold and stands in the middle of the box."""
    angle_deg: float
    """Clockwise; text reads from the left, or upwards."""


@dataclass(frozen=True, slots=True)
class LabelledLayout:
    """A bundled layout with its labels."""

    bundled: BundledLayout
    settings: LabelSettings
    labels: Mapping[str, Label]
    unplaced: tuple[str, ...]
    """Ids of stations whose label found no free place; empty in a good drawing."""
    abbreviated: Mapping[str, str] = field(default_factory=dict)
    """Per station id what its label says, where that is a short form of its name."""
    run_badges: tuple[RunBadge, ...] = ()
    """Names of lines along their runs, in the order of lines and their stretches."""
