"""What the drift room gives: how far a diagram departs from the ground, and whom it misleads."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from pydantic import BaseModel, ConfigDict, Field, field_validator

from gtfs_schematic.geometry import Point

CAUTION = (
    "A schematic diagram is not to scale. These figures compare it with straight lines between "
    "the feed's coordinates; they say nothing about walking routes, step-free access or safety."
)

PLANNING_RATIOS = (1.05, 1.15, 1.3, 1.5, 2.0)
"""Ratios of travel times above which journeys are counted."""


class DriftSettings(BaseModel):
    """From when on a departure from the ground is told, and how riders are taken to travel."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    neighbors: int = Field(default=5, ge=1)
    """How many nearest stations the measures of neighbourhood look at."""
    false_near_links: float = Field(default=1.0, gt=0.0)
    """Stations drawn no further apart than so many typical links look close."""
    false_far_m: float = Field(default=1500.0, gt=0.0)
    """Such stations are false neighbors if they lie further apart than this, metres."""
    hidden_far_links: float = Field(default=1.5, gt=0.0)
    """Stations drawn further apart than so many typical links look far."""
    hidden_near_m: float = Field(default=500.0, gt=0.0)
    """Such stations are a hidden walk if they lie no further apart than this, metres."""
    misleading_factor: float = Field(default=2.0, ge=1.0)
    """Both kinds of pairs are told only if the scale between them is off by this factor."""
    change_links: float = Field(default=3.0, ge=0.0)
    """What a change looks like to a rider who compares routes, in typical drawn links."""
    change_s: int = Field(default=180, ge=0)
    """Time of a change where the feed gives none, seconds."""
    day_from_h: float = Field(default=6.0, ge=0.0)
    """Journeys are those by day: trips that start at this hour or later, …"""
    day_to_h: float = Field(default=22.0, ge=0.0)
    """… and before this hour."""
    rare_share: float = Field(default=0.04, ge=0.0, le=1.0)
    """Rides that a smaller share of a line's trips makes are not taken for a choice."""
    longest_wait_s: int = Field(default=1800, ge=0)
    """Nobody waits longer than this, for of rare trips one knows the times, seconds."""
    walking_m_s: float = Field(default=1.2, gt=0.0)
    """Speed of walks for which the feed gives no time, metres per second."""
    most_origins: int = Field(default=1000, ge=1)
    """In larger networks journeys from only so many stations are measured, evenly chosen."""
    competing_difference: float = Field(default=0.2, gt=0.0)
    """Two routes are told if drawn lengths compare otherwise than true ones by this share."""
    competing_detour: float = Field(default=1.5, ge=1.0)
    """Routes compete if the longer is at most so many times the shorter on the ground."""
    listed: int = Field(default=30, ge=1)
    """How many of the worst pairs and journeys are spelled out."""
    limits: Mapping[str, float | str] = Field(default_factory=dict)
    """What measures must not exceed (or fall below), by their names in `drift.limits`."""

    @field_validator("limits", mode="before")
    @classmethod
    def _joined(cls, limits: object) -> object:
        """Let names with a dot stand bare in TOML, which reads a dot as a table in a table."""
        if not isinstance(limits, Mapping):
            return limits
        joined: dict[str, object] = {}
        for name, value in limits.items():
            parts = value if isinstance(value, Mapping) else {"": value}
            for rest, each in parts.items():
                joined[f"{name}.{rest}" if rest else str(name)] = each
        return joined


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
    """Displacement of one station after the north-up fit, and the map round it."""

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
    local_scale: float
    """Scale of the best local affine fit over that of the whole drawing; 1 is as everywhere."""
    local_rotation_deg: float
    """Clockwise turn of the best local affine fit, degrees."""


@dataclass(frozen=True, slots=True)
class LinkDrift:
    """Bearing and length change of one link, end to end.

    Both changes are None for a link whose ends share a place on the ground or on the sheet.
    """

    link_id: str
    start: str
    end: str
    true_length_m: float
    drawn_length_mm: float
    bearing_change_deg: float | None
    """Drawn minus true bearing, clockwise, in (-180, 180]."""
    length_ratio: float | None
    """Drawn length over true length, divided by the median of that over all links."""


@dataclass(frozen=True, slots=True)
class MisleadingPair:
    """Two stations that look close and are far, or look far and are close."""

    start: str
    end: str
    true_m: float
    drawn_mm: float
    drawn_links: float
    """Drawn distance in typical (median) drawn links."""
    departures: int | None
    """Departures of the service date at both stations; None without a timetable."""


@dataclass(frozen=True, slots=True)
class Leg:
    """One part of an itinerary: a ride on a line, or a walk (`line` is empty)."""

    line: str
    stations: tuple[str, ...]
    """All stations on the way as drawn, passed ones included."""
    wait_s: int
    time_s: int
    """Time in the vehicle or on foot; the change before a ride is not in it."""


@dataclass(frozen=True, slots=True)
class Itinerary:
    """A way from one station to another, spelled out."""

    legs: tuple[Leg, ...]
    time_s: int
    """Whole time with waits and changes, seconds."""
    drawn_mm: float
    """Drawn length with what its changes look like, millimetres."""


@dataclass(frozen=True, slots=True)
class Journey:
    """Two stations, the way between them that looks shortest and the one that is fastest."""

    start: str
    end: str
    ratio: float
    """Time of the way that looks shortest over the least time, at least 1."""
    looks_shortest: Itinerary
    fastest: Itinerary


@dataclass(frozen=True, slots=True)
class Journeys:
    """Theoretical planning error over all pairs of stations."""

    pairs: int
    """Ordered pairs of stations of different interchanges, one reached from the other."""
    unreached: int
    """Ordered pairs that no sequence of rides and walks joins."""
    origins: int
    """Stations from which journeys were measured."""
    mean: float
    median: float
    p95: float
    largest: float
    over: tuple[tuple[float, float], ...]
    """(ratio, share of pairs above it) for each of `PLANNING_RATIOS`."""
    worst: tuple[Journey, ...]


@dataclass(frozen=True, slots=True)
class CompetingRoutes:
    """Two ways between the same stations whose drawn lengths compare otherwise than true ones."""

    first: tuple[str, ...]
    """Ids of the stations of the way that is shorter on the ground."""
    second: tuple[str, ...]
    true_m: tuple[float, float]
    drawn_mm: tuple[float, float]
    difference: float
    """Share by which the second is drawn too long (above 0) or too short against the first."""


@dataclass(frozen=True, slots=True)
class Warp:
    """The local affine field: a square grid on the ground, and where the drawing takes it."""

    columns: int
    rows: int
    true_mm: tuple[Point, ...]
    """Row by row from the north-west, by the north-up fit, sheet millimetres, y down."""
    drawn_mm: tuple[Point, ...]
    near: tuple[bool, ...]
    """Whether any station is near enough for the field to mean something."""


@dataclass(frozen=True, slots=True)
class DriftSummary:
    """The whole diagram in a few figures."""

    displacement_median_share: float
    displacement_p95_share: float
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
    octant_agreement: float
    """Share of pairs of stations that are seen in the same eighth of the compass."""
    distance_correlation: float
    """Pearson's correlation of true and drawn distance over all pairs of stations."""
    distance_rank_correlation: float
    """Spearman's correlation of the same."""
    link_correlation: float
    """Pearson's correlation of true and drawn length over links."""
    link_rank_correlation: float
    """Spearman's correlation of the same."""
    neighbor_agreement: float
    """Mean share of a station's nearest on the ground that are among its nearest drawn."""
    trustworthiness: float
    """1 if no station is drawn near to others that it is not near to."""
    continuity: float
    """1 if no station is drawn away from others that it is near to."""


@dataclass(frozen=True, slots=True)
class DriftReport:
    """All measures of one diagram; tuples in the order of the diagram, pairs the worst first."""

    north_up: Fit
    free: Fit
    diagonal_m: float
    stations: tuple[StationDrift, ...]
    links: tuple[LinkDrift, ...]
    summary: DriftSummary
    warp: Warp
    typical_link_mm: float
    """Median drawn length of a link, 0 without links."""
    false_neighbors: tuple[MisleadingPair, ...] = ()
    hidden_walks: tuple[MisleadingPair, ...] = ()
    competing: tuple[CompetingRoutes, ...] = ()
    settings: DriftSettings = field(default_factory=DriftSettings)
    """What the lists of pairs and the journeys were measured with."""
    journeys: Journeys | None = None
    """None if the diagram knows no timetable."""
