"""Command `editions`: list the editions of a folder, and go back to an earlier one."""

from __future__ import annotations

import json
from dataclasses import asdict
from pathlib import Path

import click

from gtfs_schematic.cli import options, words
from gtfs_schematic.errors import UsageError

_EPILOG = """\b
Example:
  gtfs-schematic editions archive
  gtfs-schematic changes archive/spring archive/summer
  gtfs-schematic editions archive --back-to spring --as autumn
"""


@click.command(epilog=_EPILOG)
@click.argument("folder", metavar="FOLDER", type=click.Path(path_type=Path))
@click.option(
    "--back-to", metavar="NAME", help="Make an edition like this one that follows the latest."
)
@click.option("--as", "name", metavar="NAME", help="Folder of the edition that --back-to makes.")
@options.as_json
def editions(folder: Path, back_to: str | None, name: str | None, *, as_json: bool) -> None:
    """List the editions in FOLDER, each after the one that it revises.

    With --back-to, an earlier one is issued again: its diagram, to the letter, with a change sheet
    against the latest. No edition is ever altered or taken away, so that this, too, can be undone.
    """
    if (back_to is None) != (name is None):
        raise UsageError("--back-to and --as go together: which edition, and its new folder.")
    if back_to is not None and name is not None:
        _go_back(folder, back_to, name, as_json=as_json)
        return
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


def _go_back(folder: Path, back_to: str, name: str, *, as_json: bool) -> None:
    """Issue an earlier edition again."""
    if not name or name.startswith(".") or Path(name).name != name:
        raise UsageError(f"--as {name}: give the name of a folder within {folder}.")
    from gtfs_schematic.edition.folder import check_target, write_folder
    from gtfs_schematic.edition.history import gone_back_to

    check_target(folder / name, overwrite=False)
    files, last = gone_back_to(folder, back_to)
    from gtfs_schematic.cli.changes import describe
    from gtfs_schematic.comparison import compare, files_of_comparison, load_issue
    from gtfs_schematic.config import Settings

    issues = [load_issue(folder / each, Settings()) for each in (last.name, back_to)]
    sheet = compare(issues[0], issues[1])
    files |= files_of_comparison(sheet, issues[0], issues[1])
    write_folder(folder / name, files)
    if as_json:
        click.echo(files["changes.json"])
        return
    told = describe(sheet, issues[0], issues[1])
    click.echo("\n".join([*told, f"Written to {folder / name}, as after {last.name}"]))
