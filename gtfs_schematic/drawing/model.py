"""What the drawing room gives: a scene of plain shapes and texts in sheet millimetres, y down."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

from pydantic import BaseModel, ConfigDict, Field, field_validator

from gtfs_schematic.geometry import Point

SHEET_SIZES: Mapping[str, tuple[int, int]] = {
    "A5": (148, 210),
    "A4": (210, 297),
    "A3": (297, 420),
    "A2": (420, 594),
    "A1": (594, 841),
    "A0": (841, 1189),
    "2A0": (1189, 1682),
    "4A0": (1682, 2378),
}
"""Short and long side in millimetres, rising (ISO 216:2007; 2A0 and 4A0 are DIN 476's doubles)."""
_LEAST_SIDE_MM, _MOST_SIDE_MM = 80.0, 5000.0


class SheetSettings(BaseModel):
    """The page on which the diagram stands."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    size: str = "auto"
    """"auto", a size of ISO 216 from A5 to A0, 2A0, 4A0, or width and height in mm: "420x297"."""
    orientation: Literal["auto", "portrait", "landscape"] = "auto"
    """"auto" follows the network, or the order in which width and height are given."""
    margin_mm: float | Literal["auto"] = "auto"
    """White margin on all sides, millimetres; "auto" is 10 on A4 and grows with the sheet."""
    bleed_mm: float = Field(default=0.0, ge=0.0, le=20.0)
    """How far the PDF's background reaches beyond the sheet's edge, with crop marks; 0 for none."""
    png_dpi: float = Field(default=0.0, ge=0.0, le=2400.0)
    """Resolution of a PNG image beside the PDF, pixels to the inch; 0 for none."""

    @field_validator("margin_mm")
    @classmethod
    def _not_negative(cls, margin: float | str) -> float | str:
        """Refuse a margin outside of the sheet."""
        if not isinstance(margin, str) and margin < 0.0:
            raise ValueError('the margin must be "auto", 0 or more millimetres')
        return margin

    @field_validator("size")
    @classmethod
    def _known(cls, size: str) -> str:
        """Refuse a size that is no size, and say what is one."""
        text = size.strip().replace("×", "x").lower()
        if text == "auto" or text.upper() in SHEET_SIZES:
            return text if text == "auto" else text.upper()
        sides = text.removesuffix("mm").split("x")
        try:
            width, height = (float(side) for side in sides)
        except ValueError:
            width = height = 0.0
        if not all(_LEAST_SIDE_MM <= side <= _MOST_SIDE_MM for side in (width, height)):
            raise ValueError(
                f'{size!r} is no sheet size: use "auto", {", ".join(SHEET_SIZES)}, or width and '
                f"height in millimetres from {_LEAST_SIDE_MM:g} to {_MOST_SIDE_MM:g}, "
                'such as "420x297".'
            )
        return f"{width:g}x{height:g}"


class DrawingSettings(BaseModel):
    """Colours and words of the sheet."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    title: str = ""
    """Title on the sheet; empty: the publisher's name and "network diagram"."""
    attribution: str = ""
    """Credit and licence line that the feed's publisher asks for."""
    background: str = Field(default="#FFFFFF", pattern=r"^#[0-9A-Fa-f]{6}$")
    ink: str = Field(default="#1B1F24", pattern=r"^#[0-9A-Fa-f]{6}$")
    water: str = Field(default="#D7E8F3", pattern=r"^#[0-9A-Fa-f]{6}$")
    """Colour of water in the background."""
    park: str = Field(default="#E0EDD7", pattern=r"^#[0-9A-Fa-f]{6}$")
    """Colour of parks in the background."""
    boundary: str = Field(default="#9AA3AB", pattern=r"^#[0-9A-Fa-f]{6}$")
    """Colour of boundaries in the background."""
    colors: Literal["auto", "feed", "distinct"] = "auto"
    """"feed" keeps the feed's colours, "distinct" gives every line its own, "auto" replaces
    those that more than half of the lines share or that look like another."""
    body_size_pt: float = Field(default=8.0, gt=0.0)
    """Type size of key and notes on A4, points; it and the title's grow with the sheet."""
    index: bool = False
    """List all stations with the square of a grid in which each stands."""
    show_headways: bool = True
    """Tell in the key how often each line runs by day on the service date."""
    show_step_free: bool = False
    """Mark step-free stations; off by default, since a feed's flags need a person's check."""
    mark_new: str = ""
    """Words at new stations and lines of a revised edition, such as "new" or "from {date}" with
    its first day; empty: none."""
    show_closed: str = Field(default="", pattern=r"^(\d{1,4}|\d{4}-\d{2}-\d{2})?$")
    """How long a revised edition shows closed stations struck through: before a date as
    YYYY-MM-DD, or for so many days from its first; empty: not at all."""
    line_remarks: dict[str, str] = Field(default_factory=dict)
    """Per line id a remark in the key; written by revise."""
    closed_sign: bool = False
    """Explain the sign of closed stations in the key; written by revise."""


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
