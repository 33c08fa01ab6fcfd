"""Write an edition as JSON and read it back, strictly."""

from __future__ import annotations

import json
from dataclasses import fields
from importlib.metadata import version
from typing import Annotated, Any, Literal, NoReturn

from pydantic import BaseModel, ConfigDict, Field, ValidationError

from gtfs_schematic.drift.placed import TimedPattern
from gtfs_schematic.edition.check import faults
from gtfs_schematic.edition.model import (
    Edition,
    EditionDrift,
    EditionFeed,
    EditionJunction,
    EditionLine,
    EditionLink,
    EditionStation,
    EditionWalk,
)
from gtfs_schematic.errors import EditionError

Row = dict[str, Any]
_Row = (
    EditionDrift
    | EditionFeed
    | EditionStation
    | EditionLine
    | EditionLink
    | EditionWalk
    | EditionJunction
    | TimedPattern
)

FORMAT = "gtfs-schematic/edition"
VERSION = 1

_NAMES = {"start": "from", "end": "to"}

Degrees = Annotated[float, Field(ge=-180.0, le=180.0)]
Color = Annotated[str, Field(pattern=r"^#[0-9A-Fa-f]{6}$")]
PathMm = Annotated[list[tuple[float, float]], Field(min_length=2)]


class _Part(BaseModel):
    """A part of the document: known fields are strict, fields of later versions are let by."""

    model_config = ConfigDict(
        strict=True, extra="ignore", allow_inf_nan=False, validate_by_name=True
    )


class _Feed(_Part):
    sha256: str
    publisher: str
    version: str
    start_date: str
    end_date: str
    service_date: str


class _Sheet(_Part):
    width_mm: float = Field(gt=0.0)
    height_mm: float = Field(gt=0.0)
    rotation_deg: float = 0.0
    angles: int = Field(default=45, gt=0)


class _Station(_Part):
    id: str
    name: str
    stop_ids: list[str]
    lon: Degrees
    lat: Annotated[float, Field(ge=-90.0, le=90.0)]
    x_mm: float
    y_mm: float
    kind: Literal["stop", "interchange", "terminus"]
    lines: list[str]
    group: str
    label_side: str = ""
    change_s: Annotated[int, Field(ge=0)] | None = None
    stop_codes: list[str] = []
    second_name: str = ""
    boarding: Literal["unknown", "yes", "no"] = "unknown"


class _Link(_Part):
    id: str
    start: str = Field(alias="from")
    end: str = Field(alias="to")
    lines: list[str]
    path_mm: PathMm
    via: list[str] = []


class _Junction(_Part):
    id: str
    lon: Degrees
    lat: Annotated[float, Field(ge=-90.0, le=90.0)]
    x_mm: float
    y_mm: float


class _Walk(_Part):
    id: str
    start: str = Field(alias="from")
    end: str = Field(alias="to")
    time_s: int | None
    path_mm: PathMm


class _Line(_Part):
    id: str
    name: str
    color: Color
    text_color: Color
    route_ids: list[str]
    itineraries: list[list[str]]
    long_name: str = ""
    mode: str = ""
    service: str = ""
    trips: Annotated[int, Field(ge=0)] = 0
    first_departure_s: int | None = None
    last_departure_s: int | None = None
    headway_s: int | None = None


class _Pattern(_Part):
    line: str
    stations: list[str] = Field(min_length=2)
    times_s: list[int]
    departures_s: list[int] = Field(min_length=1)


class _Drift(_Part):
    edition: Annotated[str, Field(pattern=r"^([0-9a-f]{64})?$")]
    service_date: str
    residual: float


class _LeftOut(_Part):
    kind: str
    id: str
    reason: str


class _Document(_Part):
    format: Literal["gtfs-schematic/edition"]
    version: Literal[1]
    title: str
    feed: _Feed
    sheet: _Sheet
    stations: list[_Station]
    links: list[_Link]
    lines: list[_Line]
    walks: list[_Walk] = []
    junctions: list[_Junction] = []
    parts: list[_Link] = []
    patterns: list[_Pattern] = []
    left_out: list[_LeftOut] = []
    findings: list[str] = []
    previous: Annotated[str, Field(pattern=r"^([0-9a-f]{64})?$")] = ""
    state_sha256: Annotated[str, Field(pattern=r"^([0-9a-f]{64})?$")] = ""
    drifts: list[_Drift] = []
    settings: dict[str, Any] = {}
    adjustments: dict[str, Any] = {}


def to_json(edition: Edition) -> bytes:
    """Write an edition as the schema `edition.schema.json` says: UTF-8, one row a line.

    Raises
    ------
    EditionError
        If the edition contradicts itself: what cannot be read back is not written.
    """
    found = faults(edition)
    if found:
        raise EditionError(f"The edition contradicts itself: {'; '.join(found[:5])}.")
    head = {
        "format": FORMAT,
        "version": VERSION,
        "made_by": f"gtfs-schematic {version('gtfs-schematic')}",
        "title": edition.title,
        "feed": _plain(edition.feed),
        "sheet": {
            "width_mm": edition.width_mm,
            "height_mm": edition.height_mm,
            **({"rotation_deg": edition.rotation_deg} if edition.rotation_deg else {}),
            **({"angles": edition.angles} if edition.angles != 45 else {}),
        },
        "previous": edition.previous,
        "state_sha256": edition.state_sha256,
        "drifts": [_plain(each) for each in edition.drifts],
        "settings": edition.settings,
        "adjustments": edition.adjustments,
    }
    tables: dict[str, list[Any]] = {
        "stations": [_plain(station) for station in edition.stations],
        "links": [_plain(link) for link in edition.links],
        "walks": [_plain(walk) for walk in edition.walks],
        "junctions": [_plain(junction) for junction in edition.junctions],
        "parts": [_plain(part) for part in edition.parts],
        "lines": [_plain(line) for line in edition.lines],
        "patterns": [_plain(pattern) for pattern in edition.patterns],
        "left_out": [{"kind": k, "id": i, "reason": r} for k, i, r in edition.left_out],
        "findings": list(edition.findings),
    }
    parts = [f"{_dump(key)}: {_dump(value)}" for key, value in head.items()]
    for key, rows in tables.items():
        body = ",\n  ".join(_dump(row) for row in rows)
        parts.append(f"{_dump(key)}: [\n  {body}]" if rows else f"{_dump(key)}: []")
    return ("{" + ",\n ".join(parts) + "}\n").encode("utf-8")


def from_json(data: bytes) -> Edition:
    """Read an edition.

    Raises
    ------
    EditionError
        If `data` is no edition of a version that this program knows, or contradicts itself;
        names the field.
    """
    try:
        raw = json.loads(data.decode("utf-8"), parse_constant=_refuse)
    except (ValueError, RecursionError) as error:
        raise EditionError(
            f"edition.json: not JSON in UTF-8 ({error}). Give a folder or file that draw wrote."
        ) from error
    if not isinstance(raw, dict) or raw.get("format") != FORMAT:
        raise EditionError(
            f'edition.json: no "format": "{FORMAT}". Give a folder or file that draw wrote.'
        )
    if raw.get("version") != VERSION:
        raise EditionError(
            f"edition.json: version {raw.get('version')!r}, but this program reads version "
            f"{VERSION}. Update the program, or draw the edition again."
        )
    try:
        # JSON mode lets lists stand for tuples, yet takes no text for a number.
        document = _Document.model_validate_json(json.dumps(raw))
    except ValidationError as error:
        raise EditionError(_first_error(error)) from error
    edition = _edition(document)
    found = faults(edition)
    if found:
        raise EditionError(
            f"edition.json: {'; '.join(found[:5])}. Was it edited by hand? Draw it again."
        )
    return edition


def _edition(document: _Document) -> Edition:
    return Edition(
        title=document.title,
        feed=EditionFeed(**document.feed.model_dump()),
        width_mm=document.sheet.width_mm,
        height_mm=document.sheet.height_mm,
        rotation_deg=document.sheet.rotation_deg,
        angles=document.sheet.angles,
        stations=tuple(EditionStation(**_frozen(part)) for part in document.stations),
        links=tuple(EditionLink(**_frozen(part)) for part in document.links),
        lines=tuple(EditionLine(**_frozen(part)) for part in document.lines),
        left_out=tuple((part.kind, part.id, part.reason) for part in document.left_out),
        findings=tuple(document.findings),
        walks=tuple(EditionWalk(**_frozen(part)) for part in document.walks),
        drifts=tuple(EditionDrift(**_frozen(part)) for part in document.drifts),
        patterns=tuple(TimedPattern(**_frozen(part)) for part in document.patterns),
        junctions=tuple(EditionJunction(**_frozen(part)) for part in document.junctions),
        parts=tuple(EditionLink(**_frozen(part)) for part in document.parts),
        previous=document.previous,
        state_sha256=document.state_sha256,
        settings=document.settings,
        adjustments=document.adjustments,
    )


def _first_error(error: ValidationError) -> str:
    first = error.errors()[0]
    place = ".".join(str(part) for part in first["loc"])
    return f"edition.json: {place}: {first['msg']}. Was it edited by hand? Draw it again."


def _frozen(part: _Part) -> dict[str, Any]:
    return {key: _tuples(value) for key, value in part.model_dump().items()}


def _tuples(value: Any) -> Any:  # noqa: ANN401 - JSON holds any of its kinds
    return tuple(_tuples(item) for item in value) if isinstance(value, list | tuple) else value


def _plain(value: _Row) -> Row:
    """Give a part's fields by name, `start` and `end` as "from" and "to"; no empty `via`."""
    row = {_NAMES.get(part.name, part.name): getattr(value, part.name) for part in fields(value)}
    if row.get("via") == ():
        del row["via"]
    return row


def _dump(value: object) -> str:
    return json.dumps(value, ensure_ascii=False, allow_nan=False)


def _refuse(text: str) -> NoReturn:
    raise ValueError(f"{text} is no number")
