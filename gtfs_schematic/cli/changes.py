"""Command `changes`: what differs between two editions, two feeds, or one of each."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from gtfs_schematic.cli import options

if TYPE_CHECKING:
    from gtfs_schematic.comparison import Issue
    from gtfs_schematic.edition.changes import ChangeSheet

_EPILOG = """\b
Example:
  gtfs-schematic changes spring.zip summer.zip
  gtfs-schematic changes spring summer --out changes
"""


@click.command(epilog=_EPILOG)
@click.argument("before", metavar="OLD", type=click.Path(path_type=Path))
@click.argument("after", metavar="NEW", type=click.Path(path_type=Path))
@click.option(
    "--out",
    type=click.Path(path_type=Path),
    metavar="DIR",
    help="Write changes.html, changes.pdf, changes.csv and changes.json into a folder.",
)
@options.overwrite
@options.feed_options
@options.as_json
@options.quiet
def changes(before: Path, after: Path, **given: Any) -> int:  # noqa: ANN401 - the options of the registry
    """List what differs between OLD and NEW, each an edition's folder or a feed.

    Lines and stations are known again whatever became of their ids. Two editions are also shown
    side by side.
    """
    settings = options.settings_from(given)
    from gtfs_schematic.cli.console import listening
    from gtfs_schematic.comparison import compare, files_of_comparison, load_issue

    with listening(quiet=given["quiet"]) as progress:
        issues = [load_issue(path, settings, progress=progress) for path in (before, after)]
        sheet = compare(issues[0], issues[1])
    files = None
    if given["out"] is not None or given["as_json"]:
        files = files_of_comparison(sheet, issues[0], issues[1])
    if given["out"] is not None and files is not None:
        options.write_report(given["out"], files, overwrite=given["overwrite"])
    if given["as_json"] and files is not None:
        click.echo(files["changes.json"])
    else:
        click.echo("\n".join(describe(sheet, issues[0], issues[1])))
    return 0


def describe(sheet: ChangeSheet, before: Issue, after: Issue) -> list[str]:
    """Write what differs, for people."""
    from gtfs_schematic.edition.change_words import conclusion, period, sentence, summary

    return [
        f"Before: {before.name}, {period(sheet.before)}",
        f"After: {after.name}, {period(sheet.after)}",
        summary(sheet),
        *(f"  {sentence(change)}" for change in sheet.large),
        conclusion(sheet),
        *(f"Look at this match: {doubt}" for doubt in sheet.doubtful),
        *(f"  {sentence(change)}" for change in sheet.small),
    ]
