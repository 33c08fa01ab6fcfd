"""What a person overrides in a diagram: `adjustments.toml`, keyed by ids of the feed."""

from __future__ import annotations

import difflib
import tomllib
from collections.abc import Iterable, Iterator, Mapping
from typing import Annotated, Any, get_args

from pydantic import BaseModel, ConfigDict, Field, ValidationError, model_validator
from pydantic_core import ErrorDetails

from gtfs_schematic.errors import UsageError
from gtfs_schematic.labels.model import Side

Color = Annotated[str, Field(pattern=r"^#[0-9A-Fa-f]{6}$")]
Id = Annotated[str, Field(min_length=1)]


class _Table(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class StationAdjustment(_Table):
    """What a person says of one station."""

    name: str = ""
    """Name to draw instead of the feed's."""
    label_side: Side | None = None
    """Where the name stands as seen from the marker."""
    pin_mm: tuple[float, float] | None = None
    """Place that the station keeps: millimetres from the sheet's left and top."""
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
    merge: tuple[Merge, ...] = ()
    split: tuple[Split, ...] = ()
    same_station: tuple[Same, ...] = ()
    same_line: tuple[Same, ...] = ()

    @model_validator(mode="after")
    def _agree(self) -> Adjustments:
        """Refuse what contradicts itself on the face of it, naming both."""
        found = next(_contradictions(self), None)
        if found:
            raise ValueError(found)
        return self


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
        return Adjustments.model_validate(values)
    except ValidationError as error:
        raise UsageError("\n".join(_advice(each, name) for each in error.errors())) from error


def translated(
    adjustments: Adjustments, stations: Mapping[str, str], lines: Mapping[str, str]
) -> Adjustments:
    """Give adjustments by other ids of the same things.

    Parameters
    ----------
    adjustments
        As a person wrote them.
    stations, lines
        Other ids by those that stand there; what is in neither keeps its own.
    """

    def station(key: str) -> str:
        return stations.get(key, key)

    return adjustments.model_copy(
        update={
            "stations": {station(k): v for k, v in adjustments.stations.items()},
            "lines": {lines.get(k, k): v for k, v in adjustments.lines.items()},
            "merge": tuple(
                each.model_copy(update={"stations": tuple(map(station, each.stations))})
                for each in adjustments.merge
            ),
            "split": tuple(
                each.model_copy(update={"station": station(each.station)})
                for each in adjustments.split
            ),
        }
    )


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
    if not error["loc"]:
        return f"{name}: {message}"
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


def _contradictions(adjustments: Adjustments) -> Iterator[str]:
    """Say which adjustments cannot both hold, whatever the feed."""
    merged = [(f"merge.{i}", s) for i, m in enumerate(adjustments.merge) for s in m.stations]
    split = [(f"split.{i}", each.station) for i, each in enumerate(adjustments.split)]
    yield from _twice([*merged, *split], "station")
    for kind in ("same_station", "same_line"):
        for side in ("old", "new"):
            ids = [getattr(same, side) for same in getattr(adjustments, kind)]
            places = [(f"{kind}.{i}.{side}", key) for i, key in enumerate(ids) if key]
            yield from _twice(places, "id")


def _twice(places: Iterable[tuple[str, str]], noun: str) -> Iterator[str]:
    first: dict[str, str] = {}
    for where, key in places:
        if key in first:
            yield f"{first[key]} and {where} contradict each other about {noun} {key}"
        first[key] = where
