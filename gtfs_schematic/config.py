"""Settings of a whole run: one frozen value, read from TOML, every unknown key refused."""

from __future__ import annotations

import datetime as dt
import difflib
import tomllib
from collections.abc import Mapping
from typing import Any

from pydantic import BaseModel, ConfigDict, ValidationError
from pydantic_core import ErrorDetails

from gtfs_schematic.background.model import BackgroundSettings
from gtfs_schematic.bundles.model import BundleSettings
from gtfs_schematic.drawing.marks import Marks
from gtfs_schematic.drawing.model import DrawingSettings, SheetSettings
from gtfs_schematic.drift.model import DriftSettings
from gtfs_schematic.edition.ratchet import RevisionSettings
from gtfs_schematic.errors import UsageError
from gtfs_schematic.feed.model import FeedSettings
from gtfs_schematic.labels.model import LabelSettings
from gtfs_schematic.layout.model import LayoutSettings
from gtfs_schematic.network.model import NetworkSettings


class Settings(BaseModel):
    """What each room may be told; `configs/standard.toml` explains every value."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    feed: FeedSettings = FeedSettings()
    network: NetworkSettings = NetworkSettings()
    layout: LayoutSettings = LayoutSettings()
    bundles: BundleSettings = BundleSettings()
    labels: LabelSettings = LabelSettings()
    background: BackgroundSettings = BackgroundSettings()
    drawing: DrawingSettings = DrawingSettings()
    sheet: SheetSettings = SheetSettings()
    drift: DriftSettings = DriftSettings()
    revision: RevisionSettings = RevisionSettings()


def settings_from_toml(data: bytes, name: str) -> Settings:
    """Read settings from a TOML file; what it leaves out keeps its default.

    Parameters
    ----------
    data
        The file.
    name
        What to call the file in an error.

    Raises
    ------
    UsageError
        If it is no TOML, or a key is unknown or has a wrong value; names the key's full path.
    """
    try:
        document = tomllib.loads(data.decode("utf-8-sig"))
    except ValueError as error:
        raise UsageError(f"{name}: not TOML in UTF-8 ({error}).") from error
    return settings_of(document, name)


def settings_of(values: Mapping[str, Any], name: str) -> Settings:
    """Make settings of nested tables, as TOML gives them.

    Raises
    ------
    UsageError
        If a key is unknown or has a wrong value; names the key's full path.
    """
    try:
        return Settings.model_validate(_plain(values))
    except ValidationError as error:
        raise UsageError("\n".join(_advice(each, name) for each in error.errors())) from error


def with_values(settings: Settings, values: Mapping[str, Any], name: str) -> Settings:
    """Give settings with some values changed, by full paths such as "layout.fidelity".

    Raises
    ------
    UsageError
        If a value is wrong.
    """
    tables = settings.model_dump()
    for path, value in values.items():
        room, key = path.split(".")
        tables[room][key] = value
    return settings_of(tables, name)


def with_wishes(
    settings: Settings, wishes: Mapping[str, Mapping[str, Mapping[str, object]]]
) -> Settings:
    """Give settings in which rooms heed what a person asked for.

    Parameters
    ----------
    settings
        What holds otherwise.
    wishes
        Per room and name of a mapping in its settings, what is added to that.
    """
    rooms = {}
    for room, tables in wishes.items():
        before = getattr(settings, room)
        after = {name: {**getattr(before, name), **table} for name, table in tables.items()}
        rooms[room] = before.model_copy(update=after)
    return settings.model_copy(update=rooms)


def with_marks(settings: Settings, marks: Marks) -> Settings:
    """Give settings in which labels and key hold the marks of a revised edition."""
    marked = with_wishes(
        settings,
        {"labels": {"remarks": marks.stations}, "drawing": {"line_remarks": marks.lines}},
    )
    drawing = marked.drawing.model_copy(update={"closed_sign": marks.closed_sign})
    return marked.model_copy(update={"drawing": drawing})


def _plain(value: Any) -> Any:  # noqa: ANN401 - TOML holds any of its kinds
    """Let a date stand without quotation marks."""
    if isinstance(value, Mapping):
        return {key: _plain(item) for key, item in value.items()}
    return value.isoformat() if isinstance(value, dt.date) else value


def _advice(error: ErrorDetails, name: str) -> str:
    path = ".".join(str(part) for part in error["loc"])
    if error["type"] == "extra_forbidden":
        *rooms, key = (str(part) for part in error["loc"])
        known = _keys(rooms)
        near = difflib.get_close_matches(key, known, 1, cutoff=0.5)
        where = ".".join(rooms)
        hint = f"did you mean {'.'.join([*rooms, near[0]])}?" if near else ""
        listed = f"known here: {', '.join(known)}"
        return f"{name}: unknown key {path}{f' in [{where}]' if where else ''}: {hint or listed}"
    message = error["msg"].removeprefix("Value error, ")
    return f"{name}: {path} = {error['input']!r}: {message}"


def _keys(rooms: list[str]) -> list[str]:
    """Give the known keys of a table."""
    model: type[BaseModel] = Settings
    for room in rooms:
        inner = model.model_fields[room].annotation if room in model.model_fields else None
        if not (isinstance(inner, type) and issubclass(inner, BaseModel)):
            return []
        model = inner
    return sorted(model.model_fields)
