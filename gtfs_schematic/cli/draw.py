"""Command `draw`: from feeds to the folder of an edition."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from gtfs_schematic.cli import advice, options, words
from gtfs_schematic.cli.console import listening
from gtfs_schematic.errors import LimitExceededError

if TYPE_CHECKING:
    from gtfs_schematic.drift.limits import LimitResult
    from gtfs_schematic.pipeline import Result

_EPILOG = """\b
Example:
  gtfs-schematic draw feed.zip --out diagram --sheet A3
  gtfs-schematic draw feed.zip --mode metro --mode tram --date 2026-03-11 --out rail
"""

_WHERE = "edition.json lists all"

_GUARANTEES = (
    "Kept, by checks of their own: every segment at a multiple of {angles}°, no crossing that the "
    "ground does not have, order of lines round every station, clearances, no name over another "
    "name, a line or a marker"
)


@click.command(epilog=_EPILOG)
@options.feeds
@click.option(
    "--out",
    type=click.Path(path_type=Path),
    required=True,
    metavar="DIR",
    help="Folder to write; it holds this edition and nothing else.",
)
@options.overwrite
@options.feed_options
@options.draw_options
@options.adjustments
@options.limit
@options.as_json
@options.quiet
def draw(
    feeds: tuple[Path, ...],
    out: Path,
    **given: Any,  # noqa: ANN401 - the options of the registry
) -> int:
    """Draw FEED as one diagram, and write its edition into a folder: all files or none.

    FEED is a GTFS zip file or a folder; several are drawn as one network.
    """
    settings = options.settings_from(given)
    adjustments = options.adjustments_from(given)
    from gtfs_schematic.drift.limits import judge, limits_of
    from gtfs_schematic.edition.folder import check_target, write_folder

    limits = limits_of(settings.drift, given["limits"])
    check_target(out, overwrite=given["overwrite"])
    from gtfs_schematic.pipeline import draw as run
    from gtfs_schematic.pipeline import files_of

    with listening(quiet=given["quiet"]) as progress:
        result = run(feeds, settings, adjustments=adjustments, progress=progress)
        progress.phase("writing files")
        files = files_of(result, limits)
    if not given["quiet"]:
        advice.tell_expiry(result.network.info)
    write_folder(out, files, overwrite=given["overwrite"])
    judged = judge(result.drift, limits)
    if given["as_json"]:
        click.echo(to_json(result, out, files, judged))
    else:
        click.echo("\n".join(describe(result, out, files, judged)))
    return LimitExceededError.exit_code if any(each.exceeded for each in judged) else 0


def to_json(
    result: Result, out: Path, files: Mapping[str, bytes], limits: Sequence[LimitResult]
) -> bytes:
    """Write what was drawn, for machines."""
    from gtfs_schematic.network.between import from_station_to_station

    network = result.network
    document = {
        "out": str(out),
        "files": {name: hashlib.sha256(files[name]).hexdigest() for name in sorted(files)},
        "service_date": network.info.service_date,
        "lines": len(network.lines),
        "stations": len(network.stations),
        "interchange_groups": network.groups,
        "links": len(from_station_to_station(network)),
        "left_out": len(network.left_out),
        "findings": len(network.findings),
        "names_without_place": list(result.labelled.unplaced),
        "residual": {
            "north_up": round(result.drift.north_up.residual, 6),
            "free": round(result.drift.free.residual, 6),
        },
        "limits": [
            {"limit": str(each.limit), "measured": each.measured, "exceeded": each.exceeded}
            for each in limits
        ],
    }
    return json.dumps(document, ensure_ascii=False, indent=1).encode()


def describe(
    result: Result, out: Path, files: Mapping[str, bytes], limits: Sequence[LimitResult]
) -> list[str]:
    """Write what was drawn, for people."""
    from gtfs_schematic.drawing.words import CAUTIONS

    network, drawing = result.network, result.drawing
    return [
        f"{result.edition.title}, {drawing.width_mm:g} × {drawing.height_mm:g} mm",
        words.service_date(network.info),
        f"Drawn: {words.size(network)}",
        *words.left_out(network.left_out, where=_WHERE),
        *words.findings(network.findings, where=_WHERE),
        *_names(result),
        *_short_names(result),
        *_letters(result),
        *_contrast(result),
        *_background(result),
        _GUARANTEES.format(angles=result.layout.angles),
        *words.drift(result.drift),
        *words.limits(limits),
        f"Written to {out}:",
        *(f"  {name}  {len(files[name]) / 1000:.0f} kB" for name in sorted(files)),
        *(f"Caution: {caution}" for caution in CAUTIONS),
        "Caution: check the feed's licence for the attribution it asks for (--attribution).",
    ]


def _names(result: Result) -> list[str]:
    """Say which stations stand without their name."""
    missing = result.labelled.unplaced
    whole = len(result.network.stations)
    if not missing:
        return [f"Names: all {whole} placed"]
    rows = [f"{result.network.station[key].name} ({key})" for key in missing]
    head = f"Names: {whole - len(missing)} of {whole} placed; no room for"
    advice = "a larger sheet or smaller type gives room"
    return [head, *words.first_few(rows, everything=False, where=advice)]


def _short_names(result: Result) -> list[str]:
    """Say which names stand in a short form."""
    short = result.labelled.abbreviated
    if not short:
        return []
    rows = [f"{result.network.station[key].name}: {short[key]}" for key in sorted(short)]
    return [f"Abbreviated: {words.count(len(rows), 'name')}", *(f"  {row}" for row in rows)]


def _letters(result: Result) -> list[str]:
    """Say which names hold characters that the typeface lacks."""
    from gtfs_schematic.labels.fonts import advice_on, missing_characters

    rows: list[str] = []
    lacking: set[str] = set()
    for station in result.network.stations:
        missing = missing_characters(station.name + station.second_name)
        if missing:
            rows.append(f"{station.name} ({station.id}): {' '.join(missing)}")
            lacking.update(missing)
    if not rows:
        return []
    head = f"Typeface: {words.count(len(rows), 'name')} with characters that it lacks"
    listed = words.first_few(rows, everything=False, where="they are drawn as boxes")
    return [head, *listed, *filter(None, [advice_on(sorted(lacking))])]


def _background(result: Result) -> list[str]:
    """Say what lies beneath the network, and what does not although it was asked for."""
    background = result.background
    if not background.settings.files:
        return []
    drawn = words.count(len(background.shapes), "shape")
    rows = [f"{left.what}: {left.reason}" for left in background.left_out]
    head = f"Background: {drawn} drawn" + (f", {len(rows)} left out" if rows else "")
    return [head, *words.first_few(rows, everything=False, where="the others likewise")]


def _contrast(result: Result) -> list[str]:
    """Say which lines are hard to see on the paper (WCAG 2.2)."""
    from gtfs_schematic.drawing.contrast import contrast_findings

    found = contrast_findings(result.network, result.settings.drawing.background)
    if not found:
        return []
    rows = [finding.message for finding in found]
    head = f"Contrast: {words.count(len(found), 'colour')} below WCAG 2.2"
    return [head, *words.first_few(rows, everything=False, where="change them in the feed")]
