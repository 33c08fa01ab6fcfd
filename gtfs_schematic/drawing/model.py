"""What the drawing room gives: a scene of plain shapes and texts in sheet millimetres, y down."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

from pydantic import BaseModel, ConfigDict, Field

from gtfs_schematic.geometry import Point


class DrawingSettings(BaseModel):
    """Colours and words of the sheet."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    title: str = ""
    """Title on the sheet; empty: the publisher's name and "network diagram"."""
    attribution: str = ""
    """Credit and licence line that the feed's publisher asks for."""
    background: str = Field(default="#FFFFFF", pattern=r"^#[0-9A-Fa-f]{6}$")
    ink: str = Field(default="#1B1F24", pattern=r"^#[0-9A-Fa-f]{6}$")
    show_step_free: bool = False
    """Mark step-free stations; off by default, since a feed's flags need a person's check."""


@dataclass(frozen=True, slots=True)
class PathShape:
    """An SVG path: `d` in user units of millimetres."""

    d: str
    stroke: str | None = None
    stroke_width: float = 0.0
    fill: str | None = None
    dash: tuple[float, ...] = ()
    cap: Literal["butt", "round"] = "round"


@dataclass(frozen=True, slots=True)
class TextShape:
    """One run of text with its baseline start at (x, y), rotated clockwise about the pivot."""

    text: str
    x: float
    y: float
    size: float
    fill: str
    width: float
    """Measured advance width, millimetres."""
    bold: bool = False
    angle_deg: float = 0.0
    pivot: Point = (0.0, 0.0)
    css_class: str = ""
    lang: str = ""


@dataclass(frozen=True, slots=True)
class Group:
    """Shapes that belong together; `data` becomes data-… attributes, `title` the <title>."""

    css_class: str
    children: tuple[PathShape | TextShape | Group, ...]
    data: Mapping[str, str] = field(default_factory=dict)
    title: str = ""


@dataclass(frozen=True, slots=True)
class Drawing:
    """The whole sheet."""

    width_mm: float
    height_mm: float
    title: str
    description: str
    lang: str
    background: str
    groups: tuple[Group, ...]
