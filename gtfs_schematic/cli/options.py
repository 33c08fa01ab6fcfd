"""Arguments and options that several commands share, each said once."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeVar

import click

from gtfs_schematic.errors import UsageError

if TYPE_CHECKING:
    from gtfs_schematic.config import Settings
    from gtfs_schematic.edition.adjustments import Adjustments

Command = TypeVar("Command", bound=Callable[..., Any])

SETTINGS = {
    "date": "feed.date",
    "mode": "feed.modes",
    "agency": "feed.agencies",
    "route": "feed.routes",
    "without_route": "feed.without_routes",
    "min_trips": "feed.min_trips",
    "language": "feed.language",
    "sheet": "sheet.size",
    "orientation": "sheet.orientation",
    "fidelity": "layout.fidelity",
    "effort": "layout.effort",
    "title": "drawing.title",
    "attribution": "drawing.attribution",
    "background": "background.files",
}
"""Which setting each option changes."""

feeds = click.argument(
    "feeds", nargs=-1, required=True, metavar="FEED...", type=click.Path(path_type=Path)
)
edition = click.argument("edition", metavar="EDITION", type=click.Path(path_type=Path))
as_json = click.option("--json", "as_json", is_flag=True, help="Write JSON on standard output.")
overwrite = click.option("--overwrite", is_flag=True, help="Replace what an earlier run wrote.")
quiet = click.option("--quiet", "-q", is_flag=True, help="No progress on standard error.")
limit = click.option(
    "--limit",
    "limits",
    multiple=True,
    metavar="NAME=VALUE",
    help="Exit with 4 if the drift exceeds this, such as displacement-p95=8%; repeatable.",
)

config = click.option(
    "--config",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Settings as TOML; configs/standard.toml explains them all.",
)

adjustments = click.option(
    "--adjustments",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="What you override, as TOML: names, colors, sides of names, pins, merges and more.",
)

_FEED_OPTIONS = (
    click.option(
        "--date",
        metavar="DATE",
        help="YYYY-MM-DD, a range YYYY-MM-DD/YYYY-MM-DD, typical-weekday (the default), saturday, "
        "sunday, night, or busiest.",
    ),
    click.option("--mode", multiple=True, metavar="MODE", help="Keep this mode only; repeatable."),
    click.option(
        "--agency", multiple=True, metavar="NAME", help="Keep this agency only; repeatable."
    ),
    click.option(
        "--route", multiple=True, metavar="NAME", help="Keep this route only; repeatable."
    ),
    click.option(
        "--without-route", multiple=True, metavar="NAME", help="Leave this route out; repeatable."
    ),
    click.option(
        "--min-trips", type=int, metavar="N", help="Leave out lines with fewer trips on that date."
    ),
    click.option("--language", metavar="TAG", help="Second language for names, as a BCP 47 tag."),
    config,
)
_DRAW_OPTIONS = (
    click.option("--sheet", metavar="SIZE", help="A4, A3 … 4A0, auto, or millimetres: 420x297."),
    click.option(
        "--orientation", metavar="WAY", help="portrait, landscape, or auto: as suits the network."
    ),
    click.option(
        "--fidelity", type=float, metavar="0…1", help="1 keeps geography, 0 spaces stations evenly."
    ),
    click.option("--effort", metavar="LEVEL", help="quick, standard or thorough."),
    click.option("--title", metavar="TEXT", help="Title on the sheet."),
    click.option("--attribution", metavar="TEXT", help="Credit that the feed's licence asks for."),
    click.option(
        "--background",
        multiple=True,
        metavar="FILE",
        help="GeoJSON of water, parks and boundaries to lie beneath; repeatable.",
    ),
)


def feed_options(command: Command) -> Command:
    """Give a command the options that choose what of a feed is used."""
    return _with(_FEED_OPTIONS, command)


def draw_options(command: Command) -> Command:
    """Give a command the options that change the picture."""
    return _with(_DRAW_OPTIONS, command)


def read_bytes(path: Path, what: str) -> bytes:
    """Read a file that the user named.

    Raises
    ------
    UsageError
        If it cannot be read.
    """
    try:
        return path.read_bytes()
    except OSError as error:
        raise UsageError(f"{path}: cannot read the {what} ({error.strerror or error}).") from error


def adjustments_from(given: Mapping[str, Any]) -> Adjustments | None:
    """Give the adjustments of a file that the user named; None if none was.

    Raises
    ------
    UsageError
        If it cannot be read, or an adjustment is wrong.
    """
    path = given.get("adjustments")
    if path is None:
        return None
    from gtfs_schematic.edition.adjustments import adjustments_from_toml

    return adjustments_from_toml(read_bytes(path, "adjustments"), str(path))


def write_file(path: Path, data: bytes) -> None:
    """Write a file that the user named.

    Raises
    ------
    UsageError
        If it cannot be written.
    """
    try:
        path.write_bytes(data)
    except OSError as error:
        raise UsageError(
            f"{path}: cannot be written ({error.strerror or error}). Name another file."
        ) from error


def write_report(folder: Path, files: Mapping[str, bytes], *, overwrite: bool) -> None:
    """Write a report into a folder of its own.

    Raises
    ------
    UsageError
        If it holds an edition, or files that must not be replaced.
    """
    if (folder / "edition.json").exists():
        raise UsageError(f"{folder}: an edition stands there. Choose another folder with --out.")
    standing = [name for name in files if (folder / name).exists()]
    if standing and not overwrite:
        raise UsageError(
            f"{folder}: {standing[0]} stands there already. Give --overwrite to replace it, or "
            "choose another folder with --out."
        )
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise UsageError(
            f"{folder}: cannot be made ({error.strerror or error}). Choose another folder."
        ) from error
    for name in sorted(files):
        write_file(folder / name, files[name])


def settings_from(given: Mapping[str, Any], base: Mapping[str, Any] | None = None) -> Settings:
    """Give the settings of a configuration file and the options that win over it.

    Parameters
    ----------
    given
        The command's options by name; those that are None or empty were not given.
    base
        Settings that hold where no configuration is given, as nested tables.
    """
    from gtfs_schematic.config import settings_from_toml, settings_of, with_values

    config = given.get("config")
    settings = (
        settings_from_toml(read_bytes(config, "configuration"), str(config))
        if config is not None
        else settings_of(base or {}, "settings of the edition")
    )
    values = {
        SETTINGS[name]: value
        for name, value in given.items()
        if name in SETTINGS and value is not None and value != ()
    }
    return with_values(settings, values, "option") if values else settings


def _with(options: tuple[Callable[[Command], Command], ...], command: Command) -> Command:
    for option in reversed(options):
        command = option(command)
    return command
