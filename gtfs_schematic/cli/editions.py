"""Command `editions`: list the editions of a folder."""

from __future__ import annotations

import json
from dataclasses import asdict
from pathlib import Path

import click

from gtfs_schematic.cli import options, words

_EPILOG = """\b
Example:
  gtfs-schematic editions archive
  gtfs-schematic changes archive/spring archive/summer
"""


@click.command(epilog=_EPILOG)
@click.argument("folder", metavar="FOLDER", type=click.Path(path_type=Path))
@options.as_json
def editions(folder: Path, *, as_json: bool) -> None:
    """List the editions in FOLDER, each after the one that it revises.

    To go back to an earlier edition, revise that one: no edition is ever altered.
    """
    from gtfs_schematic.edition.history import editions_in

    found, faults = editions_in(folder)
    if as_json:
        document = {"editions": [asdict(each) for each in found], "unreadable": list(faults)}
        click.echo(json.dumps(document, ensure_ascii=False, indent=1))
        return
    for each in found:
        dates = f"{each.start_date or '?'} to {each.end_date or '?'}"
        size = f"{words.count(each.stations, 'station')}, {words.count(each.lines, 'line')}"
        origin = "first"
        if each.previous:
            origin = f"revises {each.previous_name or each.previous[:12] + ' (not here)'}"
        click.echo(f"{each.name}  {each.title}, {dates}, {size}; {origin}")
    if not found:
        click.echo(f"No edition in {folder}.")
    for fault in faults:
        click.echo(f"Cannot be read: {fault}", err=True)
