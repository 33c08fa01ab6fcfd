"""What a person overrides in a diagram: `adjustments.toml`, keyed by ids of the feed."""

from __future__ import annotations

import difflib
import tomllib
from collections.abc import Mapping
from typing import Annotated, Any, Literal, get_args

from pydantic import BaseModel, ConfigDict, Field, ValidationError, model_validator
from pydantic_core import ErrorDetails

from gtfs_schematic.edition.contradictions import contradictions
from gtfs_schematic.errors import UsageError
from gtfs_schematic.labels.model import Side

Color = Annotated[str, Field(pattern=r"^#[0-9A-Fa-f]{6}$")]
Id = Annotated[str, Field(min_length=1)]
Angle = Literal[-45, 0, 45, 90]


class _Table(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class PinFrom(_Table):
    """Where a station stands as seen from another; `dy_mm = 0` alone puts it level with that."""

    station: Id
    dx_mm: float | None = None
    """Millimetres to the right of it; None: as it falls."""
    dy_mm: float | None = None
    """Millimetres below it."""

    @model_validator(mode="after")
    def _says_something(self) -> PinFrom:
        """Refuse what leaves both open."""
        if self.dx_mm is None and self.dy_mm is None:
            raise ValueError("give dx_mm, dy_mm or both, in millimetres")
        return self


class StationAdjustment(_Table):
    """What a person says of one station."""

    name: str = ""
    """Name to draw instead of the feed's."""
    short_name: str = ""
    """What its label says instead; lists and the change sheet keep the whole name."""
    label_rows: tuple[Id, ...] = ()
    """The same, row by row."""
    label_side: Side | None = None
    """Where the name stands as seen from the marker."""
    label_angle: Angle | None = None
    """Degrees by which the name rises to the right; 0 is level."""
    pin_mm: tuple[float, float] | None = None
    """Place that the station keeps: millimetres from the sheet's left and top."""
    pin_from: PinFrom | None = None
    """Place that it keeps as seen from another station."""
    straight: tuple[Id, ...] = ()
    """Lines that go straight through; of one that branches here, one branch."""
    hide: bool = False
    """Whether lines pass the station as if it were not there."""
    note: str = ""
    """A remark for whoever reads the change sheet."""


class LineAdjustment(_Table):
    """What a person says of one line."""

    name: str = ""
    color: Color | None = None
    text_color: Color | None = None
    hide: bool = False
    note: str = ""


class LinkAdjustment(_Table):
    """What a person says of one link, as seen from its first station towards its second."""

    between: tuple[Id, Id]
    direction: Side | None = None
    """Where the link leads, straight on; N is up the sheet."""
    order: tuple[Id, ...] = ()
    """Its lines from left to right; those left out stand where they fall."""
    note: str = ""


class LineGroup(_Table):
    """Lines that riders take for one."""

    lines: Annotated[tuple[Id, ...], Field(min_length=2)]
    name: str = ""
    """Name of the whole; the first line's if empty."""
    color: Color | None = None
    """The first line's if none is given."""
    text_color: Color | None = None


class Merge(_Table):
    """Stations that riders take for one."""

    stations: Annotated[tuple[Id, ...], Field(min_length=2)]
    name: str = ""
    """Name of the whole; the first station's if empty."""


class Part(_Table):
    """One of the stations that a station is split into."""

    stops: Annotated[tuple[Id, ...], Field(min_length=1)]
    name: str = ""
    """Name of the part; the feed's name of its first stop if empty."""
    id: str = ""
    """Id of the part; the least of its stops' if empty. The first part has the station's."""


class Split(_Table):
    """A station that riders take for several; stops that no part names stay with the first."""

    station: Id
    parts: Annotated[tuple[Part, ...], Field(min_length=2)]


class Same(_Table):
    """What of an edition a thing of the next feed is, whatever the program thinks."""

    old: Id
    """Id in the earlier edition."""
    new: str
    """Id in the later feed; empty if it is gone."""


class Adjustments(_Table):
    """All overrides of a diagram; stations by id or by any of their stops', lines likewise."""

    stations: dict[Id, StationAdjustment] = Field(default_factory=dict)
    lines: dict[Id, LineAdjustment] = Field(default_factory=dict)
    abbreviations: dict[Id, str] = Field(default_factory=dict)
    """Words of station names and what to write for them, such as Street = "St"."""
    links: tuple[LinkAdjustment, ...] = ()
    group: tuple[LineGroup, ...] = ()
    merge: tuple[Merge, ...] = ()
    split: tuple[Split, ...] = ()
    same_station: tuple[Same, ...] = ()
    same_line: tuple[Same, ...] = ()


def adjustments_from_toml(data: bytes, name: str) -> Adjustments:
    """Read adjustments from a TOML file.

    Parameters
    ----------
    data
        The file.
    name
        What to call the file in an error.

    Raises
    ------
    UsageError
        If it is no TOML, a key is unknown or has a wrong value, or two adjustments contradict
        each other; names the full path.
    """
    try:
        document = tomllib.loads(data.decode("utf-8-sig"))
    except ValueError as error:
        raise UsageError(f"{name}: not TOML in UTF-8 ({error}).") from error
    return adjustments_of(document, name)


def adjustments_of(values: Mapping[str, Any], name: str) -> Adjustments:
    """Make adjustments of nested tables, as TOML and JSON give them.

    Raises
    ------
    UsageError
        As `adjustments_from_toml` does.
    """
    try:
        found = Adjustments.model_validate(values)
    except ValidationError as error:
        raise UsageError("\n".join(_advice(each, name) for each in error.errors())) from error
    problem = next(contradictions(found), None)
    if problem:
        raise UsageError(f"{name}: {problem}.")
    return found


def plain(adjustments: Adjustments) -> dict[str, Any]:
    """Give adjustments as nested tables without what stands at its default."""
    return adjustments.model_dump(mode="json", exclude_defaults=True)


def _advice(error: ErrorDetails, name: str) -> str:
    path = ".".join(str(part) for part in error["loc"])
    if error["type"] == "extra_forbidden":
        *above, key = error["loc"]
        known = _keys(above)
        near = difflib.get_close_matches(str(key), known, 1, cutoff=0.5)
        hint = f"did you mean {near[0]}?" if near else f"known here: {', '.join(known)}"
        return f"{name}: unknown key {path}: {hint}"
    message = error["msg"].removeprefix("Value error, ")
    return f"{name}: {path} = {error['input']!r}: {message}"


def _keys(path: list[int | str]) -> list[str]:
    """Give the known keys of the table at a path."""
    model: Any = Adjustments
    for part in path:
        if isinstance(model, type) and issubclass(model, BaseModel):
            model = model.model_fields[str(part)].annotation
        else:
            # Of a mapping the values count, of a list its items: both stand among the arguments.
            model = next(
                (a for a in get_args(model) if isinstance(a, type) and issubclass(a, BaseModel)),
                model,
            )
    return sorted(getattr(model, "model_fields", ()))
